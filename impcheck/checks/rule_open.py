"""The declared ends of a net are not joined by copper.

Measured: whether every declared end (or pin) of a net can be reached from its start through copper, barrels and the parts named in
`joins`; and, for the whole board, whether the copper that a netlist or the artwork's own attributes call by one name is one piece. What
is not declared in the board file is a note. A declared net that cannot be followed at all (nothing says where it ends, or its copper is
only a pour) is reported here too.

Why it matters: the board does not work, or works through something else.

What to do: look at the place for a missing trace, via or drill file; where a part leads the signal on, name it in `joins`.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from impcheck.checks.context import Context
from impcheck.checks.finding import Finding
from impcheck.checks.limits import Level

RULE = "open"


@dataclass(frozen=True)
class Limits:
    """Limits of the rule."""

    level: Level


def check_board(limits: Limits, context: Context) -> Iterator[Finding]:
    """Findings of the whole board: declared nets that are open or cannot be followed, then the others as notes."""
    told: set[str] = set()
    faults = {fault.nets[0]: fault for fault in context.nets.faults if fault.kind == "open"}
    for track in context.tracks:
        walk = track.walk
        if walk.status == "walked":
            continue
        fault = faults.get(walk.net.name)
        reached = set(walk.ends)
        missing = next((end for end in walk.net.ends if end not in reached), walk.begin or next(iter(walk.net.begin), None))
        at, layer = (missing.at, missing.layer) if missing is not None else ((0.0, 0.0), None)
        text = walk.reason or "the ends are not joined by copper"
        if fault is not None:
            at, layer, text = fault.at, fault.layer, fault.message
        if walk.status == "unresolved":
            text = f"the net cannot be followed: {walk.reason}"
        told.add(walk.net.name)
        yield _finding(limits.level, walk.net.name, layer, at, text, context)
    for name, fault in faults.items():
        if name not in told:
            yield _finding(limits.level if fault.declared else "note", name, fault.layer, fault.at, fault.message, context)


def _finding(level: str, net: str, layer: int | None, at: tuple[float, float], text: str, context: Context) -> Finding:
    return Finding(RULE, level, net, "" if layer is None else context.layer(layer), at, (at, at), None, None, None, "", text)
