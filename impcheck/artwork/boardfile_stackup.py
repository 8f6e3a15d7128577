"""Builds the stackup of a board file. In: its checked entries; out: a Stackup in mm, or None with the problems that forbid one."""

from __future__ import annotations

import re
from itertools import pairwise

from impcheck.artwork import schema
from impcheck.artwork.boardfile_entries import Sections
from impcheck.artwork.stackup import CopperItem, Dielectric, Mask, Stackup
from impcheck.errors import Problems

Item = Mask | CopperItem | Dielectric


def build_stackup(sections: Sections, file: str, problems: Problems) -> Stackup | None:
    """The stackup the entries describe; None where there are none, or where they cannot be built (the problems say why)."""
    before = len(problems.found)
    items: list[Item] = []
    lines: list[int] = []
    for entry, line in sections.many("stackup"):
        items.append(_item(entry, line))
        lines.append(line)
    if "stackup" in sections.broken or not sections.line("stackup"):
        return None  # what is missing because of another mistake is no second mistake
    if not items:
        problems.add(file, sections.line("stackup"), "the stackup is empty", "write its layers top to bottom, or leave the key out")
        return None
    _check_names(items, file, problems)
    _check_order(items, lines, file, problems)
    return None if len(problems.found) > before else Stackup(tuple(items))


def _item(entry: schema.MaskEntry | schema.CopperEntry | schema.DielectricEntry, line: int) -> Item:
    if isinstance(entry, schema.MaskEntry):
        return Mask(entry.mask, entry.er, entry.loss_tangent)
    if isinstance(entry, schema.CopperEntry):
        return CopperItem(entry.copper, entry.thickness, entry.etch, entry.roughness, entry.file, entry.negative, line)
    core = is_core(entry.name) if entry.core is None else entry.core
    return Dielectric(entry.dielectric, entry.er, entry.loss_tangent, entry.name, core, line)


def is_core(name: str) -> bool | None:
    """What the name of a material says: True core, False prepreg, None neither (or both)."""
    core, prepreg = bool(re.search(r"\bcore\b", name, re.IGNORECASE)), bool(re.search(r"prepreg", name, re.IGNORECASE))
    return None if core == prepreg else core


def _check_names(items: list[Item], file: str, problems: Problems) -> None:
    names: dict[str, int] = {}
    files: dict[str, str] = {}
    for item in items:
        if not isinstance(item, CopperItem):
            continue
        if item.name in names:
            said = f"the copper layer '{item.name}' stands here already in line {names[item.name]}"
            problems.add(file, item.line, said, "give each layer its own name")
        names.setdefault(item.name, item.line)
        if item.file is not None:
            if item.file in files:
                said = f"file '{item.file}' is given to two layers, {files[item.file]} and {item.name}"
                problems.add(file, item.line, said, "give each layer its own file")
            files.setdefault(item.file, item.name)


def _check_order(items: list[Item], lines: list[int], file: str, problems: Problems) -> None:
    inner = list(zip(items, lines, strict=True))
    if isinstance(inner[0][0], Mask):
        inner = inner[1:]
    if inner and isinstance(inner[-1][0], Mask):
        inner = inner[:-1]
    for item, line in inner:
        if isinstance(item, Mask):
            problems.add(file, line, "solder mask inside the stackup", "a mask is the first or the last item")
    inner = [(item, line) for item, line in inner if not isinstance(item, Mask)]
    coppers = [item for item, _ in inner if isinstance(item, CopperItem)]
    if len(coppers) < 2:
        said = "the stackup has one copper layer" if coppers else "the stackup has no copper"
        problems.add(file, lines[0], said, "write two at least, with a dielectric between them")
        return
    for (above, _), (below, line) in pairwise(inner):
        if isinstance(above, CopperItem) and isinstance(below, CopperItem):
            said = f"there is no dielectric between {above.name} and {below.name}"
            problems.add(file, line, said, "write `- {dielectric: 110um, er: 4.2}` between them")
    for (item, line), where in ((inner[0], "top"), (inner[-1], "bottom")):
        if isinstance(item, Dielectric):
            problems.add(file, line, f"a dielectric is the {where} of the stackup", "the outermost items are copper, with or without mask")
