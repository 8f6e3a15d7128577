"""The legs of one layer and what is known of them. In: nothing (types only); out: frames, references, heights and reaches, in mm."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from impcheck.artwork.image import Bools, Floats
from impcheck.path.edges import LocalEdges
from impcheck.path.frame import Frame


@dataclass(frozen=True)
class LegFacts:
    """What the walk knows of a leg beside its line."""

    group: int  # of declared nets
    stay: int  # legs of one walk that follow each other on one layer share a number
    open_ends: tuple[bool, bool]  # the walk begins or ends there
    barrels: tuple[int, int]  # barrel at each end, -1 none


@dataclass(frozen=True)
class Part:
    """The l legs of one layer."""

    layer: int
    frame: Frame
    facts: list[LegFacts]  # (l,)
    group: NDArray[np.int64]  # (l,)
    usual: Floats  # (l,) usual drawn width
    above: NDArray[np.int64]  # (l,) layer of the reference above, -1 none
    below: NDArray[np.int64]  # (l,)
    height: Floats  # (l,) over the nearest reference
    reach: Floats  # (l,) half-width of the cuts
    kept: dict[int, tuple[NDArray[np.int64], LocalEdges]] = field(default_factory=dict)  # layer -> windows and the edges near them

    def between(self, other: int) -> Bools:
        """(l,) True where `other` lies between the leg and its reference, the reference included (next to it where there is none)."""
        if other < self.layer:
            return (other >= self.above) & ((self.above >= 0) | (other == self.layer - 1))
        result: Bools = ((other <= self.below) & (self.below >= 0)) | ((self.below < 0) & (other == self.layer + 1))
        return result


@dataclass(frozen=True)
class Places:
    """The n places of the cuts of a part, in rising order."""

    leg: NDArray[np.int64]  # (n,)
    window: NDArray[np.int64]  # (n,)
    s: Floats  # (n,) in the window

    def __len__(self) -> int:
        return len(self.leg)
