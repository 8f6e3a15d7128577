"""Stations that agree are one stretch; lengths and delays add up."""

import numpy as np
import pytest

from impcheck.fields.profile import NetProfile, RunProfile
from impcheck.fields.stretches import stretches
from impcheck.path.walk import Zone
from tests.fields.straight import walk


def profile(stations, ohm, eps=3.0):
    walked = walk(stations)
    z = np.array(ohm, float)
    return NetProfile(walked, (RunProfile(z, np.full(len(z), eps), np.full(len(z), 6e-12), np.zeros(len(z))),))


SAME = {"width": 0.3}


def test_stations_that_agree_are_one():
    (found,) = stretches(profile([SAME] * 6, [50.0, 50.04, 50.0, 49.96, 50.0, 50.02]))
    assert found.along == (0.0, 3.0)
    assert (found.start, found.end) == ((0.0, 0.0), (3.0, 0.0))
    assert found.impedance == pytest.approx(50.0033, abs=1e-3)
    assert found.delay == pytest.approx(3.0 * 6e-12, rel=1e-12)
    assert (found.above, found.below, found.coverage, found.zone) == (-1, 1, 1.0, Zone.TRACE)


@pytest.mark.parametrize(
    ("other", "ohm"),
    [
        (SAME, 50.2),
        ({"width": 0.305}, 50.0),
        ({"width": 0.3, "below": 2}, 50.0),
        ({"width": 0.3, "cover": 0.5}, 50.0),
        ({"width": 0.3, "zone": Zone.PAD}, 50.0),
        (SAME, np.nan),
    ],
)
def test_what_parts_them(other, ohm):
    found = stretches(profile([SAME, SAME, other, other], [50.0, 50.0, ohm, ohm]))
    assert [stretch.along for stretch in found] == [(0.0, 1.0), (1.0, 2.0)]
    assert found[1].impedance == pytest.approx(ohm, nan_ok=True)


def test_nothing_is_lost_between_them():
    rng = np.random.default_rng(5)
    stations = [{"width": w} for w in rng.choice([0.2, 0.3], 40)]
    found = stretches(profile(stations, 60 - 40 * np.array([s["width"] for s in stations])))
    assert [a.along[1] for a in found[:-1]] == [b.along[0] for b in found[1:]]
    # exact: 40 stations of 0.5 mm
    assert sum(stretch.delay for stretch in found) == pytest.approx(20 * 6e-12, rel=1e-12)


def test_a_trace_without_reference_is_covered_by_none():
    (found,) = stretches(profile([{"width": 0.3, "below": -1}], [120.0]))
    assert found.coverage == 0.0
