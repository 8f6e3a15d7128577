"""The statements of a drill file carried out. In: lines and a Format; out: holes and slots in mm with their lines."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass, replace

from impcheck.artwork.excellon_format import Format
from impcheck.artwork.gerber.attributes import Attributes
from impcheck.artwork.limits import Limits
from impcheck.errors import InputError, Problem, Problems, Remark, RemarkKind

MOST_PROBLEMS = 20
CHORD = 0.001  # mm, of routed arcs
FARTHEST = 1e5  # mm, no board is larger
_WORD = re.compile(r"\s*([A-Z])\s*([-+]?[0-9.]*)")
_TOOL = re.compile(r"T(\d+)")
_TABLE = re.compile(r";\s*(?:T(\d+)\s*=?\s*(?:HOLESIZE\s+\d+\.?\s*=)?|HOLESIZE\s+(\d+)\.?\s*=)\s*([0-9.]+)\s*(MM|INCH(?:ES)?|IN|MILS?|\")?", re.IGNORECASE)
_UNITS = {"MM": 1.0, "INCH": 25.4, "INCHES": 25.4, "IN": 25.4, '"': 25.4, "MIL": 0.0254, "MILS": 0.0254}
HARMLESS = {"M00", "M01", "M06", "M09", "M14", "M18", "M45", "M47", "M97", "M98", "M99", "G04", "G40", "G07", "G98"}
Point = tuple[float, float]


@dataclass(frozen=True)
class Hole:
    """One hole; a slot has start != end."""

    start: Point
    end: Point
    diameter: float
    plated: int  # 1, 0, -1 not said
    line: int
    net: int
    pin: int


class Program:
    """Runs one file under one reading of its numbers."""

    def __init__(self, file: str, limits: Limits, reading: Format) -> None:
        self.file, self.limits, self.reading = file, limits, reading
        self.holes: list[Hole] = []
        self.problems = Problems()
        self.remarks: list[Remark] = []
        self.ambiguous = False  # a number without a decimal point was met
        self._notes = Attributes()
        self.names = self._notes.objects
        self._net, self._pin = -1, -1
        self._tools: dict[int, float] = {}
        self._plated_tools: dict[int, int] = {}
        self._comment_tools: dict[int, float] = {}
        self._tool: int | None = None
        self._plated = -1
        self._aperture_plated = -1
        self._at: Point = (0.0, 0.0)
        self._zero: Point = (0.0, 0.0)
        self._mode = "drill"  # or "rout"
        self._motion = 0  # 0 move, 1 line, 2 clockwise, 3 counter-clockwise
        self._down = False
        self._incremental = False
        self._header = False
        self._pattern: int | None = None
        self._block: list[Hole] = []
        self._ended = False

    @property
    def attributes(self) -> dict[str, tuple[str, ...]]:
        """File attributes from `; #@! TF` comments."""
        return self._notes.file

    def run(self, lines: list[str]) -> None:
        """Carries out every line; what is wrong stands in `problems` afterwards."""
        for number, raw in enumerate(lines, 1):
            line = raw.strip()
            if not line:
                continue
            try:
                if line.startswith(";"):
                    self._comment(line, number)
                elif self._ended:
                    self._remark(f"what follows the end of the program in line {number} is left out", number)
                    break
                else:
                    self._statement(line.upper(), number)
            except ValueError as error:
                self._problem(number, str(error), "export the drill file again")
            if len(self.problems.found) >= MOST_PROBLEMS:
                break
        if not self._ended and not self.problems.found:
            self._remark("the file has no end (M30): it may be cut off", len(lines))

    def _problem(self, line: int, message: str, remedy: str) -> None:
        self.problems.add(self.file, line, message, remedy)

    def _remark(self, text: str, line: int, kind: RemarkKind = RemarkKind.ODD) -> None:
        self.remarks.append(Remark(kind, text, self.file, line))

    # comments: attributes, plating, tool tables

    def _comment(self, line: str, number: int) -> None:
        text = line[1:].strip()
        if text.startswith("#@!"):
            command = text[3:].strip()
            kind, rest = command[:2], command[2:].lstrip()
            if kind in ("TF", "TA", "TO", "TD"):
                odd = self._notes.apply(kind, rest, number)
                if odd:
                    self._remark(odd, number)
                _, self._net, self._pin, _ = self.names.changes[-1]
                function = self._notes.aperture.get(".AperFunction", ())
                self._aperture_plated = {"Plated": 1, "NonPlated": 0}.get(function[0], -1) if function else -1
            return
        upper = text.upper().replace(" ", "")
        if upper.startswith("TYPE="):
            self._plated = {"PLATED": 1, "NON_PLATED": 0, "NONPLATED": 0}.get(upper[5:], -1)
        elif match := _TABLE.match(line):
            tool = int(match[1] or match[2])
            unit = _UNITS[match[4].upper()] if match[4] else self.reading.unit
            size = float(match[3]) * unit
            self._comment_tools.setdefault(tool, size)

    # statements

    def _statement(self, line: str, number: int) -> None:
        line = re.sub(r"^N\d+\s*", "", line)
        line = re.sub(r"\([^)]*\)", "", line).strip()
        if not line:
            return
        if line == "M48":
            self._header = True
        elif line in ("%", "M95"):
            self._header = False
        elif line.startswith(("METRIC", "INCH", "M71", "M72", "FMAT", "VER", "DETECT", "ATC", "OM48", "SBK", "SG", "R,", "BLKD", "AFS", "CCW", "CP", "UP", "DN", "TCST", "PCKPARAM")):
            if line.startswith("FMAT") and not line.endswith("2"):
                self._remark(f"command format {line} is read like FMAT,2", number)
        elif line.startswith("ICI"):
            self._incremental = line.endswith("ON")
        elif line.startswith("T") and _TOOL.match(line):
            self._tool_statement(line, number)
        elif line.startswith("R") and self._repeat(line, number):
            pass
        elif line[0] in "XYGMIJA":
            self._words(line, number)
        else:
            raise ValueError(f"unknown command '{line[:40]}'")

    def _tool_statement(self, line: str, number: int) -> None:
        match = _TOOL.match(line)
        assert match is not None
        digits = match[1]
        code = int(digits) if len(digits) <= 2 else int(digits[:-2]) if len(digits) == 4 else int(digits)  # T0101: tool 1, compensation 1
        rest = line[match.end() :]
        size = re.search(r"C\s*([0-9.]+)", rest)
        if size:
            text = size[1]
            self._tools[code] = float(text) * self.reading.unit if "." in text else self._coordinate(text)
            self._plated_tools[code] = self._aperture_plated if self._aperture_plated >= 0 else self._plated
        unknown = re.sub(r"[CFSBHZ]\s*[-+]?[0-9.]*", "", rest)
        if self._header and not size:
            if code not in self._comment_tools:
                self._tools.pop(code, None)
            return
        if not self._header:
            self._tool = code if code or 0 in self._tools else None  # T0 puts the tool away, unless a file numbers from 0
            if unknown.strip() and re.match(r"[XYG]", unknown.strip()):
                self._words(re.sub(r"^T\d+", "", line) if not size else unknown, number)

    def _repeat(self, line: str, number: int) -> bool:
        """R3X1Y0: the last hole three times more, each a step farther. False where the line is none."""
        match = re.fullmatch(r"R(\d+)((?:[XY][-+]?[0-9.]+)*)", line)
        if match is None:
            return False
        times = int(match[1])
        self._bound(times, number)
        step = self._pairs(match[2])
        dx, dy = step.get("X", 0.0), step.get("Y", 0.0)
        x, y = self._at
        for k in range(1, times + 1):
            self._hole((x + k * dx, y + k * dy), None, number)
        self._at = (x + times * dx, y + times * dy)
        return True

    def _pairs(self, text: str) -> dict[str, float]:
        return {letter: self._coordinate(value) for letter, value in _WORD.findall(text)}

    def _words(self, line: str, number: int) -> None:
        position = 0
        pending: dict[str, float] = {}
        slot_from: Point | None = None
        while position < len(line):
            match = _WORD.match(line, position)
            if match is None or not match[2]:
                raise ValueError(f"unknown command '{line[:40]}'")
            letter, value = match[1], match[2]
            position = match.end()
            if letter == "G":
                code = f"G{int(float(value)):02d}"
                if code == "G85":
                    slot_from = self._target(pending)
                    pending = {}
                elif code == "G93":
                    zero = self._pairs(line[position:])
                    self._zero = (zero.get("X", 0.0), zero.get("Y", 0.0))
                    return
                else:
                    self._preparatory(code, number)
            elif letter == "M":
                self._auxiliary(f"M{int(float(value)):02d}", line[position:], number)
                if int(float(value)) in (2, 47, 97, 98, 99):
                    return
            elif letter in "XYIJA":
                pending[letter] = self._coordinate(value)
            elif letter in "FSZ":
                continue
            elif letter == "T":
                self._tool = int(value)
            else:
                raise ValueError(f"unknown command '{line[:40]}'")
        if slot_from is not None:
            self._hole(slot_from, self._target(pending, slot_from), number)
            self._at = self._target(pending, slot_from)
        elif pending.keys() & {"X", "Y"}:
            self._go(pending, number)

    def _preparatory(self, code: str, number: int) -> None:
        if code in ("G00", "G01", "G02", "G03"):
            self._mode, self._motion = "rout", int(code[1:])
        elif code in ("G05", "G81", "G80"):
            self._mode, self._down = "drill", False
        elif code in ("G90", "G91"):
            self._incremental = code == "G91"
        elif code in ("G41", "G42"):
            self._remark(f"cutter compensation {code} is not applied: the routed path is taken as the middle of the tool", number, RemarkKind.LIMIT)
        elif code not in HARMLESS:
            raise ValueError(f"unknown command '{code}'")

    def _auxiliary(self, code: str, rest: str, number: int) -> None:
        if code == "M15":
            self._down = True
        elif code in ("M16", "M17"):
            self._down = False
        elif code == "M25":
            self._pattern, self._block = len(self.holes), []
        elif code == "M01" and self._pattern is not None:
            self._block = self.holes[self._pattern :]
            self._pattern = None
        elif code == "M02" and rest.strip() and self._block:
            step = self._pairs(rest)
            self._bound(len(self._block), number)
            dx, dy = step.get("X", 0.0), step.get("Y", 0.0)
            self._block = [replace(h, start=(h.start[0] + dx, h.start[1] + dy), end=(h.end[0] + dx, h.end[1] + dy)) for h in self._block]
            self.holes.extend(self._block)
        elif code in ("M30", "M02"):
            self._ended = True
        elif code == "M08":
            self._block = []
        elif code in ("M71", "M72"):
            pass
        elif code not in HARMLESS:
            raise ValueError(f"unknown command '{code}'")

    # geometry

    def _coordinate(self, text: str) -> float:
        if "." not in text:
            self.ambiguous = True
        try:
            value = self.reading.number(text)
        except ValueError:
            raise ValueError(f"'{text}' is no number") from None
        if not abs(value) < FARTHEST:
            raise ValueError(f"coordinate {text} is {value:.3g} mm, farther than any board reaches")
        return value

    def _target(self, pending: dict[str, float], start: Point | None = None) -> Point:
        x, y = start or self._at
        if self._incremental:
            return x + pending.get("X", 0.0), y + pending.get("Y", 0.0)
        zx, zy = self._zero
        return (pending["X"] + zx if "X" in pending else x), (pending["Y"] + zy if "Y" in pending else y)

    def _go(self, pending: dict[str, float], number: int) -> None:
        start, end = self._at, self._target(pending)
        self._at = end
        if self._mode == "drill":
            self._hole(end, None, number)
        elif self._motion == 0:
            return
        elif self._motion == 1:
            self._hole(start, end, number)  # a route without M15 is meant to cut
        else:
            for a, b in self._arc(start, end, pending):
                self._hole(a, b, number)

    def _arc(self, start: Point, end: Point, pending: dict[str, float]) -> list[tuple[Point, Point]]:
        clockwise = self._motion == 2
        if "A" in pending:
            radius = pending["A"]
            chord = math.dist(start, end)
            if chord == 0:
                raise ValueError("an arc by its radius needs two different ends")
            radius = max(radius, chord / 2)
            lift = math.sqrt(max(0.0, radius**2 - (chord / 2) ** 2)) * (1 if clockwise else -1)
            ux, uy = (end[0] - start[0]) / chord, (end[1] - start[1]) / chord
            centre = ((start[0] + end[0]) / 2 + uy * lift, (start[1] + end[1]) / 2 - ux * lift)
        elif pending.keys() & {"I", "J"}:
            centre = (start[0] + pending.get("I", 0.0), start[1] + pending.get("J", 0.0))
        else:
            raise ValueError("an arc needs its radius (A) or its centre (I, J)")
        radius = math.dist(start, centre)
        a0 = math.atan2(start[1] - centre[1], start[0] - centre[0])
        a1 = math.atan2(end[1] - centre[1], end[0] - centre[0])
        sweep = (a0 - a1 if clockwise else a1 - a0) % (2 * math.pi) or 2 * math.pi
        step = 2 * math.acos(max(0.0, 1 - CHORD / max(radius, CHORD)))
        count = max(1, math.ceil(sweep / max(step, 1e-3)))
        sign = -1.0 if clockwise else 1.0
        points = [(centre[0] + radius * math.cos(a0 + sign * sweep * k / count), centre[1] + radius * math.sin(a0 + sign * sweep * k / count)) for k in range(count + 1)]
        points[0], points[-1] = start, end
        return list(zip(points[:-1], points[1:], strict=True))

    def _bound(self, more: int, number: int) -> None:
        if len(self.holes) + more > self.limits.objects:
            raise InputError(Problem(self.file, number, f"more than {self.limits.objects} holes (limit objects)", "split the file, or raise the limit"))

    def _hole(self, start: Point, end: Point | None, number: int) -> None:
        if self._pattern is not None and self._mode == "drill":
            pass  # the first copy of a pattern is drilled where it stands
        if self._tool is None:
            self._problem(number, "a hole before any tool is chosen", "write a tool (T1) before it")
            self._tool = -1
            return
        size = self._tools.get(self._tool, self._comment_tools.get(self._tool))
        if size is None:
            if self._tool >= 0:
                self._problem(number, f"tool T{self._tool} has no diameter", f"define it in the header: T{self._tool}C0.3")
                self._tools[self._tool] = math.nan
            return
        if not 0 < size < FARTHEST:
            if not math.isnan(size):
                self._problem(number, f"tool T{self._tool} has the diameter {size:g} mm", "give it a diameter over zero")
                self._tools[self._tool] = math.nan
            return
        self._bound(1, number)
        plated = self._plated_tools.get(self._tool, self._plated)
        self.holes.append(Hole(start, end or start, size, plated, number, self._net, self._pin))


