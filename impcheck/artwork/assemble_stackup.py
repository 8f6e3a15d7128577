"""Settles the stackup of a board. In: the board file's plan and the job file; out: one Stackup in mm, and where the two differ."""

from __future__ import annotations

from impcheck.artwork.boardfile import Plan
from impcheck.artwork.jobfile import Job
from impcheck.artwork.stackup import CopperItem, Dielectric, Stackup
from impcheck.errors import Problems, Remark, RemarkKind

_SAME_THICKNESS = 0.001  # mm: files are written in um
_SAME_PERMITTIVITY = 0.005


def settle_stackup(plan: Plan, job: Job | None, problems: Problems, remarks: list[Remark]) -> Stackup | None:
    """The board file's stackup, else the job file's. None where neither can be used; the problem then stands in `problems`."""
    told = job.stackup if job is not None else None
    if plan.stackup_line:
        if plan.stackup is not None and told is not None:
            text = difference(plan.stackup, told)
            if text:
                said = f"the job file's stackup differs from the board file's: {text}; the board file was followed"
                remarks.append(Remark(RemarkKind.DISAGREEMENT, said, plan.board.file, plan.stackup_line))
        return plan.stackup
    if told is not None:
        remarks.append(Remark(RemarkKind.GUESS, "the stackup is the job file's; confirm it with the fab house", plan.board.file))
        return told
    why = ""
    if job is not None:
        why = f", and the job file's cannot be used: {'; '.join(job.missing[:4])}" if job.missing else ", and the job file has none"
    problems.add(
        plan.board.file, 1, f"there is no stackup{why}", "write `stackup:` with every layer top to bottom, as the fab house quoted it"
    )
    return None


def difference(one: Stackup, other: Stackup) -> str:
    """The first way in which two stackups differ, in words; "" where they agree."""
    if len(one.coppers) != len(other.coppers):
        return f"{len(other.coppers)} copper layers, not {len(one.coppers)}"
    for first, second in zip(one.coppers, other.coppers, strict=True):
        if abs(first.thickness - second.thickness) > _SAME_THICKNESS:
            return f"copper layer {first.name} is {second.thickness * 1000:g} um thick, not {first.thickness * 1000:g} um"
    for index, (mine, theirs) in enumerate(zip(_gaps(one), _gaps(other), strict=True)):
        where = f"between {one.coppers[index].name} and {one.coppers[index + 1].name}"
        if abs(mine[0] - theirs[0]) > _SAME_THICKNESS:
            return f"{where} there are {theirs[0] * 1000:g} um of dielectric, not {mine[0] * 1000:g} um"
        if abs(mine[1] - theirs[1]) > _SAME_PERMITTIVITY:
            return f"{where} er is {theirs[1]:.3g}, not {mine[1]:.3g}"
    return ""


def _gaps(stackup: Stackup) -> list[tuple[float, float]]:
    """Thickness and mean permittivity (of layers in series) between each two copper layers."""
    gaps: list[tuple[float, float]] = []
    height = elastance = 0.0
    coppers = 0
    for item in stackup.items:
        if isinstance(item, CopperItem):
            if coppers:
                gaps.append((height, height / elastance if elastance else 1.0))
            coppers += 1
            height = elastance = 0.0
        elif isinstance(item, Dielectric):
            height += item.thickness
            elastance += item.thickness / item.er
    return gaps
