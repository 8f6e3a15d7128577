"""The result document (format 1). In: everything a check found; out: a pydantic model that is the JSON file and what the Python API
returns.

Lengths are mm, delays ps, impedances ohm; positions are in the artwork's own coordinates. The same input gives the same bytes: no
times, no absolute paths.
"""

from __future__ import annotations

from typing import Any, Literal

from pydantic import BaseModel, ConfigDict, Field

Point = tuple[float, float]
Level = Literal["error", "warning", "note"]

DISCLAIMER = (
    "Quasi-TEM fields of two-dimensional cross-sections: good for finding and ranking discontinuities and for comparing revisions. "
    "No replacement for the fab's own impedance control (coupon and TDR measurement, IPC-TM-650 method 2.5.5.7), for a full-wave "
    "solution, or for a safety review: the applicable standards and qualified engineers decide."
)


class Part(BaseModel):
    """Base of every part of the document: unknown keys are refused, aliases may be written by their Python name."""

    model_config = ConfigDict(extra="forbid", populate_by_name=True, frozen=True)


class BoardPart(Part):
    """Which board was checked."""

    name: str
    file: str
    layers: list[str] = Field(description="copper layers, top to bottom")
    size_mm: tuple[float, float] = Field(description="width and height of the outline")


class Range(Part):
    """Least, greatest and length-weighted mean impedance over the places that trace rules judge."""

    min: float
    max: float
    mean: float


class StretchPart(Part):
    """Stations next to each other that share one cross-section."""

    layer: str
    start: Point = Field(alias="from")
    end: Point = Field(alias="to")
    along_mm: tuple[float, float]
    width_mm: float
    gap_mm: float | None = Field(default=None, description="gap between the legs of a pair")
    impedance_ohm: float | None = Field(description="null where no cross-section could be solved")
    eps_eff: float | None
    delay_ps: float | None
    above: str | None = Field(description="layer of the reference above")
    below: str | None
    coverage: float = Field(ge=0, le=1, description="share of the width that every usual reference covers, the least of both sides")
    zone: Literal["trace", "bend", "junction", "pad", "via"] = Field(
        description="what the place belongs to; trace rules judge trace and bend"
    )


class ViaPart(Part):
    """A change of layer."""

    at: Point
    start: str = Field(alias="from")
    end: str = Field(alias="to")
    stub_mm: float = Field(description="longest piece of barrel beyond the used layers")
    return_via_mm: float | None = Field(description="distance to the nearest via that joins the planes; null where none is needed or found")


class TdrPart(Part):
    """What a step of the class's rise time shows over time."""

    rise_time_ps: float
    time_ps: list[float]
    impedance_ohm: list[float]


class NetPart(Part):
    """One declared net (or one leg of a pair)."""

    name: str
    net_class: str = Field(alias="class")
    kind: Literal["single", "pair"]
    pair: str | None = Field(default=None, description="name of the pair this leg belongs to")
    status: Literal["walked", "open", "unresolved"]
    reason: str | None = Field(default=None, description="why it was not walked")
    length_mm: float
    delay_ps: float | None
    impedance_ohm: Range | None
    target_ohm: tuple[float, float, float] | None = Field(description="lowest allowed, nominal, highest allowed")
    stretches: list[StretchPart]
    vias: list[ViaPart]
    tdr: TdrPart | None = None
    worst_reflection: float | None = None


class Waiver(Part):
    """Why a finding does not count."""

    reason: str
    expires: str | None


class FindingPart(Part):
    """One spot one rule objects to."""

    rule: str
    level: Level
    net: str
    layer: str
    at: Point
    span: tuple[Point, Point]
    along_mm: tuple[float, float] | None
    measured: float | None
    limit: float | None
    unit: str
    message: str
    fingerprint: str = Field(description="stays the same when unrelated parts of the board move")
    waived: Waiver | None = None


class RemarkPart(Part):
    """One thing the check rests on: a guess, an oddity, a disagreement or a limit."""

    kind: Literal["guess", "odd", "disagreement", "limit"]
    text: str
    file: str
    line: int


class Summary(Part):
    """Counts."""

    errors: int
    warnings: int
    notes: int
    waived: int
    nets: int
    walked: int


class Document(Part):
    """The result of checking one board."""

    impcheck: Literal[1] = 1
    version: str
    about: str = DISCLAIMER
    board: BoardPart
    nets: list[NetPart]
    findings: list[FindingPart]
    rests_on: list[RemarkPart]
    summary: Summary

    def to_json(self) -> str:
        """The result file: UTF-8 text, two blanks of indent, a final newline."""
        return self.model_dump_json(by_alias=True, indent=2) + "\n"

    def gate(self, fail_on: str) -> bool:
        """True where a finding that is not waived stands at or over the level `fail_on` ("error", "warning", "note", "never")."""
        reached = {"never": (), "error": ("error",), "warning": ("error", "warning"), "note": ("error", "warning", "note")}[fail_on]
        return any(finding.level in reached and finding.waived is None for finding in self.findings)


def result_schema() -> dict[str, Any]:
    """JSON Schema of the result file."""
    return Document.model_json_schema(by_alias=True)
