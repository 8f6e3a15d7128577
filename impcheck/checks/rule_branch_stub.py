"""Copper hangs off the path between the declared ends.

Measured: the length of each branch from the edge of the path's copper to its far end, through its vias. Pads, teardrops and copper that
is shorter than the trace is wide are no branches; with `from` and `to` in the board file a branch to another pin is one.

Why it matters: a branch splits the edge where it leaves, and what runs into it comes back from its open end after twice its delay.
Branches much shorter than the edge act as a small capacitor.

What to do: remove what is left over, move the test point or the part onto the path, or shorten the branch.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from impcheck.checks.context import Context
from impcheck.checks.finding import Finding
from impcheck.checks.limits import Length, Level
from impcheck.checks.track import Track

RULE = "branch-stub"


@dataclass(frozen=True)
class Limits:
    """Limits of the rule."""

    level: Level
    longest: Length  # a shorter branch is no finding


def check(track: Track, limits: Limits, context: Context) -> Iterator[Finding]:
    """Findings of one net, one a branch, placed where it leaves the path."""
    longest = limits.longest.against(context.edge(track))
    for branch in track.walk.branches:
        if branch.length <= longest:
            continue
        end = f"pin {branch.pin}" if branch.pin else f"an open end at ({branch.tip[0]:.3f}, {branch.tip[1]:.3f})"
        text = f"a branch of {branch.length:.2f} mm leaves the path here and leads to {end}"
        yield Finding(
            RULE,
            limits.level,
            track.walk.net.name,
            context.layer(branch.layer),
            branch.at,
            (branch.at, branch.tip),
            (branch.along, branch.along),
            branch.length,
            longest,
            "mm",
            text,
        )
