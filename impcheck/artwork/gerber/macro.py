"""Aperture macros. In: the text of an AM command and the parameters of an AD; out: primitives, lengths in mm, angles in degrees."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from functools import cached_property

from impcheck.artwork.image import Primitive

_NUMBER = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)")
_TOKEN = re.compile(r"(?P<number>\d+\.?\d*|\.\d+)|\$(?P<variable>\d+)|(?P<operator>[-+xX/()])")
_DEEPEST = 40  # parentheses in parentheses
_CLOSED_WITHIN = 0.002  # mm; outlines of real files miss their first point by a rounding step of up to a 1/10,000 inch

Expression = float | tuple[tuple[str, float], ...]  # a number, or its tokens


class MacroError(ValueError):
    """A macro that cannot be read or evaluated: the message, and what would be right."""

    def __init__(self, message: str, remedy: str) -> None:
        super().__init__(message)
        self.message = message
        self.remedy = remedy


@dataclass(frozen=True)
class Step:
    """One block of a macro: an assignment to a variable, or a primitive."""

    variable: int  # 0 for a primitive
    values: tuple[Expression, ...]


@dataclass(frozen=True)
class Macro:
    """A macro as defined: its steps in order."""

    name: str
    steps: tuple[Step, ...]

    @cached_property
    def cost(self) -> int:
        """How many numbers and operators one evaluation goes through."""
        return sum(1 if isinstance(value, float) else len(value) for step in self.steps for value in step.values)


def parse_macro(name: str, blocks: list[str]) -> Macro:
    """Reads the blocks between the `*` of an AM command. Raises MacroError."""
    steps = []
    for raw in blocks:
        if re.match(r"\s*(?:0(?![\d.])|G0*4\b)", raw):  # primitive 0 is a comment; the specification's own example puts a G04 here
            continue
        block = "".join(raw.split())
        if not block:
            continue
        if block[0] == "$":
            match = re.fullmatch(r"\$(\d+)=(.+)", block)
            if not match or int(match[1]) == 0:
                raise MacroError(f"'{block[:30]}' is no macro statement", "a variable is set as in $3=$1x0.5")
            steps.append(Step(int(match[1]), (_parse(match[2]),)))
            continue
        values = block.rstrip(",").split(",")
        if any(not value for value in values):
            raise MacroError(f"an empty number in '{block[:30]}'", "write every number of a macro primitive")
        steps.append(Step(0, tuple(_parse(value) for value in values)))
    return Macro(name, tuple(steps))


def evaluate(macro: Macro, parameters: tuple[float, ...], scale: float, most: int) -> tuple[tuple[Primitive, ...], tuple[str, ...]]:
    """The macro's primitives for the given parameters ($1 is the first; those not given are 0), and what was odd.

    scale: mm of the file's unit. most: how many primitives are allowed. Raises MacroError.
    """
    variables = dict(enumerate(parameters, 1))
    primitives: list[Primitive] = []
    odd: list[str] = []
    for step in macro.steps:
        values = [value if isinstance(value, float) else _Evaluation(value, variables).result() for value in step.values]
        if step.variable:
            variables[step.variable] = values[0]
            continue
        for value in values:
            if not math.isfinite(value) or abs(value) > 1e9:
                raise MacroError("number out of range in the macro", "lengths of a board stay below 10 m")
        made = _primitive(values, scale, odd)
        # Rings cut what stands before them; a target's own gaps must not cut the shapes drawn earlier, and a union does not mind the order.
        if values[0] == 6 and all(primitive.dark for primitive in primitives):
            primitives[:0] = made
        else:
            primitives.extend(made)
        if len(primitives) > most:
            raise MacroError("the macro has too many primitives", f"limit macro_primitives = {most}")
    return tuple(primitives), tuple(dict.fromkeys(odd))


def _parse(text: str) -> Expression:
    if _NUMBER.fullmatch(text):
        return float(text)
    tokens: list[tuple[str, float]] = []
    position = 0
    while position < len(text):
        match = _TOKEN.match(text, position)
        if not match:
            raise MacroError(f"'{text[:30]}' is no macro expression", "an expression is made of numbers, $1, +, -, x, / and parentheses")
        if match["number"]:
            tokens.append(("n", float(match["number"])))
        elif match["variable"]:
            tokens.append(("$", float(match["variable"])))
        else:
            tokens.append((match["operator"].lower(), 0.0))
        position = match.end()
    _Evaluation(tuple(tokens), None).result()  # a wrong expression is found even where no aperture uses it
    return tuple(tokens)


class _Evaluation:
    """One pass over an expression; without variables only its form is checked."""

    def __init__(self, tokens: tuple[tuple[str, float], ...], variables: dict[int, float] | None) -> None:
        self.tokens = tokens
        self.variables = variables
        self.position = 0
        self.depth = 0

    def result(self) -> float:
        value = self._sum()
        if self.position < len(self.tokens):
            raise self._wrong()
        return value

    def _peek(self) -> str:
        return self.tokens[self.position][0] if self.position < len(self.tokens) else ""

    def _wrong(self) -> MacroError:
        return MacroError("a macro expression is incomplete or has an operator in a wrong place", "write it as in 1.5x($1-$2)")

    def _sum(self) -> float:
        value = self._product()
        while self._peek() in ("+", "-"):
            operator = self._peek()
            self.position += 1
            term = self._product()
            value = value + term if operator == "+" else value - term
        return value

    def _product(self) -> float:
        value = self._factor()
        while self._peek() in ("x", "/"):
            operator = self._peek()
            self.position += 1
            factor = self._factor()
            if operator == "x":
                value *= factor
            elif self.variables is not None:
                if factor == 0:
                    raise MacroError("a macro divides by zero", "check the aperture's parameters; one that is left out counts as 0")
                value /= factor
        return value

    def _factor(self) -> float:
        sign = 1.0
        while self._peek() in ("+", "-"):
            sign = -sign if self._peek() == "-" else sign
            self.position += 1
        if self.position >= len(self.tokens):
            raise self._wrong()
        name, number = self.tokens[self.position]
        self.position += 1
        if name == "n":
            return sign * number
        if name == "$":
            return sign * (self.variables.get(int(number), 0.0) if self.variables is not None else 0.0)
        if name != "(":
            raise self._wrong()
        self.depth += 1
        if self.depth > _DEEPEST:
            raise MacroError("a macro expression is nested too deeply", f"at most {_DEEPEST} parentheses in parentheses")
        value = self._sum()
        if self._peek() != ")":
            raise self._wrong()
        self.position += 1
        self.depth -= 1
        return sign * value


_SHAPES = {  # code: (its name, numbers behind the code that must be there, numbers with the optional rotation)
    1: ("circle", 4, 5),
    2: ("vector line", 6, 7),
    20: ("vector line", 6, 7),
    21: ("centre line", 5, 6),
    22: ("lower left line", 5, 6),
    5: ("polygon", 5, 6),
    6: ("moire", 8, 9),
    7: ("thermal", 5, 6),
}


def _primitive(values: list[float], mm: float, odd: list[str]) -> list[Primitive]:
    code, given = values[0], values[1:]
    if code == 4:
        return [_outline(given, mm, odd)]
    if code not in _SHAPES:
        raise MacroError(f"unknown macro primitive {code:g}", "primitives are 0, 1, 4, 5, 7, 20, 21 and the old 2, 6, 22")
    name, least, full = _SHAPES[int(code)]
    if not least <= len(given) <= full:
        raise MacroError(f"macro primitive {code:g} ({name}) has {len(given)} numbers", f"it takes {least} to {full}")
    given = given + [0.0] * (full - len(given))
    *_, rotation = given
    if code == 6:
        return _moire(given, mm)
    if code == 7:
        x, y, outer, inner, gap, rotation = given
        if not outer > inner >= 0 or gap < 0:
            raise MacroError("a thermal's outer diameter is not over the inner one, or its gap is negative", "outer > inner >= 0, gap >= 0")
        if gap * math.sqrt(2) >= outer:
            return []  # the gaps leave nothing
        return [Primitive(7, True, (x * mm, y * mm, outer * mm, inner * mm, gap * mm, rotation))]
    dark = _exposure(given[0])
    if code == 1:
        _, diameter, x, y, _ = given
        _not_negative(name, diameter)
        return [Primitive(1, dark, (diameter * mm, x * mm, y * mm, rotation))]
    if code in (2, 20):
        _, width, *ends, _ = given
        _not_negative(name, width)
        return [Primitive(20, dark, (width * mm, *(end * mm for end in ends), rotation))]
    if code in (21, 22):
        _, width, height, x, y, _ = given
        _not_negative(name, width, height)
        if code == 22:
            x, y = x + width / 2, y + height / 2
        return [Primitive(21, dark, (width * mm, height * mm, x * mm, y * mm, rotation))]
    _, vertices, x, y, diameter, _ = given
    _not_negative(name, diameter)
    if vertices != round(vertices) or not 3 <= vertices <= 12:
        raise MacroError(f"a macro polygon has {vertices:g} vertices", "3 to 12")
    return [Primitive(5, dark, (vertices, x * mm, y * mm, diameter * mm, rotation))]


def _exposure(value: float) -> bool:
    if value not in (0.0, 1.0):
        raise MacroError(f"exposure {value:g} means nothing", "1 is on, 0 is off")
    return value == 1.0


def _not_negative(name: str, *sizes: float) -> None:
    for size in sizes:
        if size < 0:
            raise MacroError(f"a macro {name} has the negative size {size:g}", "sizes are 0 or more")


def _outline(given: list[float], mm: float, odd: list[str]) -> Primitive:
    if len(given) < 2 or given[1] != round(given[1]) or given[1] < 1:
        raise MacroError("a macro outline does not say how many segments it has", "4,exposure,segments,x0,y0,...,rotation")
    count = 2 * (int(given[1]) + 1)
    rest = given[2:]
    if len(rest) not in (count, count + 1):
        raise MacroError(
            f"a macro outline of {given[1]:g} segments has {len(rest)} numbers behind their count",
            f"{count} coordinates ({given[1]:g} segments and the first point again) and a rotation",
        )
    points = [number * mm for number in rest[:count]]
    rotation = rest[count] if len(rest) > count else 0.0
    gap = math.hypot(points[0] - points[-2], points[1] - points[-1])
    if 0 < gap <= _CLOSED_WITHIN:
        points[-2:] = points[:2]
    elif gap > 0:
        odd.append(f"a macro outline does not end at its first point ({gap:.4f} mm off); closed by a straight line")
        points += points[:2]
    return Primitive(4, _exposure(given[0]), (*points, rotation))


def _moire(given: list[float], mm: float) -> list[Primitive]:
    """Rings and a cross (withdrawn from the specification). A ring is a dark circle with a clear one in it."""
    x, y, diameter, thickness, gap, rings, cross_width, cross_length, rotation = given
    _not_negative("moire", diameter, thickness, gap, rings, cross_width, cross_length)
    parts = []
    for _ in range(int(min(rings, 1000))):
        if diameter <= 0:
            break
        parts.append(Primitive(1, True, (diameter * mm, x * mm, y * mm, rotation)))
        inner = diameter - 2 * thickness
        if inner <= 0:
            break
        parts.append(Primitive(1, False, (inner * mm, x * mm, y * mm, rotation)))
        if thickness + gap <= 0:
            break
        diameter = inner - 2 * gap
    half = cross_length / 2
    if half > 0 and cross_width > 0:
        width = cross_width * mm
        parts.append(Primitive(20, True, (width, (x - half) * mm, y * mm, (x + half) * mm, y * mm, rotation)))
        parts.append(Primitive(20, True, (width, x * mm, (y - half) * mm, x * mm, (y + half) * mm, rotation)))
    return parts
