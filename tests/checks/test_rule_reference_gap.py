import pytest

from tests.checks.small import BOARD, BOTTOM, cleared, found

GAP = "reference-gap"
SPLIT = BOARD.replace("returns: [GND]", "returns: [GND, VCC]")


def two_planes(moat):
    """GND up to x = 10, VCC from there on, `moat` mm between."""
    left, right = 10 - moat / 2, 10 + moat / 2
    halves = []
    for net, x0, x1 in (("GND", 0, left), ("VCC", right, 20)):
        corners = [(x0, 0), (x1, 0), (x1, 10), (x0, 10), (x0, 0)]
        points = "\n".join(f"X{x * 1e6:.0f}Y{y * 1e6:.0f}D0{2 if k == 0 else 1}*" for k, (x, y) in enumerate(corners))
        halves.append(f"%TO.N,{net}*%\nG36*\n{points}\nG37*")
    return BOTTOM[: BOTTOM.index("%TO.N")] + "G01*\n" + "\n".join(halves) + "\nM02*\n"


def gaps(findings):
    return [f for f in findings if f.rule == GAP]


def test_a_void_under_the_trace(tmp_path):
    (hit,) = gaps(found(tmp_path, bottom_gbr=cleared((9, 4, 10, 6))))
    assert (hit.level, hit.layer) == ("error", "L1")
    assert hit.at == pytest.approx((9.5, 5.0), abs=0.02)
    assert hit.measured == pytest.approx(1.0, abs=0.02)
    assert "a void in GND, 1.98 mm across the trace" in hit.message or "a void in GND, 1.99 mm across" in hit.message
    assert "no whole plane above it makes up for it" in hit.message


def test_a_slot_across_and_the_way_round_its_nearer_end(tmp_path):
    (hit,) = gaps(found(tmp_path, bottom_gbr=cleared((9, 3, 9.3, 9))))
    assert "a slot in GND" in hit.message
    assert "the return goes round its nearer end, 3.9" in hit.message  # twice 2 mm, less the hairline that closes cut-ins


def test_a_slot_that_runs_out_of_the_plane(tmp_path):
    (hit,) = gaps(found(tmp_path, bottom_gbr=cleared((9, -1, 9.3, 7))))
    assert "a slot in GND that runs out of the plane" in hit.message


@pytest.mark.parametrize("moat", [0.4, 0.05])
def test_a_split_is_found_however_narrow(moat, tmp_path):
    (hit,) = gaps(found(tmp_path, SPLIT, bottom_gbr=two_planes(moat)))
    assert hit.at == pytest.approx((10.0, 5.0), abs=0.05)
    assert "a split between GND and VCC" in hit.message


def test_a_void_shorter_than_the_limit_is_none(tmp_path):
    assert gaps(found(tmp_path, bottom_gbr=cleared((9, 4, 9.08, 6)))) == []


def test_an_opening_beside_the_trace_is_none(tmp_path):
    assert gaps(found(tmp_path, bottom_gbr=cleared((9, 5.3, 10, 7)))) == []


def test_part_of_the_width_counts(tmp_path):
    (hit,) = gaps(found(tmp_path, bottom_gbr=cleared((9, 5.05, 10, 7))))
    assert hit.at == pytest.approx((9.5, 5.0), abs=0.02)


def test_a_plane_that_ends_for_good(tmp_path):
    (hit,) = gaps(found(tmp_path, bottom_gbr=cleared((13, -1, 21, 11))))
    assert "ends here and does not come back" in hit.message
    assert hit.at == pytest.approx((15.25, 5.0), abs=0.1)  # from the plane's end at 13 to the pad at 17.5
