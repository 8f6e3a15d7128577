"""X2 attributes of files, apertures and objects, as commands and as standard comments. Rules of the specification's attribute chapter."""

from __future__ import annotations

import pytest

from impcheck.artwork.gerber import read_gerber
from impcheck.artwork.image import Image, Pin

HEAD = "%FSLAX33Y33*%%MOMM*%%ADD10C,0.5*%D10*\n"


def read(body: str | bytes) -> Image:
    return read_gerber(HEAD.encode() + (body.encode() if isinstance(body, str) else body) + b"M02*", "tide.gbr")


def spelled(command: str, comment: bool) -> str:
    return f"G04 #@! {command}*" if comment else f"%{command}*%"


@pytest.mark.parametrize("comment", [False, True])
def test_file_attributes(comment: bool) -> None:
    image = read(spelled("TF.FileFunction,Copper,L1,Top", comment) + spelled("TF.Part,Single", comment))
    assert image.attributes == {".FileFunction": ("Copper", "L1", "Top"), ".Part": ("Single",)}


@pytest.mark.parametrize("comment", [False, True])
def test_nets_pins_and_components_hold_until_they_are_deleted(comment: bool) -> None:
    parts = ["TO.N,CLK", "X0Y0D03", "TO.P,U1,7,CLKOUT", "TO.C,U1", "X1Y0D03", "TD.P", "X2Y0D03", "TO.N,GND", "X3Y0D03", "TD", "X4Y0D03"]
    image = read("".join(spelled(part, comment) if part.startswith("T") else f"{part}*" for part in parts))
    assert [image.nets[k] if k >= 0 else None for k in image.net] == [("CLK",)] * 3 + [("GND",), None]
    assert [image.pins[k] if k >= 0 else None for k in image.pin] == [None, Pin("U1", "7", "CLKOUT"), None, None, None]
    assert [image.components[k] if k >= 0 else None for k in image.component] == [None, "U1", "U1", "U1", None]


def test_a_net_tie_has_several_names() -> None:
    assert read("%TO.N,AGND,GND*%X0Y0D03*").nets == (("AGND", "GND"),)


@pytest.mark.parametrize("value", ["", "N/C"])
def test_pads_of_no_net(value: str) -> None:
    image = read(f"%TO.N,CLK*%X0Y0D03*%TO.N,{value}*%X1Y0D03*")
    assert image.net.tolist() == [0, -1]


@pytest.mark.parametrize(
    ("written", "name"),
    [
        (r"/D\u002CQ[0]", "/D,Q[0]"),
        (r"\u00B5P_RESET", "µP_RESET"),
        (r"A\,B", "A,B"),
        (r"\U0001F30A", "\U0001f30a"),
        (r"A\\B", r"A\B"),
        ("µP_RESET", "µP_RESET"),
        ("Net-(U1-Pad 3)", "Net-(U1-Pad 3)"),
        (r"\uD800", "�"),
    ],
)
def test_escapes(written: str, name: str) -> None:
    assert read(f"%TO.N,{written}*%X0Y0D03*").nets == ((name,),)


def test_bytes_that_are_not_utf8_are_latin1() -> None:
    image = read(b"%TO.N,\xb5P*%X0Y0D03*")
    assert image.nets == (("µP",),)
    assert "Latin-1" in image.remarks[0].text


def test_aperture_attributes_are_those_at_the_definition() -> None:
    image = read("%TA.AperFunction,SMDPad,CuDef*%%ADD11C,1*%%TA.Own,1*%%ADD12C,1*%%TD.AperFunction*%%ADD13C,1*%%TD*%%ADD14C,1*%")
    assert [dict(a.attributes) for a in image.apertures] == [
        {},
        {".AperFunction": ("SMDPad", "CuDef")},
        {".AperFunction": ("SMDPad", "CuDef"), ".Own": ("1",)},
        {".Own": ("1",)},
        {},
    ]


def test_deleting_what_is_not_set_does_no_harm() -> None:
    assert read("%TD.N*%%TD*%X0Y0D03*").remarks == ()


def test_a_file_attribute_set_differently_is_remarked() -> None:
    image = read("%TF.Part,Single*%%TF.Part,Array*%X0Y0D03*")
    assert image.attributes[".Part"] == ("Array",)
    assert "set twice" in image.remarks[0].text


def test_attributes_of_other_programs_are_comments() -> None:
    image = read("G04 #@! TXY*G04 #! TO.N,CLK*G04 TO.N,CLK*X0Y0D03*")
    assert image.net.tolist() == [-1]
    assert image.nets == ()


def test_draws_and_regions_carry_nets_too() -> None:
    image = read("%TO.N,CLK*%X0Y0D02*G01X1Y0D01*G36*X0Y0D02*X1000D01*Y1000D01*X0Y0D01*G37*%TO.N,GND*%X5Y5D01*")
    assert image.net.tolist() == [0, 0, 1]


def test_a_line_end_inside_an_attribute_is_not_part_of_it() -> None:
    assert read("%TO.N,CL\nK*%X0Y0D03*").nets == (("CLK",),)
