"""Draws the sample boards: python -m sample_boards.draw, from the project's root, with the test extras installed.

Five invented boards of one invented maker, Sedgeholm Gauges, whose river-ice gauge listens for the ice from a mast: the antenna board
on the mast, the logger, the sampler, and the clock board. Each is written as a user would have it: a commented board.yaml, the
fabrication files, and beside them expected.yaml, which lists the defects that were drawn into it and why each is one. Shares no code
with impcheck.
"""

from __future__ import annotations

import json
import shutil
from pathlib import Path

from sample_boards.gauge_main import draw as gauge_main
from tests.boards.model import Board, Cut, Declared, Fill, Hole, Label, Layer, Plane
from tests.boards.parts import chip, coax, header, rows, serpentine, teardrop, via
from tests.boards.write_board import Dialect, write_board

HERE = Path(__file__).parent


def box(x0: float, y0: float, x1: float, y1: float) -> tuple[tuple[float, float], ...]:
    return ((x0, y0), (x1, y0), (x1, y1), (x0, y1))


def mask() -> Layer:
    return Layer("mask", 20, er=3.6)


# widths of 50 ohm lines on these stackups, from the field solver (impcheck.fields), rounded to 10 um
FEED, FEED_GAP = 0.49, 0.15  # coplanar on 0.5 mm
OUTER = 0.18  # microstrip on 0.11 mm of prepreg
INNER = 0.19  # stripline between 0.2 and 0.25 mm


def antenna() -> tuple[Board, list[Label]]:
    """Two layers: the feed line from the antenna jack through a capacitor to the amplifier, and on to the cable jack, coplanar over
    ground."""
    board = Board(
        "Ice gauge antenna, revision D",
        box(0, 0, 44, 24),
        (
            mask(),
            Layer("copper", 35, name="L1", etch=10),
            Layer("dielectric", 500, 4.3, 0.016, "core"),
            Layer("copper", 35, name="L2", etch=10),
            mask(),
        ),
    )
    y = 12.0
    coax(board, "J1", (4, y), 0, "RF_ANT")
    chip(board, "C1", (16, y), 0, ("RF_ANT", "RF_LNA"))
    rows(board, "U1", (27, y), 0, {1: "GND", 2: "RF_LNA", 3: "GND", 4: "GND", 5: "RF_OUT", 6: "VCC_LNA"}, 6, 1.27, 5.2, (1.5, 0.6))
    coax(board, "J2", (40, y), 180, "RF_OUT")
    board.trace("RF_ANT", 0, FEED, (4, y), (15.52, y))
    board.trace("RF_LNA", 0, FEED, (16.48, y), (24.4, y))
    board.trace("RF_OUT", 0, FEED, (29.6, y), (33, y))
    board.trace("RF_OUT", 0, 0.3, (33, y), (35, y))
    board.trace("RF_OUT", 0, FEED, (35, y), (40, y))
    header(board, "J3", (12, 20), 0, ("GND", "VCC_LNA"))
    chip(board, "C2", (33.2, 18), 0, ("VCC_LNA", "GND"))
    board.trace("VCC_LNA", 0, 0.4, (29.6, 13.27), (31, 13.27), (32, 14.27), (32, 20), (14.54, 20))
    board.trace("VCC_LNA", 0, 0.4, (32, 18), (32.72, 18))
    for x in (2.5, 6, 8, 12, 14, 18, 20, 22, 31.5, 37, 38.8, 41.5):
        for sign in (-1, 1):
            via(board, "GND", (x, y + sign * (1.5 if x in (2.5, 41.5) else 1.0)))
    for at in (
        (24.4, 14.8),
        (24.4, 9.2),
        (29.6, 9.2),
        (35, 18),
        (35, 21),
        (20, 17.5),
        (8, 22),
        (30, 4),
        (14, 4),
        (40, 4),
        (4, 4),
        (40, 21),
    ):
        via(board, "GND", at)
    board.holes += [Hole((2.2, 21.8), 2.2), Hole((41.8, 2.2), 2.2)]
    outline = box(0.3, 0.3, 43.7, 23.7)
    slot = Cut(box(9.0, 9.0, 10.0, 17.0))
    board.planes += [Plane("GND", 0, outline, clearance=FEED_GAP), Plane("GND", 1, outline, (slot,))]
    board.classes = {"feed": {"impedance": "50 ohm", "tolerance": "10%", "rise_time": "100ps", "width": f"{FEED}mm"}}
    board.joins = ("C1",)
    board.nets = [
        Declared("RF_ANT", "feed", "J1.1", "U1.2", "the antenna's line, through C1 to the amplifier"),
        Declared("RF_OUT", "feed", "U1.5", "J2.1", "the amplifier's output to the cable"),
    ]
    middle = (34.0, y)
    why = "a fab edit narrowed 2 mm of the line to 0.3 mm"
    labels = [
        Label("neck-down", "RF_OUT", "L1", middle, why),
        Label("width", "RF_OUT", "L1", middle, why),
        Label(
            "impedance", "RF_OUT", "L1", (33.213, y), f"{why}: over 55 ohm, most so behind the step, where the pour has not closed in yet"
        ),
        Label("reference-gap", "RF_ANT", "L1", (9.5, y), "a slot for a cable tie cuts the ground under the line"),
        Label("impedance", "RF_ANT", "L1", (9.5, y), "over the slot only the pour beside the line is left to return on"),
    ]
    return board, labels


def four_layers(name: str) -> Board:
    return Board(
        name,
        box(0, 0, 80, 50),
        (
            mask(),
            Layer("copper", 42, name="L1", etch=12),
            Layer("dielectric", 110, 4.0, 0.015, "prepreg"),
            Layer("copper", 17, name="L2"),
            Layer("dielectric", 1200, 4.4, 0.018, "core"),
            Layer("copper", 17, name="L3"),
            Layer("dielectric", 110, 4.0, 0.015, "prepreg"),
            Layer("copper", 42, name="L4", etch=12),
            mask(),
        ),
    )


def lane(number: int) -> float:
    """y of the pins that face each other, pin 11 + number of U1 and pin 10 - number of U2."""
    return round(19.285 + 1.27 * number, 6)


def processor_and_converter(board: Board, nets: list[str], supply: str, other: str) -> None:
    """U1 at the left, U2 at the right, ten pins facing each other; their outer pins alternate between supply and ground, each with a
    via."""
    rows(
        board,
        "U1",
        (12, 25),
        0,
        {11 + k: net for k, net in enumerate(nets)} | {k: supply if k % 2 else "GND" for k in range(1, 11)},
        20,
        1.27,
        6.0,
        (1.5, 0.5),
    )
    rows(
        board,
        "U2",
        (66, 25),
        0,
        {10 - k: net for k, net in enumerate(nets)} | {k: other if k % 2 else "GND" for k in range(11, 21)},
        20,
        1.27,
        6.0,
        (1.5, 0.5),
    )
    for k in range(10):
        y = round(25 - 5.715 + 1.27 * k, 6)
        for x, way, net in ((9.0, -1, "GND" if k % 2 == 0 else supply), (69.0, 1, other if k % 2 == 0 else "GND")):
            board.trace(net, 0, 0.4, (x, y), (x + 1.6 * way, y))
            via(board, net, (x + 1.6 * way, y))


def logger() -> tuple[Board, list[Label]]:
    """Four layers: microstrips between processor and converter over the ground plane, and a bus to the mast on the lower side under two
    supplies."""
    board = four_layers("Ice gauge logger, revision B")
    nets = ["ADC_CLK", "SPI_SCK", "SPI_MOSI", "SPI_MISO", "SPI_CS", "SYNC", "TRIG", "DRDY", "WAKE", "PPS"]
    processor_and_converter(board, nets, "VDD_A", "VDD_B")
    for k, net in enumerate(nets):
        y = lane(k)
        if net == "SPI_MISO":
            board.trace(net, 0, OUTER, (15, y), (40, y))
            board.trace(net, 0, 0.26, (40, y), (50, y))
            board.trace(net, 0, OUTER, (50, y), (63, y))
        elif net == "WAKE":
            for x, before in ((20.0, True), (34.0, False)):
                via(board, net, (x, y))
                board.trace(net, 0, OUTER, (15.0 if before else 63.0, y), (x, y))
                part = f"C{1 if before else 2}"
                chip(board, part, (x, 32.2), 0, ("VDD_A", "GND"))
                for pin_net, way in (("VDD_A", -1), ("GND", 1)):
                    board.trace(pin_net, 0, 0.3, (x + way * 0.48, 32.2), (x + way * 1.4, 32.2))
                    via(board, pin_net, (x + way * 1.4, 32.2))
            board.trace(net, 3, OUTER, (20, y), (34, y))
        else:
            board.trace(net, 0, OUTER, (15, y), (63, y))
    board.trace("PPS", 0, OUTER, (45, lane(9)), (45, 36))
    header(board, "J1", (6, 38), 90, ("MAST_CLK", "GND", "MAST_DAT"))
    header(board, "J2", (74, 38), 90, ("MAST_CLK", "GND", "MAST_DAT"))
    board.trace("MAST_CLK", 3, OUTER, (6, 38), (74, 38))
    board.trace("MAST_DAT", 3, OUTER, (6, 43.08), (74, 43.08))
    for x, y in ((5, 5), (20, 5), (40, 8), (60, 5), (75, 5), (5, 47), (40, 47), (75, 47), (30, 41), (50, 41), (20, 36), (60, 36)):
        via(board, "GND", (x, y))
    board.holes += [Hole((3, 3), 3.2), Hole((77, 3), 3.2), Hole((3, 33), 3.2), Hole((77, 33), 3.2)]
    slot = Cut(box(30.0, lane(1) - 0.9, 30.4, lane(1) + 0.9))
    edge = Cut(box(25.0, 11.0, 45.0, lane(0) - OUTER / 2 - 0.04))
    board.planes += [
        Plane("GND", 1, box(0.5, 0.5, 79.5, 49.5), (slot, edge)),
        Plane("VDD_A", 2, ((0.5, 0.5), (39.6, 0.5), (39.6, 40.5), (79.5, 40.5), (79.5, 49.5), (0.5, 49.5))),
        Plane("VDD_B", 2, box(40.0, 0.5, 79.5, 40.1)),
        Plane("GND", 3, box(10, 2, 70, 16), hatch=1.0),
    ]
    board.returns = ("GND", "VDD_A", "VDD_B")
    clock = {"impedance": "50 ohm", "tolerance": "10%", "rise_time": "300ps", "width": f"{OUTER}mm"}
    board.classes = {"clock": clock, "control": {"impedance": "50 ohm", "tolerance": "10%", "rise_time": "600ps"}}
    for k, net in enumerate(nets):
        board.nets.append(Declared(net, "control" if net in ("TRIG", "DRDY", "SYNC") else "clock", f"U1.{11 + k}", f"U2.{10 - k}"))
    board.nets += [Declared("MAST_CLK", "control", "J1.1", "J2.1", "to the mast"), Declared("MAST_DAT", "control", "J1.3", "J2.3")]
    wide = "ten millimetres were drawn with the aperture of the supply traces"
    labels = [
        Label("reference-gap", "SPI_SCK", "L1", (30.2, lane(1)), "a slot in the ground plane runs under the trace"),
        Label("plane-edge", "ADC_CLK", "L1", (35.0, lane(0)), "the ground plane ends 40 um beside the trace for 20 mm"),
        Label("width", "SPI_MISO", "L1", (45.0, lane(3)), wide),
        Label("impedance", "SPI_MISO", "L1", (45.0, lane(3)), f"{wide}, which takes it below 45 ohm"),
        Label("branch-stub", "PPS", "L1", (45.0, lane(9)), "the trace to a test pad that was removed is left"),
        Label("reference-gap", "MAST_CLK", "L4", (39.8, 38.0), "crosses the split between the two supplies it refers to"),
    ]
    return board, labels


def sampler() -> tuple[Board, list[Label]]:
    """Six layers: a fast bus as striplines with back-drilled vias, strobes on the outer layers."""
    board = Board(
        "Ice gauge sampler, revision A",
        box(0, 0, 80, 50),
        (
            mask(),
            Layer("copper", 42, name="L1", etch=12),
            Layer("dielectric", 110, 4.0, 0.015, "prepreg"),
            Layer("copper", 17, name="L2", etch=6),
            Layer("dielectric", 200, 4.2, 0.016, "core"),
            Layer("copper", 17, name="L3", etch=6),
            Layer("dielectric", 250, 4.1, 0.015, "prepreg"),
            Layer("copper", 17, name="L4", etch=6),
            Layer("dielectric", 200, 4.2, 0.016, "core"),
            Layer("copper", 17, name="L5", etch=6),
            Layer("dielectric", 110, 4.0, 0.015, "prepreg"),
            Layer("copper", 42, name="L6", etch=12),
            mask(),
        ),
    )
    nets = ["DQ0", "DQ1", "DQ2", "DQ3", "DQ4", "DQ5", "STB", "REF_CLK", "HOLD", "ARM"]
    processor_and_converter(board, nets, "VCORE", "VCORE")
    for k, net in enumerate(nets):
        y = lane(k)
        if net.startswith("DQ"):
            drilled = None if net == "DQ3" else (1, 2, 0.5)
            for x, end in ((19.0 + k % 2, 15.0), (58.0 - k % 2, 63.0)):
                via(board, net, (x, y), used=(2,), backdrill=drilled)
                board.trace(net, 0, OUTER, (end, y), (x, y))
            board.trace(net, 2, INNER, (19.0 + k % 2, y), (58.0 - k % 2, y))
        elif net in ("STB", "REF_CLK"):
            for x, end in ((22.0, 15.0), (55.0, 63.0)):
                via(board, net, (x, y))
                via(board, "GND", (x, y + 0.635 if net == "STB" else y - 0.635))
                board.trace(net, 0, OUTER, (end, y), (x, y))
            board.trace(net, 5, OUTER, (22.0, y), (55.0, y))
        elif net == "HOLD":
            board.trace(net, 0, OUTER, (15, y), (37.85, y))
            board.trace(net, 0, OUTER, (38.15, y), (63, y))
        else:
            board.trace(net, 0, OUTER, (15, y), (63, y))
    chip(board, "R1", (12, 42), 0, ("GATE", "GND"), "0603")
    chip(board, "R2", (66, 42), 0, ("GND", "GATE"), "0603")
    board.trace("GATE", 0, OUTER, (11.2, 42), (11.2, 44), (26, 44))
    board.trace("GATE", 5, OUTER, (26, 44), (50, 44))
    board.trace("GATE", 0, OUTER, (50, 44), (66.8, 44), (66.8, 42))
    via(board, "GATE", (26, 44))
    via(board, "GATE", (50, 44))
    via(board, "GND", (50.8, 44.8))
    for x, y in ((12.8, 40.6), (65.2, 40.6)):
        via(board, "GND", (x, y))
        board.trace("GND", 0, 0.4, (x, y), (x, 42))
    for x, y in ((5, 5), (20, 8), (40, 8), (60, 8), (75, 5), (5, 47), (40, 38), (75, 47)):
        via(board, "GND", (x, y))
    board.holes += [Hole((3, 3), 3.2), Hole((77, 3), 3.2), Hole((30, 12), 1.0, (34, 12))]
    void = Cut(box(37.6, lane(1) - 0.5, 38.4, lane(1) + 0.5))
    whole = box(0.5, 0.5, 79.5, 49.5)
    board.planes += [
        Plane("GND", 1, whole, (void,), clearance=0.2),
        Plane("VCORE", 3, whole, clearance=0.2),
        Plane("GND", 4, whole, clearance=0.2),
    ]
    board.returns = ("GND", "VCORE")
    board.classes = {
        "bus": {
            "impedance": "50 ohm",
            "tolerance": "10%",
            "rise_time": "100ps",
            "width": f"{{L1: {OUTER}mm, L3: {INNER}mm, L6: {OUTER}mm}}",
        },
        "strobe": {"impedance": "50 ohm", "tolerance": "10%", "rise_time": "300ps"},
    }
    for k, net in enumerate(nets):
        board.nets.append(Declared(net, "bus" if net.startswith("DQ") else "strobe", f"U1.{11 + k}", f"U2.{10 - k}"))
    board.nets.append(Declared("GATE", "strobe", "R1.1", "R2.2"))
    stub = "the drawing for the back-drills leaves this net out, so its barrels go on below L3"
    labels = [
        Label("via-stub", "DQ3", "L3", (20.0, lane(3)), stub),
        Label("via-stub", "DQ3", "L3", (57.0, lane(3)), stub),
        Label("reference-gap", "DQ1", "L3", (38.0, lane(1)), "a void in the ground plane over the stripline"),
        Label("impedance", "DQ1", "L3", (38.0, lane(1)), "under the void only the plane below is left"),
        Label("open", "HOLD", "L1", (38.0, lane(8)), "the trace is broken"),
        Label("return-via", "GATE", "L6", (26.0, 44.0), "no ground via within reach of the change from L1 to L6"),
    ]
    return board, labels


def clock() -> tuple[Board, list[Label]]:
    """Four layers, clean: clocks with a meander, teardrops, a series resistor and layer changes with their return vias."""
    board = four_layers("Ice gauge clock, revision C")
    nets = ["CK0", "CK1", "CK2", "CK3", "CK4", "CK5", "FRAME", "MUTE", "GAIN0", "GAIN1"]
    processor_and_converter(board, nets, "GND", "GND")
    for k, net in enumerate(nets):
        y = lane(k)
        if net in ("CK0", "CK2"):
            for x, end in ((24.0, 15.0), (54.0, 63.0)):
                via(board, net, (x, y))
                via(board, "GND", (x, y - 0.7))
                board.trace(net, 0, OUTER, (end, y), (x, y))
                teardrop(board, net, 0, (x, y), (end, y), 0.5, OUTER, 0.5)
            board.trace(net, 3, OUTER, (24.0, y), (54.0, y))
        elif net == "GAIN1":
            way = serpentine((30.0, y), 4, 5.0, 1.2)
            board.trace(net, 0, OUTER, (15, y), *way, (way[-1][0], y), (63, y))
        elif net == "CK5":
            chip(board, "R7", (22, y), 0, ("CK5", "CK5_R"))
            board.trace("CK5", 0, OUTER, (15, y), (21.52, y))
            board.trace("CK5_R", 0, OUTER, (22.48, y), (63, y))
        else:
            board.trace(net, 0, OUTER, (15, y), (63, y))
    for pad in [p for p in board.pads if p.component == "U2" and p.net == "CK5"]:
        board.pads.remove(pad)
        board.pads.append(type(pad)(**{**pad.__dict__, "net": "CK5_R"}))
    header(board, "J1", (30, 44), 0, ("GND", "VDD", "GND", "VDD", "GND", "VDD"), rows_=2)
    for x, y in ((5, 5), (40, 5), (75, 5), (5, 47), (55, 47), (75, 47), (20, 36), (60, 36)):
        via(board, "GND", (x, y))
    board.holes += [Hole((3, 3), 3.2), Hole((77, 3), 3.2), Hole((3, 33), 3.2), Hole((77, 33), 3.2)]
    whole = box(0.5, 0.5, 79.5, 49.5)
    board.planes += [
        Plane("GND", 1, whole),
        Plane("GND", 2, whole),
        Plane("VDD", 0, box(6, 38, 74, 49), clearance=0.3),
        Plane("GND", 3, box(10, 2, 70, 14), hatch=1.2),
    ]
    board.fills.append(Fill("GND", 3, box(68, 40, 72, 44)))
    via(board, "GND", (70, 42))
    clocks = {"impedance": "50 ohm", "tolerance": "10%", "rise_time": "300ps", "width": f"{OUTER}mm"}
    board.classes = {"clock": clocks, "control": {"impedance": "50 ohm", "tolerance": "12%", "rise_time": "1ns"}}
    board.joins = ("R7",)
    for k, net in enumerate(nets):
        board.nets.append(Declared(net, "clock" if net.startswith("CK") else "control", f"U1.{11 + k}", f"U2.{10 - k}"))
    return board, []


def expected(labels: list[Label]) -> str:
    lines = [
        "# Every finding `impcheck check` must report for this board, and no other: rule, net, layer, place in mm, and why it is a defect."
    ]
    lines += ["findings:" if labels else "findings: []"]
    for label in labels:
        lines += [
            f"  - rule: {label.rule}",
            f"    net: {label.net}",
            f"    layer: {label.layer}",
            f"    at: [{label.at[0]:g}, {label.at[1]:g}]",
            f"    why: {json.dumps(label.why)}",
        ]
    return "\n".join([*lines, ""])


BOARDS = {
    "ice-antenna": (antenna, Dialect("ice-antenna"), "Antenna board of the river-ice gauge. The files say nets and pins themselves (X2)."),
    "ice-logger": (
        logger,
        Dialect(
            "ice-logger",
            "inch",
            6,
            "netlist",
            {-1: "strokes"},
            {-1: "regions", 1: "clear"},
            naming="suffixes",
            drill_unit="inch",
            drill_zeros="TZ",
        ),
        "Logger board of the river-ice gauge. Plain Gerber in inches; nets and pins come from the IPC-D-356 netlist.",
    ),
    "ice-main": (
        gauge_main,
        Dialect("ice-main", "inch", 6, "netlist", {-1: "strokes"}, {-1: "clear"}, drill_unit="inch", drill_zeros="TZ"),
        "Main board of the river-ice gauge, dense. Plain Gerber in inches, planes dark and clear; nets and pins come from the netlist.",
    ),
    "ice-sampler": (
        sampler,
        Dialect("ice-sampler", "mm", 6, "x2", {-1: "strokes", 2: "regions"}, {-1: "regions", 3: "negative", 4: "clear"}),
        "Sampler board of the river-ice gauge. L3 is drawn as regions, L4 is a negative plane.",
    ),
    "ice-clock": (
        clock,
        Dialect("ice-clock", "mm", 6, "x2", {-1: "strokes", 3: "both"}, archive=True, job=True),
        "Clock board of the river-ice gauge, as the zip that went to the fab. No known defects.",
    ),
}


def main() -> None:
    for name, (draw, dialect, heading) in BOARDS.items():
        board, labels = draw()
        folder = HERE / name
        shutil.rmtree(folder, ignore_errors=True)
        write_board(board, folder, dialect, heading)
        (folder / "expected.yaml").write_text(expected(labels), encoding="utf-8")


if __name__ == "__main__":
    main()
