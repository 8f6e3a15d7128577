"""Excellon and XNC drill files. In: bytes of one file, the board's extent in mm; out: a DrillFile, in mm, with the line of each hole."""

from __future__ import annotations

import re

import numpy as np

from impcheck.artwork.excellon_format import Extent, settle_format
from impcheck.artwork.excellon_notes import noted_tools
from impcheck.artwork.excellon_program import FARTHEST, MOST_PROBLEMS, Program
from impcheck.artwork.limits import Limits
from impcheck.artwork.parts import DrillFile
from impcheck.errors import InputError, Problem, Remark, RemarkKind

_DEFAULTS = Limits()
_LOOKS = re.compile(
    r"(?m)^\s*(?:N\d+\s*)?(?:M48\b|T\d+\s*(?:[A-Z]\s*[\d.]|$)|(?:G\d+\s*)*[XY]\s*[+-]?[\d.]+\s*(?:[A-Z]\s*[-+\d.]|$))", re.IGNORECASE
)
_GERBER = re.compile(r"%\s*(?:FS[LTD][AI]|MO(?:IN|MM)|ADD\d)|^G04[^\r\n]*\*", re.MULTILINE)


def read_excellon(data: bytes, file: str, limits: Limits = _DEFAULTS, extent: Extent | None = None) -> DrillFile:
    """Reads a drill or route file: holes, slots (G85 and routed), repeats, tools, plating and X2 attributes in comments.

    extent: min x, min y, max x, max y in mm of the board. It settles unit, digits and zeros where the file does not state them: the
    reading is taken under which the holes lie on the board; without it the usual one. Either way a remark says so. Raises InputError with
    the line of each mistake (at most 20): a hole without a tool or diameter, an unknown or unreadable command, a limit, a file cut short.
    """
    lines, whole = _lines(data, file, limits)
    form, remarks = settle_format(lines, file, extent)
    chosen = any(re.match(r"\s*T\d", line) for line in lines)
    program = Program(file, limits, form, noted_tools(lines, form.unit), chosen)
    program.run(lines)
    holes = np.frombuffer(program.holes.geometry, dtype=np.float64).reshape(-1, 5)
    problems = program.problems
    if problems and not len(holes) and not any(re.match(r"\s*(M48|%)", line) for line in lines):
        problems = [Problem(file, problems[0].line, f"this is no drill file: {problems[0].message}", "name an Excellon or XNC file")]
    elif not problems and not program.ended and not whole and not re.search(r"M00\s*$", lines[-1]):
        problems = [Problem(file, len(lines), "the file ends in the middle, without M30", "export or copy the drill file again")]
    elif not problems and program.in_header:
        problems = [Problem(file, len(lines), "the file ends in its header", "export or copy the drill file again")]
    info = np.frombuffer(program.holes.info, dtype=np.intc).astype(np.int32).reshape(-1, 4)
    far = np.flatnonzero(~(np.abs(holes[:, :4]).max(axis=1, initial=0.0) <= FARTHEST))
    if len(far):
        x, y = holes[far[0], 2:4]
        said = f"{len(far)} holes lie farther out than any board reaches, the first at ({x:.4g}, {y:.4g}) mm"
        remedy = f"the numbers were read as {form}; state their format, as in METRIC,TZ,000.000"
        problems = [*problems, Problem(file, int(info[far[0], 0]), said, remedy)]
    if problems:
        raise InputError(sorted(problems, key=lambda problem: problem.line)[:MOST_PROBLEMS])
    remarks += program.remarks()
    if not program.ended and not re.search(r"M00\s*$", "\n".join(lines[-3:]).strip()):
        remarks += (Remark(RemarkKind.ODD, "the drill file does not end with M30; it may be cut short", file, program.last_line),)
    plated = info[:, 1].astype(np.int8)
    plated[plated < 0] = program.notes.of_file()
    names = program.notes.attributes.objects
    return DrillFile(
        file=file,
        attributes=dict(program.notes.attributes.file),
        start=holes[:, 0:2].copy(),
        end=holes[:, 2:4].copy(),
        diameter=holes[:, 4].copy(),
        plated=plated,
        line=info[:, 0].copy(),
        net=info[:, 2].copy(),
        pin=info[:, 3].copy(),
        nets=tuple(names.nets),
        pins=tuple(names.pins),
        remarks=remarks,
    )


def _lines(data: bytes, file: str, limits: Limits) -> tuple[list[str], bool]:
    """The lines of a text file that may be a drill file, and whether the last one is complete."""
    if len(data) > limits.file_bytes:
        raise InputError(Problem(file, 0, f"the file has {len(data):,} bytes", f"limit file_bytes = {limits.file_bytes:,}"))
    data = data.removeprefix(b"\xef\xbb\xbf").rstrip(b"\x00\x1a")  # paper tape and old systems end a file so
    if not data.strip():
        raise InputError(Problem(file, 0, "the file is empty", "export the drill file again"))
    if b"\x00" in data[:4096]:
        raise InputError(Problem(file, 0, "this is a binary file, no drill file", "name an Excellon or XNC file"))
    try:
        text = data.decode("utf-8")
    except UnicodeDecodeError:
        text = data.decode("latin-1")
    if _GERBER.search(text[:100_000]):
        raise InputError(Problem(file, 0, "this is a Gerber file, no Excellon drill file", "name it with the ending .gbr"))
    if not _LOOKS.search(text):
        raise InputError(Problem(file, 0, "this is no drill file: it holds no header, tool or coordinate", "name an Excellon or XNC file"))
    lines = re.split(r"\r\n|\r|\n", text)
    whole = lines[-1].strip() == ""
    while len(lines) > 1 and not lines[-1].strip():
        lines.pop()
    return lines, whole
