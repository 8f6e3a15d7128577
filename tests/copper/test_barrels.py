"""Spans and heights of barrels, and what holes take away. Numbers are exact, from the stackup of `four_layers`."""

from __future__ import annotations

import math

import numpy as np
import pytest
import shapely

from impcheck.copper.barrels import barrels_of
from impcheck.copper.build import rebuild
from tests.copper.four_layers import artwork, drill

HOLE = math.pi * 0.25**2  # mm2 of a 0.5 mm hole


def areas(copper):
    return [float(shapely.union_all(layer.shape).area) for layer in copper.layers]


def test_a_through_hole_reaches_from_outer_face_to_outer_face():
    barrels = barrels_of(artwork(drill([(5, 5, 0.5)])))
    assert (barrels.first.tolist(), barrels.last.tolist()) == ([0], [3])
    assert (barrels.top[0], barrels.bottom[0]) == (pytest.approx(0.82), pytest.approx(0.0))
    assert (barrels.file, barrels.line.tolist()) == (("holes.drl",), [1])


def test_blind_and_buried_spans():
    barrels = barrels_of(artwork(drill([(5, 5, 0.3)], first=0, last=1), drill([(6, 5, 0.3)], first=1, last=2)))
    assert list(zip(barrels.first.tolist(), barrels.last.tolist(), strict=True)) == [(0, 1), (1, 2)]
    assert barrels.top == pytest.approx([0.82, 0.68])
    assert barrels.bottom == pytest.approx([0.66, 0.14])


@pytest.mark.parametrize(("aside", "met"), [(0.0, True), (0.149, True), (0.151, False)])
def test_a_back_drill_from_below_stops_halfway_through_the_next_dielectric(aside, met):
    # its diameter is 0.6: it drills a barrel within a quarter of that, 0.15 mm
    back = drill([(5 + aside, 5, 0.6)], plated=0, backdrill_from=3, backdrill_keep=1)
    barrels = barrels_of(artwork(drill([(5, 5, 0.3)]), back))
    assert barrels.last.tolist() == [1 if met else 3]
    assert barrels.bottom[0] == pytest.approx((0.66 + 0.16) / 2 if met else 0.0)
    assert barrels.top[0] == pytest.approx(0.82)


def test_a_back_drill_from_above():
    back = drill([(5, 5, 0.6)], plated=0, backdrill_from=0, backdrill_keep=2)
    barrels = barrels_of(artwork(drill([(5, 5, 0.3)]), back))
    assert (barrels.first[0], barrels.last[0]) == (2, 3)
    assert barrels.top[0] == pytest.approx((0.66 + 0.16) / 2)


def test_back_drills_from_both_sides():
    drills = [
        drill([(5, 5, 0.3)]),
        drill([(5, 5, 0.6)], plated=0, backdrill_from=0, backdrill_keep=1),
        drill([(5, 5, 0.6)], plated=0, backdrill_from=3, backdrill_keep=2),
    ]
    barrels = barrels_of(artwork(*drills))
    assert (barrels.first[0], barrels.last[0]) == (1, 2)
    assert (barrels.top[0], barrels.bottom[0]) == (pytest.approx((0.78 + 0.68) / 2), pytest.approx((0.14 + 0.04) / 2))


def test_a_back_drill_takes_the_copper_of_the_layers_it_passes():
    back = drill([(5, 5, 0.5)], plated=0, backdrill_from=3, backdrill_keep=1)
    assert areas(rebuild(artwork(drill([(5, 5, 0.3)]), back))) == pytest.approx([400, 400, 400 - HOLE, 400 - HOLE], abs=1e-3)


def test_holes_without_plating_are_cut_on_the_layers_they_pass_and_plated_ones_are_not():
    copper = rebuild(artwork(drill([(5, 5, 0.5)]), drill([(9, 9, 0.5)], plated=0), drill([(3, 3, 0.5)], first=2, last=3, plated=0)))
    assert areas(copper) == pytest.approx([400 - HOLE, 400 - HOLE, 400 - 2 * HOLE, 400 - 2 * HOLE], abs=3e-3)
    assert copper.barrels.diameter.tolist() == [0.5]
    assert not any(layer.whole.any() for layer in copper.layers)


def test_slots():
    # exact: a stadium 3 mm long and 1 mm wide, cut where it is not plated, a barrel where it is
    stadium = 3.0 + math.pi / 4
    copper = rebuild(artwork(drill([(5, 5, 8, 5, 1.0)]), drill([(5, 10, 8, 10, 1.0)], plated=0)))
    assert areas(copper) == pytest.approx([400 - stadium] * 4, abs=3e-3)
    assert copper.barrels.start.tolist() == [[5.0, 5.0]]
    assert copper.barrels.end.tolist() == [[8.0, 5.0]]


def test_no_holes_at_all():
    copper = rebuild(artwork())
    assert len(copper.barrels.diameter) == 0
    assert copper.barrels.start.shape == (0, 2)
    assert np.array_equal(copper.layers[0].whole, [True])
