"""Graphical objects as columns. In: arrays in mm; out: selections, joins and moved copies of them, arrays again."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

from impcheck.artwork.image import Bools, Floats, Ints, Transform

Indices = NDArray[np.int64]


@dataclass(frozen=True)
class Objects:
    """n objects in drawing order, as in `Image`, whose names the columns have; c contours of s segments in all."""

    offset: Indices  # (n,) byte offset of each in the file
    kind: NDArray[np.uint8]
    dark: Bools
    aperture: Ints  # -1 for regions, -2 and below for block apertures
    transform: Ints
    start: Floats
    end: Floats
    centre: Floats
    sweep: Floats
    net: Ints
    pin: Ints
    component: Ints
    contour_object: Ints  # (c,) rising
    contour_size: Indices  # (c,) number of segments
    segment_start: Floats  # (s, 2)
    segment_centre: Floats  # (s, 2)
    segment_sweep: Floats  # (s,)

    def __len__(self) -> int:
        return len(self.kind)


_PER_CONTOUR = ("contour_object", "contour_size")
_PER_SEGMENT = ("segment_start", "segment_centre", "segment_sweep")
_PER_OBJECT = tuple(f.name for f in fields(Objects) if f.name not in (*_PER_CONTOUR, *_PER_SEGMENT))


def ranges(first: Indices, size: Indices) -> Indices:
    """The indices first[0], first[0] + 1, ... (size[0] of them), then those of the next range, as one array."""
    behind = np.cumsum(size)
    return np.repeat(first - (behind - size), size) + np.arange(behind[-1] if len(behind) else 0)


def take(objects: Objects, index: Indices) -> Objects:
    """The objects of these indices (m,), in this order, any of them several times."""
    columns = {name: getattr(objects, name)[index] for name in _PER_OBJECT}
    count = np.bincount(objects.contour_object, minlength=len(objects)).astype(np.int64)
    mine = count[index]
    contour = ranges((np.cumsum(count) - count)[index], mine)
    size = objects.contour_size[contour]
    segment = ranges((np.cumsum(objects.contour_size) - objects.contour_size)[contour], size)
    columns |= {name: getattr(objects, name)[segment] for name in _PER_SEGMENT}
    columns["contour_object"] = np.repeat(np.arange(len(index), dtype=np.int32), mine)
    columns["contour_size"] = size
    return Objects(**columns)


def join(parts: Sequence[Objects]) -> Objects:
    """All parts one after the other."""
    if len(parts) == 1:
        return parts[0]
    columns = {f.name: np.concatenate([getattr(part, f.name) for part in parts]) for f in fields(Objects)}
    shift = np.cumsum([0, *(len(part) for part in parts[:-1])])
    columns["contour_object"] = np.concatenate(
        [part.contour_object + np.int32(first) for part, first in zip(parts, shift, strict=True)]
    ).astype(np.int32)
    return Objects(**columns)


def segments_of(objects: Objects) -> Indices:
    """The object (s,) each segment belongs to."""
    return np.repeat(objects.contour_object, objects.contour_size).astype(np.int64)


def shifted(objects: Objects, by: Floats) -> Objects:
    """The objects moved by (n, 2) mm, each by its own."""
    of_segment = by[segments_of(objects)]
    return replaced(
        objects,
        start=objects.start + by,
        end=objects.end + by,
        centre=objects.centre + by,
        segment_start=objects.segment_start + of_segment,
        segment_centre=objects.segment_centre + of_segment,
    )


def mapped(objects: Objects, matrix: Floats) -> Objects:
    """The places of all objects multiplied by a (2, 2) matrix of equal scale in all directions; apertures stay as they are."""
    turns = np.sign(np.linalg.det(matrix))
    return replaced(
        objects,
        start=objects.start @ matrix.T,
        end=objects.end @ matrix.T,
        centre=objects.centre @ matrix.T,
        sweep=objects.sweep * turns,
        segment_start=objects.segment_start @ matrix.T,
        segment_centre=objects.segment_centre @ matrix.T,
        segment_sweep=objects.segment_sweep * turns,
    )


def replaced(objects: Objects, **columns: NDArray[np.generic]) -> Objects:
    """The objects with some columns replaced."""
    return Objects(**({f.name: getattr(objects, f.name) for f in fields(Objects)} | columns))


def matrix_of(transform: Transform) -> Floats:
    """The (2, 2) matrix of a transform: mirrored first, then rotated, then scaled. Quarter turns are exact."""
    quarter, rest = divmod(transform.rotation % 360.0, 90.0)
    if rest == 0:
        cosine, sine = ((1.0, 0.0), (0.0, 1.0), (-1.0, 0.0), (0.0, -1.0))[int(quarter) % 4]
    else:
        cosine, sine = np.cos(np.radians(transform.rotation)), np.sin(np.radians(transform.rotation))
    mirror = np.diag([-1.0 if transform.mirror_x else 1.0, -1.0 if transform.mirror_y else 1.0])
    return np.asarray(transform.scale * np.array([[cosine, -sine], [sine, cosine]]) @ mirror, np.float64)


def composed(outer: Transform, inner: Transform) -> Transform:
    """The transform that does `inner` first, then `outer`."""
    if outer == Transform():
        return inner
    if inner == Transform():
        return outer

    def reduced(transform: Transform) -> tuple[bool, float]:
        # Mirroring y is mirroring x and half a turn.
        return transform.mirror_x != transform.mirror_y, transform.rotation + (180.0 if transform.mirror_y else 0.0)

    (outer_mirror, outer_rotation), (inner_mirror, inner_rotation) = reduced(outer), reduced(inner)
    rotation = outer_rotation + (-inner_rotation if outer_mirror else inner_rotation)
    return Transform(outer_mirror != inner_mirror, False, rotation % 360.0, outer.scale * inner.scale)
