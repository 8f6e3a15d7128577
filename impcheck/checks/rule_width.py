"""The copper's width differs from the width the class states for the layer.

Measured: the width of the trace itself (not of a cut: bends and junctions are left out) at every station of plain trace, where the
class states a width for that layer.

Why it matters: width is what the layout set to reach the impedance. A trace that was drawn, edited or scaled to another width is
another line, even where its impedance happens to stay within tolerance.

What to do: restore the width, or correct the class if the new width is meant (`impcheck rules impedance` tells what it does to the
line).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from impcheck.checks.context import Context
from impcheck.checks.finding import Finding
from impcheck.checks.limits import Length, Level, Share
from impcheck.checks.track import Track

RULE = "width"


@dataclass(frozen=True)
class Limits:
    """Limits of the rule."""

    level: Level
    deviation: Share  # of the class's width
    shortest: Length  # a shorter spot is no finding


def check(track: Track, limits: Limits, context: Context) -> Iterator[Finding]:
    """Findings of one net; none on layers for which its class states no width."""
    wanted = track.walk.net.net_class
    stated = [wanted.width_on(name) for name in context.artwork.names]
    target = np.array([np.nan if width is None else width for width in stated])[track.layer]
    judged = track.trace & np.isfinite(target)
    off = np.where(judged, track.width / np.where(judged, target, 1.0) - 1.0, 0.0)
    shortest = limits.shortest.against(context.edge(track))
    for marked, badness, word in (
        (judged & (off < -limits.deviation), -off, "narrower"),
        (judged & (off > limits.deviation), off, "wider"),
    ):
        for spot in track.spots(marked, judged, badness):
            if spot.length < shortest:
                continue
            width, aim = float(track.width[spot.worst]), float(target[spot.worst])
            bound = aim * (1 + limits.deviation * (1 if word == "wider" else -1))
            text = f"{width:.3f} mm wide over {spot.length:.2f} mm, {abs(off[spot.worst]):.0%} {word} than the class's {aim:.3f} mm"
            yield context.finding(RULE, limits.level, track, spot, width, bound, "mm", text)
