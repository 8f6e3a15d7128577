"""The solver against closed forms and published formulas. Each case says its kind and source; tolerances are the claim of the source or
of the design.

Coordinates in mm. Elliptic integrals from scipy; eta0 from scipy.constants.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.constants import c as light
from scipy.constants import epsilon_0, mu_0
from scipy.special import ellipk

from impcheck.fields import Coating, Conductor, Section, Slab, solve

ETA0 = math.sqrt(mu_0 / epsilon_0)
EXACT = 1e-3  # the design's bar for closed exact solutions
STRIP = 2e-3  # and for strips without thickness


def k_over_k(k):
    """K(k) / K(k') for a modulus k."""
    return float(ellipk(k * k) / ellipk(1 - k * k))


def strip(name, low, high, y, role="signal"):
    return Conductor(name, role, ((low, y), (high, y)))


def bar(name, low, high, bottom, top, role="signal"):
    return Conductor(name, role, ((low, bottom), (high, bottom), (high, top), (low, top)))


def circle(x, y, radius, sides=256, begin=0.0, end=2 * math.pi):
    """A regular polygon with the circle's area, so that its capacitance is the circle's to second order."""
    grown = radius * math.sqrt(2 * math.pi / sides / math.sin(2 * math.pi / sides))
    return [
        (x + grown * math.cos(t), y + grown * math.sin(t)) for t in np.linspace(begin, end, sides + 1)[: sides if end - begin > 6 else None]
    ]


@pytest.mark.parametrize("ratio", [1.5, 3.0, 10.0])
def test_round_wire_over_a_plane(ratio):
    # exact: Z0 = eta0 / (2 pi) arccosh(h / a), textbook image solution
    section = Section((), (Conductor("s", "signal", tuple(circle(0, ratio * 0.1, 0.1, 64))),), planes=(0.0,))
    assert solve(section).z0 == pytest.approx(ETA0 / (2 * math.pi) * math.acosh(ratio), rel=EXACT)


@pytest.mark.parametrize("ratio", [1.5, 2.3, 5.0])
def test_coaxial_line(ratio):
    # exact: Z0 = eta0 / (2 pi) ln(b / a); the outer conductor is two half rings at 0 V
    halves = []
    for begin in (-math.pi / 2, math.pi / 2):
        inner = circle(0, 0, ratio * 0.1, 128, begin, begin + math.pi)[::1]
        outer = circle(0, 0, ratio * 0.1 + 0.1, 32, begin, begin + math.pi)
        halves.append(Conductor("shield", "return", (*inner, *outer[::-1])))
    section = Section((), (Conductor("s", "signal", tuple(circle(0, 0, 0.1, 64))), *halves))
    assert solve(section).z0 == pytest.approx(ETA0 / (2 * math.pi) * math.log(ratio), rel=EXACT)


@pytest.mark.parametrize("er", [1.0, 4.2])
@pytest.mark.parametrize("w", [0.1, 0.3, 0.6, 1.5])
def test_symmetric_stripline(w, er):
    # exact: Cohn 1954 (IRE Trans. MTT-2), Z0 = (eta0 / 4 sqrt(er)) K(k) / K(k'), k = sech(pi w / 2 b)
    b = 0.5
    section = Section((Slab(0, b, er),), (strip("s", -w / 2, w / 2, b / 2),), planes=(0.0, b))
    line = solve(section)
    assert line.z0 == pytest.approx(ETA0 / (4 * math.sqrt(er)) * k_over_k(1 / math.cosh(math.pi * w / (2 * b))), rel=STRIP)
    assert line.eps_eff == pytest.approx(er, rel=1e-6)


@pytest.mark.parametrize(("w", "s"), [(0.2, 0.1), (0.3, 0.3), (0.15, 0.05)])
def test_edge_coupled_stripline(w, s):
    # exact: Cohn 1955 (IRE Trans. MTT-3)
    b, er = 0.5, 4.0
    section = Section((Slab(0, b, er),), (strip("p", -s / 2 - w, -s / 2, b / 2), strip("n", s / 2, s / 2 + w, b / 2)), planes=(0.0, b))
    line = solve(section)
    even = math.tanh(math.pi * w / (2 * b)) * math.tanh(math.pi * (w + s) / (2 * b))
    odd = math.tanh(math.pi * w / (2 * b)) / math.tanh(math.pi * (w + s) / (2 * b))
    assert line.even == pytest.approx(ETA0 / (4 * math.sqrt(er)) / k_over_k(even), rel=STRIP)
    assert line.odd == pytest.approx(ETA0 / (4 * math.sqrt(er)) / k_over_k(odd), rel=STRIP)
    assert line.differential == pytest.approx(2 * line.odd)


@pytest.mark.parametrize(("s", "w"), [(0.2, 0.1), (0.1, 0.3)])
def test_coplanar_waveguide_on_a_half_space(s, w):
    # exact for grounds and substrate without end: Wen 1969 (IEEE Trans. MTT-17), k = s / (s + 2 w)
    er, far = 4.0, 150.0
    grounds = (strip("g", -far, -s / 2 - w, 0, "return"), strip("h", s / 2 + w, far, 0, "return"))
    section = Section((Slab(-300, 0, er),), (strip("s", -s / 2, s / 2, 0), *grounds))
    k = s / (s + 2 * w)
    assert solve(section).z0 == pytest.approx(ETA0 / 4 / math.sqrt((er + 1) / 2) / k_over_k(k), rel=STRIP)


def hammerstad_jensen(u, er):
    """Z0 and eps_eff of a microstrip without thickness: Hammerstad and Jensen 1980 (MTT-S Digest); 0.03 % for er = 1, 0.2 % in eps_eff."""
    f = 6 + (2 * math.pi - 6) * math.exp(-((30.666 / u) ** 0.7528))
    z = ETA0 / (2 * math.pi) * math.log(f / u + math.sqrt(1 + (2 / u) ** 2))
    a = 1 + math.log((u**4 + (u / 52) ** 2) / (u**4 + 0.432)) / 49 + math.log(1 + (u / 18.1) ** 3) / 18.7
    b = 0.564 * ((er - 0.9) / (er + 3)) ** 0.053
    eps = (er + 1) / 2 + (er - 1) / 2 * (1 + 10 / u) ** (-a * b)
    return z / math.sqrt(eps), eps


@pytest.mark.parametrize("u", [0.3, 1.0, 2.0, 6.0])
def test_microstrip_in_air(u):
    # published: 0.03 % for er = 1, on top of the solver's own bar for strips
    section = Section((), (strip("s", -u / 2, u / 2, 1.0),), planes=(0.0,))
    assert solve(section).z0 == pytest.approx(hammerstad_jensen(u, 1.0)[0], rel=STRIP + 3e-4)


@pytest.mark.parametrize("er", [2.2, 4.3, 9.8])
@pytest.mark.parametrize("u", [0.3, 1.0, 2.0, 6.0])
def test_microstrip_on_a_dielectric(u, er):
    # published: eps_eff within 0.2 %
    line = solve(Section((Slab(0, 1.0, er),), (strip("s", -u / 2, u / 2, 1.0),), planes=(0.0,)))
    z, eps = hammerstad_jensen(u, er)
    assert line.eps_eff == pytest.approx(eps, rel=2e-3 + STRIP)
    assert line.z0 == pytest.approx(z, rel=1.3e-3 + STRIP)


def test_thick_stripline():
    # published: Wheeler 1978 (IEEE Trans. MTT-26), stated accuracy 0.5 % for w / (b - t) < 10; formula from memory
    w, t, b, er = 0.2, 0.035, 0.5, 4.0
    m = 6 / (3 + 2 * (t / (b - t)))
    x = t / b
    dw = x / (math.pi * (1 - x)) * (1 - 0.5 * math.log((x / (2 - x)) ** 2 + (0.0796 * x / (w / b + 1.1 * x)) ** m))
    wp = w / (b - t) + dw
    a = 4 / (math.pi * wp)
    z = 30 / math.sqrt(er) * math.log(1 + a * (2 * a + math.sqrt(4 * a * a + 6.27)))
    section = Section((Slab(0, b, er),), (bar("s", -w / 2, w / 2, (b - t) / 2, (b + t) / 2),), planes=(0.0, b))
    assert solve(section).z0 == pytest.approx(z, rel=5e-3 + EXACT)


def test_microstrip_against_scikit_rf():
    # a general-purpose library's model (Hammerstad and Jensen with thickness), quasi-static
    import warnings

    import skrf

    frequency = skrf.Frequency(1e6, 2e6, 2, unit="Hz")
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        media = skrf.media.MLine(
            frequency,
            w=0.19e-3,
            h=0.11e-3,
            t=0.042e-3,
            ep_r=4.0,
            tand=0,
            rho=1e-12,
            model="hammerstadjensen",
            disp="none",
            diel="frequencyinvariant",
        )
        other = float(np.real(media.z0_characteristic[0]))
    section = Section((Slab(0, 0.11, 4.0),), (bar("s", -0.095, 0.095, 0.11, 0.152),), planes=(0.0,))
    assert solve(section).z0 == pytest.approx(
        other, rel=0.015
    )  # its thickness correction is an approximation of about 1 % (common practice)


def test_delay_is_that_of_light():
    # exact: 3.336 ps/mm times sqrt(er) in a homogeneous dielectric
    line = solve(Section((Slab(0, 0.4, 4.0),), (bar("s", -0.1, 0.1, 0.19, 0.21),), planes=(0.0, 0.4)))
    assert line.delay == pytest.approx(2.0 / (light * 1e3), rel=1e-6)


def test_the_design_example_runs():
    section = Section(
        slabs=(Slab(bottom=0.0, top=0.11, er=4.0, loss_tangent=0.015),),
        planes=(0.0,),
        coating=Coating(thickness=0.02, er=3.6),
        conductors=(
            Conductor(name="s", role="signal", outline=((-0.095, 0.11), (0.095, 0.11), (0.095, 0.152), (-0.095, 0.152))),
            Conductor(name="g", role="return", outline=((0.3, 0.11), (1.0, 0.11), (1.0, 0.152), (0.3, 0.152))),
        ),
    )
    line = solve(section)
    assert 40 < line.z0 < 55
    assert line.error < 5e-3
