"""Potential and field of charged panels. In: targets and panels in mm; out: influence matrices (eps0 = 1, charges per length).

A panel is straight, with q Gauss nodes whose charge densities are the unknowns. Far from a panel the Gauss rule is used; near it the
density's Legendre series is integrated in closed form through Legendre functions of the second kind, with zeta = (z - middle) / half a
panel in the complex plane: int P_n(t) / (zeta - t) dt = 2 Q_n(zeta) and int P_n(t) ln|zeta - t| dt = 2 Re(Q_{n+1} - Q_{n-1}) / (2 n +
1) for n >= 1.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from numpy.polynomial import legendre
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]

NEAR = 2.5  # half-lengths from its middle within which a panel is integrated in closed form


@lru_cache
def gauss(q: int) -> tuple[Floats, Floats, Floats]:
    """Nodes, weights, and the (q, q) matrix from nodal values to Legendre coefficients, on [-1, 1]."""
    nodes, weights = legendre.leggauss(q)
    values = legendre.legvander(nodes, q - 1)  # (node, degree)
    to_series = (values * weights[:, None]).T * (np.arange(q)[:, None] + 0.5)
    return nodes, weights, to_series


def legendre_q(zeta: Complexes, q: int) -> tuple[Complexes, ...]:
    """Q_0 .. Q_q of complex zeta, real parts principal values on the panel itself (forward recursion: fine for |zeta| < 3 and small q)."""
    x, y = zeta.real, zeta.imag
    with np.errstate(divide="ignore"):
        real = 0.25 * np.log(((x + 1) ** 2 + y**2) / ((x - 1) ** 2 + y**2))
    on = np.abs(y) < 1e-12
    imaginary = 0.5 * np.where(on, 0.0, np.arctan2(-2.0 * y, x * x + y * y - 1.0))
    found = [real + 1j * imaginary]
    found.append(zeta * found[0] - 1.0)
    for n in range(1, q):
        found.append(((2 * n + 1) * zeta * found[n] - n * found[n - 1]) / (n + 1))
    return tuple(found)


def near_potential(zeta: Complexes, half: Floats, q: int, to_series: Floats) -> Floats:
    """(m, q) potential at zeta of unit nodal densities on a panel of half-length `half`: -1/(2 pi) int s ln r."""
    found = legendre_q(zeta, q)
    x, y = zeta.real, zeta.imag
    with np.errstate(divide="ignore", invalid="ignore"):
        up, down = (x + 1) ** 2 + y**2, (x - 1) ** 2 + y**2
        logs = 0.5 * (np.where(up > 0, (x + 1) * np.log(up), 0.0) - np.where(down > 0, (x - 1) * np.log(down), 0.0))
    turn = np.where(np.abs(y) < 1e-12, 0.0, np.arctan2(-2.0 * y, x * x + y * y - 1.0))
    moments = np.empty((len(zeta), q))
    moments[:, 0] = logs - y * turn - 2.0 + 2.0 * np.log(half)
    for n in range(1, q):
        moments[:, n] = 2.0 * (found[n + 1] - found[n - 1]).real / (2 * n + 1)
    return (moments @ to_series) * (-half / (2 * np.pi))[:, None]


def near_field(zeta: Complexes, unit: Complexes, q: int, to_series: Floats) -> Complexes:
    """(m, q) conjugate field Ex - i Ey at zeta of unit nodal densities on a panel of direction `unit`."""
    found = legendre_q(zeta, q)
    moments = np.stack([2.0 * found[n] for n in range(q)], axis=1)
    return (moments @ to_series) / (2 * np.pi * unit)[:, None]
