"""Writes Gerber text. In: strokes, arcs, flashes and polygons in mm, with names; out: one file as text, in mm or inches, with or
without X2 attributes. Shares no code with impcheck."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from shapely import Polygon

from tests.boards.model import Pad, Point


class Gerber:
    """One Gerber file being written.

    `names`: "x2" writes attributes, "comment" writes them in G04 comments, "" writes none. `digits` decimals after the point.
    """

    def __init__(self, unit: str = "mm", digits: int = 6, names: str = "x2", negative: bool = False, remark: str = "") -> None:
        self.unit, self.digits, self.names = unit, digits, names
        self.scale = 10**digits / (25.4 if unit == "inch" else 1.0)
        self.head: list[str] = []
        if remark:
            self.head.append(f"G04 {remark}*")
        self.head += [
            f"%FSLAX{4 if unit == 'mm' else 2}{digits}Y{4 if unit == 'mm' else 2}{digits}*%",
            f"%MO{'MM' if unit == 'mm' else 'IN'}*%",
        ]
        self.definitions: list[str] = []
        self.body: list[str] = []
        self.apertures: dict[tuple[str, str], int] = {}
        self.macros: set[str] = set()
        self.current = -1
        self.dark = True
        self.said: dict[str, str] = {}
        self.last_point: tuple[int, int] | None = None
        if negative:
            if names:
                self.file_attribute(".FilePolarity", "Negative")
            else:
                self.head.append("%IPNEG*%")
        elif names:
            self.file_attribute(".FilePolarity", "Positive")

    def _attribute(self, text: str) -> str:
        return f"%{text}*%" if self.names == "x2" else f"G04 #@! {text}*"

    def file_attribute(self, name: str, *values: str) -> None:
        if self.names:
            self.head.append(self._attribute(",".join((f"TF{name}", *values))))

    def object(self, net: str = "", pin: tuple[str, str] | None = None) -> None:
        """Names the objects that follow: net, and component and pin number."""
        if not self.names:
            return
        wanted = {".N": net} if net else {}
        if pin is not None:
            wanted[".P"] = f"{pin[0]},{pin[1]}"
            wanted[".C"] = pin[0]
        if self.said.keys() - wanted.keys():
            self.body.append(self._attribute("TD"))
            self.said = {}
        for name, value in wanted.items():
            if self.said.get(name) != value:
                self.body.append(self._attribute(f"TO{name},{value}"))
        self.said = wanted

    def number(self, value: float) -> str:
        """A length in a definition, in the file's unit."""
        return f"{value / (25.4 if self.unit == 'inch' else 1.0):.{self.digits}f}"

    def xy(self, at: Point) -> tuple[int, int]:
        return round(at[0] * self.scale), round(at[1] * self.scale)

    def polarity(self, dark: bool) -> None:
        if dark != self.dark:
            self.body.append(f"%LP{'D' if dark else 'C'}*%")
            self.dark = dark

    def select(self, definition: str, function: str = "") -> None:
        key = (definition, function)
        if key not in self.apertures:
            code = self.apertures[key] = 10 + len(self.apertures)
            if self.names and function:
                self.definitions.append(self._attribute(f"TA.AperFunction,{function}"))
            self.definitions.append(f"%ADD{code}{definition}*%")
            if self.names and function:
                self.definitions.append(self._attribute("TD"))
        if self.apertures[key] != self.current:
            self.current = self.apertures[key]
            self.body.append(f"D{self.current}*")

    def _go(self, at: Point, command: str, extra: str = "") -> None:
        x, y = self.xy(at)
        self.body.append(f"X{x}Y{y}{extra}{command}*")
        self.last_point = (x, y)

    def stroke(self, points: Sequence[Point], width: float, function: str = "Conductor") -> None:
        self.select(f"C,{self.number(width)}", function)
        if self.last_point != self.xy(points[0]):
            self._go(points[0], "D02")
        self.body.append("G01*")
        for point in points[1:] if len(points) > 1 else points:
            self._go(point, "D01")

    def arc(self, start: Point, end: Point, centre: Point, ccw: bool, width: float, function: str = "Conductor") -> None:
        self.select(f"C,{self.number(width)}", function)
        self.body.append("G75*")
        self._go(start, "D02")
        self.body.append("G03*" if ccw else "G02*")
        i, j = self.xy((centre[0] - start[0], centre[1] - start[1]))
        self._go(end, "D01", f"I{i}J{j}")
        self.body.append("G01*")

    def flash(self, at: Point, definition: str, function: str = "") -> None:
        self.select(definition, function)
        self._go(at, "D03")

    def circle(self, at: Point, diameter: float, function: str = "") -> None:
        self.flash(at, f"C,{self.number(diameter)}", function)

    def macro(self, name: str, *primitives: str) -> None:
        if name not in self.macros:
            self.macros.add(name)
            self.head.append("%AM" + name + "*\n" + "*\n".join(primitives) + "*%")

    def pad(self, pad: Pad, style: str = "flash", grow: float = 0.0, function: str = "") -> None:
        """A pad as a standard aperture, a macro or a region, whichever `style` says and its turn allows."""
        w, h = pad.size[0] + 2 * grow, pad.size[1] + 2 * grow
        turn = pad.rotation % 180
        if pad.shape == "circle" and style != "region":
            self.circle(pad.at, w, function)
            return
        square = min(abs(turn), abs(turn - 180)) < 1e-9, abs(turn - 90) < 1e-9
        if style == "flash" and any(square) and pad.shape in ("rectangle", "obround"):
            if square[1]:
                w, h = h, w
            self.flash(pad.at, f"{'R' if pad.shape == 'rectangle' else 'O'},{self.number(w)}X{self.number(h)}", function)
            return
        if style == "region":
            from tests.boards.shapes import pad_shape

            self.region([pad_shape(pad, grow)], function)
            return
        n = self.number
        if pad.shape == "rectangle":
            self.macro("TURNED", "0 turned rectangle: width, height, angle", "21,1,$1,$2,0,0,$3")
            self.flash(pad.at, f"TURNED,{n(w)}X{n(h)}X{turn:.6f}", function)
        elif pad.shape == "obround":
            if h > w:
                w, h, turn = h, w, turn + 90
            self.macro(
                "CAPSULE",
                "0 turned obround: width, straight half, angle",
                "$4=0-$2",
                "20,1,$1,$4,0,$2,0,$3",
                "1,1,$1,$4,0,$3",
                "1,1,$1,$2,0,$3",
            )
            self.flash(pad.at, f"CAPSULE,{n(h)}X{n((w - h) / 2)}X{turn:.6f}", function)
        else:  # rounded rectangle: two crossed bars and four discs
            r = min(pad.size) / 4 + grow
            self.macro(
                "ROUNDED",
                "0 rounded rectangle: half width less radius, half height less radius, radius, angle",
                "$5=2x$1",
                "$6=2x$2",
                "$7=2x$3",
                "21,1,$5+$7,$6,0,0,$4",
                "21,1,$5,$6+$7,0,0,$4",
                "1,1,$7,$1,$2,$4",
                "1,1,$7,0-$1,$2,$4",
                "1,1,$7,$1,0-$2,$4",
                "1,1,$7,0-$1,0-$2,$4",
            )
            self.flash(pad.at, f"ROUNDED,{n(w / 2 - r)}X{n(h / 2 - r)}X{n(r)}X{turn:.6f}", function)

    def region(self, polygons: Sequence[Polygon], function: str = "") -> None:
        """Each polygon as one region; its holes are joined to the outside by cut-ins."""
        for polygon in polygons:
            if self.names and function:
                self.body.append(self._attribute(f"TA.AperFunction,{function}"))
            ring = with_cut_ins(polygon)
            self.body.append("G36*")
            self._go(ring[0], "D02")
            self.body.append("G01*")
            for point in ring[1:]:
                self._go(point, "D01")
            self._go(ring[0], "D01")
            self.body.append("G37*")
            if self.names and function:
                self.body.append(self._attribute("TD.AperFunction"))

    def outline(self, points: Sequence[Point], width: float = 0.1) -> None:
        self.stroke([*points, points[0]], width, "Profile")

    def text(self) -> str:
        return "\n".join([*self.head, *self.definitions, "%LPD*%", *self.body, "M02*", ""])


def with_cut_ins(polygon: Polygon) -> list[Point]:
    """One ring for a polygon with holes: from the leftmost vertex of each hole a cut goes left to what is there already.

    Holes are taken from left to right, so what the cut meets is the outside or a hole already joined.
    """
    ring = np.array(polygon.exterior.coords[:-1])
    if polygon.exterior.is_ccw is False:
        ring = ring[::-1]
    holes = []
    for interior in polygon.interiors:
        points = np.array(interior.coords[:-1])
        if interior.is_ccw:
            points = points[::-1]
        holes.append(np.roll(points, -int(np.lexsort((points[:, 1], points[:, 0]))[0]), axis=0))
    holes.sort(key=lambda points: (points[0, 0], points[0, 1]))
    for hole in holes:
        x, y = hole[0]
        begin, end = ring, np.roll(ring, -1, axis=0)
        crosses = (begin[:, 1] <= y) != (end[:, 1] <= y)
        with np.errstate(divide="ignore", invalid="ignore"):
            at = begin[:, 0] + (y - begin[:, 1]) / (end[:, 1] - begin[:, 1]) * (end[:, 0] - begin[:, 0])
        at = np.where(crosses & (at < x), at, -math.inf)
        edge = int(np.argmax(at))
        hit = np.array([at[edge], y])
        ring = np.concatenate([ring[: edge + 1], [hit], hole, hole[:1], [hit], ring[edge + 1 :]])
    return [(float(px), float(py)) for px, py in ring]
