"""Opens and shorts of small boards drawn with one defect each: what is said, of which nets, and at which place (exact unless said)."""

from __future__ import annotations

import pytest

from tests.copper.four_layers import drill
from tests.nets.drawn import fill, nets_of, pad, points, trace, wish

A = trace((2, 5), (18, 5), net="A") + pad(2, 5, "U1.1", "A") + pad(18, 5, "J1.1", "A")
B = trace((2, 9), (18, 9), net="B") + pad(2, 9, "U1.2", "B") + pad(18, 9, "J1.2", "B")


def only_fault(*args, **more):
    faults = nets_of(*args, **more).faults
    assert len(faults) == 1
    return faults[0]


def test_a_board_as_it_should_be_has_no_faults():
    assert nets_of(A + B, wishes=[wish("A")]).faults == ()


def test_two_nets_that_touch_meet_where_they_touch():
    fault = only_fault(A + B + trace((10, 5), (10, 9), net="A"))
    assert (fault.kind, fault.nets, fault.declared, fault.net_tie, fault.layer) == ("short", ("A", "B"), False, False, 0)
    assert fault.at == (pytest.approx(10.0, abs=0.11), pytest.approx(9.0, abs=0.11))
    assert fault.message == "nets A and B are one piece of copper: they meet here"


def test_a_piece_of_no_name_between_two_nets_is_the_place():
    fault = only_fault(A + B + trace((10, 5), (10, 9)))
    assert fault.at == (pytest.approx(10.0), pytest.approx(7.0))


def test_a_stray_pad_that_touches_a_trace_is_a_short_and_an_open():
    stray, short = nets_of(A + B + pad(12, 5.6, net="B"), wishes=[wish("A", "U1.1", "J1.1")]).faults[::-1]
    assert (short.kind, short.nets, short.declared) == ("short", ("A", "B"), True)
    assert short.at == (pytest.approx(12.0, abs=0.51), pytest.approx(5.1, abs=0.01))  # the pad's lower edge on the trace's upper
    assert (stray.kind, stray.nets, stray.declared) == ("open", ("B",), False)


def test_a_via_through_a_plane_without_its_antipad():
    plane = fill(0, 0, 20, 20, net="GND")
    fault = only_fault(A, drill([(10, 5, 0.3)]), inner=(plane, "", ""))
    assert (fault.kind, fault.nets) == ("short", ("A", "GND"))
    assert fault.at == (pytest.approx(10.0), pytest.approx(5.0))


def test_names_of_a_netlist_alone_tell_a_short():
    bare = trace((2, 5), (18, 5)) + trace((2, 9), (18, 9)) + trace((10, 5), (10, 9))
    rows = [("A", "U1", "1", 2, 5, 1), ("A", "J1", "1", 18, 5, 1), ("B", "U1", "2", 2, 9, 1), ("B", "J1", "2", 18, 9, 1)]
    fault = only_fault(bare, netlist=points(*rows))
    assert (fault.kind, fault.nets) == ("short", ("A", "B"))
    assert fault.at == (pytest.approx(10.0, abs=0.11), pytest.approx(7.0, abs=2.1))
    assert nets_of(bare, netlist=points(*rows[:2])).faults == ()


def test_three_nets_on_one_copper_are_two_shorts():
    c = trace((2, 13), (18, 13), net="C")
    faults = nets_of(A + B + c + trace((10, 5), (10, 13), net="A")).faults
    assert [fault.nets for fault in faults] == [("A", "B"), ("A", "C")]


def test_a_part_whose_two_pads_overlap_is_a_net_tie():
    tie = pad(10, 5, "NT1.1", "A") + pad(10.8, 5, "NT1.2", "B") + trace((10.8, 5.2), (10.8, 9), net="B")
    fault = only_fault(A + B + tie)
    assert (fault.kind, fault.nets, fault.net_tie) == ("short", ("A", "B"), True)
    assert fault.message.endswith("at a net tie (one part whose pads of the two nets are one copper)")


def test_a_pad_named_for_two_nets_is_a_net_tie():
    both = "%TO.N,A,B*%\nD11*\nX10000000Y7000000D03*\n%TD*%\n"
    fault = only_fault(A + B + trace((10, 5), (10, 7), net="A") + trace((10, 7), (10, 9), net="B") + both)
    assert (fault.nets, fault.net_tie) == (("A", "B"), True)


def test_a_part_with_three_pins_is_no_net_tie():
    part = pad(10, 5, "Q1.1", "A") + pad(10.8, 5, "Q1.2", "B") + trace((10.8, 5.2), (10.8, 9), net="B") + pad(15, 15, "Q1.3", "C")
    assert only_fault(A + B + part).net_tie is False


def test_a_two_pin_part_with_a_bridge_between_its_pads_is_no_net_tie():
    part = pad(10, 5, "R1.1", "A") + pad(12, 5, "R1.2", "B") + trace((12, 5.2), (12, 9), net="B")
    broken = trace((2, 5), (10, 5), net="A") + pad(2, 5, "U1.1", "A")
    fault = only_fault(broken + B + part + trace((10, 5), (12, 5)))
    assert (fault.nets, fault.net_tie) == (("A", "B"), False)
    assert fault.at == (pytest.approx(11.0), pytest.approx(5.0))


def test_a_join_is_a_part_and_no_short():
    part = pad(10, 5, "R1.1", "A") + pad(12, 5, "R1.2", "B") + trace((12, 5.2), (12, 9), net="B")
    broken = trace((2, 5), (10, 5), net="A") + pad(2, 5, "U1.1", "A")
    assert nets_of(broken + B + part, wishes=[wish("A", "U1.1", "J1.2")], joins=("R1",)).faults == ()


def test_a_broken_trace_is_an_open_in_its_gap():
    top = trace((2, 5), (8, 5), net="A") + trace((8.5, 5), (18, 5), net="A") + pad(2, 5, "U1.1", "A") + pad(18, 5, "J1.1", "A")
    fault = only_fault(top, wishes=[wish("A", "U1.1", "J1.1")])
    assert (fault.kind, fault.nets, fault.declared, fault.layer) == ("open", ("A",), True, 0)
    assert fault.at == (pytest.approx(8.25), pytest.approx(5.0))  # the traces' round ends leave 0.3 mm between 8.1 and 8.4
    assert "it comes nearest to the rest here, 0.300 mm away" in fault.message


def test_a_missing_via_is_an_open():
    inner = (trace((10, 5), (18, 5), net="A") + pad(18, 5, net="A"), "", "")
    top = trace((2, 5), (10, 5), net="A") + pad(2, 5, "U1.1", "A")
    assert nets_of(top, drill([(10, 5, 0.2)]), inner=inner).faults == ()
    fault = only_fault(top, inner=inner)
    assert (fault.kind, fault.nets, fault.declared) == ("open", ("A",), False)


def test_a_blind_hole_of_the_wrong_span_is_an_open():
    inner = ("", trace((10, 5), (18, 5), net="A") + pad(18, 5, "J1.1", "A"), "")
    top = trace((2, 5), (10, 5), net="A") + pad(2, 5, "U1.1", "A")
    assert nets_of(top, drill([(10, 5, 0.2)], first=0, last=2), inner=inner).faults == ()
    assert only_fault(top, drill([(10, 5, 0.2)], first=0, last=1), inner=inner).kind == "open"


def test_a_hole_without_plating_through_a_trace_is_an_open():
    assert only_fault(A, drill([(10, 5, 0.5)], plated=0)).kind == "open"


def test_slivers_of_a_net_without_pins_are_no_open():
    assert nets_of(A + fill(5, 15, 6, 16, net="A")).faults == ()
    assert only_fault(A + pad(5, 15, net="A")).kind == "open"  # a pad is


def test_names_that_mean_no_net_are_neither_open_nor_short():
    assert nets_of(pad(2, 2, "U1.1", "N/C") + pad(5, 5, "U1.2", "N/C")).faults == ()


def test_a_net_renamed_in_the_netlist_is_no_fault():
    rows = [("NET_A", "U1", "1", 2, 5, 1), ("NET_A", "J1", "1", 18, 5, 1), ("NET_B", "U1", "2", 2, 9, 1), ("NET_B", "J1", "2", 18, 9, 1)]
    nets = nets_of(A + B, netlist=points(*rows), wishes=[wish("NET_A")])
    assert nets.faults == ()
    assert [str(pin) for pin in (*nets.declared[0].begin, *nets.declared[0].ends)] == ["J1.1", "U1.1"]


def test_a_netlist_that_splits_the_copper_otherwise_is_a_fault():
    rows = [("B", "U1", "1", 2, 5, 1), ("B", "U1", "2", 2, 9, 1)]
    faults = nets_of(A + B, netlist=points(*rows)).faults
    assert ("short", ("A", "B")) in [(fault.kind, fault.nets) for fault in faults]
    assert all(not fault.declared for fault in faults)


def test_a_netlist_point_on_the_copper_of_another_net_is_told_there():
    rows = [("A", "U1", "1", 2, 5, 1), ("A", "J1", "1", 18, 5, 1), ("B", "U1", "2", 2, 9, 1), ("B", "TP1", "1", 12, 5, 1)]
    faults = nets_of(A + B, netlist=points(*rows)).faults
    (short,) = [fault for fault in faults if fault.kind == "short"]
    assert short.nets == ("A", "B")
    assert short.at == (pytest.approx(12.0), pytest.approx(5.0))


def test_declared_faults_stand_first():
    c = trace((2, 13), (8, 13), net="C") + trace((9, 13), (18, 13), net="C") + pad(2, 13, net="C") + pad(18, 13, net="C")
    faults = nets_of(A + B + trace((10, 5), (10, 9), net="A") + c, wishes=[wish("C")]).faults
    assert [(fault.kind, fault.declared) for fault in faults] == [("open", True), ("short", False)]
