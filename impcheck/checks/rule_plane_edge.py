"""The trace runs closer to the edge of its reference plane than a multiple of its height over it.

Measured: the distance across, from the edge of the trace to where the plane under (or over) it ends, wherever the plane still covers
the whole trace. The moat to a neighbouring plane is an edge too. Short approaches, such as single antipads, are not counted.

Why it matters: the return current spreads over about three heights to either side. Near an edge it is squeezed, the impedance rises,
the field leaks round the edge, and the trace radiates and picks up.

What to do: move the trace inwards or the plane's edge outwards; stitch the edge where it must stay.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from impcheck.artwork.image import Floats
from impcheck.checks.context import Context
from impcheck.checks.finding import Finding
from impcheck.checks.limits import Factor, Length, Level
from impcheck.checks.track import Track

RULE = "plane-edge"


@dataclass(frozen=True)
class Limits:
    """Limits of the rule."""

    level: Level
    heights: Factor  # of the trace over its plane
    longest: Length  # a shorter approach is no finding


def check(track: Track, limits: Limits, context: Context) -> Iterator[Finding]:
    """Findings of one net."""
    judged = track.trace | track.bends
    longest = limits.longest.against(context.edge(track))
    for side in ("above", "below"):
        layer, distance, height = margins(track, side, context)
        good = judged & (layer >= 0) & np.isfinite(distance)
        share = np.where(good, distance / np.where(height > 0, height, 1.0), np.inf)
        marked = good & (share < limits.heights)
        for spot in track.spots(marked, judged, np.where(marked, limits.heights - share, 0.0)):
            if spot.length < longest:
                continue
            at = spot.worst
            plane = context.layer(int(layer[at]))
            text = (
                f"{distance[at]:.3f} mm from the trace to the edge of its reference on {plane} over {spot.length:.2f} mm, "
                f"{share[at]:.2g} of the {height[at]:.3f} mm between them"
            )
            yield context.finding(RULE, limits.level, track, spot, float(distance[at]), float(height[at]) * limits.heights, "mm", text)


def margins(track: Track, side: str, context: Context) -> tuple[Floats, Floats, Floats]:
    """Reference layer (-1 none), distance from the trace's edge to the nearer edge of the plane that covers it whole (inf where the cut
    meets no edge, nan where the plane does not cover it), and height over the plane, per station."""
    layer, distance, height = np.full(len(track), -1.0), np.full(len(track), np.nan), np.zeros(len(track))
    returns = sorted(context.nets.returns)
    offset = 0
    for run in track.walk.runs:
        s = run.stations
        reference = s.above if side == "above" else s.below
        covered = s.coverage_above if side == "above" else s.coverage_below
        for index in np.unique(reference).tolist():
            cut = s.cuts.get(index)
            if index < 0 or cut is None:
                continue
            count = np.diff(cut.first)
            station = np.repeat(np.arange(len(s)), count)
            half = (s.width / 2)[station]
            low, high = cut.low - s.centre[station], cut.high - s.centre[station]
            hit = np.isin(cut.label, returns) & (low <= -half + 1e-4) & (high >= half - 1e-4)
            left = np.where(cut.high[hit] >= s.reach - 1e-6, np.inf, high[hit] - half[hit])
            right = np.where(cut.low[hit] <= -s.reach + 1e-6, np.inf, -low[hit] - half[hit])
            nearest = np.full(len(s), np.nan)
            nearest[station[hit]] = np.maximum(np.minimum(left, right), 0.0)
            mine = (reference == index) & (covered > 0.999)
            where = offset + np.flatnonzero(mine)
            layer[where], distance[where], height[where] = index, nearest[mine], context.height(run.layer, index)
        offset += len(s)
    return layer, distance, height
