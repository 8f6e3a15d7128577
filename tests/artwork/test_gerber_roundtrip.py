"""Random files written by a few lines here come back exactly: kinds, places, polarity, apertures, nets, lines."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from impcheck.artwork.gerber import read_gerber
from impcheck.artwork.image import Kind

_MICRO = st.integers(-50_000_000, 50_000_000)  # in 1e-6 mm


@dataclass(frozen=True)
class Thing:
    kind: Kind
    points: tuple[tuple[int, int], ...]
    aperture: int
    dark: bool
    net: str


_POINT = st.tuples(_MICRO, _MICRO)
_THING = st.builds(
    lambda kind, points, aperture, dark, net: Thing(
        kind, tuple(points[: {Kind.FLASH: 1, Kind.DRAW: 2}.get(kind, len(points))]), aperture, dark, net
    ),
    st.sampled_from([Kind.FLASH, Kind.DRAW, Kind.REGION]),
    st.lists(_POINT, min_size=3, max_size=7, unique=True),
    st.integers(0, 2),
    st.booleans(),
    st.sampled_from(["", "CLK", "GND", "/D[0],x", "µ"]),
)


def written(things: list[Thing], end: str, modal: bool) -> tuple[str, list[int]]:
    """The file's text, and the line of each object."""
    lines = ["%FSLAX36Y36*%", "%MOMM*%", "%ADD10C,0.1*%", "%ADD11R,1X2*%", "%ADD12O,1X2*%", "G01*"]
    at = []
    dark, net, aperture, last = True, "", -1, (None, None)

    def place(point: tuple[int, int]) -> str:
        nonlocal last
        words = "".join(f"{axis}{value}" for axis, value, old in zip("XY", point, last, strict=True) if not modal or value != old)
        last = point
        return words

    for thing in things:
        if thing.dark != dark:
            dark = thing.dark
            lines.append(f"%LP{'D' if dark else 'C'}*%")
        if thing.net != net:
            net = thing.net
            lines.append("%TO.N," + net.replace(",", "\\u002C") + "*%" if net else "%TD*%")
        if thing.kind != Kind.REGION and thing.aperture != aperture:
            aperture = thing.aperture
            lines.append(f"D{10 + aperture}*")
        if thing.kind == Kind.FLASH:
            lines.append(place(thing.points[0]) + "D03*")
            at.append(len(lines))
        elif thing.kind == Kind.DRAW:
            lines.append(place(thing.points[0]) + "D02*")
            lines.append(place(thing.points[1]) + "D01*")
            at.append(len(lines))
        else:
            lines.append("G36*")
            at.append(len(lines))
            lines.append(place(thing.points[0]) + "D02*")
            lines.extend(place(point) + "D01*" for point in (*thing.points[1:], thing.points[0]))
            lines.append("G37*")
    return end.join([*lines, "M02*", ""]), at


@settings(max_examples=120, deadline=None)
@given(st.lists(_THING, max_size=12), st.sampled_from(["\n", "\r\n", "\r"]), st.booleans())
def test_what_was_written_is_read(things: list[Thing], end: str, modal: bool) -> None:
    text, at = written(things, end, modal)
    image = read_gerber(text.encode(), "tide.gbr")
    assert image.kind.tolist() == [thing.kind for thing in things]
    assert image.dark.tolist() == [thing.dark for thing in things]
    assert image.line.tolist() == at
    assert [image.nets[k][0] if k >= 0 else "" for k in image.net] == [thing.net for thing in things]
    assert image.aperture.tolist() == [-1 if thing.kind == Kind.REGION else thing.aperture for thing in things]
    # exact: a whole number of steps over 10^6 is rounded once
    for k, thing in enumerate(things):
        assert image.start[k].tolist() == [v / 1e6 for v in thing.points[0]]
        if thing.kind == Kind.DRAW:
            assert image.end[k].tolist() == [v / 1e6 for v in thing.points[1]]
    corners = [point for thing in things if thing.kind == Kind.REGION for point in thing.points]
    assert image.contours.start.tolist() == [[x / 1e6, y / 1e6] for x, y in corners]
    assert np.all(image.contours.sweep == 0)
