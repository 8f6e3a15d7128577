"""Whole boards: negative layers, outlines, masks, and the contract of the pieces. Areas are exact unless said."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import shapely

from impcheck.artwork.stackup import Stackup
from impcheck.copper.build import rebuild, rebuild_layer
from impcheck.copper.outline import outline_shape
from tests.copper.four_layers import PLANE, STACKUP, artwork, drill, image, square

CLEAR = "%LPC*%\n" + square(5, 5, 6, 6) + "%LPD*%\n"


def frame(x0, y0, x1, y1):
    corners = ((x0, y0, 2), (x1, y0, 1), (x1, y1, 1), (x0, y1, 1), (x0, y0, 1))
    return "".join(f"X{round(x * 1e6)}Y{round(y * 1e6)}D0{c}*\n" for x, y, c in corners)


def edge(*frames):
    return image("D10*\n" + "".join(frame(*one) for one in frames), "%ADD10C,0.1*%\n", "edge.gbr")


def area(layer):
    return float(shapely.union_all(layer.shape).area)


def test_a_negative_plane_fills_the_outline():
    negative = image("%LPD*%\n" + square(5, 5, 6, 6), "%TF.FilePolarity,Negative*%\n")
    copper = rebuild(artwork(layers=[image(PLANE), negative, image(PLANE), image(PLANE)], outline=edge((0, 0, 30, 20))))
    assert area(copper.layers[1]) == pytest.approx(600 - 1)
    assert copper.layers[1].object.tolist() == [-1]
    assert copper.outline_box == pytest.approx((0, 0, 30, 20))


def test_a_cut_out_of_the_board_is_no_copper_of_a_negative_plane():
    negative = image(square(5, 5, 6, 6), "%TF.FilePolarity,Negative*%\n")
    copper = rebuild(artwork(layers=[image(PLANE), negative, image(PLANE), image(PLANE)], outline=edge((0, 0, 30, 20), (10, 10, 14, 14))))
    assert area(copper.layers[1]) == pytest.approx(600 - 1 - 16)


def test_without_an_outline_a_negative_plane_reaches_just_beyond_the_other_layers():
    negative = image(square(5, 5, 6, 6), "%TF.FilePolarity,Negative*%\n")
    copper = rebuild(artwork(layers=[image(PLANE), negative, image(PLANE), image(PLANE)]))
    assert area(copper.layers[1]) == pytest.approx(22 * 22 - 1)  # a margin of 1 mm all round
    assert copper.outline_box == pytest.approx((0, 0, 20, 20))


def test_clear_objects_of_a_negative_plane_are_copper_again():
    negative = image(square(4, 4, 8, 8) + CLEAR, "%TF.FilePolarity,Negative*%\n")
    copper = rebuild(artwork(layers=[image(PLANE), negative, image(PLANE), image(PLANE)], outline=edge((0, 0, 20, 20))))
    assert area(copper.layers[1]) == pytest.approx(400 - 16 + 1)
    assert sorted(shapely.area(copper.layers[1].shape).tolist()) == [pytest.approx(1.0), pytest.approx(384.0)]


def test_the_board_file_may_say_that_a_layer_is_negative():
    items = [replace(item, negative=True) if getattr(item, "name", "") == "L2" else item for item in STACKUP.items]
    drawn = [image(PLANE), image(square(5, 5, 6, 6)), image(PLANE), image(PLANE)]
    copper = rebuild(artwork(layers=drawn, outline=edge((0, 0, 20, 20)), stackup=Stackup(tuple(items))))
    assert area(copper.layers[1]) == pytest.approx(399)


def test_positive_and_negative_drawings_of_a_plane_are_the_same_copper():
    # antipads cleared from a dark plane, or drawn on a negative one, some of them overlapping
    head = "%ADD10C,1.2*%\n"
    pads = "D10*\n" + "".join(f"X{x}000000Y{y}000000D03*\n" for x, y in ((3, 3), (4, 3), (10, 10), (0, 8), (20, 20)))
    positive = image(PLANE + "%LPC*%\n" + pads, head)
    negative = image(pads, "%TF.FilePolarity,Negative*%\n" + head)
    copper = rebuild(artwork(layers=[positive, negative, image(PLANE), image(PLANE)], outline=edge((0, 0, 20, 20))))
    one, other = (shapely.union_all(layer.shape) for layer in copper.layers[:2])
    assert one.symmetric_difference(other).area == pytest.approx(0.0, abs=1e-9)


def test_mask_openings_are_polygons_whatever_the_polarity_says():
    opening = square(5, 5, 6, 6)
    said = image(opening, "%TF.FileFunction,Soldermask,Top*%\n%TF.FilePolarity,Negative*%\n")
    plain = image(opening, "%TF.FileFunction,Soldermask,Top*%\n")
    for mask in (said, plain):
        copper = rebuild(artwork(mask_top=mask, outline=edge((0, 0, 20, 20))))
        assert [float(shape.area) for shape in copper.mask_openings[0]] == [pytest.approx(1.0)]
        assert len(copper.mask_openings[1]) == 0


def test_a_mask_drawn_as_the_resist_itself_is_turned_round():
    resist = image("%IPNEG*%\n" + square(0, 0, 20, 20) + CLEAR, "%TF.FileFunction,Soldermask,Top*%\n")
    copper = rebuild(artwork(mask_top=resist, outline=edge((0, 0, 20, 20))))
    assert float(shapely.union_all(copper.mask_openings[0]).area) == pytest.approx(1.0)


def test_an_outline_whose_corners_miss_by_a_few_micrometres_closes():
    body = "D10*\nX0Y0D02*\nX20000000Y0D01*\nX20004000Y3000D02*\nX20000000Y10000000D01*\nX0Y10000000D01*\nX2000Y-3000D01*\n"
    found = outline_shape(image(body, "%ADD10C,0.1*%\n"), 0.001)
    assert found.area == pytest.approx(200, rel=1e-3)


def test_a_round_board():
    body = "D10*\nG75*\nX10000000Y0D02*\nG03*\nX10000000Y0I-10000000J0D01*\n"
    found = outline_shape(image(body, "%ADD10C,0.1*%\n"), 0.001)
    assert found.area == pytest.approx(np.pi * 100, rel=1e-3)


def test_an_outline_that_never_closes_is_none():
    assert outline_shape(image("D10*\nX0Y0D02*\nX20000000Y0D01*\n", "%ADD10C,0.1*%\n"), 0.001) is None


def test_pieces_keep_the_contract():
    body = PLANE + "%LPC*%\n" + square(-1, 9, 21, 10) + "%LPD*%\nD10*\nX1000000Y1000000D02*\nX5000000Y1000000D01*\nX9000000Y9500000D03*\n"
    layer = rebuild(artwork(drill([(3, 1, 0.1)], plated=0), layers=[image(body, "%ADD10C,0.5*%\n")] + [image(PLANE)] * 3)).layers[0]
    assert layer.object.tolist() == [0, 0, 2, 3]  # the plane in two, then the stroke and the flash
    assert layer.whole.tolist() == [False, False, False, True]  # the stroke has a hole
    assert np.isnan(layer.width).tolist() == [True, True, True, True]
    assert shapely.is_valid(layer.shape).all()
    assert shapely.is_ccw(shapely.get_exterior_ring(layer.shape)).all()
    inner = [ring for shape in layer.shape for ring in shape.interiors]
    assert inner
    assert not shapely.is_ccw(inner).any()


def test_an_empty_layer_gives_no_pieces():
    layer = rebuild_layer("L1", 0, image(""))
    assert len(layer.shape) == len(layer.object) == len(layer.whole) == len(layer.width) == 0
