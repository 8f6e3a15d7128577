"""The connectivity of a board. In: artwork and copper; out: labels, names, pins, return nets, declared nets, opens and shorts."""

from __future__ import annotations

from impcheck.artwork.parts import Artwork
from impcheck.copper.copper import Copper
from impcheck.errors import Problems
from impcheck.nets.declare import Declarer
from impcheck.nets.evidence import Finder, gather
from impcheck.nets.faults import find_faults
from impcheck.nets.nets import Nets
from impcheck.nets.returns import return_labels
from impcheck.nets.touching import label


def connect(artwork: Artwork, copper: Copper) -> Nets:
    """Finds which copper belongs to which net.

    Raises InputError, with every problem found, where a declared net, pin, place, join or return net is nowhere in the files.
    """
    piece_label, barrel_label, count = label(copper.layers, copper.barrels)
    evidence = gather(artwork, copper, piece_label, barrel_label)
    names = evidence.names()
    problems = Problems()
    finder = Finder(copper, piece_label, barrel_label)
    declared = Declarer(artwork, finder, names, evidence.pins, problems).all()
    own = {label for net in declared for label in net.labels}
    returns, shown, remarks = return_labels(artwork, copper, piece_label, names, own, problems)
    problems.raise_if_any()
    faults = find_faults(copper, piece_label, barrel_label, evidence, {net.name for net in declared})
    return Nets(piece_label, barrel_label, count, names, tuple(evidence.pins), returns, shown, tuple(declared), tuple(faults), (*evidence.remarks, *remarks))
