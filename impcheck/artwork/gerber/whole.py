"""Commands that act on the whole image (all withdrawn, all met in old files). In: their text; out: what to do, lengths in mm."""

from __future__ import annotations

import re
from dataclasses import dataclass

from impcheck.artwork.gerber.apertures import FARTHEST

NUMBER = r"[+-]?(?:\d{1,12}\.?\d{0,20}|\.\d{1,20})"
WHOLE = frozenset({"AS", "IP", "IR", "MI", "OF", "SF"})


class WholeError(ValueError):
    """A command that cannot be understood: the message, and what would be right."""

    def __init__(self, message: str, remedy: str) -> None:
        super().__init__(message)
        self.message = message
        self.remedy = remedy


@dataclass
class Whole:
    """What the commands of a file ask for."""

    mirror: tuple[bool, bool] = (False, False)  # MI: x, y
    scale: tuple[float, float] = (1.0, 1.0)  # SF
    offset: tuple[float, float] = (0.0, 0.0)  # OF, mm
    rotation: float = 0.0  # IR, degrees
    swap: bool = False  # AS: x and y change places
    negative: bool = False  # IP

    def apply(self, name: str, text: str, mm: float) -> None:
        """Takes in one command: its two letters, the text behind them, mm of the unit that holds. Raises WholeError."""
        if name == "IP":
            self.negative = _choice(text, ("POS", "NEG")) == "NEG"
        elif name == "IR":
            self.rotation = float(_choice(text, ("0", "90", "180", "270")))
        elif name == "AS":
            self.swap = _choice(text, ("AXBY", "AYBX")) == "AYBX"
        elif name == "MI":
            match = re.fullmatch(r"(?:A([01]))?(?:B([01]))?", text)
            if not match:
                raise WholeError("no mirroring", "as in %MIA1B0*%")
            self.mirror = match[1] == "1", match[2] == "1"
        elif name == "SF":
            a, b = _pair(text, 1.0)
            if not (0 < a <= FARTHEST and 0 < b <= FARTHEST):
                raise WholeError("a factor is out of range", "factors are over 0")
            self.scale = a, b
        else:
            a, b = _pair(text, 0.0)
            if max(abs(a), abs(b)) * mm > FARTHEST:
                raise WholeError("a number is out of range", f"at most {FARTHEST:g} mm")
            self.offset = a * mm, b * mm


def _choice(text: str, allowed: tuple[str, ...]) -> str:
    if text not in allowed:
        raise WholeError("not one of the values this command has", ", ".join(allowed))
    return text


def _pair(text: str, default: float) -> tuple[float, float]:
    match = re.fullmatch(rf"(?:A({NUMBER}))?(?:B({NUMBER}))?", text)
    if not match:
        raise WholeError("no two numbers", "as in A1.0B1.0")
    return (default if match[1] is None else float(match[1])), (default if match[2] is None else float(match[2]))
