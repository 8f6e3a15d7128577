"""A via's barrel goes on beyond the last layer the signal uses.

Measured: the length of barrel above and below the two layers of a change of layer, after back-drilling; the finding names the frequency
at which the stub is a quarter wave long, f = c / (4 L sqrt(er)).

Why it matters: a stub is a line open at its end. Below its quarter-wave frequency it loads the line like a capacitor, near it it shorts
the signal.

What to do: change layers so that the barrel is used to its end, back-drill it, or use a blind or buried via.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from scipy.constants import speed_of_light

from impcheck.checks.context import Context
from impcheck.checks.finding import Finding
from impcheck.checks.limits import Length, Level
from impcheck.checks.stubs import mean_permittivity, stub_lengths
from impcheck.checks.track import Track

RULE = "via-stub"


@dataclass(frozen=True)
class Limits:
    """Limits of the rule."""

    level: Level
    longest: Length  # a shorter stub is no finding


def check(track: Track, limits: Limits, context: Context) -> Iterator[Finding]:
    """Findings of one net, one a via: the longer of its two stubs."""
    longest = limits.longest.against(context.edge(track))
    for via in track.walk.vias:
        upper, lower = stub_lengths(context.artwork, context.copper, via)
        stub = max(upper, lower)
        if stub <= longest:
            continue
        used = sorted((via.entered, via.left))
        beyond = context.layer(used[0] if upper > lower else used[1])
        er = mean_permittivity(context.artwork.stackup)
        frequency = speed_of_light / (4 * stub * 1e-3 * er**0.5) / 1e9
        text = (
            f"the barrel goes on {stub:.2f} mm {'above' if upper > lower else 'below'} {beyond}, the last layer used: "
            f"a quarter wave at {frequency:.1f} GHz (er {er:.2f})"
        )
        yield Finding(
            RULE, limits.level, track.walk.net.name, beyond, via.at, (via.at, via.at), (via.along, via.along), stub, longest, "mm", text
        )
