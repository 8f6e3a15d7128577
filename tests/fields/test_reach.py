"""Copper that a cut only meets as far as its reach goes on beyond it: a plane seen through an opening wider than the reach is no strip."""

import pytest

from impcheck.fields import Coating, Conductor, Section, Slab, solve
from impcheck.pipeline import run
from sample_boards.draw import OUTER
from tests.boards.model import Cut
from tests.boards.write_board import write_board
from tests.checks.small import four

HALF = 4.0  # mm, half of the opening: its edges change the impedance by 0.3 % only (solved)


def test_the_plane_behind_an_opening_wider_than_the_cut_is_whole(tmp_path):
    board = four()
    board.trace("S", 0, OUTER, (10, 10), (60, 10))
    plane = board.planes[0]
    board.planes[0] = type(plane)(
        plane.net, plane.layer, plane.outline, (Cut(((30, 10 - HALF), (32, 10 - HALF), (32, 10 + HALF), (30, 10 + HALF))),)
    )
    checked = run(write_board(board, tmp_path))
    found = checked.document.nets[0].impedance_ohm.max
    stack = checked.artwork.stackup
    (low, high), _, (_, floor), _ = stack.heights
    cut = stack.coppers[0].etch / 2
    trace = Conductor("s", "signal", ((-OUTER / 2, low), (OUTER / 2, low), (OUTER / 2 - cut, high), (-OUTER / 2 + cut, high)))
    slabs = tuple(Slab(max(s.bottom, floor), s.top, s.er) for s in stack.slabs if s.top > floor)
    mask = stack.mask_top
    whole = solve(Section(slabs, (trace,), (floor,), Coating(mask.thickness, mask.er))).z0
    assert found == pytest.approx(whole, rel=0.01)
