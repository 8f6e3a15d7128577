"""Route mode of a drill file. In: moves of the tool in mm; out: slots handed to a function, arcs as chords of 1 um error."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from itertools import pairwise

from impcheck.artwork.chop import chop

Point = tuple[float, float]

_RADII = 0.05  # mm by which the radii at both ends of an arc, or a radius and half its chord, may differ (rounded coordinates)


class Route:
    """Whether the tool cuts while it moves: from M15 to M16 or M17; without either, every G01, G02 and G03 after a G00 cuts."""

    def __init__(self, add: Callable[[float, float, float, float, int], None], remark: Callable[[str, int], None]) -> None:
        self.add, self.remark = add, remark
        self.on = False
        self.motion = 0  # 0 G00, 1 straight, 2 clockwise, 3 counter-clockwise
        self.down = False
        self.raised = False  # by M16 or M17, and no G00 since
        self.used = False  # M15 was met
        self.cut = False  # since the tool went down

    def begin(self, motion: int, x: float, y: float, line: int) -> None:
        """G00 to G03."""
        if motion == 0:
            self.lift(x, y, line)
            self.raised = False
        self.on, self.motion = True, motion

    def end(self, x: float, y: float, line: int) -> None:
        """Back to drill mode, by G05 or another tool."""
        self.lift(x, y, line)
        self.on = self.raised = False

    def plunge(self) -> None:
        """M15, and M14 (at a set depth)."""
        self.on = self.down = self.used = True
        self.raised = self.cut = False
        if self.motion == 0:
            self.motion = 1

    def lift(self, x: float, y: float, line: int) -> None:
        """M16 or M17. A tool that went down and up in one place has made a hole."""
        if self.down:
            if not self.cut:
                self.add(x, y, x, y, line)
            self.down = False
            self.raised = True

    def move(self, start: Point, end: Point, place: Mapping[str, float], line: int) -> str | None:
        """A move in route mode; returns what is wrong with it, or None."""
        if self.motion == 0:
            return None
        if not self.down:
            if self.raised:
                self.remark("a move with the tool lifted (after M16 or M17) cuts nothing", line)
                return None
            if self.used:
                self.remark("a route without M15 was taken to cut", line)
        self.cut = True
        if self.motion == 1:
            self.add(*start, *end, line)
            return None
        arc = _by_radius(start, end, place["A"], self.motion == 2) if "A" in place else _by_centre(start, end, place, self.motion == 2)
        if isinstance(arc, str):
            return arc
        centre, sweep = arc
        for (x0, y0), (x1, y1) in pairwise(chop(start, end, centre, sweep).tolist()):
            self.add(x0, y0, x1, y1, line)
        return None


def _by_radius(start: Point, end: Point, radius: float, clockwise: bool) -> tuple[Point, float] | str:
    """Centre and sweep of an arc of at most half a turn (of more, for a negative radius)."""
    chord = math.dist(start, end)
    if chord == 0:
        return "an arc given by its radius ends where it starts"
    size = abs(radius)
    if chord / 2 - size > _RADII:
        return f"the ends of the arc are {chord:.4g} mm apart, more than twice its radius of {size:.4g} mm"
    size = max(size, chord / 2)
    away = math.sqrt(max(size**2 - (chord / 2) ** 2, 0.0))
    right = (end[1] - start[1]) / chord, (start[0] - end[0]) / chord  # unit vector to the right of the chord
    side = away if clockwise == (radius > 0) else -away
    centre = (start[0] + end[0]) / 2 + side * right[0], (start[1] + end[1]) / 2 + side * right[1]
    half = math.asin(min(chord / (2 * size), 1.0))
    sweep = 2 * half if radius > 0 else 2 * (math.pi - half)
    return centre, -sweep if clockwise else sweep


def _by_centre(start: Point, end: Point, place: Mapping[str, float], clockwise: bool) -> tuple[Point, float] | str:
    """Centre (I and J count from the start) and sweep; a full turn where the ends are one."""
    if not place.keys() & {"I", "J"}:
        return "an arc has neither a radius (A) nor a centre (I, J)"
    centre = start[0] + place.get("I", 0.0), start[1] + place.get("J", 0.0)
    first, last = math.dist(start, centre), math.dist(end, centre)
    if abs(first - last) > max(_RADII, 0.01 * first) or first == 0:
        return f"the arc's centre is {first:.4g} mm from its start and {last:.4g} mm from its end"
    sweep = math.atan2(end[1] - centre[1], end[0] - centre[0]) - math.atan2(start[1] - centre[1], start[0] - centre[0])
    sweep = (-sweep if clockwise else sweep) % (2 * math.pi)
    if start == end or sweep == 0:
        sweep = 2 * math.pi
    return centre, -sweep if clockwise else sweep
