"""A net walked from pin to pin. In: nothing (types only); out: runs, stations, vias, branches, in mm."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from enum import IntEnum

import numpy as np
from numpy.typing import NDArray

from impcheck.artwork.image import Floats, Ints
from impcheck.nets.nets import BoardPin, DeclaredNet


class Zone(IntEnum):
    """What a station's place belongs to; trace rules judge TRACE (and BEND, except for width) only."""

    TRACE = 0
    BEND = 1  # near a corner of the centreline, where a cut reads too wide
    JUNCTION = 2  # near a branch
    PAD = 3  # in or under a pad, or in the teardrop up to where the trace has its own width again
    VIA = 4  # in the pad or the antipad of a via of the own net


@dataclass(frozen=True)
class Intervals:
    """Copper met by the cuts of n stations on one layer: station i owns the entries first[i]:first[i+1], sorted by `low`, not overlapping
    within one label. t is the distance from the centreline along the cut, mm, positive to the left of the direction of travel."""

    first: Ints  # (n+1,)
    low: Floats  # (m,) cut off at -reach
    high: Floats  # (m,) cut off at +reach
    label: Ints  # (m,) connected component (nets.Nets)


@dataclass(frozen=True)
class Stations:
    """n stations of a run, in order; station i stands for the piece begin[i]..end[i] of the path and is measured at its middle. The
    pieces follow each other without gaps from the start of the run to its end."""

    begin: Floats  # (n,) mm along the path
    end: Floats  # (n,)
    at: Floats  # (n, 2) point on the centreline in the middle of the piece
    left_normal: Floats  # (n, 2) unit vector to the left of the direction of travel
    width: Floats  # (n,) width of the trace, mm (of the trace, not of the cut)
    centre: Floats  # (n,) t of the middle of the trace (about 0 where the centreline was drawn)
    zone: NDArray[np.uint8]  # (n,) Zone
    reach: float  # half-width of the cuts, mm
    cuts: Mapping[int, Intervals]  # copper layer index -> what the cuts meet there; own layer (own net included), and outwards above and
    # below. Up to the reference every station is cut; beyond it those without entries have return copper all along the trace's width (and
    # a quarter of the height beyond) on a nearer layer, so that what lies behind does not matter, or lie in the antipad of an own via
    above: Ints  # (n,) copper layer of the reference above, -1 none
    below: Ints  # (n,) copper layer of the reference below, -1 none
    coverage_above: Floats  # (n,) share of the trace's width that return copper on `above` covers
    coverage_below: Floats  # (n,)

    def __len__(self) -> int:
        return len(self.begin)


@dataclass(frozen=True)
class Run:
    """A stretch of one net on one layer between two changes of layer, pad or branch."""

    layer: int
    line: Floats  # (k, 2) centreline in the direction of travel
    along: tuple[float, float]  # path coordinate of both ends, mm from the start of the walk
    stations: Stations

    def points_at(self, along: Floats) -> list[tuple[float, float]]:
        """The points of the centreline at path coordinates (n,), mm."""
        reached = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(self.line, axis=0).T))])
        span = self.along[1] - self.along[0]
        at = (along - self.along[0]) * (float(reached[-1]) / span if span > 0 else 0.0)
        return list(zip(np.interp(at, reached, self.line[:, 0]).tolist(), np.interp(at, reached, self.line[:, 1]).tolist(), strict=True))

    def point_at(self, along: float) -> tuple[float, float]:
        """The point of the centreline at a path coordinate, mm."""
        return self.points_at(np.array([along]))[0]


@dataclass(frozen=True)
class Via:
    """A change of layer."""

    barrel: int  # index into Copper.barrels
    at: tuple[float, float]
    along: float  # path coordinate, mm
    entered: int  # copper layer the path comes from
    left: int  # copper layer it goes to


@dataclass(frozen=True)
class Branch:
    """Copper hanging off the path: it ends in no declared end."""

    layer: int
    along: float  # path coordinate where it leaves
    at: tuple[float, float]  # where it leaves
    tip: tuple[float, float]  # its farthest end
    length: float  # mm from the edge of the path's copper to the tip, along the branch (through its vias)
    pin: str  # pin at its end ("U7.3"), "" none


@dataclass(frozen=True)
class Bridge:
    """A part the signal runs through."""

    component: str
    along: tuple[float, float]


@dataclass(frozen=True)
class Walk:
    """One declared net as walked. The path is a tree from the first end to all others; each run is listed once, `along` counts from the
    start of the walk along the tree."""

    net: DeclaredNet
    status: str  # "walked", "open" (the ends are not joined), "unresolved" (no ends, or no centreline found)
    reason: str  # for the last two: one sentence
    runs: tuple[Run, ...]
    vias: tuple[Via, ...]
    branches: tuple[Branch, ...]
    bridges: tuple[Bridge, ...]
    begin: BoardPin | None
    ends: tuple[BoardPin, ...]  # those reached

    @property
    def length(self) -> float:
        """Length of all runs, mm."""
        return sum(run.along[1] - run.along[0] for run in self.runs)
