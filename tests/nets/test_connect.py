"""Connectivity against a union of everything, names, ends, returns, opens and shorts, on small boards written as files."""

from __future__ import annotations

import numpy as np
import pytest
import shapely
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from impcheck.artwork.assemble import read_artwork
from impcheck.artwork.gerber import read_gerber
from impcheck.copper.build import rebuild, rebuild_layer
from impcheck.copper.copper import Barrels
from impcheck.errors import InputError
from impcheck.nets.connect import connect
from impcheck.nets.touching import label_copper
from tests.tiny_board import BOARD, TOP, write

_F, _I = np.empty(0), np.empty(0, np.int32)
NONE = Barrels(np.empty((0, 2)), np.empty((0, 2)), _F, _I, _I, _F, _F, (), _I)


def nets_of(folder, board=BOARD, **files):
    artwork = read_artwork(write(folder, board, **files))
    return connect(artwork, rebuild(artwork))


POINT = st.tuples(st.integers(0, 40), st.integers(0, 40))


@settings(max_examples=60, deadline=None)
@given(st.lists(st.tuples(st.sampled_from("sfr"), POINT, POINT, st.integers(1, 8)), min_size=1, max_size=25))
def test_labels_equal_the_parts_of_the_union(objects):
    """Exact: two pieces share a label where and only where the union of all copper joins them."""
    body = ""
    for kind, (x, y), (u, v), size in objects:
        if kind == "s":
            body += f"D{10 + size}*\nX{x}00000Y{y}00000D02*\nX{u}00000Y{v}00000D01*\n"
        elif kind == "f":
            body += f"D{20 + size}*\nX{x}00000Y{y}00000D03*\n"
        else:
            corners = ((x, y, 2), (x + size, y, 1), (x + size, y + size, 1), (x, y, 1))
            body += "G36*\n" + "".join(f"X{a}00000Y{b}00000D0{c}*\n" for a, b, c in corners) + "G37*\n"
    apertures = "".join(f"%ADD{10 + k}C,0.{k}1*%\n%ADD{20 + k}R,0.{k}1X0.31*%\n" for k in range(1, 9))
    image = read_gerber(f"%FSLAX46Y46*%\n%MOMM*%\n{apertures}G01*\n{body}M02*\n".encode(), "t.gbr")
    layer = rebuild_layer("L1", 0, image)
    (labels,), _, count = label_copper((layer,), NONE)
    parts = shapely.get_parts(shapely.union_all(shapely.buffer(layer.shape, 0.0001)))
    looser = shapely.get_parts(shapely.union_all(shapely.buffer(layer.shape, 0.0016)))
    assume(len(parts) == len(looser))  # else a gap of the tolerance give or take two chord errors
    home = shapely.STRtree(parts).query(shapely.point_on_surface(layer.shape), predicate="intersects")[1]
    assert count == len(parts)
    for part in range(len(parts)):
        assert len(set(labels[home == part].tolist())) == 1


def test_copper_within_a_micrometre_is_joined_and_more_is_not():
    def count(gap):
        body = f"D10*\nX0Y0D03*\nX{round((1 + gap) * 1e6)}Y0D03*\n"
        layer = rebuild_layer("L1", 0, read_gerber(f"%FSLAX46Y46*%\n%MOMM*%\n%ADD10C,1*%\n{body}M02*\n".encode(), "t.gbr"))
        return label_copper((layer,), NONE)[2]

    assert (count(0.0009), count(0.002)) == (1, 2)


def test_names_pins_and_ends_from_attributes(tmp_path):
    nets = nets_of(tmp_path)
    (clk,) = nets.declared
    assert (clk.name, str(clk.begin[0]), str(clk.ends[0])) == ("CLK", "U1.1", "J1.1")
    assert nets.return_names == ("GND",)
    assert nets.faults == ()


NETLIST = """\
P  UNITS CUST 1
P  NNAME1 A_VERY_LONG_NAME_OF_A_CLOCK
327NNAME1           U1    -1          A01X+002000Y+005000X1000Y1000
327NNAME1           J1    -1          A01X+018000Y+005000X1000Y1000
317GND              VIA         D0300PA00X+001000Y+001000X0600Y0600
999
"""
BARE = TOP.replace("%TO.N,CLK*%\n", "").replace("%TO.P,U1,1*%\n", "").replace("%TO.P,J1,1*%\n", "").replace("%TD*%\n", "")


def test_names_from_a_netlist(tmp_path):
    board = BOARD.replace("net: CLK", "net: A_VERY_LONG_NAME_OF_A_CLOCK")
    (clk,) = nets_of(tmp_path, board, top_gbr=BARE, net_ipc=NETLIST).declared
    assert str(clk.ends[0]) == "J1.1"


def test_a_net_known_by_its_declared_ends_only(tmp_path):
    board = BOARD.replace("from: U1.1, to: J1.1", "from: {x: 2mm, y: 5mm, layer: L1}, to: {x: 18mm, y: 5mm}")
    nets = nets_of(tmp_path, board, top_gbr=BARE)
    (clk,) = nets.declared
    assert clk.name == "CLK"
    assert nets.name_of(clk.labels[0]) == "CLK"


def test_ends_left_out_are_the_pins_in_natural_order(tmp_path):
    (clk,) = nets_of(tmp_path, BOARD.replace(", from: U1.1, to: J1.1", "")).declared
    assert [str(pin) for pin in (*clk.begin, *clk.ends)] == ["J1.1", "U1.1"]


MASK = TOP[: TOP.index("%TO.N")].replace("Copper,L1,Top", "Soldermask,Top") + "D11*\nX2000000Y5000000D03*\nX18000000Y5000000D03*\nM02*\n"


def test_without_pins_the_openings_of_the_solder_mask_are_the_ends(tmp_path):
    board = BOARD.replace(", from: U1.1, to: J1.1", "")
    top = TOP.replace("%TO.P,U1,1*%\n", "").replace("%TO.P,J1,1*%\n", "")
    (clk,) = nets_of(tmp_path, board, top_gbr=top, mask_gbr=MASK).declared
    assert [pin.at for pin in (*clk.begin, *clk.ends)] == [pytest.approx((2.0, 5.0)), pytest.approx((18.0, 5.0))]


def test_returns_by_area(tmp_path):
    nets = nets_of(tmp_path, BOARD.replace("returns: [GND]\n", ""))
    assert nets.return_names == ("GND",)
    assert any("cover at least a tenth of the board" in remark.text for remark in nets.remarks)


def test_every_mistake_in_one_go_with_its_remedy(tmp_path):
    board = BOARD.replace("returns: [GND]", "returns: [GMD]").replace("from: U1.1", "from: U2.1").replace("to: J1.1", "to: J1.9")
    with pytest.raises(InputError) as refused:
        nets_of(tmp_path, board)
    said = "\n".join(map(str, refused.value.problems))
    assert "return net 'GMD' is nowhere" in said
    assert "did you mean 'GND'?" in said
    assert "no part is called 'U2'" in said
    assert "part J1 has no pin '9'" in said
    assert len(refused.value.problems) == 3


def test_a_join_leads_on(tmp_path):
    top = TOP.replace(
        "X18000000Y5000000D01*\nD11*",
        "X9000000Y5000000D01*\n%TO.N,CLK_R*%\nX11000000Y5000000D02*\nX18000000Y5000000D01*\nD11*\n%TO.N,CLK*%",
    )
    top = top.replace(
        "%TO.P,J1,1*%", "%TO.P,R1,1*%\nX9000000Y5000000D03*\n%TO.N,CLK_R*%\n%TO.P,R1,2*%\nX11000000Y5000000D03*\n%TO.P,J1,1*%"
    )
    nets = nets_of(tmp_path, BOARD + "joins: [R1]\n", top_gbr=top)
    (clk,) = nets.declared
    assert len(clk.labels) == 2
    assert [join.component for join in clk.joins] == ["R1"]
    assert nets.faults == ()


def test_a_plane_shorted_to_a_net_stays_a_plane(tmp_path):
    drill = "M48\n; #@! TF.FileFunction,Plated,1,2,PTH\nMETRIC\nT1C0.300\n%\nT1\nX10.0Y5.0\nM30\n"
    nets = nets_of(tmp_path, pth_drl=drill)
    (fault,) = nets.faults
    assert (fault.kind, fault.nets, fault.declared) == ("short", ("CLK", "GND"), True)
    assert fault.at == pytest.approx((10.0, 5.0), abs=0.3)
    assert len(nets.returns) == 1
