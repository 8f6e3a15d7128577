"""The tools of a drill file. In: T words as text; out: tools with their diameter in mm and plating."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from impcheck.artwork.excellon_notes import NotedTool, Notes

_LARGEST = 50.0  # mm; a diameter without a point that would be larger is written in the digits of the coordinates


@dataclass(frozen=True)
class Tool:
    """One tool."""

    number: int
    diameter: float | None  # mm, None not stated
    plated: int  # 1, 0, -1 not said
    line: int


class Tools:
    """The tool table, as it grows while the file is read."""

    def __init__(self, noted: dict[int, NotedTool], unit: float, number: Callable[[str], float]) -> None:
        self.noted, self.unit, self.number = noted, unit, number
        self.table: dict[int, Tool] = {}

    def code(self, digits: str, defining: bool) -> int:
        """The tool's number. T0102 is tool 1 with compensation 2; T1002 too, where no tool 1002 is defined but a tool 10 is."""
        number = int(digits[:9])
        if len(digits) == 4 and (digits[0] == "0" or not defining):
            short = int(digits[:2])
            if digits[0] == "0" or (number not in self.table and short in self.table):
                return short
        return number

    def define(self, code: int, size: str | None, notes: Notes, line: int) -> str | None:
        """Enters a tool; `size` is the text behind C. Returns what was odd, or None."""
        plated = next((said for said in (notes.by_function(), notes.type, notes.by_start(code)) if said >= 0), -1)
        odd = None
        if size is None:
            if code not in self.table:
                self.table[code] = Tool(code, None, plated, line)
            return None
        diameter = float(size) * self.unit if len(size) < 18 else float("inf")
        if "." not in size and (diameter > _LARGEST or (size[0] == "0" and len(size) >= 3)):
            diameter = self.number(size)
            odd = f"the diameter of T{code} has no decimal point; read in the digits of the coordinates as {diameter:g} mm"
        before = self.table.get(code)
        if before is not None and before.diameter is not None and abs(before.diameter - diameter) > 1e-9:
            odd = f"T{code} is defined again with another diameter; it holds for the holes that follow"
        self.table[code] = Tool(code, diameter, plated, line)
        return odd

    def diameter(self, code: int) -> float | None:
        """Diameter in mm; None where neither the file nor its comments give it, or where it is not above zero."""
        tool = self.table.get(code)
        if tool is not None and tool.diameter is not None:
            return tool.diameter if 0 < tool.diameter < 1000 else None
        noted = self.noted.get(code)
        return noted.diameter if noted is not None and 0 < noted.diameter < 1000 else None

    def plated(self, code: int) -> int:
        """Plating as the tool's definition or the table in comments says it."""
        tool, noted = self.table.get(code), self.noted.get(code)
        if tool is not None and tool.plated >= 0:
            return tool.plated
        return noted.plated if noted is not None else -1
