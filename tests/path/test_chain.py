"""From Gerber text to walks: reader, copper, nets and path together. Places and widths are known from the drawing (exact)."""

from itertools import pairwise

import numpy as np
import pytest

from impcheck.artwork.board import Board, End, NetClass, NetRequest
from impcheck.artwork.gerber.reader import read_gerber
from impcheck.artwork.parts import Artwork
from impcheck.copper.build import rebuild
from impcheck.nets.connect import connect
from impcheck.path.build import walk_nets
from impcheck.path.walk import Walk, Zone
from tests.path.board_builder import Drawing

Point = tuple[float, float]


def _at(point: Point) -> str:
    return f"X{round(point[0] * 1e6)}Y{round(point[1] * 1e6)}"


class Plot:
    """Writes one Gerber layer."""

    def __init__(self) -> None:
        self.apertures: dict[tuple[str, tuple[float, ...]], int] = {}
        self.body: list[str] = []

    def use(self, shape: str, *size: float) -> None:
        code = self.apertures.setdefault((shape, size), 10 + len(self.apertures))
        self.body.append(f"D{code}*")

    def say(self, command: str) -> "Plot":
        self.body.append(command)
        return self

    def stroke(self, points: list[Point], width: float) -> "Plot":
        self.use("C", width)
        for a, b in pairwise(points):
            self.body += [f"{_at(a)}D02*", f"{_at(b)}D01*"]
        return self

    def flash(self, point: Point, shape: str, *size: float) -> "Plot":
        self.use(shape, *size)
        return self.say(f"{_at(point)}D03*")

    def region(self, points: list[Point]) -> "Plot":
        self.body += ["G36*", f"{_at(points[0])}D02*", *[f"{_at(p)}D01*" for p in [*points[1:], points[0]]], "G37*"]
        return self

    def text(self) -> bytes:
        sizes = {key: "X".join(f"{value:g}" for value in key[1]) for key in self.apertures}
        head = ["%FSLAX46Y46*%", "%MOMM*%", *[f"%ADD{code}{key[0]},{sizes[key]}*%" for key, code in self.apertures.items()], "G01*"]
        return "\n".join([*head, *self.body, "M02*"]).encode()


def signal() -> Plot:
    plot = Plot().say("%TO.N,TIDE*%").stroke([(2, 5), (6, 5), (8, 7), (12, 7)], 0.15)
    plot.say("%TO.P,U1,1*%").flash((2, 5), "R", 0.5, 0.5)
    return plot.say("%TO.P,U2,1*%").flash((12, 7), "R", 0.5, 0.5)


def plane() -> Plot:
    plot = Plot().say("%TO.N,GND*%").region([(0, 0), (30, 0), (30, 30), (0, 30)])
    return plot.say("%LPC*%").flash((10, 7.2), "C", 0.6).stroke([(4, 3), (4, 8)], 0.4)


def negative_plane() -> Plot:
    plot = Plot().say("%IPNEG*%").flash((10, 7.2), "C", 0.6).stroke([(4, 3), (4, 8)], 0.4)
    return plot.stroke([(0, 0), (30, 0), (30, 30), (0, 30), (0, 0)], 0.2)


def walk(top: Plot, bottom: Plot, request: NetRequest, returns: tuple[str, ...]) -> Walk:
    board = Board("Tide logger", "board.yaml", {"c": NetClass("c", impedance=50)}, (request,), returns=returns)
    images = (read_gerber(top.text(), "L1.gbr"), read_gerber(bottom.text(), "L2.gbr"))
    artwork = Artwork(board, Drawing(2).stackup(), images, None, None, None, (), None, ())
    copper = rebuild(artwork)
    return walk_nets(artwork, copper, connect(artwork, copper))[0]


def check(found: Walk) -> None:
    length = 8 + 8**0.5
    assert found.status == "walked"
    assert found.length == pytest.approx(length, abs=1e-5)
    (run,) = found.runs
    trace = run.stations.zone == Zone.TRACE
    assert np.allclose(run.stations.width[trace], 0.15, atol=1e-6)
    open_at = run.stations.begin[run.stations.coverage_below < 1], run.stations.end[run.stations.coverage_below < 1]
    assert open_at[0][0] == pytest.approx(1.8, abs=5e-3)  # the slot from x = 3.8 to 4.2
    assert pytest.approx(open_at[1][open_at[1] < 5].max(), abs=5e-3) == 2.2
    half = (0.3**2 - 0.125**2) ** 0.5  # the disc under the far edge of the trace
    assert open_at[0][open_at[0] > 5].min() == pytest.approx(length - 2 - half, abs=5e-3)
    assert open_at[1][-1] == pytest.approx(length - 2 + half, abs=5e-3)


def test_named_nets_over_a_plane_of_dark_and_clear() -> None:
    check(walk(signal(), plane(), NetRequest("TIDE", "c"), ("GND",)))


def test_declared_ends_over_a_negative_plane() -> None:
    top = Plot().stroke([(2, 5), (6, 5), (8, 7), (12, 7)], 0.15).flash((2, 5), "R", 0.5, 0.5).flash((12, 7), "R", 0.5, 0.5)
    ends = (End(at=(2.0, 5.0), layer="L1"),), (End(at=(12.0, 7.0), layer="L1"),)
    check(walk(top, negative_plane(), NetRequest("TIDE", "c", *ends), ()))
