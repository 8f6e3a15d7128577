"""Which layers beyond its reference a station is cut on, on boards whose openings are known from how they were drawn (exact)."""

import numpy as np
import pytest
import shapely

from impcheck.path.walk import Run
from tests.path.board_builder import Drawing


def _board() -> Drawing:
    """A trace over three planes: a slot under it at x = 5 to 6, a hole 0.4 to 0.9 mm beside its edge at x = 8 to 8.6, both in the first
    plane; heights 0.1 mm, so that only the slot lets the field through."""
    first = shapely.box(0, 0, 30, 30) - shapely.box(5, 3, 6, 7) - shapely.box(8, 5.475, 8.6, 5.975)
    board = Drawing(4).region(1, first).region(2, shapely.box(0, 0, 30, 30)).region(3, shapely.box(0, 0, 30, 30))
    return board.stroke(0, [(2, 5), (12, 5)], 0.15).flash(0, (2, 5), (0.5, 0.5)).flash(0, (12, 5), (0.5, 0.5))


def _run(board: Drawing) -> Run:
    (run,) = board.walk([(2, 5, 0), (12, 5, 0)], [(0.1, 0.1, 1), (0.1, 0.1, 2), (0.1, 0.1, 3)]).runs
    return run


def test_only_what_lies_behind_an_opening_under_the_trace_is_cut() -> None:
    run = _run(_board())
    stations = run.stations
    x = stations.at[:, 0]
    slot, beside = (x > 5) & (x < 6), (x > 8) & (x < 8.6)
    assert slot.any() and beside.any()
    behind = stations.cuts[2]
    assert (np.diff(behind.first) == slot).all()
    assert np.allclose(behind.low, -stations.reach) and np.allclose(behind.high, stations.reach)
    assert (np.diff(stations.cuts[1].first)[beside] == 2).all()
    assert (stations.coverage_below[slot] == 0).all() and (stations.coverage_below[~slot] == 1).all()


def test_the_layer_behind_an_opening_beside_the_trace_is_listed_without_entries() -> None:
    plane = shapely.box(0, 0, 30, 30)
    board = Drawing(4).region(1, plane - shapely.box(8, 5.475, 8.6, 5.975)).region(2, plane).region(3, plane)
    run = _run(board.stroke(0, [(2, 5), (12, 5)], 0.15).flash(0, (2, 5), (0.5, 0.5)).flash(0, (12, 5), (0.5, 0.5)))
    assert set(run.stations.cuts) == {0, 1, 2}
    assert len(run.stations.cuts[2].low) == 0


def test_a_whole_plane_ends_the_search() -> None:
    plane = shapely.box(0, 0, 30, 30)
    board = Drawing(4).region(1, plane).region(2, plane).region(3, plane)
    run = _run(board.stroke(0, [(2, 5), (12, 5)], 0.15).flash(0, (2, 5), (0.5, 0.5)).flash(0, (12, 5), (0.5, 0.5)))
    assert set(run.stations.cuts) == {0, 1}


@pytest.mark.parametrize("gap", [0.1, 0.25])
def test_copper_within_three_heights_has_its_own_stations(gap: float) -> None:
    board = _board().disc(0, (10, 5.075 + gap + 0.2), 0.4)
    stations = _run(board).stations
    # the disc reaches from x = 9.8 to 10.2, 7.8 to 8.2 mm from the start; events of copper beside the trace lie within 50 um
    for place in (7.8, 8.2):
        assert np.abs(stations.begin - place).min() < 0.05
    cuts = stations.cuts[0]
    nearest = [cuts.low[a:b][cuts.low[a:b] > 0.1].min(initial=9.0) for a, b in zip(cuts.first, cuts.first[1:], strict=False)]
    assert min(nearest) - 0.075 == pytest.approx(
        gap, abs=0.03
    )  # a station holds 15 % of the gap and what its neighbours within 50 um leave it


def test_copper_farther_than_three_heights_makes_no_stations() -> None:
    far = _run(_board().disc(0, (10, 5.075 + 0.5 + 0.2), 0.4)).stations
    without = _run(_board()).stations
    assert np.array_equal(far.begin, without.begin)
