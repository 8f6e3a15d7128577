"""Walks of small boards whose lengths, widths and openings are known from how they were drawn (exact)."""

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st

from impcheck.path.walk import Run, Walk, Zone
from tests.path.board_builder import Drawing

GROUND = [(0.1, 0.1, 1)]
Span = tuple[float, float]


def with_plane(layers: int = 2, plane: int = 1, *holes: shapely.Geometry) -> Drawing:
    shape = shapely.box(0, 0, 30, 30)
    for hole in holes:
        shape = shape - hole
    return Drawing(layers).region(plane, shape)


def spans(run: Run, where: np.ndarray) -> list[Span]:
    """Spans along the path of neighbouring stations at `where`."""
    stations = run.stations
    found: list[list[float]] = []
    for i in np.flatnonzero(where):
        if found and abs(found[-1][1] - stations.begin[i]) < 1e-9:
            found[-1][1] = float(stations.end[i])
        else:
            found.append([float(stations.begin[i]), float(stations.end[i])])
    return [(a, b) for a, b in found]


def trace(run: Run) -> np.ndarray:
    zone: np.ndarray = run.stations.zone == Zone.TRACE
    return zone


def check_pieces(walk: Walk) -> None:
    """Stations follow each other without gaps from end to end."""
    for run in walk.runs:
        assert run.stations.begin[0] == pytest.approx(run.along[0], abs=1e-9)
        assert run.stations.end[-1] == pytest.approx(run.along[1], abs=1e-9)
        assert np.allclose(run.stations.begin[1:], run.stations.end[:-1], atol=1e-9)
        size = run.stations.end - run.stations.begin
        assert (size > 0).all()
        assert size.max() <= 1.0 + 1e-9


def bent() -> Drawing:
    board = with_plane(2, 1, shapely.box(3, 4, 3.5, 6), shapely.Point(10, 7.2).buffer(0.3, quad_segs=16))
    board.stroke(0, [(1, 5), (6, 5), (8, 7), (12, 7)], 0.15).flash(0, (1, 5), (0.6, 0.4)).flash(0, (12, 7), (0.6, 0.4))
    return board.stroke(0, [(1, 5.5), (6, 5.5)], 0.2)


BENT_LENGTH = 5 + 8**0.5 + 4
BENT_ENDS = [(1.0, 5.0, 0), (12.0, 7.0, 0)]


def check_bent(walk: Walk) -> None:
    assert walk.status == "walked"
    assert walk.length == pytest.approx(BENT_LENGTH, abs=2e-3)
    (run,) = walk.runs
    check_pieces(walk)
    stations = run.stations
    judged = trace(run)
    assert np.allclose(stations.width[judged], 0.15, atol=1e-6)
    assert np.allclose(stations.centre[judged], 0.0, atol=2e-6)
    # the slot from x = 3 to 3.5 lies 2.0 to 2.5 mm along, to 5 um
    slot, disc = spans(run, stations.coverage_below < 1)
    assert slot == pytest.approx((2.0, 2.5), abs=5e-3)
    # the disc of 0.3 mm around (10, 7.2) reaches under the far edge (y = 7.075) for 2 sqrt(0.3^2 - 0.125^2)
    half = (0.3**2 - 0.125**2) ** 0.5
    middle = BENT_LENGTH - 2
    assert disc == pytest.approx((middle - half, middle + half), abs=5e-3)
    # the disc reaches over the middle line for 2 sqrt(0.3^2 - 0.2^2)
    half = (0.3**2 - 0.2**2) ** 0.5
    reading = spans(run, stations.coverage_below < 0.5)[-1]
    assert reading == pytest.approx((middle - half, middle + half), abs=5e-3)
    assert spans(run, stations.zone == Zone.PAD) == [
        pytest.approx((0, 0.3), abs=1e-4),
        pytest.approx((BENT_LENGTH - 0.3, BENT_LENGTH), abs=2e-3),
    ]
    assert len(spans(run, stations.zone == Zone.BEND)) == 2


@pytest.mark.parametrize("turn", [0.0, 31.7, 90.0])
@pytest.mark.parametrize("mirror", [False, True])
@pytest.mark.parametrize("style", ["strokes", "regions", "merged", "both", "scrambled"])
def test_the_same_answer_however_it_is_drawn(turn: float, mirror: bool, style: str) -> None:
    board = bent()
    if style == "regions":
        board = board.as_regions({0}, merged=False)
    elif style == "merged":
        board = board.as_regions({0}, merged=True)
    elif style == "both":
        board.region(0, shapely.LineString([(1, 5), (6, 5), (8, 7), (12, 7)]).buffer(0.075, quad_segs=16))
    order = np.random.default_rng(3).permutation(len(board.items)).tolist() if style == "scrambled" else None
    moved = board.moved(turn, mirror, order)
    ends = [(*board.place((x, y), turn, mirror), layer) for x, y, layer in BENT_ENDS]
    ground = [(*board.place((0.1, 0.1), turn, mirror), 1)]
    check_bent(moved.walk(ends, ground))


def test_the_neighbour_beside_and_its_gap() -> None:
    (run,) = bent().walk(BENT_ENDS, GROUND).runs
    cuts = run.stations.cuts[0]
    i = int(np.searchsorted(run.stations.begin, 3.5))
    entries = slice(cuts.first[i], cuts.first[i + 1])
    assert np.allclose(cuts.low[entries], [-0.075, 0.4])
    assert np.allclose(cuts.high[entries], [0.075, 0.6])
    assert cuts.label[entries][0] != cuts.label[entries][1]


def test_a_layer_change_through_a_via() -> None:
    board = with_plane(4, 1, shapely.Point(6, 5).buffer(0.4, quad_segs=16)).region(
        2, shapely.box(0, 0, 30, 30) - shapely.Point(6, 5).buffer(0.4)
    )
    board.stroke(0, [(2, 5), (6, 5)], 0.15).stroke(3, [(6, 5), (12, 5)], 0.12).via((6, 5), 0.2, 0.45)
    board.flash(0, (2, 5), (0.5, 0.5)).flash(3, (12, 5), (0.5, 0.5))
    walk = board.walk([(2, 5, 0), (12, 5, 3)], [(0.1, 0.1, 1), (0.1, 0.1, 2)])
    top, bottom = walk.runs
    (via,) = walk.vias
    assert (via.barrel, via.at, via.entered, via.left) == (0, (6.0, 5.0), 0, 3)
    assert via.along == pytest.approx(4.0)
    assert (top.layer, bottom.layer) == (0, 3)
    assert walk.length == pytest.approx(10.0)
    assert (top.stations.below == 1).all()
    assert (top.stations.above == -1).all()
    assert (bottom.stations.above == 2).all()
    # the antipad's edge at 0.4 mm from the barrel's centre ends the via's zone; it is no opening of the trace's reference
    assert spans(top, top.stations.zone == Zone.VIA) == [pytest.approx((3.6, 4.0), abs=1e-3)]
    assert spans(bottom, bottom.stations.zone == Zone.VIA) == [pytest.approx((4.0, 4.4), abs=1e-3)]
    for run, width in ((top, 0.15), (bottom, 0.12)):
        judged = trace(run)
        assert np.allclose(run.stations.width[judged], width)
        assert (np.maximum(run.stations.coverage_below, run.stations.coverage_above)[judged] == 1).all()
    check_pieces(walk)


def test_plated_pins_are_no_layer_change() -> None:
    holes = [shapely.Point(x, 5).buffer(0.6) for x in (2, 12)]
    board = with_plane(2, 1, *holes).stroke(0, [(2, 5), (12, 5)], 0.15).via((2, 5), 0.8, 1.0).via((12, 5), 0.8, 1.0)
    walk = board.walk([(2, 5, None), (12, 5, None)], GROUND)
    assert walk.vias == ()
    assert [run.layer for run in walk.runs] == [0]
    assert walk.length == pytest.approx(10.0)
    (run,) = walk.runs
    assert spans(run, trace(run)) == [pytest.approx((0.6, 9.4), abs=2e-3)]


def neck(board: Drawing) -> Drawing:
    board.stroke(0, [(2, 5), (5, 5)], 0.2).stroke(0, [(5, 5), (6, 5)], 0.12).stroke(0, [(6, 5), (12, 5)], 0.2)
    return board.flash(0, (2, 5), (0.5, 0.5)).flash(0, (12, 5), (0.5, 0.5))


@pytest.mark.parametrize("merged", [None, False, True])
def test_a_neck_is_placed_within_20_um(merged: bool | None) -> None:
    board = neck(with_plane())
    walk = (board if merged is None else board.as_regions({0}, merged)).walk([(2, 5, 0), (12, 5, 0)], GROUND)
    (run,) = walk.runs
    narrow = spans(run, run.stations.width < 0.121)
    # the wide strokes' round ends (radius 0.1) reach sqrt(0.1^2 - 0.06^2) = 0.08 mm into the narrow one
    assert narrow == [pytest.approx((3.08, 3.92), abs=0.02)]
    assert spans(run, run.stations.width < 0.199) == [pytest.approx((3.0, 4.0), abs=0.04)]


def test_a_sharp_step_of_a_region_is_exact() -> None:
    board = with_plane().region(
        0, shapely.union_all([shapely.box(2, 4.9, 5, 5.1), shapely.box(5, 4.94, 6, 5.06), shapely.box(6, 4.9, 12, 5.1)])
    )
    board.flash(0, (2, 5), (0.5, 0.5)).flash(0, (12, 5), (0.5, 0.5))
    (run,) = board.walk([(2, 5, 0), (12, 5, 0)], GROUND).runs
    assert spans(run, run.stations.width < 0.15) == [pytest.approx((3.0, 4.0), abs=1e-4)]
    assert set(np.round(run.stations.width[trace(run)], 6)) == {0.2, 0.12}


def test_a_taper_changes_by_three_percent_a_station_at_most() -> None:
    shape = shapely.Polygon([(2, 4.9), (5, 4.9), (6, 4.8), (9, 4.8), (9, 5.2), (6, 5.2), (5, 5.1), (2, 5.1)])
    board = with_plane().region(0, shape).flash(0, (2, 5), (0.5, 0.5)).flash(0, (9, 5), (0.5, 0.5))
    (run,) = board.walk([(2, 5, 0), (9, 5, 0)], GROUND).runs
    width = run.stations.width[trace(run)]
    assert (np.abs(np.diff(width)) / width[:-1]).max() < 0.05
    middle = (run.stations.begin + run.stations.end)[trace(run)] / 2
    assert np.allclose(width, np.interp(middle, [3, 4], [0.2, 0.4]), atol=1e-6)


@pytest.mark.parametrize("merged", [None, True])
def test_a_teardrop_belongs_to_its_pad(merged: bool | None) -> None:
    board = with_plane().stroke(0, [(2, 5), (12, 5)], 0.15).flash(0, (2, 5), (0.6, 0.6)).flash(0, (12, 5), (0.5, 0.5))
    board.region(0, shapely.Polygon([(2.2, 5.28), (3.2, 5.06), (3.2, 4.94), (2.2, 4.72)]))
    walk = (board if merged is None else board.as_regions({0}, merged)).walk([(2, 5, 0), (12, 5, 0)], GROUND)
    (run,) = walk.runs
    assert walk.branches == ()
    assert np.allclose(run.stations.width[trace(run)], 0.15, atol=0.002)
    # the teardrop's sides pass the trace's edge where 0.28 - 0.22 (x - 2.2) = 0.075, that is 1.13 mm from the pad's centre
    first = spans(run, trace(run))[0]
    assert 1.05 < first[0] < 1.21


@pytest.mark.parametrize("merged", [None, False, True])
def test_a_branch_is_measured_from_the_edge_of_the_path(merged: bool | None) -> None:
    board = with_plane().stroke(0, [(2, 5), (12, 5)], 0.15).stroke(0, [(6, 5), (6, 8)], 0.12)
    board.flash(0, (2, 5), (0.5, 0.5)).flash(0, (12, 5), (0.5, 0.5))
    walk = (board if merged is None else board.as_regions({0}, merged)).walk([(2, 5, 0), (12, 5, 0)], GROUND)
    (branch,) = walk.branches
    assert branch.along == pytest.approx(4.0, abs=1e-3)
    assert branch.at == pytest.approx((6.0, 5.0), abs=1e-3)
    assert branch.tip == pytest.approx((6.0, 8.06), abs=1e-3)
    assert branch.length == pytest.approx(3 + 0.06 - 0.075, abs=3e-3)
    assert branch.pin == ""
    for run in walk.runs:
        assert np.allclose(run.stations.width[trace(run)], 0.15, atol=1e-6)
    assert [spans(run, run.stations.zone == Zone.JUNCTION)[0] for run in walk.runs] == [
        pytest.approx((4 - 0.08, 4), abs=3e-3),
        pytest.approx((4, 4 + 0.08), abs=3e-3),
    ]


def test_a_tee_to_a_pin_that_is_no_end_is_a_branch_with_its_pin() -> None:
    board = with_plane().stroke(0, [(2, 5), (12, 5)], 0.15).stroke(0, [(6, 5), (6, 8)], 0.12)
    board.flash(0, (2, 5), (0.5, 0.5)).flash(0, (12, 5), (0.5, 0.5)).flash(0, (6, 8), (0.4, 0.4))
    walk = board.walk([(2, 5, 0), (12, 5, 0)], GROUND, pins=[("U7", 6, 8, 0)])
    (branch,) = walk.branches
    assert branch.pin == "U7.1"
    tree = board.walk([(2, 5, 0), (12, 5, 0), (6, 8, 0)], GROUND)
    assert tree.branches == ()
    assert tree.length == pytest.approx(13.0)
    assert sorted(run.along for run in tree.runs) == [pytest.approx((0, 4)), pytest.approx((4, 7)), pytest.approx((4, 10))]


def test_strokes_that_overlap_repeat_or_join_in_mid_draw() -> None:
    board = with_plane().stroke(0, [(2, 5), (7, 5)], 0.15).stroke(0, [(5, 5), (12, 5)], 0.15).stroke(0, [(12, 5), (2, 5)], 0.15)
    board.flash(0, (2, 5), (0.5, 0.5)).flash(0, (12, 5), (0.5, 0.5))
    walk = board.walk([(2, 5, 0), (12, 5, 0)], GROUND)
    assert walk.length == pytest.approx(10.0)
    assert walk.branches == ()
    assert np.allclose(walk.runs[0].stations.width[trace(walk.runs[0])], 0.15)


def test_copper_that_overlaps_without_a_common_point() -> None:
    board = with_plane().stroke(0, [(2, 5), (7, 5)], 0.2).stroke(0, [(6.9, 5.05), (12, 5.05)], 0.2)
    board.flash(0, (2, 5), (0.5, 0.5)).flash(0, (12, 5), (0.5, 0.5))
    walk = board.walk([(2, 5, 0), (12, 5, 0)], GROUND)
    assert walk.status == "walked"
    assert walk.length == pytest.approx(10.1, abs=0.02)  # two steps of 0.05 mm across


def test_ends_that_overshoot_or_stop_short_of_the_pad_centre() -> None:
    board = with_plane().stroke(0, [(2.15, 5), (12.2, 5)], 0.15).flash(0, (2, 5), (0.5, 0.5)).flash(0, (12, 5), (0.6, 0.6))
    walk = board.walk([(2, 5, 0), (12, 5, 0)], GROUND)
    assert walk.length == pytest.approx(10.0)
    assert walk.branches == ()


def test_serpentine_legs_stay_apart() -> None:
    points = [(2, 5), (5, 5), (5, 8), (5.4, 8), (5.4, 5), (5.8, 5), (5.8, 8), (9, 8)]
    board = with_plane().stroke(0, points, 0.15).flash(0, (2, 5), (0.5, 0.5)).flash(0, (9, 8), (0.5, 0.5))
    (run,) = board.walk([(2, 5, 0), (9, 8, 0)], GROUND).runs
    cuts = run.stations.cuts[0]
    i = int(np.searchsorted(run.stations.begin, 4.0))
    entries = slice(cuts.first[i], cuts.first[i + 1])
    assert len(set(cuts.label[entries].tolist())) == 1
    assert np.allclose(cuts.low[entries], [-0.875, -0.475, -0.075])
    assert np.allclose(run.stations.width[trace(run)], 0.15)


def test_arcs_have_their_own_length() -> None:
    board = with_plane().stroke(0, [(2, 5), (5, 5)], 0.15).arc(0, (5, 5), (5, 7), np.pi / 2, 0.15).stroke(0, [(7, 7), (7, 12)], 0.15)
    board.flash(0, (2, 5), (0.5, 0.5)).flash(0, (7, 12), (0.5, 0.5))
    for drawn in (board, board.as_regions({0}, merged=True)):
        walk = drawn.walk([(2, 5, 0), (7, 12, 0)], GROUND)
        assert walk.length == pytest.approx(8 + np.pi, abs=2e-3)
        (run,) = walk.runs
        assert not (run.stations.zone == Zone.BEND).any()
        assert np.allclose(run.stations.width[trace(run)], 0.15, rtol=2e-3)


def test_a_part_on_the_way_is_bridged() -> None:
    board = with_plane().stroke(0, [(2, 5), (5, 5)], 0.15).stroke(0, [(6, 5), (12, 5)], 0.15)
    for x in (2, 5, 6, 12):
        board.flash(0, (x, 5), (0.4, 0.5))
    walk = board.walk([(2, 5, 0), (12, 5, 0)], GROUND, joins=[("C1", (5, 5, 0), (6, 5, 0))])
    assert walk.status == "walked"
    (bridge,) = walk.bridges
    assert (bridge.component, bridge.along) == ("C1", pytest.approx((3.0, 4.0)))
    assert [run.along for run in walk.runs] == [pytest.approx((0, 3)), pytest.approx((4, 10))]


def test_an_open_says_which_end_is_missing() -> None:
    board = with_plane().stroke(0, [(2, 5), (5, 5)], 0.15).stroke(0, [(6, 5), (12, 5)], 0.15)
    walk = board.walk([(2, 5, 0), (12, 5, 0), (5, 5, 0)], GROUND)
    assert (walk.status, walk.reason) == ("open", "no copper joins U1.1 to U2.1")
    assert walk.length == pytest.approx(3.0)
    assert [str(end) for end in walk.ends] == ["U3.1"]


def test_a_net_without_two_ends_or_without_a_centreline_is_unresolved() -> None:
    board = with_plane().stroke(0, [(2, 5), (5, 5)], 0.15)
    walk = board.walk([(2, 5, 0)], GROUND)
    assert (walk.status, walk.reason) == ("unresolved", "the files name no two ends for this net; declare `from` and `to`")
    pour = with_plane().region(0, shapely.box(2, 2, 12, 12))
    walk = pour.walk([(3, 3, 0), (11, 11, 0)], GROUND)
    assert walk.status == "unresolved"
    assert "no centreline" in walk.reason


def test_a_pour_painted_with_strokes_is_no_path() -> None:
    board = with_plane().stroke(0, [(2, 5), (12, 5)], 0.15).flash(0, (2, 5), (0.5, 0.5)).flash(0, (12, 5), (0.5, 0.5))
    for k in range(30):
        board.stroke(0, [(6, 6 + 0.15 * k), (9, 6 + 0.15 * k)], 0.2)
    board.stroke(0, [(7, 5), (7, 6)], 0.15)
    walk = board.walk([(2, 5, 0), (12, 5, 0)], GROUND)
    assert walk.length == pytest.approx(10.0)
    assert len(walk.branches) == 1
    assert walk.branches[0].length < 1.2


def test_the_split_between_two_planes_shows() -> None:
    board = Drawing(2).region(1, shapely.box(0, 0, 6.95, 30)).region(1, shapely.box(7.05, 0, 30, 30))
    board.stroke(0, [(2, 5), (12, 5)], 0.15).flash(0, (2, 5), (0.5, 0.5)).flash(0, (12, 5), (0.5, 0.5))
    (run,) = board.walk([(2, 5, 0), (12, 5, 0)], [(0.1, 0.1, 1), (29, 29, 1)]).runs
    assert spans(run, run.stations.coverage_below < 1) == [pytest.approx((4.95, 5.05), abs=1e-4)]
    cuts = run.stations.cuts[1]
    labels = [set(cuts.label[cuts.first[i] : cuts.first[i + 1]].tolist()) for i in range(len(run.stations))]
    assert len(labels[0]) == len(labels[-1]) == 1
    assert labels[0] != labels[-1]


def test_planes_behind_an_opening_are_cut_too() -> None:
    board = with_plane(3, 1, shapely.box(5, 4, 6, 6)).region(2, shapely.box(0, 0, 30, 30))
    board.stroke(0, [(2, 5), (12, 5)], 0.15).flash(0, (2, 5), (0.5, 0.5)).flash(0, (12, 5), (0.5, 0.5))
    (run,) = board.walk([(2, 5, 0), (12, 5, 0)], [(0.1, 0.1, 1), (0.1, 0.1, 2)]).runs
    assert (run.stations.below == 1).all()
    behind = run.stations.cuts[2]
    opened = run.stations.coverage_below < 1
    assert (np.diff(behind.first)[opened] > 0).all()


def test_a_trace_between_planes_refers_to_both_and_a_signal_layer_between_is_none() -> None:
    board = Drawing(4).region(0, shapely.box(0, 0, 30, 30)).region(3, shapely.box(0, 0, 30, 30)).stroke(2, [(5, 0), (5, 20)], 3.0)
    board.stroke(1, [(2, 5), (12, 5)], 0.12).flash(1, (2, 5), (0.3, 0.3)).flash(1, (12, 5), (0.3, 0.3))
    (run,) = board.walk([(2, 5, 1), (12, 5, 1)], [(0.1, 0.1, 0), (0.1, 0.1, 3)]).runs
    assert (run.stations.above == 0).all()
    assert (run.stations.below == 3).all()
    assert {0, 1, 2, 3} <= set(run.stations.cuts)


@settings(max_examples=25, deadline=None)
@given(
    st.lists(st.tuples(st.floats(0.5, 3.0), st.sampled_from([-90, -45, -30, 0, 30, 45, 90])), min_size=1, max_size=6),
    st.floats(0.1, 0.25),
    st.floats(0, 360),
    st.booleans(),
    st.sampled_from(["strokes", "regions", "merged"]),
)
def test_random_traces_keep_length_width_and_slot(
    steps: list[tuple[float, int]], width: float, turn: float, mirror: bool, style: str
) -> None:
    points, heading = [(0.0, 0.0), (3.0, 0.0)], 0.0
    for size, bend in steps:
        heading = max(-90.0, min(90.0, heading + bend))
        last = points[-1]
        points.append((last[0] + size * np.cos(np.radians(heading)) + 0.3, last[1] + size * np.sin(np.radians(heading))))
    line = shapely.LineString(points)
    board = Drawing(2).region(1, shapely.box(-30, -30, 60, 60) - shapely.box(1.0, -3, 1.4, 3))
    board.stroke(0, points, width).flash(0, points[0], (0.4, 0.4)).flash(0, points[-1], (0.4, 0.4))
    if style != "strokes":
        board = board.as_regions({0}, merged=style == "merged")
    ends = [(*board.place(p, turn, mirror), 0) for p in (points[0], points[-1])]
    walk = board.moved(turn, mirror).walk(ends, [(*board.place((-29, -29), turn, mirror), 1)])
    assert walk.status == "walked"
    assert walk.length == pytest.approx(line.length, abs=5e-3)
    check_pieces(walk)
    (run,) = walk.runs
    assert np.allclose(run.stations.width[trace(run)], width, rtol=2e-3)
    assert spans(run, run.stations.coverage_below < 1) == [pytest.approx((1.0, 1.4), abs=5e-3)]


def test_a_pad_on_the_way_ends_a_run_and_is_no_width() -> None:
    board = with_plane().stroke(0, [(2, 5), (12, 5)], 0.15)
    for x in (2, 7, 12):
        board.flash(0, (x, 5), (0.5, 0.5))
    walk = board.walk([(2, 5, 0), (12, 5, 0)], GROUND)
    assert [run.along for run in walk.runs] == [pytest.approx((0, 5)), pytest.approx((5, 10))]
    for run in walk.runs:
        assert np.allclose(run.stations.width[trace(run)], 0.15)
    assert spans(walk.runs[0], walk.runs[0].stations.zone == Zone.PAD)[-1] == pytest.approx((4.75, 5.0))


@pytest.mark.parametrize("one", [False, True])
def test_pads_drawn_as_regions(one: bool) -> None:
    shapes = [shapely.LineString([(2, 5), (12, 5)]).buffer(0.075), shapely.box(1.75, 4.75, 2.25, 5.25), shapely.box(11.7, 4.6, 12.3, 5.4)]
    board = with_plane()
    for shape in [shapely.union_all(shapes)] if one else shapes:
        board.region(0, shape)
    walk = board.walk([(2, 5, 0), (12, 5, 0)], GROUND)
    assert walk.length == pytest.approx(10.0, abs=0.01)
    assert walk.branches == ()
    (run,) = walk.runs
    assert spans(run, trace(run)) == [pytest.approx((0.25, 9.7), abs=5e-3)]
    assert np.allclose(run.stations.width[trace(run)], 0.15, atol=1e-6)


def test_places_on_a_trace_begin_and_end_the_walk() -> None:
    walk = with_plane().stroke(0, [(2, 5), (12, 5)], 0.15).walk([(3, 5.03, 0), (11, 5, 0)], GROUND)
    assert walk.length == pytest.approx(8.0)
    assert [branch.length for branch in walk.branches] == [pytest.approx(1.0, abs=1e-6), pytest.approx(1.0, abs=1e-6)]


def test_a_branch_through_a_via_counts_on_the_other_layer() -> None:
    board = with_plane(4, 1, shapely.Point(7, 5).buffer(0.4)).stroke(0, [(2, 5), (12, 5)], 0.15)
    board.flash(0, (2, 5), (0.5, 0.5)).flash(0, (12, 5), (0.5, 0.5))
    board.via((7, 5), 0.2, 0.45).stroke(3, [(7, 5), (7, 8)], 0.15)
    walk = board.walk([(2, 5, 0), (12, 5, 0)], GROUND)
    assert walk.vias == ()
    (branch,) = walk.branches
    assert (branch.layer, branch.at) == (3, (7.0, 5.0))
    assert branch.tip == pytest.approx((7.0, 8.075), abs=1e-6)


def test_fly_by_pads_lie_on_one_path() -> None:
    board = with_plane().stroke(0, [(2, 5), (5, 5), (5, 6)], 0.15).stroke(0, [(5, 6), (8, 6), (12, 5)], 0.15)
    for at in ((2, 5), (5, 6), (12, 5)):
        board.flash(0, at, (0.4, 0.4))
    walk = board.walk([(2, 5, 0), (5, 6, 0), (12, 5, 0)], GROUND)
    assert [str(end) for end in walk.ends] == ["U2.1", "U3.1"]
    assert [run.along for run in walk.runs] == [pytest.approx((0, 4)), pytest.approx((4, 7 + 17**0.5))]
    assert walk.branches == ()


def test_a_wide_trace_painted_with_two_strokes_has_one_centreline() -> None:
    board = with_plane().stroke(0, [(2, 4.95), (12, 4.95)], 0.2).stroke(0, [(2, 5.05), (12, 5.05)], 0.2)
    board.flash(0, (2, 5), (0.5, 0.5)).flash(0, (12, 5), (0.5, 0.5))
    walk = board.walk([(2, 5, 0), (12, 5, 0)], GROUND)
    (run,) = walk.runs
    assert walk.branches == ()
    assert walk.length == pytest.approx(10.0, abs=2e-3)
    assert np.allclose(run.stations.width[trace(run)], 0.3, atol=1e-6)
    assert np.allclose(run.stations.centre[trace(run)], 0.0, atol=2e-3)


def test_the_order_of_drawing_changes_nothing() -> None:
    board = neck(with_plane()).stroke(0, [(8, 5), (8, 7)], 0.12)
    first = board.walk([(2, 5, 0), (12, 5, 0)], GROUND)
    for seed in range(3):
        order = np.random.default_rng(seed).permutation(len(board.items)).tolist()
        other = board.moved(order=order).walk([(2, 5, 0), (12, 5, 0)], GROUND)
        assert other.branches == first.branches
        for a, b in zip(first.runs, other.runs, strict=True):
            assert np.allclose(a.line, b.line, atol=1e-9)
            assert np.allclose(a.stations.begin, b.stations.begin, atol=1e-9)
            assert np.allclose(a.stations.width, b.stations.width, atol=1e-9)
