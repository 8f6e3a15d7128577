"""Distances to copper against shapely's own (a general library as second opinion)."""

import numpy as np
import shapely

from impcheck.path.edges import LayerEdges
from tests.path.board_builder import Drawing


def test_distance_agrees_with_shapely() -> None:
    rng = np.random.default_rng(11)
    board = Drawing(1)
    for _ in range(25):
        board.stroke(0, [tuple(p) for p in rng.uniform(0, 10, (2, 2))], float(rng.uniform(0.1, 0.4)))
    holes = shapely.union_all([shapely.Point(*rng.uniform(0, 10, 2)).buffer(rng.uniform(0.2, 0.8)) for _ in range(20)])
    layer = board.region(0, shapely.box(2, 2, 8, 8) - holes).copper().layers[0]
    labels = rng.integers(0, 3, len(layer.shape)).astype(np.int32)
    edges = LayerEdges(layer, labels, shapely.STRtree([shapely.box(-1, -1, 11, 11)]))
    points = rng.uniform(-1, 11, (200, 2))
    wanted = np.array([True, False, True, False])
    truth = shapely.distance(shapely.points(points), shapely.union_all(layer.shape[wanted[labels]]))
    assert np.allclose(edges.distance(points, wanted, 0.7), np.minimum(truth, 0.7), atol=1e-9)
    assert (truth == 0).any() and (truth > 0.7).any()
    assert np.array_equal(edges.distance(points[:5], np.zeros(4, np.bool_), 0.7), np.full(5, 0.7))
