"""The graphics state at every statement, all at once. In: rows of codes and the commands; out: objects in drawing order, in mm."""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from impcheck.artwork.gerber.arcs import arcs
from impcheck.artwork.gerber.commands import NOT_DEFINED, Commands
from impcheck.artwork.gerber.coordinates import hold, operations
from impcheck.artwork.gerber.notes import Notes
from impcheck.artwork.gerber.objects import Objects
from impcheck.artwork.gerber.words import Codes, Offsets, Rows
from impcheck.artwork.image import Bools, Floats, Kind
from impcheck.errors import RemarkKind

_NONE = 255
_NO_APERTURE = -2_000_000
_BROKEN_ARC = 0.25  # mm; smaller contradictions come from rounding tiny arcs and change the picture by less than a drill wanders


def held(changes: Sequence[tuple[int, int]], offsets: Offsets) -> Codes:
    """At each offset the value of the last change before it; the first change stands before everything."""
    at = np.array([change[0] for change in changes], np.int64)
    values = np.array([change[1] for change in changes], np.int32)
    return values[np.maximum(np.searchsorted(at, offsets, side="right") - 1, 0)]


def draw(rows: Rows, commands: Commands, notes: Notes) -> Objects:
    """All objects of the file as it stands, neither repeated nor blocks put in. Mistakes are noted; their objects may be missing."""
    count = len(rows)
    inside = hold(rows.region, rows.region >= 0, 0) == 1
    _check_regions(rows, inside, commands, notes)
    operation, position, centre_offset, resolution = operations(rows, commands, notes)
    before = np.vstack([np.zeros((1, 2)), position[:-1]]) if count else position
    interpolation = hold(rows.interpolation, rows.interpolation >= 0, 1)

    stroke = (operation == 1) & ~inside
    flash = (operation == 3) & ~inside
    for r in np.flatnonzero((operation == 3) & inside)[:50]:
        notes.error(int(rows.offset[r]), "a flash (D03) inside a region", "end the region by G37* first")
    aperture = _apertures(rows, stroke | flash, commands, notes)
    for r in np.flatnonzero(stroke & (aperture <= -2) & (aperture > NOT_DEFINED))[:50]:
        notes.error(int(rows.offset[r]), "a draw with a block aperture", "block apertures can only be flashed (D03)")

    sweep = np.zeros(count)
    centre = np.full((count, 2), np.nan)
    curved = np.flatnonzero((operation == 1) & (interpolation >= 2))
    if len(curved):
        centre[curved], sweep[curved] = _curves(
            curved,
            rows,
            before=before,
            position=position,
            offset=centre_offset,
            clockwise=interpolation[curved] == 2,
            resolution=resolution,
            notes=notes,
        )

    segment_rows = np.flatnonzero((operation == 1) & inside & (np.any(before != position, axis=1) | (sweep != 0)))
    contours = _contours(
        rows,
        segment_rows,
        moves=inside & (operation == 2),
        before=before,
        position=position,
        centre=centre,
        sweep=sweep,
        resolution=resolution,
        notes=notes,
    )
    contour_row, contour_size, contour_first, segment_start, segment_centre, segment_sweep = contours

    kind = np.full(count, _NONE, np.uint8)
    kind[stroke] = np.where(sweep[stroke] != 0, Kind.ARC, Kind.DRAW)
    kind[flash] = Kind.FLASH
    region_rows, first_contour = np.unique(contour_row, return_index=True)
    kind[region_rows] = Kind.REGION
    start = np.where(flash[:, None], position, before)
    end = position.copy()
    start[region_rows] = end[region_rows] = segment_start[contour_first[first_contour]]
    aperture[region_rows] = -1
    centre[region_rows], sweep[region_rows] = np.nan, 0.0

    mine = np.flatnonzero(kind != _NONE)
    offset = rows.offset[mine]
    transform = held(commands.transform, offset)
    transform[kind[mine] == Kind.REGION] = 0
    changes = np.array(commands.attributes.objects.changes, np.int64)
    named = changes[np.searchsorted(changes[:, 0], offset, side="right") - 1, 1:].astype(np.int32)
    return Objects(
        offset=offset,
        kind=kind[mine],
        dark=held(commands.dark, offset).astype(np.bool_),
        aperture=aperture[mine],
        transform=transform,
        start=start[mine],
        end=end[mine],
        centre=centre[mine],
        sweep=sweep[mine],
        net=named[:, 0],
        pin=named[:, 1],
        component=named[:, 2],
        contour_object=np.searchsorted(mine, contour_row).astype(np.int32),
        contour_size=contour_size,
        segment_start=segment_start,
        segment_centre=segment_centre,
        segment_sweep=segment_sweep,
    )


def _check_regions(rows: Rows, inside: Bools, commands: Commands, notes: Notes) -> None:
    was = np.concatenate([[False], inside[:-1]])
    for r in np.flatnonzero((rows.region == 1) & was)[:50]:
        notes.error(int(rows.offset[r]), "a region begins inside a region", "end the first one by G37*")
    for r in np.flatnonzero((rows.region == 0) & ~was):
        notes.odd("G37 ends a region that was not begun", int(rows.offset[r]))
    if len(inside) and inside[-1]:
        begin = int(rows.offset[np.flatnonzero(rows.region == 1)[-1]])
        raise notes.fatal(
            begin, "the file ends inside the region that begins here", "the file is cut off, or G37* is missing; export it again"
        )
    changes = [(offset, "a polarity") for offset, _ in commands.dark[1:]]
    changes += [(offset, "a mirroring, rotation or scale") for offset, _ in commands.transform[1:]]
    changes += [(structure.offset, "a step-and-repeat or block") for structure in commands.structure]
    if len(rows) and changes and inside.any():
        offsets = np.array([offset for offset, _ in changes], np.int64)
        at = np.searchsorted(rows.offset, offsets, side="right") - 1
        for k in np.flatnonzero((at >= 0) & inside[np.maximum(at, 0)])[:50]:
            notes.error(int(offsets[k]), f"{changes[k][1]} command inside a region", "end the region by G37* first")


def _apertures(rows: Rows, used: Bools, commands: Commands, notes: Notes) -> Codes:
    """Index of the aperture selected at each row (n,)."""
    select = np.flatnonzero(rows.d >= 10)
    index = np.full(len(rows), _NO_APERTURE, np.int32)
    codes = rows.d[select]
    undefined = []
    order = np.argsort(codes, kind="stable")
    heads = np.flatnonzero(np.diff(codes[order], prepend=-1))
    for here in np.split(select[order], heads[1:]) if len(heads) else ():
        code = rows.d[here[0]]
        known = commands.definitions.get(int(code), [])
        if not known:
            undefined.append(int(code))
            index[here] = NOT_DEFINED
            continue
        starts = [offset for offset, _ in known]
        if len(known) == 1 and rows.offset[here[0]] > starts[0]:
            index[here] = known[0][1]
            continue
        for r in here:
            k = bisect_right(starts, int(rows.offset[r])) - 1
            if k < 0:
                if known[0][1] <= -2:  # a block that flashes itself
                    notes.error(int(rows.offset[r]), f"block D{code} is used before it ends", "a block cannot contain itself")
                else:
                    notes.odd(f"aperture D{code} is selected before it is defined", int(rows.offset[r]))
            index[r] = known[max(k, 0)][1]
    current = hold(index, index != _NO_APERTURE, _NO_APERTURE)
    chosen = hold(rows.d, rows.d >= 10, -1)
    drawing = np.flatnonzero(used & (current == NOT_DEFINED))
    drawn, first = np.unique(chosen[drawing], return_index=True)
    wrong = dict(zip(drawn.tolist(), drawing[first].tolist(), strict=True))
    for code in undefined:
        if code in wrong:
            notes.error(
                int(rows.offset[wrong[code]]), f"aperture D{code} is not defined", f"a line like %ADD{code}C,0.15*% must come before"
            )
        else:
            notes.odd("an aperture is selected that is neither defined nor used")
    for r in np.flatnonzero(used & (current == _NO_APERTURE))[:1]:
        notes.error(int(rows.offset[r]), "nothing can be drawn before an aperture is selected", "a statement like D10* must come before")
    return current


def _curves(
    curved: NDArray[np.int64],
    rows: Rows,
    *,
    before: Floats,
    position: Floats,
    offset: Floats,
    clockwise: Bools,
    resolution: Floats,
    notes: Notes,
) -> tuple[Floats, Floats]:
    quadrant = hold(rows.quadrant, rows.quadrant >= 0, 0)[curved]
    start, end, to_centre = before[curved], position[curved], offset[curved]
    step = np.max(resolution[curved], axis=1)
    found = arcs(start, end, to_centre, clockwise, quadrant == 74)
    unsaid = np.flatnonzero(quadrant == 0)
    if len(unsaid):
        # Signed offsets that fit are G75; offsets that only fit without their sign are G74.
        poor = unsaid[(found.mismatch > 4 * step + 0.01 * found.radius)[unsaid]]
        again = arcs(start[poor], end[poor], to_centre[poor], clockwise[poor], np.ones(len(poor), np.bool_))
        better = ~again.impossible & (again.mismatch < found.mismatch[poor])
        for name in ("centre", "sweep", "mismatch", "radius", "impossible"):
            getattr(found, name)[poor[better]] = getattr(again, name)[better]
        text = "arcs without G74 or G75 before them: taken as the mode that fits their ends"
        notes.remark(RemarkKind.GUESS, text, int(rows.offset[curved[unsaid[0]]]))
    for k in np.flatnonzero(found.impossible)[:50]:
        notes.error(int(rows.offset[curved[k]]), "no centre gives an arc of at most a quarter turn (G74)", "check I and J, or use G75")
    straight = np.flatnonzero((found.sweep == 0) & np.any(start != end, axis=1) & ~found.impossible)
    if len(straight):
        notes.odd("an arc without a centre (I, J) is drawn straight", int(rows.offset[curved[straight[0]]]))
    for k in np.flatnonzero((found.sweep != 0) & (found.mismatch > _BROKEN_ARC) & (found.mismatch > 0.5 * found.radius))[:50]:
        notes.error(
            int(rows.offset[curved[k]]), "an arc's ends are at quite different distances from its centre", "check I and J, G74 and G75"
        )
    off = np.flatnonzero((found.sweep != 0) & (found.mismatch > 4 * step + 0.01 * found.radius))
    for k in off:
        notes.odd("an arc whose two radii differ: its ends are kept, its centre is moved", int(rows.offset[curved[k]]))
    return found.centre, found.sweep


def _contours(
    rows: Rows,
    segments: NDArray[np.int64],
    *,
    moves: Bools,
    before: Floats,
    position: Floats,
    centre: Floats,
    sweep: Floats,
    resolution: Floats,
    notes: Notes,
) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.int64], Floats, Floats, Floats]:
    """Row of the G36 of each contour, its size, its first segment; start, centre and sweep of all segments."""
    if not len(segments):
        none = np.zeros(0, np.int64)
        return none, none, none, np.zeros((0, 2)), np.zeros((0, 2)), np.zeros(0)
    begins = np.flatnonzero(rows.region == 1)
    piece = np.cumsum((rows.region == 1) | moves)[segments]
    head = np.flatnonzero(np.concatenate([[True], piece[1:] != piece[:-1]]))
    size = np.diff(np.append(head, len(segments)))
    contour_row = begins[np.searchsorted(begins, segments[head], side="right") - 1]
    last = segments[head + size - 1]
    gap = np.hypot(*(position[last] - before[segments[head]]).T)
    opened = gap > 1e-9
    start, mid, turn = before[segments], centre[segments], sweep[segments]
    if opened.any():
        worst = int(np.argmax(gap))
        step = float(np.max(resolution[segments[head[worst]]]))
        where = int(rows.offset[last[worst]])
        if gap[worst] > 2 * step:
            notes.odd(f"a region contour does not end where it began (up to {gap[worst]:.4g} mm off); closed by a straight line", where)
        else:
            notes.odd("a region contour ends a rounding step from where it began; closed by a straight line", where)
        place = (head + size)[opened]
        start = np.insert(start, place, position[last[opened]], axis=0)
        mid = np.insert(mid, place, np.nan, axis=0)
        turn = np.insert(turn, place, 0.0)
        size = size + opened
    return contour_row, size, np.cumsum(size) - size, start, mid, turn
