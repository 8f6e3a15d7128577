"""A large invented board for the benchmark. In: a folder and a size; out: Gerber, Excellon, netlist and board file of 10 layers. Shares
no code with impcheck.

One tile holds 100 declared nets in lanes (a pad, a microstrip, a via, a stripline with jogs, a via, a pad, each with its return vias),
about 2,600 foreign vias between the lanes and in two ball grid fields, whose antipads perforate five planes, and short foreign traces
on every signal layer: a little over 40,000 objects. A board of n tiles is n times that.
"""

from __future__ import annotations

import random
from pathlib import Path

TILE = (104.0, 84.0)  # mm
PLANES = (1, 3, 5, 7, 8)  # copper layer index; all GND but layer 4 (index 3), which is a supply
SUPPLY = 3
SIGNALS = (0, 2, 4, 6, 9)
LANES = 100
PITCH = 0.76  # mm between lanes
WIDTH = {0: 0.17, 2: 0.1, 4: 0.1, 6: 0.1, 9: 0.17}
DRILL, PAD, ANTIPAD = 0.15, 0.3, 0.56
DIELECTRIC = (0.1, 0.1, 0.12, 0.12, 0.2, 0.12, 0.12, 0.1, 0.1)


class Layer:
    """The text of one Gerber file."""

    def __init__(self, function: str) -> None:
        self.head = ["%FSLAX46Y46*%", "%MOMM*%", f"%TF.FileFunction,{function}*%"]
        self.codes: dict[str, int] = {}
        self.body: list[str] = ["G01*"]
        self.code = -1
        self.net = ""
        self.pin = ""

    def aperture(self, shape: str) -> None:
        number = self.codes.setdefault(shape, len(self.codes) + 10)
        if number != self.code:
            self.code = number
            self.body.append(f"D{number}*")

    def named(self, net: str, pin: str = "") -> None:
        if net != self.net or pin != self.pin:
            self.body.append("%TD*%" if not net else f"%TO.N,{net}*%" + (f"\n%TO.P,{pin}*%" if pin else "\n%TD.P*%" if self.pin else ""))
            self.net, self.pin = net, pin

    def flash(self, x: float, y: float, shape: str) -> None:
        self.aperture(shape)
        self.body.append(f"X{round(x * 1e6)}Y{round(y * 1e6)}D03*")

    def path(self, width: float, points: list[tuple[float, float]]) -> None:
        self.aperture(f"C,{width:.6f}")
        for code, (x, y) in zip(["D02"] + ["D01"] * (len(points) - 1), points, strict=True):
            self.body.append(f"X{round(x * 1e6)}Y{round(y * 1e6)}{code}*")

    def box(self, x0: float, y0: float, x1: float, y1: float) -> None:
        corners = [(x0, y0), (x1, y0), (x1, y1), (x0, y1), (x0, y0)]
        lines = [f"X{round(x * 1e6)}Y{round(y * 1e6)}{'D02' if k == 0 else 'D01'}*" for k, (x, y) in enumerate(corners)]
        self.body += ["G36*", *lines, "G37*"]

    def text(self) -> str:
        apertures = [f"%ADD{number}{shape}*%" for shape, number in self.codes.items()]
        return "\n".join([*self.head, *apertures, *self.body, "M02*", ""])


class Big:
    """The board while it is drawn."""

    def __init__(self, tiles: int) -> None:
        self.columns = {1: 1, 2: 2, 4: 2, 8: 4}.get(tiles, tiles)
        self.rows = -(-tiles // self.columns)
        self.size = (self.columns * TILE[0], self.rows * TILE[1])
        sides = ["Top"] + ["Inr"] * 8 + ["Bot"]
        self.layers = [Layer(f"Copper,L{k + 1},{side}") for k, side in enumerate(sides)]
        self.clear: list[list[tuple[float, float]]] = [[] for _ in range(10)]
        self.holes: list[tuple[float, float]] = []
        self.points: list[str] = []
        self.nets: list[str] = []
        self.pads: list[tuple[int, float, float, str, str]] = []

    def via(self, net: str, x: float, y: float, used: tuple[int, ...] = ()) -> None:
        self.holes.append((x, y))
        for layer in {0, 9, *used}:
            self.pads.append((layer, x, y, f"C,{PAD:.6f}", net))
        for layer in PLANES:
            if net != ("VDD" if layer == SUPPLY else "GND"):
                self.clear[layer].append((x, y))
        self.points.append(record(net, "VIA", "", x, y, DRILL, 0))


def record(net: str, part: str, pin: str, x: float, y: float, drill: float, access: int) -> str:
    """One IPC-D-356 record in thousandths of a millimetre."""
    hole = f"D{round(drill * 1000):04d}P" if drill else " " * 6
    code = "317" if drill else "327"
    place = f"X{round(x * 1000):+07d}Y{round(y * 1000):+07d}X0400Y0400R000S0"
    return f"{code}{net[:14]:<14}   {part[:6]:<6}{'-' + pin[:4] if pin else '':<5} {hole}A{access:02d}{place}"


def tile(big: Big, number: int, x0: float, y0: float, rng: random.Random) -> None:
    """Draws one tile."""
    for lane in range(LANES):
        net = f"SIG{number}_{lane:02d}"
        big.nets.append(net)
        y = y0 + 4 + lane * PITCH
        inner = (2, 4, 6)[lane % 3]
        a, b = x0 + 3 + (lane % 4) * 1.2, x0 + 40 + (lane * 7) % 20
        first, second = a + 4.0, b - 4.0
        out = 0 if lane % 2 else 9
        for part, pin, x, layer in (("U", "1", a, 0), ("J", "1", b, out)):
            name = f"{part}{number}{lane:02d}"
            big.layers[layer].named(net, f"{name},{pin}")
            big.layers[layer].flash(x, y, "R,0.500000X0.300000")
            big.points.append(record(net, name, pin, x, y, 0.0, 1 if layer == 0 else 10))
        big.layers[0].named(net)
        big.layers[0].path(WIDTH[0], [(a, y), (first, y)])
        big.layers[out].named(net)
        big.layers[out].path(WIDTH[out], [(second, y), (b, y)])
        big.layers[inner].named(net)
        jog, points, side = 0.04, [(first, y)], 1
        for k in range(1, 5):
            x = first + (second - first) * k / 5
            points += [(x, points[-1][1]), (x + jog, y + (jog if side > 0 else 0.0))]
            side = -side
        points += [(second - jog, points[-1][1])] if points[-1][1] == y else []
        big.layers[inner].path(WIDTH[inner], [*points, (second, y)])
        for x in (first, second):
            big.via(net, x, y, (inner,))
            big.via("GND", x + (0.6 if x == first else -0.6), y + PITCH / 2)
        for k in range(14):  # foreign vias half-way to the next lane
            x = first + 1.5 + (second - first - 3) * (k + rng.random() * 0.8) / 14
            big.via("VDD" if k % 5 == 0 else f"BG{number}_{lane}_{k}", x, y + PITCH / 2)
    for field in range(2):  # ball grid fields with their escape traces
        for row in range(24):
            for column in range(24):
                x, y = x0 + 68 + column * 1.0, y0 + 6 + field * 38 + row * 1.0
                net = ("GND", "VDD")[column % 2] if (row + column) % 3 == 0 else f"B{number}_{field}_{row}_{column}"
                big.via(net, x, y)
                if net[0] == "B":
                    layer = SIGNALS[rng.randrange(len(SIGNALS))]
                    big.layers[layer].named(net)
                    big.layers[layer].path(0.1, [(x, y), (x + 0.3, y + 0.3), (x + 0.3, y + 0.5 + rng.random() * 0.2)])
    for k in range(1500):  # foreign traces beyond the fields, a few strokes each
        layer = SIGNALS[k % len(SIGNALS)]
        x, y = x0 + 94 + (k // 5) % 6 * 1.4, y0 + 4 + (k // 30) * 1.5
        net = f"F{number}_{k}"
        big.layers[layer].named(net)
        points = [(x, y)]
        for _ in range(9):
            points.append((points[-1][0] + 0.09, y + rng.random() * 0.9))
        big.layers[layer].path(0.1, points)


def write_big_board(folder: Path, tiles: int = 1) -> Path:
    """Writes the board into a folder and returns its board file."""
    big = Big(tiles)
    rng = random.Random(7)
    for number in range(tiles):
        tile(big, number, (number % big.columns) * TILE[0], (number // big.columns) * TILE[1], rng)
    width, height = big.size
    for index in PLANES:
        layer = big.layers[index]
        layer.named("VDD" if index == SUPPLY else "GND")
        layer.box(0.5, 0.5, width - 0.5, height - 0.5)
        layer.named("")
        layer.body.append("%LPC*%")
        for x, y in big.clear[index]:
            layer.flash(x, y, f"C,{ANTIPAD:.6f}")
        layer.body.append("%LPD*%")
    for index, x, y, shape, net in big.pads:
        big.layers[index].named(net)
        big.layers[index].flash(x, y, shape)
    fab = folder / "fab"
    fab.mkdir(parents=True)
    for index, layer in enumerate(big.layers):
        (fab / f"big-L{index + 1}.gbr").write_text(layer.text())
    edge = Layer("Profile,NP")
    edge.path(0.1, [(0, 0), (width, 0), (width, height), (0, height), (0, 0)])
    (fab / "big-edge.gbr").write_text(edge.text())
    holes = "\n".join(f"X{x:.4f}Y{y:.4f}" for x, y in big.holes)
    (fab / "big-pth.drl").write_text(f"M48\n; #@! TF.FileFunction,Plated,1,10,PTH\nMETRIC\nT1C{DRILL:.3f}\n%\nT1\n{holes}\nM30\n")
    (fab / "big.ipc").write_text("P  JOB big\nP  UNITS CUST 1\n" + "\n".join(big.points) + "\n999\n")
    (folder / "board.yaml").write_text(board_file(big))
    return folder / "board.yaml"


def board_file(big: Big) -> str:
    """The board file."""
    lines = ["impcheck: 1", "board: Benchmark board", "files: fab", "stackup:", "  - {mask: 20um, er: 3.6}"]
    for index in range(10):
        etch = ", etch: 12um" if index in SIGNALS else ""
        lines.append(f"  - {{copper: L{index + 1}, thickness: {'40um' if index in (0, 9) else '17um'}{etch}}}")
        if index < len(DIELECTRIC):
            lines.append(f"  - {{dielectric: {round(DIELECTRIC[index] * 1000)}um, er: 4.0, loss_tangent: 0.015}}")
    lines += ["  - {mask: 20um, er: 3.6}", "returns: [GND, VDD]", "classes:"]
    widths = ", ".join(f"L{layer + 1}: {width}mm" for layer, width in WIDTH.items())
    lines += [
        f"  bus: {{impedance: 50 ohm, tolerance: 15%, rise_time: 300ps, width: {{{widths}}}}}",
        "nets:",
        '  - {net: "SIG*", class: bus}',
    ]
    return "\n".join(lines) + "\n"
