"""Small boards for the rules' tests. In: what is to be different; out: the findings of the whole chain."""

from __future__ import annotations

from impcheck.pipeline import run
from sample_boards.draw import OUTER, box, four_layers
from tests.boards.model import Declared, Pad, Plane
from tests.boards.parts import via
from tests.boards.write_board import write_board
from tests.tiny_board import BOARD, BOTTOM, TOP, write

__all__ = ["BOARD", "BOTTOM", "TOP", "cleared", "found", "four", "neck", "of_board"]


def found(folder, board=BOARD, **files):
    """Findings of the tiny board with files changed."""
    return run(write(folder, board, **files)).document.findings


def neck(begin, end, width):
    """The top layer with the trace of another width between two places."""
    return TOP.replace(
        "X18000000Y5000000D01*\nD11*",
        f"X{begin * 1e6:.0f}Y5000000D01*\n%ADD12C,{width:.6f}*%\nD12*\nX{end * 1e6:.0f}Y5000000D01*\nD10*\nX18000000Y5000000D01*\nD11*",
    )


def cleared(*boxes):
    """The bottom layer with boxes (x0, y0, x1, y1) taken out of its plane."""
    out = []
    for x0, y0, x1, y1 in boxes:
        corners = [(x0, y0), (x1, y0), (x1, y1), (x0, y1), (x0, y0)]
        points = "\n".join(f"X{x * 1e6:.0f}Y{y * 1e6:.0f}D0{2 if k == 0 else 1}*" for k, (x, y) in enumerate(corners))
        out.append(f"G36*\n{points}\nG37*")
    return BOTTOM.replace("%TD*%", "%TD*%\n%LPC*%\n" + "\n".join(out) + "\n%LPD*%")


def four():
    """Four layers, ground planes on L2 and L3, one declared net S from U1.1 at (10, 10) to J1.1 at (60, 10), nothing drawn between."""
    board = four_layers("Small")
    for part, x in (("U1", 10.0), ("J1", 60.0)):
        board.pads.append(Pad("S", 0, (x, 10.0), "rectangle", (0.6, 0.6), 0, part, "1"))
    whole = box(0.5, 0.5, 79.5, 49.5)
    board.planes += [Plane("GND", 1, whole), Plane("GND", 2, whole)]
    via(board, "GND", (5, 45), first=0, last=1)  # each plane is held by a via of its own, so that none joins the two
    via(board, "GND", (7, 45), first=2, last=3)
    board.classes = {"fast": {"impedance": "50 ohm", "tolerance": "10%", "rise_time": "100ps", "width": f"{OUTER}mm"}}
    board.nets = [Declared("S", "fast", "U1.1", "J1.1")]
    return board


def of_board(folder, board):
    """Findings of a board of the abstract model."""
    return run(write_board(board, folder)).document.findings
