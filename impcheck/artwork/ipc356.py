"""IPC-D-356 and IPC-D-356A netlists. In: bytes; out: NetlistPoints in mm, with the line of each record.

Columns of a test record (counted from 1): 1-3 operation code, 4-17 net, 21-26 part, 27 hyphen, 28-31 pin, 32 midpoint flag, then a hole (D, diameter,
P or U), access (A and a layer), place (X, Y), size (X, Y), rotation (R) and solder mask (S), each behind its letter.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np

from impcheck.artwork.limits import Limits
from impcheck.artwork.parts import NetlistPoints
from impcheck.errors import InputError, Problem, Problems, Remark, RemarkKind

INCH_UNIT = 25.4e-4  # mm in a ten-thousandth of an inch
SI_UNIT = 1e-3
MOST_PROBLEMS = 20
UNCONNECTED = ("N/C", "")
_TAIL = re.compile(
    r"(?:D\s*(?P<drill>\d{1,4})\s*(?P<plated>[PU ])?)?\s*(?:A(?P<access>\d{1,2}))?\s*"
    r"X\s*(?P<x>[-+]?\d{1,7})\s*Y\s*(?P<y>[-+]?\d{1,7})\s*(?:X\s*(?P<w>\d{1,5}))?\s*(?:Y\s*(?P<h>\d{1,5}))?"
)
_LAYERS = re.compile(r"L(\d{1,2})")
_TEST = {"317", "327", "307", "367", "347", "337"}
_CONDUCTORS = {"378", "379", "389", "089", "078", "079", "370", "380"}


@dataclass(frozen=True)
class _Point:
    net: str
    component: str
    pin: str
    mid: bool
    drill: float
    plated: bool
    access: int
    first: int
    last: int
    at: tuple[float, float]
    size: tuple[float, float]
    line: int


def read_ipc356(data: bytes, file: str, limits: Limits | None = None) -> NetlistPoints:
    """Reads a netlist. Raises InputError for a file that is none, or whose records cannot be read."""
    limits = limits or Limits()
    if len(data) > limits.file_bytes:
        raise InputError(Problem(file, 0, f"the file is larger than {limits.file_bytes} bytes (limit file_bytes)", "leave it out of the package"))
    if not data.strip():
        raise InputError(Problem(file, 0, "the file is empty", "export the netlist again"))
    lines = re.split(r"\r\n|\n|\r", data.decode("latin-1"))
    problems, remarks = Problems(), list[Remark]()
    aliases = _aliases(lines)
    unit, skipped, ended = INCH_UNIT, 0, False
    points: list[_Point] = []
    known = False
    for number, raw in enumerate(lines, 1):
        line = raw.rstrip()
        if not line or line[0] in "Cc":
            continue
        code = line[:3]
        if line[0] in "Pp":
            known = True
            unit = _unit(line, unit, file, number, problems)
        elif code == "999":
            ended = known = True
            break
        elif code in _CONDUCTORS or (code[0] == "0" and skipped and not points):
            known = True
            skipped += 1
        elif code in _TEST or (code.isdigit() and code[0] == "0" and points):
            known = True
            try:
                points.append(_record(line, number, unit, aliases, points[-1] if code[0] == "0" and points else None))
            except ValueError as error:
                problems.add(file, number, str(error), "export the netlist again as IPC-D-356")
        else:
            problems.add(file, number, f"unknown record '{line[:20]}'", "IPC-D-356 records begin with C, P, 317, 327, ... or 999")
        if len(problems.found) >= MOST_PROBLEMS or len(points) > limits.objects:
            break
    if not known or (not points and problems.found):
        raise InputError(Problem(file, 1, "this is no IPC-D-356 netlist: it holds no record of one", "name an IPC-D-356 or 356A file"))
    problems.raise_if_any()
    if len(points) > limits.objects:
        raise InputError(Problem(file, 0, f"more than {limits.objects} records (limit objects)", "raise the limit"))
    if not ended:
        remarks.append(Remark(RemarkKind.ODD, "the netlist has no end record (999): it may be cut off", file, len(lines)))
    if skipped:
        remarks.append(Remark(RemarkKind.ODD, f"{skipped} conductor and outline records are no test points and are left out", file))
    return _points(file, [point for point in points if point.net not in UNCONNECTED], tuple(remarks))


def _aliases(lines: list[str]) -> dict[str, str]:
    """Long net names: `P  NNAME12 THE_LONG_NAME`; the same number again continues the name."""
    found: dict[str, str] = {}
    for line in lines:
        match = re.match(r"[Pp]\s+(NNAME\w*)\s+(\S.*?)\s*$", line)
        if match:
            found[match[1].upper()] = found.get(match[1].upper(), "") + match[2]
    return found


def _unit(line: str, unit: float, file: str, number: int, problems: Problems) -> float:
    match = re.match(r"[Pp]\s+UNITS\s+(.*?)\s*$", line, re.IGNORECASE)
    if match is None:
        return unit
    value = " ".join(match[1].upper().split())
    known = {"CUST 0": INCH_UNIT, "CUST": INCH_UNIT, "CUST 1": SI_UNIT, "SI": SI_UNIT, "CUST 2": INCH_UNIT}
    if value not in known:
        problems.add(file, number, f"unknown units '{value}'", "write P UNITS CUST 0 (inch), CUST 1 or SI (mm)")
        return unit
    return known[value]


def _record(line: str, number: int, unit: float, aliases: dict[str, str], before: _Point | None) -> _Point:
    tail = _TAIL.search(line, 31) or _TAIL.search(line, 20)
    if tail is None:
        raise ValueError(f"no place (X and Y) in the record '{line[:40]}'")
    name = line[3:17].strip()
    net = aliases.get(name.upper(), name) if name else (before.net if before else "")
    component, pin = line[20:26].strip(), line[27:31].strip().lstrip("-")
    if not component and before is not None:
        component, pin = before.component, before.pin
    drill = int(tail["drill"]) * unit if tail["drill"] else float("nan")
    layers = [int(value) for value in _LAYERS.findall(line, tail.end())]
    return _Point(
        net=net,
        component=component,
        pin=pin,
        mid=line[31:32].upper() == "M",
        drill=drill,
        plated=(tail["plated"] or "").upper() == "P",
        access=int(tail["access"] or 0),
        first=min(layers, default=0),
        last=max(layers, default=0),
        at=(int(tail["x"]) * unit, int(tail["y"]) * unit),
        size=(int(tail["w"] or 0) * unit, int(tail["h"] or 0) * unit),
        line=number,
    )


def _points(file: str, points: list[_Point], remarks: tuple[Remark, ...]) -> NetlistPoints:
    return NetlistPoints(
        file=file,
        at=np.array([p.at for p in points], float).reshape(-1, 2),
        net=tuple(p.net for p in points),
        component=tuple(p.component for p in points),
        pin=tuple(p.pin for p in points),
        mid=np.array([p.mid for p in points], bool),
        drill=np.array([p.drill for p in points], float),
        plated=np.array([p.plated for p in points], bool),
        access=np.array([p.access for p in points], np.int32),
        first=np.array([p.first for p in points], np.int32),
        last=np.array([p.last for p in points], np.int32),
        size=np.array([p.size for p in points], float).reshape(-1, 2),
        line=np.array([p.line for p in points], np.int32),
        remarks=remarks,
    )
