"""Gerber drill files. Expected places are exact; areas of slots in closed form; the worked example follows the X2 drill files of the
Gerber Layer Format Specification (from memory)."""

from __future__ import annotations

import math

import numpy as np
import pytest

from impcheck.artwork.gerber import read_gerber
from impcheck.artwork.gerber_drill import drills_from_gerber
from impcheck.artwork.parts import DrillFile
from impcheck.errors import InputError, Problem, RemarkKind

HEAD = (
    "%FSLAX33Y33*%\n%MOMM*%\n%TF.FileFunction,{function}*%\n%ADD10C,0.3*%\n%ADD11O,1X3*%\n%ADD12R,1X1*%\n%ADD13C,0*%\n%ADD14O,2X2*%\nG01*\n"
)


def read(body: str, function: str = "Plated,1,4,PTH") -> DrillFile:
    return drills_from_gerber(read_gerber((HEAD.format(function=function) + body + "\nM02*\n").encode(), "tide-drill.gbr"))


def test_flashes_are_holes_and_strokes_are_slots() -> None:
    drills = read("D10*\nX1000Y2000D03*\nX0Y0D02*\nX5000Y1000D01*")
    assert drills.start.tolist() == [[1, 2], [0, 0]]
    assert drills.end.tolist() == [[1, 2], [5, 1]]
    assert drills.diameter.tolist() == [0.3, 0.3]
    assert drills.line.tolist() == [11, 13]
    assert (drills.file, drills.attributes[".FileFunction"]) == ("tide-drill.gbr", ("Plated", "1", "4", "PTH"))
    assert drills.remarks == ()


@pytest.mark.parametrize(
    ("function", "plated"),
    [("Plated,1,4,PTH", 1), ("Plated,1,2,Blind", 1), ("NonPlated,1,4,NPTH", 0), ("Drillmap", -1)],
)
def test_plating_follows_the_file_function(function: str, plated: int) -> None:
    drills = read("D10*\nX1000Y2000D03*", function)
    assert drills.plated.tolist() == [plated]
    assert drills.plated.dtype == np.int8


def test_nets_and_pins_stay_with_their_holes() -> None:
    drills = read("D10*\n%TO.N,CLK*%\n%TO.P,U1,4*%\nX0Y0D03*\n%TD*%\nX1000D03*")
    assert [drills.nets[index] if index >= 0 else None for index in drills.net] == [("CLK",), None]
    assert [drills.pins[index].component if index >= 0 else None for index in drills.pin] == ["U1", None]


@pytest.mark.parametrize(
    ("commands", "reach", "diameter"),
    [
        ("", (0.0, 1.0), 1.0),
        ("%LR90*%\n", (-1.0, 0.0), 1.0),
        ("%LR30*%\n", (-0.5, math.sqrt(0.75)), 1.0),
        ("%LS2*%\n", (0.0, 2.0), 2.0),
        ("%LMX*%\n%LR30*%\n", (-0.5, math.sqrt(0.75)), 1.0),
    ],
)
def test_an_obround_flash_is_a_slot(commands: str, reach: tuple[float, float], diameter: float) -> None:
    # exact: an obround 1 x 3 is a 1 mm tool moved by 2 mm
    drills = read(f"D11*\n{commands}X5000Y5000D03*")
    assert drills.end[0] - 5 == pytest.approx(reach, abs=1e-12)
    assert drills.start[0] - 5 == pytest.approx(np.negative(reach), abs=1e-12)
    assert drills.diameter.tolist() == pytest.approx([diameter])


def test_an_obround_of_equal_sides_is_a_hole() -> None:
    drills = read("D14*\nX5000Y5000D03*")
    assert drills.start.tolist() == drills.end.tolist() == [[5, 5]]
    assert drills.diameter.tolist() == [2]


def test_a_macro_of_one_circle_is_a_hole() -> None:
    drills = read("%AMHOLE*1,1,$1,0,0*%\n%ADD20HOLE,0.8*%\nD20*\nX5000Y5000D03*")
    assert drills.diameter.tolist() == [0.8]


def test_an_arc_is_chopped_to_a_micron() -> None:
    drills = read("D10*\nG75*\nX0Y0D02*\nG03X4000Y0I2000J0D01*")
    assert drills.start[0].tolist() == [0, 0]
    assert drills.end[-1].tolist() == [4, 0]
    assert (drills.start[1:] == drills.end[:-1]).all()
    assert np.hypot(*(drills.start - (2, 0)).T) == pytest.approx(2, abs=1e-9)
    middles = (drills.start + drills.end) / 2
    assert np.hypot(*(middles - (2, 0)).T).min() >= 2 - 0.001001  # exact: sagitta of a chord
    assert (middles[:, 1] < 0).all()  # counter-clockwise from the left: through the lower half


def test_step_and_repeat_drills_every_copy() -> None:
    assert len(read("%SRX3Y2I5J5*%\nD10*\nX0Y0D03*\n%SR*%").start) == 6


def test_a_file_without_holes_is_fine() -> None:
    assert read("").start.shape == (0, 2)


def test_a_negative_file_is_odd_but_its_objects_are_holes() -> None:
    drills = read("%TF.FilePolarity,Negative*%\nD10*\nX0Y0D03*")
    assert len(drills.start) == 1
    said = [remark for remark in drills.remarks if "declared negative" in remark.text]
    assert [remark.kind for remark in said] == [RemarkKind.ODD]


@pytest.mark.parametrize(
    ("body", "message", "line"),
    [
        ("D12*\nX0Y0D03*", "aperture D12 (rectangle) is not round", 11),
        ("D12*\nX0Y0D02*\nX1000D01*", "aperture D12 (rectangle) is not round", 12),
        ("D11*\nX0Y0D02*\nX1000D01*", "a slot is drawn with aperture D11, which is not round", 12),
        ("D13*\nX0Y0D03*", "aperture D13 has no diameter", 11),
        ("D10*\n%LPC*%\nX0Y0D03*", "a clear object stands among the holes", 12),
        ("G36*\nX0Y0D02*\nX1000D01*\nY1000D01*\nX0Y0D01*\nG37*", "a filled region is neither a hole nor a slot", 11),
    ],
)
def test_what_no_drill_makes_is_an_error(body: str, message: str, line: int) -> None:
    with pytest.raises(InputError) as caught:
        read(body)
    assert [problem.message for problem in caught.value.problems] == [message]
    problem = caught.value.problems[0]
    assert (problem.file, problem.remedy) == ("tide-drill.gbr", "a drill file holds round holes and slots only")
    assert abs(problem.line - line) <= 1  # a region's line is that of its first contour


def test_all_mistakes_come_at_once() -> None:
    with pytest.raises(InputError) as caught:
        read("D12*\nX0Y0D03*\nX1000D03*\nD13*\nX2000D03*")
    assert [type(problem) for problem in caught.value.problems] == [Problem] * 3
