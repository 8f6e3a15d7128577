"""IPC-D-356 and 356A netlists. The columns are those of the standard (from memory); values are exact: 0.0001 inch is 2.54 um.

The second opinion is gerbonara (test only) on plain 317 and 327 records, and a writer that shares no code with the reader.
"""

from __future__ import annotations

import math
import random
import time
import warnings

import numpy as np
import pytest
from gerbonara.ipc356 import Netlist
from gerbonara.utils import MM
from hypothesis import given, settings
from hypothesis import strategies as st

from impcheck.artwork.ipc356 import read_ipc356
from impcheck.artwork.limits import Limits
from impcheck.artwork.parts import NetlistPoints
from impcheck.errors import InputError, RemarkKind

HEAD = "C  made up\nP  JOB   tide\nP  UNITS CUST 0\n"
PIN = "317CLK              U1    -A12  D0138PA00X+012500Y-003000X0236Y0000R000 S0\n"
PAD = "327GND              C100  -2           A01X+012600Y+003000X0236Y0300R090 S2\n"


def read(text: str, limits: Limits | None = None) -> NetlistPoints:
    return read_ipc356(text.encode("latin-1"), "tide.ipc", limits or Limits())


def quiet(text: str) -> NetlistPoints:
    found = read(text)
    assert found.remarks == ()
    return found


def test_a_pin_and_a_pad() -> None:
    found = quiet(HEAD + PIN + PAD + "999\n")
    assert found.net == ("CLK", "GND")
    assert found.component == ("U1", "C100")
    assert found.pin == ("A12", "2")
    assert found.at == pytest.approx(np.array([[31.75, -7.62], [32.004, 7.62]]), abs=1e-12)
    assert found.drill == pytest.approx([0.35052, math.nan], abs=1e-12, nan_ok=True)
    assert found.size == pytest.approx(np.array([[0.59944, 0.0], [0.59944, 0.762]]), abs=1e-12)
    assert (found.plated.tolist(), found.access.tolist(), found.mid.tolist()) == ([True, False], [0, 1], [False, False])
    assert (found.line.tolist(), found.first.tolist(), found.last.tolist()) == ([4, 5], [0, 0], [0, 0])


# exact: CUST 0 and 2 are 0.0001 inch, CUST 1 and SI are 0.001 mm
@pytest.mark.parametrize(
    ("units", "unit"),
    [("CUST 0", 0.00254), ("CUST", 0.00254), ("CUST 1", 0.001), ("CUST 2", 0.00254), ("SI", 0.001), ("cust 1", 0.001), ("CUST, 1", 0.001)],
)
def test_units(units: str, unit: float) -> None:
    assert quiet(f"P  UNITS {units}\n{PIN}999\n").at[0] == pytest.approx((12500 * unit, -3000 * unit), abs=1e-12)


def test_without_units_ten_thousandths_of_an_inch_are_assumed_and_said() -> None:
    (remark,) = read(f"P  JOB tide\n{PIN}999\n").remarks
    assert (remark.kind, remark.line) == (RemarkKind.GUESS, 2)
    assert "0.0001 inch is assumed" in remark.text


def test_long_names_are_resolved_also_continued_ones_and_wherever_they_stand() -> None:
    text = HEAD + "P  NNAME1  A_VERY_LONG_NAME_OF_A_NET_THAT_\n" + PIN.replace("CLK   ", "NNAME1") + PAD.replace("GND   ", "nname2")
    found = quiet(text + "P  NNAME1  GOES_ON\nP  NNAME2  DATA[3] TIDE\n999\n")
    assert found.net == ("A_VERY_LONG_NAME_OF_A_NET_THAT_GOES_ON", "DATA[3] TIDE")


def test_an_alias_without_a_name_is_said() -> None:
    (remark,) = read(HEAD + PIN.replace("CLK   ", "NNAME7") + "999\n").remarks
    assert (remark.kind, remark.line) == (RemarkKind.ODD, 4)
    assert "the long name of NNAME7 is not given" in remark.text


@pytest.mark.parametrize("code", ["017", "007", "027"])
def test_a_continuation_gives_a_point_only_where_it_names_another_place(code: str) -> None:
    same = f"{code}                              A02X+012500Y-003000X0300Y0300R000 S0\n"
    other = f"{code}                              A02X+022500Y-003000X0300Y0300R000 S0\n"
    more = f"{code}                 and more\n"
    assert len(quiet(HEAD + PIN + same + more + PAD + "999\n").net) == 2
    found = quiet(HEAD + PIN + same + other + PAD + "999\n")
    assert found.net == ("CLK", "CLK", "GND")
    assert found.component[1] == "U1"
    assert found.at[1] == pytest.approx((57.15, -7.62), abs=1e-12)


def test_blind_and_buried_vias_name_their_layers() -> None:
    blind = "307CLK              VIA   -    MD0079PA01X+001000Y+002000X0180Y0000R000 S3 L01L03\n"
    buried = "307CLK              VIA         D0079PA00X+001000Y+002500X0180Y0000R000 S3\n027  L04 L02\n"
    found = quiet(HEAD + blind + buried + "999\n")
    assert found.component == ("VIA", "VIA")
    assert found.pin == ("", "")
    assert (found.mid.tolist(), found.access.tolist()) == ([True, False], [1, 0])
    assert list(zip(found.first.tolist(), found.last.tolist(), strict=True)) == [(1, 3), (2, 4)]


def test_unconnected_points_and_tooling_holes_are_left_out() -> None:
    tooling = "367N/C              TOOL        D1250UA00X+000000Y+000000X1250Y0000R000 S0\n"
    assert quiet(HEAD + PIN + PAD.replace("GND", "N/C") + tooling + PAD.replace("GND", "   ") + "999\n").net == ("CLK",)


def test_an_unplated_hole_says_so() -> None:
    assert quiet(HEAD + PIN.replace("0138P", "0138U") + PIN.replace("0138P", "0138 ") + "999\n").plated.tolist() == [False, True]


def test_conductors_and_outlines_are_no_test_points() -> None:
    extra = (
        "378CLK             L01 X0100 X+012500Y-003000 X+013500\n078 X+014000\n389BOARD_EDGE         X+000000Y+000000 X+060000 Y+040000\n"
    )
    found = read(HEAD + PIN + extra + PAD + "999\n")
    assert found.net == ("CLK", "GND")
    (remark,) = found.remarks
    assert (remark.kind, remark.line) == (RemarkKind.ODD, 5)
    assert remark.text == "records of conductors and outlines (3) are no test points and were left out"


@pytest.mark.parametrize(
    "record",
    [
        "317CLK              U1    -A12  D0138PA00X+012500Y-003000",
        "317CLK              U1    -A12  D0138PA00X+012500Y-003000        ",
        "317CLK              U1    -A12  D0138PA00X 012500Y-003000X0236",
        "317CLK              U1    -A12       PA00X+012500Y-003000X0236",
        "317clk              u1    -a12  d0138pa00x+012500y-003000x0236y0000r000 s0",
    ],
)
def test_sloppy_records(record: str) -> None:
    found = quiet(f"{HEAD}{record}\r\n999\r\n".replace("\n", "\r\n").replace("\r\r", "\r"))
    assert [net.upper() for net in found.net] == ["CLK"]
    assert (found.component[0].upper(), found.pin[0].upper()) == ("U1", "A12")
    assert found.at[0] == pytest.approx((31.75, -7.62), abs=1e-12)


def test_a_part_name_that_is_too_long_moves_the_rest() -> None:
    found = quiet(HEAD + "317CLK              CONNECTOR7-A12 MD0138PA00X+012500Y-003000X0236Y0000R000 S0\n999\n")
    assert (found.component, found.pin, found.mid.tolist()) == (("CONNECTOR7",), ("A12",), [True])


def test_a_net_name_of_seventeen_characters_is_whole() -> None:
    assert quiet(HEAD + PIN.replace("CLK              ", "TIDE_CLOCK_OUTPUT") + "999\n").net == ("TIDE_CLOCK_OUTPUT",)


def test_what_is_odd_is_said() -> None:
    (remark,) = read(HEAD + PIN).remarks
    assert (remark.kind, remark.text) == (RemarkKind.ODD, "the netlist does not end with 999; it may be cut short")
    (remark,) = read(HEAD + PIN + "555 something\n999\n").remarks
    assert remark.text == "records of unknown kind were left out: 555 (1)"


@pytest.mark.parametrize(
    ("text", "line", "message"),
    [
        ("", 0, "the file is empty"),
        ("Dear fab house,\nplease test this board.\n", 0, "this is no IPC-D-356 netlist"),
        ("Copper is nice\n", 0, "this is no IPC-D-356 netlist"),
        ("M48\nMETRIC,TZ\nT1C0.3\n%\nT1\nX1Y1\nM30\n", 0, "this is no IPC-D-356 netlist"),
        (HEAD + "317CLK              U1    -A12  D0138PA00X+0125\n999\n", 4, "record 317 names no place"),
        (HEAD + PIN + "hello\n999\n", 5, "'hello' is no IPC-D-356 record"),
        ("P  UNITS CUST 7\n999\n", 1, "the units 'CUST 7' are not known"),
        (HEAD + "017                              A02X+012500Y-003000\n999\n", 4, "record 017 continues no record before it"),
        (HEAD + PIN.replace("+012500", "+99999999") + "999\n", 4, "farther out than any board reaches"),
    ],
)
def test_mistakes_are_named_with_their_line(text: str, line: int, message: str) -> None:
    with pytest.raises(InputError) as caught:
        read(text)
    (problem,) = caught.value.problems
    assert message in problem.message
    assert (problem.file, problem.line) == ("tide.ipc", line)
    assert problem.remedy


def test_limits_are_named() -> None:
    with pytest.raises(InputError, match="limit objects = 3"):
        read(HEAD + PIN * 5 + "999\n", Limits(objects=3))
    with pytest.raises(InputError, match="limit file_bytes = 3"):
        read(HEAD, Limits(file_bytes=3))


NAME = st.text("ABCXYZ0123456789_-+/.", min_size=1, max_size=14).filter(lambda name: name.strip() not in ("N/C", "NC"))
POINT = st.tuples(NAME, st.integers(-999_999, 999_999), st.integers(-999_999, 999_999), st.booleans(), st.integers(1, 9999))


@settings(max_examples=60, deadline=None)
@given(st.lists(POINT, min_size=1, max_size=15), st.sampled_from([0, 1]))
def test_plain_records_agree_with_gerbonara(points: list[tuple[str, int, int, bool, int]], units: int) -> None:
    records = []
    for index, (net, x, y, through, size) in enumerate(points):
        hole = f"D{size:04d}P" if through else "      "
        code, access = (317, 0) if through else (327, 1)
        records.append(f"{code}{net:<14}   {f'U{index}':<6}-{index:<4} {hole}A{access:02d}X{x:+07d}Y{y:+07d}X{size:04d}Y{size:04d}R000 S0")
    text = "\n".join([f"P  UNITS CUST {units}", *records, "999", ""])
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        theirs = Netlist.from_string(text, "tide.ipc").test_records
    found = quiet(text)
    assert found.net == tuple(record.net_name for record in theirs)
    assert found.component == tuple(record.ref_des for record in theirs)
    there = np.array([(MM(record.x, record.unit), MM(record.y, record.unit)) for record in theirs])
    assert found.at == pytest.approx(there, abs=1e-9)
    drills = [MM(record.hole_dia, record.unit) if record.hole_dia else math.nan for record in theirs]
    assert found.drill == pytest.approx(drills, abs=1e-9, nan_ok=True)


@settings(max_examples=150, deadline=None)
@given(st.integers(0, 2**32))
def test_damaged_files_never_give_a_traceback(seed: int) -> None:
    rng = random.Random(seed)
    data = bytearray((HEAD + "P  NNAME1  LONG\n" + PIN + PAD + "017  A02X+012500Y-003100\n999\n").encode())
    for _ in range(rng.randint(1, 8)):
        at = rng.randrange(len(data))
        if rng.random() < 0.5:
            data[at] = rng.choice(b"XYDAPLMRS0123456789+- \n\r\xff\x00")
        else:
            del data[at : at + rng.randint(1, 12)]
    try:
        read_ipc356(bytes(data), "tide.ipc")
    except InputError as error:
        assert all(problem.message for problem in error.problems)


def test_five_thousand_records_take_little_time() -> None:
    text = HEAD + "".join(PIN.replace("CLK     ", f"NET{k:05d}") for k in range(5_000)) + "999\n"
    begin = time.process_time()
    assert len(read(text).net) == 5_000
    assert time.process_time() - begin < 0.5
