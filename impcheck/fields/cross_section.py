"""The cross-section met at a station. In: cuts of a station and the stackup; out: a canonical description, and the Section it stands for, in mm.

Distances are snapped to what matters to the impedance (about 0.2 %), copper beyond what matters is left out, and a section and its mirror image are
one: so thousands of stations share a few sections.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from impcheck.artwork.stackup import Slab, Stackup
from impcheck.fields.section import Coating, Conductor, Section

Edges = tuple[tuple[float, float], ...]

MATTERS = 5.0  # heights beyond the trace's edge within which copper beside or an opening of a plane matters
NEIGHBOURS = 2  # pieces of copper on either side that are kept: those farther out are shielded by them
WIDTH_STEP = 0.002  # relative, of widths
GAP_STEP = 0.02  # relative, of gaps between copper side by side
PLANE_STEP = 0.03  # relative, of distances of plane edges, and heights of the least step
COARSE = 5.0  # times coarser where no rule judges
FAR = 30.0  # heights beyond which a plane is drawn no farther


@dataclass(frozen=True)
class Shape:
    """A canonical section: everything relative to the middle of the trace, mm."""

    layer: int
    width: float
    beside: Edges  # copper on the own layer, low and high edge, at 0 V
    planes: tuple[tuple[int, Edges], ...]  # interrupted layers and what is left of them, nearest first
    closed_above: int  # copper layer of the first plane above without interruption that matters, -1 none
    closed_below: int
    coated: bool  # solder mask over an outer layer


def snapped(value: float, step: float, least: float) -> float:
    """A distance rounded to a relative step, or to `least` mm where that is coarser; the sign is kept."""
    size = abs(value)
    if size * step <= least:
        return math.copysign(round(size / least) * least, value)
    return math.copysign(math.exp(round(math.log(size) / math.log1p(step)) * math.log1p(step)), value)


def shape_of(
    layer: int,
    width: float,
    beside: Edges,
    above: list[tuple[int, Edges]],
    below: list[tuple[int, Edges]],
    stackup: Stackup,
    coated: bool,
    fine: bool,
) -> Shape:
    """The canonical shape of one station.

    `beside` and the edges of planes are relative to the middle of the trace; `above` and `below` list layers outwards with the return copper the cut
    meets there. `fine` is False where no rule judges the place.
    """
    factor = 1.0 if fine else COARSE
    half = width / 2
    planes: list[tuple[int, Edges]] = []
    closed = {}
    height = math.inf
    for side, layers in (("above", above), ("below", below)):
        closed[side] = -1
        for index, edges in layers:
            away = _height(stackup, layer, index)
            kept = _within(edges, half + MATTERS * away)
            if not kept:
                continue
            height = min(height, away)
            if kept[0][0] <= -half - MATTERS * away and kept[0][1] >= half + MATTERS * away:
                closed[side] = index
                break
            planes.append((index, _snapped_edges(kept, half, PLANE_STEP * factor, PLANE_STEP * factor * away, half + FAR * away)))
    if math.isinf(height):
        height = 1.0
    near = _beside(beside, half, MATTERS * height, GAP_STEP * factor)
    width = snapped(width, WIDTH_STEP * factor, 0.001)
    shape = Shape(layer, width, near, tuple(sorted(planes)), closed["above"], closed["below"], coated)
    return min(shape, _mirrored(shape), key=lambda s: (s.beside, s.planes))


def _mirrored(shape: Shape) -> Shape:
    def flip(edges: Edges) -> Edges:
        return tuple((-high, -low) for low, high in reversed(edges))

    return Shape(
        shape.layer,
        shape.width,
        flip(shape.beside),
        tuple((index, flip(edges)) for index, edges in shape.planes),
        shape.closed_above,
        shape.closed_below,
        shape.coated,
    )


def _height(stackup: Stackup, one: int, two: int) -> float:
    high, low = stackup.heights[min(one, two)], stackup.heights[max(one, two)]
    return high[0] - low[1]


def _within(edges: Edges, limit: float) -> Edges:
    return tuple((low, high) for low, high in edges if high > -limit and low < limit)


def _snapped_edges(edges: Edges, half: float, step: float, least: float, far: float) -> Edges:
    """Edges of a plane snapped by their distance from the trace's nearer edge."""

    def snap(value: float) -> float:
        if abs(value) >= far:
            return math.copysign(far, value)
        origin = math.copysign(half, value)
        return origin + snapped(value - origin, step, least)

    found: list[tuple[float, float]] = []
    for low, high in edges:
        a, b = snap(low), snap(high)
        if found and a - found[-1][1] < least / 2:
            found[-1] = (found[-1][0], max(b, found[-1][1]))
        elif b - a > least / 2:
            found.append((a, b))
    return tuple(found)


def _beside(edges: Edges, half: float, limit: float, step: float) -> Edges:
    """The nearest copper on either side: gap and width snapped."""
    found: list[tuple[float, float]] = []
    right = sorted((low, high) for low, high in edges if low >= half - 1e-6)[:NEIGHBOURS]
    left = sorted(((-high, -low) for low, high in edges if high <= -half + 1e-6))[:NEIGHBOURS]
    for sign, side in ((1.0, right), (-1.0, left)):
        at = half
        for low, high in side:
            if low - half > limit:
                break
            gap = max(snapped(low - at, step, 0.001), 0.002)
            wide = max(snapped(min(high, half + 3 * limit) - low, 4 * step, 0.005), 0.005)
            a, b = at + gap, at + gap + wide
            found.append((a, b) if sign > 0 else (-b, -a))
            at = b
    return tuple(sorted(found))


def section_of(shape: Shape, stackup: Stackup) -> Section:
    """The section a shape stands for, ready to be solved."""
    heights = stackup.heights
    conductors = [_trapezoid("trace", "signal", -shape.width / 2, shape.width / 2, shape.layer, stackup)]
    conductors += [_trapezoid(f"beside {n}", "return", low, high, shape.layer, stackup) for n, (low, high) in enumerate(shape.beside)]
    for index, edges in shape.planes:
        bottom, top = heights[index]
        conductors += [
            Conductor(f"plane {index}.{n}", "return", ((low, bottom), (high, bottom), (high, top), (low, top))) for n, (low, high) in enumerate(edges)
        ]
    planes = []
    low_end, high_end = -math.inf, math.inf
    if shape.closed_below >= 0:
        low_end = heights[shape.closed_below][1]
        planes.append(low_end)
    if shape.closed_above >= 0:
        high_end = heights[shape.closed_above][0]
        planes.append(high_end)
    slabs = tuple(
        Slab(max(slab.bottom, low_end), min(slab.top, high_end), slab.er, slab.loss_tangent, slab.name)
        for slab in stackup.slabs
        if slab.top > low_end + 1e-9 and slab.bottom < high_end - 1e-9
    )
    top, bottom = stackup.mask_top, stackup.mask_bottom
    over = shape.closed_above < 0 and top is not None and (shape.coated or shape.layer != 0)
    under = shape.closed_below < 0 and bottom is not None and (shape.coated or shape.layer != len(heights) - 1)
    return Section(
        slabs=slabs,
        conductors=tuple(conductors),
        planes=tuple(planes),
        coating=Coating(top.thickness, top.er, top.loss_tangent) if over and top is not None else None,
        coating_below=Coating(bottom.thickness, bottom.er, bottom.loss_tangent) if under and bottom is not None else None,
    )


def _trapezoid(name: str, role: str, low: float, high: float, layer: int, stackup: Stackup) -> Conductor:
    """A trace as etched: as wide as drawn where it is bonded, narrower by the layer's etch on the far side (never less than a tenth of it)."""
    bottom, top = stackup.heights[layer]
    cut = min(stackup.coppers[layer].etch, 0.9 * (high - low)) / 2
    if stackup.bonded_below[layer]:
        outline = ((low, bottom), (high, bottom), (high - cut, top), (low + cut, top))
    else:
        outline = ((low + cut, bottom), (high - cut, bottom), (high, top), (low, top))
    return Conductor(name, role, outline)
