"""Impedance along walked nets. In: walks, copper, a stackup; out: a profile a net, each distinct cross-section solved once."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from concurrent.futures import ProcessPoolExecutor

import numpy as np
import shapely
from numpy.typing import NDArray

from impcheck.artwork.image import Bools, Floats
from impcheck.artwork.stackup import Stackup
from impcheck.copper.copper import Copper
from impcheck.errors import Remark, RemarkKind
from impcheck.fields.alongside import alongside
from impcheck.fields.cross_section import COARSE, Edges, Place, Shape, place_of, section_of
from impcheck.fields.line import SPEED
from impcheck.fields.profile import NetProfile, RunProfile
from impcheck.fields.section import SectionError
from impcheck.fields.solver import solve
from impcheck.nets.nets import Nets
from impcheck.path.walk import Intervals, Run, Walk, Zone

GRAIN = 0.002  # mm: stations whose cuts agree to this are one before anything is computed
ENDLESS = 1000.0  # mm, where copper that goes on beyond a cut is taken to end
MOST = 800  # sections solved for one board
COARSEST = 32.0
FEWEST = 12  # sections a process, for which starting one does not pay
ACCURACY = 5e-3  # relative, of each section: a tenth of the narrowest tolerance boards are built to
Solved = tuple[float, float, float]  # impedance in ohm, effective permittivity, estimated relative error


def profile_nets(
    walks: Sequence[Walk], stackup: Stackup, nets: Nets, copper: Copper, *, jobs: int = 1
) -> tuple[tuple[NetProfile, ...], tuple[Remark, ...]]:
    """Fields of every station of every walk, and remarks on what could not be solved.

    Copper beside a trace counts at 0 V, whether it is a return net or a quiet foreign net (its driver holds it), and so do foreign traces
    on the layers between it and its planes where they run alongside for longer than they are away; the own net's other legs stay out of
    the section. `jobs` processes share the solving; the result does not depend on their number.
    """
    returns = np.zeros(nets.count, bool)
    returns[sorted(nets.returns)] = True
    factor = 1.0
    while True:
        places: dict[Place, int] = {}
        known: dict[tuple[object, ...], int] = {}
        rows: list[list[NDArray[np.int64]]] = []
        for walk in walks:
            own = np.zeros(nets.count, bool)
            own[list(walk.net.labels)] = True
            rows.append([_places_of_run(run, stackup, copper, (returns, own), (places, known), factor) for run in walk.runs])
        if len(_distinct(places)) <= MOST or factor >= COARSEST:
            break
        factor *= 2
    table = np.array([*solve_places(list(places), stackup, jobs), (np.nan, np.nan, np.nan)])
    profiles = []
    lost = 0
    for walk, runs in zip(walks, rows, strict=True):
        found = []
        for run, index in zip(walk.runs, runs, strict=True):
            z0, eps, error = table[index].T
            lost += int((np.isnan(z0) & (run.stations.zone != Zone.VIA)).sum())
            found.append(RunProfile(z0, eps, np.sqrt(eps) / SPEED, error))
        profiles.append(NetProfile(walk, tuple(found)))
    remarks = []
    if factor > 1:
        text = (
            f"the copper beside and under the traces varies so much that cross-sections were rounded {factor:.0f} times more coarsely than "
            f"usual, so that at most {MOST} have to be solved: impedances may be off by about {0.3 * factor:.1g} %"
        )
        remarks.append(Remark(RemarkKind.LIMIT, text))
    if lost:
        total = sum(len(index) for runs in rows for index in runs)
        text = (
            f"{lost} of {total} stations have no cross-section that could be solved (nothing near to return on, or copper that "
            "touches): they carry no impedance"
        )
        remarks.append(Remark(RemarkKind.LIMIT, text))
    return tuple(profiles), tuple(remarks)


def _places_of_run(
    run: Run,
    stackup: Stackup,
    copper: Copper,
    labels: tuple[Bools, Bools],
    found_before: tuple[dict[Place, int], dict[tuple[object, ...], int]],
    factor: float,
) -> NDArray[np.int64]:
    """(n,) index into `places` of each station, -1 where there is no section: in vias, and where there is nothing to return on."""
    (returns, own), (places, known), stations = labels, found_before, run.stations
    fine = np.isin(stations.zone, (Zone.TRACE, Zone.BEND))
    coated = _coated(run, stackup, copper)
    cuts = {
        layer: _prepared(cut, stations.centre, stations.reach, ~own[cut.label] if layer == run.layer else returns[cut.label])
        for layer, cut in stations.cuts.items()
    }
    foreign = {
        layer: _prepared(stations.cuts[layer], stations.centre, stations.reach, use)
        for layer, use in alongside(run, stackup, returns, own).items()
        if use.any()
    }
    width = np.maximum(np.round(stations.width / GRAIN * 2).astype(np.int64), 1)
    found = np.full(len(stations), -1, np.int64)
    above = [layer for layer in range(run.layer - 1, -1, -1) if layer in cuts]
    below = [layer for layer in range(run.layer + 1, len(stackup.coppers)) if layer in cuts]
    for i in np.flatnonzero(stations.zone != Zone.VIA).tolist():
        key = (run.layer, width[i], fine[i], coated[i], *cuts, *(cut.key(i) for cut in cuts.values()))
        if foreign:
            key = (*key, *foreign, *(cut.key(i) for cut in foreign.values()))
        index = known.get(key)
        if index is None:
            half = float(stations.width[i]) / 2
            beside = tuple((a, b) for a, b in cuts[run.layer].edges(i) if a > half - 1e-3 or b < -half + 1e-3)
            upper = [(layer, cuts[layer].edges(i)) for layer in above]
            lower = [(layer, cuts[layer].edges(i)) for layer in below]
            between = tuple((layer, cut.edges(i)) for layer, cut in foreign.items())
            rough = factor * (1.0 if fine[i] else COARSE)
            place = place_of(run.layer, float(stations.width[i]), beside, upper, lower, stackup, bool(coated[i]), rough, between)
            main = place.main
            nothing = main.closed_above < 0 and main.closed_below < 0 and not main.planes and not main.beside
            index = -1 if nothing else places.setdefault(place, len(places))
            known[key] = index
        found[i] = index
    return found


class _Cut:
    """The copper of one layer's cuts that a section sees, relative to the middle of the trace."""

    def __init__(self, first: NDArray[np.int64], low: Floats, high: Floats) -> None:
        self.first, self.low, self.high = first, low, high
        self._rounded = np.round(np.column_stack([low, high]) / GRAIN).astype(np.int32)

    def key(self, i: int) -> bytes:
        """What two stations must share to be one."""
        return self._rounded[self.first[i] : self.first[i + 1]].tobytes()

    def edges(self, i: int) -> Edges:
        """Low and high edges at station i, sorted, overlaps merged."""
        found: list[tuple[float, float]] = []
        for low, high in sorted(
            zip(self.low[self.first[i] : self.first[i + 1]].tolist(), self.high[self.first[i] : self.first[i + 1]].tolist(), strict=True)
        ):
            if found and low <= found[-1][1] + 1e-6:
                found[-1] = (found[-1][0], max(high, found[-1][1]))
            else:
                found.append((low, high))
        return tuple(found)


def _prepared(cut: Intervals, centre: Floats, reach: float, use: Bools) -> _Cut:
    """The entries of a cut to be used, relative to the middle of the trace."""
    count = np.diff(cut.first)
    station = np.repeat(np.arange(len(count)), count)
    first = np.concatenate([[0], np.cumsum(np.bincount(station[use], minlength=len(count)))])
    shift = centre[station[use]]
    low, high = cut.low[use], cut.high[use]
    # what is cut off at the reach goes on: read as an edge there it would make a strip of a plane
    return _Cut(first, np.where(low <= -reach + 1e-6, -ENDLESS, low - shift), np.where(high >= reach - 1e-6, ENDLESS, high - shift))


def _coated(run: Run, stackup: Stackup, copper: Copper) -> Bools:
    """(n,) True where solder mask covers the trace."""
    last = len(stackup.coppers) - 1
    side = 0 if run.layer == 0 else 1 if run.layer == last else None
    mask = None if side is None else (stackup.mask_top, stackup.mask_bottom)[side]
    if side is None or mask is None:
        return np.zeros(len(run.stations), bool)
    openings = copper.mask_openings[side]
    covered = np.ones(len(run.stations), bool)
    if len(openings):
        which, _ = shapely.STRtree(openings).query(shapely.points(run.stations.at), predicate="within")
        covered[which] = False
    return covered


def _distinct(places: Iterable[Place]) -> list[Shape]:
    """Every section that has to be solved for some places, once."""
    found: dict[Shape, None] = {}
    for place in places:
        found[place.main] = None
        if place.beside:
            found[place.base] = None
            found.update((part, None) for part, _ in place.beside)
    return list(found)


def solve_places(places: list[Place], stackup: Stackup, jobs: int = 1) -> list[Solved]:
    """Impedance (ohm), effective permittivity and estimated relative error of each place; nan where a section has no solution. Every
    distinct section is solved once, by `jobs` processes when there are many."""
    shapes = _distinct(places)
    solved = dict(zip(shapes, _solve_all(shapes, stackup, jobs), strict=True))
    found = []
    for place in places:
        z0, eps, error = solved[place.main]
        if place.beside:
            z_base, eps_base, _ = solved[place.base]
            for part, power in place.beside:
                z0 *= (solved[part][0] / z_base) ** power
                eps *= (solved[part][1] / eps_base) ** power
                error = max(error, solved[part][2])
        found.append((z0, eps, error))
    return found


def _solve_all(shapes: list[Shape], stackup: Stackup, jobs: int) -> list[Solved]:
    if jobs > 1 and len(shapes) > FEWEST * jobs:
        size = max(1, len(shapes) // (8 * jobs))
        chunks = [shapes[i : i + size] for i in range(0, len(shapes), size)]
        with ProcessPoolExecutor(jobs) as pool:
            return [found for part in pool.map(_solve_chunk, chunks, [stackup] * len(chunks)) for found in part]
    return _solve_chunk(shapes, stackup)


def _solve_chunk(shapes: list[Shape], stackup: Stackup) -> list[Solved]:
    return [_solve(shape, stackup) for shape in shapes]


def _solve(shape: Shape, stackup: Stackup) -> Solved:
    try:
        line = solve(section_of(shape, stackup), ACCURACY)
    except SectionError:
        return (float("nan"),) * 3
    return line.z0, line.eps_eff, line.error
