"""Aperture macros. Values follow from the specification's rules by hand (exact): precedence, missing parameters, primitives."""

from __future__ import annotations

import math

import pytest

from impcheck.artwork.gerber import read_gerber
from impcheck.artwork.image import Primitive
from impcheck.errors import InputError

HEAD = "%FSLAX24Y24*%%MOMM*%"


def primitives(macro: str, parameters: str = "", unit: str = "MM") -> tuple[Primitive, ...]:
    text = f"%FSLAX24Y24*%%MO{unit}*%\n%AMTIDE*{macro}*%\n%ADD10TIDE{',' if parameters else ''}{parameters}*%D10*X0Y0D03*M02*"
    image = read_gerber(text.encode(), "tide.gbr")
    assert image.apertures[0].shape == "macro"
    assert image.apertures[0].macro == "TIDE"
    return image.apertures[0].primitives


@pytest.mark.parametrize(
    ("expression", "value"),
    [
        ("1+2x3", 7.0),
        ("1.8+1X0+0.1", 1.9),
        ("(1+2)x3", 9.0),
        ("8/2/2", 2.0),
        ("7-2-1", 4.0),
        ("-$1+4", 1.0),
        ("4x-$1+20", 8.0),
        ("-(1-$2)", 4.0),
        ("$1x$2", 15.0),
        ("$1X$2", 15.0),
        ("$9+2", 2.0),  # a parameter that is not given is 0
        ("((((2))))", 2.0),
        ("--2", 2.0),
        ("+.5", 0.5),
        ("2.", 2.0),
        ("$1 + $2 x 2", 13.0),
    ],
)
def test_expressions(expression: str, value: float) -> None:
    assert primitives(f"1,1,{expression},0,0", "3X5")[0].numbers[0] == pytest.approx(value, abs=1e-12)


def test_variables_are_set_and_set_again_in_order() -> None:
    found = primitives("$3=$1x2*$1=$3+1*1,1,$1,$3,$2*$3=0-$3*1,1,1,$3,0", "2X7")
    assert found[0].numbers == (5, 4, 7, 0)
    assert found[1].numbers == (1, -4, 0, 0)


@pytest.mark.parametrize(
    ("text", "code", "numbers"),
    [
        ("1,1,1.5,2,3", 1, (1.5, 2, 3, 0)),
        ("1,1,1.5,2,3,30", 1, (1.5, 2, 3, 30)),
        ("20,1,0.4,0,1,2,3,45", 20, (0.4, 0, 1, 2, 3, 45)),
        ("2,1,0.4,0,1,2,3,45", 20, (0.4, 0, 1, 2, 3, 45)),
        ("02,1,0.4,0,1,2,3,45", 20, (0.4, 0, 1, 2, 3, 45)),
        ("21,1,6,2,1,1,10", 21, (6, 2, 1, 1, 10)),
        ("22,1,6,2,1,1,10", 21, (6, 2, 4, 2, 10)),  # lower left corner (1, 1): centre (4, 2)
        ("4,1,3,0,0,2,0,2,2,0,0,15", 4, (0, 0, 2, 0, 2, 2, 0, 0, 15)),
        ("5,1,8,1,2,3,22.5", 5, (8, 1, 2, 3, 22.5)),
        ("7,1,2,3,2,0.5,45", 7, (1, 2, 3, 2, 0.5, 45)),
    ],
)
def test_each_primitive(text: str, code: int, numbers: tuple[float, ...]) -> None:
    (found,) = primitives(text)
    assert (found.code, found.dark, found.numbers) == (code, True, pytest.approx(numbers))


def test_inches_scale_lengths_but_neither_angles_nor_counts() -> None:
    assert primitives("5,1,8,1,2,3,22.5", unit="IN")[0].numbers == pytest.approx((8, 25.4, 50.8, 76.2, 22.5))
    assert primitives("4,1,2,0,0,1,0,0,0,15", unit="IN")[0].numbers == pytest.approx((0, 0, 25.4, 0, 0, 0, 15))


def test_exposure_off_is_kept_in_order() -> None:
    found = primitives("1,1,2,0,0*1,0,1,0,0*21,$1,1,1,0,0,0", "0")
    assert [p.dark for p in found] == [True, False, False]


def test_comments_in_every_spelling() -> None:
    assert len(primitives("0 round-cornered, 4-sided $1/0*0*0comment,with,commas*1,1,1,0,0")) == 1
    assert len(primitives("0 4 sides*G04 written by hand*1,1,1,0,0")) == 1


def test_a_moire_becomes_rings_and_a_cross() -> None:
    # Outer diameter 5, ring 0.5, gap 0.25, at most 3 rings: rings of 5/4, 3.5/2.5 and 2/1.
    found = primitives("6,0,0,5,0.5,0.25,3,0.1,6,0")
    circles = [(p.numbers[0], p.dark) for p in found if p.code == 1]
    assert circles == [(5, True), (4, False), (3.5, True), (2.5, False), (2, True), (1, False)]
    assert [p.numbers[:5] for p in found if p.code == 20] == [(0.1, -3, 0, 3, 0), (0.1, 0, -3, 0, 3)]


def test_a_moire_does_not_cut_the_shapes_before_it() -> None:
    found = primitives("1,1,2,0,0*6,0,0,5,0.5,0.25,1,0.1,6,0")
    assert found[-1].code == 1 and found[-1].numbers[0] == 2


def test_outline_that_misses_its_first_point_by_rounding_is_closed_in_silence() -> None:
    (found,) = primitives("4,1,3,0,0,2,0,2,2,0.0005,0,0")
    assert found.numbers == (0, 0, 2, 0, 2, 2, 0, 0, 0)


def test_outline_that_is_open_is_closed_and_remarked() -> None:
    text = HEAD + "%AMTIDE*4,1,2,0,0,2,0,2,2,0*%%ADD10TIDE*%D10*X0Y0D03*M02*"
    image = read_gerber(text.encode(), "tide.gbr")
    assert image.apertures[0].primitives[0].numbers == (0, 0, 2, 0, 2, 2, 0, 0, 0)
    assert "does not end at its first point (2.8284 mm off)" in image.remarks[0].text


@pytest.mark.parametrize("name", ["A", "4SIDED", "lower_case", "a.b", "VB_RCRECTANGLE", "x"])
def test_macro_names(name: str) -> None:
    text = HEAD + f"%AM{name}*1,1,$1,0,0*%%ADD10{name},2*%D10*X0Y0D03*M02*"
    image = read_gerber(text.encode(), "tide.gbr")
    assert (image.apertures[0].code, image.apertures[0].macro) == ("D10", name)
    assert image.apertures[0].primitives[0].numbers[0] == 2


def test_a_rounded_rectangle_with_its_trigonometry_in_the_parameters() -> None:
    # A corner of a w x h rectangle with corner radius r, turned by 30 degrees: worked out by hand with the same rotation.
    macro = "$1=$1/2*$2=$2/2*1,1,2x$3,$1x$5-$2x$4,$1x$4+$2x$5"
    (found,) = primitives(macro, "4X2X0.5X0.5X0.866025")
    assert found.numbers == pytest.approx((1, 2 * math.cos(math.pi / 6) - 0.5, 1 + math.cos(math.pi / 6), 0), abs=1e-5)


@pytest.mark.parametrize(
    ("macro", "message"),
    [
        ("1,1,$1/0,0,0", "divides by zero"),
        ("1,1,$1/$2,0,0", "divides by zero"),
        ("1,1,1+,0,0", "incomplete"),
        ("1,1,(1,0,0", "incomplete"),
        ("1,1,1$,0,0", "no macro expression"),
        ("1,1,sin(1),0,0", "no macro expression"),
        ("1,1,,0,0", "empty number"),
        ("1,2,1,0,0", "exposure 2 means nothing"),
        ("1,1,1", "macro primitive 1 (circle) has 2 numbers"),
        ("1,1,-1,0,0", "negative size"),
        ("3,1,1,0,0", "unknown macro primitive 3"),
        ("5,1,2,0,0,1,0", "2 vertices"),
        ("5,1,13,0,0,1,0", "13 vertices"),
        ("5,1,3.5,0,0,1,0", "3.5 vertices"),
        ("4,1,3,0,0,1,0,0", "outline of 3 segments has 5 numbers"),
        ("4,1", "how many segments"),
        ("7,0,0,1,2,0.1,0", "thermal's outer diameter"),
        ("$0=1*1,1,1,0,0", "no macro statement"),
        ("$1*1,1,1,0,0", "no macro statement"),
        ("1,1," + "(" * 100 + "1" + ")" * 100 + ",0,0", "nested too deeply"),
        ("1,1,1000000x1000000,0,0", "out of range"),
    ],
)
def test_wrong_macros_are_refused_with_their_line(macro: str, message: str) -> None:
    text = HEAD + f"\n%AMTIDE*\n{macro}*%\n%ADD10TIDE,1*%\nD10*X0Y0D03*M02*"
    with pytest.raises(InputError) as caught:
        read_gerber(text.encode(), "tide.gbr")
    (problem,) = caught.value.problems
    assert message in problem.message
    assert problem.line in (2, 4)
    assert problem.remedy
