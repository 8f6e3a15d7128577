"""The solver against an independent finite-element solution (scikit-fem, biquadratic quadrilaterals graded towards every edge, refined
once to see that it stands still). Sections of the kinds the walk gives: a void under a trace, a plane edge, a pour beside, an
interrupted stripline."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from scipy.constants import c as light
from scipy.constants import epsilon_0
from skfem import Basis, BilinearForm, ElementQuad2, MeshQuad, condense, solve
from skfem.helpers import dot, grad

from impcheck.fields import Conductor, Section, Slab
from impcheck.fields import solve as impcheck_solve

FAR = 4.0  # mm, walls of the finite-element box; the field there is under 1e-3 of that at the trace


def box(low, bottom, high, top):
    return ((low, bottom), (high, bottom), (high, top), (low, top))


def lines(keys, least, growth):
    """Coordinates graded towards every key."""
    found = [keys[0]]
    for a, b in pairwise(keys):
        half, step, points = (b - a) / 2, min(least, (b - a) / 4), [0.0]
        while points[-1] + step < half:
            points.append(points[-1] + step)
            step *= growth
        points = np.array(points) / (points[-1] + step / 2) * half if len(points) > 1 else np.array([0.0])
        found += [*(a + points[1:]), (a + b) / 2, *(b - points[:0:-1]), b]
    return np.unique(np.round(found, 9))


def finite_elements(section, least, growth):
    """Impedance of a section in a grounded box, from its energy with and without dielectrics."""
    boxes = [(c.role, np.array(c.outline)) for c in section.conductors]
    ys = {0.0 if section.planes else -FAR, max(section.planes) if len(section.planes) > 1 else FAR}
    ys |= {float(y) for _, o in boxes for y in o[:, 1]} | {v for s in section.slabs for v in (s.bottom, s.top)}
    low, high = (0.0 if section.planes else -FAR), (max(section.planes) if len(section.planes) > 1 else FAR)
    ys = sorted(y for y in ys if low <= y <= high)
    xs = sorted({-FAR, FAR} | {float(x) for _, o in boxes for x in o[:, 0] if abs(x) < FAR})
    mesh = MeshQuad.init_tensor(lines(xs, least, growth), lines(ys, least, growth))
    basis = Basis(mesh, ElementQuad2())
    x, y = basis.doflocs
    potential = np.zeros(basis.N)
    fixed = (np.abs(x) > FAR - 1e-9) | (y < low + 1e-9) | (y > high - 1e-9)
    for role, o in boxes:
        inside = (x > o[:, 0].min() - 1e-9) & (x < o[:, 0].max() + 1e-9) & (y > o[:, 1].min() - 1e-9) & (y < o[:, 1].max() + 1e-9)
        fixed |= inside
        if role == "signal":
            potential[inside] = 1.0

    def energy(slabs):
        @BilinearForm
        def laplace(u, v, w):
            er = np.ones_like(w.x[1])
            for s in slabs:
                er = np.where((w.x[1] > s.bottom) & (w.x[1] < s.top), s.er, er)
            return er * dot(grad(u), grad(v))

        stiffness = laplace.assemble(basis)
        solution = solve(*condense(stiffness, np.zeros(basis.N), x=potential, D=np.flatnonzero(fixed)))
        return float(solution @ (stiffness @ solution))

    return 1.0 / (light * epsilon_0 * np.sqrt(energy(section.slabs) * energy(())))


TRACE = Conductor("s", "signal", box(-0.09, 0.25, 0.09, 0.285))
SECTIONS = {
    "microstrip": Section((Slab(0, 0.25, 4.0),), (TRACE,), (0.0,)),
    "pour beside": Section((Slab(0, 0.25, 4.0),), (TRACE, Conductor("g", "return", box(0.19, 0.25, 3.0, 0.285))), (0.0,)),
    "void under the trace, plane behind": Section(
        (Slab(0, 0.25, 4.0),),
        (TRACE, Conductor("g", "return", box(-3.5, 0.12, -0.2, 0.137)), Conductor("g", "return", box(0.15, 0.12, 3.5, 0.137))),
        (0.0,),
    ),
    "plane edge under the trace": Section((Slab(0, 0.25, 4.0),), (TRACE, Conductor("g", "return", box(-3.5, 0.12, 0.02, 0.137))), (0.0,)),
    "interrupted stripline of two dielectrics": Section(
        (Slab(0, 0.267, 4.2), Slab(0.267, 0.6, 3.6)),
        (TRACE, Conductor("g", "return", box(-3.5, 0.12, -0.05, 0.137)), Conductor("g", "return", box(0.3, 0.12, 3.5, 0.137))),
        (0.0, 0.6),
    ),
}


@pytest.mark.parametrize("name", SECTIONS)
def test_same_impedance_as_finite_elements(name):
    rough = finite_elements(SECTIONS[name], 0.002, 1.7)
    fine = finite_elements(SECTIONS[name], 0.0005, 1.5)
    assert rough == pytest.approx(fine, rel=2e-3)  # it stands still
    assert impcheck_solve(SECTIONS[name]).z0 == pytest.approx(fine, rel=3e-3)
