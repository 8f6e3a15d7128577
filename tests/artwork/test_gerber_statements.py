"""Statements of the Gerber specification: formats, units, modal codes, ends. Expected places follow from the text by hand (exact)."""

from __future__ import annotations

import numpy as np
import pytest

from impcheck.artwork.gerber import read_gerber
from impcheck.artwork.image import Image, Kind
from impcheck.errors import RemarkKind

HEAD = "%FSLAX24Y24*%\n%MOMM*%\n%ADD10C,0.5*%\nD10*\nG01*\n"


def read(text: str | bytes) -> Image:
    return read_gerber(text.encode() if isinstance(text, str) else text, "tide.gbr")


def texts(image: Image) -> str:
    return "\n".join(remark.text for remark in image.remarks)


def test_moves_draws_and_flashes_in_order_with_their_lines() -> None:
    image = read(HEAD + "X10000Y20000D02*\nX30000D01*\nY-5000D01*\nX0Y0D03*\nM02*\n")
    assert image.kind.tolist() == [Kind.DRAW, Kind.DRAW, Kind.FLASH]
    assert image.start.tolist() == [[1, 2], [3, 2], [0, 0]]
    assert image.end.tolist() == [[3, 2], [3, -0.5], [0, 0]]
    assert image.line.tolist() == [7, 8, 9]
    assert image.remarks == ()


@pytest.mark.parametrize(
    ("form", "unit", "number", "mm"),
    [
        ("FSLAX24Y24", "MM", "12345", 1.2345),
        ("FSLAX24Y24", "MM", "-000001", -0.0001),
        ("FSLAX46Y46", "MM", "1234567", 1.234567),
        ("FSLAX24Y24", "IN", "10000", 25.4),
        ("FSLAX25Y25", "IN", "1", 0.000254),
        ("FSTAX24Y24", "MM", "12", 12.0),  # trailing zeros left out: 12 is 12.0000
        ("FSTAX24Y24", "MM", "0123", 1.23),
        ("FSTAX24Y24", "IN", "-01", -25.4),
        ("FSAX24Y24", "MM", "000100", 0.01),
        ("FSLAN2X34Y34", "MM", "+10000", 1.0),
        ("FSLAX24Y24", "MM", "1.5", 1.5),  # decimal coordinates are read as they stand
        ("FSLAX24Y24", "IN", "-.5", -12.7),
    ],
)
def test_one_number_in_each_format(form: str, unit: str, number: str, mm: float) -> None:
    image = read(f"%{form}*%\n%MO{unit}*%\n%ADD10C,0.1*%\nD10*\nX{number}Y{number}D03*\nM02*\n")
    assert image.start[0].tolist() == pytest.approx([mm, mm], abs=1e-12)


def test_x_and_y_may_have_different_digits() -> None:
    image = read("%FSLAX23Y34*%%MOMM*%%ADD10C,0.1*%D10*X1000Y1000D03*M02*")
    assert image.start[0].tolist() == [1.0, 0.1]


def test_a_whole_number_of_units_is_the_nearest_double() -> None:
    image = read("%FSLAX46Y46*%%MOIN*%%ADD10C,0.1*%D10*X100000Y1D03*M02*")
    assert image.start[0].tolist() == [2.54, 0.0000254]  # exact comparison: rounded once


def test_decimal_coordinates_are_remarked() -> None:
    image = read(HEAD + "X1.5Y2.25D03*M02*")
    assert "decimal point" in texts(image)
    assert [remark.kind for remark in image.remarks] == [RemarkKind.ODD]


@pytest.mark.parametrize(
    "body", ["X1Y1D03*M02*", "X1Y1D3*M2*", "Y1X1D03*M00*", "N10X1Y1D03*\nN20M02*", "X 1 Y 1 D 03 *\n M02 *", "X+0001Y1\nD03*\nM02*"]
)
def test_spellings_of_one_flash(body: str) -> None:
    image = read("%FSLAX24Y24*%%MOMM*%%ADD10C,0.1*%D10*" + body)
    assert image.kind.tolist() == [Kind.FLASH]
    assert image.start.tolist() == [[0.0001, 0.0001]]
    assert image.remarks == ()


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r", ""])
def test_line_ends(end: str) -> None:
    image = read(HEAD.replace("\n", end) + end.join(["X0Y0D02*", "X1Y1D01*", "M02*"]))
    assert len(image) == 1
    assert image.line.tolist() == [7 if end else 1]


def test_modal_operations_repeat_and_are_remarked() -> None:
    image = read(HEAD + "X0Y0D02*X1D01*X2*Y3*X5Y5D03*X6*M02*")
    assert image.kind.tolist() == [Kind.DRAW] * 3 + [Kind.FLASH] * 2
    assert image.end[:, 0].tolist() == pytest.approx([1e-4, 2e-4, 2e-4, 5e-4, 6e-4])
    assert "repeat the last" in texts(image)


def test_a_coordinate_before_any_operation_only_moves() -> None:
    image = read(HEAD + "X10000Y10000*X20000D01*M02*")
    assert image.start.tolist() == [[1, 1]]
    assert "only move" in texts(image)


@pytest.mark.parametrize("select", ["D11*", "G54D11*", "G54D11*G01*"])
def test_apertures_are_selected(select: str) -> None:
    image = read(HEAD + "%ADD11R,1X2*%X0Y0D03*" + select + "X1Y0D03*G55X2Y0D03*M02*")
    assert [image.apertures[k].code for k in image.aperture] == ["D10", "D11", "D11"]


def test_an_operation_may_stand_in_the_statement_that_selects() -> None:
    image = read(HEAD + "%ADD11R,1X2*%G54D11X10000Y0D03*M02*")
    assert image.apertures[image.aperture[0]].shape == "rectangle"
    assert image.start.tolist() == [[1, 0]]


def test_an_operation_without_coordinates_uses_the_current_point() -> None:
    image = read(HEAD + "D03*X10000Y0D02*D03*D01*M02*")
    assert image.kind.tolist() == [Kind.FLASH, Kind.FLASH, Kind.DRAW]
    assert image.end.tolist() == [[0, 0], [1, 0], [1, 0]]


def test_incremental_by_format_and_by_g91() -> None:
    body = "%MOMM*%%ADD10C,0.1*%D10*X10000Y0D02*X10000D01*Y-5000D01*X0Y5000D01*M02*"
    expected = [[2, 0], [2, -0.5], [2, 0]]
    assert read("%FSLIX24Y24*%" + body).end.tolist() == expected
    image = read("%FSLAX24Y24*%G91*" + body)
    assert image.end.tolist() == expected
    assert "incremental" in texts(image)
    mixed = read("%FSLAX24Y24*%%MOMM*%%ADD10C,0.1*%D10*X10000Y10000D02*G91*X10000D01*G90*X0Y0D01*M02*")
    assert mixed.end.tolist() == [[2, 1], [0, 0]]


@pytest.mark.parametrize(("code", "mm"), [("G70", 25.4), ("G71", 1.0)])
def test_unit_by_g70_and_g71(code: str, mm: float) -> None:
    image = read(f"%FSLAX24Y24*%{code}*%ADD10C,0.1*%D10*X10000Y0D03*M02*")
    assert image.start.tolist() == [[mm, 0]]
    assert image.apertures[0].parameters == pytest.approx((0.1 * mm,))
    assert "G70 or G71 only" in texts(image)


def test_a_file_without_unit_is_in_inches_and_that_is_a_guess() -> None:
    image = read("%FSLAX24Y24*%%ADD10C,0.1*%D10*X10000Y0D03*M02*")
    assert image.start.tolist() == [[25.4, 0]]
    assert [remark.kind for remark in image.remarks] == [RemarkKind.GUESS]


def test_g71_against_moin_is_a_disagreement_and_mo_counts() -> None:
    image = read("%FSLAX24Y24*%%MOIN*%G71*%ADD10C,0.1*%D10*X10000Y0D03*M02*")
    assert image.start.tolist() == [[25.4, 0]]
    assert [remark.kind for remark in image.remarks] == [RemarkKind.DISAGREEMENT]


def test_a_unit_said_after_apertures_and_macros_holds_for_them() -> None:
    image = read("%FSLAX24Y24*%%AMDOT*1,1,$1,0,0*%%ADD10DOT,1*%%MOIN*%D10*X0Y0D03*M02*")
    assert image.apertures[0].primitives[0].numbers == (25.4, 0, 0, 0)


def test_several_commands_in_one_block_and_over_lines() -> None:
    image = read("%FSLAX24Y24*MOMM*\nADD10C,0.5*\nAMBOX*21,1,$1,$2,0,0,0*ADD11BOX,1X2*\nLPC*%D11*X0Y0D03*M02*")
    assert [a.code for a in image.apertures] == ["D10", "D11"]
    assert image.apertures[1].primitives[0].numbers[:2] == (1, 2)
    assert image.dark.tolist() == [False]


def test_blanks_and_line_ends_inside_commands() -> None:
    image = read("% FS LA X24 Y24 *%\n%MO MM*%\n%\nADD10 C, 0.5\n*\n%\nD10*X0Y0D03*M02*")
    assert image.apertures[0].parameters == (0.5,)


def test_polarity_holds_from_its_command_on() -> None:
    image = read(HEAD + "X0Y0D03*%LPC*%X1Y0D03*X2Y0D01*%LPD*%X3Y0D03*M02*")
    assert image.dark.tolist() == [True, False, False, True]


def test_comments_are_not_read_even_where_they_look_like_code() -> None:
    image = read("G04 X0Y0D03 100% of %LPC*\n" + HEAD + "G4*G04 50% X1Y1D03*\nX0Y0D03*G04 M02*X1Y0D03*M02*")
    assert len(image) == 2
    assert image.dark.all()


def test_a_missing_end_is_remarked() -> None:
    assert "does not end with M02" in texts(read(HEAD + "X0Y0D03*"))


def test_what_follows_the_end_is_not_read_and_remarked() -> None:
    image = read(HEAD + "X0Y0D03*M02*\nX1Y1D03*\n%UNKNOWN\nrubbish $$$")
    assert len(image) == 1
    assert "not read" in texts(image)
    assert image.remarks[0].line == 7


def test_padding_and_byte_order_mark_do_no_harm() -> None:
    image = read(b"\xef\xbb\xbf" + HEAD.encode() + b"X0Y0D03*M02*\r\n\x1a\x00\x00")
    assert len(image) == 1
    assert image.remarks == ()


def test_no_objects_at_all() -> None:
    image = read("%FSLAX24Y24*%%MOMM*%M02*")
    assert len(image) == 0
    assert image.start.shape == (0, 2)
    assert image.contours.first.tolist() == [0]
    assert "draws nothing" in texts(image)


def test_names_of_image_and_load_change_nothing() -> None:
    image = read("%INPANEL_1*%%LNTOP LAYER*%%ICAS*%" + HEAD + "X0Y0D03*M02*")
    assert image.remarks == ()
    assert np.all(image.dark)
