"""The stackup of a board. In: its items top to bottom; out: heights of copper and dielectrics in mm, y upwards from the bottom."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property


@dataclass(frozen=True)
class Mask:
    """Solder mask over an outer layer."""

    thickness: float  # mm, over laminate and copper alike
    er: float
    loss_tangent: float = 0.0


@dataclass(frozen=True)
class CopperItem:
    """One copper layer."""

    name: str
    thickness: float  # mm
    etch: float = 0.0  # mm, how much narrower in total the side away from the laminate it is bonded to is
    roughness: float = 0.0  # mm, rms
    file: str | None = None
    negative: bool | None = None  # said in the board file; None: as the artwork says
    line: int = 0


@dataclass(frozen=True)
class Dielectric:
    """One dielectric between two copper layers (several may follow each other)."""

    thickness: float  # mm
    er: float
    loss_tangent: float = 0.0
    name: str = ""
    core: bool | None = None  # True core, False prepreg, None not said
    line: int = 0


@dataclass(frozen=True)
class Slab:
    """A horizontal dielectric layer of a cross-section, y upwards in mm."""

    bottom: float
    top: float
    er: float
    loss_tangent: float = 0.0
    name: str = ""


@dataclass(frozen=True)
class Stackup:
    """Items top to bottom: an optional mask, copper and dielectrics in turn, an optional mask."""

    items: tuple[Mask | CopperItem | Dielectric, ...]

    @cached_property
    def coppers(self) -> tuple[CopperItem, ...]:
        """The copper layers, top to bottom."""
        return tuple(item for item in self.items if isinstance(item, CopperItem))

    @cached_property
    def mask_top(self) -> Mask | None:
        """The solder mask over the top layer."""
        return self.items[0] if isinstance(self.items[0], Mask) else None

    @cached_property
    def mask_bottom(self) -> Mask | None:
        """The solder mask over the bottom layer."""
        return self.items[-1] if isinstance(self.items[-1], Mask) else None

    @cached_property
    def heights(self) -> tuple[tuple[float, float], ...]:
        """(bottom, top) of each copper layer, top layer first, in mm above the bottom of the lowest copper."""
        y = sum(item.thickness for item in self.items if not isinstance(item, Mask))
        found = []
        for item in self.items:
            if isinstance(item, Mask):
                continue
            if isinstance(item, CopperItem):
                found.append((y - item.thickness, y))
            y -= item.thickness
        return tuple(found)

    @cached_property
    def bonded_below(self) -> tuple[bool, ...]:
        """For each copper layer: True where it is bonded to the dielectric below it (its wide side is the lower one, and what
        lies above fills the space beside its traces).

        Outer copper is bonded to the board. Inner copper lies on a core where one of its two dielectrics is said to be one;
        otherwise the usual construction is assumed: the dielectrics between copper layers are prepreg, core, prepreg, ... from
        the top (two-layer board: core).
        """
        count = len(self.coppers)
        bonded = []
        for index in range(count):
            if index == 0:
                bonded.append(True)
            elif index == count - 1:
                bonded.append(False)
            else:
                below, above = self._beside(index, +1), self._beside(index, -1)
                if below is not None and below.core is True:
                    bonded.append(True)
                elif above is not None and above.core is True:
                    bonded.append(False)
                else:
                    bonded.append(index % 2 == 1)
        return tuple(bonded)

    @cached_property
    def slabs(self) -> tuple[Slab, ...]:
        """Every dielectric as a slab, bottom to top; the height of an inner copper layer is filled by the dielectric on the side
        it is not bonded to (resin flows between traces). The height of the outer copper layers is outside (air or mask)."""
        found: list[Slab] = []
        y = self.heights[0][0]  # the lower side of the top copper
        index = 0
        items = [item for item in self.items if not isinstance(item, Mask)]
        for item in items[1:-1]:
            if isinstance(item, CopperItem):
                index += 1
                if self.bonded_below[index]:  # filled from above
                    last = found[-1]
                    found[-1] = Slab(last.bottom - item.thickness, last.top, last.er, last.loss_tangent, last.name)
                y -= item.thickness
            else:
                top = y
                if found and found[-1].bottom > y + 1e-9:  # the copper above is filled from below
                    top = found[-1].bottom
                y -= item.thickness
                found.append(Slab(y, top, item.er, item.loss_tangent, item.name))
        return tuple(reversed(found))

    def _beside(self, copper: int, step: int) -> Dielectric | None:
        position = [i for i, item in enumerate(self.items) if isinstance(item, CopperItem)][copper] + step
        item = self.items[position] if 0 <= position < len(self.items) else None
        return item if isinstance(item, Dielectric) else None
