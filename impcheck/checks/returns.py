"""Where the return current of a layer change goes. In: a walk, its via, copper, nets; out: the planes on both sides and what joins
them, in mm."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from impcheck.artwork.parts import Artwork
from impcheck.copper.copper import Copper
from impcheck.nets.nets import Nets
from impcheck.path.walk import Run, Via, Walk, Zone

Plane = tuple[int, int]  # copper layer, label
MEETS = 0.05  # mm between the end of a run and its via, along the path


@dataclass(frozen=True)
class Change:
    """The return path of one change of layer."""

    before: frozenset[Plane]  # planes the return runs on before the via
    after: frozenset[Plane]
    shared: bool  # one plane serves both sides: no change for the return current
    distance: float | None  # mm to the nearest via or capacitor that joins a plane before with one after; None where there is none at all
    joint: str  # what it is: "via", or a part's name


def return_change(artwork: Artwork, copper: Copper, nets: Nets, walk: Walk, via: Via) -> Change:
    """Looks at the planes of the runs on both sides of a via and for what joins them.

    A barrel of a return net joins two planes of its own net between its ends; planes of different nets are joined by a two-pin part
    that the board file's `joins` name or whose reference begins with C.
    """
    before = _planes(nets, _run_at(walk, via, via.entered, before=True), at_end=True)
    after = _planes(nets, _run_at(walk, via, via.left, before=False), at_end=False)
    shared = bool(before & after)
    if shared or not before or not after:
        return Change(before, after, shared, None, "")
    best: tuple[float, str] | None = None
    middle = (copper.barrels.start + copper.barrels.end) / 2
    for layer_b, label_b in sorted(before):
        for layer_a, label_a in sorted(after):
            if label_a == label_b:
                low, high = sorted((layer_a, layer_b))
                good = (nets.barrel_label == label_a) & (copper.barrels.first <= low) & (copper.barrels.last >= high)
                if good.any():
                    distance = float(np.hypot(*(middle[good] - np.array(via.at)).T).min())
                    best = min(best or (math.inf, ""), (distance, "via"))
            else:
                for name, place in _capacitors(artwork, nets, label_a, label_b):
                    best = min(best or (math.inf, ""), (math.dist(place, via.at), name))
    return Change(before, after, False, *(best or (None, "")))


def nearest_return_via(artwork: Artwork, copper: Copper, nets: Nets, walk: Walk, via: Via) -> float | None:
    """Distance to what joins the planes of a layer change, mm; None where none is needed or none is found."""
    return return_change(artwork, copper, nets, walk, via).distance


def _run_at(walk: Walk, via: Via, layer: int, before: bool) -> Run | None:
    """The run on a layer that ends (begins) at the via, the nearest one that holds plain trace."""
    runs = [run for run in walk.runs if run.layer == layer]
    if before:
        near = [run for run in runs if run.along[1] <= via.along + MEETS]
        near.sort(key=lambda run: via.along - run.along[1])
    else:
        near = [run for run in runs if run.along[0] >= via.along - MEETS]
        near.sort(key=lambda run: run.along[0] - via.along)
    if not near:
        return None
    return next((run for run in near if (run.stations.zone == Zone.TRACE).any()), near[0])


def _planes(nets: Nets, run: Run | None, at_end: bool) -> frozenset[Plane]:
    """The planes a run refers to at the end that meets the via: of its last (first) stations of plain trace."""
    if run is None or len(run.stations) == 0:
        return frozenset()
    s = run.stations
    plain = np.flatnonzero(s.zone == Zone.TRACE)
    order = plain if len(plain) else np.arange(len(s))
    found: set[Plane] = set()
    for reference in (s.above, s.below):
        for station in order[::-1] if at_end else order:
            layer = int(reference[station])
            cut = s.cuts.get(layer)
            if layer < 0 or cut is None:
                break
            a, b = int(cut.first[station]), int(cut.first[station + 1])
            centre = float(s.centre[station])
            labels = [int(x) for x in cut.label[a:b][(cut.low[a:b] <= centre) & (cut.high[a:b] >= centre)] if int(x) in nets.returns]
            if labels:
                found.add((layer, labels[0]))
                break
    return frozenset(found)


def _capacitors(artwork: Artwork, nets: Nets, one: int, other: int) -> list[tuple[str, tuple[float, float]]]:
    parts: dict[str, list[tuple[int, tuple[float, float]]]] = {}
    for pin in nets.pins:
        if pin.component.upper().startswith("C") or pin.component in artwork.board.joins:
            parts.setdefault(pin.component, []).append((pin.label, pin.at))
    found = []
    for name, pins in sorted(parts.items()):
        if len(pins) == 2 and {pins[0][0], pins[1][0]} == {one, other}:
            found.append((name, ((pins[0][1][0] + pins[1][1][0]) / 2, (pins[0][1][1] + pins[1][1][1]) / 2)))
    return found
