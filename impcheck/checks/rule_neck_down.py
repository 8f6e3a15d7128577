"""The width falls below a share of the net's usual width on that layer.

Measured: the width of the trace at every station of plain trace against the median width of the same net on the same layer (weighted by
length); the finding says how long the neck is.

Why it matters: a neck is a short piece of higher impedance. Alone and short it may do little, but it is rarely meant: it comes from a
fab edit, a trace squeezed between pads, or a stroke that was drawn twice with different apertures.

What to do: widen the neck, or move what forced it; where it is meant (the escape from a dense part) state a larger share in the board
file.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from impcheck.artwork.image import Bools, Floats
from impcheck.checks.context import Context
from impcheck.checks.finding import Finding
from impcheck.checks.limits import Length, Level, Share
from impcheck.checks.track import Track

RULE = "neck-down"


@dataclass(frozen=True)
class Limits:
    """Limits of the rule."""

    level: Level
    share: Share  # of the usual width
    shortest: Length  # a shorter neck is no finding


def check(track: Track, limits: Limits, context: Context) -> Iterator[Finding]:
    """Findings of one net."""
    judged = track.trace
    usual = usual_width(track, judged)
    ratio = np.where(judged, track.width / np.where(usual > 0, usual, 1.0), 1.0)
    shortest = limits.shortest.against(context.edge(track))
    for spot in track.spots(judged & (ratio < limits.share), judged, 1.0 - ratio):
        if spot.length < shortest:
            continue
        width, aim = float(track.width[spot.worst]), float(usual[spot.worst])
        text = f"{width:.3f} mm wide over {spot.length:.2f} mm, {ratio[spot.worst]:.0%} of the net's usual {aim:.3f} mm on this layer"
        yield context.finding(RULE, limits.level, track, spot, width, aim * limits.share, "mm", text)


def usual_width(track: Track, judged: Bools) -> Floats:
    """(n,) median width of the net on each station's layer, weighted by length, mm; 0 where the layer has no judged station."""
    usual = np.zeros(len(track))
    for layer in np.unique(track.layer):
        mine = judged & (track.layer == layer)
        if not mine.any():
            continue
        order = np.argsort(track.width[mine], kind="stable")
        width, length = track.width[mine][order], track.length[mine][order]
        reached = np.cumsum(length)
        usual[track.layer == layer] = width[np.searchsorted(reached, reached[-1] / 2)]
    return usual
