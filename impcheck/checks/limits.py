"""Limits of rules. In: what a deck says; out: typed limits, lengths resolved in mm against the edge of a class."""

from __future__ import annotations

import re
from dataclasses import dataclass

from impcheck import units

LEVELS = ("error", "warning", "note")


@dataclass(frozen=True)
class Length:
    """A length: `mm`, or a share `rise` of the distance an edge covers during its rise time."""

    mm: float = 0.0
    rise: float = 0.0

    def against(self, edge: float) -> float:
        """The length in mm for an edge that covers `edge` mm during its rise time."""
        return self.mm + self.rise * edge

    def __str__(self) -> str:
        return f"{self.rise:.3g} x the edge's length" if self.rise else f"{self.mm:g} mm"


def length(text: str) -> Length:
    """Reads `0.5mm` or `5% rise`. Raises ValueError with a sentence."""
    match = re.fullmatch(r"\s*(.+?)\s*rise\s*", text)
    found = Length(rise=units.ratio(match[1], "share of the rise")) if match else Length(mm=units.length(text))
    if found.against(1.0) <= 0:
        raise ValueError(f"'{text}' is not over zero")
    return found


def share(text: str) -> float:
    """Reads `80%`. Raises ValueError with a sentence."""
    found = units.ratio(text)
    if not 0 < found <= 10:
        raise ValueError(f"'{text}' is not between 0 and 1000 %")
    return found


def factor(text: str) -> float:
    """Reads a plain number over zero. Raises ValueError with a sentence."""
    found = units.number(text)
    if not 0 < found < 1e3:
        raise ValueError(f"'{text}' is not a number between 0 and 1000")
    return found


def level(text: str) -> str:
    """Reads a level. Raises ValueError with a sentence."""
    if text not in LEVELS:
        raise ValueError(f"'{text}' is no level; write {', '.join(LEVELS[:-1])} or {LEVELS[-1]}")
    return text


READERS = {"Length": length, "Share": share, "Factor": factor, "Level": level}
Share = float
Factor = float
Level = str
