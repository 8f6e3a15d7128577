"""The copper of a board rebuilt. In: artwork; out: pieces per layer, barrels, mask openings, in mm."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import shapely
from shapely.geometry.base import BaseGeometry

from impcheck.artwork.image import Bools, Floats, Image, Ints, Kind
from impcheck.artwork.parts import Artwork
from impcheck.copper.apertures import aperture_shape
from impcheck.copper.barrels import barrels_of, holes_through
from impcheck.copper.copper import Copper, LayerCopper
from impcheck.copper.outline import outline_shape
from impcheck.copper.polarity import apply_polarity
from impcheck.copper.regions import region_shapes
from impcheck.copper.shapes import Shapes, solid_parts
from impcheck.copper.strokes import stroke_shapes

MARGIN = 1.0  # mm: how far a negative layer reaches beyond the other layers' copper where the board's outline is not known


def rebuild(artwork: Artwork, chord_error: float = 0.001) -> Copper:
    """The copper of a board: pieces per layer, barrels, and the openings of the solder mask.

    chord_error: mm, how far a chord may lie inside the arc it stands for. Holes without plating, and back-drills on the layers they clear,
    are cut out of the copper; plated holes are not, their barrel fills them.
    """
    outline = outline_shape(artwork.outline, chord_error)
    images = [
        image if item.negative is None or item.negative == image.negative else replace(image, negative=item.negative)
        for item, image in zip(artwork.stackup.coppers, artwork.layers, strict=True)
    ]
    drawn = [object_shapes(image, chord_error) for image in images]
    box = _bounds([shape for (shape, _), image in zip(drawn, images, strict=True) if not image.negative])
    if box is None:
        box = _bounds([shape for shape, _ in drawn]) or (0.0, 0.0, 0.0, 0.0)
    background = outline if outline is not None else shapely.box(box[0] - MARGIN, box[1] - MARGIN, box[2] + MARGIN, box[3] + MARGIN)
    layers = tuple(
        _layer((name, index), image, shapes, background, holes_through(artwork, index, chord_error))
        for index, (name, image, shapes) in enumerate(zip(artwork.names, images, drawn, strict=True))
    )
    openings = tuple(_openings(image, background, chord_error) for image in (artwork.mask_top, artwork.mask_bottom))
    return Copper(layers, barrels_of(artwork), box if outline is None else outline.bounds, (openings[0], openings[1]))


def rebuild_layer(
    name: str,
    index: int,
    image: Image,
    *,
    background: BaseGeometry | None = None,
    holes: Shapes | None = None,
    chord_error: float = 0.001,
) -> LayerCopper:
    """One layer alone. `background`: what a negative image is cut from (left out: a box around what is drawn); `holes`: (k,) polygons taken
    out at the end; chord_error: mm."""
    drawn = object_shapes(image, chord_error)
    if background is None:
        x0, y0, x1, y1 = _bounds([drawn[0]]) or (0.0, 0.0, 0.0, 0.0)
        background = shapely.box(x0 - MARGIN, y0 - MARGIN, x1 + MARGIN, y1 + MARGIN)
    return _layer((name, index), image, drawn, background, np.empty(0, object) if holes is None else holes)


def object_shapes(image: Image, chord_error: float) -> tuple[Shapes, Ints]:
    """(m,) polygons of all objects of an image in drawing order, whatever their polarity, and the object each belongs to. An object may
    give several, or none where its aperture has no size."""
    parts = (flash_shapes(image, chord_error), stroke_shapes(image, chord_error), region_shapes(image, chord_error))
    shape, owner = (np.concatenate(column) for column in zip(*parts, strict=True))
    order = np.argsort(owner, kind="stable")
    return shape[order], owner[order]


def flash_shapes(image: Image, chord_error: float) -> tuple[Shapes, Ints]:
    """(m,) polygons of all flashes and the object each belongs to: one template an aperture and transform, moved to every place."""
    flashes = np.flatnonzero(image.kind == Kind.FLASH)
    shapes, owners = [np.empty(0, object)], [np.empty(0, np.int32)]
    key = image.aperture[flashes].astype(np.int64) * len(image.transforms) + image.transform[flashes]
    for value in np.unique(key):
        mine = flashes[key == value]
        template = aperture_shape(image.apertures[image.aperture[mine[0]]], image.transforms[image.transform[mine[0]]], chord_error)
        for part in solid_parts(np.array([template], object))[0]:
            shapes.append(moved(part, image.start[mine]))
            owners.append(mine.astype(np.int32))
    return np.concatenate(shapes), np.concatenate(owners)


def moved(template: BaseGeometry, places: Floats) -> Shapes:
    """(n,) copies of one polygon at (n, 2) places."""
    count = len(places)
    _, coords, (ring_first, polygon_first) = shapely.to_ragged_array([template])
    coords = (coords[None, :, :2] + places[:, None, :]).reshape(-1, 2)
    length, rings = ring_first[-1], polygon_first[-1]
    ring_offsets = np.append((np.arange(count)[:, None] * length + ring_first[None, :-1]).ravel(), count * length)
    copies = shapely.from_ragged_array(shapely.GeometryType.POLYGON, coords, (ring_offsets, np.arange(count + 1) * rings))
    return np.asarray(copies, object)


def _layer(name: tuple[str, int], image: Image, drawn: tuple[Shapes, Ints], background: BaseGeometry, holes: Shapes) -> LayerCopper:
    shape, owner = drawn
    dark = image.dark[owner] != image.negative
    if image.negative:
        back = solid_parts(np.array([background], object))[0]
        shape, owner = np.concatenate([back, shape]), np.concatenate([np.full(len(back), -1, np.int32), owner])
        dark = np.concatenate([np.ones(len(back), bool), dark])
    shape, owner = np.concatenate([shape, holes]), np.concatenate([owner, np.full(len(holes), -1, np.int32)])
    dark = np.concatenate([dark, np.zeros(len(holes), bool)])
    pieces, owner, whole = apply_polarity(shape, owner, dark)
    return LayerCopper(*name, image, shapely.orient_polygons(pieces), owner.astype(np.int32), whole, _widths(image, owner, whole))


def _widths(image: Image, owner: Ints, whole: Bools) -> Floats:
    width = np.full(len(owner), np.nan)
    mine = np.flatnonzero(whole & (owner >= 0))
    mine = mine[np.isin(image.kind[owner[mine]], (Kind.DRAW, Kind.ARC))]
    if len(mine):
        drawn = np.array([a.parameters[0] if a.shape == "circle" and not a.hole else np.nan for a in image.apertures])
        scale = np.array([t.scale for t in image.transforms])
        width[mine] = drawn[image.aperture[owner[mine]]] * scale[image.transform[owner[mine]]]
    return width


def _openings(image: Image | None, background: BaseGeometry, chord_error: float) -> Shapes:
    """What is open in a solder mask. Mask files draw the openings, and say so as a negative file function; one that is negative by IP alone
    draws the mask."""
    if image is None:
        return np.empty(0, object)
    openings = image.negative and image.attributes.get(".FilePolarity", ())[:1] == ("Negative",)
    return rebuild_layer(
        "mask", -1, replace(image, negative=False) if openings else image, background=background, chord_error=chord_error
    ).shape


def _bounds(shapes: list[Shapes]) -> tuple[float, float, float, float] | None:
    everything = [shapely.total_bounds(shape) for shape in shapes if len(shape)]
    if not everything:
        return None
    boxes = np.array(everything)
    low, high = boxes[:, :2].min(axis=0), boxes[:, 2:].max(axis=0)
    return float(low[0]), float(low[1]), float(high[0]), float(high[1])
