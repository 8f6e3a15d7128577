"""Holes, netlist points and the whole artwork of a board as read. In: nothing (types only); out: typed arrays in mm."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from impcheck.artwork.board import Board
from impcheck.artwork.image import Bools, Floats, Image, Ints, Pin
from impcheck.artwork.stackup import Stackup
from impcheck.errors import Remark


@dataclass(frozen=True)
class DrillFile:
    """One Excellon, XNC or Gerber drill file as read: n holes. A slot has start != end (a routed path is several slots; arcs
    are chopped to 1 um chord error)."""

    file: str
    attributes: Mapping[str, tuple[str, ...]]  # ".FileFunction": ("Plated", "1", "4", "PTH"), also from ; #@! comments
    start: Floats  # (n, 2) mm
    end: Floats  # (n, 2)
    diameter: Floats  # (n,) mm, finished tool diameter
    plated: NDArray[np.int8]  # (n,) 1 plated, 0 not plated, -1 the file does not say
    line: Ints  # (n,)
    net: Ints  # (n,) index into nets (X2 attributes in comments), -1 none
    pin: Ints  # (n,) index into pins, -1 none
    nets: tuple[tuple[str, ...], ...]
    pins: tuple[Pin, ...]
    remarks: tuple[Remark, ...] = ()


@dataclass(frozen=True)
class Drill:
    """A drill file with its part in the board settled: which copper layers it passes and whether its holes are plated."""

    holes: DrillFile  # holes.plated holds no -1 any more
    first: int  # index of the topmost copper layer it passes, 0 = top
    last: int  # index of the lowest
    backdrill_from: int | None = None  # side it is drilled from: 0 or the last layer; a back-drill removes barrel, never adds one
    backdrill_keep: int | None = None  # the copper layer up to which the barrel is kept (that layer stays connected)


@dataclass(frozen=True)
class NetlistPoints:
    """An IPC-D-356(A) netlist: n test points."""

    file: str
    at: Floats  # (n, 2) mm
    net: tuple[str, ...]  # (n,) long names resolved; "N/C" points are left out
    component: tuple[str, ...]  # (n,) "VIA" for vias
    pin: tuple[str, ...]
    mid: Bools  # (n,) a midpoint, not an end of its net (the M flag)
    drill: Floats  # (n,) hole diameter mm, nan where there is none
    plated: Bools  # (n,)
    access: Ints  # (n,) 0 both sides / all layers, else the 1-based layer the feature is reached from
    first: Ints  # (n,) 1-based first layer of a blind or buried via, 0 unknown
    last: Ints  # (n,)
    size: Floats  # (n, 2) feature size x, y in mm, 0 where unknown
    line: Ints
    remarks: tuple[Remark, ...] = ()


@dataclass(frozen=True)
class Artwork:
    """Everything the fabrication files and the board file say, before any geometry."""

    board: Board
    stackup: Stackup  # its copper layers in the order of `layers`
    layers: tuple[Image, ...]  # copper, top to bottom
    mask_top: Image | None
    mask_bottom: Image | None
    outline: Image | None
    drills: tuple[Drill, ...]
    netlist: NetlistPoints | None
    remarks: tuple[Remark, ...]

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the copper layers, top to bottom."""
        return tuple(layer.name for layer in self.stackup.coppers)
