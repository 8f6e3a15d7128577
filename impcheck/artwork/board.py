"""What a board file asks for, resolved. In: nothing (types only); out: numbers in mm, s, ohm, each with its line in the board file."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any


@dataclass(frozen=True)
class NetClass:
    """Targets a net is held to. None: not asked for."""

    name: str
    impedance: float | None = None  # ohm, single-ended
    differential: float | None = None  # ohm
    common: float | None = None  # ohm
    tolerance: float = 0.1  # share of the target
    rise_time: float | None = None  # s
    width: Mapping[str, float] = field(default_factory=dict)  # mm by copper layer name; "" for every layer not named
    gap: Mapping[str, float] = field(default_factory=dict)  # mm, likewise
    max_skew: float | None = None  # s
    line: int = 0

    def width_on(self, layer: str) -> float | None:
        """Width on a copper layer, mm; None where none is stated."""
        return self.width.get(layer, self.width.get(""))

    def gap_on(self, layer: str) -> float | None:
        """Gap of a pair on a copper layer, mm; None where none is stated."""
        return self.gap.get(layer, self.gap.get(""))


@dataclass(frozen=True)
class End:
    """Where a net is to begin or end: a pin, or a place on a layer."""

    component: str = ""
    pin: str = ""
    at: tuple[float, float] | None = None  # mm
    layer: str | None = None  # copper layer name of a place; None: any layer
    line: int = 0

    def __str__(self) -> str:
        if self.at is None:
            return f"{self.component}.{self.pin}"
        return f"({self.at[0]:g}, {self.at[1]:g})" + (f" on {self.layer}" if self.layer else "")


@dataclass(frozen=True)
class NetRequest:
    """One entry of `nets`. A single net has `net` (a shell pattern); a pair has a name and two legs."""

    net: str  # pattern, or the pair's name
    net_class: str
    begin: tuple[End, ...] = ()  # (): left out; one for a single net, two for a pair (p, n)
    end: tuple[End, ...] = ()
    legs: tuple[str, str] | None = None  # names of the p and n nets of a pair
    line: int = 0


@dataclass(frozen=True)
class Group:
    """Nets whose delays are to agree."""

    name: str
    nets: tuple[str, ...]  # patterns
    match: float  # s
    line: int = 0


@dataclass(frozen=True)
class RuleOverride:
    """Limits of one rule set in the board file."""

    rule: str
    limits: Mapping[str, Any]  # as written; the deck loader checks and converts them
    line: int = 0


@dataclass(frozen=True)
class Board:
    """A board file, checked and resolved."""

    name: str
    file: str  # as shown to the user
    classes: Mapping[str, NetClass] = field(default_factory=dict)
    nets: tuple[NetRequest, ...] = ()
    groups: tuple[Group, ...] = ()
    returns: tuple[str, ...] = ()  # patterns; (): by area
    joins: tuple[str, ...] = ()  # component names
    decks: tuple[str, ...] = ("standard",)  # names, or absolute paths
    overrides: tuple[RuleOverride, ...] = ()
    waivers: str | None = None
