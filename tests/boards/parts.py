"""Parts as pads and silk. In: a board, a name, a place in mm, nets by pin; out: pads, holes and silk added to the board. Shares no code
with impcheck."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence

from tests.boards.model import Board, Pad, Point, Via

CHIPS = {"0402": (0.48, 0.5, 0.62), "0603": (0.8, 0.8, 0.9), "0805": (0.95, 1.0, 1.3)}  # half pitch, pad along, pad across


def _turn(at: Point, offset: Point, degrees: float) -> Point:
    c, s = math.cos(math.radians(degrees)), math.sin(math.radians(degrees))
    return (round(at[0] + c * offset[0] - s * offset[1], 6), round(at[1] + s * offset[0] + c * offset[1], 6))


def _frame(board: Board, side: int, at: Point, turn: float, w: float, h: float) -> None:
    corners = [(-w / 2, -h / 2), (w / 2, -h / 2), (w / 2, h / 2), (-w / 2, h / 2), (-w / 2, -h / 2)]
    board.silk.append((side, 0.12, tuple(_turn(at, corner, turn) for corner in corners)))


def chip(board: Board, name: str, at: Point, turn: float, nets: Sequence[str], size: str = "0402", layer: int = 0) -> None:
    """A two-pin part; pin 1 at the left for turn 0."""
    pitch, along, across = CHIPS[size]
    for pin, sign in (("1", -1), ("2", 1)):
        board.pads.append(Pad(nets[int(pin) - 1], layer, _turn(at, (sign * pitch, 0), turn), "rounded", (along, across), turn, name, pin))
    _frame(board, 0 if layer == 0 else 1, at, turn, 2 * pitch + along + 0.3, across + 0.3)


def rows(
    board: Board,
    name: str,
    at: Point,
    turn: float,
    nets: Mapping[int, str],
    count: int,
    pitch: float,
    span: float,
    pad: tuple[float, float],
    layer: int = 0,
) -> None:
    """A two-row package: pins 1.. down the left side, on up the right side. `span`: distance of the pad centres across. Pins that are
    in no net get one of their own."""
    half = count // 2
    for k in range(count):
        left = k < half
        y = (half - 1) / 2 * pitch - (k if left else count - 1 - k) * pitch
        spot = _turn(at, (-span / 2 if left else span / 2, y), turn)
        board.pads.append(Pad(nets.get(k + 1, f"{name}_NC{k + 1}"), layer, spot, "rectangle", pad, turn, name, str(k + 1)))
    side = 0 if layer == 0 else 1
    _frame(board, side, at, turn, span - pad[0] - 0.4, half * pitch)
    board.silk.append((side, 0.25, (_turn(at, (-span / 2 - pad[0] / 2 - 0.3, (half - 1) / 2 * pitch), turn),)))


def quad(
    board: Board,
    name: str,
    at: Point,
    turn: float,
    nets: Mapping[int, str],
    count: int,
    pitch: float,
    span: float,
    pad: tuple[float, float],
    belly: float = 0.0,
) -> None:
    """A four-sided package, pin 1 at the top of the left side, counter-clockwise. `belly`: side of a middle pad on net GND, 0 none."""
    per = count // 4
    for k in range(count):
        edge, n = divmod(k, per)
        offset = (-span / 2, (per - 1) / 2 * pitch - n * pitch)
        spot = _turn(at, _turn((0, 0), offset, 90 * edge), turn)
        board.pads.append(Pad(nets.get(k + 1, f"{name}_NC{k + 1}"), 0, spot, "obround", pad, (turn + 90 * edge) % 360, name, str(k + 1)))
    if belly:
        board.pads.append(Pad("GND", 0, at, "rectangle", (belly, belly), turn, name, str(count + 1)))
    _frame(board, 0, at, turn, span - pad[0] - 0.4, span - pad[0] - 0.4)


def grid(board: Board, name: str, at: Point, nets: Mapping[str, str], columns: int, lines: int, pitch: float, pad: float) -> None:
    """A ball grid: rows A.. from the top, columns 1.. from the left."""
    letters = "ABCDEFGHJKLMNPRTUVWY"
    for r in range(lines):
        for c in range(columns):
            ball = f"{letters[r]}{c + 1}"
            if ball in nets:
                spot = (round(at[0] + (c - (columns - 1) / 2) * pitch, 6), round(at[1] + ((lines - 1) / 2 - r) * pitch, 6))
                board.pads.append(Pad(nets[ball], 0, spot, "circle", (pad, pad), 0, name, ball))
    _frame(board, 0, at, 0, columns * pitch + 1, lines * pitch + 1)


def header(
    board: Board,
    name: str,
    at: Point,
    turn: float,
    nets: Sequence[str],
    pitch: float = 2.54,
    rows_: int = 1,
    plane_net: Iterable[str] = ("GND",),
    inner: tuple[int, ...] = (),
) -> None:
    """Through-hole pins in one or two rows; those on a plane net get thermal reliefs."""
    columns = len(nets) // rows_
    for k, net in enumerate(nets):
        spot = _turn(at, (k // rows_ * pitch, -(k % rows_) * pitch), turn)
        board.vias.append(Via(net, spot, 1.0, 1.7, 2.1, used=inner, component=name, pin=str(k + 1), thermal=net in set(plane_net)))
    middle = _turn(at, ((columns - 1) / 2 * pitch, -(rows_ - 1) / 2 * pitch), turn)
    _frame(board, 0, middle, turn, columns * pitch, rows_ * pitch)


def coax(board: Board, name: str, at: Point, turn: float, net: str) -> None:
    """A small surface coaxial jack: middle pad 1, two ground pads 2 and 3 beside it."""
    board.pads.append(Pad(net, 0, at, "rectangle", (1.0, 1.0), turn, name, "1"))
    for pin, sign in (("2", 1), ("3", -1)):
        board.pads.append(Pad("GND", 0, _turn(at, (-1.5, sign * 1.5), turn), "rectangle", (2.2, 1.05), turn, name, pin))
    _frame(board, 0, _turn(at, (-1.4, 0), turn), turn, 2.6, 2.6)


def coax_through(board: Board, name: str, at: Point, net: str) -> None:
    """A coaxial jack with a through-hole middle pin 1 and four ground posts 2 to 5."""
    board.vias.append(Via(net, at, 0.9, 1.5, 2.3, component=name, pin="1"))
    for pin, (sx, sy) in zip("2345", ((1, 1), (-1, 1), (-1, -1), (1, -1)), strict=True):
        board.vias.append(Via("GND", (at[0] + 2.54 * sx, at[1] + 2.54 * sy), 1.3, 2.1, 2.5, component=name, pin=pin, thermal=True))
    _frame(board, 0, at, 0, 7.0, 7.0)


def via(board: Board, net: str, at: Point, drill: float = 0.25, pad: float = 0.5, antipad: float = 0.75, **more: object) -> None:
    board.vias.append(Via(net, at, drill, pad, antipad, **more))  # type: ignore[arg-type]


def teardrop(board: Board, net: str, layer: int, at: Point, towards: Point, pad: float, width: float, length: float) -> None:
    """A teardrop from a round pad of diameter `pad` to a trace of `width` that leaves towards a point."""
    from tests.boards.model import Fill

    d = math.dist(at, towards)
    u = ((towards[0] - at[0]) / d, (towards[1] - at[1]) / d)
    n = (-u[1], u[0])
    a, b = 0.45 * pad, width / 2
    corners = ((0, a), (length, b), (length, -b), (0, -a))
    board.fills.append(Fill(net, layer, tuple((at[0] + u[0] * s + n[0] * t, at[1] + u[1] * s + n[1] * t) for s, t in corners[::-1])))


def serpentine(start: Point, legs: int, height: float, pitch: float) -> list[Point]:
    """Corners of a meander that goes on to the right: `legs` strokes up and down of `height`, `pitch` apart, corners cut at 45 degrees."""
    x, y = start
    cut = min(pitch, height) * 0.3
    points = [start]
    up = True
    for _ in range(legs):
        y1 = y + (height if up else 0)
        y0 = y if up else y + height
        s = 1 if up else -1
        points += [(x, y0 + s * 0) if len(points) == 1 else (x, y0 + s * cut), (x, y1 - s * cut), (x + cut, y1), (x + pitch - cut, y1)]
        x += pitch
        up = not up
    points.append((x, y + (0 if up else height) + (cut if up else -cut)))
    return list(dict.fromkeys(points))
