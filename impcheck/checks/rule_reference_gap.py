"""The plane the trace refers to is missing under (or over) part of its width.

Measured: for the usual reference above and below, how much of the trace's width its copper covers at every station of trace, and which
net that copper is of. A void is an opening closed all round, a slot one that is much longer across the trace than along it or that runs
out of the plane, a split a place where the copper of one return net ends and that of another begins. The finding says how far the
return current has to go round, and whether a plane on the other side of the trace softens the change.

Why it matters: the return current of an edge runs under the trace. Where its plane is missing it makes a detour, and the loop it opens
is an inductance in series with the line, radiates, and couples to every other trace that crosses the same opening.

What to do: close the opening, move the trace, or give the current a way: copper across a slot, a capacitor at a split right beside the
trace.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from impcheck.artwork.image import Bools, Floats, Ints
from impcheck.checks.context import Context
from impcheck.checks.finding import Finding
from impcheck.checks.limits import Length, Level
from impcheck.checks.openings import Opening, opening_at
from impcheck.checks.track import Spot, Track
from impcheck.path.walk import Zone

RULE = "reference-gap"
COVERED = 0.999  # share of the width that counts as all of it
SLOT = 3.0  # an opening this many times longer across the trace than along it is a slot
LOOK = 0.5  # mm from a gap's ends, how far along the net the copper on either side is looked for


@dataclass(frozen=True)
class Limits:
    """Limits of the rule."""

    level: Level
    shortest: Length  # a shorter gap is no finding (a split always is one)


def check(track: Track, limits: Limits, context: Context) -> Iterator[Finding]:
    """Findings of one net, for the reference above and the one below."""
    judged = track.trace | track.bends | (track.zone == Zone.JUNCTION)
    shortest = limits.shortest.against(context.edge(track))
    for side in ("above", "below"):
        layer, cover, label = references(track, side, context)
        marked = judged & (layer >= 0) & (cover < COVERED)
        for spot in track.spots(marked, judged, np.where(marked, 1.0, 0.0)):
            before, after = _labels_beside(track, spot, label, cover)
            split = before >= 0 and after >= 0 and before != after
            if spot.length < shortest and not split:
                continue
            yield _finding(track, spot, side, layer, before, after, limits, context, shortest)
        yield from _seams(track, judged, layer, cover, label, side, limits, context, shortest)
    yield from _none(track, judged, limits, context, shortest)


def _none(track: Track, judged: Bools, limits: Limits, context: Context, shortest: float) -> Iterator[Finding]:
    """Trace that has no usual reference on either side, and no other copper in its section either: a plane is missing altogether, or for
    most of the way."""
    planes = np.maximum(references(track, "above", context)[0], references(track, "below", context)[0])
    marked = judged & (planes < 0) & ~np.isfinite(track.impedance)
    for spot in track.spots(marked, judged, np.where(marked, 1.0, 0.0)):
        if spot.length >= shortest:
            text = (
                f"over {spot.length:.2f} mm of trace no copper of a return net is near, above, below or beside it: the current has "
                "nothing to return on and the line no impedance of its own"
            )
            yield context.finding(RULE, limits.level, track, spot, spot.length, shortest, "mm", text)


def references(track: Track, side: str, context: Context) -> tuple[Ints, Floats, Ints]:
    """Per station: layer of the usual reference on a side (-1 none), share of the width covered, label of its copper under the middle
    (-1 none)."""
    layer, cover, label = np.full(len(track), -1, np.int32), np.ones(len(track)), np.full(len(track), -1, np.int32)
    wanted = np.zeros(context.nets.count + 1, bool)
    wanted[sorted(context.nets.returns)] = True
    offset = 0
    for run in track.walk.runs:
        s = run.stations
        mine = slice(offset, offset + len(s))
        layer[mine] = s.above if side == "above" else s.below
        cover[mine] = s.coverage_above if side == "above" else s.coverage_below
        for index in np.unique(layer[mine]).tolist():
            cut = s.cuts.get(index)
            if index < 0 or cut is None:
                continue
            station = np.repeat(np.arange(len(s)), np.diff(cut.first))
            hit = wanted[cut.label] & (cut.low <= s.centre[station]) & (cut.high >= s.centre[station]) & (layer[mine][station] == index)
            label[offset + station[hit]] = cut.label[hit]
        offset += len(s)
    return layer, cover, label


def _labels_beside(track: Track, spot: Spot, label: Ints, cover: Floats) -> tuple[int, int]:
    """Labels of the reference's copper before and after a gap, the nearest fully covered stations within LOOK mm; -1 where there is
    none."""
    found = []
    for start, step in ((int(spot.marked[0]), -1), (int(spot.marked[-1]), 1)):
        index, seen = start, -1
        while True:
            follows = index > 0 and track.continues(index - 1) if step < 0 else track.continues(index)
            if not follows:
                break
            index += step
            edge = track.end[index] if step < 0 else track.begin[index]
            if abs(edge - (track.begin[start] if step < 0 else track.end[start])) > LOOK:
                break
            if label[index] >= 0 and cover[index] >= COVERED:
                seen = int(label[index])
                break
        found.append(seen)
    return found[0], found[1]


def _seams(
    track: Track, judged: Bools, layer: Ints, cover: Floats, label: Ints, side: str, limits: Limits, context: Context, shortest: float
) -> Iterator[Finding]:
    """Splits so narrow that no station of the trace lies over the moat: the copper changes its net from one station to the next."""
    for index in range(len(track) - 1):
        one, other = int(label[index]), int(label[index + 1])
        if one < 0 or other < 0 or one == other or layer[index] != layer[index + 1] or not track.continues(index):
            continue
        if judged[index] and judged[index + 1] and cover[index] >= COVERED and cover[index + 1] >= COVERED:
            at = float(track.end[index])
            spot = Spot(np.array([index, index + 1]), 0.0, (at, at), index, at)
            yield _finding(track, spot, side, layer, one, other, limits, context, shortest)


def _finding(
    track: Track, spot: Spot, side: str, layer: Ints, before: int, after: int, limits: Limits, context: Context, shortest: float
) -> Finding:
    first = int(spot.marked[0])
    plane = int(layer[first])
    middle = (spot.along[0] + spot.along[1]) / 2
    centre = int(
        np.argmin(
            np.where(
                np.isin(np.arange(len(track)), np.arange(first, int(spot.marked[-1]) + 1)),
                np.abs((track.begin + track.end) / 2 - middle),
                np.inf,
            )
        )
    )
    at = track.place(centre, float(np.clip(middle, track.begin[centre], track.end[centre])))
    run = track.walk.runs[track.run[centre]]
    normal = run.stations.left_normal[int(track.station[centre])]
    if before >= 0 and after >= 0 and before != after:
        what = _split(before, after, context)
    else:
        opening = opening_at(
            context.copper.layers[plane],
            context.nets.piece_label[plane],
            context.nets.returns,
            at,
            (float(normal[0]), float(normal[1])),
            float(track.width[centre]) / 2,
        )
        what = _void_or_slot(spot, opening, before, after, context)
    word = "over" if side == "above" else "under"
    text = (
        f"{word} {spot.length:.2f} mm of trace the reference on {context.layer(plane)} is missing: {what}; "
        f"{_other_side(track, spot, side, context)}{_ohms(track, spot)}"
    )
    return Finding(
        RULE,
        limits.level,
        track.walk.net.name,
        context.layer(int(track.layer[centre])),
        at,
        track.span(spot),
        spot.along,
        spot.length,
        shortest,
        "mm",
        text,
    )


def _split(before: int, after: int, context: Context) -> str:
    one, other = context.nets.name_of(before), context.nets.name_of(after)
    names = f"{one} and {other}" if one != other else f"two separate pieces of {one}"
    return f"a split between {names}; the return current crosses it only through another plane or a capacitor between the two"


def _void_or_slot(spot: Spot, opening: Opening | None, before: int, after: int, context: Context) -> str:
    net = context.nets.name_of(before if before >= 0 else after) if max(before, after) >= 0 else "the return net"
    if opening is None:
        return f"an opening in {net}"
    if opening.endless and (before < 0 or after < 0):
        return f"the copper of {net} ends here and does not come back"
    if opening.open_left and opening.open_right:
        return f"a split between two areas of {net}; the return current crosses it only through other layers"
    across = opening.left + opening.right
    if opening.endless:
        closed_end = opening.right if opening.open_left else opening.left
        return f"a slot in {net} that runs out of the plane; the return goes round its closed end, {2 * closed_end:.2f} mm"
    kind = "slot" if across >= SLOT * max(spot.length, 1e-6) else "void"
    nearer = min(opening.left, opening.right)
    way = f"the return goes round its nearer end, {2 * nearer:.2f} mm" if nearer > 0 else "the plane still runs under part of the trace"
    return f"a {kind} in {net}, {across:.2f} mm across the trace; {way}"


def _other_side(track: Track, spot: Spot, side: str, context: Context) -> str:
    other = "below" if side == "above" else "above"
    layer, cover, _ = references(track, other, context)
    mine = spot.marked
    if np.all(layer[mine] >= 0) and np.all(cover[mine] >= COVERED):
        return f"the plane {other} it on {context.layer(int(layer[mine[0]]))} is whole there and softens the change"
    return f"no whole plane {other} it makes up for it"


def _ohms(track: Track, spot: Spot) -> str:
    z = track.impedance[spot.marked]
    usual = track.impedance[track.trace & np.isfinite(track.impedance)]
    if not np.isfinite(z).any() or len(usual) == 0:
        return ""
    worst = float(np.nanmax(z))
    return f" (the section there has {worst:.1f} ohm, the net's usual {float(np.median(usual)):.1f})"
