"""Cuts against shapely's intersection of the same line with the same copper (a general library as second opinion)."""

import numpy as np
import shapely

from impcheck.path.cuts import coverage, cut
from impcheck.path.edges import LayerEdges, Windows
from tests.path.board_builder import Drawing


def _random_layer(rng: np.random.Generator) -> Drawing:
    board = Drawing(1)
    for _ in range(30):
        a, b = rng.uniform(0, 10, (2, 2))
        board.stroke(0, [tuple(a), tuple(b)], float(rng.uniform(0.1, 0.5)))
    for _ in range(20):
        board.disc(0, tuple(rng.uniform(0, 10, 2)), float(rng.uniform(0.2, 1.5)))
    holes = shapely.union_all([shapely.Point(*rng.uniform(0, 10, 2)).buffer(rng.uniform(0.1, 0.8)) for _ in range(25)])
    return board.region(0, shapely.box(0, 0, 10, 6) - holes)


def test_cuts_agree_with_shapely() -> None:
    rng = np.random.default_rng(5)
    layer = _random_layer(rng).copper().layers[0]
    labels = rng.integers(0, 4, len(layer.shape)).astype(np.int32)
    count = 60
    angle = rng.uniform(0, 2 * np.pi, count)
    windows = Windows(
        rng.uniform(1, 9, (count, 2)), np.stack([np.cos(angle), np.sin(angle)], axis=1), rng.uniform(0.2, 1.0, count), np.full(count, 1.3)
    )
    edges = LayerEdges(layer, labels, shapely.STRtree(windows.boxes(0.01)))
    window = np.repeat(np.arange(count), 5)
    s = np.sort(rng.uniform(0, 1, (count, 5)), axis=1).ravel() * windows.length[window]
    found = cut(edges, edges.local(windows), windows, window, s, reach=np.full(len(s), 1.3))
    normal = np.stack([-windows.heading[:, 1], windows.heading[:, 0]], axis=1)
    low_window, high_window = np.full(len(s), -0.4), np.full(len(s), 0.7)
    wanted = np.array([True, False, True, False])
    share = coverage(found, low_window, high_window, wanted, np.ones(len(s), dtype=np.bool_))
    by_label = [shapely.union_all(layer.shape[labels == k]) for k in range(4)]
    for i in range(len(s)):
        place = windows.origin[window[i]] + s[i] * windows.heading[window[i]]
        at = normal[window[i]]
        line = shapely.LineString([place - 1.3 * at, place + 1.3 * at])
        entries = slice(found.first[i], found.first[i + 1])
        for k in range(4):
            parts = [p for p in shapely.get_parts(shapely.intersection(line, by_label[k])) if p.length > 1e-9]
            truth = sorted(
                tuple(sorted(((shapely.get_coordinates(p) - place) @ at).tolist()))[:: len(shapely.get_coordinates(p)) - 1] for p in parts
            )
            mine = found.label[entries] == k
            got = list(zip(found.low[entries][mine].tolist(), found.high[entries][mine].tolist(), strict=True))
            assert np.allclose(np.array(got).reshape(-1, 2), np.array(truth).reshape(-1, 2), atol=1e-9)
        part = shapely.LineString([place + low_window[i] * at, place + high_window[i] * at])
        truth_share = shapely.intersection(part, shapely.union_all([by_label[0], by_label[2]])).length / part.length
        assert abs(share[i] - truth_share) < 1e-9


def test_hairline_slits_of_a_plane_are_closed() -> None:
    board = Drawing(1).region(0, shapely.box(0, 0, 10, 0.5)).region(0, shapely.box(0, 0.51, 10, 3)).region(0, shapely.box(0, 3.02, 10, 5))
    layer = board.copper().layers[0]
    windows = Windows(np.array([[5.0, 1.0]]), np.array([[1.0, 0.0]]), np.array([0.5]), np.array([4.0]))
    edges = LayerEdges(layer, np.zeros(3, dtype=np.int32), shapely.STRtree(windows.boxes(0.01)))
    found = cut(edges, edges.local(windows), windows, np.array([0]), np.array([0.2]), reach=np.array([4.0]), hairline=0.015)
    assert np.allclose(found.low, [-1.0, 2.02])
    assert np.allclose(found.high, [2.0, 4.0])


def test_windows_found_wholly_covered_give_the_exact_cut() -> None:
    """A narrow window deep inside a plane meets no edge and is found covered; a wide one at the same place cuts the plane's edges."""
    hole = shapely.Point(9, 5).buffer(0.3)
    layer = Drawing(1).region(0, shapely.box(0, 0, 10, 10) - hole).copper().layers[0]
    narrow = Windows(np.array([[4.0, 5.0], [6.0, 3.0]]), np.array([[1.0, 0.0], [0.0, -1.0]]), np.full(2, 0.5), np.full(2, 1.0))
    wide = Windows(narrow.origin, narrow.heading, narrow.length, np.full(2, 12.0))
    edges = LayerEdges(layer, np.array([3], dtype=np.int32), shapely.STRtree(wide.boxes(0.01)))
    window, s = np.array([0, 0, 1, 1]), np.array([0.0, 0.3, 0.1, 0.5])
    covered = edges.local(narrow)
    assert covered.solid_window.tolist() == [0, 1] and len(covered.window) == 0
    found = cut(edges, covered, narrow, window, s, reach=np.full(4, 1.0))
    exact = cut(edges, edges.local(wide), wide, window, s, reach=np.full(4, 12.0))
    assert found.label.tolist() == exact.label[exact.first[:-1]].tolist() == [3, 3, 3, 3]
    middle = [
        np.flatnonzero((exact.low[a:b] < 0) & (exact.high[a:b] > 0))[0] + a for a, b in zip(exact.first, exact.first[1:], strict=False)
    ]
    assert np.array_equal(found.low, np.maximum(exact.low[middle], -1.0))
    assert np.array_equal(found.high, np.minimum(exact.high[middle], 1.0))
    assert np.array_equal(found.low, np.full(4, -1.0)) and np.array_equal(found.high, np.full(4, 1.0))


def test_pieces_that_touch_are_one_interval() -> None:
    board = Drawing(1).region(0, shapely.box(0, 0, 2, 1.1)).region(0, shapely.box(0, 1.1, 2, 1.7)).region(0, shapely.box(0, 1.7, 2, 3))
    layer = board.copper().layers[0]
    windows = Windows(np.array([[0.5, 1.3]]), np.array([[1.0, 0.0]]), np.array([1.0]), np.array([1.0]))
    edges = LayerEdges(layer, np.zeros(3, dtype=np.int32), shapely.STRtree(windows.boxes(0.01)))
    found = cut(edges, edges.local(windows), windows, np.zeros(3, np.int64), np.array([0.1, 0.5, 0.9]), reach=np.full(3, 1.0))
    assert found.first.tolist() == [0, 1, 2, 3]
    assert np.array_equal(found.low, np.full(3, -1.0)) and np.array_equal(found.high, np.full(3, 1.0))


def test_many_labels_leave_room_for_the_order() -> None:
    """The whole number that orders crossings holds fewer bits of t the more cuts and labels there are; the intervals stay exact."""
    count = 3000
    x = np.arange(count) * 0.001
    layer = Drawing(1)
    for k in range(40):
        layer.region(0, shapely.box(0, 0.05 * k, 1, 0.05 * k + 0.03))
    copper = layer.copper().layers[0]
    windows = Windows(np.array([[0.0, 1.0]]), np.array([[1.0, 0.0]]), np.array([1.0]), np.array([1.5]))
    edges = LayerEdges(copper, np.arange(40, dtype=np.int32), shapely.STRtree(windows.boxes(0.01)))
    s = np.sort(x[x < 0.99] + 0.0005)
    found = cut(edges, edges.local(windows), windows, np.zeros(len(s), np.int64), s, reach=np.full(len(s), 1.5))
    assert np.allclose(found.low.reshape(len(s), 40), 0.05 * np.arange(40) - 1.0, atol=1e-12)
    assert np.allclose(found.high.reshape(len(s), 40), 0.05 * np.arange(40) - 0.97, atol=1e-12)
    assert (found.label.reshape(len(s), 40) == np.arange(40)).all()
