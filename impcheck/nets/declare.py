"""The nets a board file declares, found in the copper. In: requests, names, pins; out: declared nets with their ends, or problems with
their lines."""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass, replace

import numpy as np

from impcheck.artwork.board import End, NetRequest
from impcheck.artwork.names import did_you_mean, matching
from impcheck.artwork.parts import Artwork
from impcheck.errors import Problems
from impcheck.nets.evidence import NEAR_COPPER, ON_COPPER, Finder
from impcheck.nets.mask_places import mask_places
from impcheck.nets.nets import BoardPin, DeclaredNet, Join


@dataclass
class Declarer:
    """Resolves the requests of one board file."""

    artwork: Artwork
    finder: Finder
    names: dict[int, tuple[str, ...]]  # extended with the declared names of copper no source names
    pins: list[BoardPin]
    problems: Problems

    def __post_init__(self) -> None:
        self.labels_of: dict[str, list[int]] = defaultdict(list)
        for label, found in self.names.items():
            for name in found:
                self.labels_of[name].append(label)
        self.by_pin: dict[tuple[str, str], list[BoardPin]] = defaultdict(list)
        self.by_component: dict[str, list[BoardPin]] = defaultdict(list)
        for pin in self.pins:
            self.by_pin[pin.component, pin.number].append(pin)
            self.by_component[pin.component].append(pin)
        self.christened: set[int] = set()  # labels that only declarations name
        self.file = self.artwork.board.file

    def all(self) -> list[DeclaredNet]:
        """Every declared net, in the order of the board file."""
        found: list[DeclaredNet] = []
        joins = self.joins()
        for request in self.artwork.board.nets:
            if request.legs is None:
                found.extend(self.single(request, joins))
            else:
                for leg, name, side in zip("pn", request.legs, (0, 1), strict=True):
                    own = replace(request, net=name, begin=request.begin[side : side + 1], end=request.end[side : side + 1], legs=None)
                    found.extend(replace(net, request=request, pair=request.net, leg=leg) for net in self.single(own, joins))
        seen: dict[str, DeclaredNet] = {}
        for net in found:
            seen.setdefault(net.name, net)  # an earlier, more exact entry wins over a later pattern
        return list(seen.values())

    def single(self, request: NetRequest, joins: list[Join]) -> list[DeclaredNet]:
        """The nets one request stands for."""
        hits = matching(request.net, self.labels_of)
        wanted = {label for name in hits for label in self.labels_of[name]}
        begin = [pin for end in request.begin if (pin := self.end(end, wanted)) is not None]
        ends = [pin for end in request.end if (pin := self.end(end, wanted)) is not None]
        if len(begin) < len(request.begin) or len(ends) < len(request.end):
            return []
        if not hits:
            unnamed = [pin.label for pin in (*begin, *ends) if pin.label not in self.names or pin.label in self.christened]
            if not unnamed or len(unnamed) < len(begin) + len(ends):
                self.problems.add(
                    self.file, request.line, f"net '{request.net}' is nowhere in the files", did_you_mean(request.net, self.labels_of)
                )
                return []
            for label in dict.fromkeys(unnamed):
                self.names[label] = (*self.names.get(label, ()), request.net)  # two names given here are a short
                self.christened.add(label)
                self.labels_of[request.net].append(label)
            hits = [request.net]
        if len(hits) > 1 and (begin or ends):
            self.problems.add(
                self.file,
                request.line,
                f"'{request.net}' stands for {len(hits)} nets, so from and to cannot name one pin",
                "leave from and to out, or declare the nets one by one",
            )
            return []
        return [self.declared(name, request, begin, ends, joins) for name in hits]

    def declared(self, name: str, request: NetRequest, begin: list[BoardPin], ends: list[BoardPin], joins: list[Join]) -> DeclaredNet:
        """One net with its copper, the joins that lead on, and its ends."""
        labels = list(self.labels_of[name])
        used: list[Join] = []
        grown = True
        while grown:
            grown = False
            for join in joins:
                a, b = (pin.label for pin in join.pins)
                if join not in used and (a in labels or b in labels) and a != b:
                    used.append(join)
                    labels.extend(label for label in (a, b) if label not in labels)
                    grown = True
        self.check_ends(name, request, labels, [*begin, *ends])
        if not begin or not ends:
            through = {id(pin) for join in used for pin in join.pins}
            own = [pin for pin in self.own_pins(name, labels) if id(pin) not in through] or mask_places(self.finder, labels)
            taken = {(pin.component, pin.number) for pin in (*begin, *ends) if pin.component}
            rest = [pin for pin in own if not pin.component or (pin.component, pin.number) not in taken]
            if not begin and rest:
                begin, rest = rest[:1], rest[1:]
            ends = ends or rest
        wanted = self.artwork.board.classes[request.net_class]
        return DeclaredNet(name, request, wanted, tuple(labels), tuple(begin), tuple(ends), tuple(used))

    def own_pins(self, name: str, labels: list[int]) -> list[BoardPin]:
        """Pins on a net's copper. Where some are named for the net, those on the same copper named for another (a short) are left out."""
        found = [pin for pin in self.pins if pin.label in labels]
        sure = {pin.label for pin in found if pin.net == name}
        return [pin for pin in found if pin.label not in sure or pin.net in (name, "")]

    def check_ends(self, name: str, request: NetRequest, labels: list[int], pins: list[BoardPin]) -> None:
        """A problem for each end that lies on the copper of another net. On unnamed copper it may be the far side of an open."""
        for end, pin in zip((*request.begin, *request.end), pins, strict=True):
            if pin.label not in labels and pin.label in self.names:
                other = self.names[pin.label][0]
                self.problems.add(
                    self.file,
                    end.line or request.line,
                    f"{end} is on net '{other}', not on '{name}'",
                    "give an end on the net's own copper, or name the part between the two under `joins`",
                )

    def end(self, end: End, wanted: set[int]) -> BoardPin | None:
        """The pin or place an end names, on the wanted copper where it can be; None (and a problem) where there is none."""
        if end.at is not None:
            return self.place(end, wanted)
        pins = self.by_pin.get((end.component, end.pin))
        if pins:
            return min(pins, key=lambda pin: pin.label not in wanted)
        if end.component in self.by_component:
            numbers = [pin.number for pin in self.by_component[end.component]]
            self.problems.add(self.file, end.line, f"part {end.component} has no pin '{end.pin}'", did_you_mean(end.pin, numbers))
        else:
            self.problems.add(
                self.file,
                end.line,
                f"pin {end} is nowhere: no part is called '{end.component}'",
                did_you_mean(end.component, self.by_component),
            )
        return None

    def place(self, end: End, wanted: set[int]) -> BoardPin | None:
        """The copper at a place: of several layers, one whose copper is wanted, else unnamed, else the topmost."""
        assert end.at is not None
        names = self.artwork.names
        layers = range(len(names)) if end.layer is None else [names.index(end.layer)]
        point = np.array([end.at])
        for reach in (ON_COPPER, NEAR_COPPER):
            here = [(layer, label) for layer in layers if (label := int(self.finder.on_layer(layer, point, reach)[0])) >= 0]
            if here:
                layer, label = min(here, key=lambda found: (found[1] not in wanted, found[1] in self.names))
                barrel = int(self.finder.barrel_at(point, 0.0)[0])
                through = barrel >= 0 and self.finder.barrel_label[barrel] == label
                return BoardPin("", "", end.at, None if through else layer, label, "")
        self.problems.add(
            self.file, end.line, f"there is no copper at {end}", "give a place on the net's copper, in the artwork's own coordinates"
        )
        return None

    def joins(self) -> list[Join]:
        """The two-pin parts signals run through."""
        found = []
        for name in self.artwork.board.joins:
            numbers: dict[str, BoardPin] = {}
            for pin in self.by_component.get(name, []):
                numbers.setdefault(pin.number, pin)
            if not numbers:
                self.problems.add(self.file, 0, f"join '{name}' is nowhere: no part is called that", did_you_mean(name, self.by_component))
            elif len(numbers) != 2:
                self.problems.add(self.file, 0, f"join '{name}' has {len(numbers)} pins", "only two-pin parts can be joins")
            else:
                first, second = numbers.values()
                found.append(Join(name, (first, second)))
        return found
