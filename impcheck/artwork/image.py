"""One Gerber file as read. In: nothing (types only); out: its objects as arrays in drawing order, in mm."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from enum import IntEnum

import numpy as np
from numpy.typing import NDArray

from impcheck.errors import Remark

Floats = NDArray[np.float64]
Ints = NDArray[np.int32]
Bools = NDArray[np.bool_]


class Kind(IntEnum):
    """What a graphical object is."""

    DRAW = 0  # straight stroke of an aperture from start to end
    ARC = 1  # circular stroke
    FLASH = 2  # aperture at start (= end)
    REGION = 3  # filled contours


@dataclass(frozen=True)
class Primitive:
    """One macro primitive, its expressions evaluated. `numbers` as in the specification, lengths in mm, angles in degrees.

    `code`: 1 circle (diameter, x, y, rotation); 20 vector line (width, x0, y0, x1, y1, rotation); 21 centre line (width,
    height, x, y, rotation); 4 outline (x0, y0, ..., xn, yn, rotation); 5 polygon (vertices, x, y, diameter, rotation);
    7 thermal (x, y, outer, inner, gap, rotation). The deprecated 2, 22 and 6 are rewritten as 20, 21 and several of 1 and
    20. The exposure is `dark`, so it is not among the numbers; a primitive with exposure off cuts only what stands before it
    in the same aperture.
    """

    code: int
    dark: bool
    numbers: tuple[float, ...]


@dataclass(frozen=True)
class Aperture:
    """One aperture definition, in mm and degrees."""

    code: str  # as in the file: "D10"
    shape: str  # "circle" (diameter,), "rectangle" (w, h), "obround" (w, h), "polygon" (outer diameter, vertices, rotation), "macro" ()
    parameters: tuple[float, ...]
    hole: tuple[float, ...] = ()  # (diameter,) round, (w, h) rectangular (deprecated), () none
    primitives: tuple[Primitive, ...] = ()  # of a macro, in order
    macro: str = ""  # the macro's name
    attributes: Mapping[str, tuple[str, ...]] = field(default_factory=dict)  # aperture attributes: ".AperFunction": ("SMDPad", "CuDef")
    line: int = 0


@dataclass(frozen=True)
class Transform:
    """How the aperture of an object is changed before it is placed: mirrored first, then rotated, then scaled (LM, LR, LS)."""

    mirror_x: bool = False  # x becomes -x
    mirror_y: bool = False
    rotation: float = 0.0  # degrees, counter-clockwise
    scale: float = 1.0


@dataclass(frozen=True)
class Pin:
    """A pin named by an object attribute (.P) or a netlist."""

    component: str
    number: str
    function: str = ""


@dataclass(frozen=True)
class Contours:
    """The contours of all regions of a file. Contour k holds the segments `first[k]:first[k+1]`, closed: the end of a segment
    is the start of the next, that of the last the start of the first (a closing straight segment is added where the file left
    it out by a rounding difference, and that is remarked)."""

    object: Ints  # (k,) index of the region object each contour belongs to, rising
    first: Ints  # (k+1,) offsets into the segment arrays
    start: Floats  # (m, 2) start of each segment, mm
    centre: Floats  # (m, 2) centre of an arc segment, nan for a straight one
    sweep: Floats  # (m,) signed angle of an arc segment in radians, counter-clockwise positive; 0 for a straight one


@dataclass(frozen=True)
class Image:
    """One Gerber file: n objects in drawing order. Step-and-repeat and block apertures are already expanded, image-wide
    commands (MI, OF, SF, AS, IR, IP) already applied; clear objects and a negative image are not yet."""

    file: str  # as shown to the user
    attributes: Mapping[str, tuple[str, ...]]  # file attributes: ".FileFunction": ("Copper", "L1", "Top"), also those in G04 #@! comments
    negative: bool  # IPNEG or .FilePolarity,Negative (each once is negative; both together too)
    apertures: tuple[Aperture, ...]
    transforms: tuple[Transform, ...]  # [0] is the identity
    kind: NDArray[np.uint8]  # (n,) Kind
    dark: Bools  # (n,) polarity
    aperture: Ints  # (n,) index into apertures, -1 for regions
    transform: Ints  # (n,) index into transforms; for regions 0 (already applied to the contour)
    start: Floats  # (n, 2); for a region the first vertex of its first contour
    end: Floats  # (n, 2)
    centre: Floats  # (n, 2) of arcs, else nan
    sweep: Floats  # (n,) of arcs in radians, counter-clockwise positive, +-2 pi for a full circle; else 0
    contours: Contours
    line: Ints  # (n,) 1-based line in the file
    net: Ints  # (n,) index into nets, -1 none
    pin: Ints  # (n,) index into pins, -1 none
    component: Ints  # (n,) index into components (.C), -1 none
    nets: tuple[tuple[str, ...], ...]  # each entry one .N value; several names where a pad belongs to several nets (net tie)
    pins: tuple[Pin, ...]
    components: tuple[str, ...]
    remarks: tuple[Remark, ...] = ()

    def __len__(self) -> int:
        return len(self.kind)
