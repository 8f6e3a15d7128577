"""Snapping, leaving out and taking apart change the impedance by less than they claim; the section drawn is the one that was cut."""

import math
import random
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from impcheck.artwork.stackup import CopperItem, Dielectric, Mask, Stackup
from impcheck.fields.cross_section import Shape, place_of, section_of, snapped
from impcheck.fields.profiles import solve_places
from impcheck.fields.section import Conductor, Section, Slab
from impcheck.fields.solver import solve

MASK = Mask(0.02, 3.6)
OUTER, PREPREG = 0.042, Dielectric(0.11, 4.0)
TWO = Stackup((MASK, CopperItem("L1", 0.035, 0.012), Dielectric(1.5, 4.4), CopperItem("L2", 0.035), MASK))
FOUR = Stackup(
    (
        MASK,
        CopperItem("L1", OUTER, 0.012),
        PREPREG,
        CopperItem("L2", 0.017),
        Dielectric(0.5, 4.3, core=True),
        CopperItem("L3", 0.017),
        PREPREG,
        CopperItem("L4", OUTER, 0.012),
        MASK,
    )
)
SIX = Stackup(
    (
        MASK,
        CopperItem("L1", OUTER, 0.012),
        PREPREG,
        CopperItem("L2", 0.017),
        Dielectric(0.2, 4.3, core=True),
        CopperItem("L3", 0.017, 0.005),
        Dielectric(0.25, 4.0),
        CopperItem("L4", 0.017),
        Dielectric(0.2, 4.3, core=True),
        CopperItem("L5", 0.017),
        PREPREG,
        CopperItem("L6", OUTER, 0.012),
        MASK,
    )
)
KINDS = (  # stackup, layer, width, layers of return copper above and below
    (FOUR, 0, 0.19, (), (1, 2)),
    (FOUR, 0, 0.12, (), (1, 2)),
    (SIX, 2, 0.17, (1, 0), (3, 4)),
    (SIX, 0, 0.19, (), (1, 3)),
    (TWO, 0, 1.0, (), (1,)),
    (TWO, 0, 0.5, (), (1,)),
)
REACH = 12.0  # heights: how far the cuts of these tests look


def height(stackup, one, two):
    return stackup.heights[min(one, two)][0] - stackup.heights[max(one, two)][1]


def whole(stackup, layer, other, width):
    reach = width / 2 + REACH * height(stackup, layer, other)
    return (other, ((-reach, reach),))


def holed(stackup, layer, other, width, *openings):
    """A layer of return copper with openings (low, high)."""
    reach = width / 2 + REACH * height(stackup, layer, other)
    found, low = [], -reach
    for a, b in sorted(openings):
        if max(a, -reach) > low:
            found.append((low, a))
        low = max(low, min(b, reach))
    if low < reach:
        found.append((low, reach))
    return (other, tuple(found))


def random_cut(seed):
    """A station's cut: stackup, layer, width, copper beside, layers above, layers below."""
    rng = random.Random(seed)
    stackup, layer, width, above, below = rng.choice(KINDS)
    width *= rng.uniform(0.8, 1.2)
    beside = []
    for sign in (1, -1):
        if rng.random() < 0.4:
            gap = math.exp(rng.uniform(math.log(0.08), 0.0))
            beside.append(tuple(sorted((sign * (width / 2 + gap), sign * (width / 2 + gap + rng.choice([0.15, 0.3, 0.8, 10.0]))))))
    sides = []
    for layers in (above, below):
        side = [whole(stackup, layer, other, width) for other in layers]
        if side and rng.random() < 0.65:
            away = height(stackup, layer, layers[0])
            openings = []
            for _ in range(rng.choice([1, 1, 2])):
                size = away * math.exp(rng.uniform(math.log(0.3), math.log(12.0)))
                middle = rng.uniform(-1, 1) * (width / 2 + 3 * away + size / 2)
                openings.append((middle - size / 2, middle + size / 2))
            side[0] = holed(stackup, layer, layers[0], width, *openings)
        sides.append(side)
    return stackup, layer, width, tuple(sorted(beside)), *sides


def place(cut, factor=1.0):
    stackup, layer, width, beside, above, below = cut
    return place_of(layer, width, beside, above, below, stackup, True, factor)


def as_it_is(cut):
    """The section with every edge where it was cut: planes go on to 30 mm, the first one that is whole closes it."""
    stackup, layer, width, beside, above, below = cut
    planes, closed = [], [-1, -1]
    for side, layers in enumerate((above, below)):
        for other, edges in layers:
            reach = width / 2 + REACH * height(stackup, layer, other)
            if edges == ((-reach, reach),):
                closed[side] = other
                break
            planes.append((other, tuple((-30.0 if a == -reach else a, 30.0 if b == reach else b) for a, b in edges)))
    return section_of(Shape(layer, width, beside, tuple(sorted(planes)), closed[0], closed[1], True), stackup)


def test_what_snapping_costs():
    # what the module claims: about 0.2 % as a rule. The worst are copper beside a trace on a two-layer board right over the edge of its
    # plane, where the two changes do not multiply
    errors = []
    for seed in range(40):
        cut = random_cut(seed)
        (z0, _, _), *_ = solve_places([place(cut)], cut[0])
        errors.append(abs(z0 / solve(as_it_is(cut), 2e-3).z0 - 1))
    assert np.median(errors) < 2e-3
    assert np.quantile(errors, 0.9) < 6e-3
    assert max(errors) < 2e-2


@settings(max_examples=150, deadline=None)
@given(seed=st.integers(0, 10**6))
def test_a_mirror_image_is_the_same_place(seed):
    def flip(edges):
        return tuple((-b, -a) for a, b in reversed(edges))

    stackup, layer, width, beside, above, below = cut = random_cut(seed)
    other = (stackup, layer, width, flip(beside), [(k, flip(e)) for k, e in above], [(k, flip(e)) for k, e in below])
    assert place(cut) == place(other)


@settings(max_examples=100, deadline=None)
@given(value=st.floats(0.01, 10.0), step=st.sampled_from([0.002, 0.02, 0.15]), sign=st.sampled_from([1, -1]))
def test_a_snapped_distance_is_near_and_stays(value, step, sign):
    found = snapped(sign * value, step, 0.001)
    # exact: half a step, relative, or half the least
    assert abs(found - sign * value) <= max(0.51 * step * value, 0.0005 + 1e-12)
    assert snapped(found, step, 0.001) == pytest.approx(found, rel=1e-9)


def test_neighbouring_widths_share_a_section():
    places = {place((FOUR, 0, 0.19 + k * 1e-4, (), [], [whole(FOUR, 0, 1, 0.19)])) for k in range(-4, 5)}
    assert len(places) <= 2  # 0.8 um of width in all


def test_what_is_too_far_to_matter_is_left_out():
    plain = place((FOUR, 0, 0.19, (), [], [whole(FOUR, 0, 1, 0.19)]))
    far = 0.095 + 6 * 0.11
    assert place((FOUR, 0, 0.19, ((far, far + 0.2),), [], [whole(FOUR, 0, 1, 0.19)])) == plain
    assert place((FOUR, 0, 0.19, (), [], [holed(FOUR, 0, 1, 0.19, (far, far + 0.3))])) == plain


def test_what_stands_behind_a_whole_plane_is_left_out():
    cut = [whole(FOUR, 0, 1, 0.19), holed(FOUR, 0, 2, 0.19, (-0.3, 0.3))]
    found = place((FOUR, 0, 0.19, (), [], cut))
    assert found.main.closed_below == 1
    assert found.main.planes == ()


def test_an_opening_under_the_trace_shows_the_next_plane():
    cut = [holed(FOUR, 0, 1, 0.19, (-0.4, 0.4)), whole(FOUR, 0, 2, 0.19)]
    found = place((FOUR, 0, 0.19, (), [], cut))
    assert found.main.closed_below == 2
    ((layer, edges),) = found.main.planes
    assert layer == 1
    assert edges[0][1] == pytest.approx(-0.4, rel=0.08)
    assert edges[1][0] == pytest.approx(0.4, rel=0.08)


def test_impedance_rises_as_an_opening_comes_near():
    # what must hold in any case: copper taken away from 0 V raises the impedance, the more the nearer
    levels = []
    for distance in (None, 2.0, 1.0, 0.5, 0.2, 0.0):
        edge = 0.095 + (distance or 0.0) * 0.11
        plane = whole(FOUR, 0, 1, 0.19) if distance is None else holed(FOUR, 0, 1, 0.19, (edge, edge + 0.3))
        cut = (FOUR, 0, 0.19, (), [], [plane, whole(FOUR, 0, 2, 0.19)])
        levels.append(solve_places([place(cut)], FOUR)[0][0])
    assert all(one <= other + 1e-9 for one, other in pairwise(levels))
    assert levels[-1] > 1.02 * levels[0]


def test_copper_beside_lowers_it():
    plane = [whole(FOUR, 0, 1, 0.19)]
    free, near = solve_places([place((FOUR, 0, 0.19, beside, [], plane)) for beside in ((), ((0.175, 0.5),))], FOUR)
    assert near[0] < free[0]


def test_a_section_without_detail_is_the_plain_line():
    # exact: nothing is snapped where every measure stands on the grid, so the two are one section
    cut = (FOUR, 0, snapped(0.19, 0.002, 0.001), (), [], [whole(FOUR, 0, 1, 0.19)])
    assert solve_places([place(cut)], FOUR)[0][0] == solve(as_it_is(cut), 5e-3).z0


def corners(section):
    return sorted((round(x, 6), round(y, 6)) for x, y in section.conductors[0].outline)


def test_etched_copper_is_wide_where_it_is_bonded():
    # exact: 0.838 mm of board; 12 um narrower in all on the outside of outer copper
    top = section_of(Shape(0, 0.2, (), (), -1, 1, True), FOUR)
    assert corners(top) == [(-0.1, 0.796), (-0.094, 0.838), (0.094, 0.838), (0.1, 0.796)]
    bottom = section_of(Shape(3, 0.2, (), (), 2, -1, True), FOUR)
    assert corners(bottom) == [(-0.1, 0.042), (-0.094, 0.0), (0.094, 0.0), (0.1, 0.042)]
    # L3 of six lies under the core it is bonded to: wide above, 5 um narrower below; L3 is 42 + 110 + 17 + 200 = 369 um below the top of
    # 1022
    inner = section_of(Shape(2, 0.2, (), (), 1, 3, False), SIX)
    assert corners(inner) == [(-0.1, 0.653), (-0.0975, 0.636), (0.0975, 0.636), (0.1, 0.653)]


def test_etching_never_takes_the_far_side_away():
    narrow = section_of(Shape(0, 0.012, (), (), -1, 1, True), FOUR)
    # a tenth of the width is left
    assert corners(narrow)[1][0] == pytest.approx(-0.0006, abs=1e-9)


def test_the_section_ends_at_its_planes():
    strip = section_of(Shape(2, 0.17, (), (), 1, 4, False), SIX)
    low, high = SIX.heights[4][1], SIX.heights[1][0]
    assert strip.planes == (low, high)
    assert (strip.slabs[0].bottom, strip.slabs[-1].top) == (low, high)
    assert strip.coating is None
    assert strip.coating_below is None


@pytest.mark.parametrize(("layer", "coated", "over", "under"), [(0, True, True, False), (0, False, False, False), (3, True, False, True)])
def test_mask_covers_what_it_covers(layer, coated, over, under):
    section = section_of(Shape(layer, 0.2, (), (), 2 if layer == 3 else -1, 1 if layer == 0 else -1, coated), FOUR)
    assert (section.coating is not None, section.coating_below is not None) == (over, under)


def test_mask_lowers_the_impedance_of_a_microstrip():
    # common practice: mask lowers a surface microstrip by one to a few ohm
    z = [solve(section_of(Shape(0, 0.2, (), (), -1, 1, coated), FOUR)).z0 for coated in (False, True)]
    assert 0.5 < z[0] - z[1] < 5.0


def test_what_lies_deep_behind_a_narrow_opening_is_taken_for_whole():
    # L3 lies 0.52 mm behind L2. Behind an opening 0.3 mm wide nothing is seen there, behind one 1 mm wide it is
    for wide, planes in ((0.3, 1), (1.0, 2)):
        cut = [holed(FOUR, 0, layer, 0.19, (-wide / 2, wide / 2)) for layer in (1, 2)]
        assert len(place((FOUR, 0, 0.19, (), [], [*cut, whole(FOUR, 0, 3, 0.19)])).main.planes) == planes


def test_taking_it_for_whole_costs_little():
    # the module's claim: 0.8 % one width behind, less beyond
    edges = ((-30.0, -0.15), (0.15, 30.0))
    short, full = Shape(0, 0.19, (), ((1, edges),), -1, 2, True), Shape(0, 0.19, (), ((1, edges), (2, edges)), -1, 3, True)
    assert solve(section_of(short, FOUR), 2e-3).z0 == pytest.approx(solve(section_of(full, FOUR), 2e-3).z0, rel=5e-3)


def between(*traces, layer=3):
    """A stripline on L3 of six with foreign traces on a layer between it and the planes L2 and L5."""
    planes = ([whole(SIX, 2, 1, 0.17)], [whole(SIX, 2, 4, 0.17)])
    return place_of(2, 0.17, (), *planes, SIX, True, 1.0, ((layer, traces),))


def test_a_foreign_trace_between_the_planes_stands_in_the_section():
    found = between((0.0, 0.15)).main
    ((layer, edges),) = found.planes
    assert layer == 3
    assert (edges if edges[0][1] > 0.1 else ((-edges[0][1], -edges[0][0]),)) == (pytest.approx((0.0, 0.15), abs=0.02),)
    z = [solve_places([p], SIX)[0][0] for p in (between(), between((-0.075, 0.075)), between((-0.3, 0.3)))]
    assert z[0] > z[1] > z[2]
    # the section drawn as it is, nothing snapped
    truth = Shape(2, 0.17, (), ((3, ((-0.075, 0.075),)),), 1, 4, False)
    assert z[1] == pytest.approx(solve(section_of(truth, SIX), 2e-3).z0, rel=5e-3)


def test_its_mirror_image_is_the_same():
    assert between((0.05, 0.2)) == between((-0.2, -0.05))


def test_beyond_a_plane_it_is_not_seen():
    assert between((0.0, 0.15), layer=5) == between()
    assert between((0.0, 0.15), layer=0) == between()


@pytest.mark.parametrize("wide", [0.4, 0.6, 0.8, 0.9, 1.0, 1.5, 2.0, 3.0])
def test_an_opening_of_any_width_under_the_trace(wide):
    # wide against the 0.11 mm to its own plane its edges still matter, for the plane seen through it is 0.64 mm away
    for stackup, layer, width, upper, lower in ((FOUR, 0, 0.19, (), (1, 2)), (SIX, 2, 0.17, (1,), (3, 4))):
        above = [whole(stackup, layer, other, width) for other in upper]
        below = [(lower[0], ((-8.0, -wide / 2), (wide / 2, 8.0))), whole(stackup, layer, lower[1], width)]
        z = solve_places([place((stackup, layer, width, (), above, below))], stackup)[0][0]
        edges = ((-30.0, -wide / 2), (wide / 2, 30.0))
        truth = Shape(layer, width, (), ((lower[0], edges),), 1 if upper else -1, lower[1], True)
        assert z == pytest.approx(solve(section_of(truth, stackup), 2e-3).z0, rel=1e-2)


@pytest.mark.parametrize("opening", [0.6, 0.9, 1.2, 1.6, 2.0])
def test_a_wide_opening_keeps_its_edges(opening):
    """A plane whose opening is wide against the trace's height over it still matters where the next plane is far: the section as profiled
    against the same section given to the solver whole (exact copper, no snapping)."""
    stack = Stackup(
        (
            CopperItem("L1", 0.042),
            Dielectric(0.11, 4.0),
            CopperItem("L2", 0.017),
            Dielectric(1.2, 4.4),
            CopperItem("L3", 0.017),
            Dielectric(0.11, 4.0),
            CopperItem("L4", 0.042),
        )
    )
    (low1, high1), (low2, high2), (_, floor), _ = stack.heights
    halves = ((-5.0, -opening / 2), (opening / 2, 5.0))
    place = place_of(0, 0.18, (), [], [(1, halves), (2, ((-5.0, 5.0),))], stack, False, 1.0)
    copper = [Conductor("s", "signal", ((-0.09, low1), (0.09, low1), (0.09, high1), (-0.09, high1)))]
    copper += [Conductor("g", "return", ((a, low2), (b, low2), (b, high2), (a, high2))) for a, b in halves]
    slabs = tuple(Slab(max(s.bottom, floor), s.top, s.er) for s in stack.slabs if s.top > floor)
    whole = solve(Section(slabs, tuple(copper), (floor,))).z0
    assert solve_places([place], stack)[0][0] == pytest.approx(whole, rel=0.01)
