"""Units, zeros and digits of a drill file. In: its lines; out: what it states, and the readings worth trying where it does not."""

from __future__ import annotations

import re
from dataclasses import dataclass

INCH = 25.4


@dataclass(frozen=True)
class Format:
    """How numbers without a decimal point are read."""

    metric: bool
    integer: int
    decimal: int
    leading: bool  # leading zeros are kept (trailing ones left out): "LZ"

    @property
    def unit(self) -> float:
        """mm in one unit of the file."""
        return 1.0 if self.metric else INCH

    def __str__(self) -> str:
        return f"{'mm' if self.metric else 'inch'}, {self.integer}.{self.decimal} digits, {'leading' if self.leading else 'trailing'} zeros kept"

    def number(self, text: str) -> float:
        """A coordinate in mm. Raises ValueError where the text is no number."""
        if "." in text:
            return float(text) * self.unit
        sign = -1.0 if text.startswith("-") else 1.0
        digits = text.lstrip("+-")
        if not digits.isdigit():
            raise ValueError(text)
        if self.leading:
            digits = digits.ljust(self.integer + self.decimal, "0")
            return sign * int(digits) / 10.0 ** (len(digits) - self.integer) * self.unit
        return sign * int(digits) / 10.0**self.decimal * self.unit


@dataclass
class Stated:
    """What a file says; None where it does not."""

    metric: bool | None = None
    digits: tuple[int, int] | None = None
    leading: bool | None = None

    def missing(self) -> str:
        """What is not said, in words; "" where all is."""
        parts = [word for word, value in (("its unit", self.metric), ("its digits", self.digits), ("which zeros it keeps", self.leading)) if value is None]
        return " and ".join(parts)


_COMMENT_DIGITS = re.compile(r"FORMAT\s*[={]+\s*\{?(\d)\s*[:.]\s*(\d)")
_HEADER_DIGITS = re.compile(r"(?:METRIC|INCH)\S*?,(0+)\.(0+)")


def stated_format(lines: list[str]) -> Stated:
    """Goes through header and comments."""
    found = Stated()
    for raw in lines:
        line = raw.strip().upper()
        if line.startswith(";"):
            if match := _COMMENT_DIGITS.search(line):
                found.digits = (int(match[1]), int(match[2]))
            if "FORMAT" in line:
                if "SUPPRESS LEADING" in line or "KEEP TRAILING" in line:
                    found.leading = False
                elif "SUPPRESS TRAILING" in line or "KEEP LEADING" in line:
                    found.leading = True
                if re.search(r"\bMETRIC\b", line) and found.metric is None:
                    found.metric = True
                elif re.search(r"\bINCH\b", line) and found.metric is None:
                    found.metric = False
            continue
        if line.startswith(("METRIC", "INCH")):
            found.metric = line.startswith("METRIC")
            if re.search(r",LZ\b", line):
                found.leading = True
            elif re.search(r",TZ\b", line):
                found.leading = False
            if match := _HEADER_DIGITS.match(line):
                found.digits = (len(match[1]), len(match[2]))
        elif re.match(r"M71\b", line):
            found.metric = True
        elif re.match(r"M72\b", line):
            found.metric = False
        elif line == "%" or line.startswith("M95"):
            continue
    return found


def candidates(stated: Stated) -> list[Format]:
    """Readings of a file in the order of how usual they are; one where everything is stated."""
    units = [stated.metric] if stated.metric is not None else [False, True]
    found = []
    for metric in units:
        usual = [(3, 3), (4, 2), (2, 4), (3, 2), (4, 4)] if metric else [(2, 4), (3, 3), (2, 5), (3, 5)]
        for integer, decimal in [stated.digits] if stated.digits is not None else usual:
            for leading in [stated.leading] if stated.leading is not None else [False, True]:
                found.append(Format(metric, integer, decimal, leading))
    return found
