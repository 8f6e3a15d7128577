import re

import pytest

from tests.checks.small import BOARD, TOP, found

BROKEN = TOP.replace("X18000000Y5000000D01*\nD11*", "X9800000Y5000000D01*\nX10200000Y5000000D02*\nX18000000Y5000000D01*\nD11*").replace(
    "D10C,0.300000", "D10C,0.300000"
)


def test_a_broken_trace_at_its_break(tmp_path):
    (hit,) = [f for f in found(tmp_path, top_gbr=BROKEN) if f.rule == "open"]
    assert (hit.level, hit.net, hit.layer) == ("error", "CLK", "L1")
    # exact (10, 5); with chords of 1 um error on a radius r of 0.15 mm the nearest point lies at most sqrt(2 r e) = 17 um off the axis
    assert hit.at == pytest.approx((10.0, 5.0), abs=0.018)
    distance = float(re.search(r"here, ([0-9.]+) mm away", hit.message).group(1))
    assert distance == pytest.approx(0.1, abs=2.5e-3)  # 0.4 mm between the ends, less a radius on either side


def test_an_undeclared_net_is_a_note(tmp_path):
    extra = TOP.replace("%TD*%", "%TO.N,OTHER*%\nX5000000Y8000000D03*\nX9000000Y8000000D03*\n%TD*%")
    (hit,) = found(tmp_path, top_gbr=extra)
    assert (hit.rule, hit.level, hit.net) == ("open", "note", "OTHER")


def test_a_net_that_cannot_be_followed_does_not_pass(tmp_path):
    board = BOARD.replace(", from: U1.1, to: J1.1", "")
    (hit,) = found(tmp_path, board, top_gbr=TOP.replace("%TO.P,U1,1*%\n", "").replace("%TO.P,J1,1*%\n", ""))
    assert (hit.rule, hit.level) == ("open", "error")
    assert "cannot be followed" in hit.message


def test_a_whole_net_is_fine(tmp_path):
    assert found(tmp_path) == []
