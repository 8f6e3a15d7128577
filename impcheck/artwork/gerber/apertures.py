"""Aperture definitions (AD). In: the text behind AD, the macros known so far, the unit; out: an Aperture in mm and degrees."""

from __future__ import annotations

import re
from collections.abc import Mapping

from impcheck.artwork.gerber.macro import Macro, MacroError, evaluate
from impcheck.artwork.image import Aperture

FARTHEST = 10_000.0  # mm; no board reaches this far, so a greater number is a mistake in the file
_STANDARD = {  # name: (shape, numbers that must be there, numbers with a rectangular hole)
    "C": ("circle", 1, 3),
    "R": ("rectangle", 2, 4),
    "O": ("obround", 2, 4),
    "P": ("polygon", 2, 5),
}
_EXAMPLE = "as in ADD10C,0.15"


def parse_aperture(
    text: str,
    macros: Mapping[str, Macro],
    *,
    mm: float,
    most_primitives: int,
    attributes: Mapping[str, tuple[str, ...]],
    line: int,
) -> tuple[int, Aperture, tuple[str, ...]]:
    """Number and aperture of one definition (`D10C,0.15`), and what was odd about it. Raises MacroError (message, remedy)."""
    match = re.fullmatch(r"D(\d{1,9})([^,]*)(?:,(.*))?", text)
    if not match:
        raise MacroError(f"'AD{text[:30]}' is no aperture definition", _EXAMPLE)
    number, name = _split(match[1], match[2], macros)
    code = int(number)
    if code < 10:
        raise MacroError(f"aperture number D{code} is reserved", "apertures have numbers from D10 on")
    values, odd = _numbers(match[3] or "")
    shown = f"D{code}"
    if name in macros:
        try:
            primitives, strange = evaluate(macros[name], values, mm, most_primitives)
        except MacroError as error:
            raise MacroError(f"aperture D{code}, macro '{name}': {error.message}", error.remedy) from error
        return code, Aperture(shown, "macro", (), (), primitives, name, attributes, line), (*odd, *strange)
    if name not in _STANDARD and name.upper() in _STANDARD:
        odd = (*odd, f"the aperture type '{name}' is read as '{name.upper()}'")
        name = name.upper()
    if name not in _STANDARD:
        raise MacroError(
            f"aperture D{code} uses the macro '{name}', which is not defined before it", "C, R, O, P or the name of an AM command"
        )
    shape, least, full = _STANDARD[name]
    if not least <= len(values) <= full:
        raise MacroError(f"aperture D{code} ({shape}) has {len(values)} numbers", f"it takes {least} to {full}, {_EXAMPLE}")
    if name == "P":
        size, vertices = values[:2]
        rotation = values[2] if len(values) > 2 else 0.0
        if vertices != round(vertices) or not 3 <= vertices <= 12:
            raise MacroError(f"aperture D{code} is a polygon of {vertices:g} vertices", "3 to 12")
        _check(code, (size, *values[3:]), mm)
        hole = tuple(value * mm for value in values[3:])
        return code, Aperture(shown, shape, (size * mm, vertices, rotation), _hole(hole), (), "", attributes, line), odd
    _check(code, values, mm)
    sizes = tuple(value * mm for value in values)
    return code, Aperture(shown, shape, sizes[:least], _hole(sizes[least:]), (), "", attributes, line), odd


def _split(digits: str, name: str, macros: Mapping[str, Macro]) -> tuple[str, str]:
    """Number and name; a macro's name may begin with digits, so the known names decide."""
    if name in macros or name in _STANDARD:
        return digits, name
    for length in range(len(digits) - 1, 1, -1):
        if digits[length:] + name in macros:
            return digits[:length], digits[length:] + name
    return digits, name


def _numbers(text: str) -> tuple[tuple[float, ...], tuple[str, ...]]:
    if not text:
        return (), ()
    parts = re.split("[Xx]", text)
    odd: tuple[str, ...] = ()
    while parts and not parts[-1]:
        parts.pop()
        odd = ("an aperture definition ends with an X too many",)
    values = []
    for part in parts:
        if not re.fullmatch(r"[+-]?(?:\d{1,15}\.?\d{0,30}|\.\d{1,30})", part):
            raise MacroError(f"'{part[:24]}' is no number", f"numbers with a decimal point, joined by X, {_EXAMPLE}")
        values.append(float(part))
    return tuple(values), odd


def _check(code: int, sizes: tuple[float, ...], mm: float) -> None:
    for size in sizes:
        if size < 0:
            raise MacroError(f"aperture D{code} has the negative size {size:g}", "sizes are 0 or more")
        if size * mm > FARTHEST:
            raise MacroError(f"aperture D{code} has a size out of range ({size * mm:g} mm)", f"at most {FARTHEST:g} mm; check the unit")


def _hole(sizes: tuple[float, ...]) -> tuple[float, ...]:
    return () if not any(sizes) else sizes
