"""The copper of a board as polygons. In: nothing (types only); out: pieces per layer and barrels, in mm."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from impcheck.artwork.image import Bools, Floats, Image, Ints


@dataclass(frozen=True)
class LayerCopper:
    """One copper layer: n pieces, each one connected polygon that came from one dark object (a negative layer, or a dark shape cut
    apart by clear ones or holes, may give several pieces for one object). Pieces may overlap each other."""

    name: str
    index: int  # 0 = top
    image: Image
    shape: NDArray[np.object_]  # (n,) shapely Polygons, valid, exterior counter-clockwise, holes clockwise
    object: Ints  # (n,) index of the object in image; -1 for the background of a negative layer
    whole: Bools  # (n,) True where the piece is its object as drawn, nothing cut out of it
    width: Floats  # (n,) drawn width of a straight or arc stroke with a round aperture, mm; nan for all else


@dataclass(frozen=True)
class Barrels:
    """Plated holes: n barrels. A plated slot has start != end."""

    start: Floats  # (n, 2) mm
    end: Floats  # (n, 2)
    diameter: Floats  # (n,) drilled diameter, mm
    first: Ints  # (n,) topmost copper layer the barrel still reaches, after back-drilling
    last: Ints  # (n,) lowest copper layer
    top: Floats  # (n,) height where the barrel metal begins, mm (a back-drill may leave a piece beyond the last layer)
    bottom: Floats  # (n,) height where it ends
    file: tuple[str, ...]  # (n,)
    line: Ints  # (n,)


@dataclass(frozen=True)
class Copper:
    """All copper layers, top to bottom, and the barrels that join them."""

    layers: tuple[LayerCopper, ...]
    barrels: Barrels
    outline_box: tuple[float, float, float, float]  # min x, min y, max x, max y of the board outline (of all copper where there is none)
    mask_openings: tuple[NDArray[np.object_], NDArray[np.object_]]  # polygons open in the top and bottom mask; empty without a file
