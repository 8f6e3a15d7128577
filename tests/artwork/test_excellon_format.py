"""Units, zeros and digits: stated, in comments, or found by where the holes then lie. Sources of the real files: tests/open_data.py."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from impcheck.artwork.excellon import read_excellon
from impcheck.artwork.gerber import read_gerber
from impcheck.artwork.image import Kind
from impcheck.errors import InputError, RemarkKind
from tests.open_data import fetch, reasons

BODY = "T1C{size}\n%\nT1\nX{x}Y{y}\nM30\n"


def place(head: str, x: str, y: str, size: str = "0.3", said: tuple[RemarkKind, ...] = ()) -> tuple[float, float]:
    drills = read_excellon(f"M48\n{head}\n{BODY.format(x=x, y=y, size=size)}".encode(), "tide.drl")
    assert tuple(remark.kind for remark in drills.remarks) == said
    found = drills.start.round(9).tolist()[0]
    return found[0], found[1]


# exact: the value follows from the definition of the digits
@pytest.mark.parametrize(
    ("head", "x", "y", "expected"),
    [
        ("METRIC,TZ,000.000", "1500", "-250", (1.5, -0.25)),
        ("METRIC,TZ,0000.00", "1500", "-250", (15.0, -2.5)),
        ("METRIC,LZ,000.000", "0015", "-01", (1.5, -10.0)),
        ("METRIC,LZ,0000.00", "0015", "-01", (15.0, -100.0)),
        ("INCH,TZ,00.0000", "15000", "1", (38.1, 0.00254)),
        ("INCH,LZ,00.0000", "015", "001", (38.1, 2.54)),
        (";FILE_FORMAT=2:4\nINCH,TZ", "15000", "1", (38.1, 0.00254)),
        (";FILE_FORMAT=2:3\nINCH,LZ", "0152", "00455", (38.608, 11.557)),
        (";FILE_FORMAT=4:4\nMETRIC,TZ", "15000", "10000", (1.5, 1.0)),
        (";FORMAT={3:3/ absolute / metric / keep zeros}\nMETRIC,TZ", "001500", "000250", (1.5, 0.25)),
        (";FORMAT={3:3/ absolute / metric / suppress leading zeros}", "1500", "250", (1.5, 0.25)),
        (";FORMAT={2:4/ absolute / inch / suppress trailing zeros}", "015", "1", (38.1, 254.0)),
        (";FORMAT={2:4/ absolute / inch / suppress trailing zeros}\nM72", "015", "1", (38.1, 254.0)),
        ("; Format  : 3.3 / Absolute / MM / Leading", "1500", "250", (1.5, 0.25)),
        ("METRIC,000.000,LZ", "0015", "01", (1.5, 10.0)),
        ("METRIC", "1.5", "-.25", (1.5, -0.25)),
        ("INCH,LZ", "1.5", "0.1", (38.1, 2.54)),
        ("M71", "1.5", "2.", (1.5, 2.0)),
        ("M72", "1.5", "2.", (38.1, 50.8)),
        ("G71", "1.5", "2.", (1.5, 2.0)),
        ("G90M72", "1.5", "2.", (38.1, 50.8)),
        ("METRIC,TZ ; as agreed", "1.5", "2.", (1.5, 2.0)),
    ],
)
def test_stated_formats(head: str, x: str, y: str, expected: tuple[float, float]) -> None:
    assert place(head, x, y) == pytest.approx(expected, abs=1e-9)


@pytest.mark.parametrize(
    ("head", "x", "y", "expected", "lacks", "taken"),
    [
        ("INCH,TZ", "15000", "10000", (38.1, 25.4), "digits", "inch, 2.4 digits, trailing zeros kept"),
        ("INCH,LZ", "015", "01", (38.1, 25.4), "digits", "inch, 2.4 digits, leading zeros kept"),
        ("METRIC,TZ", "1500", "1000", (1.5, 1.0), "digits", "mm, 3.3 digits, trailing zeros kept"),
        ("METRIC,LZ", "0015", "001", (1.5, 1.0), "digits", "mm, 3.3 digits, leading zeros kept"),
        ("METRIC", "1500", "1000", (1.5, 1.0), "digits and zeros", "mm, 3.3 digits, trailing zeros kept"),
    ],
)
def test_without_an_extent_the_usual_is_taken_and_said(
    head: str, x: str, y: str, expected: tuple[float, float], lacks: str, taken: str
) -> None:
    assert place(head, x, y, said=(RemarkKind.GUESS,)) == pytest.approx(expected, abs=1e-9)
    (remark,) = read_excellon(f"M48\n{head}\n{BODY.format(x=x, y=y, size='0.3')}".encode(), "tide.drl").remarks
    assert remark.text == f"the drill file does not state its {lacks}; read as {taken}, as is usual"


@pytest.mark.parametrize(("size", "scale"), [("0.3", 1.0), ("0.012", 25.4), ("0.8", 1.0), ("0.035", 25.4)])
def test_without_unit_and_extent_the_tools_decide(size: str, scale: float) -> None:
    # Common practice: drills of boards are 0.1 to 6.5 mm.
    assert place("FMAT,2", "1.5", "1.0", size, (RemarkKind.GUESS,)) == pytest.approx((1.5 * scale, scale), abs=1e-9)


def test_a_comment_that_contradicts_a_command_is_said_and_not_followed() -> None:
    drills = read_excellon(b"M48\n;FORMAT={3:3/ absolute / metric / decimal}\nINCH,TZ\nT1C0.02\n%\nT1\nX1.0Y1.0\nM30\n", "tide.drl")
    (remark,) = drills.remarks
    assert (remark.kind, remark.line) == (RemarkKind.DISAGREEMENT, 2)
    assert "another unit than line 3" in remark.text
    assert drills.start.tolist() == [[25.4, 25.4]]


def test_commands_that_contradict_each_other_are_an_error() -> None:
    with pytest.raises(InputError) as caught:
        read_excellon(b"M48\nINCH,TZ\nT1C0.02\n%\nM71\nT1\nX1.0Y1.0\nM30\n", "tide.drl")
    (problem,) = caught.value.problems
    assert (problem.line, problem.message) == (5, "the unit differs from that of line 2")


def test_holes_off_the_board_in_a_stated_format_are_said() -> None:
    text = b"M48\nINCH,TZ,00.0000\nT1C0.02\n%\nT1\nX90000Y90000\nX80000\nM30\n"
    (remark,) = read_excellon(text, "tide.drl", extent=(0.0, 0.0, 40.0, 30.0)).remarks
    assert remark.kind == RemarkKind.DISAGREEMENT
    assert "most holes lie off the board when read as stated" in remark.text
    assert read_excellon(text, "tide.drl", extent=(0.0, 0.0, 240.0, 230.0)).remarks == ()


@settings(max_examples=60, deadline=None)
@given(
    unit=st.sampled_from(["mm", "inch"]),
    leading=st.booleans(),
    decimals=st.sampled_from([0, 1]),
    seed=st.integers(0, 10_000),
    said=st.sampled_from(["unit and zeros", "unit", "nothing"]),
    at=st.tuples(st.floats(-100, 100), st.floats(-100, 100)),
)
def test_the_board_settles_what_the_file_does_not_say(
    unit: str, leading: bool, decimals: int, seed: int, said: str, at: tuple[float, float]
) -> None:
    """Holes spread over a board, written in some usual format, come back where they were (a pinned seed draws them)."""
    digits = {"mm": ((3, 3), (4, 2)), "inch": ((2, 4), (3, 3))}[unit][decimals]
    per = 25.4 if unit == "inch" else 1.0
    random = np.random.default_rng(seed)
    low, size = np.array(at), random.uniform(25, 120, 2)
    corners = np.array([[0.03, 0.03], [0.97, 0.03], [0.97, 0.97], [0.03, 0.97]])
    holes = low + size * np.vstack((corners, random.uniform(0.03, 0.97, (30, 2))))

    def number(value: float) -> str:
        whole = round(abs(value) / per * 10 ** digits[1])
        text = f"{whole:0{sum(digits)}d}"
        text = (text.rstrip("0") or "0") if leading else str(whole)
        return ("-" if value < 0 else "") + text

    head = {
        "unit and zeros": f"{'METRIC' if unit == 'mm' else 'INCH'},{'LZ' if leading else 'TZ'}",
        "unit": "M71" if unit == "mm" else "M72",
    }
    body = "\n".join(f"X{number(x)}Y{number(y)}" for x, y in holes)
    text = f"M48\n{head.get(said, 'FMAT,2')}\nT1C{0.3 / per:.4f}\nT2C{1.0 / per:.4f}\n%\nT1\n{body}\nM30\n"
    drills = read_excellon(text.encode(), "tide.drl", extent=(*low.tolist(), *(low + size).tolist()))
    assert np.abs(drills.start - holes).max() <= 0.51 * per / 10 ** digits[1]
    (remark,) = drills.remarks
    assert remark.kind == RemarkKind.GUESS
    assert remark.text.endswith("because then its holes lie on the board")


# real files

# Drill file, a copper file of the same board, number of holes (counted with grep), the format and how it is known.
_BOARDS = [
    ("tracespace", "boards/freeduino", "freeduino.drd", "freeduino.cmp", 176, "inch, 2.4"),  # says INCH,TZ only
    ("tracespace", "boards/arduino-uno", "arduino-uno.drd", "arduino-uno.cmp", 169, ""),
    ("tracespace", "boards/mchck", "mchck.drl", "mchck-F_Cu.pho", 73, ""),
    ("tracespace", "boards/usbvil", "pic18f14k50.txt", "pic18f14k50.gtl", 40, ""),
    ("tracespace", "boards/clockblock", "clockblock.drl", "clockblock-F_Cu.gbr", 206, ""),
    ("tracespace", "boards/bus-pirate", "BusPirate-v3.6a-SSOP.drd", "BusPirate-v3.6a-SSOP.cmp", 107, "inch, 2.4"),
    ("tracespace", "boards/core", "core.TXT", "core.GTL", 92, "inch, 2.4"),
    ("tracespace", "boards/8bit-mixtape", "mixtape.txt", "mixtape.gtl", 85, "inch, 2.4"),  # says M72 only
    ("gerbv", "hellboard", "hellboard.plated-drill.cnc", "hellboard.front.gbr", 360, "inch, 2.4"),
    ("gerbv", "numpres", "numpres.pcb.output_plated-drill.grb", "numpres.pcb.output_group1.grb", 85, "inch, 3.3"),
    ("gerbv", "nollezappare", "ThruHolePlated.ncd", "EtchLayer2Bottom.gdo", 94, "mm, 3.3"),  # says M71 only
    ("gerbv", "protel-pnp", "SE_SG_IF_V2.TXT", "SE_SG_IF_V2.GTL", 427, ""),
]


@pytest.mark.parametrize(("package", "folder", "drill", "copper", "count", "taken"), _BOARDS)
def test_holes_of_real_boards_lie_in_pads(package: str, folder: str, drill: str, copper: str, count: int, taken: str) -> None:
    root = fetch(package)
    if root is None:
        pytest.skip(reasons[package])
    found = next(root.rglob(f"{folder}/{drill}")).parent
    image = read_gerber((found / copper).read_bytes(), copper)
    points = np.vstack((image.start, image.end, image.contours.start))
    extent = (*points.min(axis=0).tolist(), *points.max(axis=0).tolist())
    drills = read_excellon((found / drill).read_bytes(), drill, extent=extent)
    assert len(drills.start) == count
    remarks = [remark.text for remark in drills.remarks if remark.kind is not RemarkKind.ODD]
    assert [taken in text for text in remarks] == ([True] if taken else [])
    # Pads are flashed, and traces end, where holes are (to the last digit of both files); what lies elsewhere is a mounting hole.
    pads = np.vstack((image.start, image.end))[np.tile(image.kind != Kind.REGION, 2)]
    distance = np.array([np.hypot(*(pads - at).T).min() for at in drills.start])
    assert np.mean(distance <= 0.03) >= 0.75


def test_a_set_of_files_of_one_ten_layer_board_is_read() -> None:
    root = fetch("gerbv")
    if root is None:
        pytest.skip(reasons["gerbv"])
    folder = next(root.rglob("ekf2/drill0.exc")).parent
    counts = {path.name: len(read_excellon(path.read_bytes(), path.name).start) for path in sorted(folder.glob("*.exc"))}
    assert counts == {"drill0.exc": 2704, "drill1.exc": 16, "drill20.exc": 202, "drill30.exc": 73}  # lines with X or Y, counted with grep
