"""What the comments of a drill file say. In: comment text; out: plating, tool diameters in mm, nets and pins of X2 attributes."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from impcheck.artwork.gerber.attributes import Attributes

_UNITS = {"MM": 1.0, "IN": 25.4, "INCH": 25.4, "INCHES": 25.4, '"': 25.4, "MIL": 0.0254, "MILS": 0.0254, "UM": 0.001}
_UNIT = r'(MM|INCH(?:ES)?|IN|MILS?|UM|")'
_HOLESIZE = re.compile(
    r"(?:T(\d+)\s+)?HOLE\s*SIZE\s+(\d+)?\.?\s*[=:]\s*([\d.]+)\s*"
    + _UNIT
    + r"?(?:.*?\b(NON[-_ ]?PLATED|PLATED)\b)?(?:\s*(MILS?|MM|INCH(?:ES)?)\b)?",
    re.IGNORECASE,
)
_TOOL = re.compile(r"(?:TOOL\s*|T)(\d+)(?!\d)\s*(?:D(?:IA\w*)?)?\s*([=:])?\s*(\d*\.?\d+)\s*" + _UNIT + r"?(?![\w.])", re.IGNORECASE)
_TYPE = re.compile(r"TYPE\s*=\s*(NON[-_ ]?PLATED|PLATED)", re.IGNORECASE)
_PLATED = re.compile(r"\bPLATED\s*[=:]\s*(YES|TRUE|1|NO|FALSE|0)\b", re.IGNORECASE)
_CONTENTS = re.compile(r"CONTENTS\s*:.*?\b(NON[-_ ]?PLATED|PLATED)\b", re.IGNORECASE)
_START = re.compile(r"(NON[-_ ]?PLATED|PLATED)\)?\s+HOLES\s+START\s+AT\s+T(\d+)", re.IGNORECASE)


@dataclass(frozen=True)
class NotedTool:
    """A tool as a table in comments has it."""

    diameter: float  # mm
    plated: int  # 1, 0, -1 not said
    line: int


def noted_tools(lines: Sequence[str], unit: float) -> dict[int, NotedTool]:
    """Tools of tables in comments (`;T1 Holesize 1. = 0.3 ... PLATED MM`, `; T01 = 0.3mm`). `unit` (mm) holds where a table names none."""
    found: dict[int, NotedTool] = {}
    for number, line in enumerate(lines, 1):
        if ";" not in line:
            continue
        comment = line.partition(";")[2].strip()
        if match := _HOLESIZE.match(comment):
            tool = int(match[1] or match[2] or 0)
            size, said = match[3], match[4] or match[6]
            plated = -1 if match[5] is None else int(not match[5].upper().startswith("NON"))
        elif (match := _TOOL.match(comment)) and (match[2] or match[4]):
            tool, size, said, plated = int(match[1]), match[3], match[4], -1
        else:
            continue
        if size.count(".") <= 1 and size.strip("."):
            found.setdefault(tool, NotedTool(float(size) * (_UNITS[said.upper()] if said else unit), plated, number))
    return found


class Notes:
    """The state comments leave behind: X2 attributes and plating for what follows."""

    def __init__(self) -> None:
        self.attributes = Attributes()
        self.type = -1  # plating by ;TYPE= and the like: 1, 0, -1 not said
        self.contents = -1  # of the whole file
        self.starts: list[tuple[int, int]] = []  # from this tool number on, plated or not
        self.net = -1
        self.pin = -1

    def read(self, comment: str, line: int) -> str | None:
        """Takes in one comment (without its semicolon); returns what was odd about it, or None."""
        text = comment.strip()
        if text.startswith("#@!"):
            command = text[3:].strip()
            if command[:2] not in ("TF", "TA", "TO", "TD"):
                return f"'#@! {command[:20]}' is no attribute; it has no effect"
            odd = self.attributes.apply(command[:2], command[2:].lstrip().rstrip("*"), line)
            _, self.net, self.pin, _ = self.attributes.objects.changes[-1]
            return odd
        if match := _TYPE.match(text):
            self.type = _plated(match[1])
        elif match := _PLATED.search(text):
            self.type = int(match[1].upper() in ("YES", "TRUE", "1"))
        elif match := _START.search(text):
            self.starts.append((int(match[2]), _plated(match[1])))
        elif match := _CONTENTS.match(text):
            self.contents = _plated(match[1])
        return None

    def by_function(self) -> int:
        """Plating by the aperture function that holds now: Plated,PTH,ViaDrill and the like."""
        function = self.attributes.aperture.get(".AperFunction", ())
        return {"Plated": 1, "NonPlated": 0}.get(function[0].strip(), -1) if function else -1

    def by_start(self, tool: int) -> int:
        """Plating by the number of a tool, where the file says from which number on holes are plated."""
        return max(((first, plated) for first, plated in self.starts if first <= tool), default=(0, -1))[1]

    def of_file(self) -> int:
        """Plating of holes of which nothing else is said."""
        function = self.attributes.file.get(".FileFunction", ())
        said = {"Plated": 1, "NonPlated": 0}.get(function[0].strip(), -1) if function else -1
        return said if said >= 0 else self.contents


def _plated(word: str) -> int:
    return int(not word.upper().startswith("NON"))
