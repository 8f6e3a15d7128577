"""Excellon and XNC drill files. In: bytes; out: a DrillFile in mm, with the line of each hole.

Units and digits are taken from the file where it states them (header or comments); else the readings that are usual are tried, and the one whose
holes lie on the board is taken and remarked.
"""

from __future__ import annotations

import re

import numpy as np

from impcheck.artwork.excellon_format import Format, Stated, candidates, stated_format
from impcheck.artwork.excellon_program import Program
from impcheck.artwork.limits import Limits
from impcheck.artwork.parts import DrillFile
from impcheck.errors import InputError, Problem, Remark, RemarkKind

Box = tuple[float, float, float, float]
MARGIN = 0.25  # of the board's size by which holes may lie outside it (tooling holes, coupons)
_LOOKS_RIGHT = re.compile(r"\s*(M48|%|M7[12]\b|INCH|METRIC|T\d+|[XY][-+.\d]|G\d\d)")


def read_excellon(data: bytes, file: str, limits: Limits | None = None, extent: Box | None = None) -> DrillFile:
    """Reads a drill or rout file.

    `extent` (min x, min y, max x, max y) is the board's box in mm; it settles unit, zeros and digits where the file does not say. Raises InputError
    for a file that is no drill file, that uses an undefined tool, that holds an unknown command, or that goes past a limit.
    """
    limits = limits or Limits()
    lines = _lines(data, file, limits)
    stated = stated_format(lines)
    remarks: list[Remark] = []
    tried: list[tuple[float, int, Program]] = []
    for order, reading in enumerate(candidates(stated)):
        program = Program(file, limits, reading)
        program.run(lines)
        tried.append((0.0 if extent is None else _badness(program, extent), order, program))
        if extent is None or program.problems.found or not program.holes or not program.ambiguous and stated.metric is not None:
            break
    _, _, best = min(tried, key=lambda found: found[:2])
    best.problems.raise_if_any()
    if best.holes:
        remarks += _guesses(best, stated, file, extent)
    return _drill_file(file, best, remarks)


def _guesses(program: Program, stated: Stated, file: str, extent: Box | None) -> list[Remark]:
    missing = stated.missing() if program.ambiguous else ("its unit" if stated.metric is None else "")
    if not missing:
        return []
    how = "taken as is usual" if extent is None else "of the usual readings the one was taken whose holes lie on the board"
    return [Remark(RemarkKind.GUESS, f"the file does not say {missing}; {how}: {program.reading}", file)]


def _lines(data: bytes, file: str, limits: Limits) -> list[str]:
    if len(data) > limits.file_bytes:
        raise InputError(Problem(file, 0, f"the file is larger than {limits.file_bytes} bytes (limit file_bytes)", "leave it out of the package"))
    if not data.strip():
        raise InputError(Problem(file, 0, "the file is empty", "export the drill file again"))
    if b"\0" in data:
        raise InputError(Problem(file, 0, "this is a binary file, no drill file", "name an Excellon or XNC file"))
    lines = re.split(r"\r\n|\n|\r", data.decode("latin-1"))
    if not any(_LOOKS_RIGHT.match(line) for line in lines[:500]):
        raise InputError(Problem(file, 1, "this is no drill file: it begins with no header, tool or coordinate", "name an Excellon or XNC file"))
    return lines


def _badness(program: Program, extent: Box) -> float:
    """0 where all holes lie on the board and spread over it as far as they may; the more the worse."""
    if not program.holes or program.problems.found:
        return 100.0
    x0, y0, x1, y1 = extent
    width, height = max(x1 - x0, 1e-6), max(y1 - y0, 1e-6)
    at = np.array([hole.start for hole in program.holes] + [hole.end for hole in program.holes])
    off = (
        (at[:, 0] < x0 - MARGIN * width)
        | (at[:, 0] > x1 + MARGIN * width)
        | (at[:, 1] < y0 - MARGIN * height)
        | (at[:, 1] > y1 + MARGIN * height)
    )
    spread = max(float(np.ptp(at[:, 0])) / width, float(np.ptp(at[:, 1])) / height)
    diameter = np.array([hole.diameter for hole in program.holes])
    odd = float(np.mean((diameter < 0.04) | (diameter > 10.0)))
    return 10.0 * float(np.mean(off)) + 5.0 * odd + max(0.0, 1.0 - spread)


def _drill_file(file: str, program: Program, remarks: list[Remark]) -> DrillFile:
    holes = program.holes
    return DrillFile(
        file=file,
        attributes=dict(program.attributes),
        start=np.array([hole.start for hole in holes], float).reshape(-1, 2),
        end=np.array([hole.end for hole in holes], float).reshape(-1, 2),
        diameter=np.array([hole.diameter for hole in holes], float),
        plated=np.array([hole.plated for hole in holes], np.int8),
        line=np.array([hole.line for hole in holes], np.int32),
        net=np.array([hole.net for hole in holes], np.int32),
        pin=np.array([hole.pin for hole in holes], np.int32),
        nets=tuple(program.names.nets),
        pins=tuple(program.names.pins),
        remarks=tuple(dict.fromkeys((*remarks, *program.remarks))),
    )


__all__ = ["Format", "read_excellon"]
