"""A straight trace as walked, written by hand. In: widths and cuts of its stations, mm; out: a Walk with its Copper and Nets."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import shapely

from impcheck.artwork.board import NetClass, NetRequest
from impcheck.nets.nets import DeclaredNet, Nets
from impcheck.path.walk import Intervals, Run, Stations, Walk, Zone

OWN, GND, FOREIGN, OTHER_LEG = 0, 1, 2, 0  # labels; another leg of the net has the net's own label
REACH = 1.2


def intervals(rows):
    """Rows of (low, high, label) per station."""
    flat = [entry for row in rows for entry in row]
    first = np.concatenate([[0], np.cumsum([len(row) for row in rows])]).astype(np.int32)
    low, high, label = ([entry[k] for entry in flat] for k in range(3))
    return Intervals(first, np.array(low, float), np.array(high, float), np.array(label, np.int32))


def walk(stations, *, layer=0, name="S", step=0.5):
    """One run of stations `step` mm long from (0, 0) to the right. A station is a dict: width, zone, cuts {layer: [(low, high, label)]},
    above, below, cover (share of the width the reference below covers), centre."""
    count = len(stations)
    begin = np.arange(count) * step
    layers = sorted({k for s in stations for k in s.get("cuts", {})} | {layer})
    cuts = {}
    for k in layers:
        rows = [list(s.get("cuts", {}).get(k, [])) for s in stations]
        if k == layer:
            for s, row in zip(stations, rows, strict=True):
                centre = s.get("centre", 0.0)
                row.append((centre - s["width"] / 2, centre + s["width"] / 2, OWN))
                row.sort()
        cuts[k] = intervals(rows)
    measured = Stations(
        begin=begin,
        end=begin + step,
        at=np.column_stack([begin + step / 2, np.zeros(count)]),
        left_normal=np.tile([0.0, 1.0], (count, 1)),
        width=np.array([s["width"] for s in stations]),
        centre=np.array([s.get("centre", 0.0) for s in stations]),
        zone=np.array([s.get("zone", Zone.TRACE) for s in stations], np.uint8),
        reach=REACH,
        cuts=cuts,
        above=np.array([s.get("above", -1) for s in stations], np.int32),
        below=np.array([s.get("below", 1) for s in stations], np.int32),
        coverage_above=np.zeros(count),
        coverage_below=np.array([s.get("cover", 1.0) for s in stations]),
    )
    run = Run(layer, np.array([[0.0, 0.0], [count * step, 0.0]]), (0.0, count * step), measured)
    net = DeclaredNet(name, NetRequest(name, "c"), NetClass("c", impedance=50.0), (OWN,), (), ())
    return Walk(net, "walked", "", (run,), (), (), (), None, ())


def plane(*openings):
    """What a cut meets of a GND plane with openings (low, high)."""
    found, low = [], -REACH
    for a, b in sorted(openings):
        found.append((low, a, GND))
        low = b
    return [(a, b, label) for a, b, label in [*found, (low, REACH, GND)] if b > a]


NETS = Nets((), np.empty(0, np.int32), 3, {OWN: ("S",), GND: ("GND",), FOREIGN: ("X",)}, (), frozenset({GND}), ("GND",), (), ())


def copper(*openings):
    """All that a profile asks of the copper: where the upper mask is open, as boxes."""
    boxes = np.array([shapely.box(*box) for box in openings], dtype=object)
    return SimpleNamespace(mask_openings=(boxes, np.empty(0, object)))
