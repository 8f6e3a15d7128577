import pytest

from sample_boards.draw import OUTER, box
from tests.boards.model import Plane
from tests.boards.parts import chip, via
from tests.checks.small import four, of_board


def changed(near, other="GND", capacitor=False):
    """Two changes of layer, L1 to L4 at x = 20 and back at x = 50, ground vias `near` mm beside each."""
    board = four()
    for x in (20.0, 50.0):
        via(board, "S", (x, 10.0))
        if near:
            via(board, "GND", (x, 10.0 + near))
    board.trace("S", 0, OUTER, (10, 10), (20, 10))
    board.trace("S", 3, OUTER, (20, 10), (50, 10))
    board.trace("S", 0, OUTER, (50, 10), (60, 10))
    if other != "GND":
        via(board, other, (9, 45), first=2, last=3)
        board.planes[1] = Plane(other, 2, box(0.5, 0.5, 79.5, 49.5))
        board.returns = ("GND", other)
    if capacitor:
        for k, x in enumerate((20.0, 50.0)):
            chip(board, f"C{k + 1}", (x, 11.2), 0, (other, "GND"))
            for net, way in ((other, -1), ("GND", 1)):
                board.trace(net, 0, 0.3, (x + way * 0.48, 11.2), (x + way * 1.4, 11.2))
                via(board, net, (x + way * 1.4, 11.2))
    return board


def missing(findings):
    return [f for f in findings if f.rule == "return-via"]


def test_a_return_via_beside_each_change_is_fine(tmp_path):
    assert of_board(tmp_path, changed(0.8)) == []


def test_none_near(tmp_path):
    hits = missing(of_board(tmp_path, changed(5.0)))
    assert [hit.at for hit in hits] == [pytest.approx((20.0, 10.0), abs=1e-3), pytest.approx((50.0, 10.0), abs=1e-3)]
    assert {hit.level for hit in hits} == {"warning"}
    assert hits[0].measured == pytest.approx(5.0, abs=1e-3)
    assert "from L1 to L4 the return current changes from GND on L2 to GND on L3" in hits[0].message


def test_none_at_all(tmp_path):
    hits = missing(of_board(tmp_path, changed(0.0)))
    assert len(hits) == 2
    assert hits[0].measured is None
    assert "no via joins them anywhere" in hits[0].message


def test_planes_of_different_nets_need_a_capacitor(tmp_path):
    hits = missing(of_board(tmp_path / "without", changed(0.8, "VDD")))
    assert len(hits) == 2
    assert "no capacitor joins them anywhere" in hits[0].message
    assert missing(of_board(tmp_path / "with", changed(0.8, "VDD", capacitor=True))) == []


def test_a_plane_both_sides_share_needs_nothing(tmp_path):
    # L1 to L4 and back where L3 is no return: both sides refer to L2
    board = changed(0.0)
    board.planes.pop(1)
    assert missing(of_board(tmp_path, board)) == []
