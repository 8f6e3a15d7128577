"""The boundaries of a section. In: a Section; out: straight segments, each with what lies to its left and right, in mm."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely.geometry.base import BaseGeometry

from impcheck.fields.section import Conductor, Section, SectionError

Floats = NDArray[np.float64]
GRID = 1e-7  # mm, coordinates nearer than this are one
ASIDE = 2e-6  # mm, how far beside a segment it is asked what lies there
FAR = 20.0  # heights of the section beyond its copper where open interfaces end
AIR = 1.0


@dataclass(frozen=True)
class Boundary:
    """m segments. `conductor` is the index of the conductor (0.. signals and floating ones, in order; -1: 0 V), -2 for an interface between
    dielectrics. `left` and `right` are permittivities, nan inside metal; a strip without thickness has both."""

    start: Floats  # (m, 2)
    end: Floats  # (m, 2)
    left: Floats  # (m,)
    right: Floats  # (m,)
    conductor: NDArray[np.int32]  # (m,)
    image: bool  # a perfectly conducting plane at y = 0 stands below
    names: tuple[str, ...]  # of the conductors counted, in order
    floating: NDArray[np.bool_]  # (len(names),)


@dataclass(frozen=True)
class _Bodies:
    """Copper united by what it is."""

    names: list[str]
    floating: list[bool]
    shapes: list[BaseGeometry]  # (len(names) + 1,), the last one at 0 V
    strips: list[tuple[int, tuple[tuple[float, float], ...]]]


def boundary_of(section: Section, permittivity: bool = True) -> Boundary:
    """Cuts a section into its boundaries. Raises SectionError where the section has no sensible solution."""
    section, image = _turned(section)
    bodies = _bodies(section, image)
    everything = shapely.union_all(bodies.shapes)
    corners = np.concatenate([np.array(c.outline) for c in section.conductors])
    top_plane = [y for y in section.planes if y > corners[:, 1].max()]
    height = float(
        max([corners[:, 1].max(), *(slab.top for slab in section.slabs), *top_plane])
        - (0.0 if image else min([corners[:, 1].min(), *(slab.bottom for slab in section.slabs)]))
    )
    low, high = corners[:, 0].min() - FAR * height, corners[:, 0].max() + FAR * height
    lines: list[BaseGeometry] = [shape.boundary for shape in bodies.shapes if not shape.is_empty]
    strips = [(index, shapely.LineString(points)) for index, points in bodies.strips]
    if top_plane:
        strips.append((-1, shapely.LineString([(low, top_plane[0]), (high, top_plane[0])])))
    lines += [line for _, line in strips]
    coats = _coats(section, everything, low, high)
    for _, coat in coats:
        lines.append(coat.boundary)
    levels = sorted({slab.bottom for slab in section.slabs} | {slab.top for slab in section.slabs})
    lines += [shapely.LineString([(low, y), (high, y)]) for y in levels if not (image and y <= GRID)]
    noded = shapely.get_parts(shapely.unary_union(shapely.set_precision(np.array(lines, object), GRID), grid_size=GRID))
    start, end = _segments(noded)
    if image:
        keep = (start[:, 1] > GRID) | (end[:, 1] > GRID)
        start, end = start[keep], end[keep]
    middle, normal = (start + end) / 2, np.column_stack([start[:, 1] - end[:, 1], end[:, 0] - start[:, 0]])
    normal /= np.hypot(*normal.T)[:, None]
    left = _permittivity(middle + ASIDE * normal, section, bodies.shapes, coats)
    right = _permittivity(middle - ASIDE * normal, section, bodies.shapes, coats)
    conductor = np.full(len(start), -2, np.int32)
    for index, shape in enumerate(bodies.shapes):
        if shape.is_empty:
            continue
        shapely.prepare(shape)
        inside = shapely.contains_xy(shape, *(middle + ASIDE * normal).T) | shapely.contains_xy(shape, *(middle - ASIDE * normal).T)
        conductor[inside] = index if index < len(bodies.names) else -1
    for index, line in strips:
        on = shapely.distance(line, shapely.points(middle)) < ASIDE
        conductor[on & ~(np.isnan(left) | np.isnan(right))] = index
    buried = np.isnan(left) & np.isnan(right)
    same = (conductor == -2) & (left == right)
    edge = (conductor == -2) & ((middle[:, 0] < low + GRID) | (middle[:, 0] > high - GRID))  # the sides of a coat where it is cut off
    use = ~(buried | same | edge)
    start, end, left, right, conductor = _straightened(start[use], end[use], left[use], right[use], conductor[use])
    return Boundary(start, end, left, right, conductor, image, tuple(bodies.names), np.array(bodies.floating, bool))


def _turned(section: Section) -> tuple[Section, bool]:
    """The section with its plane, if it has one on one side, at y = 0 below everything."""
    heights = [y for conductor in section.conductors for _, y in conductor.outline]
    if not heights:
        raise SectionError("the section has no conductor")
    below = [y for y in section.planes if y < min(heights) + GRID]
    above = [y for y in section.planes if y > max(heights) - GRID]
    if len(below) + len(above) < len(section.planes):
        raise SectionError("a plane without end runs through a conductor")
    if below:
        return _moved(section, max(below), 1.0, min(above, default=None)), True
    if above:
        return _moved(section, min(above), -1.0, None), True
    if all(conductor.role != "return" for conductor in section.conductors) and sum(c.role == "signal" for c in section.conductors) < 2:
        raise SectionError("nothing carries the return current: there is no plane and no return conductor")
    return section, False


def _moved(section: Section, origin: float, sign: float, top: float | None) -> Section:
    from impcheck.artwork.stackup import Slab

    def y(value: float) -> float:
        return sign * (value - origin)

    slabs = tuple(Slab(min(y(s.bottom), y(s.top)), max(y(s.bottom), y(s.top)), s.er, s.loss_tangent, s.name) for s in section.slabs)
    conductors = tuple(Conductor(c.name, c.role, tuple((px, y(py)) for px, py in c.outline)) for c in section.conductors)
    coats = (section.coating, section.coating_below)
    upper, lower = coats if sign > 0 else coats[::-1]
    planes = (0.0,) if top is None else (0.0, y(top))
    return Section(tuple(s for s in slabs if s.top > GRID), conductors, planes, upper, lower)


def _bodies(section: Section, image: bool) -> _Bodies:
    names: list[str] = []
    floating: list[bool] = []
    groups: list[list[BaseGeometry]] = []
    grounded: list[BaseGeometry] = []
    strips: list[tuple[int, tuple[tuple[float, float], ...]]] = []
    for conductor in section.conductors:
        if conductor.role == "return":
            index = -1
        else:
            if conductor.name not in names:
                names.append(conductor.name)
                floating.append(conductor.role == "floating")
                groups.append([])
            index = names.index(conductor.name)
        if len(conductor.outline) == 2:
            strips.append((index, conductor.outline))
            continue
        shape = shapely.Polygon(conductor.outline)
        if not shape.is_valid or shape.area <= 0:
            raise SectionError(f"conductor '{conductor.name}' crosses itself or has no area")
        (grounded if index < 0 else groups[index]).append(shape)
    shapes = [shapely.set_precision(shapely.union_all(group), GRID) for group in (*groups, grounded)]
    if not any(not f for f in floating):
        raise SectionError("the section has no signal")
    for index, name in enumerate(names):
        for other in range(index + 1, len(shapes)):
            if not shapes[index].is_empty and not shapes[other].is_empty and shapely.distance(shapes[index], shapes[other]) <= GRID:
                what = f"conductor '{names[other]}'" if other < len(names) else "copper at 0 V"
                raise SectionError(f"conductor '{name}' touches {what}")
        if image and not shapes[index].is_empty and shapes[index].bounds[1] <= GRID:
            raise SectionError(f"conductor '{name}' touches the plane")
    return _Bodies(names, floating, shapes, strips)


def _coats(section: Section, copper: BaseGeometry, low: float, high: float) -> list[tuple[float, BaseGeometry]]:
    """(er, area) of the solder mask on either side: a band over the laminate and the same thickness around the copper that lies on it."""
    found: list[tuple[float, BaseGeometry]] = []
    if not section.slabs:
        return found
    surface_up, surface_down = max(s.top for s in section.slabs), min(s.bottom for s in section.slabs)
    for coating, surface, sign in ((section.coating, surface_up, 1.0), (section.coating_below, surface_down, -1.0)):
        if coating is None or coating.thickness <= 0:
            continue
        band = shapely.box(low, min(surface, surface + sign * coating.thickness), high, max(surface, surface + sign * coating.thickness))
        outside = shapely.box(low, surface, high, surface + 1e3) if sign > 0 else shapely.box(low, surface - 1e3, high, surface)
        over = shapely.intersection(copper, outside)
        around = shapely.buffer(over, coating.thickness, join_style="mitre") if not over.is_empty else over
        area = shapely.difference(shapely.intersection(shapely.union(band, around), outside), copper)
        found.append((coating.er, shapely.set_precision(area, GRID)))
    return found


def _segments(lines: NDArray[np.object_]) -> tuple[Floats, Floats]:
    points, which = shapely.get_coordinates(lines, return_index=True)
    same = which[1:] == which[:-1]
    start, end = points[:-1][same], points[1:][same]
    real = np.hypot(*(end - start).T) > GRID / 2
    return start[real], end[real]


def _permittivity(points: Floats, section: Section, metal: list[BaseGeometry], coats: list[tuple[float, BaseGeometry]]) -> Floats:
    er = np.full(len(points), AIR)
    for slab in section.slabs:
        er[(points[:, 1] > slab.bottom) & (points[:, 1] < slab.top)] = slab.er
    for value, area in coats:
        shapely.prepare(area)
        er[shapely.contains_xy(area, *points.T)] = value
    for shape in metal:
        if not shape.is_empty:
            shapely.prepare(shape)
            er[shapely.contains_xy(shape, *points.T)] = np.nan
    return er


def _straightened(
    start: Floats, end: Floats, left: Floats, right: Floats, conductor: NDArray[np.int32]
) -> tuple[Floats, Floats, Floats, Floats, NDArray[np.int32]]:
    """Neighbours that continue each other straight, with the same on both sides, joined: what stays at an end is a true corner."""
    segments = [
        (tuple(np.round(a / GRID).astype(np.int64)), tuple(np.round(b / GRID).astype(np.int64))) for a, b in zip(start, end, strict=True)
    ]
    kinds = [
        (None if np.isnan(le) else float(le), None if np.isnan(r) else float(r), int(c))
        for le, r, c in zip(left, right, conductor, strict=True)
    ]
    at: dict[tuple[int, ...], list[int]] = {}
    for index, ends in enumerate(segments):
        for vertex in ends:
            at.setdefault(vertex, []).append(index)
    alive = [True] * len(segments)
    for vertex, meeting in at.items():
        members = [m for m in meeting if alive[m]]
        if len(members) != 2 or members[0] == members[1]:
            continue
        a, b = members
        (a0, a1), (b0, b1) = segments[a], segments[b]
        kind_b = kinds[b]
        if (a1 == vertex) == (b1 == vertex):  # one runs the other way round
            b0, b1 = b1, b0
            kind_b = (kind_b[1], kind_b[0], kind_b[2])
        if kinds[a] != kind_b:
            continue
        first, last = (a0, b1) if a1 == vertex else (b0, a1)
        u, v = np.subtract(vertex, first).astype(float), np.subtract(last, vertex).astype(float)
        if abs(u[0] * v[1] - u[1] * v[0]) > 1.5 * np.hypot(*(u + v)) or u @ v <= 0:
            continue
        segments[a] = (first, last)
        alive[b] = False
        for other in (b0, b1):
            if other != vertex:
                at[other] = [a if m == b else m for m in at[other]]
    keep = np.array(alive, bool)
    ends_of = np.array([segments[i] for i in np.flatnonzero(keep)], float) * GRID
    return ends_of[:, 0], ends_of[:, 1], left[keep], right[keep], conductor[keep]
