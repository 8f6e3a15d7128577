"""The quasi-TEM solution of a section. In: a Section in mm; out: a Line with its matrices per mm.

Unknown is the total (free and bound) charge on every copper surface and every dielectric interface. On copper its potential is
prescribed; on an interface the normal flux is continuous: k E_n + s / 2 = 0 with k = (e_left - e_right) / (e_left + e_right). A plane
below is an image. C comes from the free charge e_outside * s; C without dielectrics from the copper-copper block of the same matrix.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.constants import epsilon_0, mu_0

from impcheck.fields.boundary import Boundary, boundary_of
from impcheck.fields.kernels import NEAR, gauss, near_field, near_potential
from impcheck.fields.line import Line
from impcheck.fields.panels import SUBPANELS, Grading, Mesh, condensation, cuts_of, mesh_of
from impcheck.fields.section import Section

Floats = NDArray[np.float64]
NODES = 3  # Gauss nodes a panel
GRADINGS = (Grading(0.6, 4.0, 2.5), Grading(0.4, 2.5, 1.3), Grading(0.2, 1.8, 0.7))  # from the first on until the accuracy asked for is met


def solve(section: Section, accuracy: float = 2e-3) -> Line:
    """Solves one section.

    `accuracy` is the relative error of the impedance that the estimate has to meet; panels are refined until it does (at most twice,
    the estimate then says what was reached). Raises SectionError for a section without a sensible solution.
    """
    boundary = boundary_of(section)
    line: Line | None = None
    for grading in GRADINGS:
        cuts = cuts_of(boundary, grading)
        coarse = capacitances(boundary, NODES - 1, cuts)
        fine = capacitances(boundary, NODES, cuts)
        line = _line(boundary, fine, coarse)
        if line.error <= accuracy:
            break
    assert line is not None
    return line


def _line(boundary: Boundary, fine: tuple[Floats, Floats], coarse: tuple[Floats, Floats]) -> Line:
    c, c0 = (epsilon_0 * 1e-3 * part for part in fine)
    difference = max(float(np.max(np.abs(a - b)) / np.max(np.abs(a))) for a, b in zip(fine, coarse, strict=True))
    names = tuple(name for name, loose in zip(boundary.names, boundary.floating, strict=True) if not loose)
    return Line(names, c, c0, np.asarray(mu_0 * 1e-3 * epsilon_0 * 1e-3 * np.linalg.inv(c0), np.float64), 0.25 * difference)


def capacitances(boundary: Boundary, q: int, cuts: list[list[float]]) -> tuple[Floats, Floats]:
    """Maxwell matrices (k, k) of the signals with and without dielectrics, in units of eps0, symmetric to the last digit."""
    mesh = mesh_of(boundary, q, cuts)
    conductor = boundary.conductor[mesh.segment]
    left, right = boundary.left[mesh.segment], boundary.right[mesh.segment]
    metal = conductor > -2
    strip = metal & ~(np.isnan(left) | np.isnan(right))
    potential = _condensed(_potential(mesh, mesh.point[metal], boundary.image, q), mesh, q)
    asks_field = ~metal | (strip & (left != right))
    field = _condensed(_normal_field(mesh, mesh.point[asks_field], mesh.normal[asks_field], boundary.image, q), mesh, q)
    count = len(mesh.point)
    kinds = len(boundary.names)
    excitation = (conductor[metal][:, None] == np.arange(kinds)).astype(float)
    extra = 0 if boundary.image else 1
    matrix = np.zeros((count + extra, count + extra))
    matrix[:count, :count][metal] = potential
    with np.errstate(invalid="ignore"):
        k = ((left - right) / (left + right))[~metal]
    rows = field[~metal[asks_field]] * k[:, None]
    index = np.flatnonzero(~metal)
    rows[np.arange(len(index)), index] += mesh.density[index] / 2
    matrix[:count, :count][~metal] = rows
    if extra:
        matrix[:count, -1][metal] = 1.0
        matrix[-1, :count] = mesh.weight
    right_side = np.zeros((count + extra, kinds))
    right_side[:count][metal] = excitation
    charge = np.linalg.solve(matrix, right_side)[:count]
    outside = np.where(np.isnan(left), right, np.where(np.isnan(right), left, (left + right) / 2))
    free = (outside * mesh.weight)[:, None] * charge
    if (strip & (left != right)).any():
        on = strip[asks_field]
        across = field[on] @ charge
        mine = np.flatnonzero(asks_field)[on]
        free[mine] += ((left - right) * mesh.weight / mesh.density)[mine][:, None] * across
    c = np.array([[free[conductor == i, j].sum() for j in range(kinds)] for i in range(kinds)])
    size = int(metal.sum())
    block = np.zeros((size + extra, size + extra))
    block[:size, :size] = potential[:, metal]
    if extra:
        block[:size, -1] = 1.0
        block[-1, :size] = mesh.weight[metal]
    alone = np.linalg.solve(block, np.concatenate([excitation, np.zeros((extra, kinds))]))[:size]
    c0 = (excitation * mesh.weight[metal][:, None]).T @ alone
    return _signals(c, boundary.floating), _signals(c0, boundary.floating)


def _signals(c: Floats, floating: NDArray[np.bool_]) -> Floats:
    """Floating copper eliminated: it carries no charge."""
    c = (c + c.T) / 2
    if not floating.any():
        return c
    loose = np.flatnonzero(floating)
    kept = np.flatnonzero(~floating)
    return c[np.ix_(kept, kept)] - c[np.ix_(kept, loose)] @ np.linalg.solve(c[np.ix_(loose, loose)], c[np.ix_(loose, kept)])


def _condensed(full: Floats, mesh: Mesh, q: int) -> Floats:
    """Columns of source nodes -> columns of unknowns."""
    plain = mesh.plain * q
    _, reduce, _ = condensation(q)
    # nodal density of a sub-panel is the condensation matrix over the length of the whole corner panel
    length = 2 * np.abs(mesh.arm[mesh.plain :]).reshape(mesh.corner, SUBPANELS).sum(axis=1)
    corner = full[:, plain:].reshape(len(full), mesh.corner, SUBPANELS * q) @ reduce
    corner /= length[None, :, None]
    return np.concatenate([full[:, :plain], corner.reshape(len(full), mesh.corner * q)], axis=1)


def _sources(mesh: Mesh, q: int) -> tuple[NDArray[np.complex128], Floats]:
    nodes, weights, _ = gauss(q)
    points = (mesh.middle[:, None] + mesh.arm[:, None] * nodes).ravel()
    return points, (np.abs(mesh.arm)[:, None] * weights).ravel()


def _near(
    points: NDArray[np.complex128], mesh: Mesh, mirrored: bool
) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.complex128], NDArray[np.complex128]]:
    middle, arm = (np.conj(mesh.middle), np.conj(mesh.arm)) if mirrored else (mesh.middle, mesh.arm)
    dx = points.real[:, None] - middle.real
    dy = points.imag[:, None] - middle.imag
    target, panel = np.nonzero(dx * dx + dy * dy < (NEAR * np.abs(arm)) ** 2)
    zeta = (points[target] - middle[panel]) / arm[panel]
    return target, panel, zeta, arm[panel]


def _potential(mesh: Mesh, points: NDArray[np.complex128], image: bool, q: int) -> Floats:
    source, weight = _sources(mesh, q)
    _, _, to_series = gauss(q)
    dx2 = (points.real[:, None] - source.real) ** 2
    r2 = dx2 + (points.imag[:, None] - source.imag) ** 2
    r2[r2 == 0] = 1.0  # a collocation point on its own node: replaced by the closed form below
    far = np.log((dx2 + (points.imag[:, None] + source.imag) ** 2) / r2) if image else -np.log(r2)
    far *= weight / (4 * np.pi)
    for mirrored in (False, True) if image else (False,):
        target, panel, zeta, arm = _near(points, mesh, mirrored)
        exact = near_potential(zeta, np.abs(arm), q, to_series)
        nodes = panel[:, None] * q + np.arange(q)
        z = np.conj(source[nodes]) if mirrored else source[nodes]
        distance = np.abs(points[target][:, None] - z)
        distance[distance == 0] = 1.0
        rough = -weight[nodes] * np.log(distance) / (2 * np.pi)
        np.add.at(far, (target[:, None], nodes), (rough - exact) if mirrored else (exact - rough))
    return far


def _normal_field(mesh: Mesh, points: NDArray[np.complex128], normal: NDArray[np.complex128], image: bool, q: int) -> Floats:
    source, weight = _sources(mesh, q)
    _, _, to_series = gauss(q)
    nx, ny = normal.real[:, None], normal.imag[:, None]
    dx, dy = points.real[:, None] - source.real, points.imag[:, None] - source.imag
    r2 = dx * dx + dy * dy
    r2[r2 == 0] = 1.0
    far = (dx * nx + dy * ny) / r2
    if image:
        up = points.imag[:, None] + source.imag
        far -= (dx * nx + up * ny) / (dx * dx + up * up)
    far *= weight / (2 * np.pi)
    for mirrored in (False, True) if image else (False,):
        target, panel, zeta, arm = _near(points, mesh, mirrored)
        field = near_field(zeta, arm / np.abs(arm), q, to_series)
        exact = (field * normal[target][:, None]).real  # Re((Ex - i Ey)(nx + i ny)) = E . n
        nodes = panel[:, None] * q + np.arange(q)
        z = np.conj(source[nodes]) if mirrored else source[nodes]
        gap = points[target][:, None] - z
        square = np.abs(gap) ** 2
        square[square == 0] = 1.0
        rough = weight[nodes] * (gap * np.conj(normal[target])[:, None]).real / square / (2 * np.pi)
        np.add.at(far, (target[:, None], nodes), (rough - exact) if mirrored else (exact - rough))
    return far
