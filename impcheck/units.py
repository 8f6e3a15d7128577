"""Quantities with units. In: text as a person writes it ("0.19mm", "300ps", "50 ohm", "10%"); out: mm, s, Hz, ohm and shares."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from decimal import Decimal
from functools import cache

from quantiphy import Quantity

_NUMBER = re.compile(r"([+-]?(?:\d{1,30}(?:\.\d{0,30})?|\.\d{1,30})(?:[eE][+-]?\d{1,2})?)\s*([^\s\d.,+-][^\d,]*)?")

# exact by definition: 1 inch = 25.4 mm (international yard and pound agreement of 1959), 1 mil = 1/1000 inch
_INCHES = {"mil": "0.0254", "mils": "0.0254", "thou": "0.0254", "in": "25.4", "inch": "25.4", '"': "25.4"}
_SI_LENGTHS = ("mm", "um", "µm", "nm", "cm")
_SI_TIMES = ("s", "ms", "us", "µs", "ns", "ps", "fs")
_SI_FREQUENCIES = ("Hz", "kHz", "MHz", "GHz", "THz")
_SI_IMPEDANCES = ("ohm", "ohms", "Ohm", "Ohms", "Ω", "mohm", "mΩ", "kohm", "kΩ")


def length(text: str, what: str = "length", example: str = "mm") -> float:
    """A length in mm. Units mm, um, nm, cm, mil (thou), in (inch).

    `what` is how the quantity is called in an error, `example` the unit proposed where none was written. Zero needs no unit. Raises
    ValueError with a sentence: no number, no unit, or one that is not a length.

    >>> length("0.19mm"), length("42um"), length("5 mil")
    (0.19, 0.042, 0.127)
    """
    return _quantity(text, what, example, _SI_LENGTHS, _INCHES, "0.001", "mm, um, mil or in")


def time(text: str, what: str = "time", example: str = "ps") -> float:
    """A time in s. Units s, ms, us, ns, ps, fs. Raises ValueError with a sentence.

    >>> time("300ps")
    3e-10
    """
    return _quantity(text, what, example, _SI_TIMES, {}, "1", "ps, ns, us, ms or s")


def frequency(text: str, what: str = "frequency", example: str = "GHz") -> float:
    """A frequency in Hz. Units Hz, kHz, MHz, GHz, THz. Raises ValueError with a sentence.

    >>> frequency("2.5 GHz")
    2500000000.0
    """
    return _quantity(text, what, example, _SI_FREQUENCIES, {}, "1", "Hz, kHz, MHz or GHz")


def impedance(text: str, what: str = "impedance", example: str = " ohm") -> float:
    """An impedance in ohm. Units ohm (or the sign), mohm, kohm. Raises ValueError with a sentence.

    >>> impedance("50 ohm")
    50.0
    """
    return _quantity(text, what, example, _SI_IMPEDANCES, {}, "1", "ohm")


def ratio(text: str, what: str = "share", example: str = "%") -> float:
    """A share, written in per cent. Raises ValueError with a sentence.

    >>> ratio("10%")
    0.1
    """
    match = _NUMBER.fullmatch(text.strip())
    if match and not match[2] and 0 < abs(Decimal(match[1])) < 1:
        raise ValueError(f"{what} '{_short(text)}' has no unit; write {(Decimal(match[1]) * 100).normalize():f}%")
    return _quantity(text, what, example, (), {"%": "0.01", "percent": "0.01"}, "1", "per cent, as in 10%")


def number(text: str, what: str = "number") -> float:
    """A number without a unit. Raises ValueError with a sentence.

    >>> number("4.05")
    4.05
    """
    match = _NUMBER.fullmatch(text.strip())
    if match is None:
        raise ValueError(f"{what} '{_short(text)}' is not a number")
    if match[2]:
        raise ValueError(f"{what} '{_short(text)}' takes no unit; write {match[1]}")
    return float(match[1])


def _quantity(text: str, what: str, example: str, si: tuple[str, ...], other: Mapping[str, str], base: str, expected: str) -> float:
    """The value of a number and its unit; `base` is the result's unit in SI units. Decimal arithmetic: 0.19mm is the float 0.19."""
    plain = text.strip().replace("μ", "µ")  # the Greek letter and the micro sign look alike
    match = _NUMBER.fullmatch(plain)
    if match is None:
        raise ValueError(f"{what} '{_short(text)}' is not a number with a unit ({expected})")
    value, unit = Decimal(match[1]), match[2]
    if not unit:
        if value == 0:
            return 0.0
        raise ValueError(f"{what} '{_short(text)}' has no unit; write {match[1]}{example}")
    if unit in other:
        factor = Decimal(other[unit])
    elif unit in si:
        factor = _si(unit) / Decimal(base)
    else:
        raise ValueError(f"{what} '{_short(text)}' has the unit '{_short(unit)}'; write {expected}")
    result = float(value * factor)
    if not math.isfinite(result):
        raise ValueError(f"{what} '{_short(text)}' is beyond any number")
    return result


@cache
def _si(unit: str) -> Decimal:
    """What one of a prefixed unit is in the unit without it. The lists of units above keep out what reads in two ways ("m", "mil")."""
    return Decimal(repr(float(Quantity(f"1 {unit}"))))


def _short(text: str) -> str:
    return text if len(text) <= 40 else text[:37] + "..."
