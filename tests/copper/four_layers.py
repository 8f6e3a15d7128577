"""A four-layer artwork put together from Gerber text and tables of holes, without files."""

from __future__ import annotations

import numpy as np

from impcheck.artwork.board import Board
from impcheck.artwork.gerber import read_gerber
from impcheck.artwork.parts import Artwork, Drill, DrillFile
from impcheck.artwork.stackup import CopperItem, Dielectric, Stackup

STACKUP = Stackup(
    (
        CopperItem("L1", 0.04),
        Dielectric(0.1, 4.0),
        CopperItem("L2", 0.02),
        Dielectric(0.5, 4.2),
        CopperItem("L3", 0.02),
        Dielectric(0.1, 4.0),
        CopperItem("L4", 0.04),
    )
)  # heights from the bottom, exact: L4 0..0.04, L3 0.14..0.16, L2 0.66..0.68, L1 0.78..0.82


def square(x0, y0, x1, y1):
    corners = ((x0, y0, 2), (x1, y0, 1), (x1, y1, 1), (x0, y1, 1), (x0, y0, 1))
    return "G36*\n" + "".join(f"X{round(x * 1e6)}Y{round(y * 1e6)}D0{c}*\n" for x, y, c in corners) + "G37*\n"


PLANE = square(0, 0, 20, 20)


def image(body, head="", name="t.gbr"):
    return read_gerber(f"%FSLAX46Y46*%\n%MOMM*%\n{head}G01*\n{body}M02*\n".encode(), name)


def drill(holes, first=0, last=3, plated=1, **more):
    """Holes as (x, y, diameter) or (x, y, x of the end, y of the end, diameter)."""
    rows = np.array([hole if len(hole) == 5 else (hole[0], hole[1], hole[0], hole[1], hole[2]) for hole in holes], float).reshape(-1, 5)
    count = len(rows)
    nothing = np.full(count, -1, np.int32)
    table = DrillFile(
        "holes.drl",
        {},
        rows[:, :2],
        rows[:, 2:4],
        rows[:, 4],
        np.full(count, plated, np.int8),
        np.arange(1, count + 1, dtype=np.int32),
        nothing,
        nothing,
        (),
        (),
    )
    return Drill(table, first, last, **more)


def artwork(*drills, layers=None, mask_top=None, outline=None, stackup=STACKUP):
    layers = tuple(image(PLANE) for _ in stackup.coppers) if layers is None else tuple(layers)
    return Artwork(Board("Tried", "board.yaml"), stackup, layers, mask_top, None, outline, tuple(drills), None, ())
