"""Opens and shorts of the whole board. In: labels and what each source names them; out: faults with a place in mm and a sentence."""

from __future__ import annotations

import math
from collections import Counter, defaultdict

import numpy as np
import shapely

from impcheck.artwork.image import Kind
from impcheck.artwork.names import natural
from impcheck.copper.copper import Copper
from impcheck.nets.evidence import ON_COPPER, Evidence, Finder, by_count
from impcheck.nets.meeting import Meetings, Spot
from impcheck.nets.nets import BoardPin, DeclaredNet, NetFault


def find_faults(copper: Copper, finder: Finder, evidence: Evidence, declared: list[DeclaredNet]) -> list[NetFault]:
    """Every short and every open: those of declared nets first, then shorts after opens, by name."""
    search = _Search(copper, finder, evidence, {net.name for net in declared})
    search.take_declared(declared)
    found = [*_opens(search), *_shorts(search)]
    told = {fault.nets[0] for fault in found if fault.kind == "open"}
    found += [fault for net in declared if net.name not in told for fault in _parted_ends(net)]
    return sorted(found, key=lambda fault: (not fault.declared, fault.kind, [natural(name) for name in fault.nets], fault.at))


class _Search:
    """What the search for faults needs."""

    def __init__(self, copper: Copper, finder: Finder, evidence: Evidence, declared: set[str]) -> None:
        self.copper, self.finder, self.evidence, self.declared = copper, finder, evidence, declared
        self.declared_names: dict[int, Counter[str]] = defaultdict(Counter)
        self.meetings = Meetings(copper, finder, evidence)
        self.pins: dict[tuple[int, str], list[BoardPin]] = defaultdict(list)
        for pin in evidence.pins:
            self.pins[pin.label, pin.net].append(pin)
        numbers = {(pin.component, pin.number) for pin in evidence.pins if pin.component}
        self.pin_count = Counter(component for component, _ in numbers)

    def take_declared(self, declared: list[DeclaredNet]) -> None:
        """Names that only declarations give, by the ends they name."""
        for net in declared:
            for pin in (*net.begin, *net.ends):
                known = {**self.evidence.attribute_names.get(pin.label, {}), **self.evidence.netlist_names.get(pin.label, {})}
                if not known:
                    self.declared_names[pin.label][net.name] += 1
                    self.evidence.places[pin.label, net.name].append((pin.at, pin.layer))

    def nearest(self, one: int, other: int) -> tuple[tuple[float, float], int, float] | None:
        """Where two labels come nearest on one layer: the middle between them, the layer, the distance in mm; None where they share no
        layer."""
        best: tuple[float, int, tuple[float, float]] | None = None
        for layer, (copper, labels) in enumerate(zip(self.copper.layers, self.finder.piece_label, strict=True)):
            mine, others = copper.shape[labels == one], copper.shape[labels == other]
            if len(mine) == 0 or len(others) == 0:
                continue
            (which, hit), distance = shapely.STRtree(mine).query_nearest(others, return_distance=True, all_matches=False)
            nearest = int(np.argmin(distance))
            middle = shapely.line_interpolate_point(shapely.shortest_line(others[which[nearest]], mine[hit[nearest]]), 0.5, normalized=True)
            best = min(
                best or (math.inf, 0, (0.0, 0.0)),
                (float(distance[nearest]), layer, (float(shapely.get_x(middle)), float(shapely.get_y(middle)))),
            )
        return None if best is None else (best[2], best[1], best[0])

    def somewhere(self, label: int, name: str) -> Spot:
        """A place where a label bears a name."""
        if pins := self.pins.get((label, name)):
            return pins[0].at, pins[0].layer
        if places := self.evidence.places.get((label, name)):
            return places[0]
        return self.meetings.place(min(self.meetings.named_nodes(label, name)))


def _shorts(search: _Search) -> list[NetFault]:
    found: list[NetFault] = []
    told: set[tuple[int, frozenset[str]]] = set()
    sources = (search.evidence.attribute_names, search.evidence.netlist_names, search.declared_names)
    for names_of in sources:  # each by itself: they may use different names
        for label, counted in sorted(names_of.items()):
            first, *others = by_count(counted)
            for other in others:
                pair = frozenset((first, other))
                if (label, pair) not in told:
                    told.add((label, pair))
                    found.append(_short(search, label, first, other))
    return [*found, *_renamed(search, told)]


def _short(search: _Search, label: int, one: str, other: str) -> NetFault:
    tie = frozenset((one, other)) in search.evidence.ties or _tied_by_a_part(search, label, one, other)
    where = search.meetings.meeting(label, one, other)
    names = tuple(sorted((one, other), key=natural))
    told = f"nets {names[0]} and {names[1]} are one piece of copper"
    if where is None:
        where = search.somewhere(label, other)
        told += f"; where they meet cannot be told, this is a place of {other}"
    else:
        told += ": they meet here"
    if tie:
        told += ", at a net tie (one part whose pads of the two nets are one copper)"
    return NetFault("short", names, bool(search.declared & set(names)), tie, *where, told)


def _tied_by_a_part(search: _Search, label: int, one: str, other: str) -> bool:
    """True where a two-pin part has a pin of each net on this copper and its two pads touch."""
    others = {pin.component: pin for pin in search.pins[label, other]}
    for a in search.pins[label, one]:
        b = others.get(a.component)
        if not a.component or b is None or search.pin_count[a.component] != 2 or a.layer is None or a.layer != b.layer:
            continue
        layer = search.copper.layers[a.layer]
        owner = layer.object
        pad = (owner >= 0) & ((layer.image.kind[owner] == Kind.FLASH) | (layer.image.pin[owner] >= 0))
        tree = search.finder.tree(a.layer)
        at_a, at_b = (
            [piece for piece in tree.query(shapely.Point(pin.at), predicate="dwithin", distance=ON_COPPER).tolist() if pad[piece]]
            for pin in (a, b)
        )
        if any(x != y and shapely.dwithin(layer.shape[x], layer.shape[y], ON_COPPER) for x in at_a for y in at_b):
            return True
    return False


def _renamed(search: _Search, told: set[tuple[int, frozenset[str]]]) -> list[NetFault]:
    """Copper that the attributes and the netlist call by different names, where that is more than a renaming: one of the two names
    stands on other copper as well."""
    attributes, netlist = search.evidence.attribute_names, search.evidence.netlist_names
    labels_of: dict[str, set[int]] = defaultdict(set)
    for source in (attributes, netlist):
        for label, counted in source.items():
            for name in counted:
                labels_of[name].add(label)
    found = []
    for label in sorted(attributes.keys() & netlist.keys()):
        one, other = by_count(attributes[label])[0], by_count(netlist[label])[0]
        if one in netlist[label] or other in attributes[label] or (label, frozenset((one, other))) in told:
            continue
        if len(labels_of[one]) > 1 or len(labels_of[other]) > 1:
            names = tuple(sorted((one, other), key=natural))
            text = f"the netlist calls this copper {other}, the artwork {one}, and one of the two names stands on other copper as well"
            where = search.somewhere(label, other)
            found.append(NetFault("short", names, bool(search.declared & set(names)), False, *where, text))
    return found


def _opens(search: _Search) -> list[NetFault]:
    """Names that stand on pins, netlist points or pads of more than one label."""
    labels_of: dict[str, list[int]] = defaultdict(list)
    for name, label in sorted(search.evidence.anchored, key=lambda found: (natural(found[0]), found[1])):
        labels_of[name].append(label)
    found = []
    for name, labels in labels_of.items():
        if len(labels) < 2:
            continue
        attributes, netlist = search.evidence.attribute_names, search.evidence.netlist_names
        weight = {label: attributes.get(label, Counter())[name] + netlist.get(label, Counter())[name] for label in labels}
        main = max(labels, key=lambda label: (weight[label], -label))
        (at, layer), told, alone = min(
            ((*_alone(search, label, name), label) for label in labels if label != main), key=lambda one: (one[0][0], one[1])
        )
        more = "" if len(labels) == 2 else f" ({len(labels)} separate pieces in all)"
        text = f"net {name} is not one piece of copper: {told} stands alone{more}"
        break_at = search.nearest(main, alone)
        if break_at is not None:
            at, layer, gap = break_at
            text += f"; it comes nearest to the rest here, {gap:.3f} mm away"
        found.append(NetFault("open", (name,), name in search.declared, False, at, layer, text))
    return found


def _alone(search: _Search, label: int, name: str) -> tuple[Spot, str]:
    pins = search.pins[label, name]
    at, layer = search.somewhere(label, name)
    if pins:
        return (at, layer), ", ".join(map(str, pins[:4])) + (", ..." if len(pins) > 4 else "")
    return (at, layer), f"copper at ({at[0]:.3f}, {at[1]:.3f})"


def _parted_ends(net: DeclaredNet) -> list[NetFault]:
    """A declared net whose ends no copper and no join connects."""
    group = {label: label for label in net.labels}
    for join in net.joins:
        old, new = (group[pin.label] for pin in join.pins)
        group = {label: new if of == old else of for label, of in group.items()}
    pins = (*net.begin, *net.ends)
    apart = [pin for pin in pins[1:] if group.get(pin.label, pin.label) != group.get(pins[0].label, pins[0].label)]
    if not apart:
        return []
    text = f"net {net.name} is not one piece of copper: nothing joins {pins[0]} to {', '.join(map(str, apart[:4]))}"
    return [NetFault("open", (net.name,), True, False, apart[0].at, apart[0].layer, text)]
