"""A layer change moves the return current to another plane, and nothing near joins the two planes.

Measured: the planes under and over the trace before and after each change of layer. Where the two sides share a plane nothing is asked
for. Else the distance from the via to the nearest barrel of a return net that joins a plane of one side with one of the other; for
planes of different nets, to the nearest two-pin capacitor between them (a part whose reference begins with C, or that the board file's
`joins` name).

Why it matters: the return current has to change planes too. Without a way near it spreads between the planes until it finds one: a
series inductance that reflects, and energy between the planes that reaches every other via.

What to do: put a return via beside the signal via (a capacitor where the planes are of different nets), within the distance the rule
states.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from impcheck.checks.context import Context
from impcheck.checks.finding import Finding
from impcheck.checks.limits import Length, Level
from impcheck.checks.returns import Plane, return_change
from impcheck.checks.track import Track

RULE = "return-via"


@dataclass(frozen=True)
class Limits:
    """Limits of the rule."""

    level: Level
    reach: Length  # a joint farther away is none
    at_most: Length  # and none farther than this


def check(track: Track, limits: Limits, context: Context) -> Iterator[Finding]:
    """Findings of one net, one a change of layer."""
    edge = context.edge(track)
    reach = min(limits.reach.against(edge), limits.at_most.against(edge))
    for via in track.walk.vias:
        change = return_change(context.artwork, context.copper, context.nets, track.walk, via)
        if change.shared or not change.before or not change.after or (change.distance is not None and change.distance <= reach):
            continue
        names = [{context.nets.name_of(label) for _, label in planes} for planes in (change.before, change.after)]
        what = "via" if names[0] & names[1] else "capacitor"
        nearest = (
            f"the nearest {change.joint or what} that joins them is {change.distance:.2f} mm away"
            if change.distance is not None
            else f"no {what} joins them anywhere"
        )
        text = (
            f"from {context.layer(via.entered)} to {context.layer(via.left)} the return current changes from "
            f"{_words(change.before, context)} to {_words(change.after, context)}, and "
            f"{nearest}: put a {what} between them within {reach:.2f} mm of here"
        )
        yield Finding(
            RULE,
            limits.level,
            track.walk.net.name,
            context.layer(via.left),
            via.at,
            (via.at, via.at),
            (via.along, via.along),
            change.distance,
            reach,
            "mm",
            text,
        )


def _words(planes: frozenset[Plane], context: Context) -> str:
    return " and ".join(f"{context.nets.name_of(label)} on {context.layer(layer)}" for layer, label in sorted(planes))
