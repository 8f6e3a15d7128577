"""Stretches of a profile. In: a profile; out: stations next to each other that share one cross-section, merged, in mm, ohm and s."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from impcheck.artwork.image import Floats
from impcheck.fields.profile import NetProfile, RunProfile
from impcheck.path.walk import Run, Zone

SAME = 0.002  # relative difference of impedance and width that is one stretch


@dataclass(frozen=True)
class Stretch:
    """One stretch."""

    layer: int
    along: tuple[float, float]  # mm
    start: tuple[float, float]
    end: tuple[float, float]
    width: float  # mm
    impedance: float  # ohm, nan where unsolved
    eps_eff: float
    delay: float  # s over the whole stretch
    above: int
    below: int
    coverage: float  # the least share of the width that a usual reference covers
    zone: Zone


def stretches(profile: NetProfile) -> list[Stretch]:
    """All stretches of a net, run by run."""
    return [stretch for run, fields in zip(profile.walk.runs, profile.runs, strict=True) for stretch in _of_run(run, fields)]


def _of_run(run: Run, fields: RunProfile) -> list[Stretch]:
    s = run.stations
    if len(s) == 0:
        return []
    z = np.nan_to_num(fields.impedance, nan=-1.0)
    cover = np.minimum(np.where(s.above >= 0, s.coverage_above, 1.0), np.where(s.below >= 0, s.coverage_below, 1.0))
    cover = np.where((s.above < 0) & (s.below < 0), 0.0, cover)
    change = (
        (np.abs(np.diff(z)) > SAME * np.abs(z[1:]))
        | (np.abs(np.diff(s.width)) > SAME * s.width[1:])
        | (np.diff(s.above) != 0)
        | (np.diff(s.below) != 0)
        | (np.abs(np.diff(cover)) > 0.01)
        | (np.diff(s.zone.astype(np.int8)) != 0)
    )
    first = np.concatenate([[0], np.flatnonzero(change) + 1])
    last = np.concatenate([first[1:], [len(s)]])
    length = s.end - s.begin
    weight = np.maximum(length, 1e-9)
    total = np.add.reduceat(weight, first)

    def mean(values: Floats) -> list[float]:
        found: list[float] = (np.add.reduceat(values * weight, first) / total).tolist()
        return found

    width, impedance, eps_eff = mean(s.width), mean(fields.impedance), mean(fields.eps_eff)
    delay = np.add.reduceat(fields.delay * length, first).tolist()
    least = np.minimum.reduceat(cover, first).tolist()
    begin, end = s.begin[first], s.end[last - 1]
    starts, ends = run.points_at(begin), run.points_at(end)
    return [
        Stretch(
            layer=run.layer,
            along=(float(begin[k]), float(end[k])),
            start=starts[k],
            end=ends[k],
            width=width[k],
            impedance=impedance[k],
            eps_eff=eps_eff[k],
            delay=delay[k],
            above=int(s.above[a]),
            below=int(s.below[a]),
            coverage=least[k],
            zone=Zone(int(s.zone[a])),
        )
        for k, a in enumerate(first.tolist())
    ]
