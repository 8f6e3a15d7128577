"""Walks every declared net. In: artwork, copper, nets; out: one walk for each declared net with runs and stations, in mm."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from impcheck.artwork.parts import Artwork
from impcheck.copper.copper import Copper
from impcheck.nets.nets import DeclaredNet, Nets
from impcheck.path.branches import find_branches
from impcheck.path.graph import Graph, build_graph
from impcheck.path.part import LegFacts
from impcheck.path.route import Leg, Route, cut_route, find_route
from impcheck.path.stations import Measure
from impcheck.path.walk import Branch, Run, Stations, Walk, Zone

MIN_LEG = 1e-4  # mm


def walk_nets(artwork: Artwork, copper: Copper, nets: Nets) -> tuple[Walk, ...]:
    """One walk for each of `nets.declared`, in the same order. A net that is one piece with a return net has no path of its own."""
    shorted = [set(net.labels) & nets.returns for net in nets.declared]
    if any(shorted):
        rest = tuple(net for net, found in zip(nets.declared, shorted, strict=True) if not found)
        walked = iter(walk_nets(artwork, copper, replace(nets, declared=rest)))
        return tuple(_shorted(net, nets, min(found)) if found else next(walked) for net, found in zip(nets.declared, shorted, strict=True))
    if not nets.declared:
        return ()
    graph = build_graph(copper, nets)
    routes = [find_route(graph, net) for net in nets.declared]
    branches: list[list[Branch]] = []
    legs: list[Leg] = []
    facts: list[LegFacts] = []
    leaving: dict[int, list[tuple[float, float, float]]] = {}
    spans = []
    stay = 0
    for index, (net, route) in enumerate(zip(nets.declared, routes, strict=True)):
        found, hanging = find_branches(graph, route, copper, nets)
        branches.append(found)
        cut_route(graph, net, route, hanging)
        route.legs[:] = [leg for leg in route.legs if np.hypot(*np.diff(leg.line, axis=0).T).sum() > MIN_LEG]
        spans.append((len(legs), len(legs) + len(route.legs)))
        numbers = _stays(graph, route)
        for leg, number in zip(route.legs, numbers, strict=True):
            legs.append(leg)
            facts.append(
                LegFacts(
                    graph.group[index],
                    stay + number,
                    _open_ends(graph, route, leg),
                    (_barrel(graph, leg.nodes[0]), _barrel(graph, leg.nodes[1])),
                )
            )
        stay += max(numbers, default=-1) + 1
        leaving.update(_leaving(graph, route, hanging))
    stations = Measure(copper, nets, artwork.stackup, graph.owner, graph.pads).all(legs, facts, leaving)
    walks = []
    for index, net in enumerate(nets.declared):
        first, last = spans[index]
        walks.append(_walk(net, routes[index], legs[first:last], stations[first:last], branches[index]))
    return tuple(walks)


def _shorted(net: DeclaredNet, nets: Nets, label: int) -> Walk:
    other = next((name for name in nets.names.get(label, ()) if name != net.name), "a return net")
    return Walk(
        net, "unresolved", f"its copper is one piece with {other}, a return net, so it has no path of its own", (), (), (), (), None, ()
    )


def _walk(net: DeclaredNet, route: Route, legs: list[Leg], stations: list[Stations], branches: list[Branch]) -> Walk:
    runs = tuple(Run(leg.layer, leg.line, (leg.along, float(found.end[-1])), found) for leg, found in zip(legs, stations, strict=True))
    status, reason = route.status, route.reason
    if status == "walked" and (not runs or all((run.stations.zone == Zone.PAD).all() for run in runs)):
        status, reason = "unresolved", f"the copper between {route.begin} and {', '.join(map(str, route.ends))} has no centreline to follow"
    return Walk(net, status, reason, runs, tuple(route.vias), tuple(branches), tuple(route.bridges), route.begin, tuple(route.ends))


def _stays(graph: Graph, route: Route) -> list[int]:
    """Numbers the legs so that those that meet on one layer share a number."""
    number = list(range(len(route.legs)))
    for index, leg in enumerate(route.legs):
        for other in range(index):
            before = route.legs[other]
            if before.layer == leg.layer and set(before.nodes) & set(leg.nodes):
                old, new = number[index], number[other]
                number = [new if n == old else n for n in number]
    return number


def _open_ends(graph: Graph, route: Route, leg: Leg) -> tuple[bool, bool]:
    """True at an end of the walk where no pad is known."""
    followed = {before for before, _ in route.parent.values()}
    first, last = leg.nodes
    return first not in route.parent and first not in graph.pads_at, last not in followed and last not in graph.pads_at


def _barrel(graph: Graph, node: int) -> int:
    return next((graph.pads.barrel[pad] for pad in graph.pads_at.get(node, []) if graph.pads.barrel[pad] >= 0), -1)


def _leaving(graph: Graph, route: Route, hanging: set[int]) -> dict[int, list[tuple[float, float, float]]]:
    """Node -> heading and width of every strand there, at nodes of the path where copper branches off."""
    noded = graph.noded
    found: dict[int, list[tuple[float, float, float]]] = {}
    for node in route.along:
        strands = [
            (other, edge) for other, edge in graph.neighbours.get(node, ()) if edge >= 0 and (other in route.along or other in hanging)
        ]
        if len(strands) < 3 or graph.pads_at.get(node):
            continue
        headings = []
        for other, edge in strands:
            vector = noded.place[other] - noded.place[node]
            size = float(np.hypot(*vector))
            headings.append((float(vector[0] / size), float(vector[1] / size), float(noded.width[edge])))
        found[node] = headings
    return found
