"""Circular arcs. In: starts, ends and centre offsets in mm; out: centres in mm and signed sweeps in radians, all as arrays."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from impcheck.artwork.image import Bools, Floats

_QUARTER = np.pi / 2
_SIGNS = np.array([(1.0, 1.0), (1.0, -1.0), (-1.0, 1.0), (-1.0, -1.0)])


@dataclass(frozen=True)
class Arcs:
    """n arcs, each from its start exactly to its end."""

    centre: Floats  # (n, 2), nan for those drawn straight
    sweep: Floats  # (n,), 0 for those drawn straight
    mismatch: Floats  # (n,) how much the radii at start and end differ in the file, mm
    radius: Floats  # (n,)
    impossible: Bools  # (n,) no centre fits: single quadrant arcs only


def arcs(start: Floats, end: Floats, offset: Floats, clockwise: Bools, single: Bools) -> Arcs:
    """Centres and sweeps of n arcs.

    start, end, offset (n, 2) mm, offset from the start to the centre; clockwise (n,); single (n,): single-quadrant mode (G74), in
    which the offsets have no sign and the arc spans at most a quarter turn. The ends stay where they are: where the radii at the two
    ends differ, the centre moves to the nearest point at equal distance from both. An arc without a radius becomes straight.
    """
    count = len(start)
    centre = start + offset
    sweep = np.zeros(count)
    impossible = np.zeros(count, np.bool_)
    several = np.flatnonzero(~single)
    centre[several], sweep[several], mismatch, radius = _fit(start[several], end[several], centre[several], clockwise[several])
    all_mismatch, all_radius = np.zeros(count), np.zeros(count)
    all_mismatch[several], all_radius[several] = mismatch, radius
    one = np.flatnonzero(single)
    if len(one):
        tries = [_fit(start[one], end[one], start[one] + np.abs(offset[one]) * sign, clockwise[one]) for sign in _SIGNS]
        mismatches = np.array([t[2] for t in tries])
        sweeps = np.array([np.abs(t[1]) for t in tries])
        # A quarter turn, and what rounding of the coordinates can add to it.
        fits = sweeps <= _QUARTER + 0.05
        score = np.where(fits, mismatches, np.inf)
        best = np.argmin(score, axis=0)
        pick = np.arange(len(one))
        impossible[one] = ~np.isfinite(score[best, pick])
        centre[one] = np.array([t[0] for t in tries])[best, pick]
        sweep[one] = np.array([t[1] for t in tries])[best, pick]
        all_mismatch[one] = mismatches[best, pick]
        all_radius[one] = np.array([t[3] for t in tries])[best, pick]
        still = one[np.all(start[one] == end[one], axis=1)]  # no full circles in this mode: a dot
        sweep[still], impossible[still], all_mismatch[still] = 0.0, False, 0.0
    straight = sweep == 0
    centre[straight] = np.nan
    return Arcs(centre, sweep, all_mismatch, all_radius, impossible)


def _fit(start: Floats, end: Floats, centre: Floats, clockwise: Bools) -> tuple[Floats, Floats, Floats, Floats]:
    """Centre moved to equal distance from both ends, sweep, mismatch of the radii, radius."""
    first = np.hypot(*(start - centre).T)
    last = np.hypot(*(end - centre).T)
    chord = end - start
    length = np.hypot(*chord.T)
    full = length == 0
    along = chord / np.where(full, 1.0, length)[:, None]
    shift = np.sum((0.5 * (start + end) - centre) * along, axis=1)
    moved = centre + shift[:, None] * along
    a = start - moved
    b = end - moved
    turn = np.arctan2(a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0], np.sum(a * b, axis=1))
    turn = np.where(full, 2 * np.pi, np.mod(turn, 2 * np.pi))
    sweep = np.where(clockwise, np.where(full, -2 * np.pi, turn - 2 * np.pi), turn)
    sweep = np.where(first == 0, 0.0, sweep)  # a centre on the start itself (I and J left out) is no arc
    radius = np.hypot(*a.T)
    return moved, sweep, np.abs(first - last), radius
