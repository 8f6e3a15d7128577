"""Which nets may carry return current. In: names, areas and the board file's wishes; out: labels and their names."""

from __future__ import annotations

from collections.abc import Mapping, Set

import numpy as np
import shapely

from impcheck.artwork.board import Board
from impcheck.artwork.image import Ints
from impcheck.artwork.names import did_you_mean, matching
from impcheck.copper.copper import Copper
from impcheck.errors import Problems, Remark, RemarkKind

SHARE = 0.1  # of the board's area on some layer makes a net a return when the board file names none


def named_returns(
    board: Board, names: Mapping[int, tuple[str, ...]], called: Set[str], problems: Problems
) -> tuple[frozenset[int], tuple[str, ...]]:
    """Labels and names of the return nets the board file asks for; a problem for each pattern that means no net. `called`: the declared
    nets, which a pattern does not take in."""
    known = {name for found in names.values() for name in found}
    chosen: set[str] = set()
    for pattern in board.returns:
        hits = matching(pattern, known)
        if not hits:
            remedy = did_you_mean(pattern, known, "the files name no nets: leave `returns` out to take nets by their area")
            problems.add(board.file, 0, f"return net '{pattern}' is nowhere in the files", remedy)
        chosen.update(hit for hit in hits if hit == pattern or hit not in called)
    return frozenset(label for label, found in names.items() if chosen & set(found)), tuple(sorted(chosen))


def returns_by_area(copper: Copper, piece_label: tuple[Ints, ...]) -> frozenset[int]:
    """Labels that cover at least a tenth of the board on some layer."""
    x0, y0, x1, y1 = copper.outline_box
    enough = SHARE * (x1 - x0) * (y1 - y0)
    found: set[int] = set()
    for layer, labels in zip(copper.layers, piece_label, strict=True):
        if len(labels) == 0 or enough <= 0:
            continue
        total = np.bincount(labels, weights=shapely.area(layer.shape))  # overlaps count twice here, so the few candidates are united
        for label in np.flatnonzero(total >= enough).tolist():
            mine = layer.shape[labels == label]
            if shapely.area(mine).max() >= enough or shapely.union_all(mine).area >= enough:
                found.add(label)
    return frozenset(found)


def remark_on(shown: tuple[str, ...], file: str) -> Remark:
    """What the user is told where the returns were taken by area."""
    if shown:
        text = f"return nets are those that cover at least a tenth of the board on some layer: {', '.join(shown)}"
    else:
        text = "no net covers a tenth of the board on any layer, so nothing was taken as a reference plane"
    return Remark(RemarkKind.GUESS, text + " (say `returns` in the board file to choose)", file)
