"""Declared nets found in the copper: names, ends, places, joins, pairs, openings, and every mistake in one go."""

from __future__ import annotations

from dataclasses import replace

import pytest

from impcheck.artwork.board import NetRequest
from impcheck.errors import InputError
from tests.copper.four_layers import drill
from tests.nets.drawn import CLASS, end, fill, nets_of, pad, points, trace, wish

LINE = trace((2, 5), (18, 5), net="CLK") + pad(2, 5, "U1.7", "CLK") + pad(18, 5, "J1.1", "CLK")
BARE = trace((2, 5), (18, 5)) + pad(2, 5) + pad(18, 5)


def ends_of(net):
    return [str(pin) for pin in (*net.begin, *net.ends)]


def said(*args, **more):
    with pytest.raises(InputError) as refused:
        nets_of(*args, **more)
    return [str(problem) for problem in refused.value.problems]


def test_a_pattern_stands_for_every_name_it_matches_in_natural_order():
    top = "".join(trace((2, k), (18, k), net=f"D{k}") + pad(2, k, f"U1.{k}", f"D{k}") for k in (2, 10, 1))
    nets = nets_of(top, wishes=[wish("D*")])
    assert [net.name for net in nets.declared] == ["D1", "D2", "D10"]


def test_a_name_with_brackets_is_a_name_before_it_is_a_pattern():
    top = trace((2, 2), (9, 2), net="Q[1]") + trace((2, 5), (9, 5), net="Q1")
    assert [net.name for net in nets_of(top, wishes=[wish("Q[1]")]).declared] == ["Q[1]"]


def test_an_exact_entry_wins_over_a_pattern_that_follows():
    wishes = [wish("CLK", "J1.1", "U1.7"), wish("C*", line=6)]
    (net,) = nets_of(LINE, wishes=wishes).declared
    assert net.request.line == 5
    assert ends_of(net) == ["J1.1", "U1.7"]


def test_pins_of_plated_holes_have_no_layer():
    nets = nets_of(LINE, drill([(18, 5, 0.5)]), wishes=[wish("CLK")])
    assert {str(pin): pin.layer for pin in nets.pins} == {"J1.1": None, "U1.7": 0}


def test_a_pin_named_twice_stands_once_with_the_place_of_the_artwork():
    netlist = points(("CLK", "U1", "7", 2.01, 5, 1), ("CLK", "J1", "1", 18, 5, 1), ("CLK", "R9", "1", 10, 5, 1))
    nets = nets_of(LINE, wishes=[wish("CLK")], netlist=netlist)
    assert {str(pin): pin.at for pin in nets.pins} == {"J1.1": (18.0, 5.0), "R9.1": (10.0, 5.0), "U1.7": (2.0, 5.0)}


def test_a_pad_drawn_as_a_region_has_its_pin_in_its_middle():
    top = trace((2, 5), (18, 5), net="CLK") + fill(1, 4, 3, 6, "CLK", "U1.7")
    (pin,) = nets_of(top).pins
    assert pin.at == (pytest.approx(2.0), pytest.approx(5.0))


@pytest.mark.parametrize(("off", "found"), [(0.0005, True), (0.045, True), (0.06, False)])
def test_netlist_points_land_on_copper_near_them(off, found):
    netlist = points(("CLK", "U1", "7", 2, 5.5 + off, 1), ("CLK", "J1", "1", 18, 5, 1))
    nets = nets_of(BARE, netlist=netlist)
    assert [str(pin) for pin in nets.pins] == (["J1.1", "U1.7"] if found else ["J1.1"])
    assert any("1 of 2 netlist points lie on no copper" in remark.text for remark in nets.remarks) is not found


def test_between_two_nets_a_netlist_point_takes_the_nearer():
    top = pad(5, 5) + pad(6.06, 5)  # 60 um apart
    nets = nets_of(top, netlist=points(("A", "U1", "1", 5, 5, 1), ("B", "U1", "2", 6.06, 5, 1), ("B", "TP1", "1", 5.55, 5, 1)))
    assert nets.faults == ()
    assert next(pin for pin in nets.pins if pin.component == "TP1").label == next(pin for pin in nets.pins if pin.number == "2").label


def test_a_netlist_point_belongs_to_its_layer_or_its_barrel():
    inner = (pad(2, 5) + pad(9, 9), "", "")
    rows = (("A", "U1", "1", 2, 5, 1), ("B", "U2", "1", 2, 5, 2), ("C", "VIA", "", 9, 9, 0, 0.3))
    nets = nets_of(pad(2, 5), drill([(9, 9, 0.3)]), inner=inner, netlist=points(*rows))
    assert set(nets.names.values()) == {("A",), ("B",), ("C",)}
    assert [pin.layer for pin in nets.pins] == [0, 1]  # a via is no pin


def test_places_as_ends():
    nets = nets_of(BARE, wishes=[wish("RF", (2, 5), (18, 5))])
    (net,) = nets.declared
    assert (net.name, len(net.labels), ends_of(net)) == ("RF", 1, ["(2, 5)", "(18, 5)"])
    assert nets.name_of(net.labels[0]) == "RF"
    assert nets.faults == ()


def test_a_place_without_a_layer_is_on_the_net_it_is_given_for():
    inner = (fill(0, 0, 20, 20, net="GND"), LINE, "")
    nets = nets_of("", inner=inner, wishes=[wish("CLK", (2, 5), (18, 5))])
    assert [pin.layer for pin in (*nets.declared[0].begin, *nets.declared[0].ends)] == [2, 2]


def test_a_place_without_name_or_layer_is_on_unnamed_copper_first():
    inner = (fill(0, 0, 20, 20, net="GND"), BARE, "")
    nets = nets_of("", inner=inner, wishes=[wish("RF", (2, 5), (18, 5))])
    assert [pin.layer for pin in (*nets.declared[0].begin, *nets.declared[0].ends)] == [2, 2]


def test_ends_without_copper_between_them_are_an_open():
    top = trace((2, 5), (8, 5)) + trace((9, 5), (18, 5))
    (fault,) = nets_of(top, wishes=[wish("RF", (2, 5), (18, 5))]).faults
    assert (fault.kind, fault.nets, fault.declared) == ("open", ("RF",), True)


def test_two_nets_declared_by_ends_on_one_copper_are_a_short():
    top = trace((2, 5), (18, 5)) + trace((2, 8), (18, 8)) + trace((10, 5), (10, 8))
    nets = nets_of(top, wishes=[wish("RF_A", (2, 5), (18, 5)), wish("RF_B", (2, 8), (18, 8))])
    (fault,) = nets.faults
    assert (fault.kind, fault.nets, fault.declared, fault.net_tie) == ("short", ("RF_A", "RF_B"), True, False)
    assert fault.at == (pytest.approx(10.0, abs=0.2), pytest.approx(6.5, abs=1.6))


SERIES = (
    trace((2, 5), (8, 5), net="CLK")
    + pad(2, 5, "U1.7", "CLK")
    + pad(8, 5, "R7.1", "CLK")
    + pad(10, 5, "R7.2", "CLK_R")
    + trace((10, 5), (14, 5), net="CLK_R")
    + pad(14, 5, "C12.1", "CLK_R")
    + pad(16, 5, "C12.2", "CLK_C")
    + trace((16, 5), (22, 5), net="CLK_C")
    + pad(22, 5, "J1.1", "CLK_C")
)


def test_joins_lead_on_one_after_the_other():
    nets = nets_of(SERIES, wishes=[wish("CLK", "U1.7", "J1.1")], joins=("C12", "R7"))
    (net,) = nets.declared
    assert len(net.labels) == 3
    assert [join.component for join in net.joins] == ["R7", "C12"]
    assert nets.faults == ()


def test_pins_of_joins_are_no_ends():
    (net,) = nets_of(SERIES, wishes=[wish("CLK")], joins=("C12", "R7")).declared
    assert ends_of(net) == ["J1.1", "U1.7"]


def test_without_the_join_the_end_lies_on_another_net():
    problems = said(SERIES, wishes=[wish("CLK", "U1.7", "J1.1")], joins=("R7",))
    assert problems == [
        "board.yaml:7: J1.1 is on net 'CLK_C', not on 'CLK' "
        "(give an end on the net's own copper, or name the part between the two under `joins`)"
    ]


def test_a_join_within_one_net_leads_nowhere():
    top = LINE + pad(9, 5, "R7.1", "CLK") + pad(11, 5, "R7.2", "CLK")
    (net,) = nets_of(top, wishes=[wish("CLK", "U1.7", "J1.1")], joins=("R7",)).declared
    assert net.joins == ()
    assert len(net.labels) == 1


def test_only_one_end_given():
    top = LINE + pad(10, 5, "TP1.1", "CLK")
    (begun,) = nets_of(top, wishes=[wish("CLK", begin="U1.7")]).declared
    assert ends_of(begun) == ["U1.7", "J1.1", "TP1.1"]
    (ended,) = nets_of(top, wishes=[wish("CLK", to="TP1.1")]).declared
    assert ends_of(ended) == ["J1.1", "TP1.1"]


def test_pins_of_a_net_shorted_to_this_one_are_not_its_ends():
    top = LINE + pad(10, 5, "C1.1", "GND") + pad(10, 8, "C2.1", "GND") + trace((10, 5), (10, 8), net="GND")
    (net,) = nets_of(top, wishes=[wish("CLK")]).declared
    assert ends_of(net) == ["J1.1", "U1.7"]


def test_a_pair_gives_two_legs():
    top = "".join(
        trace((2, y), (18, y), net=name) + pad(2, y, f"U1.A{k}", name) + pad(18, y, f"J2.{k}", name)
        for k, (name, y) in enumerate((("L_P", 5), ("L_N", 8)), 3)
    )
    request = NetRequest("LANE", "link", (end("U1.A3"), end("U1.A4")), (end("J2.3"), end("J2.4")), ("L_P", "L_N"), 5)
    nets = nets_of(top, wishes=[replace(request, net_class="clock")])
    assert [(net.name, net.pair, net.leg, ends_of(net)) for net in nets.declared] == [
        ("L_P", "LANE", "p", ["U1.A3", "J2.3"]),
        ("L_N", "LANE", "n", ["U1.A4", "J2.4"]),
    ]
    assert [net.net_class for net in nets.declared] == [CLASS, CLASS]


def test_an_opening_drawn_in_strokes_is_one_end():
    painted = "".join(trace((x - 0.4, y), (x + 0.4, y)) for x in (2, 18) for y in (4.7, 4.9, 5.1, 5.3))
    top = trace((2, 5), (18, 5), net="CLK") + pad(2, 5, net="CLK") + pad(18, 5, net="CLK")
    (net,) = nets_of(top, wishes=[wish("CLK")], mask=painted).declared
    assert [pin.at for pin in (*net.begin, *net.ends)] == [
        (pytest.approx(2.0), pytest.approx(5.0, abs=0.01)),
        (pytest.approx(18.0), pytest.approx(5.0, abs=0.01)),
    ]


def test_an_opening_over_a_row_of_pads_is_an_end_of_each_at_the_pad():
    top = "".join(trace((x, 5), (x, 15), net=f"N{k}") + pad(x, 5, net=f"N{k}") for k, x in enumerate((2, 4, 6)))
    nets = nets_of(top, wishes=[wish("N*")], mask=fill(1, 4, 7, 6))
    assert [net.begin[0].at[0] for net in nets.declared] == pytest.approx([2, 4, 6])
    assert all(4.0 < net.begin[0].at[1] < 6.0 for net in nets.declared)


def test_open_vias_are_ends_only_where_nothing_else_is_open():
    top = LINE.replace("%TO.P,U1,7*%\n", "").replace("%TO.P,J1,1*%\n", "")
    mask = pad(2, 5) + pad(18, 5)
    via = drill([(10, 5, 0.2)])
    (net,) = nets_of(top, via, wishes=[wish("CLK")], mask=mask + pad(10, 5)).declared
    assert [pin.at[0] for pin in (*net.begin, *net.ends)] == pytest.approx([2, 18])
    (net,) = nets_of(top, via, wishes=[wish("CLK")], mask=pad(2, 5) + pad(10, 5)).declared
    assert [pin.at[0] for pin in (*net.begin, *net.ends)] == pytest.approx([2, 10])


def test_a_net_without_any_end_is_left_unresolved():
    (net,) = nets_of(trace((2, 5), (18, 5), net="CLK"), wishes=[wish("CLK")]).declared
    assert (net.begin, net.ends) == ((), ())


def test_returns_by_pattern_leave_declared_nets_out():
    top = LINE + fill(0, 10, 20, 20, net="GND") + fill(0, 20.5, 20, 30, net="CAP_GND")
    nets = nets_of(top, wishes=[wish("CLK")], returns=("*",))
    assert nets.return_names == ("CAP_GND", "GND")


def test_returns_by_area_take_every_large_net_but_declared_ones():
    top = LINE + fill(0, 10, 20, 20, net="GND") + fill(0, 20.5, 20, 30, net="V3") + fill(21, 10, 22, 11, net="V1")
    nets = nets_of(top, wishes=[wish("GND")])
    assert nets.return_names == ("V3",)


def test_every_mistake_at_once_with_what_was_meant():
    wishes = [
        wish("CLOCK", line=4),
        wish("CLK", "U1.8", "J2.1"),
        wish("CLK", (2, 5), (18, 9)),
        wish("X*", line=9),
    ]
    problems = said(LINE, wishes=wishes, joins=("R1", "U1"), returns=("GND",))
    assert problems == [
        "board.yaml: join 'R1' is nowhere: no part is called that (there are J1, U1)",
        "board.yaml: join 'U1' has 1 pins (only two-pin parts can be joins)",
        "board.yaml:4: net 'CLOCK' is nowhere in the files (did you mean 'CLK'?)",
        "board.yaml:7: part U1 has no pin '8' (there are 7)",
        "board.yaml:7: pin J2.1 is nowhere: no part is called 'J2' (there are J1, U1)",
        "board.yaml:7: there is no copper at (18, 9) (give a place on the net's copper, in the artwork's own coordinates)",
        "board.yaml:9: net 'X*' is nowhere in the files (there are CLK)",
        "board.yaml: return net 'GND' is nowhere in the files (there are CLK)",
    ]


def test_a_pattern_for_several_nets_cannot_name_one_pin():
    top = LINE + trace((2, 8), (9, 8), net="CLK2")
    (problem,) = said(top, wishes=[wish("CLK*", "U1.7", "J1.1")])
    assert problem == (
        "board.yaml:5: 'CLK*' stands for 2 nets, so from and to cannot name one pin (leave from and to out, or declare the nets one by one)"
    )
