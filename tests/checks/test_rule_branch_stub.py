import pytest

from sample_boards.draw import OUTER
from tests.boards.model import Pad
from tests.checks.small import four, of_board


def with_branch(length, pin=False):
    board = four()
    board.trace("S", 0, OUTER, (10, 10), (60, 10))
    board.trace("S", 0, OUTER, (30, 10), (30, 10 + length))
    if pin:
        board.pads.append(Pad("S", 0, (30, 10 + length), "circle", (0.5, 0.5), 0, "TP1", "1"))
    return board


def stubs(findings):
    return [f for f in findings if f.rule == "branch-stub"]


def test_copper_that_leads_nowhere(tmp_path):
    (hit,) = stubs(of_board(tmp_path, with_branch(4.0)))
    assert hit.at == pytest.approx((30.0, 10.0), abs=0.01)
    assert hit.level == "warning"
    # from the edge of the path to the round end of the branch: 4 mm - w / 2 + w / 2
    assert hit.measured == pytest.approx(4.0, abs=0.02)
    assert "leads to an open end" in hit.message


def test_a_pin_that_is_no_declared_end(tmp_path):
    (hit,) = stubs(of_board(tmp_path, with_branch(4.0, pin=True)))
    assert "leads to pin TP1.1" in hit.message


def test_with_the_ends_left_out_every_pin_is_on_the_path(tmp_path):
    board = with_branch(4.0, pin=True)
    board.nets = [type(board.nets[0])("S", "fast")]
    assert stubs(of_board(tmp_path, board)) == []


def test_a_short_one_is_fine(tmp_path):
    # 5 % of the 17 mm that 100 ps cover is 0.85 mm
    assert stubs(of_board(tmp_path, with_branch(0.7))) == []
