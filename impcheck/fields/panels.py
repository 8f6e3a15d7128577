"""Panels on the boundaries. In: a Boundary; out: source panels, unknowns and collocation points, in mm.

Every end of a segment is a corner where the charge density may be singular; the panel there carries s = g / (2 L v) at the distance L
v^2 from the corner, g a polynomial of v, evaluated on sub-panels and condensed to its q unknowns by a constant matrix that keeps the
Legendre moments.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from itertools import pairwise

import numpy as np
from numpy.polynomial import legendre
from numpy.typing import NDArray

from impcheck.fields.boundary import Boundary
from impcheck.fields.kernels import gauss

Floats = NDArray[np.float64]
SUBPANELS = 4
TIE = 1e-6  # relative: sizes this near are equal, so that round-off decides nothing
SMALLEST = 1e-6  # mm, no panel is cut shorter
RATIO = 5.1  # of neighbouring sub-panels: their ends never fall on a collocation point


@dataclass(frozen=True)
class Grading:
    """How fine the panels are."""

    corner: float = 0.4  # end panel over the distance to the nearest other corner
    growth: float = 2.5  # of panels away from a corner
    near: float = 1.3  # longest panel over its distance to any corner of another segment


@dataclass(frozen=True)
class Mesh:
    """Source panels first the plain ones, then the sub-panels of the corner panels; unknowns in the same order, q a panel."""

    middle: NDArray[np.complex128]  # (s,) of the source panels
    arm: NDArray[np.complex128]  # (s,) half a panel as a vector
    plain: int  # number of plain panels
    corner: int  # number of corner panels; s = plain + SUBPANELS * corner
    point: NDArray[np.complex128]  # (n,) collocation points
    density: Floats  # (n,) density at the point for a unit unknown
    weight: Floats  # (n,) charge for a unit unknown
    segment: NDArray[np.int64]  # (n,) segment of each unknown
    normal: NDArray[np.complex128]  # (n,) unit normal to the left


@lru_cache
def condensation(q: int) -> tuple[Floats, Floats, Floats]:
    """Break points of the sub-panels on [0, 1], the (SUBPANELS * q, q) matrix from unknowns to nodal densities times the panel's
    length, and the unknowns' places v."""
    nodes, _, _ = gauss(q)
    v = (nodes + 1) / 2
    breaks = np.array([0.0, *(RATIO ** -np.arange(SUBPANELS - 1, -1, -1.0))])
    lagrange = np.linalg.inv(np.vander(v, q, increasing=True))  # (power, node)
    fine_nodes, fine_weights = legendre.leggauss(24)
    rows = []
    for a, b in pairwise(breaks.tolist()):
        v0, v1 = np.sqrt(a), np.sqrt(b)
        vv = v0 + (v1 - v0) * (fine_nodes + 1) / 2
        t = (2 * vv**2 - a - b) / (b - a)
        g = np.vander(vv, q, increasing=True) @ lagrange
        moments = (legendre.legvander(t, q - 1) * (fine_weights * (v1 - v0) / 2)[:, None]).T @ g  # int P_n(t) g dv
        series = moments * (np.arange(q)[:, None] + 0.5) * 2.0 / (b - a)  # density = series / panel length
        rows.append(legendre.legvander(nodes, q - 1) @ series)
    return breaks, np.concatenate(rows), v


def cuts_of(boundary: Boundary, grading: Grading) -> list[list[float]]:
    """Distances along every segment, from its start, where its panels begin and end."""
    start = boundary.start[:, 0] + 1j * boundary.start[:, 1]
    end = boundary.end[:, 0] + 1j * boundary.end[:, 1]
    corners = np.unique(np.round(np.concatenate([start, end]), 9))
    seen = np.concatenate([corners, np.conj(corners)]) if boundary.image else corners
    return [_cuts(a, b, seen, grading) for a, b in zip(start.tolist(), end.tolist(), strict=True)]


def mesh_of(boundary: Boundary, q: int, cuts: list[list[float]]) -> Mesh:
    """Panels with q nodes on every segment, cut where `cuts_of` says."""
    nodes, weights, _ = gauss(q)
    breaks, _, v = condensation(q)
    start = boundary.start[:, 0] + 1j * boundary.start[:, 1]
    end = boundary.end[:, 0] + 1j * boundary.end[:, 1]
    plain: list[tuple[complex, complex, int]] = []
    ends: list[tuple[complex, complex, int]] = []  # corner, far end, segment
    for index, (a, b) in enumerate(zip(start.tolist(), end.tolist(), strict=True)):
        direction = (b - a) / abs(b - a)
        points = [a + direction * c for c in cuts[index]]
        ends.append((points[0], points[1], index))
        ends.append((points[-1], points[-2], index))
        plain.extend((p, r, index) for p, r in pairwise(points[1:-1]))
    p0, p1, ps = (
        (np.array(x) for x in zip(*plain, strict=True)) if plain else (np.empty(0, complex), np.empty(0, complex), np.empty(0, int))
    )
    c0, c1, cs = (np.array(x) for x in zip(*ends, strict=True))
    sub0 = c0[:, None] + (c1 - c0)[:, None] * breaks[None, :-1]
    sub1 = c0[:, None] + (c1 - c0)[:, None] * breaks[None, 1:]
    middle = np.concatenate([(p0 + p1) / 2, ((sub0 + sub1) / 2).ravel()])
    arm = np.concatenate([(p1 - p0) / 2, ((sub1 - sub0) / 2).ravel()])
    plain_points = ((p0 + p1) / 2)[:, None] + ((p1 - p0) / 2)[:, None] * nodes
    corner_points = c0[:, None] + (c1 - c0)[:, None] * v**2
    length = np.abs(c1 - c0)
    segment = np.concatenate([np.repeat(ps, q), np.repeat(cs, q)]).astype(np.int64)
    tangent = (end - start) / np.abs(end - start)
    return Mesh(
        middle,
        arm,
        len(p0),
        len(c0),
        np.concatenate([plain_points.ravel(), corner_points.ravel()]),
        np.concatenate([np.ones(plain_points.size), (1 / (2 * length[:, None] * v)).ravel()]),
        np.concatenate([(np.abs(p1 - p0)[:, None] / 2 * weights).ravel(), np.tile(weights / 2, len(c0))]),
        segment,
        1j * tangent[segment],
    )


def _cuts(a: complex, b: complex, corners: NDArray[np.complex128], grading: Grading) -> list[float]:
    """Distances along a segment where its panels begin and end."""
    length = abs(b - a)
    direction = (b - a) / length
    local = (corners - a) / direction
    own = (np.abs(local) < 1e-8) | (np.abs(local - length) < 1e-8)
    others = local[~own]

    def first(at: float) -> float:
        nearest = min(float(np.min(np.abs(others - at), initial=np.inf)), length)
        return min(grading.corner * nearest, length / 2)

    left, right = first(0.0), first(length)
    if left + right >= 0.8 * length * (1 - TIE):
        share = left / (left + right)
        return [0.0, share * length, length]
    low, high = [0.0, left], [length, length - right]
    sizes = [left, right]
    while True:
        rest = high[-1] - low[-1]
        size = grading.growth * min(sizes)
        both = abs(sizes[0] - sizes[1]) < TIE * size  # a segment and its mirror image are cut alike
        if rest <= 1.3 * size * (2 if both else 1) * (1 + TIE):
            break
        if both or sizes[0] < sizes[1]:
            low.append(low[-1] + size)
        if both or sizes[1] < sizes[0]:
            high.append(high[-1] - size)
        sizes = [size if both or value == min(sizes) else value for value in sizes]
    cuts = low + high[::-1]
    done: list[float] = [cuts[0]]
    for index, (p, r) in enumerate(pairwise(cuts)):
        pieces = [(p, r)]
        if 0 < index < len(cuts) - 2 and len(others):
            while True:
                split = []
                for lo, hi in pieces:
                    gap = np.abs(others - np.clip(others.real, lo, hi))
                    if hi - lo > max(grading.near * float(gap.min()) * (1 + TIE), SMALLEST):
                        split += [(lo, (lo + hi) / 2), ((lo + hi) / 2, hi)]
                    else:
                        split.append((lo, hi))
                if len(split) == len(pieces):
                    break
                pieces = split
        done += [hi for _, hi in pieces]
    return done
