"""One finding. In: nothing (types only); out: what a rule says of one place."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Finding:
    """One spot that one rule objects to. Positions are mm in the artwork's own coordinates."""

    rule: str
    level: str  # "error", "warning", "note"
    net: str
    layer: str  # copper layer name, "" where the finding is of no single layer
    at: tuple[float, float]  # the worst point
    span: tuple[tuple[float, float], tuple[float, float]]
    along: tuple[float, float] | None  # mm along the walk; None where the net was not walked
    measured: float | None
    limit: float | None
    unit: str  # unit of both: "ohm", "mm", "%", "ps", "" ...
    message: str  # one or two sentences a hardware engineer understands: what, where, against what, what to look at
