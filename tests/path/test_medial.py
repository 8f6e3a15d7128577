"""The centreline of polygons whose centreline is known because they were drawn from it (exact)."""

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st

from impcheck.path.medial import medial_axis


def _length(start: np.ndarray, end: np.ndarray) -> float:
    return float(np.hypot(*(end - start).T).sum())


@pytest.mark.parametrize("turn", [0.0, 17.3, 45.0, 90.0])
@pytest.mark.parametrize("style", [{"quad_segs": 16}, {"join_style": "mitre", "cap_style": "flat"}])
def test_bent_line_is_found_between_its_corners(turn: float, style: dict[str, object]) -> None:
    drawn = shapely.affinity.rotate(shapely.LineString([(0, 0), (5, 0), (7, 2), (7, 6)]), turn, origin=(0, 0))
    start, end, width = medial_axis(drawn.buffer(0.075, **style))
    assert len(start) == 3
    axis = shapely.multilinestrings(np.stack([start, end], axis=1))
    # every point of the axis lies on the drawn line; both ends stop short by less than a width (exact up to the grid of 0.1 um)
    assert max(drawn.distance(shapely.Point(p)) for p in np.concatenate([start, end])) < 1e-4
    assert drawn.length - 0.3 < axis.length < drawn.length
    assert np.allclose(width, 0.15, atol=1e-4)


def test_tee_meets_on_the_straight_line() -> None:
    shape = shapely.union_all([shapely.LineString([(0, 0), (6, 0)]).buffer(0.1), shapely.LineString([(2, 0), (2, 3)]).buffer(0.06)])
    start, end, _ = medial_axis(shape)
    points = np.concatenate([start, end])
    assert np.count_nonzero(np.hypot(points[:, 0] - 2, points[:, 1]) < 1e-4) == 3
    assert _length(start, end) == pytest.approx(9.0, abs=0.2)


def test_curve_has_the_length_of_its_arc() -> None:
    angle = np.linspace(0, np.pi / 2, 60)
    arc = shapely.LineString(np.stack([2 * np.cos(angle), 2 * np.sin(angle)], axis=1))
    start, end, _ = medial_axis(arc.buffer(0.075, cap_style="flat", quad_segs=16))
    radius = np.hypot(*np.concatenate([start, end]).T)
    assert np.abs(radius - 2).max() < 2e-3
    # exact: the flat ends stop half a width inside, within the sampling step
    assert _length(start, end) == pytest.approx(np.pi - 0.15, abs=0.05)


def test_a_disc_has_no_centreline() -> None:
    assert len(medial_axis(shapely.Point(0, 0).buffer(0.5))[0]) == 0


@settings(max_examples=40, deadline=None)
@given(st.floats(0.5, 20.0), st.floats(0.06, 0.4), st.floats(0.0, 180.0))
def test_straight_strokes(length: float, width: float, turn: float) -> None:
    line = shapely.affinity.rotate(shapely.LineString([(0, 0), (max(length, 3 * width), 0)]), turn, origin=(0, 0))
    start, end, found = medial_axis(line.buffer(width / 2, quad_segs=8))
    assert max(line.distance(shapely.Point(p)) for p in np.concatenate([start, end])) < 1e-4
    assert np.abs(found - width).max() < 1e-4
