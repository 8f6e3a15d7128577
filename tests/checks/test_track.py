"""What is one spot, and where its worst place is."""

from dataclasses import replace

import numpy as np
import pytest

from impcheck.checks.track import Track
from impcheck.fields.profile import NetProfile, RunProfile
from impcheck.path.walk import Run, Zone
from tests.fields.straight import walk

STEP = 0.1


def track(zones, parts=1, layers=(0, 0), apart=0.0):
    """A straight net with a station of 0.1 mm for each letter: t trace, b bend, j junction, p pad; in `parts` runs that follow each
    other, the second shifted by `apart` mm."""
    letters = {"t": Zone.TRACE, "b": Zone.BEND, "j": Zone.JUNCTION, "p": Zone.PAD}
    whole = walk([{"width": 0.2, "zone": letters[z]} for z in zones], step=STEP)
    runs = [whole.runs[0]]
    if parts == 2:
        half = len(zones) // 2
        s = whole.runs[0].stations
        runs = []
        for k, mine in enumerate((slice(0, half), slice(half, None))):
            piece = replace(
                s,
                **{
                    name: getattr(s, name)[mine]
                    for name in ("begin", "end", "at", "left_normal", "width", "centre", "zone", "above", "below")
                },
                coverage_above=s.coverage_above[mine],
                coverage_below=s.coverage_below[mine],
            )
            ends = np.array([[piece.begin[0] + k * apart, 0.0], [piece.end[-1] + k * apart, 0.0]])
            runs.append(Run(layers[k], ends, (float(piece.begin[0]), float(piece.end[-1])), piece))
    fields = tuple(RunProfile(*(np.full(len(run.stations), value) for value in (50.0, 4.0, 6e-12, 0.0))) for run in runs)
    return Track(NetProfile(replace(whole, runs=tuple(runs)), fields))


def spots(found, marks, badness=None):
    marked = np.array([mark == "x" for mark in marks])
    judged = found.trace | found.bends
    return list(found.spots(marked & judged, judged, np.where(marked, 1.0, 0.0) if badness is None else np.array(badness, float)))


def extents(found):
    return [pytest.approx(spot.along, abs=1e-9) for spot in found]


def test_marked_stations_that_follow_each_other_are_one():
    (spot,) = spots(track("tttttttttt"), "..xxxx....")
    assert spot.along == pytest.approx((0.2, 0.6))
    assert spot.length == pytest.approx(0.4)


@pytest.mark.parametrize(("marks", "count"), [("xx.xx.....", 1), ("xx..xx....", 1), ("xx...xx...", 2), ("x....x...x", 3)])
def test_what_is_good_for_less_than_a_fifth_of_a_millimetre_parts_nothing(marks, count):
    found = spots(track("tttttttttt"), marks)
    assert len(found) == count
    # exact: only what is marked counts as its length
    assert sum(spot.length for spot in found) == pytest.approx(STEP * marks.count("x"))


def test_what_is_not_judged_parts_nothing():
    (spot,) = spots(track("tttpppppptttt"), "xxx......xx..")
    assert spot.along == pytest.approx((0.0, 1.1))
    assert spot.length == pytest.approx(0.5)


def test_what_is_judged_good_beside_it_does():
    assert len(spots(track("ttttttpppptttttt"), "xx............xx")) == 2


def test_runs_that_follow_each_other_on_a_layer_are_one():
    (spot,) = spots(track("t" * 10, parts=2), "...xxxx...")
    assert spot.along == pytest.approx((0.3, 0.7))


def test_another_layer_parts_them():
    assert extents(spots(track("t" * 10, parts=2, layers=(0, 2)), "...xxxx...")) == [(0.3, 0.5), (0.5, 0.7)]


def test_a_jump_parts_them():
    assert len(spots(track("t" * 10, parts=2, apart=1.0), "...xxxx...")) == 2


def test_the_worst_place_is_the_middle_of_the_worst_stations():
    found = track("t" * 10)
    badness = [0, 0, 1, 1, 5, 5.1, 5, 1, 0, 0]
    (spot,) = spots(found, "..xxxxxx..", badness)
    assert spot.worst_along == pytest.approx(0.55)
    assert found.place(spot.worst, spot.worst_along) == pytest.approx((0.55, 0.0))
    assert found.span(spot) == (pytest.approx((0.2, 0.0)), pytest.approx((0.8, 0.0)))


def test_a_net_that_was_not_solved_has_the_usual_delay():
    found = track("tt")
    bare = NetProfile(found.walk, tuple(RunProfile(*(np.full(2, np.nan) for _ in range(4))) for _ in found.walk.runs))
    # permittivity 4: twice as slow as light, 3.336 ps/mm
    assert Track(bare).delay_per_mm == pytest.approx(2 * 3.336e-12, rel=1e-3)
