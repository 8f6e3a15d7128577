"""Coordinates and operation codes at every statement. In: rows of codes and raw numbers; out: operations, places and lengths in mm."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from impcheck.artwork.gerber.apertures import FARTHEST
from impcheck.artwork.gerber.commands import INCH, Commands, Format
from impcheck.artwork.gerber.notes import Notes
from impcheck.artwork.gerber.words import Codes, Rows
from impcheck.artwork.image import Bools, Floats
from impcheck.errors import RemarkKind


def hold(values: Codes, set_at: Bools, initial: int) -> Codes:
    """At each row the last value that was set at or before it; initial before the first."""
    last = np.maximum.accumulate(np.where(set_at, np.arange(len(values)), -1))
    return np.where(last < 0, initial, values[np.maximum(last, 0)]).astype(np.int32)


def operations(rows: Rows, commands: Commands, notes: Notes) -> tuple[Codes, Floats, Floats, Floats]:
    """Operation (n,) 0 to 3, position after each row (n, 2), centre offset (n, 2), length of one coordinate step (n, 2), all mm."""
    count = len(rows)
    has = np.zeros(count, np.bool_)
    for numbers in rows.axes.values():
        has[numbers.row] = True
    explicit = np.where((rows.d >= 1) & (rows.d <= 3), rows.d, 0)
    for r in np.flatnonzero(has & (rows.d >= 10))[:50]:
        notes.error(int(rows.offset[r]), f"coordinates together with D{rows.d[r]}", "select the aperture in a statement of its own")
    implied = has & (rows.d < 0)
    modal = hold(explicit, explicit > 0, 0)
    operation = np.where(implied, modal, explicit).astype(np.int32)
    if implied.any():
        first = int(np.flatnonzero(implied)[0])
        notes.odd("coordinates without D01, D02 or D03 repeat the last of them (withdrawn from the specification)", int(rows.offset[first]))
    for r in np.flatnonzero(implied & (modal == 0)):
        notes.odd("coordinates before any D01, D02 or D03 only move", int(rows.offset[r]))
        operation[r] = 2

    unit, form = _units_and_formats(rows, has, commands, notes)
    values = {name: _lengths(rows, name, unit=unit, form=form, formats=commands.formats, notes=notes) for name in "XYIJ"}
    incremental = np.array([f.incremental for _, f in commands.formats] or [False])[form]
    incremental = hold(np.where(rows.notation >= 0, rows.notation, incremental).astype(np.int32), np.ones(count, np.bool_), 0) == 1
    if (rows.notation == 1).any() or incremental.any():
        # G90 and G91 hold until the next of them; the format's letter holds before the first.
        first_set = np.flatnonzero(rows.notation >= 0)
        later = np.arange(count) >= (first_set[0] if len(first_set) else count)
        incremental = np.where(later, hold(rows.notation, rows.notation >= 0, 0) == 1, incremental)
        if incremental.any():
            notes.odd("incremental coordinates (withdrawn from the specification)", int(rows.offset[np.flatnonzero(incremental)[0]]))
    position = np.column_stack([_positions(*values[name], incremental, count) for name in "XY"])
    for r in np.flatnonzero(np.any(np.abs(position) > FARTHEST, axis=1))[:3]:
        notes.error(int(rows.offset[r]), "coordinate out of range", f"a board stays within {FARTHEST:g} mm; check unit and format")
    offset = np.zeros((count, 2))
    for axis, name in enumerate("IJ"):
        where, value = values[name]
        offset[where, axis] = value
    decimals = np.array([(f.digits[0][1], f.digits[1][1]) for _, f in commands.formats] or [(6, 6)])[form]
    resolution = unit[:, None] / 10.0**decimals
    return operation, position, offset, resolution


def _units_and_formats(rows: Rows, has: Bools, commands: Commands, notes: Notes) -> tuple[Floats, NDArray[np.int64]]:
    """mm of the unit (n,), index of the format (n,) at each row."""
    at = np.array([offset for offset, _ in commands.units], np.int64)
    chosen = np.array([mm for _, mm in commands.units])
    unit = (
        chosen[np.searchsorted(at, rows.offset, side="right") - 1]
        if len(commands.units) == 1
        else chosen[
            np.maximum(np.searchsorted(at[1:], rows.offset, side="right"), 1)  # a unit said late holds from the start
        ]
    )
    said = rows.unit[rows.unit >= 0]
    if len(commands.units) > 1 and len(said):
        for r in np.flatnonzero((rows.unit >= 0) & (np.where(rows.unit == 71, 1.0, INCH) != unit))[:1]:
            text = f"G{rows.unit[r]} contradicts the MO command, which counts"
            notes.remark(RemarkKind.DISAGREEMENT, text, int(rows.offset[r]))
    elif len(said):
        unit = np.where(hold(rows.unit, rows.unit >= 0, int(said[0])) == 71, 1.0, INCH)
    starts = np.array([offset for offset, _ in commands.formats], np.int64)
    form = np.searchsorted(starts, rows.offset, side="right") - 1
    for r in np.flatnonzero((form < 0) & has)[:1]:
        if len(starts):
            notes.error(int(rows.offset[r]), "coordinates before the coordinate format", "the FS command stands at the top of the file")
    return unit, np.maximum(form, 0)


def _lengths(
    rows: Rows, name: str, *, unit: Floats, form: NDArray[np.int64], formats: list[tuple[int, Format]], notes: Notes
) -> tuple[NDArray[np.int64], Floats]:
    """Rows (k,) and lengths in mm (k,) of one axis letter."""
    numbers = rows.axes[name]
    axis = "XY".find(name) if name in "XY" else "IJ".find(name)
    table = np.array([(*f.digits[axis], f.trailing) for _, f in formats] or [(6, 6, False)], np.int64)
    mine = form[numbers.row]
    whole, decimals = table[mine, 0], table[mine, 1]
    trailing = table[mine, 2] == 1
    total = whole + decimals
    value = numbers.value
    if trailing.any():
        short = np.where(trailing & ~numbers.decimal, total - numbers.digits, 0)
        for k in np.flatnonzero(short < 0)[:50]:
            notes.error(
                int(rows.offset[numbers.row[k]]),
                f"{name} has more digits than the format",
                "with trailing zeros left out it has no one reading",
            )
        value = value * 10.0 ** np.maximum(short, 0)
    many = np.flatnonzero(~trailing & ~numbers.decimal & (np.abs(value) >= 10.0**total))
    if len(many):
        notes.odd("a coordinate has more digits than the format says", int(rows.offset[numbers.row[many[0]]]))
    if numbers.decimal.any():
        first = numbers.row[np.flatnonzero(numbers.decimal)[0]]
        notes.odd("coordinates with a decimal point are read as they stand", int(rows.offset[first]))
    inch = unit[numbers.row] == INCH
    # A whole number over a power of ten is rounded once: 1.234567 mm becomes the double nearest to it.
    raw = np.where(inch, value * 254.0, value)
    power = np.where(numbers.decimal, 0, decimals) + inch
    return numbers.row, np.asarray(raw / 10.0**power + 0.0, np.float64)  # no negative zeros


def _positions(where: NDArray[np.int64], value: Floats, incremental: Bools, count: int) -> Floats:
    given = np.zeros(count, np.bool_)
    given[where] = True
    full = np.zeros(count)
    full[where] = value
    if not incremental.any():
        last = np.maximum.accumulate(np.where(given, np.arange(count), -1))
        return np.asarray(np.where(last < 0, 0.0, full[np.maximum(last, 0)]), np.float64)
    steps = np.cumsum(np.where(incremental, full, 0.0))
    fixed = given & ~incremental
    last = np.maximum.accumulate(np.where(fixed, np.arange(count), -1))
    base = np.where(last < 0, 0.0, (full - steps)[np.maximum(last, 0)])
    return np.asarray(np.round(base + steps, 9), np.float64)  # sums keep rounding errors that would open closed contours
