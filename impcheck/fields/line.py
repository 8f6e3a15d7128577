"""A solved section. In: its matrices per mm; out: impedances in ohm, effective permittivity, delay in s per mm."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy.constants import speed_of_light
from scipy.linalg import sqrtm

Floats = NDArray[np.float64]
SPEED = speed_of_light * 1e3  # mm/s


@dataclass(frozen=True)
class Line:
    """k signals over their return, lossless. `error` is an estimate of the relative error of the impedance."""

    names: tuple[str, ...]
    c: Floats  # (k, k) Maxwell capacitance matrix, F/mm
    c0: Floats  # (k, k) the same without dielectrics
    l: Floats  # (k, k) inductance matrix, H/mm  # noqa: E741  (the literature's name)
    error: float

    @cached_property
    def zc(self) -> Floats:
        """(k, k) characteristic impedance matrix in ohm: sqrt(L C) C^-1."""
        return np.real(sqrtm(self.l @ self.c)) @ np.linalg.inv(self.c)

    @cached_property
    def z0(self) -> float:
        """Characteristic impedance of a single signal, ohm. Raises ValueError where there are several."""
        self._of(1, "z0")
        return float(np.sqrt(self.l[0, 0] / self.c[0, 0]))

    @cached_property
    def eps_eff(self) -> float:
        """Effective permittivity of a single signal."""
        self._of(1, "eps_eff")
        return float(self.c[0, 0] / self.c0[0, 0])

    @cached_property
    def delay(self) -> float:
        """Delay of a single signal, s per mm."""
        return float(np.sqrt(self.eps_eff)) / SPEED

    @cached_property
    def differential(self) -> float:
        """Differential impedance of two signals, ohm: Zc11 + Zc22 - Zc12 - Zc21."""
        self._of(2, "differential")
        z = self.zc
        return float(z[0, 0] + z[1, 1] - z[0, 1] - z[1, 0])

    @cached_property
    def common(self) -> float:
        """Common-mode impedance of two signals, ohm: (Zc11 + Zc22 + Zc12 + Zc21) / 4."""
        self._of(2, "common")
        return float(self.zc.sum() / 4)

    @property
    def odd(self) -> float:
        """Odd-mode impedance of two signals, ohm: half the differential one."""
        return self.differential / 2

    @property
    def even(self) -> float:
        """Even-mode impedance of two signals, ohm: twice the common one."""
        return 2 * self.common

    def _of(self, count: int, what: str) -> None:
        if len(self.names) != count:
            raise ValueError(f"{what} is of a section with {count} signal{'s' * (count > 1)}, this one has {len(self.names)}")
