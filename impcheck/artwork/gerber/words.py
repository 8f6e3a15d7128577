"""Decodes all plain statements of a file at once. In: bytes of plain statements; out: rows of codes and raw numbers (no unit yet)."""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from impcheck.artwork.gerber.notes import Notes
from impcheck.artwork.image import Bools, Floats

Offsets = NDArray[np.int64]
Codes = NDArray[np.int32]  # -1 where a row has none

_BLANK, _DIGIT, _SIGN, _DOT, _LETTER, _STAR = range(6)
_CLASS = np.zeros(256, np.uint8)
_CLASS[list(b"0123456789")] = _DIGIT
_CLASS[list(b"XYIJDGMN")] = _LETTER
_CLASS[ord("*")] = _STAR
_CLASS[list(b"+-")] = _SIGN
_CLASS[ord(".")] = _DOT
_POWERS = 10.0 ** np.arange(17)
MOST_DIGITS = 15  # a double holds these exactly

# Which G codes set what, and to which value.
_INTERPOLATION = {0: 0, 1: 1, 2: 2, 3: 3}
_QUADRANT = {74: 74, 75: 75}
_REGION = {36: 1, 37: 0}
_UNIT = {70: 70, 71: 71}
_NOTATION = {90: 0, 91: 1}
_IGNORED = {54, 55}  # "select aperture", "prepare flash": the D code does it
_GROUPS = (_INTERPOLATION, _QUADRANT, _REGION, _UNIT, _NOTATION)


@dataclass(frozen=True)
class Numbers:
    """Raw numbers of one axis letter."""

    row: NDArray[np.int64]  # (k,) row each stands in, rising
    value: Floats  # (k,) as an integer, or as written where `decimal`
    digits: NDArray[np.int64]  # (k,) how many digits were written
    decimal: Bools  # (k,) written with a decimal point


@dataclass(frozen=True)
class Rows:
    """n rows, each a statement or a part of one that ends with its D code."""

    offset: Offsets  # (n,) in the file
    axes: dict[str, Numbers]  # "X", "Y", "I", "J"
    d: Codes  # (n,)
    interpolation: Codes  # (n,) 0 to 3
    quadrant: Codes  # (n,) 74, 75
    region: Codes  # (n,) 1 begin, 0 end
    unit: Codes  # (n,) 70, 71
    notation: Codes  # (n,) 0 absolute, 1 incremental
    ended: bool  # the file says where it ends (M02, M00)

    def __len__(self) -> int:
        return len(self.offset)


def rows_of(plain: NDArray[np.uint8], notes: Notes) -> Rows:
    """Decodes the statements; plain (bytes,) as from `scan`. Malformed numbers are noted as errors, and read as 0."""
    kind = _CLASS[plain]
    token_at = np.flatnonzero(kind >= _LETTER)
    letter = plain[token_at]
    value, digits, decimal = _numbers(plain, kind, token_at, notes)
    word = letter != 42
    first = np.ones(len(token_at), np.bool_)
    first[1:] = ~word[:-1] | (letter[:-1] == ord("D"))  # a row begins after a "*", and after a D code in mid statement
    first = first[word]
    letter, at, value, digits, decimal = letter[word], token_at[word], value[word], digits[word], decimal[word]
    for k in np.flatnonzero(digits == 0)[:50]:
        notes.error(int(at[k]), f"no number after {chr(letter[k])}", "a number must follow each letter")

    ended, keep = _end(letter, value, at, notes)
    letter, at, value, digits, decimal, first = (a[:keep] for a in (letter, at, value, digits, decimal, first))
    row = np.cumsum(first) - 1
    offset = at[first]
    count = len(offset)

    axes = {}
    for name in "XYIJ":
        mine = np.flatnonzero(letter == ord(name))
        where = row[mine]
        for k in mine[1:][where[1:] == where[:-1]][:50]:
            notes.error(int(at[k]), f"{name} stands twice in one statement", "give each axis once")
        axes[name] = Numbers(where, value[mine], digits[mine], decimal[mine])
    d = np.full(count, -1, np.int32)
    mine = np.flatnonzero(letter == ord("D"))
    d[row[mine]] = np.minimum(value[mine], 2**31 - 1).astype(np.int32)
    for k in mine[(value[mine] < 1) | ((value[mine] > 3) & (value[mine] < 10)) | decimal[mine]][:50]:
        notes.error(int(at[k]), f"D{value[k]:g} means nothing", "D01 draws, D02 moves, D03 flashes; apertures have numbers from D10 on")
    mine = np.flatnonzero(letter == ord("G"))
    groups = _g_codes(value[mine], at[mine], row[mine], count=count, notes=notes)
    return Rows(offset, axes, d, *groups, ended=ended)


def _numbers(plain: NDArray[np.uint8], kind: NDArray[np.uint8], token_at: Offsets, notes: Notes) -> tuple[Floats, NDArray[np.int64], Bools]:
    """Value, number of digits and decimal point of the number behind each token; blanks inside a number do not matter."""
    count = len(token_at)
    behind = np.cumsum(kind == _DIGIT, dtype=np.int32)  # digits up to and with each byte
    before = behind[token_at].astype(np.int64)
    total = int(behind[-1]) if len(behind) else 0
    digits = np.diff(before, append=total)
    digit_at = np.zeros(0, np.int64)
    if total and (not count or before[0] > 0):
        digit_at = np.flatnonzero(kind == _DIGIT)
        notes.error(int(digit_at[0]), "a number without a letter before it", "a statement starts with a letter such as X, G or D")
    value = _run_values(plain, kind, token_at, digits)
    if value is None:
        digit_at = np.flatnonzero(kind == _DIGIT)
        owner = np.searchsorted(token_at, digit_at) - 1
        digit_at, owner = digit_at[owner >= 0], owner[owner >= 0]
        exponent = (before + digits)[owner] - behind[digit_at]
        value = np.bincount(owner, weights=(plain[digit_at] - 48) * _POWERS[np.minimum(exponent, 16)], minlength=count).astype(np.float64)
    star = plain[token_at] == 42
    for k in np.flatnonzero(star & (digits > 0))[:50]:
        at = int(token_at[k]) + 1 + int(np.argmax(kind[token_at[k] + 1 :] == _DIGIT))
        notes.error(at, "a number without a letter before it", "a statement starts with a letter such as X, G or D")
    for k in np.flatnonzero(digits > MOST_DIGITS)[:50]:
        if not _is_zero_padded(plain, token_at, int(k)):
            notes.error(int(token_at[k]), "number out of range", f"a number has at most {MOST_DIGITS} digits")
            value[k] = 0.0

    sign_at = np.flatnonzero(kind == _SIGN)
    if len(sign_at):
        owner = np.searchsorted(token_at, sign_at) - 1
        late = behind[sign_at] - before[owner] if count else np.ones(len(owner))  # digits between the letter and the sign
        again = np.zeros(len(owner), np.bool_)
        again[1:] = owner[1:] == owner[:-1]
        for k in np.flatnonzero((late != 0) | again | (owner < 0) | (star[owner] if count else False))[:50]:
            notes.error(int(sign_at[k]), f"'{chr(plain[sign_at[k]])}' in a wrong place", "a sign stands between the letter and the number")
        minus = owner[plain[sign_at] == ord("-")]
        value[minus] = -value[minus]

    decimal = np.zeros(count, np.bool_)
    for owner_of_dot in np.unique(np.searchsorted(token_at, np.flatnonzero(kind == _DOT)) - 1):
        k = int(owner_of_dot)
        text = (
            bytes(plain[token_at[k] + 1 : token_at[k + 1] if k + 1 < count else len(plain)]).translate(None, b" \t\r\n\f\v")
            if k >= 0
            else b"."
        )
        if re.fullmatch(rb"[+-]?(\d{1,15}\.?\d{0,15}|\.\d{1,15})", text) and not star[k]:
            value[k], decimal[k] = float(text), True
        else:
            notes.error(int(token_at[max(k, 0)]), f"'{text[:24].decode()}' is no number", "write digits with at most one decimal point")
    return value, digits, decimal


def _run_values(plain: NDArray[np.uint8], kind: NDArray[np.uint8], token_at: Offsets, digits: NDArray[np.int64]) -> Floats | None:
    """Values where every number is one run of digits right behind its letter and sign (nearly every file); None where one is not."""
    value = np.zeros(len(token_at))
    mine = np.flatnonzero(digits)
    if not len(mine):
        return value
    at = token_at[mine] + 1
    at += kind[np.minimum(at, len(kind) - 1)] == _SIGN
    left = digits[mine]
    if np.any(at + left > len(plain)) or left.max() > MOST_DIGITS:
        return None
    sums = np.zeros(len(mine))
    for step in range(int(left.max())):
        going = np.flatnonzero(left > step) if step else slice(None)
        digit = plain[at[going] + step] - 48  # wraps around to a large number below "0"
        if np.any(digit > 9):
            return None
        sums[going] = sums[going] * 10.0 + digit
    value[mine] = sums
    return value


def _is_zero_padded(plain: NDArray[np.uint8], token_at: Offsets, k: int) -> bool:
    behind = token_at[k + 1] if k + 1 < len(token_at) else len(plain)
    text = bytes(plain[token_at[k] + 1 : behind]).translate(None, b" \t\r\n\f\v+-")
    return len(text.lstrip(b"0")) <= MOST_DIGITS


def _end(letter: NDArray[np.uint8], value: Floats, at: Offsets, notes: Notes) -> tuple[bool, int]:
    """Whether the file says where it ends, and the number of words before."""
    for k in np.flatnonzero(letter == ord("M")):
        if value[k] in (0, 2, 30):
            if value[k] == 30:
                notes.odd("M30 is taken for M02, the end of the file", int(at[k]))
            return True, int(k)
        if value[k] == 1:
            notes.odd("M01 (optional stop) has no effect", int(at[k]))
        else:
            notes.error(int(at[k]), f"unknown code M{value[k]:02g}", "M02 ends the file")
    return False, len(letter)


def _g_codes(codes: Floats, at: Offsets, row: NDArray[np.int64], *, count: int, notes: Notes) -> tuple[Codes, Codes, Codes, Codes, Codes]:
    columns = [np.full(count, -1, np.int32) for _ in _GROUPS]
    for code in np.unique(codes):
        these = np.flatnonzero(codes == code)
        for group, column in zip(_GROUPS, columns, strict=True):
            if code in group:
                column[row[these]] = group[int(code)]
                break  # of two codes of one group in a row the higher wins; no writer is known to do that
        else:
            if code not in _IGNORED:
                remedy = "G10 to G12 scale coordinates and were withdrawn decades ago" if code in (10, 11, 12) else "G01, G02 and G03 draw"
                for k in these[:50]:
                    notes.error(int(at[k]), f"unknown code G{code:02g}", remedy)
            continue
        if code == 0:
            notes.odd("G00 is read as G01 (straight)", int(at[these[0]]))
    return columns[0], columns[1], columns[2], columns[3], columns[4]
