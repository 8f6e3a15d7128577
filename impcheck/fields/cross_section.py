"""The cross-section met at a station. In: cuts of a station and the stackup; out: a canonical description, and the Section it stands
for, in mm.

Distances are snapped to what matters to the impedance (about 0.2 %), copper beyond what matters is left out, and a section and its
mirror image are one: so thousands of stations share a few sections.
"""

from __future__ import annotations

import bisect
import math
from dataclasses import dataclass
from functools import lru_cache

from impcheck.artwork.stackup import Slab, Stackup
from impcheck.fields.section import Coating, Conductor, Section

Edges = tuple[tuple[float, float], ...]
Layer = tuple[int, float, Edges]  # copper layer, its distance from the trace, its openings
Layers = tuple[Layer, ...]

# What matters, in heights of the trace over the plane. Solving a 50 ohm microstrip and a stripline with an opening 2.6 heights wide
# beside the trace,
# at d heights from its edge, changed the impedance by 4.7 and 1.6 % (d = 0), 1.0 and 0.15 % (d = 0.9), 0.3 and 0.01 % (d = 1.8), 0.12 and
# 0.00 % (d = 2.7);
# what stands behind the opening changed it by less than 0.1 % unless the opening lies under the trace.
MATTERS_BESIDE = 3.0  # copper beside the trace: 0.1 to 0.2 % at 3.3 heights (a 0.25 mm trace 1.5 mm over its plane)
MATTERS_OPEN = 3.0  # an opening of the only plane near
MATTERS_SHIELDED = 1.5  # an opening where a plane on the other side is whole
MATTERS_POURED = 0.0  # an opening beside a trace that has copper on both sides nearer than half the height to its plane
MATTERS_EDGE = 2.0  # times farther where the opening has no far edge
FOLLOWS = 2.0  # widths of copper beside within which the next copper makes it one that goes on: the two differ by under 0.4 % there
# An opening under the trace is a waveguide below its cut-off: taking the layer at D behind an opening as wide as W for a whole plane, where
# it has the same opening, changed the impedance by up to 5 % (D = W / 2), 1.8 % (0.75 W), 0.8 % (W), 0.2 % (1.5 W).
HIDDEN = 1.25  # widths of the opening
HIDDEN_ROUGHLY = 0.75  # where no rule judges
WIDTH_STEP = 0.002  # relative, of widths
GAP_STEP = 0.03  # relative, of gaps to copper beside that are small against the height (5 % of one changed the impedance by 1.3 % at most)
BESIDE_STEP = 0.4  # relative, of the width of copper beside (0.25 mm or without end: under 1.4 %)
EDGE_STEP = 0.04  # heights, of an opening's edge near the trace
EDGE_SHARE = 0.08  # of its distance, of one farther out: up to 0.8 %
TRACE_STEP = 0.1  # of the middle, in heights, and of the width, relative, of a foreign trace on the next layer
DISTANCES = (0.0, 0.3, 0.75, 1.5, 2.5, 4.0, 6.0)  # heights from the trace's edge at which openings beside it are solved
WIDTHS = (0.4, 1.2, 3.5, 25.0)  # heights, of those openings; the last one stands for the end of the plane
LOG_WIDTHS = tuple(math.log(width) for width in WIDTHS)
LEAST_POWER = 0.01
FAR_BESIDE = 2.0  # times that, how far copper beside that goes on is drawn
ROUGHLY = 5.0  # times coarser the copper beside is taken where only the ratio of two sections counts
COARSE = 5.0  # times coarser where no rule judges
FAR = 30.0  # heights beyond which a plane is drawn no farther


@dataclass(frozen=True)
class Shape:
    """A canonical section: everything relative to the middle of the trace, mm."""

    layer: int
    width: float
    beside: Edges  # copper on the own layer, low and high edge, at 0 V
    planes: tuple[tuple[int, Edges], ...]  # layers between that hold copper: interrupted planes, foreign traces alongside
    closed_above: int  # copper layer of the first plane above without interruption that matters, -1 none
    closed_below: int
    coated: bool  # solder mask over an outer layer


def snapped(value: float, step: float, least: float) -> float:
    """A distance rounded to a relative step, or to `least` mm where that is coarser; the sign is kept."""
    size = abs(value)
    if size * step <= least:
        return math.copysign(round(size / least) * least, value)
    return math.copysign(math.exp(round(math.log(size) / math.log1p(step)) * math.log1p(step)), value)


@dataclass(frozen=True)
class Place:
    """The section of a station, taken apart: its impedance is that of `main` times, for each of `beside`, its ratio to that of `base`
    to the power given.

    `main` holds everything but the openings that lie wholly beside the trace. Such an opening changes the impedance by a few per cent
    at most, and the changes of several multiply; so each is taken from sections with one opening of a few distances and widths, between
    which the logarithm of the ratio is interpolated (the powers). `tests/fields/test_cross_section.py` measures what that costs.
    """

    main: Shape
    base: Shape
    beside: tuple[tuple[Shape, float], ...]


def place_of(
    layer: int,
    width: float,
    beside: Edges,
    above: list[tuple[int, Edges]],
    below: list[tuple[int, Edges]],
    stackup: Stackup,
    coated: bool,
    factor: float,
    between: tuple[tuple[int, Edges], ...] = (),
) -> Place:
    """The canonical section of one station.

    `beside` and the edges of planes are relative to the middle of the trace; `above` and `below` list layers outwards with the return
    copper the cut meets there, `between` layers with foreign traces that run alongside. `factor` is how many times coarser than usual it
    is snapped.
    """
    width = snapped(width, WIDTH_STEP * factor, 0.001)
    half = width / 2
    sides = [[(index, _height(stackup, layer, index), edges) for index, edges in layers] for layers in (above, below)]
    nearest = [
        next(((index, away, edges) for index, away, edges in side if _touches(edges, half + MATTERS_OPEN * away)), None) for side in sides
    ]
    height = min((found[1] for found in nearest if found is not None), default=1.0)
    near = _beside(beside, half, MATTERS_BESIDE * height, height, factor)
    roughly = _beside(beside, half, MATTERS_BESIDE * height, height, factor * ROUGHLY)  # enough where only a ratio is taken
    pours = all(any(sign * (a + b) > 0 and min(abs(a), abs(b)) - half < height / 2 < b - a for a, b in near) for sign in (-1, 1))
    shielded = [other is not None and _closes(other[2], half + MATTERS_SHIELDED * other[1]) for other in nearest[::-1]]
    openings: list[list[Layer]] = []
    closed = [-1, -1]
    for side, layers in enumerate(sides):
        openings.append([])
        matters = MATTERS_POURED if pours else MATTERS_SHIELDED if shielded[side] else MATTERS_OPEN
        under_it = min((away for _, away, edges in layers if _touches(edges, half)), default=FAR)
        for index, away, edges in layers:
            # the edges of an opening wide against the layer's own distance still matter where the plane seen through it is far
            if not _touches(edges, half + matters * max(away, under_it)) and not openings[side]:
                continue
            behind = bool(openings[side])
            if behind and (not _under(openings[side][-1], half) or _hidden(openings[side], away, half, factor)):
                closed[side] = index  # whatever it is: it changes less than what is left out
                break
            found = () if behind and _closes(edges, half) else _openings(edges, half, away, matters, factor)
            if not found:
                closed[side] = index
                break
            openings[side].append((index, away, found))

    def shape(above_open: Layers, below_open: Layers, copper: Edges, foreign: tuple[tuple[int, Edges], ...] = ()) -> Shape:
        ends = tuple(
            closed[side] if given or not openings[side] else openings[side][0][0] for side, given in enumerate((above_open, below_open))
        )
        inside = tuple(found for found in foreign if found[1] and ends[0] < found[0] and (ends[1] < 0 or found[0] < ends[1]))
        return _canonical(layer, width, copper, above_open + below_open, ends, coated, inside)

    # what lies under the trace, or behind an opening under it, stays together; single openings beside it are taken apart
    under: list[Layers] = [(), ()]
    parts: dict[Shape, float] = {}
    for side in (0, 1):
        if len(openings[side]) != 1:
            under[side] = tuple(openings[side])
            continue
        index, away, found = openings[side][0]
        apart = [opening for opening in found if opening[0] >= half or opening[1] <= -half]
        together = tuple(opening for opening in found if opening not in apart)
        if together:
            under[side] = ((index, away, together),)
        for opening in apart:
            for model, power in _models(opening, half, away):
                alone = ((index, away, (model,)),)
                part = shape(alone, (), roughly) if side == 0 else shape((), alone, roughly)
                parts[part] = parts.get(part, 0.0) + power
    order = sorted(parts.items(), key=lambda found: (found[0].planes, found[0].closed_above, found[0].closed_below))
    foreign = tuple((index, _snapped_traces(edges, _height(stackup, layer, index), factor)) for index, edges in between)
    main = shape(under[0], under[1], near, foreign)
    return Place(main, shape((), (), roughly), tuple((part, round(power, 3)) for part, power in order))


@lru_cache(maxsize=100_000)
def _canonical(
    layer: int,
    width: float,
    near: Edges,
    openings: Layers,
    ends: tuple[int, ...],
    coated: bool,
    foreign: tuple[tuple[int, Edges], ...],
) -> Shape:
    """The shape, or its mirror image where that stands first."""
    planes = {index: _edges(found, width / 2 + FAR * away) for index, away, found in openings}
    for index, edges in foreign:
        there = planes.get(index, ())
        free = tuple((low, high) for low, high in edges if not any(low <= b and high >= a for a, b in there))
        planes[index] = tuple(sorted(there + free))
    shape = Shape(layer, width, near, tuple(sorted(planes.items())), ends[0], ends[1], coated)
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


def _under(layer: Layer, half: float) -> bool:
    return any(low < half and high > -half for low, high in layer[2])


def _hidden(openings: list[Layer], away: float, half: float, factor: float) -> bool:
    """True for what lies so deep behind an opening under the trace that the field does not reach it."""
    limit = HIDDEN if factor < COARSE else HIDDEN_ROUGHLY
    return any(
        away - layer[1] > limit * max((high - low for low, high in layer[2] if low < half and high > -half), default=math.inf)
        for layer in openings
    )


def _touches(edges: Edges, limit: float) -> bool:
    return any(high > -limit and low < limit for low, high in edges)


def _closes(edges: Edges, limit: float) -> bool:
    return any(low <= -limit and high >= limit for low, high in edges)


def _openings(edges: Edges, half: float, away: float, matters: float, factor: float) -> Edges:
    """The openings of a plane that matter, snapped; what has no end is infinite."""
    bounds = [-math.inf, *(value for edge in edges for value in edge), math.inf]
    found: list[tuple[float, float]] = []
    for low, high in zip(bounds[::2], bounds[1::2], strict=True):
        limit = matters * away * (MATTERS_EDGE if math.isinf(low) or math.isinf(high) else 1.0)
        if high <= low or low - half > limit or -half - high > limit:
            continue
        a, b = _snapped_opening(low, high, half, away, factor)
        if found and a <= found[-1][1]:
            found[-1] = (found[-1][0], max(b, found[-1][1]))
        else:
            found.append((a, b))
    return tuple(found)


def _edges(openings: Edges, far: float) -> Edges:
    """The copper of a plane out to `far` mm that its openings leave."""
    bounds = [-far, *(min(max(value, -far), far) for opening in openings for value in opening), far]
    return tuple((round(low, 6), round(high, 6)) for low, high in zip(bounds[::2], bounds[1::2], strict=True) if high > low)


def _snapped_opening(low: float, high: float, half: float, away: float, factor: float) -> tuple[float, float]:
    """An opening under the trace, or partly, with its edges snapped; one beside the trace as it is."""
    if low >= half or high <= -half:
        return low, high

    def edge(value: float) -> float:
        if math.isinf(value):
            return value
        beyond = abs(value) - half
        if beyond > 0:
            return math.copysign(half + snapped(beyond, EDGE_SHARE * factor, EDGE_STEP * factor * away), value)
        return snapped(value, 1e-9, EDGE_STEP * factor * away)

    a, b = edge(low), edge(high)
    return a, max(b, a + EDGE_STEP * away)


def _models(opening: tuple[float, float], half: float, away: float) -> list[tuple[tuple[float, float], float]]:
    """Openings beside the trace at the nodes around one, each with its power: linear between distances, logarithmic between widths,
    quadratic towards an opening without width."""
    right = opening[0] >= half
    low, high = opening if right else (-opening[1], -opening[0])
    distance, width = (low - half) / away, (high - low) / away
    found = []
    for d, share_d in _nodes(distance, DISTANCES):
        narrow = (width / WIDTHS[0]) ** 2 if width < WIDTHS[0] else 1.0
        widths = [(len(WIDTHS) - 1, 1.0)] if math.isinf(width) else _nodes(math.log(max(width, WIDTHS[0])), LOG_WIDTHS)
        for w, share_w in widths:
            power = share_d * share_w * narrow
            if power > LEAST_POWER:
                near, far = half + DISTANCES[d] * away, half + (DISTANCES[d] + WIDTHS[w]) * away
                found.append(((near, far) if right else (-far, -near), power))
    return found


def _nodes(value: float, nodes: tuple[float, ...]) -> list[tuple[int, float]]:
    """The nodes on both sides of a value and their shares."""
    above = bisect.bisect_right(nodes, value)
    if above == 0:
        return [(0, 1.0)]
    if above == len(nodes):
        return [(above - 1, 1.0)]
    share = (value - nodes[above - 1]) / (nodes[above] - nodes[above - 1])
    return [(above - 1, 1.0 - share), (above, share)]


def _beside(edges: Edges, half: float, limit: float, height: float, factor: float) -> Edges:
    """The nearest copper on either side: its gap snapped the finer the nearer it stands, its width coarsely. Where more copper follows it
    closely, the two are taken for one that goes on."""
    found: list[tuple[float, float]] = []
    far = half + FAR_BESIDE * limit
    for sign in (1.0, -1.0):
        side = sorted((min(sign * low, sign * high), max(sign * low, sign * high)) for low, high in edges)
        side = [piece for piece in side if piece[0] >= half - 1e-6][:2]
        if not side or side[0][0] - half > limit:
            continue
        low, high = side[0]
        a = half + _snapped_gap(low - half, height, factor)
        goes_on = high >= half + limit or (len(side) > 1 and side[1][0] - high < FOLLOWS * (high - low))
        b = far if goes_on else a + max(snapped(high - low, BESIDE_STEP * factor, 0.01), 0.01)
        a, b = round(a, 6), round(b, 6)  # round-off must not make two shapes of one
        found.append((a, b) if sign > 0 else (-b, -a))
    return tuple(sorted(found))


def _snapped_traces(edges: Edges, away: float, factor: float) -> Edges:
    """Foreign traces on a layer `away` mm over or under: their middles and widths snapped, those that touch by that merged."""
    found: list[tuple[float, float]] = []
    for low, high in edges:
        middle = snapped((low + high) / 2, 1e-9, TRACE_STEP * factor * away)
        reach = max(snapped((high - low) / 2, TRACE_STEP * factor, 0.005), 0.005)
        a, b = round(middle - reach, 6), round(middle + reach, 6)
        if found and a <= found[-1][1]:
            found[-1] = (found[-1][0], max(b, found[-1][1]))
        else:
            found.append((a, b))
    return tuple(found)


def _snapped_gap(gap: float, height: float, factor: float) -> float:
    """A gap on a fixed grid whose steps are GAP_STEP of it where it is small against the height, and grow to three times that and more
    where it is not: g / (1 + 2 g / height) rises by GAP_STEP from one to the next."""
    step = math.log1p(GAP_STEP * factor)
    reduced = math.exp(round(math.log(max(gap, 0.002) / (1 + 2 * gap / height)) / step) * step)
    return max(min(reduced / max(1 - 2 * reduced / height, 0.05), 2 * MATTERS_BESIDE * height), 0.002)


def section_of(shape: Shape, stackup: Stackup) -> Section:
    """The section a shape stands for, ready to be solved."""
    heights = stackup.heights
    conductors = [_trapezoid("trace", "signal", -shape.width / 2, shape.width / 2, shape.layer, stackup)]
    conductors += [_trapezoid(f"beside {n}", "return", low, high, shape.layer, stackup) for n, (low, high) in enumerate(shape.beside)]
    for index, edges in shape.planes:
        bottom, top = heights[index]
        conductors += [
            Conductor(f"plane {index}.{n}", "return", ((low, bottom), (high, bottom), (high, top), (low, top)))
            for n, (low, high) in enumerate(edges)
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
    upper, lower = stackup.mask_top, stackup.mask_bottom
    over = shape.closed_above < 0 and upper is not None and (shape.coated or shape.layer != 0)
    under = shape.closed_below < 0 and lower is not None and (shape.coated or shape.layer != len(heights) - 1)
    return Section(
        slabs=slabs,
        conductors=tuple(conductors),
        planes=tuple(planes),
        coating=Coating(upper.thickness, upper.er, upper.loss_tangent) if over and upper is not None else None,
        coating_below=Coating(lower.thickness, lower.er, lower.loss_tangent) if under and lower is not None else None,
    )


def _trapezoid(name: str, role: str, low: float, high: float, layer: int, stackup: Stackup) -> Conductor:
    """A trace as etched: as wide as drawn where it is bonded, narrower by the layer's etch on the far side (never less than a tenth of
    it)."""
    bottom, top = stackup.heights[layer]
    cut = min(stackup.coppers[layer].etch, 0.9 * (high - low)) / 2
    if stackup.bonded_below[layer]:
        outline = ((low, bottom), (high, bottom), (high - cut, top), (low + cut, top))
    else:
        outline = ((low + cut, bottom), (high - cut, bottom), (high, top), (low, top))
    return Conductor(name, role, outline)
