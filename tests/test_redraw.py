"""The same board drawn otherwise gives the same findings: units, strokes or regions, planes of all kinds, turned, mirrored, moved,
other sources of names."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest

from impcheck.pipeline import run
from sample_boards.draw import logger, sampler
from tests.boards.model import Label, Move, moved, moved_labels
from tests.boards.write_board import Dialect, write_board

NEAR = 0.1  # mm, the design's bar
PLAIN = Dialect("b")
DIALECTS = {
    "inch, netlist": replace(PLAIN, unit="inch", names="netlist", drill_unit="inch", drill_zeros="TZ"),
    "attributes in comments": replace(PLAIN, names="comment", drill_zeros="LZ"),
    "traces as regions": replace(PLAIN, traces={-1: "regions"}),
    "traces drawn twice": replace(PLAIN, traces={-1: "both"}),
    "planes dark and clear": replace(PLAIN, planes={-1: "clear"}),
    "pads as macros": replace(PLAIN, pads="macro"),
    "pads as regions": replace(PLAIN, pads="region"),
    "another order": replace(PLAIN, scramble=3),
}
MOVES = {
    "turned": Move(rotation=37.3),
    "mirrored": Move(mirror=True),
    "far from the origin": Move(shift=(1234.567, -876.5)),
    "turned, mirrored and moved": Move(rotation=-113.7, mirror=True, shift=(-50.1, 20.2)),
}


def compare(board, labels, folder, dialect):
    """The findings that are missing and those that are too many."""
    found = list(run(write_board(board, folder, dialect)).document.findings)
    missing = []
    for label in labels:
        hit = next(
            (f for f in found if (f.rule, f.net, f.layer) == (label.rule, label.net, label.layer) and math.dist(f.at, label.at) <= NEAR),
            None,
        )
        if hit is None:
            missing.append(label)
        else:
            found.remove(hit)
    return missing, [(f.rule, f.net, f.layer, f.at, f.message) for f in found]


@pytest.mark.parametrize("draw", [logger, sampler], ids=["four layers", "six layers"])
@pytest.mark.parametrize("name", DIALECTS)
def test_other_dialects(draw, name, tmp_path):
    board, labels = draw()
    assert compare(board, labels, tmp_path, DIALECTS[name]) == ([], [])


@pytest.mark.parametrize("draw", [logger, sampler], ids=["four layers", "six layers"])
@pytest.mark.parametrize("name", MOVES)
def test_moved(draw, name, tmp_path):
    board, labels = draw()
    assert compare(moved(board, MOVES[name]), moved_labels(labels, MOVES[name]), tmp_path, PLAIN) == ([], [])


def test_negative_planes(tmp_path):
    board, labels = sampler()
    assert compare(board, labels, tmp_path, replace(PLAIN, planes={-1: "regions", 1: "negative", 3: "negative", 4: "negative"})) == ([], [])


def test_no_names_at_all(tmp_path):
    # Without names the returns are found by area, and the capacitors beside WAKE's vias cannot be known: their planes stay unjoined.
    board, labels = logger()
    why = "no file names the parts, so no capacitor can be known"
    labels += [Label("return-via", "WAKE", layer, (x, 29.445), why) for x, layer in ((20.0, "L4"), (34.0, "L1"))]
    assert compare(board, labels, tmp_path, replace(PLAIN, names="none")) == ([], [])
