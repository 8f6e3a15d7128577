"""Aperture definitions: standard shapes, holes, numbers, and what is refused. Values stand in the text (exact)."""

from __future__ import annotations

import pytest

from impcheck.artwork.gerber import read_gerber
from impcheck.artwork.image import Aperture
from impcheck.errors import InputError


def aperture(definition: str, unit: str = "MM") -> Aperture:
    text = f"%FSLAX24Y24*%%MO{unit}*%%AD{definition}*%D10*X0Y0D03*M02*"
    (found,) = read_gerber(text.encode(), "tide.gbr").apertures
    return found


@pytest.mark.parametrize(
    ("definition", "shape", "parameters", "hole"),
    [
        ("D10C,0.5", "circle", (0.5,), ()),
        ("D10C,0", "circle", (0,), ()),
        ("D10C,.5X.25", "circle", (0.5,), (0.25,)),
        ("D10C,0.5X0.25X0.15", "circle", (0.5,), (0.25, 0.15)),
        ("D10R,1X2", "rectangle", (1, 2), ()),
        ("D10R,1x2X0.5", "rectangle", (1, 2), (0.5,)),
        ("D10R,1X2X0.5X0.25", "rectangle", (1, 2), (0.5, 0.25)),
        ("D10O,1X2X0.5", "obround", (1, 2), (0.5,)),
        ("D10P,3X6", "polygon", (3, 6, 0), ()),
        ("D10P,3X6X15", "polygon", (3, 6, 15), ()),
        ("D10P,3X6X15X0.5", "polygon", (3, 6, 15), (0.5,)),
        ("D10P,3X6X0X0.5X0.25", "polygon", (3, 6, 0), (0.5, 0.25)),
        ("D010C,0.5", "circle", (0.5,), ()),
    ],
)
def test_standard_shapes(definition: str, shape: str, parameters: tuple[float, ...], hole: tuple[float, ...]) -> None:
    found = aperture(definition)
    assert (found.code, found.shape, found.parameters, found.hole) == ("D10", shape, parameters, hole)


def test_inches_scale_lengths_only() -> None:
    found = aperture("D10P,1X6X15X0.5", "IN")
    assert found.parameters == (25.4, 6, 15)
    assert found.hole == (12.7,)


def test_a_hole_of_no_size_is_no_hole() -> None:
    assert aperture("D10C,1X0").hole == ()


@pytest.mark.parametrize(
    ("definition", "message"),
    [
        ("D10C", "has 0 numbers"),
        ("D10R,1", "has 1 numbers"),
        ("D10C,1X2X3X4", "has 4 numbers"),
        ("D10C,abc", "is no number"),
        ("D10C,1e5", "is no number"),
        ("D10C,-1", "negative size"),
        ("D10C,99999999", "out of range"),
        ("D10P,1X2", "polygon of 2 vertices"),
        ("D10P,1X2.5", "polygon of 2.5 vertices"),
        ("D9C,1", "reserved"),
        ("D10NONE,1", "macro 'NONE', which is not defined"),
        ("C,1", "no aperture definition"),
    ],
)
def test_wrong_definitions_are_refused(definition: str, message: str) -> None:
    text = f"%FSLAX24Y24*%\n%MOMM*%\n%AD{definition}*%\nD10*X0Y0D03*M02*"
    with pytest.raises(InputError) as caught:
        read_gerber(text.encode(), "tide.gbr")
    first = caught.value.problems[0]
    assert message in first.message
    assert (first.file, first.line) == ("tide.gbr", 3)
    assert first.remedy


def test_draws_with_any_aperture_are_held() -> None:
    text = "%FSLAX24Y24*%%MOMM*%%AMBOX*21,1,1,1,0,0,0*%%ADD10R,1X2*%%ADD11O,1X2*%%ADD12P,1X5*%%ADD13BOX*%"
    text += "".join(f"D{n}*X0Y0D02*X10000D01*" for n in (10, 11, 12, 13)) + "M02*"
    image = read_gerber(text.encode(), "tide.gbr")
    assert [image.apertures[k].shape for k in image.aperture] == ["rectangle", "obround", "polygon", "macro"]


def test_an_aperture_defined_again_counts_from_its_next_selection() -> None:
    text = "%FSLAX24Y24*%%MOMM*%%ADD10C,1*%D10*X0Y0D03*%ADD10C,2*%D10*X1Y0D03*M02*"
    image = read_gerber(text.encode(), "tide.gbr")
    assert [image.apertures[k].parameters[0] for k in image.aperture] == [1, 2]
    assert "defined twice" in image.remarks[0].text


def test_selecting_an_undefined_aperture_that_draws_nothing_is_only_odd() -> None:
    text = "%FSLAX24Y24*%%MOMM*%%ADD10C,1*%D11*D10*X0Y0D03*M02*"
    image = read_gerber(text.encode(), "tide.gbr")
    assert "neither defined nor used" in image.remarks[0].text
