"""Which nets may carry return current. In: names, areas and the board file's wishes; out: labels and their names."""

from __future__ import annotations

import numpy as np
import shapely

from impcheck.artwork.image import Ints
from impcheck.artwork.names import did_you_mean, matching
from impcheck.artwork.parts import Artwork
from impcheck.copper.copper import Copper
from impcheck.errors import Problems, Remark, RemarkKind

SHARE = 0.1  # of the board's area on some layer makes a net a return when the board file names none


def return_labels(
    artwork: Artwork, copper: Copper, piece_label: tuple[Ints, ...], names: dict[int, tuple[str, ...]], declared: set[int], problems: Problems
) -> tuple[frozenset[int], tuple[str, ...], list[Remark]]:
    """Labels of the return nets, the names to show for them, and what was assumed."""
    wanted = artwork.board.returns
    if wanted:
        known = sorted({name for found in names.values() for name in found})
        chosen: set[str] = set()
        for pattern in wanted:
            hits = matching(pattern, known)
            if not hits:
                problems.add(artwork.board.file, 0, f"return net '{pattern}' is nowhere in the files", did_you_mean(pattern, known))
            chosen.update(hits)
        labels = frozenset(label for label, found in names.items() if chosen & set(found)) - declared
        return labels, tuple(sorted(chosen)), []
    labels = _by_area(copper, piece_label) - declared
    shown = tuple(sorted({names[label][0] if label in names else "unnamed copper" for label in labels}))
    if shown:
        text = f"return nets are those that cover at least a tenth of the board on some layer: {', '.join(shown)} (say `returns:` in the board file to choose)"
    else:
        text = "no net covers a tenth of the board on any layer: nothing was taken as a reference plane (say `returns:` in the board file)"
    return labels, shown, [Remark(RemarkKind.GUESS, text, artwork.board.file)]


def _by_area(copper: Copper, piece_label: tuple[Ints, ...]) -> frozenset[int]:
    x0, y0, x1, y1 = copper.outline_box
    enough = SHARE * (x1 - x0) * (y1 - y0)
    found: set[int] = set()
    for layer, labels in zip(copper.layers, piece_label, strict=True):
        if len(labels) == 0:
            continue
        total = np.bincount(labels, weights=shapely.area(layer.shape))  # overlaps count twice here, so the few candidates are united
        for label in np.flatnonzero(total >= enough).tolist():
            mine = layer.shape[labels == label]
            if shapely.area(mine).max() >= enough or shapely.area(shapely.union_all(mine)) >= enough:
                found.add(label)
    return frozenset(found)
