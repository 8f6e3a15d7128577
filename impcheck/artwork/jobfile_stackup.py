"""The stackup of a job file. In: the entries of its MaterialStackup; out: its items and, where nothing is missing, a Stackup, in mm."""

from __future__ import annotations

import re
from dataclasses import dataclass

from impcheck.artwork.jobfile_json import JobObject
from impcheck.artwork.stackup import CopperItem, Dielectric, Mask, Stackup

_KINDS = {
    "copper": "copper",
    "dielectric": "dielectric",
    "soldermask": "mask",
}  # legend, paste, glue and finish carry no field worth counting


@dataclass(frozen=True)
class JobItem:
    """One layer of the stackup as the job file states it; None where it does not."""

    kind: str  # "copper", "dielectric", "mask"
    name: str
    thickness: float | None  # mm
    er: float | None
    loss_tangent: float | None
    material: str
    core: bool | None  # True core, False prepreg, None not said
    line: int

    @property
    def shown(self) -> str:
        """How a sentence calls it."""
        words = {"copper": "copper layer", "dielectric": "dielectric", "mask": "solder mask"}[self.kind]
        return f"{words} '{self.name}' (line {self.line})" if self.name else f"{words} (line {self.line})"


def items_of(entries: list[JobObject]) -> tuple[JobItem, ...]:
    """Copper, dielectrics and solder mask, top to bottom."""
    found = []
    for entry in entries:
        kind = _KINDS.get(re.sub(r"[^a-z]", "", entry.text("Type").casefold()))
        if kind is None:
            continue
        words = " ".join(entry.text(key) for key in ("Name", "Material", "Notes")).casefold()
        core, prepreg = re.search(r"\bcore\b", words), re.search(r"\bpre-?preg\b", words)
        found.append(
            JobItem(
                kind=kind,
                name=entry.text("Name"),
                thickness=entry.number("Thickness"),
                er=entry.number("DielectricConstant"),
                loss_tangent=entry.number("LossTangent"),
                material=entry.text("Material"),
                core=None if bool(core) == bool(prepreg) else bool(core),
                line=entry.line,
            )
        )
    return tuple(found)


def stackup_of(items: tuple[JobItem, ...]) -> tuple[Stackup | None, tuple[str, ...]]:
    """The Stackup, or None and what it lacks, one sentence each.

    Copper layers are called L1, L2, ... from the top. A loss tangent that is left out does not keep the stackup from being used, for
    impedance does not need it.
    """
    if not items:
        return None, ()
    missing: list[str] = []
    coppers = [index for index, item in enumerate(items) if item.kind == "copper"]
    if len(coppers) < 2:
        return None, (f"the stackup lists {len(coppers)} of the 2 copper layers that a trace and its reference need at least",)
    top, bottom = coppers[0], coppers[-1]
    found: list[Mask | CopperItem | Dielectric] = []
    number = 0
    for index, item in enumerate(items):
        missing += _lacking(item)
        if item.kind == "copper":
            number += 1
            if index > top and items[index - 1].kind == "copper":
                missing.append(f"there is no dielectric above the {item.shown}")
            found.append(CopperItem(f"L{number}", item.thickness or 0.0, line=item.line))
        elif item.kind == "mask":
            if top < index < bottom:
                missing.append(f"the {item.shown} lies between copper layers")
            elif any(other.kind == "mask" for other in items[:index] if (index < top) == (items.index(other) < top)):
                missing.append(f"the {item.shown} is the second one on its side")
            found.append(Mask(item.thickness or 0.0, item.er or 0.0, item.loss_tangent or 0.0))
        else:
            if not top < index < bottom:
                missing.append(f"the {item.shown} lies outside the outer copper layers")
            name = item.name or item.material
            found.append(Dielectric(item.thickness or 0.0, item.er or 0.0, item.loss_tangent or 0.0, name, item.core, item.line))
    return (None if missing else Stackup(tuple(found))), tuple(missing)


def _lacking(item: JobItem) -> list[str]:
    """What impedance needs of an item and the file does not say, or says impossibly."""
    found = []
    if not item.thickness:
        found.append(f"the {item.shown} has no Thickness")
    elif not 0 < item.thickness < 100:
        found.append(f"the {item.shown} has the impossible Thickness {item.thickness:g} mm")
    if item.kind != "copper":
        if not item.er:
            found.append(f"the {item.shown} has no DielectricConstant")
        elif not 1 <= item.er < 1000:
            found.append(f"the {item.shown} has the impossible DielectricConstant {item.er:g}")
        if item.loss_tangent is not None and not 0 <= item.loss_tangent < 1:
            found.append(f"the {item.shown} has the impossible LossTangent {item.loss_tangent:g}")
    return found
