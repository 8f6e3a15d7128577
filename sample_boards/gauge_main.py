"""The river-ice gauge's main board: four layers, microstrips over a ground plane with a slot and over split rails. In: nothing; out:
Board and its labels, mm."""

from __future__ import annotations

import shapely

from sample_boards.surroundings import keep_free, pour, rectangle, stitch
from tests.boards.model import Board, Cut, Declared, Fill, Hole, Label, Layer, Pad, Plane
from tests.boards.parts import chip, header, quad, rows, teardrop, via
from tests.boards.router import Router

WIDTH = 0.19  # 50 ohm over 115 um of er 4.1, copper 40 um, masked: 51.7 bare by Hammerstad and Jensen, the mask takes 2 to 3 % off
STACKUP = (
    Layer("mask", 25, 3.5),
    Layer("copper", 40, name="L1", etch=14),
    Layer("dielectric", 115, 4.1, 0.016, "prepreg 2113"),
    Layer("copper", 18, name="L2"),
    Layer("dielectric", 1130, 4.4, 0.018, "core"),
    Layer("copper", 18, name="L3"),
    Layer("dielectric", 115, 4.1, 0.016, "prepreg 2113"),
    Layer("copper", 40, name="L4", etch=14),
    Layer("mask", 25, 3.5),
)


def draw() -> tuple[Board, list[Label]]:
    """The board and every finding it must give."""
    board = Board("Sedgeholm river-ice gauge, main board, revision C", rectangle(0, 0, 70, 45), STACKUP)
    board.returns = ("GND", "V3V3", "V1V8")
    board.joins = ("R1",)
    board.classes = {
        "serial": {"impedance": "50 ohm", "tolerance": "10%", "rise_time": "300ps", "width": "0.19mm"},
        "clock": {"impedance": "50 ohm", "tolerance": "10%", "rise_time": "250ps"},
    }
    place_parts(board)
    controlled = route_controlled(board)
    labels = spoil(board)
    board.planes.append(
        Plane(
            "GND",
            1,
            rectangle(0.5, 0.5, 69.5, 44.5),
            cuts=(
                Cut(((44.0, 39.5), (44.0, 43.2)), 0.5),  # slot, left by a merged row of antipads
                Cut(rectangle(38.0, 23.355, 43.0, 25.4)),  # guard area under the converter's reference
                Cut(rectangle(40.42, 23.325, 40.58, 23.4)),
            ),
        )
    )
    board.planes.append(Plane("V3V3", 2, ((0.5, 0.5), (51.4, 0.5), (51.4, 9), (43.8, 9), (43.8, 44.5), (0.5, 44.5))))
    board.planes.append(Plane("V1V8", 2, ((51.8, 0.5), (69.5, 0.5), (69.5, 44.5), (44.2, 44.5), (44.2, 9.4), (51.8, 9.4))))
    router = Router(board, (0, 3), ("GND", "V3V3", "V1V8"))
    keep_free(router, board, controlled, 0.7, 0.85)
    for pin in board.vias:
        if pin.thermal:
            for layer in router.layers:
                router.keep[layer].append(shapely.Point(pin.at).buffer(1.45))
    failed = router.run(skip=controlled)
    if failed:
        raise RuntimeError(f"not routed: {failed}")
    stitch(board, "GND", 2.6, (0, 3), 0.4, 1.2, controlled)
    pour(board, "GND", 0)
    pour(board, "GND", 3)
    return board, labels


def place_parts(board: Board) -> None:
    u1 = {
        1: "V3V3",
        2: "GND",
        3: "GAUGE_CLK_R",
        5: "KEY_WAKE",
        6: "LED_ICE",
        8: "V3V3",
        9: "GND",
        10: "HEAT_EN",
        12: "PROBE_SDA",
        13: "PROBE_SCL",
    }
    u1 |= {15: "TEMP_A", 16: "TEMP_B", 17: "V3V3", 18: "GND", 20: "FLOW_IN", 21: "RADIO_RST", 23: "GND", 24: "RADIO_RX", 25: "RADIO_TX"}
    u1 |= {26: "ADC_DATA_READY_N", 27: "ADC_MISO", 28: "ADC_SCK", 30: "FLASH_CS", 31: "FLASH_MISO", 32: "FLASH_MOSI", 33: "FLASH_SCK"}
    u1 |= {34: "V3V3", 35: "GND", 37: "SWDIO", 38: "SWCLK", 39: "NRST", 41: "DEBUG_TX", 43: "V3V3", 44: "GND"}
    quad(board, "U1", (18, 24), 0, u1, 44, 0.8, 12.0, (1.6, 0.45))
    rows(
        board,
        "U2",
        (56, 38),
        0,
        {1: "FLASH_SCK", 2: "FLASH_MOSI", 3: "FLASH_MISO", 4: "FLASH_CS", 5: "GND", 6: "FLASH_WP", 7: "FLASH_WP", 8: "V1V8"},
        8,
        1.27,
        5.4,
        (1.5, 0.6),
    )
    u3 = {1: "ADC_SCK", 3: "ADC_MISO", 5: "ADC_DATA_READY_N", 8: "GND", 9: "GND", 11: "ICE_P", 12: "ICE_N", 14: "V1V8", 16: "V1V8"}
    rows(board, "U3", (56, 22), 0, u3, 16, 0.65, 5.8, (1.3, 0.4))
    rows(board, "U4", (52, 6), 0, {1: "V3V3", 2: "GND", 3: "V3V3", 5: "GND", 6: "V1V8"}, 6, 0.95, 2.6, (1.0, 0.6))
    rows(board, "Y1", (6, 36), 0, {1: "V3V3", 2: "GND", 3: "GAUGE_CLK", 4: "V3V3"}, 4, 2.2, 2.4, (1.0, 1.2))
    chip(board, "R1", (9.2, 34.9), 0, ("GAUGE_CLK", "GAUGE_CLK_R"))
    chip(board, "R2", (62, 37), 90, ("V1V8", "FLASH_WP"))
    chip(board, "R3", (6, 26), 90, ("KEY_WAKE", "V3V3"), "0603")
    chip(board, "R4", (5.5, 21), 0, ("LED_ICE", "LED_A"), "0603")
    chip(board, "D1", (3, 18), 90, ("GND", "LED_A"), "0805")
    chip(board, "R5", (16, 14), 0, ("PROBE_SDA", "V3V3"))
    chip(board, "R6", (19.5, 14), 180, ("PROBE_SCL", "V3V3"))
    for k, (x, y, turn, rail) in enumerate(
        (
            (9.8, 29.6, 90, "V3V3"),
            (9.8, 22, 90, "V3V3"),
            (22, 16, 0, "V3V3"),
            (25, 32.4, 0, "V3V3"),
            (14, 32.4, 0, "V3V3"),
            (61, 25, 90, "V1V8"),
            (62, 41, 90, "V1V8"),
        ),
        1,
    ):
        chip(board, f"C{k}", (x, y), turn, (rail, "GND"))
    chip(board, "C8", (48, 6), 90, ("V3V3", "GND"), "0805")
    chip(board, "C9", (56, 6), 90, ("V1V8", "GND"), "0805")
    chip(board, "C10", (30.8, 19.4), 90, ("V3V3", "GND"))
    chip(board, "C11", (24.4, 16.4), 90, ("V3V3", "GND"))
    chip(board, "C12", (3.2, 38), 90, ("V3V3", "GND"))
    header(
        board,
        "J1",
        (3.5, 5),
        0,
        ("V3V3", "GND", "PROBE_SDA", "PROBE_SCL", "TEMP_A", "TEMP_B", "FLOW_IN", "HEAT_EN"),
        plane_net=("GND", "V3V3"),
    )
    header(board, "J2", (64, 16), -90, ("V1V8", "RADIO_TX", "GND", "RADIO_RST"), plane_net=("GND", "V1V8"))
    header(board, "J3", (30, 5), 0, ("GND", "RADIO_RX", "V3V3", "GND"), plane_net=("GND", "V3V3"))
    header(board, "J4", (66, 31), -90, ("ICE_P", "ICE_N", "GND"))
    header(board, "J5", (15, 41), 0, ("V3V3", "SWDIO", "GND", "SWCLK", "NRST", "DEBUG_TX"), plane_net=("GND", "V3V3"))
    board.pads.append(Pad("ADC_DATA_READY_N", 0, (41.0, 16.2), "circle", (0.9, 0.9), component="TP1", pin="1", paste=False))
    board.holes += [Hole((3.2, 41.8), 2.7), Hole((66.8, 41.8), 2.7), Hole((66.8, 3.2), 2.7), Hole((34.0, 41.6), 1.0, (38.0, 41.6))]


def route_controlled(board: Board) -> list[str]:
    """The declared nets, by hand."""
    w = WIDTH
    board.trace("FLASH_SCK", 0, w, (24, 28), (26, 28), (37.905, 39.905), (53.3, 39.905))
    board.trace("FLASH_MOSI", 0, w, (24, 27.2), (27, 27.2), (38.435, 38.635), (53.3, 38.635))
    board.trace("FLASH_MISO", 0, w, (24, 26.4), (28, 26.4), (38.965, 37.365), (53.3, 37.365))
    board.trace("FLASH_CS", 0, w, (24, 25.6), (29, 25.6), (39.495, 36.095), (53.3, 36.095))
    board.trace("ADC_SCK", 0, w, (24, 24), (31, 24), (34, 27), (44, 27), (46.725, 24.275), (53.1, 24.275))
    board.trace("ADC_MISO", 0, w, (24, 23.2), (48, 23.2), (48.225, 22.975), (53.1, 22.975))
    board.trace("ADC_DATA_READY_N", 0, w, (24, 22.4), (33, 22.4), (35, 20.4), (47, 20.4), (48.275, 21.675), (53.1, 21.675))
    board.trace("GAUGE_CLK", 0, w, (7.2, 34.9), (8.72, 34.9))
    board.trace("GAUGE_CLK_R", 0, w, (9.68, 34.9), (10.4, 34.18), (10.4, 31.6), (8.2, 29.4), (8.2, 28), (9.8, 26.4), (12, 26.4))
    board.trace("RADIO_TX", 0, w, (24, 21.6), (27, 21.6), (29, 19.6))
    via(board, "RADIO_TX", (29, 19.6))
    board.trace("RADIO_TX", 3, w, (29, 19.6), (29, 16), (31.54, 13.46), (64, 13.46))
    board.trace("RADIO_RX", 0, w, (24, 20.8), (24.9, 20.8), (26.5, 19.2), (26.5, 17.5))
    via(board, "RADIO_RX", (26.5, 17.5))
    board.trace("RADIO_RX", 3, w, (26.5, 17.5), (26.5, 12), (28.5, 10), (30.54, 10), (32.54, 8), (32.54, 5))
    teardrop(board, "RADIO_TX", 0, (29, 19.6), (27, 21.6), 0.5, w, 0.6)
    teardrop(board, "RADIO_TX", 3, (29, 19.6), (29, 16), 0.5, w, 0.6)
    teardrop(board, "RADIO_RX", 0, (26.5, 17.5), (26.5, 19.2), 0.5, w, 0.6)
    teardrop(board, "RADIO_RX", 3, (26.5, 17.5), (26.5, 12), 0.5, w, 0.6)
    serial = ("FLASH_SCK", "FLASH_MOSI", "FLASH_MISO", "FLASH_CS", "ADC_SCK", "ADC_MISO", "ADC_DATA_READY_N", "RADIO_TX", "RADIO_RX")
    ends = {
        "FLASH_SCK": ("U1.33", "U2.1"),
        "FLASH_MOSI": ("U1.32", "U2.2"),
        "FLASH_MISO": ("U2.3", "U1.31"),
        "FLASH_CS": ("U1.30", "U2.4"),
        "ADC_SCK": ("U1.28", "U3.1"),
        "ADC_MISO": ("U3.3", "U1.27"),
        "ADC_DATA_READY_N": ("U3.5", "U1.26"),
        "RADIO_TX": ("U1.25", "J2.2"),
    }
    board.nets = [Declared(net, "serial", *ends.get(net, ("", ""))) for net in serial]
    board.nets.append(Declared("GAUGE_CLK", "clock", "Y1.3", "U1.3", "through the series resistor R1"))
    return [*serial, "GAUGE_CLK", "GAUGE_CLK_R"]


def spoil(board: Board) -> list[Label]:
    """Builds in the defects."""
    old = next(t for t in board.traces if t.net == "FLASH_MOSI")
    board.traces.remove(old)
    board.trace("FLASH_MOSI", 0, WIDTH, (24, 27.2), (27, 27.2), (38.435, 38.635), (46, 38.635))
    board.trace("FLASH_MOSI", 0, 0.3, (46, 38.635), (49.2, 38.635))
    board.trace("FLASH_MOSI", 0, WIDTH, (49.2, 38.635), (53.3, 38.635))
    board.fills.append(Fill("FLASH_MOSI", 0, rectangle(47.52, 38.635 - 0.17, 47.68, 38.635 + 0.17)))
    board.trace("ADC_DATA_READY_N", 0, WIDTH, (41, 20.4), (41, 16.2))
    wide = "a 0.30 mm wide stretch of 3.2 mm, 0.34 mm at its widest, where the class says 0.19 mm"
    return [
        Label(
            "reference-gap", "FLASH_SCK", "L1", (44.0, 39.905), "crosses a slot in the ground plane on L2, 0.5 mm wide and 4.2 mm long", 0.5
        ),
        Label("width", "FLASH_MOSI", "L1", (47.6, 38.635), wide, 3.2),
        Label("impedance", "FLASH_MOSI", "L1", (47.6, 38.635), wide + ": about 39 ohm against 50", 3.2),
        Label(
            "plane-edge",
            "ADC_MISO",
            "L1",
            (40.5, 23.2),
            "runs 0.06 mm (0.03 mm at the worst) beside the edge of a void in L2 for 5 mm, 0.115 mm above it",
            5.0,
        ),
        Label("reference-gap", "RADIO_TX", "L4", (44.0, 13.46), "crosses the moat between the rails V3V3 and V1V8 on L3, 0.4 mm wide", 0.4),
        Label(
            "branch-stub", "ADC_DATA_READY_N", "L1", (41.0, 20.4), "a 4 mm branch to the test point TP1; the edge allows about 2.6 mm", 4.0
        ),
    ]
