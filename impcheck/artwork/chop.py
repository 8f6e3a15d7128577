"""Routed arcs as chords. In: ends, centre and sweep of an arc in mm and radians; out: points (k, 2) along it, 1 um chord error."""

from __future__ import annotations

import numpy as np

from impcheck.artwork.image import Floats

CHORD_ERROR = 0.001  # mm, the largest distance between a chord and its arc


def chop(start: tuple[float, float], end: tuple[float, float], centre: tuple[float, float], sweep: float) -> Floats:
    """Points (k, 2) from `start` to `end`, both exactly included, on the circle around `centre` (mm).

    sweep: signed angle in radians, counter-clockwise positive. A radius that differs at the two ends changes evenly between them. Each
    chord is at most CHORD_ERROR from its arc (sagitta of a chord: r (1 - cos(step / 2)), exact).
    """
    first, last = np.subtract(start, centre), np.subtract(end, centre)
    radii = float(np.hypot(*first)), float(np.hypot(*last))
    radius = max(radii)
    step = 2 * np.arccos(1 - CHORD_ERROR / radius) if radius > CHORD_ERROR else np.pi / 2
    share = np.linspace(0.0, 1.0, max(int(np.ceil(abs(sweep) / step)), 1) + 1)
    angle = np.arctan2(first[1], first[0]) + sweep * share
    length = radii[0] + (radii[1] - radii[0]) * share
    points = np.asarray(centre) + length[:, None] * np.column_stack((np.cos(angle), np.sin(angle)))
    points[0], points[-1] = start, end
    return np.asarray(points, dtype=np.float64)
