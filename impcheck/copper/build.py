"""The copper of a board rebuilt. In: artwork; out: pieces per layer, barrels, mask openings, in mm."""

from __future__ import annotations

import numpy as np
import shapely
from numpy.typing import NDArray

from impcheck.artwork.image import Floats, Image, Ints, Kind
from impcheck.artwork.parts import Artwork
from impcheck.copper.apertures import aperture_shape
from impcheck.copper.barrels import barrels_of, holes_through
from impcheck.copper.copper import Copper, LayerCopper
from impcheck.copper.polarity import apply_polarity, cut
from impcheck.copper.regions import region_shapes
from impcheck.copper.strokes import stroke_shapes
from impcheck.copper.shapes import Shapes, arcs_to_points

MARGIN = 1.0  # mm, how far the background of a negative layer reaches beyond a board whose outline is not known
OUTLINE_GRID = 0.001  # mm, ends of outline strokes this near are one point


def object_shapes(image: Image, chord_error: float) -> tuple[Shapes, Ints]:
    """Polygons of all objects of an image in drawing order, whatever their polarity, and the object each belongs to (an object may give
    several, or none where its aperture is empty)."""
    shapes: list[Shapes] = []
    owners: list[NDArray[np.int32]] = []
    for part, owner in (flash_shapes(image, chord_error), stroke_shapes(image, chord_error), region_shapes(image, chord_error)):
        shapes.append(part)
        owners.append(owner)
    shape, owner = np.concatenate(shapes), np.concatenate(owners)
    order = np.argsort(owner, kind="stable")
    return shape[order], owner[order]


def flash_shapes(image: Image, chord_error: float) -> tuple[Shapes, Ints]:
    """Polygons of all flashes: one template an aperture and transform, moved to every place."""
    flashes = np.flatnonzero(image.kind == Kind.FLASH)
    shapes: list[Shapes] = []
    owners: list[NDArray[np.int32]] = []
    key = image.aperture[flashes].astype(np.int64) * (len(image.transforms) + 1) + image.transform[flashes]
    for value in np.unique(key):
        mine = flashes[key == value]
        first = mine[0]
        template = aperture_shape(image.apertures[image.aperture[first]], image.transforms[image.transform[first]], chord_error)
        for part in shapely.get_parts(template):
            if part.geom_type == "Polygon" and part.area > 0:
                shapes.append(moved(shapely.orient_polygons(part), image.start[mine]))
                owners.append(mine.astype(np.int32))
    return _joined(shapes, owners)


def moved(template: shapely.Polygon, places: Floats) -> Shapes:
    """Copies of one polygon at (n, 2) places."""
    count = len(places)
    _, coords, (ring_first, poly_first) = shapely.to_ragged_array([template])
    coords = (coords[None, :, :2] + places[:, None, :]).reshape(-1, 2)
    length, rings = ring_first[-1], poly_first[-1]
    ring_offsets = np.append((np.arange(count)[:, None] * length + ring_first[None, :-1]).ravel(), count * length)
    return shapely.from_ragged_array(shapely.GeometryType.POLYGON, coords, (ring_offsets, np.arange(count + 1) * rings))


def _joined(shapes: list[Shapes], owners: list[NDArray[np.int32]]) -> tuple[Shapes, Ints]:
    if not shapes:
        return np.empty(0, object), np.empty(0, np.int32)
    return np.concatenate(shapes), np.concatenate(owners)


def rebuild_layer(name: str, index: int, image: Image, background: shapely.Geometry | None = None, holes: Shapes | None = None, chord_error: float = 0.001) -> LayerCopper:
    """One layer. `background` is what a negative image is cut from; `holes` are taken out at the end."""
    shape, owner = object_shapes(image, chord_error)
    dark = image.dark[owner] if len(owner) else np.empty(0, bool)
    if image.negative:
        back = shapely.get_parts(background if background is not None else _around(shape))
        shape = np.concatenate([back, shape])
        owner = np.concatenate([np.full(len(back), -1, np.int32), owner])
        dark = np.concatenate([np.ones(len(back), bool), ~dark])
    pieces, owner, whole = apply_polarity(shape, owner, dark)
    if holes is not None and len(holes) and len(pieces):
        pieces, owner, whole = cut(pieces, owner, whole, holes)
    pieces = shapely.orient_polygons(pieces)
    width = np.full(len(pieces), np.nan)
    drawn = (owner >= 0) & whole
    mine = owner[drawn]
    stroke = (image.kind[mine] == Kind.DRAW) | (image.kind[mine] == Kind.ARC)
    round_width = np.array([a.parameters[0] if a.shape == "circle" and not a.hole else np.nan for a in image.apertures] or [np.nan])
    scale = np.array([t.scale for t in image.transforms])
    width[drawn] = np.where(stroke, round_width[image.aperture[mine]] * scale[image.transform[mine]], np.nan)
    return LayerCopper(name, index, image, pieces, owner, whole, width)


def _around(shape: Shapes) -> shapely.Geometry:
    x0, y0, x1, y1 = shapely.total_bounds(shape) if len(shape) else (0, 0, 0, 0)
    return shapely.box(x0 - MARGIN, y0 - MARGIN, x1 + MARGIN, y1 + MARGIN)


def rebuild(artwork: Artwork, chord_error: float = 0.001) -> Copper:
    """The copper of a board: pieces per layer to `chord_error` mm, barrels, and the openings of the solder mask."""
    outline = outline_shape(artwork.outline, chord_error)
    layers = tuple(
        rebuild_layer(name, index, image, outline, holes_through(artwork, index, chord_error), chord_error)
        for index, (name, image) in enumerate(zip(artwork.names, artwork.layers, strict=True))
    )
    boxes = [shapely.total_bounds(layer.shape) for layer in layers if len(layer.shape)]
    everything = np.array(boxes) if boxes else np.zeros((1, 4))
    limits = np.concatenate([everything[:, :2].min(axis=0), everything[:, 2:].max(axis=0)]) if outline is None else np.array(outline.bounds)
    openings = tuple(rebuild_layer("mask", -1, image, outline, None, chord_error).shape if image is not None else np.empty(0, object) for image in (artwork.mask_top, artwork.mask_bottom))
    x0, y0, x1, y1 = limits.tolist()
    return Copper(layers, barrels_of(artwork), (x0, y0, x1, y1), (openings[0], openings[1]))


def outline_shape(image: Image | None, chord_error: float) -> shapely.Geometry | None:
    """The area inside the board outline, from the centrelines of its strokes (cut-outs taken out) or its regions; None where nothing closes."""
    if image is None or len(image) == 0:
        return None
    strokes = (image.kind == Kind.DRAW) | (image.kind == Kind.ARC)
    lines = [np.array([a, b]) for a, b in zip(image.start[image.kind == Kind.DRAW], image.end[image.kind == Kind.DRAW], strict=True)]
    arcs = np.flatnonzero(image.kind == Kind.ARC)
    lines += arcs_to_points(image.start[arcs], image.centre[arcs], image.sweep[arcs], image.end[arcs], chord_error)
    faces: list[shapely.Geometry] = []
    if strokes.any():
        drawn = shapely.set_precision(shapely.union_all([shapely.linestrings(line) for line in lines if len(np.unique(line, axis=0)) > 1]), OUTLINE_GRID)
        faces = list(shapely.get_parts(shapely.polygonize([drawn])))
    if not faces:
        faces = list(region_shapes(image, chord_error)[0])
    if not faces:
        return None
    whole = shapely.union_all([shapely.polygons(shapely.get_exterior_ring(face)) for face in faces])
    inner = [face for face in faces if not shapely.get_exterior_ring(face).intersects(shapely.boundary(whole))]
    return shapely.difference(whole, shapely.union_all(inner)) if inner else whole
