"""Reads everything a board consists of. In: the path of a board file; out: its Artwork, in mm, and remarks on what was guessed."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, replace
from pathlib import Path

from impcheck.artwork.assemble_drills import DrillSources, read_drills
from impcheck.artwork.assemble_stackup import settle_stackup
from impcheck.artwork.boardfile import Plan, check_layer_names, parse_board_file
from impcheck.artwork.gerber import read_gerber
from impcheck.artwork.identify import Source, role_of_function
from impcheck.artwork.identify_files import Heads, Parts, identify, know, sniff
from impcheck.artwork.image import Image
from impcheck.artwork.ipc356 import read_ipc356
from impcheck.artwork.jobfile import Job, read_job
from impcheck.artwork.limits import Limits
from impcheck.artwork.names import did_you_mean
from impcheck.artwork.package import Package, open_package
from impcheck.artwork.parts import Artwork, NetlistPoints
from impcheck.errors import InputError, Problem, Problems, Remark, RemarkKind

_DEFAULTS = Limits()


def read_artwork(board_file: Path, limits: Limits = _DEFAULTS, progress: Callable[[str], None] | None = None) -> Artwork:
    """The artwork of a board: its board file and the fabrication files it names.

    `progress` is told which file is being read. Raises InputError with every mistake that could be found in one go.
    """
    problems = Problems()
    plan = parse_board_file(board_file, limits, problems)
    package = _package(plan, limits, problems)
    if package is None:
        raise InputError(problems.found)
    try:
        return _read(plan, package, limits, problems, progress or (lambda words: None))
    finally:
        package.close()


def read_image(data: bytes, file: str, limits: Limits) -> Image:
    """Reads one Gerber file; a function of its own so that another process can be given it."""
    return read_gerber(data, file, limits)


def _read(plan: Plan, package: Package, limits: Limits, problems: Problems, progress: Callable[[str], None]) -> Artwork:
    progress("looking at the files")
    remarks = list(package.remarks)
    heads = sniff(package, problems)
    listed = _job(package, heads, limits, problems, remarks)
    known = know(heads, listed.functions)
    remarks += known.remarks
    netlist_file = _netlist_file(plan, package, heads, problems)
    stackup = settle_stackup(plan, listed.job, problems, remarks)
    if stackup is None:
        _check_files_exist(plan, package, problems)
        raise InputError(problems.found)
    if plan.stackup is None:
        check_layer_names(plan, [item.name for item in stackup.coppers], problems)
    parts = identify(plan, stackup, package, known, problems)
    remarks += parts.remarks

    wanted = dict.fromkeys(name for name in (*parts.copper, parts.mask_top, parts.mask_bottom, parts.outline) if name is not None)
    images: dict[str, Image] = {}
    for name in wanted:
        progress(f"reading {name}")
        try:
            images[name] = _with_polarity(read_image(package.read(name), name, limits), listed)
        except InputError as error:
            problems.take(error)
    outline = images.get(parts.outline) if parts.outline is not None else None
    netlist = None
    if netlist_file is not None:
        progress(f"reading {netlist_file or 'the netlist'}")
        try:
            netlist = _netlist(netlist_file, plan, package, limits)
        except InputError as error:
            problems.take(error)
    coppers = tuple(images[name] for name in parts.copper if name in images)
    sources = DrillSources(package, heads.kinds, stackup, outline, coppers, netlist, limits, parts.drills, remarks)
    drills = read_drills(sources, problems, progress)
    problems.raise_if_any()

    remarks += _absences(plan, stackup.mask_top is not None or stackup.mask_bottom is not None, parts)
    for part in (*images.values(), *(drill.holes for drill in drills), *((netlist,) if netlist else ())):
        remarks += part.remarks
    return Artwork(
        board=plan.board,
        stackup=stackup,
        layers=coppers,
        mask_top=images.get(parts.mask_top) if parts.mask_top else None,
        mask_bottom=images.get(parts.mask_bottom) if parts.mask_bottom else None,
        outline=outline,
        drills=drills,
        netlist=netlist,
        remarks=tuple(dict.fromkeys(remarks)),
    )


def _package(plan: Plan, limits: Limits, problems: Problems) -> Package | None:
    """The files named by `files:`, else those beside the board file (without subfolders: other things live there)."""
    if plan.files is None:
        source, shown, line = plan.folder, ".", 0
    else:
        source, shown, line = plan.folder / plan.files.name, plan.files.name, plan.files.line
    try:
        there = source.exists()
    except (OSError, ValueError):
        there = False
    if not there:
        beside = [path.name for path in plan.folder.iterdir() if path.is_dir() or path.suffix.lower() == ".zip"]
        problems.add(
            plan.board.file,
            line,
            f"there is no folder or archive '{shown}'",
            did_you_mean(shown, beside, "paths are relative to the board file"),
        )
        return None
    try:
        return open_package(source, shown, limits, deep=plan.files is not None)
    except InputError as error:
        problems.take(error)
        return None


@dataclass(frozen=True)
class _Listed:
    """What the job file says of the package's files, by their path in it."""

    job: Job | None = None
    functions: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    negative: frozenset[str] = frozenset()


def _job(package: Package, heads: Heads, limits: Limits, problems: Problems, remarks: list[Remark]) -> _Listed:
    found = [name for name, kind in heads.kinds.items() if kind == "job" or name.lower().endswith(".gbrjob")]
    if len(found) > 1:
        problems.add(found[-1], 0, f"there is another job file, {found[0]}", "keep one of them")
    if len(found) != 1:
        return _Listed()
    try:
        job = read_job(package.read(found[0]), found[0], limits)
    except InputError as error:
        problems.take(error)
        return _Listed()
    folder = found[0].rpartition("/")[0]
    functions: dict[str, tuple[str, ...]] = {}
    negative = set()
    for path, function in job.functions.items():
        name = package.find(f"{folder}/{path}" if folder else path) or package.find(path)
        if name is None:
            if role_of_function(function, Source.JOB_FILE).part not in ("", "other"):
                remarks.append(Remark(RemarkKind.ODD, f"the job file lists '{path}', which is not there", found[0]))
            continue
        functions[name] = function
        if job.polarities.get(path, "").casefold() == "negative":
            negative.add(name)
    return _Listed(job, functions, frozenset(negative))


def _with_polarity(image: Image, listed: _Listed) -> Image:
    """An image as negative where only the job file says so."""
    if image.file in listed.negative and not image.negative and ".FilePolarity" not in image.attributes:
        return replace(image, negative=True)
    return image


def _netlist_file(plan: Plan, package: Package, heads: Heads, problems: Problems) -> str | None:
    """The netlist's path in the package; "" where it lies beside the board file, None where there is none."""
    if plan.netlist is not None:
        name = package.find(plan.netlist.name)
        if name is not None:
            return name
        try:
            if (plan.folder / plan.netlist.name).is_file():
                return ""
        except (OSError, ValueError):
            pass
        said = f"there is no file '{plan.netlist.name}' in '{package.shown}' or beside the board file"
        problems.add(plan.board.file, plan.netlist.line, said, package.like(plan.netlist.name))
        return None
    found = [name for name, kind in heads.kinds.items() if kind == "netlist"]
    if len(found) > 1:
        problems.add(found[-1], 0, f"there is another netlist, {found[0]}", f"write the right one as `netlist:` in {plan.board.file}")
        return None
    return found[0] if found else None


def _netlist(name: str, plan: Plan, package: Package, limits: Limits) -> NetlistPoints:
    shown = name or (plan.netlist.name if plan.netlist else "")
    return read_ipc356(package.read(name) if name else _beside(plan.folder / shown, shown, limits), shown, limits)


def _beside(path: Path, shown: str, limits: Limits) -> bytes:
    try:
        with path.open("rb") as file:
            data = file.read(limits.file_bytes + 1)
    except OSError as error:
        raise InputError(Problem(shown, 0, f"the file cannot be read: {error.strerror}", "name a file that can be read")) from None
    if len(data) > limits.file_bytes:
        raise InputError(Problem(shown, 0, "the file is too large", f"limit file_bytes = {limits.file_bytes:,}"))
    return data


def _check_files_exist(plan: Plan, package: Package, problems: Problems) -> None:
    """Where the stackup cannot be used, the files the board file names can still be looked for."""
    wishes = [(wish.file, wish.line) for wish in plan.drills]
    if plan.outline is not None:
        wishes.append((plan.outline.name, plan.outline.line))
    for name, line in wishes:
        if package.find(name) is None:
            problems.add(plan.board.file, line, f"there is no file '{name}' in '{package.shown}'", package.like(name))


def _absences(plan: Plan, masked: bool, parts: Parts) -> list[Remark]:
    """What the result cannot know because no file says it."""
    remarks = []
    file = plan.board.file
    if parts.outline is None:
        remarks.append(Remark(RemarkKind.LIMIT, "no file draws the board's outline: the extent of its copper is taken for it", file))
    if not parts.drills:
        remarks.append(Remark(RemarkKind.LIMIT, "there is no drill file: nothing joins the copper layers", file))
    if masked and parts.mask_top is None and parts.mask_bottom is None:
        remarks.append(Remark(RemarkKind.LIMIT, "no file draws the solder mask: its openings are not known", file))
    if not plan.board.nets:
        remarks.append(Remark(RemarkKind.LIMIT, "the board file declares no nets: none is followed", file))
    return remarks
