"""Gerber job files (.gbrjob, JSON). In: bytes; out: the board's size, file functions and stackup they state, in mm.

Written from the Gerber Job Format Specification (Ucamco, revisions of 2018 and 2020), cited from memory: lengths are mm.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace

from impcheck.artwork.jobfile_json import JobObject, load
from impcheck.artwork.jobfile_stackup import JobItem, items_of, stackup_of
from impcheck.artwork.limits import Limits
from impcheck.artwork.stackup import Stackup
from impcheck.errors import InputError, Problem, Remark, RemarkKind

_DEFAULTS = Limits()
_SECTIONS = ("Header", "GeneralSpecs", "FilesAttributes", "MaterialStackup", "DesignRules")


@dataclass(frozen=True)
class Job:
    """What a job file says. Nothing in it is assumed: what it leaves out is None, or stands in `missing`."""

    file: str
    name: str = ""
    size: tuple[float, float] | None = None  # mm
    layer_count: int | None = None  # copper layers
    thickness: float | None = None  # mm
    functions: Mapping[str, tuple[str, ...]] = field(default_factory=dict)  # file path -> ("Copper", "L1", "Top")
    polarities: Mapping[str, str] = field(default_factory=dict)  # file path -> "Positive" or "Negative"
    items: tuple[JobItem, ...] = ()  # copper, dielectrics and solder mask top to bottom, as far as stated
    stackup: Stackup | None = None  # None where the file states none, or not all that impedance needs
    missing: tuple[str, ...] = ()  # what keeps `stackup` from being complete, one sentence each
    remarks: tuple[Remark, ...] = ()


def read_job(data: bytes, file: str, limits: Limits = _DEFAULTS) -> Job:
    """Reads a job file.

    Raises InputError with the line where the file is no JSON or no job file. A value that is left out or impossible is not replaced: the
    sentence about it is in `missing`, and there is then no `stackup`.
    """
    if len(data) > limits.file_bytes:
        raise InputError(Problem(file, 0, f"the file has {len(data):,} bytes", f"limit file_bytes = {limits.file_bytes:,}"))
    document = load(data, file)
    if not any(document.get_any(section) is not None for section in _SECTIONS):
        said = "this JSON is no Gerber job file: it has none of " + ", ".join(_SECTIONS)
        raise InputError(Problem(file, document.line, said, "export the job file (.gbrjob) again, or leave it out"))
    remarks: list[Remark] = []
    general = document.child("GeneralSpecs", "Overall")
    size = general.child("Size")
    width, height = size.number("X"), size.number("Y")
    count = general.number("LayerNumber")
    thickness = general.number("BoardThickness")
    functions, polarities = _files(document.children("FilesAttributes"), file, remarks)
    items = items_of(document.children("MaterialStackup"))
    stackup, missing = stackup_of(items)
    job = Job(
        file=file,
        name=general.child("ProjectId").text("Name"),
        size=(width, height) if width is not None and height is not None and width > 0 and height > 0 else None,
        layer_count=int(count) if count is not None and count >= 1 and count == int(count) else None,
        thickness=thickness if thickness is not None and thickness > 0 else None,
        functions=functions,
        polarities=polarities,
        items=items,
        stackup=stackup,
        missing=missing,
    )
    remarks += _doubts(job, document.child("GeneralSpecs", "Overall").line)
    return replace(job, remarks=tuple(remarks))


def _files(entries: list[JobObject], file: str, remarks: list[Remark]) -> tuple[dict[str, tuple[str, ...]], dict[str, str]]:
    """Functions and polarities by path. An entry that names no file or no function is said and left out."""
    functions: dict[str, tuple[str, ...]] = {}
    polarities: dict[str, str] = {}
    for entry in entries:
        path, function = entry.text("Path").replace("\\", "/"), entry.text("FileFunction")
        if not path or not function:
            lacks = "Path" if not path else "FileFunction"
            remarks.append(Remark(RemarkKind.ODD, f"an entry of FilesAttributes has no {lacks}; it was left out", file, entry.line))
            continue
        values = tuple(part.strip() for part in function.split(","))
        if functions.get(path, values) != values:
            said = f"'{path}' is listed twice with different functions; the later one counts"
            remarks.append(Remark(RemarkKind.ODD, said, file, entry.line))
        functions[path] = values
        polarity = entry.text("FilePolarity").capitalize()
        if polarity in ("Positive", "Negative"):
            polarities[path] = polarity
        elif polarity:
            said = f"FilePolarity '{polarity}' is neither Positive nor Negative; it was left out"
            remarks.append(Remark(RemarkKind.ODD, said, file, entry.line))
    return functions, polarities


def _doubts(job: Job, line: int) -> list[Remark]:
    """What the job file says against itself, and losses it leaves out."""
    found = []
    coppers = sum(item.kind == "copper" for item in job.items)
    if coppers and job.layer_count is not None and coppers != job.layer_count:
        said = f"the job file says {job.layer_count} copper layers and lists {coppers} in its stackup; the list was taken"
        found.append(Remark(RemarkKind.DISAGREEMENT, said, job.file, line))
    if job.stackup is not None and job.thickness is not None:
        everything = sum(item.thickness for item in job.stackup.items)
        laminate = sum(item.thickness or 0.0 for item in job.items if item.kind == "dielectric")
        if not 0.9 * laminate <= job.thickness <= 1.1 * everything:  # 10 % is the usual tolerance of a board's thickness (common practice)
            said = f"the job file's board is {job.thickness:g} mm thick, its stackup adds up to {everything:.4g} mm; the stackup was taken"
            found.append(Remark(RemarkKind.DISAGREEMENT, said, job.file, line))
    lossless = [item for item in job.items if item.kind == "dielectric" and item.loss_tangent is None]
    if job.stackup is not None and lossless:
        said = "the job file gives no loss tangent for " + ", ".join(item.name or f"line {item.line}" for item in lossless[:4])
        found.append(Remark(RemarkKind.LIMIT, f"{said}: no loss is calculated there", job.file, lossless[0].line))
    return found
