"""The impedance leaves the class's tolerance for longer than a spot an edge does not see.

Measured: the characteristic impedance of the cross-section at every station of plain trace and at bends, against the class's target and
tolerance. Pads, vias and the pieces hidden by them are left to their own.

Why it matters: where the local impedance changes from Z1 to Z2 an edge is reflected by (Z2 - Z1) / (Z2 + Z1). Both ends of a short spot
reflect with opposite signs and nearly cancel, so only spots longer than a share of the distance the edge covers during its rise time
count.

What to do: look at the width, the copper beside, and the planes above and below at the place; `impcheck walk BOARD NET` shows all of
them. If the whole net is off, compare the stackup with the fab's.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from impcheck.checks.context import Context
from impcheck.checks.finding import Finding
from impcheck.checks.limits import Length, Level
from impcheck.checks.track import Track

RULE = "impedance"


@dataclass(frozen=True)
class Limits:
    """Limits of the rule."""

    level: Level
    shortest: Length  # a shorter spot is no finding


def check(track: Track, limits: Limits, context: Context) -> Iterator[Finding]:
    """Findings of one net; none where its class states no single-ended impedance."""
    wanted = track.walk.net.net_class
    if wanted.impedance is None or track.walk.net.pair:
        return
    low, high = wanted.impedance * (1 - wanted.tolerance), wanted.impedance * (1 + wanted.tolerance)
    judged = (track.trace | track.bends) & np.isfinite(track.impedance)
    z = np.where(judged, track.impedance, wanted.impedance)
    shortest = limits.shortest.against(context.edge(track))
    for marked, badness, bound, side in ((judged & (z < low), low - z, low, "below"), (judged & (z > high), z - high, high, "above")):
        for spot in track.spots(marked, judged, badness):
            if spot.length < shortest:
                continue
            worst = float(z[spot.worst])
            text = (
                f"{worst:.1f} ohm over {spot.length:.2f} mm, {side} the class's {low:.4g} to {high:.4g} ohm "
                f"({(worst / wanted.impedance - 1) * 100:+.0f} %): {_why(track, spot.worst, context)}"
            )
            yield context.finding(RULE, limits.level, track, spot, worst, bound, "ohm", text)


def _why(track: Track, station: int, context: Context) -> str:
    """What the section is made of there, so that a person knows where to look."""
    run = track.walk.runs[track.run[station]]
    s, i = run.stations, int(track.station[station])
    sides = []
    for word, layer, cover in (
        ("above", int(s.above[i]), float(s.coverage_above[i])),
        ("below", int(s.below[i]), float(s.coverage_below[i])),
    ):
        if layer >= 0:
            share = "" if cover > 0.999 else f" covering {cover:.0%} of it"
            sides.append(f"reference {word} on {context.layer(layer)}, {context.height(run.layer, layer):.3f} mm away{share}")
    gaps = _gaps(track, station)
    beside = f", copper beside at {gaps:.3f} mm" if gaps is not None else ""
    return f"width {track.width[station]:.3f} mm, " + (" and ".join(sides) or "no reference plane") + beside


def _gaps(track: Track, station: int) -> float | None:
    """Distance from the trace's edge to the nearest copper of another net beside it, mm; None where the cut meets none."""
    run = track.walk.runs[track.run[station]]
    s, i = run.stations, int(track.station[station])
    cut = s.cuts[run.layer]
    a, b = int(cut.first[i]), int(cut.first[i + 1])
    foreign = ~np.isin(cut.label[a:b], track.walk.net.labels)
    if not foreign.any():
        return None
    low, high = cut.low[a:b][foreign] - s.centre[i], cut.high[a:b][foreign] - s.centre[i]
    return float(np.min(np.where(low > 0, low, -high)) - track.width[station] / 2)
