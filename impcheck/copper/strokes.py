"""Draws and arcs as polygons. In: an image; out: the copper each stroke leaves, mm."""

from __future__ import annotations

import math

import numpy as np
import shapely
from shapely.geometry.base import BaseGeometry

from impcheck.artwork.image import Floats, Image, Ints, Kind
from impcheck.copper.apertures import aperture_shape
from impcheck.copper.shapes import Rows, Shapes, arc_points, chords, polygons, radius_of, solid_parts, stadiums


def stroke_shapes(image: Image, chord_error: float) -> tuple[Shapes, Ints]:
    """(m,) polygons of all strokes and the object each belongs to."""
    strokes = np.flatnonzero((image.kind == Kind.DRAW) | (image.kind == Kind.ARC))
    shapes, owners = [np.empty(0, object)], [np.empty(0, np.int32)]
    key = image.aperture[strokes].astype(np.int64) * len(image.transforms) + image.transform[strokes]
    for value in np.unique(key):
        mine = strokes[key == value]
        aperture, transform = image.apertures[image.aperture[mine[0]]], image.transforms[image.transform[mine[0]]]
        draws, arcs = mine[image.kind[mine] == Kind.DRAW], mine[image.kind[mine] == Kind.ARC]
        if aperture.shape == "circle" and not aperture.hole:
            width = aperture.parameters[0] * transform.scale
            if width <= 0:  # an aperture without size leaves no copper, as the specification says
                continue
            shapes.append(stadiums(image.start[draws], image.end[draws], width, chord_error))
            owners.append(draws.astype(np.int32))
            shape, owner = _round_arcs(image, arcs, width, chord_error)
        else:
            template = aperture_shape(aperture, transform, chord_error)
            if template.area <= 0:
                continue
            shape, part_of = solid_parts(swept(template, image.start[draws], image.end[draws]))
            shapes.append(shape)
            owners.append(draws[part_of].astype(np.int32))
            shape, owner = _swept_arcs(image, arcs, template, chord_error)
        shapes.append(shape)
        owners.append(owner)
    return np.concatenate(shapes), np.concatenate(owners)


def _round_arcs(image: Image, arcs: Rows, width: float, chord_error: float) -> tuple[Shapes, Ints]:
    """Arc strokes of a round aperture: the band between two arcs with round caps; the union of its chords where the band meets itself."""
    start, end, centre, sweep = image.start[arcs], image.end[arcs], image.centre[arcs], image.sweep[arcs]
    radius = radius_of(start, centre, end)
    inner = np.minimum(np.hypot(*(start - centre).T), np.hypot(*(end - centre).T)) - width / 2
    with np.errstate(invalid="ignore", divide="ignore"):
        caps = 2 * np.arcsin(np.clip(width / 2 / radius, 0, 1))
    simple = (inner > 0.01 * width) & (np.abs(sweep) + caps < 2 * math.pi - 1e-3)
    count = chords(radius + width / 2, sweep, chord_error)
    half = int(chords(np.array([width / 2]), np.array([math.pi]), chord_error)[0])
    shapes, owners = [np.empty(0, object)], [np.empty(0, np.int64)]
    for number in np.unique(count[simple]):
        mine = np.flatnonzero(simple & (count == number))
        shapes.append(_bands(start[mine], centre[mine], sweep[mine], end[mine], width, (int(number), half)))
        owners.append(arcs[mine])
    for index in np.flatnonzero(~simple):
        one = slice(index, index + 1)
        points, _ = arc_points(start[one], centre[one], sweep[one], end[one], np.maximum(count[one], 1))
        pieces = shapely.get_parts(shapely.union_all(stadiums(points[:-1], points[1:], width, chord_error)))
        shapes.append(pieces)
        owners.append(np.full(len(pieces), arcs[index]))
    return np.concatenate(shapes), np.concatenate(owners).astype(np.int32)


def _bands(start: Floats, centre: Floats, sweep: Floats, end: Floats, width: float, numbers: tuple[int, int]) -> Shapes:
    """(n,) bands along arcs: outer side forwards, cap at the end, inner side backwards, cap at the start. `numbers`: chords of a side and
    of a cap."""
    along, half = numbers
    spoke = start - centre
    r0, r1 = np.hypot(*spoke.T)[:, None], np.hypot(*(end - centre).T)[:, None]
    phi0 = np.arctan2(spoke[:, 1], spoke[:, 0])[:, None]
    t = np.linspace(0, 1, along + 1)[None, :]
    phi, radius = phi0 + sweep[:, None] * t, r0 + (r1 - r0) * t
    turn = np.sign(sweep)[:, None] * np.linspace(0, math.pi, half + 1)[None, 1:-1]

    def points(angle: Floats, distance: Floats) -> Floats:
        return np.stack([distance * np.cos(angle), distance * np.sin(angle)], axis=-1)

    outer, inner = points(phi, radius + width / 2), points(phi, radius - width / 2)[:, ::-1]
    last = points(phi[:, -1:], radius[:, -1:]) + points(phi[:, -1:] + turn, np.full_like(turn, width / 2))
    first = points(phi[:, :1], radius[:, :1]) + points(phi[:, :1] + math.pi + turn, np.full_like(turn, width / 2))
    ring = np.concatenate([outer, last, inner, first, outer[:, :1]], axis=1) + centre[:, None, :]
    return polygons(ring)


def _swept_arcs(image: Image, arcs: Rows, template: BaseGeometry, chord_error: float) -> tuple[Shapes, Ints]:
    """Arc strokes of any other aperture: the union of the copper along its chords."""
    shapes, owners = [np.empty(0, object)], [np.empty(0, np.int32)]
    for arc in arcs.tolist():
        one = slice(arc, arc + 1)
        start, end, centre = image.start[one], image.end[one], image.centre[one]
        count = chords(radius_of(start, centre, end), image.sweep[one], chord_error)
        points, _ = arc_points(start, centre, image.sweep[one], end, count)
        pieces, _ = solid_parts(np.array([shapely.union_all(swept(template, points[:-1], points[1:]))], object))
        shapes.append(pieces)
        owners.append(np.full(len(pieces), arc, np.int32))
    return np.concatenate(shapes), np.concatenate(owners)


def swept(template: BaseGeometry, start: Floats, end: Floats) -> Shapes:
    """(n,) copper left by an aperture of any shape drawn from start to end, (n, 2) mm.

    The copper of a convex shape is the hull of its copies at both ends, exactly; any other shape is the union over its triangles.
    """
    if len(start) == 0:
        return np.empty(0, object)
    convex = template.geom_type == "Polygon" and template.convex_hull.area - template.area < 1e-9 * template.area
    parts = [template] if convex else [t for t in shapely.get_parts(shapely.constrained_delaunay_triangles(template)) if t.area > 0]
    found = []
    for part in parts:
        points = shapely.get_coordinates(part)
        both = np.concatenate([points[None] + start[:, None, :], points[None] + end[:, None, :]], axis=1)
        clouds = shapely.multipoints(both.reshape(-1, 2), indices=np.repeat(np.arange(len(start)), both.shape[1]))
        found.append(np.asarray(shapely.convex_hull(clouds), object))
    return found[0] if len(found) == 1 else np.asarray(shapely.union_all(np.stack(found), axis=0), object)
