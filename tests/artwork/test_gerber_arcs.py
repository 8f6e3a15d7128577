"""Arcs (G02, G03, G74, G75). Centres and sweeps are exact geometry; the single-feature cases follow the specification's definition."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from impcheck.artwork.gerber import read_gerber
from impcheck.artwork.gerber.arcs import arcs
from impcheck.artwork.image import Image, Kind
from impcheck.errors import InputError, RemarkKind

HEAD = "%FSLAX36Y36*%%MOMM*%%ADD10C,0.1*%D10*"


def read(body: str) -> Image:
    return read_gerber((HEAD + body + "M02*").encode(), "tide.gbr")


def test_quarter_turns_in_both_directions() -> None:
    image = read("G75*X1000000Y0D02*G03*X0Y1000000I-1000000J0D01*G02*X1000000Y0I0J-1000000D01*")
    assert image.kind.tolist() == [Kind.ARC, Kind.ARC]
    np.testing.assert_allclose(image.sweep, [np.pi / 2, -np.pi / 2], atol=1e-12)
    np.testing.assert_allclose(image.centre, 0, atol=1e-12)


def test_three_quarters() -> None:
    image = read("G75*X1000000Y0D02*G02*X0Y1000000I-1000000J0D01*")
    np.testing.assert_allclose(image.sweep, [-1.5 * np.pi], atol=1e-12)


@pytest.mark.parametrize(("code", "sign"), [("G02", -1), ("G03", 1)])
def test_end_on_start_is_a_full_circle_with_g75(code: str, sign: int) -> None:
    image = read(f"G75*X1000000Y0D02*{code}X1000000Y0I-1000000D01*")
    np.testing.assert_allclose(image.sweep, [sign * 2 * np.pi])
    assert image.centre.tolist() == [[0, 0]]


def test_end_on_start_is_a_dot_with_g74() -> None:
    image = read("G74*X1000000Y0D02*G03X1000000Y0I1000000J0D01*")
    assert image.kind.tolist() == [Kind.DRAW]
    assert image.start.tolist() == image.end.tolist() == [[1, 0]]


@pytest.mark.parametrize("angle", [0, 60, 100, 190, 275, 330])
@pytest.mark.parametrize("code", ["G02", "G03"])
def test_single_quadrant_offsets_have_no_sign(angle: int, code: str) -> None:
    # An arc of 25 degrees about (2, 3) with radius 5; the signs of I and J must be found.
    turn = 25 if code == "G03" else -25
    points = 5 * np.array([[np.cos(np.radians(a)), np.sin(np.radians(a))] for a in (angle, angle + turn)]) + (2, 3)
    (x0, y0), (x1, y1) = np.round(points * 1e6).astype(int)
    i, j = abs(2_000_000 - x0), abs(3_000_000 - y0)
    image = read(f"G74*X{x0}Y{y0}D02*{code}X{x1}Y{y1}I{i}J{j}D01*")
    np.testing.assert_allclose(image.centre, [[2, 3]], atol=1e-5)
    np.testing.assert_allclose(np.degrees(image.sweep), [turn], atol=1e-4)


def test_ends_are_kept_and_the_centre_is_moved_where_radii_differ() -> None:
    # Start 5.000 and end 5.002 from the given centre: the chord's bisector holds the new centre.
    image = read("G75*X5000000Y0D02*G03X0Y5002000I-5000000J0D01*")
    start, end, centre = image.start[0], image.end[0], image.centre[0]
    assert end.tolist() == [0, 5.002]
    assert np.hypot(*(start - centre)) == pytest.approx(np.hypot(*(end - centre)), abs=1e-12)
    assert np.hypot(*centre) < 0.002
    assert image.remarks == ()  # within 1 % and a few steps: rounding


def test_clearly_different_radii_are_remarked() -> None:
    image = read("G75*X5000000Y0D02*G03X0Y5200000I-5000000J0D01*")
    assert [remark.kind for remark in image.remarks] == [RemarkKind.ODD]
    assert "two radii differ" in image.remarks[0].text


def test_an_arc_whose_centre_cannot_be_meant_is_refused() -> None:
    with pytest.raises(InputError, match="quite different distances"):
        read("G75*X5000000Y0D02*G03X0Y20000000I-5000000J0D01*")


def test_no_quarter_turn_fits_in_g74() -> None:
    with pytest.raises(InputError, match="no centre gives an arc of at most a quarter turn"):
        read("G74*X5000000Y0D02*G03X-5000000Y0I5000000J0D01*")


def test_an_arc_without_offsets_is_straight() -> None:
    image = read("G75*X0Y0D02*G03X1000000Y0D01*")
    assert image.kind.tolist() == [Kind.DRAW]
    assert "drawn straight" in image.remarks[0].text


def test_g01_ignores_offsets() -> None:
    image = read("X0Y0D02*G01X1000000Y0I5J5D01*")
    assert image.kind.tolist() == [Kind.DRAW]
    assert np.isnan(image.centre).all()


def test_a_file_that_does_not_say_its_quadrant_mode() -> None:
    # I without sign although the centre lies on the left: only the single-quadrant reading fits.
    image = read("X1000000Y0D02*G03X0Y1000000I1000000J0D01*X1000000Y0D02*X0Y-1000000I-1000000J0D01*")
    np.testing.assert_allclose(image.centre, 0, atol=1e-12)
    np.testing.assert_allclose(image.sweep, [np.pi / 2, 1.5 * np.pi], atol=1e-12)
    assert [remark.kind for remark in image.remarks] == [RemarkKind.GUESS]


def test_offsets_are_not_modal() -> None:
    image = read("G75*X0Y0D02*G03X2000000Y0I1000000J0D01*X2000000Y2000000J1000000D01*")
    np.testing.assert_allclose(image.centre, [[1, 0], [2, 1]], atol=1e-12)


@settings(max_examples=100, deadline=None)
@given(
    st.floats(0.05, 100),
    st.floats(0, 2 * np.pi),
    st.floats(0.01, 6.2),
    st.booleans(),
    st.tuples(st.floats(-200, 200), st.floats(-200, 200)),
)
def test_any_arc_comes_back(radius: float, angle: float, turn: float, clockwise: bool, middle: tuple[float, float]) -> None:
    turn = -turn if clockwise else turn
    at = np.array([[np.cos(a), np.sin(a)] for a in (angle, angle + turn)]) * radius + middle
    found = arcs(at[:1], at[1:], np.array([middle]) - at[:1], np.array([clockwise]), np.array([False]))
    np.testing.assert_allclose(found.centre, [middle], atol=1e-7)
    np.testing.assert_allclose(found.sweep, [turn], atol=1e-7)
    if abs(turn) < np.pi / 2:
        single = arcs(at[:1], at[1:], np.abs(np.array([middle]) - at[:1]), np.array([clockwise]), np.array([True]))
        assert np.abs(single.sweep[0]) <= np.pi / 2 + 0.05
        np.testing.assert_allclose(np.hypot(*(single.centre - at[0]).T), np.hypot(*(single.centre - at[1]).T), atol=1e-9)
