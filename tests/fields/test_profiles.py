"""Stations get the impedance of their own section; what is no part of it does not count."""

import numpy as np
import pytest
from scipy.constants import speed_of_light

from impcheck.artwork.stackup import CopperItem, Dielectric, Mask, Stackup
from impcheck.fields import profiles
from impcheck.fields.cross_section import Shape, section_of
from impcheck.fields.profiles import profile_nets
from impcheck.fields.solver import solve
from impcheck.path.walk import Zone
from tests.fields.straight import FOREIGN, GND, NETS, OTHER_LEG, copper, plane, walk

STACKUP = Stackup(
    (
        Mask(0.02, 3.6),
        CopperItem("L1", 0.035),
        Dielectric(0.16, 4.2),
        CopperItem("L2", 0.017),
        Dielectric(0.4, 4.2, core=True),
        CopperItem("L3", 0.035),
    )
)
PLAIN = {"width": 0.3, "cuts": {1: plane()}}


def ohms(*stations, stackup=STACKUP, open_mask=(), **how):
    (profile,), remarks = profile_nets([walk(stations, **how)], stackup, NETS, copper(*open_mask))
    return profile.runs[0].impedance, remarks


def line(width=0.3, beside=(), coated=True):
    return solve(section_of(Shape(0, width, beside, (), -1, 1, coated), STACKUP))


def test_a_plain_trace_has_the_impedance_of_its_section():
    (profile,), remarks = profile_nets([walk([PLAIN] * 4)], STACKUP, NETS, copper())
    fields, truth = profile.runs[0], line()
    # the project's claim: snapping changes about 0.2 %
    assert fields.impedance == pytest.approx([truth.z0] * 4, rel=3e-3)
    assert fields.eps_eff == pytest.approx([truth.eps_eff] * 4, rel=3e-3)
    # exact: delay is sqrt(eps_eff) / c
    assert fields.delay == pytest.approx(np.sqrt(fields.eps_eff) / (speed_of_light * 1e3), rel=1e-12)
    assert np.all(fields.error < 1e-2)
    assert remarks == ()


def test_each_distinct_section_is_solved_once(monkeypatch):
    solved = []
    monkeypatch.setattr(profiles, "solve", lambda section, accuracy: solved.append(section) or solve(section, accuracy))
    narrow = {**PLAIN, "width": 0.2}
    one, other = walk([PLAIN] * 50 + [narrow] * 50), walk([narrow, PLAIN] * 20, name="T")
    found, _ = profile_nets([one, other], STACKUP, NETS, copper())
    assert len(solved) == 2
    assert found[1].runs[0].impedance[0] == found[0].runs[0].impedance[-1]


def test_a_trace_beside_its_centreline_is_the_same_section():
    shifted = {"width": 0.3, "centre": 0.04, "cuts": {0: [(0.29, 0.5, GND)], 1: plane()}}
    straight = {"width": 0.3, "cuts": {0: [(0.25, 0.46, GND)], 1: plane()}}
    z, _ = ohms(shifted, straight)
    assert z[0] == z[1]


def test_foreign_copper_beside_counts_like_ground():
    # decided: a quiet net is held by its driver
    beside = [{"width": 0.3, "cuts": {0: [(0.25, 0.5, label)], 1: plane()}} for label in (GND, FOREIGN)]
    z, _ = ohms(PLAIN, *beside)
    assert z[1] == z[2]
    assert z[1] < z[0]
    assert z[1] == pytest.approx(line(beside=((0.25, 0.5),)).z0, rel=5e-3)


def test_another_leg_of_the_net_stays_out():
    z, _ = ohms(PLAIN, {"width": 0.3, "cuts": {0: [(0.25, 0.5, OTHER_LEG)], 1: plane()}})
    assert z[0] == z[1]


def test_foreign_copper_under_the_trace_is_no_reference():
    z, _ = ohms({"width": 0.3, "cuts": {1: [(-1.2, 1.2, FOREIGN)], 2: plane()}}, {"width": 0.3, "cuts": {2: plane()}})
    assert z[0] == z[1]


def test_an_opening_under_the_trace_raises_it():
    gap = {"width": 0.3, "cuts": {1: plane((-0.6, 0.6)), 2: plane()}, "cover": 0.0}
    beside = {"width": 0.3, "cuts": {1: plane((0.2, 0.5)), 2: plane()}}
    z, _ = ohms(PLAIN, beside, gap)
    assert z[0] < z[1] < z[2]
    truth = solve(section_of(Shape(0, 0.3, (), ((1, ((-30.0, -0.6), (0.6, 30.0))),), -1, 2, True), STACKUP))
    assert z[2] == pytest.approx(truth.z0, rel=1e-2)


def test_bare_copper_in_a_mask_opening():
    z, _ = ohms(PLAIN, PLAIN, PLAIN, open_mask=[(0.5, -1.0, 1.0, 1.0)])
    assert z[0] == z[2]
    assert z[1] == pytest.approx(line(coated=False).z0, rel=3e-3)
    assert z[1] > z[0]


def test_vias_carry_no_impedance_and_are_not_remarked():
    z, remarks = ohms(PLAIN, {**PLAIN, "zone": Zone.VIA})
    assert np.isnan(z).tolist() == [False, True]
    assert remarks == ()


def test_pads_do():
    z, _ = ohms(PLAIN, {"width": 1.0, "zone": Zone.PAD, "cuts": {1: plane()}})
    assert z[1] == pytest.approx(line(1.0).z0, rel=2e-2)


def test_nothing_to_return_on_is_told_once():
    z, remarks = ohms(PLAIN, {"width": 0.3, "below": -1}, {"width": 0.3, "below": -1})
    assert np.isnan(z).tolist() == [False, True, True]
    (remark,) = remarks
    assert "2 of 3 stations have no cross-section that could be solved" in remark.text


def test_the_result_does_not_depend_on_the_number_of_processes():
    stations = [{"width": 0.1 + 0.01 * k, "cuts": {1: plane()}} for k in range(30)]
    found = [profile_nets([walk(stations)], STACKUP, NETS, copper(), jobs=jobs)[0][0].runs[0].impedance for jobs in (1, 2)]
    assert np.array_equal(*found)


def test_a_wider_trace_has_less():
    z, _ = ohms(*({"width": 0.1 + 0.02 * k, "cuts": {1: plane()}} for k in range(15)))
    assert np.all(np.diff(z) < 0)


def test_a_board_full_of_different_places_is_rounded_more_coarsely_and_says_so(monkeypatch):
    monkeypatch.setattr(profiles, "MOST", 10)
    stations = [{"width": 0.3 + 0.002 * k, "cuts": {1: plane()}} for k in range(30)]
    z, remarks = ohms(*stations)
    assert len(np.unique(z)) <= 10
    assert z == pytest.approx([line(s["width"]).z0 for s in stations], rel=3e-2)
    assert any("more coarsely than usual" in remark.text for remark in remarks)
