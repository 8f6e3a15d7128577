"""Random boards with random defects, in random dialects, turned and moved: what was spoilt is found by its rule, on its net, in its
place, and nothing else is."""

from __future__ import annotations

import math

import pytest

from impcheck.pipeline import run
from tests.boards.model import moved, moved_labels
from tests.boards.random_board import board_of
from tests.boards.write_board import write_board

NEAR = 0.1  # mm, the design's bar


@pytest.mark.parametrize("seed", range(48))
def test_what_was_spoilt_is_found_and_nothing_else(seed, tmp_path):
    board, labels, dialect, move = board_of(seed)
    found = list(run(write_board(moved(board, move), tmp_path, dialect)).document.findings)
    missing = []
    for label in moved_labels(labels, move):
        hit = next(
            (f for f in found if (f.rule, f.net, f.layer) == (label.rule, label.net, label.layer) and math.dist(f.at, label.at) <= NEAR),
            None,
        )
        if hit is None:
            missing.append(label)
        else:
            found.remove(hit)
    assert (missing, [(f.rule, f.net, f.layer, f.at, f.message) for f in found]) == ([], [])
