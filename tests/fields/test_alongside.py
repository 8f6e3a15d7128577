"""Foreign traces on the next layer count where they run alongside, not where they cross."""

import numpy as np
import pytest

from impcheck.artwork.stackup import CopperItem, Dielectric, Stackup
from impcheck.fields.alongside import alongside
from impcheck.fields.profiles import profile_nets
from tests.fields.straight import FOREIGN, GND, NETS, OTHER_LEG, copper, plane, walk

# L2 lies 0.2 mm under L1
STACKUP = Stackup(
    (CopperItem("L1", 0.035), Dielectric(0.2, 4.2), CopperItem("L2", 0.017), Dielectric(0.2, 4.2, core=True), CopperItem("L3", 0.035))
)
STEP = 0.05
RETURNS, OWN = np.array([False, True, False]), np.array([True, False, False])


def kept(rows):
    """For each station, whether something on L2 is kept."""
    run = walk([{"width": 0.2, "cuts": {1: row, 2: plane()}} for row in rows], step=STEP).runs[0]
    found = alongside(run, STACKUP, RETURNS, OWN)
    cut = run.stations.cuts[1]
    return [bool(found[1][cut.first[i] : cut.first[i + 1]].any()) for i in range(len(rows))]


def trace(middle, label=FOREIGN, width=0.15):
    return [(middle - width / 2, middle + width / 2, label)]


def test_a_trace_that_follows_for_longer_than_it_is_away():
    # exact: away 0.2 mm, so 5 stations of 0.05 mm are enough and 4 are not
    assert kept([[]] * 3 + [trace(0.0)] * 5 + [[]] * 3) == [False] * 3 + [True] * 5 + [False] * 3
    assert not any(kept([[]] * 3 + [trace(0.0)] * 4 + [[]] * 3))


def test_beside_it_must_follow_for_longer():
    # 0.25 mm from edge to edge, 0.2 mm down: 0.32 mm away, 7 stations
    assert all(kept([trace(0.425)] * 7))
    assert not any(kept([trace(0.425)] * 6))


def test_far_beside_is_no_neighbour():
    assert not any(kept([trace(0.8)] * 40))


@pytest.mark.parametrize(("slope", "counts"), [(0.2, True), (1.0, False), (-1.0, False)])
def test_a_slanting_one_crosses(slope, counts):
    rows = [trace(slope * (k - 10) * STEP, width=0.15 * (1 + slope**2) ** 0.5) for k in range(20)]
    assert any(kept(rows)) == counts


def test_what_crosses_at_a_right_angle_reaches_beyond_the_cut():
    assert not any(kept([[]] * 5 + [[(-1.2, 1.2, FOREIGN)]] * 20 + [[]] * 5))


def test_return_copper_and_the_net_itself_are_no_foreign_traces():
    assert not any(kept([trace(0.0, GND)] * 20))
    assert not any(kept([trace(0.0, OTHER_LEG)] * 20))


def test_two_legs_of_a_foreign_net_are_two_traces():
    assert all(kept([[*trace(-0.2), *trace(0.2)]] * 20))


def test_it_lowers_the_impedance_where_it_follows_and_only_there():
    rows = [[]] * 4 + [trace(0.0)] * 12 + [[]] * 4 + [trace(0.0)] * 3 + [[]] * 3
    walked = walk([{"width": 0.2, "below": 2, "cuts": {1: row, 2: plane()}} for row in rows], step=STEP)
    (profile,), _ = profile_nets([walked], STACKUP, NETS, copper())
    z = profile.runs[0].impedance
    assert len(np.unique(z)) == 2
    assert np.all(z[4:16] == z.min())
    assert z.min() < 0.97 * z.max()
    assert np.all(z[16:] == z.max())
