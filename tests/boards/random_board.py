"""Random four-layer boards with random defects. In: a seed; out: a board, the labels of what was spoilt, a dialect and a motion. Shares
no code with impcheck."""

from __future__ import annotations

import random
from dataclasses import replace

from tests.boards.model import Board, Cut, Declared, Label, Layer, Move, Pad, Plane
from tests.boards.parts import via
from tests.boards.write_board import Dialect

WIDTH = 0.18  # 50 ohm over 0.11 mm of prepreg with the mask below, as on the sample boards
DEFECTS = ("none", "wide", "neck", "slot", "void", "branch", "no return via", "plane edge")


def board_of(seed: int) -> tuple[Board, list[Label], Dialect, Move]:
    """A board of two to five lanes, one of them spoilt in one way (or none), in a random dialect, turned and moved at random."""
    dice = random.Random(seed)
    defect = DEFECTS[seed % len(DEFECTS)]
    board = Board(
        f"Random {seed}",
        ((0, 0), (80, 0), (80, 50), (0, 50)),
        (
            Layer("mask", 20, 3.6),
            Layer("copper", 42, name="L1", etch=12),
            Layer("dielectric", 110, 4.0, 0.015, "prepreg"),
            Layer("copper", 17, name="L2"),
            Layer("dielectric", 1200, 4.4, 0.018, "core"),
            Layer("copper", 17, name="L3"),
            Layer("dielectric", 110, 4.0, 0.015, "prepreg"),
            Layer("copper", 42, name="L4", etch=12),
            Layer("mask", 20, 3.6),
        ),
    )
    board.classes = {"fast": {"impedance": "50 ohm", "tolerance": "10%", "rise_time": "300ps", "width": f"{WIDTH}mm"}}
    lanes = dice.randint(2, 5)
    spoilt = dice.randrange(lanes)
    cuts: list[Cut] = []
    labels: list[Label] = []
    for lane in range(lanes):
        net, y = f"N{lane}", round(8 + 8 * lane + dice.uniform(-1, 1), 3)
        begin, end = round(dice.uniform(5, 10), 3), round(dice.uniform(65, 75), 3)
        for part, x in (("U", begin), ("J", end)):
            board.pads.append(Pad(net, 0, (x, y), "rectangle", (0.6, 0.5), 0, f"{part}{lane}", "1"))
        board.nets.append(Declared(net, "fast", f"U{lane}.1", f"J{lane}.1"))
        kind = defect if lane == spoilt else "none"
        at = round(dice.uniform(28, 36), 3)
        if kind == "no return via" or (kind == "none" and dice.random() < 0.4):
            for x in (20.0, 55.0):
                via(board, net, (x, y))
                if kind == "none":
                    via(board, "GND", (x, y + 0.8))
                else:
                    labels.append(Label("return-via", net, "L4" if x == 20.0 else "L1", (x, y), "no ground via near"))
            board.trace(net, 0, WIDTH, (begin, y), (20, y))
            board.trace(net, 3, WIDTH, (20, y), (55, y))
            board.trace(net, 0, WIDTH, (55, y), (end, y))
            continue
        if kind in ("wide", "neck"):
            width, length = (0.27, 6.0) if kind == "wide" else (0.13, 0.9)
            board.trace(net, 0, WIDTH, (begin, y), (at - length / 2, y))
            board.trace(net, 0, width, (at - length / 2, y), (at + length / 2, y))
            board.trace(net, 0, WIDTH, (at + length / 2, y), (end, y))
            rules = ("width", "impedance") if kind == "wide" else ("width", "neck-down")
            labels += [Label(rule, net, "L1", (at, y), kind) for rule in rules]
            continue
        rise = round(dice.uniform(1, 2), 3)  # a jog at 45 degrees, and back
        board.trace(net, 0, WIDTH, (begin, y), (45, y), (45 + rise, y + rise), (50 + rise, y + rise), (50 + 2 * rise, y), (end, y))
        if kind in ("slot", "void"):
            long, wide = (0.3, 2.2) if kind == "slot" else (0.8, 0.5)
            x0, x1 = at - long / 2, at + long / 2
            cuts.append(Cut(((x0, y - wide), (x1, y - wide), (x1, y + wide), (x0, y + wide))))
            labels.append(Label("reference-gap", net, "L1", (at, y), kind))
        elif kind == "branch":
            board.trace(net, 0, WIDTH, (at, y), (at, y + 4.0))
            labels.append(Label("branch-stub", net, "L1", (at, y), "a branch of 4 mm"))
        elif kind == "plane edge":
            edge = y - WIDTH / 2 - 0.04
            cuts.append(Cut(((at - 5, edge - 2), (at + 5, edge - 2), (at + 5, edge), (at - 5, edge))))
            labels.append(Label("plane-edge", net, "L1", (at, y), "10 mm along the edge of an opening"))
    via(board, "GND", (77, 46))  # joins the planes, far from every lane
    whole = ((0.5, 0.5), (79.5, 0.5), (79.5, 49.5), (0.5, 49.5))
    board.planes += [Plane("GND", 1, whole, tuple(cuts)), Plane("GND", 2, whole)]
    dialect = Dialect(
        "r",
        unit=dice.choice(["mm", "inch"]),
        names=dice.choice(["x2", "comment"]),
        traces={-1: dice.choice(["strokes", "regions", "both"])},
        planes={-1: "regions", 1: dice.choice(["regions", "clear", "negative"]), 2: dice.choice(["regions", "clear", "negative"])},
        pads=dice.choice(["flash", "macro", "region"]),
        scramble=dice.choice([None, seed]),
    )
    move = Move(dice.uniform(0, 360), dice.random() < 0.5, (dice.uniform(-100, 100), dice.uniform(-100, 100)))
    return board, labels, replace(dialect), move
