"""Barrels beyond the layers a signal uses. In: a via, barrels, a stackup; out: lengths in mm."""

from __future__ import annotations

from impcheck.artwork.parts import Artwork
from impcheck.artwork.stackup import Dielectric, Stackup
from impcheck.copper.copper import Copper
from impcheck.path.walk import Via


def stub_lengths(artwork: Artwork, copper: Copper, via: Via) -> tuple[float, float]:
    """Length of barrel above the upper and below the lower of the two layers a via joins, mm; never negative."""
    upper, lower = sorted((via.entered, via.left))
    heights = artwork.stackup.heights
    barrels = copper.barrels
    above = float(barrels.top[via.barrel]) - heights[upper][1]
    below = heights[lower][0] - float(barrels.bottom[via.barrel])
    return max(above, 0.0), max(below, 0.0)


def mean_permittivity(stackup: Stackup) -> float:
    """Permittivity of the board's dielectrics, weighted by thickness."""
    parts = [item for item in stackup.items if isinstance(item, Dielectric)]
    return sum(item.er * item.thickness for item in parts) / sum(item.thickness for item in parts)
