"""What every rule may look at. In: the steps before; out: one object, with the few measures several rules share."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

from impcheck.artwork.parts import Artwork
from impcheck.checks.deck import Deck
from impcheck.checks.finding import Finding
from impcheck.checks.track import Spot, Track
from impcheck.copper.copper import Copper
from impcheck.errors import Remark, RemarkKind
from impcheck.nets.nets import Nets
from impcheck.path.walk import Run


@dataclass
class Context:
    """Everything found before, and the remarks the rules add."""

    artwork: Artwork
    copper: Copper
    nets: Nets
    tracks: Sequence[Track]
    deck: Deck
    remarks: list[Remark] = field(default_factory=list)

    def edge(self, track: Track) -> float:
        """Distance the class's edge covers during its rise time, mm."""
        rise = track.walk.net.net_class.rise_time
        if rise is None:
            rise = self.deck.rise_time
            text = f"class '{track.walk.net.net_class.name}' states no rise time: {rise * 1e12:.0f} ps taken from the rule deck"
            self.remarks.append(Remark(RemarkKind.GUESS, text, self.artwork.board.file, track.walk.net.net_class.line))
        return rise / track.delay_per_mm

    def height(self, one: int, two: int) -> float:
        """Distance between the facing surfaces of two copper layers, mm."""
        heights = self.artwork.stackup.heights
        return heights[min(one, two)][0] - heights[max(one, two)][1]

    def layer(self, index: int) -> str:
        """Name of a copper layer."""
        return self.artwork.names[index]

    def label_at(self, run: Run, station: int, layer: int, t: float = 0.0) -> int:
        """Label of the return copper a station's cut meets on a layer at t mm from the middle of the trace; -1 none."""
        cut = run.stations.cuts.get(layer)
        if cut is None:
            return -1
        at = t + float(run.stations.centre[station])
        a, b = int(cut.first[station]), int(cut.first[station + 1])
        hit = np.flatnonzero((cut.low[a:b] <= at) & (cut.high[a:b] >= at))
        for entry in hit.tolist():
            label = int(cut.label[a + entry])
            if label in self.nets.returns:
                return label
        return -1

    def finding(self, rule: str, level: str, track: Track, spot: Spot, measured: float, limit: float, unit: str, message: str) -> Finding:
        """A finding at a spot of a track."""
        return Finding(
            rule=rule,
            level=level,
            net=track.walk.net.name,
            layer=self.layer(int(track.layer[spot.worst])),
            at=track.place(spot.worst, spot.worst_along),
            span=track.span(spot),
            along=spot.along,
            measured=measured,
            limit=limit,
            unit=unit,
            message=message,
        )
