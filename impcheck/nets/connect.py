"""The connectivity of a board. In: artwork and copper; out: labels, names, pins, return nets, declared nets, opens and shorts."""

from __future__ import annotations

from impcheck.artwork.parts import Artwork
from impcheck.copper.copper import Copper
from impcheck.errors import Problems
from impcheck.nets.declare import Declarer
from impcheck.nets.evidence import Finder, gather
from impcheck.nets.faults import find_faults
from impcheck.nets.nets import Nets
from impcheck.nets.returns import named_returns, remark_on, returns_by_area
from impcheck.nets.touching import label_copper


def connect(artwork: Artwork, copper: Copper) -> Nets:
    """Finds which copper belongs to which net.

    Raises InputError, with every problem found, where a declared net, pin, place, join or return net is nowhere in the files, or where
    a net's end lies on another net.
    """
    piece_label, barrel_label, count = label_copper(copper.layers, copper.barrels)
    finder = Finder(copper, piece_label, barrel_label)
    evidence = gather(artwork, copper, finder)
    names = evidence.names()
    problems = Problems()
    declared = Declarer(artwork, finder, names, evidence.pins, problems).all()
    called = {net.name for net in declared}
    own = {
        label for net in declared for label in net.labels if set(names.get(label, ())) <= called
    }  # a plane shorted to a net stays a plane
    remarks = list(evidence.remarks)
    if artwork.board.returns:
        returns, shown = named_returns(artwork.board, names, called, problems)
    else:
        returns = returns_by_area(copper, piece_label) - own
        shown = tuple(sorted({names[label][0] if label in names else "unnamed copper" for label in returns}))
        remarks.append(remark_on(shown, artwork.board.file))
    problems.raise_if_any()
    return Nets(
        piece_label=piece_label,
        barrel_label=barrel_label,
        count=count,
        names=names,
        pins=tuple(evidence.pins),
        returns=returns,
        return_names=shown,
        declared=tuple(declared),
        faults=tuple(find_faults(copper, finder, evidence, declared)),
        remarks=tuple(remarks),
    )
