"""IPC-D-356 and IPC-D-356A netlists. In: bytes; out: NetlistPoints in mm, with the line of each record.

Columns of a test record, counted from 1 (IPC-D-356A, from memory): 1-3 operation code, 4-17 net, 21-26 part, 27 hyphen, 28-31 pin, 32
midpoint flag M, 33-38 hole (D, four digits, P or U), 39-41 access (A, two digits), 42-57 place (X and Y, sign, six digits), 58-67 size
(X and Y, four digits), 68-71 rotation (R), 73-74 solder mask (S), and of blind and buried vias the two layers they join (L, two digits).
"""

from __future__ import annotations

import math
import re
from collections import Counter
from typing import NamedTuple

import numpy as np

from impcheck.artwork.limits import Limits
from impcheck.artwork.parts import NetlistPoints
from impcheck.errors import InputError, Problem, Remark, RemarkKind

_DEFAULTS = Limits()
_MOST_PROBLEMS = 20
_INCH = 25.4e-4  # mm in 0.0001 inch
_SI = 1e-3  # mm in 0.001 mm
_FARTHEST = 5_000.0  # mm

_TEST = ("307", "317", "327", "337", "347", "357")  # blind or buried via, through hole, surface feature; the others are of older revisions
_CONTINUED = ("007", "017", "027", "037", "047", "057")
_TOOLING = ("367", "067")
_OUTLINES = (
    "378",
    "078",
    "379",
    "079",
    "389",
    "089",
    "088",
    "099",
    "370",
    "380",
    "390",
)  # conductors, adjacent nets, board edge, clearances

_UNIT = re.compile(r"P\s+UNITS\b\s*(.*)", re.IGNORECASE)
_ALIAS = re.compile(r"P\s+(NNAME\S*)\s+(\S.*)", re.IGNORECASE)
_PLACE = re.compile(
    r"(?:D\s*(?P<drill>\d{1,6})\s*(?P<plated>[PU])?)?\s*(?:A\s*(?P<access>\d{1,2}))?\s*"
    r"X\s*(?P<x>[-+]?\s*\d{1,9})\s*Y\s*(?P<y>[-+]?\s*\d{1,9})(?:\s*X\s*(?P<w>\d{1,6}))?(?:\s*Y\s*(?P<h>\d{1,6}))?"
    r"(?:\s*R\s*\d{1,4})?(?:\s*S\s*\d(?!\d))?(?P<rest>.*)",
    re.IGNORECASE,
)
_SPAN = re.compile(r"L\s*(\d{1,2})\s*[-/,]?\s*[LS]?\s*(\d{1,2})\b", re.IGNORECASE)


class _Point(NamedTuple):
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


def read_ipc356(data: bytes, file: str, limits: Limits = _DEFAULTS) -> NetlistPoints:
    """Reads a netlist. Points of no net (N/C) are left out, and so are tooling holes and the records of conductors and outlines.

    A continuation record (017, 027, ...) belongs to the record before it and gives a point of its own only where it names another place.
    Raises InputError, with the line of each mistake, for a file that is no netlist or holds records that cannot be read.
    """
    if len(data) > limits.file_bytes:
        raise InputError(Problem(file, 0, f"the file has {len(data):,} bytes", f"limit file_bytes = {limits.file_bytes:,}"))
    if not data.strip():
        raise InputError(Problem(file, 0, "the file is empty", "export the netlist again"))
    reader = _Reader(file, limits)
    reader.run(re.split(r"\r\n|\n|\r", data.removeprefix(b"\xef\xbb\xbf").decode("latin-1")))
    return reader.result()


class _Reader:
    """The state between the records of one file."""

    def __init__(self, file: str, limits: Limits) -> None:
        self.file, self.limits = file, limits
        self.unit: float | None = None
        self.points: list[_Point] = []
        self.problems: list[Problem] = []
        self.remarks: list[Remark] = []
        self.aliases: dict[str, str] = {}
        self.before: _Point | None = None  # what a continuation continues
        self.outlines: list[int] = []  # lines
        self.unknown: Counter[str] = Counter()
        self.ended = False

    def run(self, lines: list[str]) -> None:
        """Reads all records up to 999."""
        recognised = False
        number = 0
        for number, raw in enumerate(lines, 1):
            line = raw.rstrip()
            if not line:
                continue
            code = line[:3]
            if line[0] in "Pp" and line[1:2] in ("", " ", "\t"):
                recognised |= self._parameter(line, number)
            elif line[0] in "Cc" and not recognised:
                continue
            elif code.isascii() and code.isdigit() and len(code) == 3:
                recognised = True
                if code == "999":
                    self.ended = True
                    break
                self._record(code, line, number)
            elif line[0] not in "Cc":
                remedy = "records begin with C, P or a three-digit code such as 317, 327 or 999"
                self.problems.append(Problem(self.file, number, f"'{line[:24]}' is no IPC-D-356 record", remedy))
            if len(self.problems) >= _MOST_PROBLEMS or len(self.points) > self.limits.objects:
                break
        if not recognised:
            said = "this is no IPC-D-356 netlist: it holds none of its records"
            raise InputError(Problem(self.file, 0, said, "export the netlist as IPC-D-356 or IPC-D-356A"))
        if len(self.points) > self.limits.objects:
            said = f"the netlist holds more than {self.limits.objects:,} points"
            raise InputError(Problem(self.file, number, said, f"limit objects = {self.limits.objects:,}"))
        if self.problems:
            raise InputError(self.problems)
        if not self.ended:
            self._remark(RemarkKind.ODD, "the netlist does not end with 999; it may be cut short", number)

    def _remark(self, kind: RemarkKind, text: str, line: int = 0) -> None:
        self.remarks.append(Remark(kind, text, self.file, line))

    def _parameter(self, line: str, number: int) -> bool:
        """Units and long names; True where the line is a P record that only a netlist has."""
        if match := _UNIT.match(line):
            value = " ".join(match[1].upper().replace(",", " ").split())
            known = {"CUST 0": _INCH, "CUST": _INCH, "CUST 1": _SI, "SI": _SI, "CUST 2": _INCH}
            if value not in known:
                remedy = "CUST 0 and CUST 2 are 0.0001 inch, CUST 1 and SI 0.001 mm"
                self.problems.append(Problem(self.file, number, f"the units '{value[:24]}' are not known", remedy))
            self.unit = known.get(value, _INCH)
            return True
        if match := _ALIAS.match(line):
            # A name that does not fit one record goes on in the next record of the same alias.
            key, name = match[1].upper(), match[2].rstrip()
            self.aliases[key] = self.aliases.get(key, "") + name
            return True
        return re.match(r"P\s+(JOB|CODE|TITLE|NUM|REV|VER|IMAGE|LANG|DIM)\b", line, re.IGNORECASE) is not None

    def _record(self, code: str, line: str, number: int) -> None:
        if code in _OUTLINES:
            self.outlines.append(number)
        elif code in _TOOLING:
            return
        elif code in _TEST:
            self.before = self._point(line, number)
            if self.before is not None:
                self.points.append(self.before)
        elif code in _CONTINUED:
            self._continue(line, number)
        else:
            self.unknown[code] += 1

    def _continue(self, line: str, number: int) -> None:
        """A continuation: more about the point before it, or one more place of it."""
        before = self.before
        if before is None:
            if not self.problems:
                remedy = "it stands behind a record 307, 317 or 327"
                self.problems.append(Problem(self.file, number, f"record {line[:3]} continues no record before it", remedy))
            return
        place = _PLACE.search(line, 3)
        span = _SPAN.search(place["rest"] if place else line[3:])
        if span and before.first == 0:
            before = before._replace(first=min(int(span[1]), int(span[2])), last=max(int(span[1]), int(span[2])))
            self.points[-1] = self.before = before
        if place is None:
            return
        found = self._placed(place, number)
        if found is not None and found.at != before.at:
            self.points.append(found._replace(net=before.net, component=before.component, pin=before.pin))
            self.before = self.points[-1]

    def _point(self, line: str, number: int) -> _Point | None:
        place = _PLACE.search(line, 31) or _PLACE.search(line, 20)
        if place is None:
            remedy = "columns 42 to 57 hold it, as in X+012500Y-003000"
            self.problems.append(Problem(self.file, number, f"record {line[:3]} names no place", remedy))
            return None
        found = self._placed(place, number)
        if found is None:
            return None
        named = line[20 : place.start()] if place.start() > 20 else ""
        if named[6:7] in ("-", " ", ""):  # the columns as they should be
            component, pin, mid = named[:6].strip(), named[7:11].strip(), named[11:]
        else:  # a part name that is too long moves the rest
            component, _, behind = named.rpartition("-")
            pin, _, mid = behind.strip().partition(" ")
        return found._replace(net=line[3:20].strip(), component=component.strip(), pin=pin.strip(), mid=mid.strip().upper() == "M")

    def _placed(self, place: re.Match[str], number: int) -> _Point | None:
        """A point without names."""
        if self.unit is None:
            self._remark(RemarkKind.GUESS, "the netlist does not say its units before the first record; 0.0001 inch is assumed", number)
            self.unit = _INCH
        unit = self.unit
        x, y = (int(re.sub(r"\s", "", place[axis])) * unit for axis in "xy")
        if max(abs(x), abs(y)) > _FARTHEST:
            said = f"the point lies at ({x:.6g}, {y:.6g}) mm, farther out than any board reaches"
            self.problems.append(Problem(self.file, number, said, "check P UNITS and the columns of this record"))
            return None
        drill = int(place["drill"] or 0) * unit
        span = _SPAN.search(place["rest"])
        layers = sorted((int(span[1]), int(span[2]))) if span else [0, 0]
        return _Point(
            net="",
            component="",
            pin="",
            mid=False,
            drill=drill if drill > 0 else math.nan,
            plated=drill > 0 and (place["plated"] or "P").upper() == "P",  # a hole of a net, unless it says otherwise
            access=int(place["access"] or 0),
            first=layers[0],
            last=layers[1],
            at=(x, y),
            size=(int(place["w"] or 0) * unit, int(place["h"] or 0) * unit),
            line=number,
        )

    def result(self) -> NetlistPoints:
        """The points with a net, long names resolved."""
        if self.outlines:
            said = f"records of conductors and outlines ({len(self.outlines)}) are no test points and were left out"
            self._remark(RemarkKind.ODD, said, self.outlines[0])
        if self.unknown:
            said = ", ".join(f"{code} ({count})" for code, count in sorted(self.unknown.items()))
            self._remark(RemarkKind.ODD, f"records of unknown kind were left out: {said}")
        found, unresolved = [], dict[str, int]()
        for point in self.points:
            key = point.net.upper()
            if key in ("", "N/C", "NC"):
                continue
            if re.fullmatch(r"NNAME\d+", key) and key not in self.aliases:
                unresolved.setdefault(point.net, point.line)
            found.append(point._replace(net=self.aliases[key]) if key in self.aliases else point)
        for net, line in list(unresolved.items())[:5]:
            self._remark(RemarkKind.ODD, f"the long name of {net} is not given (no record 'P  {net}')", line)
        return NetlistPoints(
            file=self.file,
            at=np.array([p.at for p in found], dtype=np.float64).reshape(-1, 2),
            net=tuple(p.net for p in found),
            component=tuple(p.component for p in found),
            pin=tuple(p.pin for p in found),
            mid=np.array([p.mid for p in found], dtype=np.bool_),
            drill=np.array([p.drill for p in found], dtype=np.float64),
            plated=np.array([p.plated for p in found], dtype=np.bool_),
            access=np.array([p.access for p in found], dtype=np.int32),
            first=np.array([p.first for p in found], dtype=np.int32),
            last=np.array([p.last for p in found], dtype=np.int32),
            size=np.array([p.size for p in found], dtype=np.float64).reshape(-1, 2),
            line=np.array([p.line for p in found], dtype=np.int32),
            remarks=tuple(self.remarks),
        )
