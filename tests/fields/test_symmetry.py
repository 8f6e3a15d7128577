"""What must hold of every section whatever its numbers: symmetries, limits, refusals. Exact, so the tolerances are round-off or the
solver's own error."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from impcheck.fields import Coating, Conductor, Section, SectionError, Slab, solve

SMALL = st.floats(0.05, 0.5)


def trapezoid(name, low, high, bottom, top, cut, role="signal"):
    return Conductor(name, role, ((low, bottom), (high, bottom), (high - cut, top), (low + cut, top)))


def masked(w, gap, h, er, t=0.035):
    """A masked microstrip with a return pour at its right."""
    return Section(
        (Slab(0, h, er),),
        (trapezoid("s", -w / 2, w / 2, h, h + t, 0.006), trapezoid("g", w / 2 + gap, w / 2 + gap + 1.0, h, h + t, 0.006, "return")),
        (0.0,),
        Coating(0.02, 3.6),
    )


def pair(w, s, h, er, second=None):
    second = second or w
    return Section(
        (Slab(0, h, er),),
        (trapezoid("p", -s / 2 - w, -s / 2, h, h + 0.035, 0.005), trapezoid("n", s / 2, s / 2 + second, h, h + 0.035, 0.005)),
        (0.0,),
        Coating(0.02, 3.6),
    )


def scaled(section, k):
    return Section(
        tuple(Slab(s.bottom * k, s.top * k, s.er) for s in section.slabs),
        tuple(replace(c, outline=tuple((x * k, y * k) for x, y in c.outline)) for c in section.conductors),
        tuple(y * k for y in section.planes),
        section.coating and replace(section.coating, thickness=section.coating.thickness * k),
    )


def mirrored(section):
    return replace(section, conductors=tuple(replace(c, outline=tuple((-x, y) for x, y in c.outline[::-1])) for c in section.conductors))


@settings(max_examples=25, deadline=None)
@given(SMALL, SMALL, SMALL, st.floats(2, 10))
def test_scale_and_mirror_change_nothing(w, gap, h, er):
    section = masked(w, gap, h, er)
    z = solve(section).z0
    assert solve(scaled(section, 3.0)).z0 == pytest.approx(z, rel=1e-5)
    assert solve(mirrored(section)).z0 == pytest.approx(z, rel=1e-5)


@settings(max_examples=15, deadline=None)
@given(SMALL, SMALL, SMALL, st.floats(2, 10))
def test_pairs(w, s, h, er):
    section = pair(w, s, h, er)
    line = solve(section)
    assert np.allclose(line.c, line.c.T, rtol=1e-9)
    assert (line.c.sum(axis=1) > 0).all()
    assert line.even > line.odd
    swapped = replace(section, conductors=section.conductors[::-1])
    assert solve(swapped).differential == pytest.approx(line.differential, rel=1e-6)


@settings(max_examples=15, deadline=None)
@given(SMALL, SMALL, st.floats(1.5, 10))
def test_the_same_dielectric_everywhere(w, h, er):
    # exact: eps_eff = er
    section = Section((Slab(0, 2 * h, er),), (trapezoid("s", -w / 2, w / 2, h - 0.01, h + 0.02, 0.004),), (0.0, 2 * h))
    assert solve(section).eps_eff == pytest.approx(er, rel=1e-6)


@settings(max_examples=15, deadline=None)
@given(SMALL, SMALL, st.floats(0.1, 0.9))
def test_a_slab_cut_in_two_changes_nothing(w, h, share):
    whole = Section((Slab(0, h, 4.0),), (trapezoid("s", -w / 2, w / 2, h, h + 0.035, 0.006),), (0.0,))
    cut = replace(whole, slabs=(Slab(0, share * h, 4.0), Slab(share * h, h, 4.0)))
    assert solve(cut).z0 == pytest.approx(solve(whole).z0, rel=1e-9)


def test_upside_down_is_the_same():
    below = Section((Slab(0, 0.11, 4.0),), (trapezoid("s", -0.09, 0.09, 0.11, 0.15, 0.006),), (0.0,), Coating(0.02, 3.6))
    outline = tuple((x, 0.15 - y) for x, y in below.conductors[0].outline)
    above = Section((Slab(0.04, 0.15, 4.0),), (Conductor("s", "signal", outline),), (0.15,), None, Coating(0.02, 3.6))
    assert solve(above).z0 == pytest.approx(solve(below).z0, rel=1e-6)


def test_a_wide_pour_below_is_as_good_as_a_plane():
    h = 0.11
    trace = trapezoid("s", -0.09, 0.09, h, h + 0.04, 0.006)
    plane = Section((Slab(0, h, 4.0),), (trace,), (0.0,))
    pour = Section((Slab(0, h, 4.0),), (trace, Conductor("g", "return", ((-4, -0.017), (4, -0.017), (4, 0), (-4, 0)))))
    assert solve(pour).z0 == pytest.approx(solve(plane).z0, rel=2e-3)


def test_floating_copper_is_between_none_and_grounded():
    # exact ordering: a floating strip beside a line raises its capacitance by less than a grounded one
    h = 0.2
    trace = trapezoid("s", -0.1, 0.1, h, h + 0.035, 0.006)

    def beside(role):
        extra = () if role is None else (trapezoid("f", 0.15, 0.6, h, h + 0.035, 0.006, role),)
        return solve(Section((Slab(0, h, 4.0),), (trace, *extra), (0.0,))).z0

    assert beside("return") < beside("floating") < beside(None)


REFUSED = {
    "touches": (
        Section((), (trapezoid("s", 0, 1, 1, 2, 0), trapezoid("g", 1, 2, 1, 2, 0, "return")), (0.0,)),
        "conductor 's' touches copper at 0 V",
    ),
    "overlaps": (
        Section((), (trapezoid("p", 0, 1, 1, 2, 0), trapezoid("n", 0.5, 2, 1, 2, 0)), (0.0,)),
        "conductor 'p' touches conductor 'n'",
    ),
    "on the plane": (Section((), (trapezoid("s", 0, 1, 0, 1, 0),), (0.0,)), "conductor 's' touches the plane"),
    "no return": (Section((), (trapezoid("s", 0, 1, 1, 2, 0),)), "nothing carries the return current"),
    "no signal": (Section((), (trapezoid("g", 0, 1, 1, 2, 0, "return"),), (0.0,)), "no signal"),
    "no conductor": (Section((), (), (0.0,)), "no conductor"),
    "plane through copper": (Section((), (trapezoid("s", 0, 1, 1, 2, 0),), (0.0, 1.5)), "runs through a conductor"),
    "crosses itself": (Section((), (Conductor("s", "signal", ((0, 1), (1, 2), (1, 1), (0, 2))),), (0.0,)), "crosses itself"),
}


@pytest.mark.parametrize("name", REFUSED)
def test_sections_without_a_sensible_solution_are_refused_in_words(name):
    section, words = REFUSED[name]
    with pytest.raises(SectionError, match=words):
        solve(section)


EXTREME = {
    "5 um gap": masked(0.2, 0.005, 0.2, 4.0),
    "0.5 um gap": masked(0.2, 0.0005, 0.2, 4.0),
    "mask closes the gap": masked(0.2, 0.03, 0.2, 4.0),
    "aspect 100 to 1": masked(4.0, 0.2, 0.1, 4.0),
    "narrow and thick": Section((Slab(0, 0.1, 4.0),), (trapezoid("s", -0.01, 0.01, 0.1, 0.2, 0.002),), (0.0,)),
    "er 80": masked(0.2, 0.2, 0.2, 80.0),
    "flush with an edge": Section(
        (Slab(0, 0.2, 4.0),),
        (trapezoid("s", -0.1, 0.1, 0.2, 0.235, 0.0), Conductor("g", "return", ((0.1, 0.08), (3, 0.08), (3, 0.1), (0.1, 0.1)))),
        (0.0,),
    ),
}


@pytest.mark.parametrize("name", EXTREME)
def test_extreme_sections_stand_still_when_refined(name):
    rough, fine = solve(EXTREME[name]), solve(EXTREME[name], accuracy=1e-6)
    assert np.isfinite(rough.z0)
    assert rough.z0 == pytest.approx(fine.z0, rel=2e-3)
