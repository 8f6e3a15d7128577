"""Broken and hostile drill files: each mistake once, with file, line and remedy; bounded in time and memory."""

from __future__ import annotations

import random
import time
import tracemalloc

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from impcheck.artwork.excellon import read_excellon
from impcheck.artwork.limits import Limits
from impcheck.errors import InputError, Problem

DEFAULTS = Limits()
HEAD = "M48\nMETRIC,TZ,000.000\nT1C0.300\nT2\n%\n"  # 5 lines


def problems(data: str | bytes, limits: Limits = DEFAULTS) -> tuple[Problem, ...]:
    with pytest.raises(InputError) as caught:
        read_excellon(data.encode() if isinstance(data, str) else data, "tide.drl", limits)
    assert all(problem.file == "tide.drl" and problem.message and problem.remedy for problem in caught.value.problems)
    return caught.value.problems


@pytest.mark.parametrize(
    ("data", "message"),
    [
        (b"", "the file is empty"),
        (b" \r\n\n\x1a", "the file is empty"),
        (b"Dear fab house,\nplease drill this board. Thanks!\n", "this is no drill file"),
        (b"impcheck: 1\nboard: Tide logger\n", "this is no drill file"),
        (b"PK\x03\x04\x14\x00\x08\x00" + bytes(range(256)) * 8, "this is a binary file"),
        (b"%FSLAX24Y24*%\n%MOMM*%\n%ADD10C,0.3*%\nD10*\nX0Y0D03*\nM02*\n", "this is a Gerber file"),
        (b"G04 made by hand*\nX0Y0D03*\n", "this is a Gerber file"),
        (b"C  netlist\nP  JOB  tide\n317CLK              U1    -1     D0300PA00X+012500Y-003000\n999\n", "this is no drill file"),
    ],
)
def test_what_is_no_drill_file_gives_one_clear_error(data: bytes, message: str) -> None:
    (problem,) = problems(data)
    assert message in problem.message


@pytest.mark.parametrize(
    ("body", "message", "line"),
    [
        ("X0Y0\nM30", "a hole is drilled before any tool is selected", 6),
        ("T1\nT0\nX0Y0\nM30", "a hole is drilled before any tool is selected", 8),
        ("T7\nX0Y0\nX1Y1\nM30", "tool T7 is not defined", 7),
        ("T2\nX0Y0\nX1Y1\nM30", "tool T2 has no diameter", 7),
        ("T3C0.0\nX0Y0\nM30", "tool T3 has an impossible diameter", 7),
        ("T1\nX0Y0Q\nM30", "'X0Y0Q' is no drill command", 7),
        ("T1\nX0Y\nM30", "'X0Y' is no drill command", 7),
        ("T1\nX1.2.3Y0\nM30", "'X1.2.3Y0' is no drill command", 7),
        ("T1\nX0Y0\nG1.5\nM30", "G1.5 is no code", 8),
        ("T1\nHELLO\nM30", "'HELLO' is no drill command", 7),
        ("T1\nG77\nX0Y0\nM30", "the code G77 is not known", 7),
        ("T1\nM77\nX0Y0\nM30", "the code M77 is not known", 7),
        ("T1\nX0Y0G82X1000\nM30", "G82 (a dual in-line cycle) is not read", 7),
        ("T1\nX0Y0\nU7\nM30", "the word U7 is not known", 8),
        ("T1\nX0Y0G85\nM30", "a slot (G85) has no end", 7),
        ("T1\nR3X1000\nM30", "a repeat (R) follows no hole", 7),
        ("T1\nX0Y0\nM02X1000\nM30", "a repeat (M02) follows no pattern", 8),
        ("T1\nG93X1000Y0\nX0Y0\nM30", "G93 moves the origin", 7),
        ("T1\nG00X0Y0\nM15\nG02X1000Y1000\nM16\nM30", "an arc has neither a radius (A) nor a centre (I, J)", 9),
        ("T1\nG00X0Y0\nM15\nG02X1000Y1000A500\nM16\nM30", "more than twice its radius of 0.5 mm", 9),
        ("T1\nG00X0Y0\nM15\nG02A500\nM16\nM30", "an arc given by its radius ends where it starts", 9),
        ("T1\nG00X0Y0\nM15\nG02X1000Y1000I300\nM16\nM30", "the arc's centre is 0.3 mm from its start and 1.221 mm from its end", 9),
        ("T1\nX0Y0\nX9999999Y0\nM30", "farther out than any board reaches, the first at (1e+04, 0) mm", 8),
        ("T1\nX0Y0G85X9999999\nM30", "X9999999 is 1e+04 mm, farther out than any board reaches", 7),
        ("T1\nX0Y0\nX" + "9" * 400 + "\nM30", "is too long", 8),
        ("T1\nX0Y0\nX" + "9" * 5000 + "\nM30", "is too long", 8),
        ("T1\nX0Y0\nX1000Y10", "the file ends in the middle, without M30", 8),
    ],
)
def test_mistakes_are_named_with_their_line(body: str, message: str, line: int) -> None:
    text = HEAD + body + ("\n" if body.endswith("M30") else "")
    (problem,) = problems(text)
    assert message in problem.message
    assert problem.line == line


def test_a_file_that_ends_in_its_header_is_cut_short() -> None:
    (problem,) = problems("M48\nMETRIC,TZ\nT1C0.3\n")
    assert problem.message == "the file ends in its header"


def test_several_mistakes_come_at_once_and_in_order() -> None:
    found = problems(HEAD + "T7\nX0Y0\nT1\nX0Y\nT2\nX0Y0\nM77\nM30\n")
    assert [problem.line for problem in found] == [7, 9, 11, 12]


def test_a_broken_file_stops_at_twenty_mistakes() -> None:
    assert len(problems(HEAD + "T1\n" + "X0Y\n" * 5000 + "M30\n")) == 20


@pytest.mark.parametrize(
    "body",
    [
        "T1\nX0Y0\nR1000000000X1\nM30\n",
        "T1\nX0Y0\n" + "R99999X1\n" * 60 + "M30\n",
        "T1\nM25\nX0Y0\nX1Y1\nM01\nR999999999M02X1000\nM08\nM30\n",
        "T1\nM25\nX0Y0\nR9999X1\nM01\n" + "M25\nM01\nR99999M02X1\n" + "M25\nX0Y0\nR9999X1\nM01\nR9999M02X1\nM08\nM30\n",
    ],
)
def test_repeats_without_end_are_refused_at_once(body: str) -> None:
    tracemalloc.start()
    begin = time.process_time()
    (problem,) = problems(HEAD + body, Limits(objects=200_000))
    assert problem.message == "the file drills more than 200,000 holes"
    assert problem.remedy == "limit objects = 200,000"
    assert time.process_time() - begin < 5.0
    assert tracemalloc.get_traced_memory()[1] < 100e6
    tracemalloc.stop()


def test_limits_are_named() -> None:
    assert problems(HEAD + "T1\n" + "X0Y0\n" * 30 + "M30\n", Limits(objects=20))[0].line == 27
    assert "limit file_bytes = 50" in problems(HEAD + "T1\n" + "X0Y0\n" * 30, Limits(file_bytes=50))[0].remedy


def test_nested_parentheses_and_long_lines_take_no_time() -> None:
    begin = time.process_time()
    for line in ("(" * 200_000, "X" * 200_000, "X1" * 100_000, "; T1 =" + " 1" * 100_000, "; HOLESIZE" + " " * 200_000, "N1" * 100_000):
        try:
            read_excellon(f"{HEAD}T1\nX0Y0\n{line}\nM30\n".encode(), "tide.drl")
        except InputError as error:
            assert error.problems[0].line in (6, 8)
    assert time.process_time() - begin < 5.0


WHOLE = (
    HEAD
    + "; #@! TF.FileFunction,Plated,1,2,PTH\nT1\n; #@! TO.N,CLK\nX1000Y2000\nR2X500\nX0Y0G85X1000\nG00X0Y0\nM15\nG02X2000Y2000A2000\nM16\n"
    "G05\n"
    "M25\nX1000\nM01\nM02X3000\nM08\nM30\n"
)


def test_every_beginning_of_a_file_is_read_or_refused_with_a_sentence() -> None:
    for size in range(len(WHOLE)):
        try:
            drills = read_excellon(WHOLE[:size].encode(), "tide.drl")
        except InputError as error:
            assert error.problems[0].message
        else:
            said = [remark.text for remark in drills.remarks]
            assert any("M30" in text for text in said) or WHOLE[:size].endswith("M30")


@settings(max_examples=150, deadline=None)
@given(st.integers(0, 2**32))
def test_damaged_files_never_give_a_traceback(seed: int) -> None:
    rng = random.Random(seed)
    data = bytearray(WHOLE.encode())
    for _ in range(rng.randint(1, 8)):
        at = rng.randrange(len(data))
        kind = rng.random()
        if kind < 0.4:
            data[at] = rng.choice(b"XYGMTRACN0123456789.+-;%()\n\r ,/\xff")
        elif kind < 0.7:
            del data[at : at + rng.randint(1, 12)]
        else:
            data[at:at] = data[rng.randrange(len(data)) :][: rng.randint(1, 20)]
        data = data or bytearray(b"M")
    try:
        read_excellon(bytes(data), "tide.drl", Limits(objects=10_000), extent=(0.0, 0.0, 10.0, 10.0))
    except InputError as error:
        assert all(problem.message for problem in error.problems)


@settings(max_examples=100, deadline=None)
@given(st.text(alphabet="XYGMTRACIJN0123456789.+-;%()\n ,/", max_size=80))
def test_any_text_behind_a_header_never_gives_a_traceback(body: str) -> None:
    try:
        read_excellon((HEAD + "T1\n" + body + "\nM30\n").encode(), "tide.drl", Limits(objects=10_000))
    except InputError as error:
        assert all(problem.message for problem in error.problems)
