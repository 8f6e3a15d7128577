"""Reads a board file. In: its path; out: a Plan (Board, Stackup, which files to use) in mm, s, ohm, every entry with its line."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from pathlib import Path

from impcheck.artwork import schema
from impcheck.artwork.board import Board, End, Group, NetClass, NetRequest, RuleOverride
from impcheck.artwork.boardfile_entries import Sections, read_sections
from impcheck.artwork.boardfile_stackup import build_stackup
from impcheck.artwork.limits import Limits
from impcheck.artwork.lines import compose
from impcheck.artwork.names import did_you_mean
from impcheck.artwork.stackup import Stackup
from impcheck.errors import InputError, Problem, Problems

_DEFAULTS = Limits()


@dataclass(frozen=True)
class FileWish:
    """A file the board file names."""

    name: str
    line: int


@dataclass(frozen=True)
class DrillWish:
    """A drill file the board file names; None where it leaves something to the files."""

    file: str
    plated: bool | None = None
    layers: tuple[str, str] | None = None
    backdrill: tuple[str, str] | None = None  # from, keep
    line: int = 0


@dataclass(frozen=True)
class Plan:
    """A board file as read: what to check, and which files to use for it."""

    board: Board
    stackup: Stackup | None  # None: not written, or wrong (then `stackup_line` is its line)
    folder: Path  # of the board file
    files: FileWish | None  # folder or archive; None: the board file's own folder
    netlist: FileWish | None = None
    outline: FileWish | None = None
    drills: tuple[DrillWish, ...] = ()
    stackup_line: int = 0  # 0: the board file has none
    layer_lines: Mapping[str, tuple[int, ...]] = field(default_factory=dict)  # copper layer names outside the stackup, and where they stand


def read_board_file(path: Path, limits: Limits = _DEFAULTS) -> Plan:
    """The plan a board file holds. Raises InputError with every mistake in it; the fabrication files are not looked at."""
    problems = Problems()
    plan = parse_board_file(path, limits, problems)
    problems.raise_if_any()
    return plan


def parse_board_file(path: Path, limits: Limits, problems: Problems) -> Plan:
    """Like read_board_file, but mistakes go to `problems` and what is right is still given. Raises InputError only where the file is no
    mapping in YAML."""
    name = path.name
    root = compose(_text(path, limits), name, limits, problems)
    if not isinstance(root.value, dict):
        raise InputError(Problem(name, root.line, "this is no board file", "a board file begins with `impcheck: 1`, key by key"))
    sections = read_sections(root, name, problems)
    stackup = build_stackup(sections, name, problems)
    layers = sections.layer_names()
    reader = _Reader(name, path.parent, sections, problems)
    board = Board(
        name=sections.one("board") or path.stem,
        file=name,
        classes=reader.classes(),
        nets=reader.nets(),
        groups=tuple(Group(item.name, item.nets, item.match, line) for item, line in sections.many("groups")),
        returns=tuple(item for item, _ in sections.many("returns")),
        joins=tuple(item for item, _ in sections.many("joins")),
        decks=reader.decks(),
        overrides=reader.overrides(),
        waivers=reader.path_of("waivers"),
    )
    plan = Plan(
        board=board,
        stackup=stackup,
        folder=path.parent,
        files=reader.wish("files"),
        netlist=reader.wish("netlist"),
        outline=reader.wish("outline"),
        drills=reader.drills(),
        stackup_line=sections.line("stackup"),
        layer_lines={layer: tuple(lines) for layer, lines in reader.layers.items()},
    )
    if layers:
        check_layer_names(plan, layers, problems)
    problems.found.sort(key=lambda problem: problem.line)
    return plan


def check_layer_names(plan: Plan, layers: Iterable[str], problems: Problems) -> None:
    """Adds a problem for every copper layer the board file names outside its stackup and the stackup does not hold."""
    known = tuple(layers)
    for layer, lines in plan.layer_lines.items():
        if layer not in known:
            for line in lines:
                problems.add(plan.board.file, line, f"'{layer}' is no copper layer of the stackup", did_you_mean(layer, known))


def _text(path: Path, limits: Limits) -> str:
    try:
        if path.is_dir() or not path.exists():
            raise InputError(Problem(path.name, 0, "there is no such file", "name a board file (board.yaml)"))
        if not path.is_file():
            raise InputError(Problem(path.name, 0, "this is no regular file", "name a board file (board.yaml)"))
        if path.stat().st_size > limits.board_file_bytes:
            remedy = f"limit board_file_bytes = {limits.board_file_bytes:,}"
            raise InputError(Problem(path.name, 0, "this file is too large for a board file", remedy))
        data = path.read_bytes()
    except (OSError, ValueError) as error:
        said = getattr(error, "strerror", None) or str(error)
        raise InputError(Problem(path.name, 0, f"the file cannot be read: {said}", "name a board file (board.yaml)")) from None
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise InputError(Problem(path.name, line, "this is no UTF-8 text", "save the board file as UTF-8")) from None


class _Reader:
    """Turns the entries that have the right shape into what the rest of the tool works with, and checks that their names agree."""

    def __init__(self, file: str, folder: Path, sections: Sections, problems: Problems) -> None:
        self.file, self.folder, self.sections, self.problems = file, folder, sections, problems
        self.layers: dict[str, list[int]] = {}
        self.held = {name: item for name, (item, _) in sections.classes.items()}

    def layer(self, name: str, line: int) -> str:
        self.layers.setdefault(name, []).append(line)
        return name

    def wish(self, key: str) -> FileWish | None:
        value = self.sections.one(key)
        return None if value is None else FileWish(value, self.sections.line(key))

    def path_of(self, key: str) -> str | None:
        wish = self.wish(key)
        return None if wish is None else self.beside(wish.name, wish.line)

    def beside(self, name: str, line: int) -> str:
        """The path of a file that is named relative to the board file."""
        path = self.folder / name
        if not is_file(path):
            siblings = sorted(p.name for p in path.parent.iterdir() if p.is_file()) if is_folder(path.parent) else []
            remedy = did_you_mean(path.name, siblings, "paths are relative to the board file")
            self.problems.add(self.file, line, f"there is no file '{name}'", remedy)
        return str(path.resolve())

    def widths(self, value: float | dict[str, float] | None, name: str, key: str) -> dict[str, float]:
        if value is None:
            return {}
        if not isinstance(value, dict):
            return {"": value}
        return {self.layer(layer, self.sections.root.find(("classes", name, key, layer))[1]): width for layer, width in value.items()}

    def classes(self) -> dict[str, NetClass]:
        found = {}
        for name, (item, line) in self.sections.classes.items():
            found[name] = NetClass(
                name=name,
                impedance=item.impedance,
                differential=item.differential,
                common=item.common,
                tolerance=item.tolerance,
                rise_time=item.rise_time,
                width=self.widths(item.width, name, "width"),
                gap=self.widths(item.gap, name, "gap"),
                max_skew=item.max_skew,
                line=line,
            )
        return found

    def nets(self) -> tuple[NetRequest, ...]:
        found: list[NetRequest] = []
        declared = self.sections.keys("classes")
        seen: dict[tuple[object, ...], int] = {}
        item: schema.NetEntry | schema.PairEntry
        for item, line in self.sections.many("nets"):
            pair = isinstance(item, schema.PairEntry)
            name = item.pair if isinstance(item, schema.PairEntry) else item.net
            if item.net_class not in declared:
                otherwise = f"write it under `classes:`, as in `{item.net_class}: {{impedance: 50 ohm}}`"
                remedy = did_you_mean(item.net_class, declared, otherwise)
                self.problems.add(self.file, line, f"class '{item.net_class}' is not declared", remedy)
            held = self.held.get(item.net_class)
            if not pair and held is not None and held.impedance is None and (held.differential is not None or held.common is not None):
                said = f"class '{item.net_class}' is for pairs and '{name}' is a single net"
                self.problems.add(self.file, line, said, "give the class an `impedance`, or write {pair: NAME, p: ..., n: ..., class: ...}")
            if isinstance(item, schema.PairEntry) and item.p == item.n:
                self.problems.add(self.file, line, f"both legs of pair '{name}' are the net '{item.p}'", "name two nets, p and n")
            begin, end = self.ends(item.begin, line), self.ends(item.end, line)
            identity = (pair, name, tuple(map(str, begin)), tuple(map(str, end)))
            if identity in seen:
                self.problems.add(self.file, line, f"'{name}' is declared already in line {seen[identity]}", "keep one of the two")
            seen.setdefault(identity, line)
            legs = (item.p, item.n) if isinstance(item, schema.PairEntry) else None
            found.append(NetRequest(name, item.net_class, begin, end, legs, line))
        return tuple(found)

    def ends(self, value: object, line: int) -> tuple[End, ...]:
        if value is None:
            return ()
        if isinstance(value, tuple):
            return tuple(end for item in value for end in self.ends(item, line))
        if isinstance(value, schema.PlaceEntry):
            layer = None if value.layer is None else self.layer(value.layer, line)
            return (End(at=(value.x, value.y), layer=layer, line=line),)
        component, dot, pin = str(value).rpartition(".")
        if not (component and dot and pin) or component != component.strip() or pin != pin.strip():
            said = f"'{value}' names no pin"
            self.problems.add(self.file, line, said, "write part and pin as U3.7, or a place as {x: 12.5mm, y: 30mm, layer: L1}")
            return ()
        return (End(component=component, pin=pin, line=line),)

    def decks(self) -> tuple[str, ...]:
        found = []
        for item, line in self.sections.many("rules"):
            if not isinstance(item, str):
                continue
            is_path = "/" in item or "\\" in item or item.lower().endswith((".yaml", ".yml"))
            found.append(self.beside(item, line) if is_path else item)
        return tuple(dict.fromkeys(found)) or ("standard",)

    def overrides(self) -> tuple[RuleOverride, ...]:
        found = []
        for item, node in self.sections.entries.get("rules", ()):
            for rule in item if isinstance(item, dict) else ():
                limits, line = node.find((rule,))
                found.append(RuleOverride(rule, dict(limits.native()), line))
        return tuple(found)

    def drills(self) -> tuple[DrillWish, ...]:
        found: list[DrillWish] = []
        seen: dict[str, int] = {}
        coppers = self.sections.layer_names()
        item: schema.DrillEntry
        for item, line in self.sections.many("drills"):
            if item.file in seen:
                said = f"drill file '{item.file}' stands here already in line {seen[item.file]}"
                self.problems.add(self.file, line, said, "keep one of the two")
                continue
            seen[item.file] = line
            layers = None if item.layers is None else (self.layer(item.layers[0], line), self.layer(item.layers[1], line))
            back = None
            if item.backdrill is not None:
                back = (self.layer(item.backdrill.begin, line), self.layer(item.backdrill.keep, line))
                self.backdrill(item, coppers, line)
            elif layers is not None and layers[0] == layers[1]:
                said = f"the holes pass from {layers[0]} to itself"
                self.problems.add(self.file, line, said, "name the first and the last copper layer they pass")
            found.append(DrillWish(item.file, item.plated, layers, back, line))
        return tuple(found)

    def backdrill(self, item: schema.DrillEntry, coppers: tuple[str, ...], line: int) -> None:
        back = item.backdrill
        if back is None:
            return
        if item.plated:
            self.problems.add(self.file, line, "a back-drill cannot be plated", "leave `plated: true` out")
        if item.layers is not None:
            self.problems.add(self.file, line, "a back-drill has no `layers`", "say `backdrill: {from: ..., keep: ...}` alone")
        if coppers and back.begin in coppers and back.begin not in (coppers[0], coppers[-1]):
            said = f"a back-drill cannot come from the inner layer {back.begin}"
            self.problems.add(self.file, line, said, f"it comes from {coppers[0]} or {coppers[-1]}")
        if back.begin == back.keep:
            said = f"a back-drill from {back.begin} cannot keep {back.keep}"
            self.problems.add(self.file, line, said, "name the layer up to which the barrel stays")


def is_file(path: Path) -> bool:
    """Like Path.is_file, false for names no file system takes."""
    try:
        return path.is_file()
    except (OSError, ValueError):
        return False


def is_folder(path: Path) -> bool:
    """Like Path.is_dir, false for names no file system takes."""
    try:
        return path.is_dir()
    except (OSError, ValueError):
        return False
