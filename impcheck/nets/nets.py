"""Which copper belongs to which net. In: nothing (types only); out: component labels, names, pins, declared nets."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from impcheck.artwork.board import NetClass, NetRequest
from impcheck.artwork.image import Ints
from impcheck.errors import Remark


@dataclass(frozen=True)
class BoardPin:
    """A pin of a part (or a declared place) found on copper."""

    component: str  # "" for a place
    number: str
    at: tuple[float, float]  # mm
    layer: int | None  # copper layer; None: a plated hole, every layer it reaches
    label: int  # connected component of the copper it lies on
    net: str  # name the source gives, "" unknown

    def __str__(self) -> str:
        return f"{self.component}.{self.number}" if self.component else f"({self.at[0]:g}, {self.at[1]:g})"


@dataclass(frozen=True)
class Join:
    """A two-pin part the signal runs through."""

    component: str
    pins: tuple[BoardPin, BoardPin]


@dataclass(frozen=True)
class DeclaredNet:
    """One net of the board file found in the copper. A pair gives two of these (legs p and n), its name in `pair`."""

    name: str
    request: NetRequest
    net_class: NetClass
    labels: tuple[int, ...]  # connected components that carry it (several where joins lead on, or where it is open)
    begin: tuple[BoardPin, ...]  # where the walk starts; () when nothing is known
    ends: tuple[BoardPin, ...]  # where it goes, in order
    joins: tuple[Join, ...] = ()  # those whose two pins both lie on `labels`
    pair: str = ""  # the pair's name
    leg: str = ""  # "p" or "n"


@dataclass(frozen=True)
class NetFault:
    """An open or a short of the whole board, declared or not."""

    kind: str  # "open" or "short"
    nets: tuple[str, ...]
    declared: bool  # one of the nets is declared in the board file
    net_tie: bool  # a short that is one part whose pads of two nets overlap, or a pad named for both
    at: tuple[float, float]
    layer: int | None
    message: str  # one sentence: what is joined or separate, and where


@dataclass(frozen=True)
class Nets:
    """The connectivity of the board. A label numbers one connected piece of copper over all layers and barrels."""

    piece_label: tuple[Ints, ...]  # per copper layer (n pieces,)
    barrel_label: Ints  # (n barrels,)
    count: int  # labels are 0 .. count-1
    names: Mapping[int, tuple[str, ...]]  # label -> names found on it, the most frequent first; labels without a name are absent
    pins: tuple[BoardPin, ...]
    returns: frozenset[int]  # labels that may carry return current
    return_names: tuple[str, ...]  # their net names, for the report
    declared: tuple[DeclaredNet, ...]
    faults: tuple[NetFault, ...]
    remarks: tuple[Remark, ...] = ()

    def name_of(self, label: int) -> str:
        """A name to show for a label: its first name, or "unnamed copper" where no source names it."""
        names = self.names.get(label)
        return names[0] if names else "unnamed copper"
