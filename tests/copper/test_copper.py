"""Copper against closed forms (exact up to the chord error) and against brute force."""

from __future__ import annotations

import math

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st

from impcheck.artwork.gerber import read_gerber
from impcheck.copper.build import rebuild_layer

HEAD = "%FSLAX46Y46*%\n%MOMM*%\n"
CHORD = 0.001  # mm


def layer(body, apertures="", **more):
    return rebuild_layer("L1", 0, read_gerber(f"{HEAD}{apertures}G01*\n{body}M02*\n".encode(), "t.gbr"), **more)


def area(pieces):
    return float(shapely.union_all(pieces.shape).area)


def at(x, y, code):
    return f"X{round(x * 1e6)}Y{round(y * 1e6)}D0{code}*\n"


# exact: elementary geometry
APERTURES = {
    "C,2": math.pi,
    "C,2X1": math.pi - math.pi / 4,
    "R,2X1": 2.0,
    "R,2X1X0.5": 2.0 - math.pi / 16,
    "O,3X1": 2.0 + math.pi / 4,
    "P,2X6": 3 * math.sqrt(3) / 2,
    "P,2X4X30X0.5": 2.0 - math.pi / 16,
}


@pytest.mark.parametrize("aperture", APERTURES)
def test_area_of_a_flash(aperture):
    found = layer("D10*\n" + at(5, 5, 3), f"%ADD10{aperture}*%\n")
    assert area(found) == pytest.approx(APERTURES[aperture], rel=3 * CHORD)
    assert shapely.is_valid(found.shape).all()


# exact: elementary geometry; primitives as the Gerber specification numbers them
MACROS = {
    "1,1,2,0,0": math.pi,
    "20,1,1,0,0,4,0,30": 4.0,
    "21,1,4,1,0,0,45": 4.0,
    "4,1,3,0,0,2,0,0,2,0,0,0": 2.0,
    "5,1,4,0,0,2,0": 2.0,
    "7,0,0,4,2,0.5,0": math.pi * 3 - 4 * (0.5 * (2 - 1)),  # a ring less four bars, to second order of the gap (below)
    "1,1,4,0,0*1,0,2,0,0": 3 * math.pi,
    "1,0,2,0,0*1,1,2,0,0": math.pi,  # an exposure-off primitive cuts only what stands before it
}


@pytest.mark.parametrize("macro", MACROS)
def test_area_of_a_macro(macro):
    found = layer("D10*\n" + at(5, 5, 3), f"%AMM*{macro}*%\n%ADD10M*%\n")
    tolerance = 0.02 if macro.startswith("7") else 3 * CHORD
    assert area(found) == pytest.approx(MACROS[macro], rel=tolerance)


def test_a_hole_in_an_aperture_is_no_clear_shape():
    # the flash's hole shows the copper below
    found = layer("D11*\n" + at(5, 5, 3) + "D10*\n" + at(5, 5, 3), "%ADD10C,2X1*%\n%ADD11C,1.5*%\n")
    assert area(found) == pytest.approx(math.pi, rel=3 * CHORD)


@settings(max_examples=40, deadline=None)
@given(st.floats(-20, 20), st.floats(-20, 20), st.floats(0.05, 3), st.floats(0, 6.28))
def test_a_stroke_is_a_stadium_of_exact_width(x, y, width, heading):
    length = 5.0
    x, y, width = round(x, 6), round(y, 6), round(width, 6)
    end = (round(x + length * math.cos(heading), 6), round(y + length * math.sin(heading), 6))
    found = layer("D10*\n" + at(x, y, 2) + at(*end, 1), f"%ADD10C,{width:.6f}*%\n")
    (shape,) = found.shape
    drawn = math.dist((x, y), end)
    assert shape.area == pytest.approx(drawn * width + math.pi * width**2 / 4, rel=2e-2 * CHORD / width + 2e-3)
    normal = np.array([-(end[1] - y), end[0] - x]) / drawn
    middle = (np.array([x, y]) + end) / 2
    cut = shapely.intersection(shape, shapely.LineString([middle - 5 * normal, middle + 5 * normal]))
    assert cut.length == pytest.approx(width, abs=1e-9)
    assert found.width[0] == pytest.approx(width)
    true = shapely.LineString([(x, y), end]).buffer(width / 2, quad_segs=200)
    assert shapely.hausdorff_distance(shapely.boundary(shape), shapely.boundary(true)) < 1.5 * CHORD


def test_a_stroke_without_length_is_a_dot():
    assert area(layer("D10*\n" + at(1, 1, 2) + at(1, 1, 1), "%ADD10C,2*%\n")) == pytest.approx(math.pi, rel=3 * CHORD)


def test_a_rectangle_drawn_sideways():
    # exact: a 1 x 1 square swept 3 mm along its diagonal direction (3 x 3): hull of both ends
    found = layer("D10*\n" + at(0, 0, 2) + at(3, 3, 1), "%ADD10R,1X1*%\n")
    assert area(found) == pytest.approx(1 + 2 * 3.0, rel=1e-9)


def test_an_arc_is_a_ring_piece():
    # exact: half a ring of mean radius 5 and width 1, and two half discs
    found = layer("G75*\nD10*\n" + at(5, 0, 2) + "G03*\nX-5000000Y0I-5000000J0D01*\n", "%ADD10C,1*%\n")
    assert area(found) == pytest.approx(math.pi * 5 * 1 + math.pi / 4, rel=3 * CHORD)
    assert len(found.shape) == 1


def square(x0, y0, x1, y1):
    return "G36*\n" + at(x0, y0, 2) + at(x1, y0, 1) + at(x1, y1, 1) + at(x0, y1, 1) + at(x0, y0, 1) + "G37*\n"


def test_a_region_with_a_cut_in():
    # exact: a 10 x 10 square with a 2 x 2 hole reached by a cut-in of no width
    points = [(0, 0), (10, 0), (10, 10), (0, 10), (0, 4), (4, 4), (4, 6), (6, 6), (6, 4), (4, 4), (0, 4), (0, 0)]
    body = "G36*\n" + "".join(at(x, y, 2 if k == 0 else 1) for k, (x, y) in enumerate(points)) + "G37*\n"
    found = layer(body)
    assert area(found) == pytest.approx(96.0, abs=1e-6)
    assert shapely.is_valid(found.shape).all()


def test_outlines_run_counter_clockwise_and_holes_clockwise():
    found = layer(square(0, 0, 10, 10) + "%LPC*%\n" + square(4, 4, 6, 6))
    (shape,) = found.shape
    assert shapely.is_ccw(shape.exterior)
    assert not shapely.is_ccw(shape.interiors[0])
    assert not found.whole[0]


@settings(max_examples=60, deadline=None)
@given(
    st.lists(
        st.tuples(st.booleans(), st.integers(0, 20), st.integers(0, 20), st.integers(1, 12), st.integers(1, 12)), min_size=1, max_size=14
    )
)
def test_polarity_in_order_against_brute_force(steps):
    body, truth = "", shapely.Polygon()
    for dark, x, y, w, h in steps:
        body += f"%LP{'D' if dark else 'C'}*%\n" + square(x, y, x + w, y + h)
        box = shapely.box(x, y, x + w, y + h)
        truth = truth.union(box) if dark else truth.difference(box)
    found = layer(body)
    made = shapely.union_all(found.shape) if len(found.shape) else shapely.Polygon()
    assert made.symmetric_difference(truth).area == pytest.approx(0.0, abs=1e-9)
    assert (shapely.get_type_id(found.shape) == 3).all()


def test_a_negative_layer_is_its_background_less_what_is_drawn():
    found = layer("%IPNEG*%\n" + square(2, 2, 4, 4), background=shapely.box(0, 0, 10, 10))
    assert area(found) == pytest.approx(96.0)


def test_holes_without_plating_cut_a_trace_in_two():
    hole = np.array([shapely.Point(5, 0).buffer(0.5)], object)
    found = layer("D10*\n" + at(0, 0, 2) + at(10, 0, 1), "%ADD10C,0.4*%\n", holes=hole)
    assert len(found.shape) == 2
    assert np.isnan(found.width).all()


def test_a_stroke_redrawn_as_a_region_is_the_same_copper():
    stroke = layer("D10*\n" + at(0, 0, 2) + at(10, 0, 1), "%ADD10R,1X1*%\n")
    region = layer(square(-0.5, -0.5, 10.5, 0.5))
    assert shapely.union_all(stroke.shape).symmetric_difference(shapely.union_all(region.shape)).area == pytest.approx(0.0, abs=1e-9)
