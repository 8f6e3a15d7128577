"""Dark and clear in order against sequential union and difference by shapely (exact), with what the grouped method could get wrong."""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st

from impcheck.copper.polarity import apply_polarity


def apply(*steps):
    shape = np.array([shape for _, shape in steps], object)
    dark = np.array([polarity == "dark" for polarity, _ in steps])
    return apply_polarity(shape, np.arange(len(steps), dtype=np.int32), dark)


def square(x, y, size=1.0):
    return shapely.box(x, y, x + size, y + size)


def test_clear_shapes_that_meet_in_corners_set_the_copper_between_them_free():
    # exact: four unit squares around (1, 1)-(2, 2) touch each other in its corners
    ring = [("clear", square(x, y)) for x, y in ((1, 0), (0, 1), (2, 1), (1, 2))]
    pieces, owner, whole = apply(("dark", shapely.box(-5, -5, 10, 10)), *ring)
    assert sorted(shapely.area(pieces).tolist()) == [pytest.approx(1.0), pytest.approx(220.0)]
    assert shapely.is_valid(pieces).all()
    assert owner.tolist() == [0, 0]
    assert not whole.any()


def test_a_clear_ring_leaves_an_island():
    ring = shapely.box(2, 2, 8, 8).difference(shapely.box(4, 4, 6, 6))
    pieces, _, _ = apply(("dark", shapely.box(0, 0, 10, 10)), ("clear", ring))
    assert sorted(shapely.area(pieces).tolist()) == [pytest.approx(4.0), pytest.approx(64.0)]


def test_two_clear_halves_of_a_ring_leave_an_island():
    left = shapely.box(2, 2, 5, 8).difference(shapely.box(4, 4, 6, 6))
    right = shapely.box(5, 2, 8, 8).difference(shapely.box(4, 4, 6, 6))
    pieces, _, _ = apply(("dark", shapely.box(0, 0, 10, 10)), ("clear", left), ("clear", right))
    assert sorted(shapely.area(pieces).tolist()) == [pytest.approx(4.0), pytest.approx(64.0)]


def test_only_what_was_drawn_before_is_cleared():
    pieces, owner, whole = apply(("dark", square(0, 0, 4)), ("clear", square(1, 1, 2)), ("dark", square(1.5, 1.5, 1)))
    assert shapely.area(pieces).tolist() == [pytest.approx(12.0), pytest.approx(1.0)]
    assert owner.tolist() == [0, 2]
    assert whole.tolist() == [False, True]


def test_a_clear_shape_that_only_touches_takes_nothing():
    pieces, _, whole = apply(("dark", square(0, 0)), ("clear", square(1, 0)), ("clear", square(1, 1)))
    assert shapely.area(pieces).tolist() == [pytest.approx(1.0)]
    assert whole.tolist() == [True]


def test_what_is_covered_wholly_is_gone():
    pieces, _, _ = apply(("dark", square(1, 1)), ("clear", square(0, 0, 3)))
    assert len(pieces) == 0


def test_a_hole_that_stands_already_is_kept_when_another_is_cut():
    plate = shapely.box(0, 0, 10, 10).difference(square(1, 1, 2))
    pieces, _, _ = apply(("dark", plate), ("clear", square(5, 5, 2)))
    assert pieces[0].area == pytest.approx(100 - 4 - 4)
    assert len(pieces[0].interiors) == 2


SHAPES = st.one_of(
    st.builds(square, st.integers(0, 9), st.integers(0, 9), st.integers(1, 4)),
    st.builds(lambda x, y, r: shapely.Point(x, y).buffer(r / 4), st.integers(0, 9), st.integers(0, 9), st.integers(1, 12)),
    st.builds(lambda x, y: square(x, y, 4).difference(square(x + 1, y + 1, 2)), st.integers(0, 9), st.integers(0, 9)),
)


@settings(max_examples=150, deadline=None)
@given(st.lists(st.tuples(st.sampled_from(("dark", "clear", "clear")), SHAPES), min_size=2, max_size=24))
def test_against_one_step_after_the_other(steps):
    steps = [("dark", shapely.box(1, 1, 9, 9)), *steps]
    truth = shapely.Polygon()
    for polarity, shape in steps:
        truth = truth.union(shape) if polarity == "dark" else truth.difference(shape)
    pieces, owner, whole = apply(*steps)
    assert shapely.is_valid(pieces).all()
    assert (shapely.get_type_id(pieces) == shapely.GeometryType.POLYGON).all()
    assert shapely.union_all(pieces).symmetric_difference(truth).area == pytest.approx(0.0, abs=1e-7)
    for piece, index, untouched in zip(pieces, owner, whole, strict=True):
        assert steps[index][0] == "dark"
        assert piece.difference(steps[index][1]).area == pytest.approx(0.0, abs=1e-9)
        if untouched:
            assert piece.equals(steps[index][1])
