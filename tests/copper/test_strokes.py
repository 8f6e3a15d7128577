"""Strokes, flashes and regions written as Gerber, against closed forms (exact up to the chord error) and against shapely's own buffers
and sweeps."""

from __future__ import annotations

import math

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st

from impcheck.artwork.gerber import read_gerber
from impcheck.copper.build import rebuild_layer

CHORD = 0.001  # mm


def layer(body, apertures="", chord_error=CHORD):
    image = read_gerber(f"%FSLAX46Y46*%\n%MOMM*%\n{apertures}G75*\nG01*\n{body}M02*\n".encode(), "t.gbr")
    return rebuild_layer("L1", 0, image, chord_error=chord_error)


def at(x, y, code):
    return f"X{round(x * 1e6)}Y{round(y * 1e6)}D0{code}*\n"


def arc(start, end, centre, clockwise=False):
    i, j = round((centre[0] - start[0]) * 1e6), round((centre[1] - start[1]) * 1e6)
    return at(*start, 2) + f"G0{2 if clockwise else 3}*\nX{round(end[0] * 1e6)}Y{round(end[1] * 1e6)}I{i}J{j}D01*\nG01*\n"


def merged(found):
    return shapely.union_all(found.shape)


def band(start, centre, sweep, width):
    """The truth of an arc stroke: a fine polyline widened by shapely."""
    radius, phi = math.dist(start, centre), math.atan2(start[1] - centre[1], start[0] - centre[0])
    t = phi + np.linspace(0, sweep, 2000)
    return shapely.LineString(np.column_stack([centre[0] + radius * np.cos(t), centre[1] + radius * np.sin(t)])).buffer(
        width / 2, quad_segs=200
    )


@settings(max_examples=60, deadline=None)
@given(st.floats(0.05, 8), st.floats(0.1, 6.2), st.booleans(), st.floats(0.02, 3))
def test_any_arc_lies_within_the_chord_error(radius, sweep, clockwise, width):
    sign = -1 if clockwise else 1
    start, end = (radius, 0.0), (radius * math.cos(sweep), sign * radius * math.sin(sweep))
    found = layer("D10*\n" + arc(start, end, (0, 0), clockwise), f"%ADD10C,{width:.6f}*%\n")
    truth = band(start, (0, 0), sign * sweep, width)
    made = merged(found)
    assert shapely.is_valid(found.shape).all()
    # chords lie at most CHORD inside, and 1.2 um of rounding and of the truth's own chords on top
    assert truth.buffer(-CHORD - 2e-4).difference(made).area < 1e-6
    assert made.difference(truth.buffer(CHORD + 2e-4)).area < 1e-6
    assert found.width == pytest.approx(np.full(len(found.shape), width), abs=1e-6)


def test_a_full_circle_is_a_ring():
    # exact: 2 pi r w
    found = layer("D10*\n" + arc((5, 0), (5, 0), (0, 0)), "%ADD10C,1*%\n")
    assert merged(found).area == pytest.approx(2 * math.pi * 5, rel=2 * CHORD)
    assert len(found.shape[0].interiors) == 1


def test_an_arc_tighter_than_its_own_width_has_no_hole():
    # exact: a half circle of radius 0.1 drawn with a disc of 1: the hull of two discs 0.2 apart and the bulge between
    found = layer("D10*\n" + arc((0.1, 0), (-0.1, 0), (0, 0)), "%ADD10C,1*%\n")
    assert merged(found).symmetric_difference(band((0.1, 0), (0, 0), math.pi, 1.0)).area < 5e-3
    assert len(found.shape) == 1
    assert len(found.shape[0].interiors) == 0


def test_an_arc_of_a_square_aperture():
    # exact: a square of side 1 along a half circle of radius 5 sweeps r * integral of |cos| + |sin| = 4 r, and itself once
    found = layer("D10*\n" + arc((5, 0), (-5, 0), (0, 0)), "%ADD10R,1X1*%\n")
    assert merged(found).area == pytest.approx(21.0, rel=CHORD)
    assert np.isnan(found.width).all()


SWEPT = ("R,2X0.5", "O,2X0.5", "P,2X5X10", "C,1X0.6")


@pytest.mark.parametrize("aperture", [*SWEPT, "M"])
@pytest.mark.parametrize("end", [(3.0, 1.0), (0.3, -0.2), (0.0, 0.0)])
def test_a_stroke_of_any_aperture_is_the_union_of_its_places(aperture, end):
    # the definition: the aperture at every place along the line, here at 800
    macro = "%AMM*4,1,6,0,0,2,0,2,0.5,0.5,0.5,0.5,2,0,2,0,0,0*1,1,0.4,-1,-1*%\n"
    head = f"{macro}%ADD10{aperture}*%\n"
    flash = merged(layer("D10*\n" + at(0, 0, 3), head))
    places = np.linspace((0, 0), end, 800)
    truth = shapely.union_all([shapely.affinity.translate(flash, *place) for place in places])
    found = layer("D10*\n" + at(0, 0, 2) + at(*end, 1), head)
    assert shapely.is_valid(found.shape).all()
    assert merged(found).symmetric_difference(truth).area == pytest.approx(0.0, abs=0.02 * math.hypot(*end) + 1e-9)
    assert truth.difference(merged(found).buffer(1e-6)).area == pytest.approx(0.0, abs=1e-6)


def test_transforms_mirror_then_turn_then_scale():
    # exact: the corner (2, 0) mirrors to (-2, 0), turns by 30 degrees to (-sqrt 3, -1), doubles to (-2 sqrt 3, -2)
    found = layer("%LMX*%\n%LR30*%\n%LS2*%\nD10*\n" + at(0, 0, 3), "%AMT*4,1,3,0,0,2,0,0,1,0,0,0*%\n%ADD10T*%\n")
    corners = shapely.get_coordinates(found.shape)
    assert min(math.dist(corner, (-2 * math.sqrt(3), -2)) for corner in corners) < 1e-9
    assert min(math.dist(corner, (-1, math.sqrt(3))) for corner in corners) < 1e-9
    assert found.shape[0].area == pytest.approx(4.0)
    assert shapely.is_ccw(shapely.get_exterior_ring(found.shape)).all()


def test_a_scaled_stroke_has_the_scaled_width():
    found = layer("%LS2*%\nD10*\n" + at(0, 0, 2) + at(5, 0, 1), "%ADD10C,0.5*%\n")
    assert found.width.tolist() == [pytest.approx(1.0)]
    assert found.shape[0].area == pytest.approx(5 + math.pi / 4, rel=CHORD)


def test_a_thermal_is_four_pieces():
    # exact: a ring from 1 to 2 mm diameter, less a cross of 0.2 mm; per quarter, integrate x + y over the ring beyond 0.1 mm of both axes
    def quarter(r, g):  # area of a disc's quarter beyond the lines x = g and y = g
        return r * r / 2 * (math.pi / 2 - 2 * math.asin(g / r)) - g * (math.sqrt(r * r - g * g) - g)

    found = layer("D10*\n" + at(3, 3, 3), "%AMM*7,0,0,2,1,0.2,0*%\n%ADD10M*%\n")
    assert len(found.shape) == 4
    assert shapely.area(found.shape) == pytest.approx(np.full(4, quarter(1.0, 0.1) - quarter(0.5, 0.1)), rel=3 * CHORD)
    assert set(found.object.tolist()) == {0}


def test_macro_primitives_turn_about_the_origin_of_the_macro():
    # exact: a square of 1 mm centred at (2, 0), turned by 90 degrees, is centred at (0, 2)
    for primitive in ("21,1,1,1,2,0,90", "20,1,1,1.5,0,2.5,0,90", "4,1,4,1.5,-.5,2.5,-.5,2.5,.5,1.5,.5,1.5,-.5,90", "1,1,1,2,0,90"):
        (shape,) = layer("D10*\n" + at(0, 0, 3), f"%AMM*{primitive}*%\n%ADD10M*%\n").shape
        assert (shape.centroid.x, shape.centroid.y) == (pytest.approx(0.0, abs=1e-9), pytest.approx(2.0))


def region(*contours):
    return "G36*\n" + "".join(at(*point, 2 if k == 0 else 1) for points in contours for k, point in enumerate(points)) + "G37*\n"


BOX = [(0, 0), (2, 0), (2, 2), (0, 2), (0, 0)]


def test_every_contour_of_a_region_is_filled():
    inner = [(0.5, 0.5), (1, 0.5), (1, 1), (0.5, 1), (0.5, 0.5)]
    far = [(x + 5, y) for x, y in BOX]
    found = layer(region(BOX, inner, far))
    assert merged(found).area == pytest.approx(8.0)  # the inner contour is no hole
    assert set(found.object.tolist()) == {0}


def test_a_contour_of_arcs_alone():
    # exact: one full circle of radius 1; and the same from two halves
    full = layer("G36*\n" + arc((1, 0), (1, 0), (0, 0)) + "G37*\n")
    halves = layer("G36*\n" + arc((1, 0), (-1, 0), (0, 0)) + "G03*\nX1000000Y0I1000000J0D01*\nG37*\n")
    assert merged(full).area == pytest.approx(math.pi, rel=2 * CHORD)
    assert merged(halves).area == pytest.approx(math.pi, rel=2 * CHORD)


def test_a_contour_with_a_rounded_corner():
    # exact: a square of 2 with one corner rounded by 1: 4 - (1 - pi/4)
    body = "G36*\n" + at(0, 0, 2) + at(2, 0, 1) + at(2, 1, 1) + "G03*\nX1000000Y2000000I-1000000J0D01*\nG01*\n" + at(0, 2, 1)
    found = layer(body + at(0, 0, 1) + "G37*\n")
    assert merged(found).area == pytest.approx(3 + math.pi / 4, rel=CHORD)


def test_many_cut_ins_keep_the_plane_whole():
    # exact: 100 mm2 less nine holes of 1 mm2, all reached by cut-ins from the left edge
    points = [(0, 0), (10, 0), (10, 10), (0, 10)]
    for y in (8, 5, 2):
        points.append((0, y))
        for x in (1, 4, 7):
            points += [(x, y), (x, y + 0.5), (x + 1, y + 0.5), (x + 1, y)]
        for x in (7, 4, 1):
            points += [(x + 1, y), (x + 1, y - 0.5), (x, y - 0.5), (x, y)]
        points.append((0, y))
    found = layer(region([*points, points[0]]))
    assert merged(found).area == pytest.approx(91.0, abs=1e-9)
    assert len(found.shape) == 1
    assert len(found.shape[0].interiors) == 9


def test_a_cut_in_that_does_not_close_exactly_keeps_one_piece():
    slit = [(0, 0), (10, 0), (10, 10), (0, 10), (0, 4.002), (4, 4.002), (4, 6), (6, 6), (6, 4), (0, 4), (0, 0)]
    found = layer(region(slit))
    assert len(found.shape) == 1
    assert found.shape[0].area == pytest.approx(100 - 4 - 0.008, abs=1e-9)


def test_a_contour_that_crosses_itself_is_mended():
    # exact: two triangles of 1 mm2 that meet in a point
    found = layer(region([(0, 0), (2, 2), (2, 0), (0, 2), (0, 0)]))
    assert shapely.area(found.shape).tolist() == [pytest.approx(1.0), pytest.approx(1.0)]


def test_apertures_without_size_leave_no_copper():
    found = layer("D10*\n" + at(0, 0, 2) + at(5, 0, 1) + at(1, 1, 3), "%ADD10C,0*%\n")
    assert len(found.shape) == 0


def test_a_smaller_chord_error_comes_nearer():
    # order of convergence: the area a polygon lacks is proportional to the chord error
    lack = [math.pi - merged(layer("D10*\n" + at(0, 0, 3), "%ADD10C,2*%\n", chord_error=c)).area for c in (0.01, 0.001, 0.0001)]
    assert lack[0] / lack[1] == pytest.approx(10, rel=0.25)
    assert lack[1] / lack[2] == pytest.approx(10, rel=0.25)
    assert lack[2] > 0  # vertices on the circle, chords inside


def test_pieces_stand_in_drawing_order():
    body = "D10*\n" + at(0, 0, 3) + region(BOX) + "D10*\n" + at(0, 0, 2) + at(5, 5, 1)
    assert layer(body, "%ADD10C,1*%\n").object.tolist() == [0, 1, 2]
