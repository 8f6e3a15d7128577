"""Artwork for tests of nets: layers drawn by small Gerber commands, a netlist and a board file given as values."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from impcheck.artwork.board import Board, End, NetClass, NetRequest
from impcheck.artwork.parts import NetlistPoints
from impcheck.copper.build import rebuild
from impcheck.nets.connect import connect
from tests.copper.four_layers import artwork, image, square

HEAD = "%ADD10C,0.2*%\n%ADD11R,1X1*%\n%ADD12C,0.6*%\n"
CLASS = NetClass("clock", impedance=50.0)


def place(x, y):
    return f"X{round(x * 1e6)}Y{round(y * 1e6)}"


def trace(*points, net=""):
    """A 0.2 mm trace along points."""
    steps = "".join(f"{place(*point)}D0{2 if k == 0 else 1}*\n" for k, point in enumerate(points))
    return _tagged(f"D10*\n{steps}", net)


def pad(x, y, pin="", net="", aperture="D11"):
    """A 1 mm square pad, or a flash of another aperture; `pin` as "U1.3"."""
    part = "%TO.P,{},{}*%\n".format(*pin.split(".")) if pin else ""
    return _tagged(f"{part}{aperture}*\n{place(x, y)}D03*\n", net)


def fill(x0, y0, x1, y1, net="", pin=""):
    part = "%TO.P,{},{}*%\n".format(*pin.split(".")) if pin else ""
    return _tagged(part + square(x0, y0, x1, y1), net)


def _tagged(body, net):
    return f"%TO.N,{net}*%\n{body}%TD*%\n" if net else f"{body}%TD*%\n" if "%TO" in body else body


def end(text, layer=None):
    """ "U1.3" or (x, y)."""
    if isinstance(text, str):
        component, pin = text.split(".")
        return End(component, pin, line=7)
    return End(at=text, layer=layer, line=7)


def wish(net, begin=None, to=None, line=5):
    return NetRequest(net, "clock", () if begin is None else (end(begin),), () if to is None else (end(to),), line=line)


def points(*rows):
    """Netlist points as (net, component, pin, x, y, access layer), or with a drill diameter at the end."""
    count = len(rows)
    drill = np.array([row[6] if len(row) > 6 else np.nan for row in rows])
    zero = np.zeros(count, np.int32)
    return NetlistPoints(
        file="board.ipc",
        at=np.array([row[3:5] for row in rows], float).reshape(-1, 2),
        net=tuple(row[0] for row in rows),
        component=tuple(row[1] for row in rows),
        pin=tuple(row[2] for row in rows),
        mid=np.zeros(count, bool),
        drill=drill,
        plated=np.isfinite(drill),
        access=np.array([row[5] for row in rows], np.int32),
        first=zero,
        last=zero,
        size=np.zeros((count, 2)),
        line=np.arange(1, count + 1, dtype=np.int32),
    )


def drawn(top, *drills, inner=("", "", ""), wishes=(), netlist=None, mask="", **board):
    """The artwork: `top` is layer L1, `inner` the three below."""
    layers = [image(body, HEAD, f"L{k + 1}.gbr") for k, body in enumerate((top, *inner))]
    made = artwork(*drills, layers=layers, mask_top=image(mask, HEAD, "mask.gbr") if mask else None)
    wanted = Board("Tried", "board.yaml", classes={"clock": CLASS}, nets=tuple(wishes), **board)
    return replace(made, board=wanted, netlist=netlist)


def nets_of(*args, **more):
    made = drawn(*args, **more)
    return connect(made, rebuild(made))
