"""A cross-section to be solved. In: nothing (types only); out: slabs, planes, mask and conductors, in mm with y upwards."""

from __future__ import annotations

from dataclasses import dataclass

from impcheck.artwork.stackup import Slab

Point = tuple[float, float]


class SectionError(ValueError):
    """A section that has no sensible solution: copper of different nets that touches, a signal on a plane, nothing to return on."""


@dataclass(frozen=True)
class Coating:
    """Solder mask: the same thickness over laminate and copper; where copper stands nearer than twice that, it fills the gap."""

    thickness: float  # mm
    er: float
    loss_tangent: float = 0.0


@dataclass(frozen=True)
class Conductor:
    """One piece of copper. Two points make a strip without thickness."""

    name: str
    role: str  # "signal", "return" (0 V) or "floating" (no charge)
    outline: tuple[Point, ...]


@dataclass(frozen=True)
class Section:
    """Everything the field sees."""

    slabs: tuple[Slab, ...]  # horizontal dielectric layers that reach to both sides without end; air elsewhere
    conductors: tuple[Conductor, ...]
    planes: tuple[float, ...] = ()  # heights of infinite, perfectly conducting planes: none, one, or two with everything else between them
    coating: Coating | None = None  # over the upper side
    coating_below: Coating | None = None  # over the lower side


__all__ = ["Coating", "Conductor", "Point", "Section", "SectionError", "Slab"]
