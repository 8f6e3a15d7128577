"""Labels over layers and barrels, against shapely's predicates and a union of each layer (exact)."""

from __future__ import annotations

import networkx
import numpy as np
import pytest
import shapely
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from impcheck.copper.build import rebuild
from impcheck.nets.touching import label_copper, segment_distance
from tests.copper.four_layers import artwork, drill, image
from tests.nets.drawn import HEAD, fill, pad, trace

COORDINATE = st.integers(-30, 30)
SEGMENTS = st.lists(st.tuples(*[COORDINATE] * 8), min_size=1, max_size=30)


@settings(max_examples=100, deadline=None)
@given(SEGMENTS)
def test_distance_of_segments_is_that_of_shapely(rows):
    a0, a1, b0, b1 = np.array(rows, float).reshape(-1, 4, 2).transpose(1, 0, 2)
    truth = shapely.distance(shapely.linestrings(np.stack([a0, a1], 1)), shapely.linestrings(np.stack([b0, b1], 1)))
    assert segment_distance(a0, a1, b0, b1) == pytest.approx(truth, abs=1e-9)


def labels_of(top, *drills, inner=("", "", "")):
    copper = rebuild(artwork(*drills, layers=[image(body, HEAD) for body in (top, *inner)]))
    return label_copper(copper.layers, copper.barrels)


SPOT = st.tuples(st.integers(0, 24), st.integers(0, 24))
OBJECT = st.tuples(st.sampled_from("tpdf"), SPOT, SPOT)
HOLE = st.tuples(SPOT, st.sampled_from(((0, 3), (0, 1), (1, 2), (2, 3))), st.booleans())


@settings(max_examples=60, deadline=None)
@given(st.lists(st.lists(OBJECT, max_size=8), min_size=4, max_size=4), st.lists(HOLE, max_size=6))
def test_labels_equal_the_graph_of_united_layers(layers, holes):
    """Unites each layer, then joins its parts by the drilled discs: nothing of the tiered method is used."""

    def body(kind, one, other):
        (x, y), (u, v) = ((c[0] / 4, c[1] / 4) for c in (one, other))
        if kind == "t":
            return trace((x, y), (u, v))
        return fill(x, y, x + 0.5, y + 0.7) if kind == "f" else pad(x, y, aperture="D11" if kind == "p" else "D12")

    bodies = ["".join(body(*one) for one in layer) for layer in layers]
    drills = []
    for (column, row), (first, last), slot in holes:
        x, y = column / 4, row / 4
        drills.append(drill([(x, y, x + 0.5, y, 0.3) if slot else (x, y, 0.3)], first=first, last=last))
    copper = rebuild(artwork(*drills, layers=[image(one, HEAD) for one in bodies]))
    labels, barrels, count = label_copper(copper.layers, copper.barrels)

    components, home = united(copper, 0.0001)
    assume(len(components) == len(united(copper, 0.0016)[0]))  # else a gap of the tolerance give or take two chord errors
    assert count == len(components)
    for component in components:
        of_pieces = {
            int(labels[layer][piece]) for layer, found in enumerate(home) for piece, part in found.items() if (layer, part) in component
        }
        of_barrels = {int(barrels[number]) for kind, number in component if kind == "barrel"}
        assert len(of_pieces | of_barrels) == 1


def united(copper, reach):
    """Components of the graph of parts of united layers and barrels, all grown by `reach`, and the part each piece belongs to."""
    graph = networkx.Graph()
    graph.add_nodes_from(("barrel", index) for index in range(len(copper.barrels.diameter)))
    home = []
    for index, layer in enumerate(copper.layers):
        parts = shapely.get_parts(shapely.union_all(shapely.buffer(layer.shape, reach))) if len(layer.shape) else np.empty(0, object)
        graph.add_nodes_from((index, part) for part in range(len(parts)))
        inside = shapely.STRtree(parts).query(shapely.point_on_surface(layer.shape), predicate="intersects") if len(parts) else [[], []]
        home.append(dict(zip(*(np.asarray(column).tolist() for column in inside), strict=True)))
        for number in range(len(copper.barrels.diameter)):
            if copper.barrels.first[number] <= index <= copper.barrels.last[number]:
                axis = shapely.MultiPoint([copper.barrels.start[number], copper.barrels.end[number]]).convex_hull
                met = np.flatnonzero(shapely.intersects(parts, axis.buffer(0.15, quad_segs=200)))
                graph.add_edges_from((("barrel", number), (index, part)) for part in met.tolist())
    return list(networkx.connected_components(graph)), home


def count_of(*args, **more):
    return labels_of(*args, **more)[2]


def test_a_barrel_joins_only_the_layers_of_its_span():
    four = {"top": pad(5, 5), "inner": (pad(5, 5),) * 3}
    assert count_of(four["top"], drill([(5, 5, 0.3)]), inner=four["inner"]) == 1
    assert count_of(four["top"], drill([(5, 5, 0.3)], first=0, last=1), inner=four["inner"]) == 3
    back = drill([(5, 5, 0.5)], plated=0, backdrill_from=3, backdrill_keep=1)
    # the back-drilled layers keep what is left of their pads around the drill, each by itself
    assert count_of(four["top"], drill([(5, 5, 0.3)]), back, inner=four["inner"]) == 3


@pytest.mark.parametrize(("gap", "joined"), [(0.0009, True), (0.002, False)])
def test_a_barrel_touches_copper_within_a_micrometre(gap, joined):
    # the pad's edge is at x = 5.5, the disc of 0.15 mm radius ends `gap` beyond it
    assert (count_of(pad(5, 5), drill([(5.5 + 0.15 + gap, 5, 0.3)])) == 1) is joined
    # likewise at a round pad, which goes by another way
    assert (count_of(pad(5, 5, aperture="D12"), drill([(5.3 + 0.15 + gap, 5, 0.3)])) == 1) is joined


def test_a_slot_reaches_along_its_whole_length():
    pads = pad(5, 5, aperture="D12") + pad(8, 5, aperture="D12")
    assert count_of(pads, drill([(5.2, 5, 7.8, 5, 0.3)])) == 1
    assert count_of(pads, drill([(5.2, 5, 0.3)])) == 2
    # a via beside the middle of a long slot is its own
    assert count_of("", drill([(5, 5, 8, 5, 0.5)]), drill([(6.5, 6, 0.3)])) == 2


def test_a_plane_with_antipads_is_not_joined_by_what_passes_through_them():
    plane = fill(0, 0, 20, 20) + "%LPC*%\n" + pad(5, 5) + "%LPD*%\n"
    assert count_of(pad(5, 5), drill([(5, 5, 0.3)]), inner=(plane, "", "")) == 2
    assert count_of(pad(5, 5) + pad(9, 9), drill([(9, 9, 0.3)]), inner=(plane, "", "")) == 2


def test_one_object_cut_in_two_is_two():
    assert count_of(fill(0, 0, 10, 2) + "%LPC*%\n" + fill(4, -1, 5, 3)) == 2


def test_a_board_without_copper():
    assert count_of("") == 0


def test_a_pour_painted_in_diagonal_strokes_is_one_piece_of_copper():
    # 0.2 mm strokes 0.19 mm apart touch; left out one of them, the pour is two; a loose piece is its own
    def hatch(left_out=()):
        return "".join(trace((k * 0.27, 0), (0, k * 0.27)) for k in range(1, 60) if k not in left_out)

    assert count_of(hatch()) == 1
    assert count_of(hatch(left_out=(30,))) == 2
    assert count_of(fill(30, 30, 31, 31) + hatch()) == 2
