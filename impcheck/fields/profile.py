"""Impedance along a walked net. In: walks and a stackup; out: ohms, effective permittivity and delay for every station."""

from __future__ import annotations

from dataclasses import dataclass

from impcheck.artwork.image import Floats
from impcheck.path.walk import Walk


@dataclass(frozen=True)
class RunProfile:
    """Fields of the stations of one run, same order."""

    impedance: Floats  # (n,) ohm; nan where no cross-section could be solved (said in a remark)
    eps_eff: Floats  # (n,)
    delay: Floats  # (n,) s per mm
    error: Floats  # (n,) estimated relative error of the impedance


@dataclass(frozen=True)
class NetProfile:
    """A walk with its fields."""

    walk: Walk
    runs: tuple[RunProfile, ...]  # as walk.runs
