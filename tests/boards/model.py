"""An abstract board: what a layout tool knows before it writes fabrication files. In: shapes added in mm; out: lists the writers draw.
Shares no code with impcheck."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass, field, replace

Point = tuple[float, float]


@dataclass(frozen=True)
class Trace:
    """A polyline stroke with round ends."""

    net: str
    layer: int  # 0 = top
    width: float
    points: tuple[Point, ...]


@dataclass(frozen=True)
class Arc:
    """A circular stroke with round ends."""

    net: str
    layer: int
    width: float
    start: Point
    end: Point
    centre: Point
    ccw: bool

    def chopped(self, chord_error: float = 0.0005) -> tuple[Point, ...]:
        """The arc as a polyline whose chords stay within `chord_error` mm of it."""
        radius = math.dist(self.start, self.centre)
        a0 = math.atan2(self.start[1] - self.centre[1], self.start[0] - self.centre[0])
        a1 = math.atan2(self.end[1] - self.centre[1], self.end[0] - self.centre[0])
        sweep = (a1 - a0) % math.tau if self.ccw else -((a0 - a1) % math.tau)
        steps = max(2, math.ceil(abs(sweep) / (2 * math.acos(1 - min(chord_error / radius, 1)))))
        inner = [
            (self.centre[0] + radius * math.cos(a0 + sweep * k / steps), self.centre[1] + radius * math.sin(a0 + sweep * k / steps))
            for k in range(1, steps)
        ]
        return (self.start, *inner, self.end)


@dataclass(frozen=True)
class Pad:
    """A surface pad. `shape`: circle, rectangle, obround, rounded (a rectangle with round corners)."""

    net: str
    layer: int
    at: Point
    shape: str
    size: tuple[float, float]
    rotation: float = 0.0  # degrees, counter-clockwise
    component: str = ""
    pin: str = ""
    mask: bool = True
    paste: bool = True


@dataclass(frozen=True)
class Via:
    """A plated hole, with pads on every layer it is used on; a through-hole pin where `component` is set."""

    net: str
    at: Point
    drill: float
    pad: float
    antipad: float  # diameter of the clearance in planes of other nets
    first: int = 0
    last: int = -1  # -1: the lowest layer
    used: tuple[int, ...] = ()  # inner layers with a pad
    component: str = ""
    pin: str = ""
    thermal: bool = False  # joined to planes of its own net by four spokes
    backdrill: tuple[int, int, float] | None = None  # side it is drilled from, layer that is kept, drill diameter


@dataclass(frozen=True)
class Hole:
    """A hole without copper; a routed slot where `end` is set."""

    at: Point
    drill: float
    end: Point | None = None


@dataclass(frozen=True)
class Cut:
    """A place taken out of planes: a disc (`diameter`, one point), a stroke (`diameter`, several points) or a polygon (diameter 0)."""

    points: tuple[Point, ...]
    diameter: float = 0.0


@dataclass(frozen=True)
class Plane:
    """A plane or a pour: an outline less its cuts and less the clearance round other nets' copper."""

    net: str
    layer: int
    outline: tuple[Point, ...]
    cuts: tuple[Cut, ...] = ()
    clearance: float = 0.25
    hatch: float = 0.0  # pitch of a hatched pour, mm; 0 solid


@dataclass(frozen=True)
class Fill:
    """A solid polygon of copper with a net: teardrops, shapes, pads no aperture draws."""

    net: str
    layer: int
    points: tuple[Point, ...]


@dataclass(frozen=True)
class Layer:
    """One item of the stackup, thickness in um as people write it. `kind`: mask, copper, dielectric."""

    kind: str
    thickness: float
    er: float = 0.0
    loss_tangent: float = 0.0
    name: str = ""
    etch: float = 0.0


@dataclass(frozen=True)
class Declared:
    """A net the board file asks for. Ends are pins ("U1.3"); places on a layer where `places` is used by the writer."""

    net: str
    net_class: str
    begin: str = ""
    end: str = ""
    comment: str = ""


@dataclass(frozen=True)
class Label:
    """A known defect: the rule that must fire, where, and why."""

    rule: str
    net: str
    layer: str  # copper layer name, "" where the finding is of no single layer
    at: Point
    why: str
    length: float = 0.0  # mm along the trace, 0 where a length means nothing


@dataclass
class Board:
    """A whole board. Lengths mm, y upwards."""

    name: str
    outline: tuple[Point, ...]
    stackup: tuple[Layer, ...]
    traces: list[Trace] = field(default_factory=list)
    arcs: list[Arc] = field(default_factory=list)
    pads: list[Pad] = field(default_factory=list)
    vias: list[Via] = field(default_factory=list)
    holes: list[Hole] = field(default_factory=list)
    planes: list[Plane] = field(default_factory=list)
    fills: list[Fill] = field(default_factory=list)
    silk: list[tuple[int, float, tuple[Point, ...]]] = field(default_factory=list)  # side (0 top, 1 bottom), width, polyline
    classes: dict[str, dict[str, str]] = field(default_factory=dict)
    nets: list[Declared] = field(default_factory=list)
    returns: tuple[str, ...] = ("GND",)
    joins: tuple[str, ...] = ()
    rules: str = ""  # YAML of the board file's `rules`, "" the standard deck

    @property
    def coppers(self) -> tuple[Layer, ...]:
        return tuple(item for item in self.stackup if item.kind == "copper")

    @property
    def last(self) -> int:
        """Index of the lowest copper layer."""
        return len(self.coppers) - 1

    def span(self, via: Via) -> tuple[int, int]:
        """First and last copper layer of a barrel as first drilled."""
        return via.first, self.last if via.last < 0 else via.last

    def via_layers(self, via: Via) -> tuple[int, ...]:
        """Layers on which a via has a pad: both ends and the inner layers it is used on."""
        first, last = self.span(via)
        gone: set[int] = set()
        if via.backdrill is not None:
            side, keep, _ = via.backdrill
            gone = set(range(keep + 1, last + 1)) if side else set(range(first, keep))
        return tuple(sorted(({first, last, *via.used} | ({via.backdrill[1]} if via.backdrill else set())) - gone))

    def barrel_layers(self, via: Via) -> tuple[int, ...]:
        """Layers the metal of the barrel still reaches."""
        first, last = self.span(via)
        if via.backdrill is not None:
            side, keep, _ = via.backdrill
            first, last = (first, keep) if side else (keep, last)
        return tuple(range(first, last + 1))

    def extent(self) -> tuple[float, float, float, float]:
        xs, ys = [p[0] for p in self.outline], [p[1] for p in self.outline]
        return min(xs), min(ys), max(xs), max(ys)

    def trace(self, net: str, layer: int, width: float, *points: Point) -> None:
        self.traces.append(Trace(net, layer, width, tuple(points)))

    def scrub(self) -> None:
        """Puts every list into one order that depends on the content only."""
        for items in (self.traces, self.arcs, self.pads, self.vias, self.holes, self.fills):
            items.sort(key=repr)


@dataclass(frozen=True)
class Move:
    """A motion of the whole drawing: mirrored in x first, then rotated, then shifted."""

    rotation: float = 0.0  # degrees
    mirror: bool = False
    shift: Point = (0.0, 0.0)

    def point(self, at: Point) -> Point:
        x, y = (-at[0] if self.mirror else at[0]), at[1]
        c, s = math.cos(math.radians(self.rotation)), math.sin(math.radians(self.rotation))
        return (c * x - s * y + self.shift[0], s * x + c * y + self.shift[1])

    def points(self, many: Iterable[Point]) -> tuple[Point, ...]:
        return tuple(self.point(p) for p in many)

    def angle(self, degrees: float) -> float:
        return ((-degrees if self.mirror else degrees) + self.rotation) % 360.0


def moved(board: Board, move: Move) -> Board:
    """The board drawn elsewhere: every point moved, every pad turned with it. Layers stay where they are."""
    return replace(
        board,
        outline=move.points(board.outline),
        traces=[replace(t, points=move.points(t.points)) for t in board.traces],
        arcs=[
            replace(a, start=move.point(a.start), end=move.point(a.end), centre=move.point(a.centre), ccw=a.ccw != move.mirror)
            for a in board.arcs
        ],
        pads=[replace(p, at=move.point(p.at), rotation=move.angle(p.rotation)) for p in board.pads],
        vias=[replace(v, at=move.point(v.at)) for v in board.vias],
        holes=[replace(h, at=move.point(h.at), end=None if h.end is None else move.point(h.end)) for h in board.holes],
        planes=[
            replace(p, outline=move.points(p.outline), cuts=tuple(replace(c, points=move.points(c.points)) for c in p.cuts))
            for p in board.planes
        ],
        fills=[replace(f, points=move.points(f.points)) for f in board.fills],
        silk=[(side, width, move.points(points)) for side, width, points in board.silk],
    )


def moved_labels(labels: Iterable[Label], move: Move) -> list[Label]:
    """The labels of a board drawn elsewhere."""
    return [replace(label, at=move.point(label.at)) for label in labels]
