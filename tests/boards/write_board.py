"""Writes a board as the folder a user has: board.yaml and fabrication files. In: Board and a Dialect; out: files. Shares no code with
impcheck."""

from __future__ import annotations

import json
import random
import zipfile
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path

from shapely import LineString, Polygon, union_all

from tests.boards.model import Board, Declared, Layer, Plane, Via
from tests.boards.shapes import SPOKE, clearances, cut_shape, plane_shapes, spokes
from tests.boards.write_drill import Drilled, excellon
from tests.boards.write_gerber import Gerber
from tests.boards.write_netlist import netlist


@dataclass(frozen=True)
class Dialect:
    """How a board is written. Per-layer settings are by layer index; layers not named take the key -1."""

    stem: str = "board"
    unit: str = "mm"  # or inch
    digits: int = 6
    names: str = "x2"  # x2, comment (X2 in G04 comments), netlist (X1 and IPC-D-356), none (X1, ends declared by place)
    traces: dict[int, str] = field(default_factory=lambda: {-1: "strokes"})  # strokes, regions, both
    planes: dict[int, str] = field(default_factory=lambda: {-1: "regions"})  # regions, clear, negative
    pads: str = "flash"  # flash, macro, region
    drill_unit: str = "mm"
    drill_zeros: str = "decimal"
    scramble: int | None = None  # seed for the order of drawing
    naming: str = "numbered"  # numbered (board-L1.gbr) or suffixes (board.GTL)
    archive: bool = False
    job: bool = False
    extras: bool = True  # silk, paste


def of(setting: dict[int, str], layer: int) -> str:
    return setting.get(layer, setting[-1])


class FabWriter:
    """Draws one board in one dialect."""

    def __init__(self, board: Board, dialect: Dialect) -> None:
        self.board, self.dialect = board, dialect
        self.x2 = dialect.names if dialect.names in ("x2", "comment") else ""
        self.files: dict[str, str] = {}
        self.functions: dict[str, str] = {}

    def name(self, part: str, suffix: str) -> str:
        return f"{self.dialect.stem}.{suffix}" if self.dialect.naming == "suffixes" else f"{self.dialect.stem}-{part}.gbr"

    def copper_name(self, layer: int) -> str:
        last = self.board.last
        return self.name(f"L{layer + 1}", "GTL" if layer == 0 else "GBL" if layer == last else f"G{layer}L")

    def gerber(self, negative: bool = False) -> Gerber:
        return Gerber(self.dialect.unit, self.dialect.digits, self.x2, negative, f"{self.board.name}, invented sample")

    def keep(self, file: str, writer: Gerber, *function: str) -> None:
        writer.head.insert(3, writer._attribute(",".join(("TF.FileFunction", *function)))) if self.x2 else None
        self.files[file] = writer.text()
        self.functions[file] = ",".join(function)

    def copper_layer(self, layer: int) -> None:
        board, dialect = self.board, self.dialect
        style = of(dialect.planes, layer)
        planes = [plane for plane in board.planes if plane.layer == layer]
        side = "Top" if layer == 0 else "Bot" if layer == board.last else "Inr"
        function = ("Copper", f"L{layer + 1}", side)
        if style == "negative":
            self.keep(self.copper_name(layer), self.negative_layer(layer, planes), *function)
            return
        out = self.gerber()
        for plane in planes:
            out.object(plane.net)
            if plane.hatch:
                self.hatched(out, plane)
            elif style == "clear":
                out.region([Polygon(plane.outline)], "Conductor")
            else:
                out.region(plane_shapes(board, plane), "Conductor")
        if style == "clear" and planes:
            self.clear_shapes(out, planes)
        self.dark_objects(out, layer, [plane for plane in planes if style == "clear" or plane.hatch])
        self.keep(self.copper_name(layer), out, *function)

    def clear_shapes(self, out: Gerber, planes: list[Plane]) -> None:
        out.object()
        out.polarity(False)
        for plane in planes:
            if plane.hatch:
                continue
            inside = Polygon(plane.outline)
            for cut in clearances(self.board, plane):
                if not cut_shape(cut).intersects(inside):
                    continue
                if cut.diameter == 0:
                    out.region([Polygon(cut.points)])
                elif len(cut.points) == 1:
                    out.circle(cut.points[0], cut.diameter)
                else:
                    out.stroke(cut.points, cut.diameter, "")
            for dead in self.dead(plane):
                out.region([dead])
        out.polarity(True)

    def dead(self, plane: Plane) -> list[Polygon]:
        """Islands and slivers a pour drops, with a little more round them so that nothing of them stays."""
        inside = Polygon(plane.outline)
        kept = union_all(plane_shapes(self.board, plane))
        cuts = union_all([cut_shape(cut) for cut in clearances(self.board, plane)])
        rest = inside.difference(cuts).difference(kept.buffer(0.002))
        return [
            piece.buffer(0.02, join_style="mitre").difference(kept.buffer(0.0005))
            for piece in getattr(rest, "geoms", [rest])
            if piece.area > 1e-3 and isinstance(piece.buffer(0.02, join_style="mitre").difference(kept.buffer(0.0005)), Polygon)
        ]

    def hatched(self, out: Gerber, plane: Plane) -> None:
        """A pour drawn as strokes both ways and along its outlines."""
        line = 0.2
        for piece in plane_shapes(self.board, plane):
            inner = piece.buffer(-line / 2)
            for part in getattr(inner, "geoms", [inner]):
                if part.is_empty:
                    continue
                for ring in (part.exterior, *part.interiors):
                    out.stroke([*ring.coords], line)
                x0, y0, x1, y1 = part.bounds
                steps = int(max(x1 - x0, y1 - y0) / plane.hatch) + 1
                for k in range(1, steps):
                    for line_cut in (
                        LineString([(x0 + k * plane.hatch, y0), (x0 + k * plane.hatch, y1)]),
                        LineString([(x0, y0 + k * plane.hatch), (x1, y0 + k * plane.hatch)]),
                    ):
                        hit = part.intersection(line_cut)
                        for segment in getattr(hit, "geoms", [hit]):
                            if isinstance(segment, LineString) and segment.length > line:
                                out.stroke([*segment.coords], line)

    def dark_objects(self, out: Gerber, layer: int, planes: list[Plane]) -> None:
        board, dialect = self.board, self.dialect
        style = of(dialect.traces, layer)
        jobs: list[Callable[[], None]] = []

        def stroke(net: str, width: float, points: tuple[tuple[float, float], ...]) -> Callable[[], None]:
            def draw() -> None:
                out.object(net)
                if style in ("regions", "both"):
                    shape = LineString(points).buffer(width / 2, quad_segs=12)
                    out.region([shape], "Conductor")
                if style in ("strokes", "both"):
                    out.stroke(points, width)

            return draw

        for plane in planes:
            for via in board.vias:
                if via.thermal and via.net == plane.net and layer in board.barrel_layers(via):
                    inside = Polygon(plane.outline)
                    for ends in spokes(via, plane):
                        if inside.covers(LineString(ends)):
                            jobs.append(stroke(via.net, SPOKE, ends))
        for trace in board.traces:
            if trace.layer == layer:
                jobs.append(stroke(trace.net, trace.width, trace.points))
        for arc in board.arcs:
            if arc.layer == layer:

                def draw_arc(arc=arc) -> None:
                    if style == "regions":
                        stroke(arc.net, arc.width, arc.chopped())()
                    else:
                        out.object(arc.net)
                        out.arc(arc.start, arc.end, arc.centre, arc.ccw, arc.width)

                jobs.append(draw_arc)
        for fill in board.fills:
            if fill.layer == layer:

                def draw_fill(fill=fill) -> None:
                    out.object(fill.net)
                    out.region([Polygon(fill.points)], "Conductor")

                jobs.append(draw_fill)
        for pad in board.pads:
            if pad.layer == layer:

                def draw_pad(pad=pad) -> None:
                    out.object(pad.net, (pad.component, pad.pin) if pad.component else None)
                    out.pad(pad, dialect.pads, function="SMDPad,CuDef")

                jobs.append(draw_pad)
        for via in board.vias:
            if layer in board.via_layers(via):

                def draw_via(via=via) -> None:
                    out.object(via.net, (via.component, via.pin) if via.component else None)
                    out.circle(via.at, via.pad, "ComponentPad" if via.component else "ViaPad")

                jobs.append(draw_via)
        if dialect.scramble is not None:
            random.Random(f"{dialect.scramble} {layer}").shuffle(jobs)
        for job in jobs:
            job()

    def negative_layer(self, layer: int, planes: list[Plane]) -> Gerber:
        """What is drawn is what is etched away: the border and the splits, antipads, slots, thermal reliefs."""
        board, out = self.board, self.gerber(negative=True)
        edge = Polygon(board.outline)
        away = edge.buffer(0.5, join_style="mitre").difference(union_all([Polygon(plane.outline) for plane in planes]))
        out.region([piece for piece in getattr(away, "geoms", [away]) if piece.area > 1e-9])
        drawn = set()
        for plane in planes:
            inside = Polygon(plane.outline)
            relieved = {via.at: via for via in board.vias if via.thermal and via.net == plane.net and layer in board.barrel_layers(via)}
            for cut in clearances(board, plane):
                if cut in drawn or not cut_shape(cut).intersects(inside):
                    continue
                drawn.add(cut)
                via = relieved.get(cut.points[0])
                if cut.diameter == 0:
                    out.region([Polygon(cut.points)])
                elif len(cut.points) > 1:
                    out.stroke(cut.points, cut.diameter, "")
                elif via is not None and cut.diameter == via.pad + 2 * plane.clearance:
                    self.thermal(out, via, cut.diameter)
                else:
                    out.circle(cut.points[0], cut.diameter)
            for dead in self.dead(plane):
                out.region([dead])
        return out

    def thermal(self, out: Gerber, via: Via, outer: float) -> None:
        n = out.number
        out.macro("RELIEF", "7,0,0,$1,$2,$3,45")
        out.flash(via.at, f"RELIEF,{n(outer)}X{n(via.pad)}X{n(SPOKE)}")

    def side_layers(self) -> None:
        board = self.board
        for side, layer, word, letter in ((0, 0, "Top", "T"), (1, board.last, "Bot", "B")):
            mask = self.gerber()
            for pad in board.pads:
                if pad.layer == layer and pad.mask:
                    mask.pad(pad, self.dialect.pads if self.dialect.pads == "region" else "flash", grow=0.05, function="Material")
            for via in board.vias:
                if via.component:
                    mask.circle(via.at, via.pad + 0.1, "Material")
            for hole in board.holes:
                if hole.end is None:
                    mask.circle(hole.at, hole.drill + 0.2, "Material")
                else:
                    mask.stroke([hole.at, hole.end], hole.drill + 0.2, "Material")
            self.keep(self.name(f"mask-{word.lower()}", f"G{letter}S"), mask, "Soldermask", word)
            if not self.dialect.extras:
                continue
            paste = self.gerber()
            for pad in board.pads:
                if pad.layer == layer and pad.paste:
                    paste.pad(pad, grow=-0.03, function="Material")
            self.keep(self.name(f"paste-{word.lower()}", f"G{letter}P"), paste, "Paste", word)
            silk = self.gerber()
            for where, width, points in board.silk:
                if where == side:
                    silk.stroke(points, width, "Material")
            self.keep(self.name(f"silk-{word.lower()}", f"G{letter}O"), silk, "Legend", word)
        edge = self.gerber()
        edge.outline(board.outline)
        self.keep(self.name("edge", "GKO"), edge, "Profile", "NP")

    def drills(self) -> list[str]:
        """Writes the drill files; returns the lines of the board file that describe them."""
        board, dialect = self.board, self.dialect
        lines = []

        def write(part: str, holes: list[Drilled], function: tuple[str, ...], described: str) -> None:
            file = f"{dialect.stem}-{part}.drl"
            routed = dialect.drill_zeros == "decimal"
            self.files[file] = excellon(holes, dialect.drill_unit, dialect.drill_zeros, function if self.x2 else (), routed)
            self.functions[file] = ",".join(function)
            lines.append(f"  - {{file: {file}, {described}}}")

        spans: dict[tuple[int, int], list[Drilled]] = {}
        backs: dict[tuple[int, int], list[Drilled]] = {}
        for via in board.vias:
            use = "Plated,PTH,ComponentDrill" if via.component else "Plated,PTH,ViaDrill"
            spans.setdefault(board.span(via), []).append(Drilled(via.at, via.drill, function=use))
            if via.backdrill is not None:
                side, keep, drill = via.backdrill
                backs.setdefault((side, keep), []).append(Drilled(via.at, drill, function="NonPlated,NPTH,BackDrill"))
        for (first, last), holes in sorted(spans.items()):
            through = (first, last) == (0, board.last)
            part = "pth" if through else f"via-{first + 1}-{last + 1}"
            kind = "PTH" if through else "Blind" if first == 0 or last == board.last else "Buried"
            names = f"[{board.coppers[first].name}, {board.coppers[last].name}]"
            write(part, holes, ("Plated", str(first + 1), str(last + 1), kind), f"plated: true, layers: {names}")
        if board.holes:
            loose = [Drilled(hole.at, hole.drill, hole.end, "NonPlated,NPTH,MechanicalDrill") for hole in board.holes]
            names = f"[{board.coppers[0].name}, {board.coppers[-1].name}]"
            write("npth", loose, ("NonPlated", "1", str(board.last + 1), "NPTH"), f"plated: false, layers: {names}")
        for (side, keep), holes in sorted(backs.items()):
            start = board.last if side else 0
            span = (str(keep + 2), str(board.last + 1)) if side else ("1", str(keep))
            back = f"backdrill: {{from: {board.coppers[start].name}, keep: {board.coppers[keep].name}}}"
            write(f"back-L{keep + 1}", holes, ("NonPlated", *span, "NPTH"), back)
        return lines


def place_of(board: Board, pin: str) -> tuple[tuple[float, float], int | None]:
    """Where a pin ("U1.3") is: point, and its layer (None for a hole)."""
    component, number = pin.rsplit(".", 1)
    for pad in board.pads:
        if (pad.component, pad.pin) == (component, number):
            return pad.at, pad.layer
    for via in board.vias:
        if (via.component, via.pin) == (component, number):
            return via.at, None
    raise KeyError(pin)


def end_text(board: Board, pin: str, by_place: bool) -> str:
    if not by_place:
        return pin
    (x, y), layer = place_of(board, pin)
    on = board.coppers[0 if layer is None else layer].name
    return f"{{x: {x:.6f}mm, y: {y:.6f}mm, layer: {on}}}"


def stackup_line(item: Layer, file: str = "") -> str:
    if item.kind == "mask":
        return f"  - {{mask: {item.thickness:g}um, er: {item.er:g}}}"
    if item.kind == "copper":
        parts = [f"copper: {item.name}", f"thickness: {item.thickness:g}um", f"file: {file}"]
        if item.etch:
            parts.append(f"etch: {item.etch:g}um")
        return "  - {" + ", ".join(parts) + "}"
    name = f", name: {item.name}" if item.name else ""
    return f"  - {{dielectric: {item.thickness:g}um, er: {item.er:g}, loss_tangent: {item.loss_tangent:g}{name}}}"


def board_yaml(board: Board, dialect: Dialect, fab: FabWriter, drills: list[str], heading: str = "") -> str:
    """The board file as a user would write it."""
    lines = [
        *(f"# {line}" for line in heading.splitlines()),
        "impcheck: 1",
        f"board: {board.name}",
        f"files: {'fab.zip' if dialect.archive else 'fab'}",
    ]
    if dialect.names == "netlist":
        lines.append(f"netlist: {dialect.stem}.ipc")
    lines += [f"outline: {fab.name('edge', 'GKO')}", "stackup:  # top to bottom, as the fab house quoted it"]
    copper = 0
    for item in board.stackup:
        lines.append(stackup_line(item, fab.copper_name(copper) if item.kind == "copper" else ""))
        copper += item.kind == "copper"
    lines += ["drills:", *drills]
    by_place = dialect.names == "none"
    if not by_place:
        lines.append(f"returns: [{', '.join(board.returns)}]  # copper that may carry return current")
        if board.joins:
            lines.append(f"joins: [{', '.join(board.joins)}]  # series parts the signal runs through")
    lines.append("classes:")
    lines += [f"  {name}: {{{', '.join(f'{key}: {value}' for key, value in limits.items())}}}" for name, limits in board.classes.items()]
    lines.append("nets:")
    for wanted in board.nets:
        lines.append(declared_line(board, wanted, by_place))
    if board.rules:
        lines += ["rules:", board.rules]
    return "\n".join([*lines, ""])


def declared_line(board: Board, wanted: Declared, by_place: bool) -> str:
    parts = [f"net: {wanted.net}", f"class: {wanted.net_class}"]
    if wanted.begin:
        parts += [f"from: {end_text(board, wanted.begin, by_place)}", f"to: {end_text(board, wanted.end, by_place)}"]
    return "  - {" + ", ".join(parts) + "}" + (f"  # {wanted.comment}" if wanted.comment else "")


def job_file(board: Board, fab: FabWriter) -> str:
    """A Gerber job file that repeats the stackup and the file functions."""
    x0, y0, x1, y1 = board.extent()
    materials: list[dict[str, object]] = []
    masks = coppers = 0
    for item in board.stackup:
        if item.kind == "mask":
            side = "Top" if masks == 0 else "Bottom"
            materials.append(
                {"Type": "SolderMask", "Thickness": item.thickness / 1000, "DielectricConstant": item.er, "Name": f"{side} solder mask"}
            )
            masks += 1
        elif item.kind == "copper":
            materials.append({"Type": "Copper", "Thickness": item.thickness / 1000, "Name": item.name})
            coppers += 1
        else:
            materials.append(
                {
                    "Type": "Dielectric",
                    "Thickness": item.thickness / 1000,
                    "Material": "FR4",
                    "DielectricConstant": item.er,
                    "LossTangent": item.loss_tangent,
                    "Name": item.name or f"{board.coppers[coppers - 1].name}/{board.coppers[coppers].name}",
                }
            )
    files = [
        {"Path": path, "FileFunction": use, "FilePolarity": "Positive"}
        for path, use in sorted(fab.functions.items())
        if path.endswith(".gbr")
    ]
    for entry in files:
        if "FilePolarity,Negative" in fab.files[entry["Path"]]:
            entry["FilePolarity"] = "Negative"
    total = sum(item.thickness for item in board.stackup) / 1000
    general = {
        "ProjectId": {"Name": board.name, "GUID": "5ed6e401-0000-4000-8000-000000000003", "Revision": "B"},
        "Size": {"X": round(x1 - x0, 3), "Y": round(y1 - y0, 3)},
        "LayerNumber": board.last + 1,
        "BoardThickness": round(total, 3),
    }
    header = {"GenerationSoftware": {"Vendor": "Sedgeholm Gauges", "Application": "draw", "Version": "1"}}
    document = {"Header": header, "GeneralSpecs": general, "FilesAttributes": files, "MaterialStackup": materials}
    return json.dumps(document, indent=1) + "\n"


def write_board(board: Board, folder: Path, dialect: Dialect | None = None, heading: str = "") -> Path:
    """Writes board.yaml and the fabrication files into `folder`; returns the path of the board file."""
    dialect = dialect or Dialect()
    fab = FabWriter(board, dialect)
    for layer in range(len(board.coppers)):
        fab.copper_layer(layer)
    fab.side_layers()
    drills = fab.drills()
    if dialect.names == "netlist":
        fab.files[f"{dialect.stem}.ipc"] = netlist(board, "inch" if dialect.unit == "inch" else "mm")
    if dialect.job:
        fab.files[f"{dialect.stem}.gbrjob"] = job_file(board, fab)
    folder.mkdir(parents=True, exist_ok=True)
    if dialect.archive:
        with zipfile.ZipFile(folder / "fab.zip", "w", zipfile.ZIP_DEFLATED) as archive:
            for name, text in sorted(fab.files.items()):
                archive.writestr(zipfile.ZipInfo(name, (2026, 1, 1, 0, 0, 0)), text, zipfile.ZIP_DEFLATED)
    else:
        (folder / "fab").mkdir(exist_ok=True)
        for name, text in fab.files.items():
            (folder / "fab" / name).write_text(text, encoding="ascii")
    path = folder / "board.yaml"
    path.write_text(board_yaml(board, dialect, fab, drills, heading), encoding="utf-8")
    return path
