"""What the commands of a drill file make. All expected places are exact: they follow from a command's definition (CNC-7, XNC; from memory).

The second opinion is gerbonara (test only), where it is right: zero suppression with an explicit format, R repeats, M15/M16 slots.
"""

from __future__ import annotations

import math
import time
import warnings
from itertools import pairwise
from pathlib import Path

import gerbonara
import numpy as np
import pytest
from gerbonara.utils import MM
from hypothesis import given, settings
from hypothesis import strategies as st
from shapely.geometry import LineString, Point

from impcheck.artwork.excellon import read_excellon
from impcheck.artwork.image import Pin
from impcheck.artwork.parts import DrillFile
from impcheck.errors import RemarkKind
from tests.boards.write_drill import Drilled, excellon

HEAD = "M48\nMETRIC,TZ,000.000\nT1C0.300\nT2C1.000\n%\n"

Slot = tuple[float, float, float, float, float]


def read(text: str) -> DrillFile:
    return read_excellon(text.encode(), "tide.drl")


def slots(body: str, head: str = HEAD) -> list[Slot]:
    """(x0, y0, x1, y1, diameter) of everything a program drills; the file must cause no remark."""
    drills = read(f"{head}{body}\nM30\n")
    assert drills.remarks == ()
    return rows(drills)


def rows(drills: DrillFile) -> list[Slot]:
    found = np.column_stack((drills.start, drills.end, drills.diameter))
    return [(a, b, c, d, e) for a, b, c, d, e in np.round(found, 9).tolist()]


def hole(x: float, y: float, diameter: float = 0.3) -> Slot:
    return (x, y, x, y, diameter)


@pytest.mark.parametrize(
    ("body", "expected"),
    [
        ("T1\nX1000Y2000", [hole(1, 2)]),
        ("T1\nX1000Y2000\nX3000\nY-500", [hole(1, 2), hole(3, 2), hole(3, -0.5)]),  # coordinates are modal
        ("T1\nX1.5Y2.\nX.25Y+3", [hole(1.5, 2), hole(0.25, 0.003)]),
        ("T01\nX1000Y1000\nT2\nX1000", [hole(1, 1), hole(1, 1, 1.0)]),
        ("T0102\nX1000Y1000", [hole(1, 1)]),  # tool 1, compensation 2
        ("T1\nN10X1000Y1000\nN20 X 2000", [hole(1, 1), hole(2, 1)]),
        ("T1(small vias)\nX1000Y1000(here)", [hole(1, 1)]),
        ("T1\nG05\nG90\nX1000Y1000\nG91\nX500\nX500Y-1000\nG90\nX0Y0", [hole(1, 1), hole(1.5, 1), hole(2, 0), hole(0, 0)]),
        ("T1\nG81\nX1000Y1000\nG80", [hole(1, 1)]),
        ("T1\nG81X1000Y1000", [hole(1, 1)]),
        ("T1\nX1000Y1000X2000Y1000", [hole(1, 1), hole(2, 1)]),
        ("T1X1000Y1000", [hole(1, 1)]),
        ("T3C0.5F200S65\nX1000Y1000", [hole(1, 1, 0.5)]),  # a tool defined in place is selected
        ("T2X0Y0\nT00\nT1\nX1000", [hole(0, 0, 1.0), hole(1, 0)]),
        ("T1\nX1000Y2000G85X3000Y2500", [(1, 2, 3, 2.5, 0.3)]),
        ("T1\nX1000Y2000G85X3000\nX4000", [(1, 2, 3, 2, 0.3), hole(4, 2)]),  # after a slot the tool is at its end
        ("T1\nX1000Y2000\nG85X3000", [hole(1, 2), (1, 2, 3, 2, 0.3)]),
        ("T1\nX1000Y1000\nR3X500", [hole(1, 1), hole(1.5, 1), hole(2, 1), hole(2.5, 1)]),
        ("T1\nX1000Y1000\nR2X500Y-250\nX0", [hole(1, 1), hole(1.5, 0.75), hole(2, 0.5), hole(0, 0.5)]),
        ("T1\nX0Y0G85X1000\nR1Y2000", [(0, 0, 1, 0, 0.3), (0, 2, 1, 2, 0.3)]),
        ("T1\nM25\nX0Y0\nX1000\nM01\nM02X5000\nM08", [hole(0, 0), hole(1, 0), hole(5, 0), hole(6, 0)]),
        ("T1\nM25\nX0Y0\nM01\nR3M02Y2000\nM08\nX9000Y0", [hole(0, 0), hole(0, 2), hole(0, 4), hole(0, 6), hole(9, 0)]),
        ("T1\nM25\nX0Y0\nT2\nX1000\nM01\nM02X5000\nM08", [hole(0, 0), hole(1, 0, 1.0), hole(5, 0), hole(6, 0, 1.0)]),
        ("T2\nG00X0Y0\nM15\nG01X2000\nY1000\nM16\nG05\nX5000Y5000", [(0, 0, 2, 0, 1.0), (2, 0, 2, 1, 1.0), hole(5, 5, 1.0)]),
        ("T2\nG00X0Y0\nG01X2000\nG00X0Y3000\nG01X2000", [(0, 0, 2, 0, 1.0), (0, 3, 2, 3, 1.0)]),  # no M15 in the whole file
        ("T2\nG00X0Y0\nM15\nG01X2000\nM17\nT1\nX1000Y1000", [(0, 0, 2, 0, 1.0), hole(1, 1)]),  # another tool ends route mode
        ("T2\nG00X1000Y1000\nM15\nM16\nG05", [hole(1, 1, 1.0)]),  # down and up in one place
        ("T1\nG93X0Y0\nM06\nX1000Y1000\nM09", [hole(1, 1)]),
        ("T1\nG04X500\nX1000Y1000", [hole(1, 1)]),  # the X of a pause is a time
        ("M47,LOAD THE SMALL TOOLS\nT1\nX1000Y1000", [hole(1, 1)]),
    ],
)
def test_commands(body: str, expected: list[Slot]) -> None:
    assert slots(body) == expected


def test_header_words_of_machines_have_no_effect() -> None:
    head = "%\nM48\nMETRIC,TZ,000.000\nVER,1\nFMAT,2\nICI,OFF\nATC,ON\nDETECT,ON\nR,H\nR,T\nPCKPARAM,X\n"
    head += "T1C.300F200S65.5B100H500Z-1.2\n/\nM95\n"
    assert slots("T1\nX1000Y1000", head) == [hole(1, 1)]


def test_incremental_input_from_the_header() -> None:
    assert slots("T1\nX1000Y1000\nX1000\nY1000", HEAD.replace("T1C", "ICI,ON\nT1C", 1)) == [hole(1, 1), hole(2, 1), hole(2, 2)]


def test_lines_may_end_with_carriage_returns_and_count() -> None:
    for end in ("\r\n", "\r", "\n"):
        drills = read(end.join([*HEAD.splitlines(), "T1", "X1000Y1000", "", "X2000", "M30", ""]))
        assert drills.line.tolist() == [7, 9]
        assert rows(drills) == [hole(1, 1), hole(2, 1)]


def test_lower_case_is_read() -> None:
    assert slots("t1\nx1000y1000g85x2000", HEAD.lower()) == [(1, 1, 2, 1, 0.3)]


def test_a_file_without_holes_is_fine() -> None:
    drills = read("M48\nMETRIC,TZ\nT1C0.3\n%\nG90\nG05\nM30\n")
    assert (len(drills.start), drills.start.shape, drills.line.dtype) == (0, (0, 2), np.dtype(np.int32))


@pytest.mark.parametrize(
    ("arc", "centre", "radius", "angles"),
    [
        ("G02X2000Y2000A2000", (2, 0), 2, (180, 90)),
        ("G03X2000Y2000A2000", (0, 2), 2, (-90, 0)),
        ("G02X2000Y2000I2000J0", (2, 0), 2, (180, 90)),
        ("G03X2000Y2000J2000", (0, 2), 2, (-90, 0)),
        ("G03X2000Y2000I2000", (2, 0), 2, (180, 450)),  # the long way round
        ("G02I1000J0", (1, 0), 1, (180, -180)),  # a full circle
        ("G02X4000A2000", (2, 0), 2, (180, 0)),  # exactly half a turn
        ("G02X2000Y2000A-2000", (0, 2), 2, (270, 0)),  # a negative radius: more than half a turn
    ],
)
def test_routed_arcs_are_chopped_to_a_micron(arc: str, centre: tuple[float, float], radius: float, angles: tuple[float, float]) -> None:
    found = slots(f"T2\nG00X0Y0\nM15\n{arc}\nM16\nG05")
    first, last = (math.radians(angle) for angle in angles)
    assert found[0][:2] == (0.0, 0.0)
    end = centre[0] + radius * math.cos(last), centre[1] + radius * math.sin(last)
    assert found[-1][2:4] == pytest.approx(end, abs=1e-9)
    assert all(a[2:4] == b[:2] for a, b in pairwise(found))
    points = np.array([row[:2] for row in found] + [found[-1][2:4]])
    assert np.hypot(*(points - centre).T) == pytest.approx(radius, abs=1e-8)
    middles = (points[1:] + points[:-1]) / 2
    assert np.hypot(*(middles - centre).T).min() >= radius - 0.001001  # exact: sagitta of a chord
    turned = np.unwrap(np.arctan2(*(points - centre).T[::-1]))
    assert turned[-1] - turned[0] == pytest.approx(last - first, abs=1e-6)


# plating, attributes, tables in comments


def plating(text: str) -> list[int]:
    drills = read(text)
    assert drills.remarks == ()
    return drills.plated.tolist()


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("M48\nMETRIC,TZ,000.000\n;TYPE=PLATED\nT1C0.3\n;TYPE=NON_PLATED\nT2C1\n%\nT1\nX0Y0\nT2\nX0Y0\nM30\n", [1, 0]),
        (HEAD + ";TYPE=PLATED\nT1\nX0Y0\n;TYPE=NON_PLATED\nT2\nX0Y0\nM30\n", [1, 0]),  # before the selection of a tool
        (HEAD + "T1\nX0Y0\nM30\n", [-1]),
        ("; #@! TF.FileFunction,Plated,1,4,PTH\n" + HEAD + "T1\nX0Y0\nM30\n", [1]),
        (";#@! TF.FileFunction,NonPlated,1,4,NPTH\n" + HEAD + "T1\nX0Y0\nM30\n", [0]),
        (
            "M48\n; #@! TF.FileFunction,MixedPlating,1,2\nMETRIC\n; #@! TA.AperFunction,Plated,PTH,ViaDrill\nT1C0.3\n"
            "; #@! TA.AperFunction,NonPlated,NPTH,ComponentDrill\nT2C1.0\n; #@! TD\nT3C1.0\n%\nT1\nX0.Y0.\nT2\nX0.\nT3\nX0.\nM30\n",
            [1, 0, -1],
        ),
        ("; Contents: Thru / Drill / Non-Plated\n" + HEAD + "T1\nX0Y0\nM30\n", [0]),
        (
            "; NON-PLATED HOLES START AT T1\n; THROUGH (PLATED) HOLES START AT T100\nM48\nINCH,TZ,00.0000\nT1C0.1\nT100C0.03\n%\nT1\nX0Y0\n"
            "T100\nX0Y0\nM30\n",
            [0, 1],
        ),
        (HEAD + "; plated=no\nT1\nX0Y0\nM30\n", [0]),
    ],
)
def test_plating(text: str, expected: list[int]) -> None:
    assert plating(text) == expected


def test_x2_attributes_in_comments_stay_with_their_holes() -> None:
    drills = read(
        "; #@! TF.FileFunction,Plated,1,2,Blind\n; #@! TF.Part,Single\n"
        + HEAD
        + "T1\n; #@! TO.N,TIDE_CLK\n; #@! TO.P,U1,A4,clk\nX0Y0\nX1000\n; #@! TO.N,SUM\\u002CDIFF\nX2000\n; #@! TD\nX3000\nM30\n"
    )
    assert drills.attributes[".FileFunction"] == ("Plated", "1", "2", "Blind")
    assert [drills.nets[index] if index >= 0 else None for index in drills.net] == [("TIDE_CLK",), ("TIDE_CLK",), ("SUM,DIFF",), None]
    assert [drills.pins[index] if index >= 0 else None for index in drills.pin] == [Pin("U1", "A4", "clk")] * 3 + [None]
    assert drills.remarks == ()


@pytest.mark.parametrize(
    ("table", "diameter", "plated"),
    [
        ("; T01 = 0.3mm", 0.3, -1),
        ("; T1: 12 mil", 0.3048, -1),
        (";T1 Holesize 1. = 0.300000 Tolerance = +0.000000/-0.000000 PLATED MM Quantity = 30", 0.3, 1),
        (";   Holesize 1. = 12.000000 Tolerance = +0.000000/-0.000000 NON_PLATED MILS Quantity = 30", 0.3048, 0),
        ("; TOOL 1 DIAMETER = 0.3", 0.3, -1),  # in the unit of the file
    ],
)
def test_diameters_from_a_table_in_comments(table: str, diameter: float, plated: int) -> None:
    drills = read(f"M48\n{table}\nMETRIC,TZ,000.000\n%\nT01\nX0Y0\nM30\n")
    assert drills.diameter.tolist() == pytest.approx([diameter], abs=1e-12)
    assert drills.plated.tolist() == [plated]
    (remark,) = drills.remarks
    assert (remark.kind, remark.line) == (RemarkKind.GUESS, 2)
    assert "table in the comments" in remark.text


def test_without_tool_words_a_stop_changes_to_the_next_tool_of_the_table() -> None:
    # Common practice of one layout tool, from memory.
    drills = read("; Holesize 1. = 0.3 PLATED MM\n; Holesize 2. = 0.9 NON_PLATED MM\n%\nG90\nM71\nX1.0Y1.0\nM00\nX2.0Y1.0\nM00\nM30\n")
    assert rows(drills) == [hole(1, 1, 0.3), hole(2, 1, 0.9)]
    assert drills.plated.tolist() == [1, 0]


# what is odd is said


@pytest.mark.parametrize(
    ("text", "kind", "said"),
    [
        (HEAD + "T1\nX0Y0\n", RemarkKind.ODD, "does not end with M30"),
        (HEAD + "T1\nX0Y0\nM30\nX1000\n", RemarkKind.ODD, "what follows the end of the program"),
        (HEAD + "T2\nG00X0Y0\nM15\nG01X1000\nM16\nG00X0Y1000\nG01X2000\nM30\n", RemarkKind.ODD, "a route without M15 was taken to cut"),
        (HEAD + "T2\nG00X0Y0\nM15\nG01X1000\nM16\nG01X2000\nM30\n", RemarkKind.ODD, "with the tool lifted"),
        (HEAD + "T2\nG41\nG00X0Y0\nM15\nG01X1000\nM16\nM30\n", RemarkKind.LIMIT, "cutter compensation"),
        (HEAD + "T1\nX0Y0\nM97,TIDE\nX1000Y9000\nM30\n", RemarkKind.LIMIT, "drilled text"),
        (HEAD + "T1\nM25\nX0Y0\nM01\nM02X5000\nM02Y5000\nM08\nM30\n", RemarkKind.GUESS, "each offset is counted from the copy before it"),
        (HEAD + "T1\n/X0Y0\nM30\n", RemarkKind.ODD, "optional block"),
        (HEAD.replace("%\n", "") + "T1\nX0Y0\nM30\n", RemarkKind.ODD, "the header does not end with %"),
        (HEAD.replace("%\n", "LASER,ON\n%\n") + "T1\nX0Y0\nM30\n", RemarkKind.ODD, "'LASER,ON' in the header is not known"),
        (HEAD.replace("0.300", "00300") + "T1\nX0Y0\nM30\n", RemarkKind.ODD, "read in the digits of the coordinates as 0.3 mm"),
        (HEAD.replace("METRIC", "FMAT,1\nMETRIC") + "T1\nX0Y0\nM30\n", RemarkKind.ODD, "is read like FMAT,2"),
    ],
)
def test_remarks(text: str, kind: RemarkKind, said: str) -> None:
    (remark,) = read(text).remarks
    assert said in remark.text
    assert (remark.kind, remark.file) == (kind, "tide.drl")
    assert remark.line > 0


def test_a_lifted_move_cuts_nothing_and_a_route_without_m15_cuts() -> None:
    assert rows(read(HEAD + "T2\nG00X0Y0\nM15\nG01X1000\nM16\nG01X2000\nM30\n")) == [(0, 0, 1, 0, 1.0)]
    assert rows(read(HEAD + "T2\nG00X0Y0\nM15\nG01X1000\nM16\nG00X0Y1000\nG01X2000\nM30\n")) == [(0, 0, 1, 0, 1.0), (0, 1, 2, 1, 1.0)]


# second opinions

PLACE = st.tuples(st.integers(-90_000, 90_000), st.integers(-90_000, 90_000))


@settings(max_examples=80, deadline=None)
@given(
    places=st.lists(st.tuples(PLACE, st.one_of(st.none(), PLACE), st.sampled_from([0.3, 0.9, 1.35])), min_size=1, max_size=12),
    unit=st.sampled_from(["mm", "inch"]),
    zeros=st.sampled_from(["decimal", "LZ", "TZ"]),
    routed=st.booleans(),
)
def test_files_of_an_independent_writer_come_back(
    places: list[tuple[tuple[int, int], tuple[int, int] | None, float]], unit: str, zeros: str, routed: bool
) -> None:
    step = 0.001 if unit == "mm" else 0.00254  # the last digit of 3.3 mm and 2.4 inch
    holes = [
        Drilled((at[0] * step, at[1] * step), diameter, None if end in (None, at) else (end[0] * step, end[1] * step))
        for at, end, diameter in places
    ]
    drills = read(excellon(holes, unit, zeros, routed=routed))
    order = list(dict.fromkeys(h.diameter for h in holes))  # the writer groups holes by tool
    expected = [(*h.at, *(h.end or h.at), h.diameter) for h in sorted(holes, key=lambda h: order.index(h.diameter))]
    found = np.column_stack((drills.start, drills.end, drills.diameter))
    # mm: half the last of five decimals of an inch, which is how the writer gives diameters
    assert found == pytest.approx(np.array(expected), abs=0.5e-5 * 25.4 * 1.001)
    assert drills.remarks == ()


@pytest.mark.parametrize(
    "text",
    [
        "M48\nINCH,LZ,00.0000\nT1C0.02\nT2C0.05\n%\nG90\nT1\nX01Y02\nX0105\nY000625\nT2\nX003Y-01\nM30\n",
        "M48\nINCH,TZ,00.0000\nT1C0.02\n%\nG90\nT1\nX10000Y625\nX-10500\nY25000\nM30\n",
        "M48\nMETRIC,LZ,000.000\nT1C0.5\n%\nG90\nT1\nX01Y02\nX0105\nM30\n",
        "M48\nMETRIC,TZ,000.00\nT1C0.5\n%\nG90\nT1\nX1000Y625\nX10500\nM30\n",
        "M48\nMETRIC,TZ,000.000\nT1C0.5\n%\nG90\nT1\nX1000Y1000\nR4X2000Y-500\nX0Y0\nM30\n",
        "M48\nMETRIC,TZ,000.000\nT1C0.5\n%\nG90\nT1\nG00X1000Y1000\nM15\nG01X3000Y2000\nM16\nG05\nX0Y0\nM30\n",
    ],
)
def test_places_agree_with_gerbonara(text: str, tmp_path: Path) -> None:
    path = tmp_path / "tide.drl"
    path.write_text(text)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        objects = gerbonara.ExcellonFile.open(path).objects
    theirs = []
    for thing in objects:
        there = thing.converted(MM)
        ends = (there.x, there.y, there.x, there.y) if hasattr(there, "x") else (there.x1, there.y1, there.x2, there.y2)
        theirs.append((*ends, there.tool.equivalent_width(MM)))
    assert np.array(sorted(rows(read(text)))) == pytest.approx(np.array(sorted(theirs)), abs=1e-6)


def test_the_area_cut_by_a_routed_ring_is_that_of_a_ring() -> None:
    # exact: a full circle of radius 2 mm cut with a 1 mm tool takes pi (2.5^2 - 1.5^2) mm^2; chords of 1 um error take at most 0.1 % less.
    found = slots("T2\nG00X0Y0\nM15\nG03I2000J0\nM16\nG05")
    line = LineString([found[0][:2], *(row[2:4] for row in found)])
    assert line.buffer(0.5, quad_segs=64).area == pytest.approx(math.pi * 4.0, rel=1e-3)
    assert not line.buffer(0.5).contains(Point(2, 0))


def test_twenty_thousand_holes_are_read_quickly() -> None:
    lines = [f"X{(k * 37) % 200_000:06d}Y{(k * 91) % 150_000:06d}" for k in range(20_000)]
    text = (HEAD + "T1\n" + "\n".join(lines) + "\nM30\n").encode()
    best = math.inf
    for _ in range(3):
        begin = time.process_time()
        drills = read_excellon(text, "tide.drl", extent=(0, 0, 200, 150))
        best = min(best, time.process_time() - begin)
    assert len(drills.start) == 20_000
    assert best < 0.3  # s, the bar set for this reader
