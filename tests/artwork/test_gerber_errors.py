"""Broken and hostile files: each mistake once, with file, line and remedy; several in one go; bounded in time and memory."""

from __future__ import annotations

import random
import time

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from impcheck.artwork.gerber import read_gerber
from impcheck.artwork.limits import Limits
from impcheck.errors import InputError, Problem

DEFAULTS = Limits()
HEAD = "%FSLAX24Y24*%\n%MOMM*%\n%ADD10C,0.5*%\nD10*\nG01*\n"


def problems(data: str | bytes, limits: Limits = DEFAULTS) -> tuple[Problem, ...]:
    with pytest.raises(InputError) as caught:
        read_gerber(data.encode() if isinstance(data, str) else data, "tide.gbr", limits)
    assert all(problem.file == "tide.gbr" and problem.message and problem.remedy for problem in caught.value.problems)
    return caught.value.problems


@pytest.mark.parametrize(
    ("data", "message"),
    [
        (b"", "the file is empty"),
        (b" \r\n\n", "the file is empty"),
        (b"Dear fab house,\nplease build this board. * Thanks!\n", "this is not a Gerber file"),
        (b"PK\x03\x04\x14\x00\x08\x00" + bytes(range(256)) * 8, "binary file"),
        (b"\x89PNG\r\n\x1a\n\x00\x00\x00\rIHDR" + b"\x00" * 64, "binary file"),
        (b"M48\nMETRIC,TZ\nT1C0.3\n%\nT1\nX1Y1\nM30\n", "Excellon drill file"),
        (b"D12*\nX1776Y1024D02*\nX1524D01*\nY4906D01*\nM02*\n", "RS-274-D"),
        (b"%MOMM*%\n%ADD10C,1*%\nD10*X0Y0D03*M02*", "coordinate format is missing"),
        (b"impcheck: 1\nboard: Tide logger\n", "this is not a Gerber file"),
    ],
)
def test_what_is_no_gerber_file_gives_one_clear_error(data: bytes, message: str) -> None:
    (problem,) = problems(data)
    assert message in problem.message
    assert problem.line == 0


@pytest.mark.parametrize(
    ("body", "message", "line"),
    [
        ("X0Y0D02*\nX1Y1D0", "the file ends inside the statement 'X1Y1D0'", 7),
        ("X0Y0D02*\n%ADD11C,", "the file ends inside a %...% command", 7),
        ("X0Y0D02*\nG04 half a com", "the file ends inside a comment", 7),
        ("X0Y0D03*\n%LPD*\nX1Y1D03*\n%LPC*%M02*", "drawing code stands inside a %...% command", 8),
        ("D11*\nX0Y0D03*M02*", "aperture D11 is not defined", 7),
        ("X0Y0D03*\nQ1*M02*", "unknown statement at 'Q1'", 7),
        ("X0Y0D03*\n%XX*%M02*", "unknown command 'XX'", 7),
        ("G99*\nM02*", "unknown code G99", 6),
        ("G10*\nM02*", "unknown code G10", 6),
        ("M07*\nM02*", "unknown code M07", 6),
        ("X0Y0D04*\nM02*", "D4 means nothing", 6),
        ("X0Y0D00*\nM02*", "D0 means nothing", 6),
        ("XY0D03*\nM02*", "no number after X", 6),
        ("X--1Y0D03*\nM02*", "'-' in a wrong place", 6),
        ("X1-1Y0D03*\nM02*", "'-' in a wrong place", 6),
        ("X1.2.3Y0D03*\nM02*", "is no number", 6),
        ("123*\nM02*", "a number without a letter", 6),
        ("X1X2Y0D03*\nM02*", "X stands twice", 6),
        ("X1234567890123456789Y0D03*\nM02*", "number out of range", 6),
        ("X999999999999Y0D03*\nM02*", "coordinate out of range", 6),
        ("X0Y0D10*\nM02*", "coordinates together with D10", 6),
        ("%FSQQ*%\nX0Y0D03*M02*", "no coordinate format", 6),
        ("%MOXX*%\nX0Y0D03*M02*", "unknown unit", 6),
        ("%AM*1,1,1,0,0*%\nX0Y0D03*M02*", "a macro without a name", 6),
    ],
)
def test_one_mistake_one_error_at_its_line(body: str, message: str, line: int) -> None:
    (problem,) = problems(HEAD + body)
    assert message in problem.message
    assert problem.line == line


def test_nothing_drawn_before_an_aperture_is_selected() -> None:
    (problem,) = problems("%FSLAX24Y24*%\n%MOMM*%\nX0Y0D03*\nM02*")
    assert (problem.line, problem.message) == (3, "nothing can be drawn before an aperture is selected")


def test_coordinates_before_the_format() -> None:
    (problem,) = problems("%MOMM*%%ADD10C,1*%D10*X0Y0D03*\n%FSLAX24Y24*%M02*")
    assert "before the coordinate format" in problem.message


def test_too_many_digits_with_trailing_zeros_left_out() -> None:
    (problem,) = problems("%FSTAX24Y24*%%MOMM*%%ADD10C,1*%D10*X1234567Y0D03*M02*")
    assert "more digits than the format" in problem.message


def test_several_mistakes_come_in_one_go_by_line() -> None:
    found = problems(HEAD + "X0Y0D04*\nQ*\n%XX*%\nD11*\nX0Y0D03*\nM02*")
    assert [problem.line for problem in found] == [6, 7, 8, 10]


def test_at_most_twenty_are_listed() -> None:
    found = problems(HEAD + "X0Y0D04*\n" * 500 + "M02*")
    assert len(found) == 21
    assert [problem.line for problem in found[:20]] == list(range(6, 26))
    assert "more problems" in found[20].message


def test_file_size_is_limited() -> None:
    (problem,) = problems(HEAD + "X0Y0D03*M02*", Limits(file_bytes=20))
    assert "limit file_bytes = 20" in problem.remedy


def test_objects_and_vertices_are_limited() -> None:
    (problem,) = problems(HEAD + "X0Y0D03*" * 50 + "M02*", Limits(objects=49))
    assert "limit objects = 49" in problem.remedy
    (problem,) = problems(HEAD + "G36*X0Y0D02*" + "X1D01*X0D01*" * 50 + "G37*M02*", Limits(vertices=49))
    assert "limit vertices = 49" in problem.remedy


def _hostile() -> dict[str, str]:
    words = 200_000
    macro = "%AMBIG*" + "$1=$1+1*" * 50_000 + "1,1,1,0,0*%\n"
    return {
        "blanks in a command": HEAD + "%" + " " * 1_000_000 + "\n*%M02*",
        "blanks after G": HEAD + ("G" + " " * 1000) * 1000 + "M02*",
        "zeros": HEAD + "X" + "0" * 1_000_000 + "Y0D03*M02*",
        "per cents": HEAD + "%" * 300_001,
        "stars": HEAD + "*" * 1_000_000 + "M02*",
        "expensive macros": HEAD + macro + "".join(f"%ADD{n}BIG,1*%\n" for n in range(20, 20_000)) + "M02*",
        "many undefined apertures": HEAD + "".join(f"D{n}*X0Y0D03*" for n in range(20, 60_000)) + "M02*",
        "many unused apertures": HEAD + "".join(f"D{n}*" for n in range(20, words)) + "M02*",
        "many attributes": HEAD + "".join(f"%TA.A{n},1*%" for n in range(words)) + "M02*",
        "deep parentheses": HEAD + "%AMP*1,1," + "(" * 100_000 + "*%M02*",
        "long moires": HEAD + "%AMM*" + "6,0,0,5000,0.001,0.001,1000000,1,1,0*" * 20 + "%%ADD20M*%M02*",
        "open repeats": HEAD + "%SRX2Y2I1J1*%X0Y0D03*" * 20_000 + "M02*",
        "dots": HEAD + "X1.1.1" * 50_000 + "*M02*",
        "unclosed regions": HEAD + "G36*" * 50_000 + "M02*",
        "format as text": "%TF.FS,FS*%" + "G01*" * 1000,
    }


@pytest.mark.parametrize("name", sorted(_hostile()))
def test_hostile_files_end_soon(name: str) -> None:
    data = _hostile()[name].encode()
    begin = time.perf_counter()
    try:
        read_gerber(data, "tide.gbr")
    except InputError as error:
        assert 1 <= len(error.problems) <= 21
        assert len(str(error)) < 10_000
    # What this looks for is work without bound, not speed: the files are about 1 MB and take a few seconds at most.
    assert time.perf_counter() - begin < 60


_PIECES = [
    "%FSLAX24Y24*%", "%MOMM*%", "%MOIN*%", "%ADD10C,0.5*%", "%ADD11M,1X2*%", "%AMM*1,1,$1,0,0*21,1,$2/$1,1,0,0,0*%", "%LPC*%",
    "%LPD*%", "%LMX*%", "%LR30*%", "%LS2*%", "%SRX2Y2I1J1*%", "%SR*%", "%ABD12*%", "%AB*%", "%TO.N,A*%", "%TD*%", "D10*", "D11*", "D12*",
    "G01*", "G02*", "G03*", "G74*", "G75*", "G36*", "G37*", "X10Y20D02*", "X5D01*", "Y7I3J4D01*", "X1Y1D03*", "D03*", "X9*", "G90*", "G91*",
    "M02*", "%", "*", "X", "-", ".", "G04 x*", "%IPNEG*%", "\n", "%OFA1B1*%", "%MIA1*%", "N5", "D", "1",
]  # fmt: skip


@settings(max_examples=150, deadline=None)
@given(st.lists(st.sampled_from(_PIECES), max_size=40))
def test_any_mixture_of_pieces_is_read_or_refused(pieces: list[str]) -> None:
    data = ("%FSLAX24Y24*%%MOMM*%%ADD10C,0.5*%D10*" + "".join(pieces)).encode()
    try:
        image = read_gerber(data, "tide.gbr")
    except InputError as error:
        assert all(problem.message for problem in error.problems)
    else:
        assert len(image.start) == len(image.line) == len(image)
        assert image.contours.first[-1] == len(image.contours.start)


@settings(max_examples=100, deadline=None)
@given(st.binary(max_size=300))
def test_any_bytes_are_read_or_refused(data: bytes) -> None:
    for given_bytes in (data, HEAD.encode() + data):
        try:
            read_gerber(given_bytes, "tide.gbr")
        except InputError as error:
            assert error.problems


def test_a_good_file_cut_anywhere_is_read_or_refused() -> None:
    text = (
        HEAD
        + "%AMM*1,1,$1,0,0*%\n%ADD11M,2*%\nG75*G36*X0Y0D02*X10000D01*G03X0Y10000I-10000J0D01*G01Y0D01*G37*\nD11*%TO.N,A*%X0Y0D03*\nM02*\n"
    )
    for cut in random.Random(5).sample(range(len(text)), 80):
        try:
            read_gerber(text[:cut].encode(), "tide.gbr")
        except InputError as error:
            assert error.problems[0].message
