"""Reads the drill files and settles which layers their holes pass and whether they are plated. In: file roles; out: Drills, in mm."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace

import numpy as np
from scipy.spatial import cKDTree

from impcheck.artwork.boardfile import DrillWish
from impcheck.artwork.excellon import read_excellon
from impcheck.artwork.gerber import read_gerber
from impcheck.artwork.gerber_drill import drills_from_gerber
from impcheck.artwork.identify import Role, plating_in, span_in
from impcheck.artwork.image import Image, Kind
from impcheck.artwork.limits import Limits
from impcheck.artwork.package import Package
from impcheck.artwork.parts import Drill, DrillFile, NetlistPoints
from impcheck.artwork.stackup import Stackup
from impcheck.errors import InputError, Problems, Remark, RemarkKind

_AT_PAD = 0.05  # mm between the centres of a hole and of its pad, at most


@dataclass(frozen=True)
class DrillSources:
    """The drill files, and what they are read against."""

    package: Package
    kinds: Mapping[str, str]  # what each file looks like
    stackup: Stackup
    outline: Image | None
    coppers: tuple[Image, ...]
    netlist: NetlistPoints | None
    limits: Limits
    files: Mapping[str, tuple[Role, DrillWish | None]]
    remarks: list[Remark]  # guesses and disagreements go here


def read_drills(sources: DrillSources, problems: Problems, progress: Callable[[str], None]) -> tuple[Drill, ...]:
    """All drill files of a board. Mistakes are added to `problems`."""
    extent = extent_of(sources.outline, sources.coppers)
    drills = []
    for name, (role, wish) in sorted(sources.files.items()):
        progress(f"reading {name}")
        try:
            data = sources.package.read(name)
            if sources.kinds.get(name) == "gerber":
                holes = drills_from_gerber(read_gerber(data, name, sources.limits))
            else:
                holes = read_excellon(data, name, sources.limits, extent)
        except InputError as error:
            problems.take(error)
            continue
        drills.append(_settled(holes, role, wish, sources))
    return tuple(drills)


def extent_of(outline: Image | None, coppers: tuple[Image, ...]) -> tuple[float, float, float, float] | None:
    """min x, min y, max x, max y in mm of the outline's objects, else of the copper's; None where nothing is drawn."""
    for images in ((outline,), coppers):
        points = [array for image in images if image is not None for array in (image.start, image.end, image.contours.start) if len(array)]
        if points:
            everything = np.concatenate(points)
            low, high = everything.min(axis=0), everything.max(axis=0)
            if (high > low).all():
                return float(low[0]), float(low[1]), float(high[0]), float(high[1])
    return None


def _settled(holes: DrillFile, role: Role, wish: DrillWish | None, sources: DrillSources) -> Drill:
    """A drill file with its layers and plating: the board file says, else its attribute or the job file, else its name, else a guess."""
    remarks = sources.remarks
    names = [item.name for item in sources.stackup.coppers]
    last = len(names) - 1
    said = (role.layer - 1, role.last - 1) if role.layer is not None and role.last is not None and role.last <= last + 1 else None
    back = _backdrill(wish, role, said, names)
    if back is not None and (wish is None or wish.backdrill is None):
        text = f"not plated and not through: taken for a back-drill from {names[back[0]]} that keeps {names[back[1]]}"
        remarks.append(Remark(RemarkKind.GUESS, text, holes.file))
    if back is not None:
        side, keep = back
        first, lowest = (keep + 1, last) if side == last else (0, keep - 1)
        plain = replace(holes, plated=np.zeros(len(holes.plated), dtype=np.int8))
        return Drill(plain, first, lowest, backdrill_from=side, backdrill_keep=keep)
    holes = _plated(holes, role, wish, sources)
    if wish is not None and wish.layers is not None and all(layer in names for layer in wish.layers):
        ends = sorted(names.index(layer) for layer in wish.layers)
        span = (ends[0], ends[1])
        if said is not None and said != span:
            text = f"{role.source} says the holes pass layers {said[0] + 1} to {said[1] + 1}, the board file {span[0] + 1} to {span[1] + 1}"
            remarks.append(Remark(RemarkKind.DISAGREEMENT, f"{text}; the board file was followed", holes.file))
        return Drill(holes, *span)
    if said is not None:
        return Drill(holes, *said)
    named = span_in(holes.file, last + 1)
    if named is not None and named != (1, last + 1):
        text = f"by its name its holes pass from {names[named[0] - 1]} to {names[named[1] - 1]}"
        remarks.append(Remark(RemarkKind.GUESS, text, holes.file))
        return Drill(holes, named[0] - 1, named[1] - 1)
    return Drill(holes, 0, last)


def _backdrill(wish: DrillWish | None, role: Role, said: tuple[int, int] | None, names: list[str]) -> tuple[int, int] | None:
    """Side and kept layer of a back-drill, as indices; None where the file is none. Holes that are not plated and reach from one side to an
    inner layer are taken for one: they take the barrel away all the same."""
    last = len(names) - 1
    if wish is not None and wish.backdrill is not None:
        begin, keep = wish.backdrill
        good = begin in (names[0], names[-1]) and keep in names and keep != begin
        return (names.index(begin), names.index(keep)) if good else None  # what is wrong was told already
    if role.plated is not False or said is None or (wish is not None and (wish.plated is not None or wish.layers is not None)):
        return None
    first, lowest = said
    if lowest == last and first > 0:
        return last, first - 1
    return (0, lowest + 1) if first == 0 and lowest < last else None


def _plated(holes: DrillFile, role: Role, wish: DrillWish | None, sources: DrillSources) -> DrillFile:
    remarks = sources.remarks
    plated = holes.plated.astype(np.int8, copy=True)
    if wish is not None and wish.plated is not None:
        value = np.int8(wish.plated)
        against = int(np.count_nonzero((plated >= 0) & (plated != value)))
        if against or (role.plated is not None and role.plated != wish.plated):
            word = "plated" if wish.plated else "not plated"
            text = f"the board file says the holes are {word}, the file says otherwise{f' of {against}' if against else ''}"
            remarks.append(Remark(RemarkKind.DISAGREEMENT, f"{text}; the board file was followed", holes.file))
        return replace(holes, plated=np.full(len(plated), value, dtype=np.int8))
    open_ = plated < 0
    if not open_.any():
        return replace(holes, plated=plated)
    known = role.plated
    if known is None:
        known = plating_in(holes.file)
        why = "by its name"
        if known is None:
            known, why = _guess(holes, sources)
        text = f"{why} its holes are taken for {'plated' if known else 'not plated'}"
        remarks.append(Remark(RemarkKind.GUESS, text, holes.file))
    plated[open_] = np.int8(known)
    return replace(holes, plated=plated)


def _guess(holes: DrillFile, sources: DrillSources) -> tuple[bool, str]:
    """Whether holes of which nothing is said are plated, and why that is assumed."""
    if (holes.net >= 0).any():
        return True, "because they carry net names"
    if len(sources.files) == 1:
        return True, "as the only drill file"
    share = _share_at_pads(holes, sources)
    if share >= 0.5:
        return True, f"because {share:.0%} of them lie in pads"
    return False, f"because only {share:.0%} of them lie in pads"


def _share_at_pads(holes: DrillFile, sources: DrillSources) -> float:
    """The share of holes at whose centre a pad is flashed on an outer layer, or the netlist has a plated hole."""
    pads = [image.start[image.kind == Kind.FLASH] for image in (sources.coppers[:1] + sources.coppers[-1:])]
    if sources.netlist is not None:
        pads.append(sources.netlist.at[sources.netlist.plated])
    centres = np.concatenate(pads) if pads else np.zeros((0, 2))
    if not len(centres) or not len(holes.start):
        return 0.0
    distance, _ = cKDTree(centres).query((holes.start + holes.end) / 2)
    return float(np.mean(distance <= _AT_PAD))
