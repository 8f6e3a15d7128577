"""The result document put together. In: artwork, copper, profiles, findings, remarks; out: a Document with rounded numbers in a fixed
order."""

from __future__ import annotations

import math
from collections.abc import Sequence
from importlib.metadata import version

import numpy as np

from impcheck.artwork.parts import Artwork
from impcheck.checks.finding import Finding
from impcheck.checks.returns import nearest_return_via
from impcheck.checks.stubs import stub_lengths
from impcheck.copper.copper import Copper
from impcheck.errors import Remark
from impcheck.fields.profile import NetProfile
from impcheck.fields.stretches import Stretch, stretches
from impcheck.nets.nets import Nets
from impcheck.path.walk import Run, Zone
from impcheck.report.document import BoardPart, Document, FindingPart, NetPart, Range, RemarkPart, StretchPart, Summary, ViaPart
from impcheck.report.fingerprint import fingerprints

LEVELS = ("error", "warning", "note")
PS = 1e12


def build_document(
    artwork: Artwork, copper: Copper, nets: Nets, profiles: Sequence[NetProfile], findings: Sequence[Finding], remarks: Sequence[Remark]
) -> Document:
    """The document of one board. Findings stand errors first, then by net and place; nets in the order they were declared."""
    ordered = sorted(findings, key=lambda f: (LEVELS.index(f.level), f.net, f.along or (-1.0, -1.0), f.rule, f.layer, f.at))
    x0, y0, x1, y1 = copper.outline_box
    parts = [net_part(artwork, copper, nets, profile) for profile in profiles]
    judged = [finding_part(finding, name) for finding, name in zip(ordered, fingerprints(ordered), strict=True)]
    counts = {level: sum(f.level == level and f.waived is None for f in judged) for level in LEVELS}
    return Document(
        version=version("impcheck"),
        board=BoardPart(
            name=artwork.board.name, file=artwork.board.file, layers=list(artwork.names), size_mm=(rounded(x1 - x0), rounded(y1 - y0))
        ),
        nets=parts,
        findings=judged,
        rests_on=[RemarkPart(kind=r.kind.value, text=r.text, file=r.file, line=r.line) for r in dict.fromkeys(remarks)],
        summary=Summary(
            errors=counts["error"],
            warnings=counts["warning"],
            notes=counts["note"],
            waived=sum(f.waived is not None for f in judged),
            nets=len(parts),
            walked=sum(net.status == "walked" for net in parts),
        ),
    )


def net_part(artwork: Artwork, copper: Copper, nets: Nets, profile: NetProfile) -> NetPart:
    """One net of the document. Length and delay count from the start of the walk to its farthest end."""
    walk = profile.walk
    declared = walk.net
    wanted = declared.net_class
    nominal = wanted.impedance if not declared.pair else None
    target = None if nominal is None else (rounded(nominal * (1 - wanted.tolerance)), nominal, rounded(nominal * (1 + wanted.tolerance)))
    vias = []
    for via in walk.vias:
        distance = nearest_return_via(artwork, copper, nets, walk, via)
        stub = max(stub_lengths(artwork, copper, via))
        names = artwork.names
        vias.append(
            ViaPart(
                at=point(via.at),
                start=names[via.entered],
                end=names[via.left],
                stub_mm=rounded(stub),
                return_via_mm=None if distance is None else rounded(distance),
            )
        )
    return NetPart(
        name=declared.name,
        net_class=wanted.name,
        kind="pair" if declared.pair else "single",
        pair=declared.pair or None,
        status=walk.status,
        reason=walk.reason or None,
        length_mm=rounded(max((run.along[1] for run in walk.runs), default=0.0)),
        delay_ps=farthest_delay(profile),
        impedance_ohm=impedance_range(profile),
        target_ohm=target,
        stretches=[stretch_part(artwork, stretch) for stretch in stretches(profile)],
        vias=vias,
    )


def stretch_part(artwork: Artwork, stretch: Stretch) -> StretchPart:
    """One stretch of the document."""
    names = artwork.names
    return StretchPart(
        layer=names[stretch.layer],
        start=point(stretch.start),
        end=point(stretch.end),
        along_mm=(rounded(stretch.along[0]), rounded(stretch.along[1])),
        width_mm=rounded(stretch.width),
        impedance_ohm=number(stretch.impedance, 2),
        eps_eff=number(stretch.eps_eff, 4),
        delay_ps=number(stretch.delay * PS, 3),
        above=None if stretch.above < 0 else names[stretch.above],
        below=None if stretch.below < 0 else names[stretch.below],
        coverage=round(min(1.0, max(0.0, stretch.coverage)), 3),
        zone=Zone(stretch.zone).name.lower(),
    )


def finding_part(finding: Finding, fingerprint: str) -> FindingPart:
    """One finding of the document."""
    return FindingPart(
        rule=finding.rule,
        level=finding.level,
        net=finding.net,
        layer=finding.layer,
        at=point(finding.at),
        span=(point(finding.span[0]), point(finding.span[1])),
        along_mm=None if finding.along is None else (rounded(finding.along[0]), rounded(finding.along[1])),
        measured=None if finding.measured is None else number(finding.measured, 4),
        limit=None if finding.limit is None else number(finding.limit, 4),
        unit=finding.unit,
        message=finding.message,
        fingerprint=fingerprint,
    )


def impedance_range(profile: NetProfile) -> Range | None:
    """Least, greatest and mean impedance where trace rules judge; of all stations where there is no such place; None without any."""
    if not profile.runs:
        return None
    ohms = np.concatenate([run.impedance for run in profile.runs])
    lengths = np.concatenate([run.stations.end - run.stations.begin for run in profile.walk.runs])
    zones = np.concatenate([run.stations.zone for run in profile.walk.runs])
    solved = np.isfinite(ohms)
    judged = solved & ((zones == Zone.TRACE) | (zones == Zone.BEND))
    use = judged if judged.any() else solved
    if not use.any():
        return None
    weights = np.maximum(lengths[use], 1e-9)
    return Range(
        min=round(float(ohms[use].min()), 2),
        max=round(float(ohms[use].max()), 2),
        mean=round(float(np.average(ohms[use], weights=weights)), 2),
    )


def farthest_delay(profile: NetProfile) -> float | None:
    """Delay in ps from the start of the walk to its farthest end; a station without a solution counts with the mean delay of its run."""
    reached: list[tuple[Run, float]] = []
    for run, fields in sorted(zip(profile.walk.runs, profile.runs, strict=True), key=lambda pair: pair[0].along):
        known = np.isfinite(fields.delay)
        if not known.any():
            if run.along[1] - run.along[0] > 1e-6:
                return None
            own = 0.0
        else:
            per_mm = np.where(known, fields.delay, fields.delay[known].mean())
            own = float(np.sum(per_mm * (run.stations.end - run.stations.begin)))
        before = [(abs(earlier.along[1] - run.along[0]), math.dist(earlier.line[-1], run.line[0]), time) for earlier, time in reached]
        reached.append((run, own + (min(before)[2] if before and run.along[0] > 1e-6 else 0.0)))
    if not reached:
        return None
    return round(max(reached, key=lambda pair: pair[0].along[1])[1] * PS, 3)


def rounded(value: float) -> float:
    """A length to 0.1 um, never minus zero."""
    return round(float(value), 4) + 0.0


def number(value: float, digits: int) -> float | None:
    """A number rounded, None where it is not finite."""
    return round(float(value), digits) + 0.0 if math.isfinite(value) else None


def point(place: Sequence[float]) -> tuple[float, float]:
    """A place to 0.1 um."""
    return rounded(place[0]), rounded(place[1])
