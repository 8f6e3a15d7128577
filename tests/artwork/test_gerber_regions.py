"""Regions (G36, G37). Areas are closed forms; the rules are those of the specification's section on regions."""

from __future__ import annotations

import numpy as np
import pytest

from impcheck.artwork.gerber import read_gerber
from impcheck.artwork.image import Contours, Image, Kind
from impcheck.errors import InputError

HEAD = "%FSLAX33Y33*%%MOMM*%%ADD10C,0.5*%D10*G01*G75*\n"


def read(body: str) -> Image:
    return read_gerber((HEAD + body + "M02*").encode(), "tide.gbr")


def signed_areas(contours: Contours) -> list[float]:
    """Area of each contour, straight part by the shoelace formula, arcs by their segments r^2 (a - sin a) / 2."""
    areas = []
    for k in range(len(contours.object)):
        mine = slice(contours.first[k], contours.first[k + 1])
        start, sweep, centre = contours.start[mine], contours.sweep[mine], contours.centre[mine]
        end = np.roll(start, -1, axis=0)
        radius = np.hypot(*(start - centre).T)
        segment = np.where(sweep != 0, radius**2 * (sweep - np.sin(sweep)) / 2, 0.0)
        areas.append(float(np.sum(start[:, 0] * end[:, 1] - end[:, 0] * start[:, 1]) / 2 + np.nansum(segment)))
    return areas


def test_a_square_keeps_its_corners_and_line() -> None:
    image = read("X1000Y1000D02*\nG36*\nX0Y0D02*X2000D01*Y2000D01*X0D01*Y0D01*\nG37*\nX5000Y0D03*")
    assert image.kind.tolist() == [Kind.REGION, Kind.FLASH]
    assert image.contours.start.tolist() == [[0, 0], [2, 0], [2, 2], [0, 2]]
    assert image.aperture.tolist() == [-1, 0]
    assert image.line.tolist() == [3, 6]
    assert image.start.tolist() == image.end.tolist() == [[0, 0], [5, 0]]
    assert image.remarks == ()


def test_areas_of_straight_and_round_contours() -> None:
    image = read(
        "G36*X0Y0D02*X2000D01*Y2000D01*X0D01*Y0D01*G37*"
        "G36*X3000Y0D02*G03X3000Y0I1000J0D01*G37*"  # a full circle of radius 1
        "G36*G01X0Y0D02*X1000D01*G03X0Y1000I-1000J0D01*G01Y0D01*G37*"  # a quarter disc
        "G36*X0Y0D02*X1000D01*G02X0Y1000I0J1000D01*G01Y0D01*G37*"  # the unit square less a quarter disc
    )
    # The last one: 1 - pi/4, exact.
    np.testing.assert_allclose(np.abs(signed_areas(image.contours)), [4, np.pi, np.pi / 4, 1 - np.pi / 4], atol=1e-9)


def test_several_contours_belong_to_one_region() -> None:
    image = read("G36*X0Y0D02*X1000D01*Y1000D01*X0Y0D01*X5000Y5000D02*X6000D01*Y6000D01*X5000Y5000D01*G37*")
    assert len(image) == 1
    assert image.contours.object.tolist() == [0, 0]
    assert image.contours.first.tolist() == [0, 3, 6]


def test_a_cut_in_keeps_both_of_its_coincident_segments() -> None:
    # A 10 x 10 square with a 2 x 2 hole joined by a cut-in from the left: area 96.
    image = read("G36*X0Y0D02*X10000D01*Y10000D01*X0D01*Y5000D01*X4000D01*Y6000D01*X6000D01*Y4000D01*X4000D01*Y5000D01*X0D01*Y0D01*G37*")
    assert signed_areas(image.contours) == [pytest.approx(96)]
    assert len(image.contours.start) == 12


def test_segments_of_no_length_are_left_out() -> None:
    image = read("G36*X0Y0D02*X1000D01*X1000D01*Y1000D01*X0Y0D01*X0Y0D01*G37*")
    assert image.contours.start.tolist() == [[0, 0], [1, 0], [1, 1]]


def test_an_open_contour_is_closed_and_remarked() -> None:
    image = read("G36*X0Y0D02*X1000D01*Y1000D01*G37*G36*X0Y0D02*X1000D01*Y1000D01*X1Y0D01*G37*")
    assert image.contours.start.tolist() == [[0, 0], [1, 0], [1, 1], [0, 0], [1, 0], [1, 1], [0.001, 0]]
    assert "up to 1.414 mm off" in image.remarks[0].text


def test_a_contour_without_a_move_starts_at_the_current_point() -> None:
    image = read("X5000Y5000D02*G36*X6000D01*Y6000D01*X5000Y5000D01*G37*")
    assert image.contours.start[0].tolist() == [5, 5]


def test_regions_carry_polarity_and_net() -> None:
    image = read("%LPC*%%TO.N,TIDE*%G36*X0Y0D02*X1000D01*Y1000D01*X0Y0D01*G37*%TD*%")
    assert image.dark.tolist() == [False]
    assert image.nets[image.net[0]] == ("TIDE",)


def test_an_empty_region_draws_nothing() -> None:
    assert len(read("G36*G37*G36*X0Y0D02*G37*X0Y0D03*")) == 1


def test_no_aperture_is_needed_for_a_region() -> None:
    text = "%FSLAX33Y33*%%MOMM*%G36*X0Y0D02*X1000D01*Y1000D01*X0Y0D01*G37*M02*"
    assert len(read_gerber(text.encode(), "tide.gbr")) == 1


def test_modal_draws_inside_a_region() -> None:
    image = read("G36*X0Y0D02*X1000D01*Y1000*X0*Y0*G37*")
    assert signed_areas(image.contours) == [pytest.approx(1)]


@pytest.mark.parametrize(
    ("body", "message", "line"),
    [
        ("\nG36*X0Y0D02*X1000D01*\nX1000Y1000D01*", "the file ends inside the region", 3),
        ("G36*X0Y0D02*\nX0Y0D03*G37*", "a flash (D03) inside a region", 3),
        ("G36*X0Y0D02*\nG36*X1000D01*Y1000D01*X0Y0D01*G37*", "a region begins inside a region", 3),
    ],
)
def test_what_is_refused(body: str, message: str, line: int) -> None:
    with pytest.raises(InputError) as caught:
        read(body)
    assert message in caught.value.problems[0].message
    assert caught.value.problems[0].line == line


def test_g37_without_g36_is_only_odd() -> None:
    assert "not begun" in read("G37*X0Y0D03*").remarks[0].text
