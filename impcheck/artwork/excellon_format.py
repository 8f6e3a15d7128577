"""How the numbers of a drill file are meant. In: its lines and the board's extent (mm); out: a Format that turns number texts into mm.

LZ means that leading zeros are kept (trailing ones may be left out), TZ the opposite. Statements are taken from commands (METRIC, INCH,
M71, M72), then from the comments layout tools write; what neither says is inferred from where the holes would lie on the board.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from itertools import product

import numpy as np

from impcheck.artwork.image import Floats
from impcheck.errors import InputError, Problem, Remark, RemarkKind

Extent = tuple[float, float, float, float]  # min x, min y, max x, max y, mm

_INCH = 25.4
_NAMES = {1.0: "mm", _INCH: "inch"}
# Digits before and after the point, the usual ones first (common practice). Only those after it matter for TZ, only those before it for LZ.
_USUAL = {1.0: ((3, 3), (4, 2), (4, 4), (2, 5), (5, 1)), _INCH: ((2, 4), (3, 3), (1, 5), (4, 6))}
_TOOLS = {1.0: (0.1, 6.5), _INCH: (0.004, 0.26)}  # drill diameters a board has, in the unit (common practice)
_MARGIN, _MARGIN_SHARE = 2.0, 0.05  # how far tooling holes may lie outside, mm and share of the board's size

_HEADER = re.compile(r"\s*(METRIC|INCH)\b((?:\s*,\s*[\w.]+)*)\s*(?:;.*)?$", re.IGNORECASE)
_CODE = re.compile(r"(?<![A-Z,])(?:M7([12])|G7([01]))(?!\d)", re.IGNORECASE)
_DIGITS = re.compile(r"FORMAT\s*[:=]?\s*\{?\s*(\d)\s*[:.]\s*(\d)", re.IGNORECASE)
_COORDINATE = re.compile(r"([XY])\s*([+-]?)\s*(\d+(?:\.\d*)?|\.\d+)")
_ASIDE = re.compile(r"R|G93|M0?2|M97|M98|M47|G0?4")  # lines whose numbers are no places
_KEPT = re.compile(r"[XY]\s*[+-]?(0\d*[1-9]\d*)(?![\d.])", re.IGNORECASE), re.compile(r"[XY]\s*[+-]?(\d*[1-9]\d*0)(?![\d.])", re.IGNORECASE)
_TOOL = re.compile(r"^\s*T\d+[^C;\n]*C\s*([\d.]+)", re.IGNORECASE)
_INCREMENTAL = re.compile(r"G91|ICI(?:,ON)?\s*$")


@dataclass(frozen=True)
class Format:
    """The meaning of a number: with a decimal point as it stands, without one by its digits."""

    unit: float  # mm
    leading: bool  # leading zeros are kept: the first `integers` digits stand before the point
    integers: int
    decimals: int  # trailing zeros are kept: the last `decimals` digits stand behind the point

    def reader(self) -> Callable[[str], float]:
        """A function from the text of a number to mm."""
        unit, integers, scale = self.unit, self.integers, self.unit / 10**self.decimals

        def leading(text: str) -> float:
            if "." in text:
                return float(text) * unit
            digits = len(text) - (text[0] in "+-")
            return int(text) * unit / 10.0 ** (digits - integers)

        def trailing(text: str) -> float:
            return float(text) * unit if "." in text else int(text) * scale

        return leading if self.leading else trailing

    def __str__(self) -> str:
        return f"{_NAMES[self.unit]}, {self.integers}.{self.decimals} digits, {'leading' if self.leading else 'trailing'} zeros kept"


@dataclass
class _Said:
    """One property and the places where the file states it."""

    what: str
    commands: list[tuple[object, int]] = field(default_factory=list)
    comments: list[tuple[object, int]] = field(default_factory=list)

    def settle(self, file: str, remarks: list[Remark]) -> object | None:
        """The stated value; None where nothing is. Raises InputError where two commands disagree."""
        for value, line in self.commands:
            first, before = self.commands[0]
            if value != first:
                said = f"the {self.what} differs from that of line {before}"
                raise InputError(Problem(file, line, said, "state it once, or export the drill file again"))
        source = self.commands or self.comments
        for value, line in self.comments:
            if source and value != source[0][0]:
                said = f"the comment states another {self.what} than line {source[0][1]}; the latter was followed"
                remarks.append(Remark(RemarkKind.DISAGREEMENT, said, file, line))
                break
        return source[0][0] if source else None


def settle_format(lines: Sequence[str], file: str, extent: Extent | None) -> tuple[Format, tuple[Remark, ...]]:
    """The Format of a file, and what was guessed or disagreed. Raises InputError where two commands contradict each other."""
    remarks: list[Remark] = []
    units, zeros, digits = (said.settle(file, remarks) for said in _statements(lines))
    places = _places(lines)
    dotted = not any(len(column.digits) for column in places)
    candidates = []
    for unit in [float(units)] if isinstance(units, float) else [_INCH, 1.0]:
        shapes = [digits] if isinstance(digits, tuple) else _USUAL[unit][:1] if dotted else _USUAL[unit]
        for (integers, decimals), leading in product(shapes, [zeros] if zeros is not None else [False] if dotted else [False, True]):
            candidates.append(Format(unit, bool(leading), integers, decimals))
    open_ = [
        what for what, value in (("unit", units), ("digits", digits), ("zeros", zeros)) if value is None and (what == "unit" or not dotted)
    ]
    tools = np.array([float(match[1]) for line in lines if (match := _TOOL.match(line)) and match[1].count(".") == 1 and len(match[1]) > 1])
    kept = None if zeros is not None or dotted else _zeros_kept(lines)
    scores = [
        _score(candidate, places, tools, extent) + 4.0 * (candidate.leading == kept) - 0.001 * order
        for order, candidate in enumerate(candidates)
    ]
    best = int(np.argmax(scores))
    found = candidates[best]
    spans = {_span(candidate, places) for candidate in candidates}
    if open_ and (len(spans) > 1 or units is None) and any(len(column) for column in places):
        lack = " and ".join([*filter(None, [", ".join(open_[:-1])]), open_[-1]])
        why = "as is usual" if extent is None else "because then its holes lie on the board"
        taken = f"{_NAMES[found.unit]}" if dotted else str(found)
        remarks.append(Remark(RemarkKind.GUESS, f"the drill file does not state its {lack}; read as {taken}, {why}", file))
    elif extent is not None and any(len(column) for column in places) and _inside(found, places, extent) < 0.5:
        said = f"most holes lie off the board when read as stated ({found}); check the format of the drill file"
        remarks.append(Remark(RemarkKind.DISAGREEMENT, said, file))
    return found, tuple(remarks)


def _statements(lines: Sequence[str]) -> tuple[_Said, _Said, _Said]:
    units, zeros, digits = _Said("unit"), _Said("zero suppression"), _Said("number of digits")
    for number, line in enumerate(lines, 1):
        if not line or line[0] in "XYxy":
            continue
        text, _, comment = line.partition(";")
        if match := _HEADER.match(text):
            units.commands.append((1.0 if match[1].upper() == "METRIC" else _INCH, number))
            for option in re.findall(r"[\w.]+", match[2].upper()):
                if option in ("LZ", "TZ"):
                    zeros.commands.append((option == "LZ", number))
                elif re.fullmatch(r"0+\.0+", option):
                    before, _, behind = option.partition(".")
                    digits.commands.append(((len(before), len(behind)), number))
        elif text and (match := _CODE.search(text)):
            units.commands.append((1.0 if "1" in (match[1] or "") + (match[2] or "") else _INCH, number))
        if comment and (match := _DIGITS.search(comment)):
            digits.comments.append(((int(match[1]), int(match[2])), number))
        if comment and re.search(r"\bFORMAT\b", comment, re.IGNORECASE):
            _in_comment(comment.casefold(), number, units, zeros)
    return units, zeros, digits


def _in_comment(comment: str, number: int, units: _Said, zeros: _Said) -> None:
    """Unit and zeros in a comment like `FORMAT={3:3/ absolute / metric / keep zeros}` or `Format : 3.3 / Absolute / MM / Leading`."""
    if re.search(r"\b(metric|mm|millimet\w+)\b", comment):
        units.comments.append((1.0, number))
    elif re.search(r"\b(inch|inches|imperial|english)\b", comment):
        units.comments.append((_INCH, number))
    if re.search(r"keep leading|(suppress|omit)\w*\s+trailing|/\s*trailing\s*(/|$)", comment):
        zeros.comments.append((True, number))
    elif re.search(r"keep trailing|(suppress|omit)\w*\s+leading|/\s*leading\s*(/|$)|keep zeros", comment):
        zeros.comments.append((False, number))


@dataclass(frozen=True)
class _Column:
    """All X, or all Y, of a file: those with a point as numbers, the others as integers with their count of digits."""

    dotted: Floats
    value: Floats
    digits: Floats
    incremental: bool

    def __len__(self) -> int:
        return len(self.dotted) + len(self.value)

    def mm(self, form: Format) -> Floats:
        power = self.digits - form.integers if form.leading else np.full(len(self.value), float(form.decimals))
        found = np.concatenate((self.dotted, self.value / 10.0**power)) * form.unit
        return np.cumsum(found) if self.incremental else found


def _places(lines: Sequence[str]) -> tuple[_Column, _Column]:
    """Coordinates as far as they can be told from other numbers without knowing the state of the machine."""
    incremental = any(_INCREMENTAL.search(line) for line in lines if line and line[0] not in "XYxy;")
    text = "\n".join(line.partition(";")[0] for line in lines if line and not _ASIDE.match(line)).upper()
    dotted: dict[str, list[float]] = {"X": [], "Y": []}
    value: dict[str, list[float]] = {"X": [], "Y": []}
    count: dict[str, list[float]] = {"X": [], "Y": []}
    for axis, sign, digits in _COORDINATE.findall(text):
        number = min(float(digits), 1e30)
        if "." in digits:
            dotted[axis].append(-number if sign == "-" else number)
        else:
            value[axis].append(-number if sign == "-" else number)
            count[axis].append(min(len(digits), 30))
    x, y = (_Column(np.array(dotted[axis]), np.array(value[axis]), np.array(count[axis]), incremental) for axis in "XY")
    return x, y


def _zeros_kept(lines: Sequence[str]) -> bool | None:
    """Which zeros the numbers themselves show to be kept: True leading ones, False trailing ones, None both or neither."""
    text = "\n".join(line.partition(";")[0] for line in lines if line and not _ASIDE.match(line))
    leading, trailing = (pattern.search(text) is not None for pattern in _KEPT)
    return leading if leading != trailing else None


def _span(form: Format, places: tuple[_Column, _Column]) -> tuple[float, ...]:
    return tuple(float(edge) for column in places if len(column) for edge in (column.mm(form).min(), column.mm(form).max()))


def _inside(form: Format, places: tuple[_Column, _Column], extent: Extent) -> float:
    """The smaller share, of X and of Y, that lies on the board or just beside it."""
    shares = []
    for column, low, high in zip(places, extent[:2], extent[2:], strict=True):
        margin = max(_MARGIN, _MARGIN_SHARE * (high - low))
        at = column.mm(form)
        shares.append(float(np.mean((at >= low - margin) & (at <= high + margin))) if len(at) else 1.0)
    return min(shares)


def _score(form: Format, places: tuple[_Column, _Column], tools: Floats, extent: Extent | None) -> float:
    """How plausible a reading is: holes on the board (10), tools of sizes there are (3), holes spread over the board (1)."""
    least, most = _TOOLS[form.unit]
    score = 3.0 * float(np.mean((tools >= least) & (tools <= most))) if len(tools) else 0.0
    if extent is None:
        far = max((abs(edge) for edge in _span(form, places)), default=0.0)
        return score - (10.0 if far > 1000.0 else 0.0)  # no board is a metre long
    spread = 0.0
    for column, low, high in zip(places, extent[:2], extent[2:], strict=True):
        if len(column) and high > low:
            spread = max(spread, min(float(np.ptp(column.mm(form))) / (high - low), 1.0))
    return score + 10.0 * _inside(form, places, extent) + spread
