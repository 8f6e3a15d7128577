"""A walked net as one long row of stations. In: a profile; out: arrays over all its runs, and the spots a condition marks, in mm."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from impcheck.artwork.image import Bools, Floats, Ints
from impcheck.fields.line import SPEED
from impcheck.fields.profile import NetProfile
from impcheck.path.walk import Run, Zone

BRIDGE = 0.2  # mm: what is good for less than this between two bad pieces parts no spot
MEETS = 0.02  # mm: the end of a run and the start of the next one nearer than this are one place
AS_BAD = 0.05  # share of the greatest deviation within which stations count as equally bad
USUAL_EPS = 4.0  # effective permittivity where a net has no station that was solved


@dataclass(frozen=True)
class Spot:
    """One place where a condition holds: stations `first` to `last` (included) of a track, those in between that are not marked
    included."""

    marked: NDArray[np.int64]  # the stations marked
    length: float  # mm, of the marked ones
    along: tuple[float, float]
    worst: int  # a station at the worst place
    worst_along: float  # mm, path coordinate of the worst place


class Track:
    """All stations of a walk in order."""

    def __init__(self, profile: NetProfile) -> None:
        self.profile = profile
        self.walk = profile.walk
        runs = [run.stations for run in self.walk.runs]

        def joined(parts: list[NDArray[np.generic]], kind: type) -> NDArray[np.generic]:
            return np.concatenate(parts).astype(kind) if parts else np.empty(0, kind)

        self.run: Ints = joined([np.full(len(s), i) for i, s in enumerate(runs)], np.int32)  # type: ignore[assignment]
        self.begin: Floats = joined([s.begin for s in runs], float)  # type: ignore[assignment]
        self.end: Floats = joined([s.end for s in runs], float)  # type: ignore[assignment]
        self.width: Floats = joined([s.width for s in runs], float)  # type: ignore[assignment]
        self.zone: NDArray[np.uint8] = joined([s.zone for s in runs], np.uint8)  # type: ignore[assignment]
        self.impedance: Floats = joined([p.impedance for p in profile.runs], float)  # type: ignore[assignment]
        self.delay: Floats = joined([p.delay for p in profile.runs], float)  # type: ignore[assignment]
        self.layer: Ints = joined([np.full(len(s), r.layer) for r, s in zip(self.walk.runs, runs, strict=True)], np.int32)  # type: ignore[assignment]
        self.length = self.end - self.begin
        self.station: Ints = joined([np.arange(len(s)) for s in runs], np.int32)  # type: ignore[assignment]

    def __len__(self) -> int:
        return len(self.run)

    @cached_property
    def trace(self) -> Bools:
        """(n,) stations on plain trace."""
        found: Bools = self.zone == Zone.TRACE
        return found

    @cached_property
    def bends(self) -> Bools:
        """(n,) stations at bends."""
        found: Bools = self.zone == Zone.BEND
        return found

    @cached_property
    def delay_per_mm(self) -> float:
        """Mean delay of the net, s per mm."""
        known = np.isfinite(self.delay) & (self.length > 0)
        if not known.any():
            return float(np.sqrt(USUAL_EPS)) / SPEED
        return float(np.average(self.delay[known], weights=self.length[known]))

    def continues(self, index: int) -> bool:
        """True where station index + 1 follows station index on the same layer without a break."""
        if index + 1 >= len(self) or self.layer[index] != self.layer[index + 1]:
            return False
        one, other = self.run[index], self.run[index + 1]
        if one == other:
            return True
        a, b = self.walk.runs[one], self.walk.runs[other]
        return abs(a.along[1] - b.along[0]) < MEETS and float(np.hypot(*(a.line[-1] - b.line[0]))) < MEETS

    def spots(self, marked: Bools, judged: Bools, badness: Floats) -> Iterator[Spot]:
        """Groups marked stations into spots.

        Marked stations are one spot while they follow each other on a layer; stations between them that are not judged, or judged good
        for less than BRIDGE mm, do not part them. `badness` (n,) says how bad each station is; the spot's worst place is the middle of
        its worst stations.
        """
        where = np.flatnonzero(marked)
        if not len(where):
            return
        group: list[int] = []
        good = 0.0
        for index in range(int(where[0]), int(where[-1]) + 1):
            if group and (not self.continues(index - 1) or good > BRIDGE):
                yield self._spot(group, badness)
                group, good = [], 0.0
            if marked[index]:
                group.append(index)
                good = 0.0
            elif group and judged[index]:
                good += float(self.length[index])
        if group:
            yield self._spot(group, badness)

    def _spot(self, group: list[int], badness: Floats) -> Spot:
        marked = np.array(group)
        bad = badness[marked]
        top = bad >= bad.max() - AS_BAD * abs(bad.max())
        parts = np.split(np.flatnonzero(top), np.flatnonzero(np.diff(np.flatnonzero(top)) > 1) + 1)
        longest = marked[max(parts, key=lambda part: float(self.length[marked[part]].sum()))]
        middle = (float(self.begin[longest[0]]) + float(self.end[longest[-1]])) / 2
        worst = int(longest[np.argmin(np.abs((self.begin[longest] + self.end[longest]) / 2 - middle))])
        if not self.begin[worst] <= middle <= self.end[worst]:
            middle = float(self.begin[worst] + self.end[worst]) / 2
        return Spot(marked, float(self.length[marked].sum()), (float(self.begin[marked[0]]), float(self.end[marked[-1]])), worst, middle)

    def place(self, station: int, along: float) -> tuple[float, float]:
        """The point of the centreline at a path coordinate within the run of a station."""
        run: Run = self.walk.runs[int(self.run[station])]
        return run.point_at(along)

    def span(self, spot: Spot) -> tuple[tuple[float, float], tuple[float, float]]:
        """Both ends of a spot on the centreline."""
        return self.place(int(spot.marked[0]), spot.along[0]), self.place(int(spot.marked[-1]), spot.along[1])
