"""Which file is which: content, attributes, job file, names. Names are habits of layout tools (common practice)."""
# ruff: noqa: E501  the tables below hold whole messages and whole lines of files

from __future__ import annotations

import pytest

from impcheck.artwork.identify import (
    Role,
    Source,
    content_kind,
    function_in,
    number_inner,
    plating_in,
    role_of_function,
    role_of_name,
    span_in,
)

CONTENTS = {
    b"%FSLAX46Y46*%\n%MOMM*%\n": "gerber",
    b"G04 some tool*\nG75*\n": "gerber",
    b"%ASAXBY*%\r%FSLAX23Y23*%": "gerber",
    b"G54D11*\nX0100Y0100D02*\n": "gerber",
    b"%!PS-Adobe\n": "",
    b"M48\nMETRIC\nT1C0.3\n%\nT1\nX1Y1\nM30\n": "excellon",
    b";drill file\r\nM48 ; header\r\n": "excellon",
    b"%\nT1\nX100Y100\nM30\n": "excellon",
    b"T01C0.0150F200S65\nX0100Y0200\nM30\n": "excellon",
    b"; #@! TF.FileFunction,Plated,1,2,PTH\nM48\n": "excellon",
    b"P  JOB eel\nP  UNITS CUST 1\n317GND              VIA   -     D0300PA00X+001000Y+002000X0600Y0000R000S3\n": "netlist",
    b"C  made by hand\n327NET1             U1    -1          A01X+001000Y+002000X0600Y0300R000\n327NET1             U2    -1          A01X+003000Y+002000X0600Y0300R000\n999\n": "netlist",
    b'{"Header": {}, "GeneralSpecs": {}, "FilesAttributes": []}': "job",
    b'{"a": 1}': "",
    b"%PDF-1.4\n": "binary",
    b"PK\x03\x04": "binary",
    b"": "",
    b"Dear fab,\nplease find the files attached. Drill T1 last.\n": "",
    b"Designator,X,Y,Rotation\nU1,10,20,90\n": "",
    b"<html><body>G04 is a command*</body>": "",
}  # fmt: skip


@pytest.mark.parametrize("head", CONTENTS)
def test_content(head):
    assert content_kind(head) == CONTENTS[head]


def test_file_function():
    assert function_in(b"%FSLAX46Y46*%\n%TF.FileFunction,Copper,L1,Top*%\n") == ("Copper", "L1", "Top")
    assert function_in(b"G04 #@! TF.FileFunction,Soldermask,Bot*\n") == ("Soldermask", "Bot")
    assert function_in(b"M48\n; #@! TF.FileFunction,Plated,1,4,PTH\r\n") == ("Plated", "1", "4", "PTH")
    assert function_in(b"G04 the words TF.FileFunction,Copper,L1,Top in a plain comment*\n") == ()
    assert function_in(b"%TF.GenerationSoftware,x*%") == ()


@pytest.mark.parametrize(
    ("function", "part", "layer", "last", "side", "plated"),
    [
        ("Copper,L1,Top,Signal", "copper", 1, None, "top", None), ("Copper,L2,Inr", "copper", 2, None, "", None), ("Copper,L12,Bot", "copper", 12, None, "bottom", None),
        ("Copper", "copper", None, None, "", None), ("Soldermask,Top", "mask", None, None, "top", None), ("Soldermask,Bot,1", "mask", None, None, "bottom", None),
        ("Soldermask,Top,2", "other", None, None, "", None), ("Profile,NP", "outline", None, None, "", None), ("Plated,1,4,PTH", "drill", 1, 4, "", True),
        ("NonPlated,1,4,NPTH,Drill", "drill", 1, 4, "", False), ("Plated,2,3,Buried", "drill", 2, 3, "", True), ("NonPlated,8,5,Blind", "drill", 5, 8, "", False),
        ("Legend,Top", "other", None, None, "", None), ("Paste,Bot", "other", None, None, "", None), ("Drillmap", "other", None, None, "", None),
    ],
)  # fmt: skip
def test_role_of_a_file_function(function, part, layer, last, side, plated):
    role = role_of_function(function.split(","), Source.ATTRIBUTE)
    assert (role.part, role.layer, role.last, role.side, role.plated) == (part, layer, last, side, plated)


NAMES = {
    "copper top": "x.GTL eel-F_Cu.gbr top.gbr eel.cmp copper_top.gbr Gerber_TopLayer.GTL toplayer.ger hellboard.front.gbr eel.top TopLayer.gbr",
    "copper bottom": "x.gbl eel-B_Cu.gbr bottom.gbr eel.sol copper_bottom.gbr eel.bot hellboard.back.gbr",
    "copper inner": "x.g1 x.G2L x.gp1 eel-In1_Cu.gbr inner1.gbr eel_copper_l2.gbr layer3.gbr eel-L4.gbr Gerber_InnerLayer1.G1 InternalPlane1.ger eel.in2 L02.art",
    "mask top": "x.gts eel-F_Mask.gbr eel.stc soldermask_top.gbr eel.smt eel-mask-top.gbr SoldermaskTop.gdo",
    "mask bottom": "x.gbs eel-B_Mask.gbr eel.sts soldermask_bottom.gbr eel.smb eel-mask-bottom.gbr",
    "outline": "x.gko x.gm1 eel-Edge_Cuts.gbr profile.gbr outline.gbr eel.dim eel-edge.gbr board_outline.ger",
    "other": "x.gto x.gtp eel-F_Silkscreen.gbr eel-F_Paste.gbr eel.plc silk_top.gbr assembly-top.gbr drill_map.gbr top_paste.gbr AssemblyTop.gdo Drill_Drawing.gbr",
    "": "readme.txt foo.gbr bom.csv top.pdf laptop.gbr",
}


@pytest.mark.parametrize(("name", "wanted"), [(name, wanted) for wanted, names in NAMES.items() for name in names.split()])
def test_role_of_a_name(name, wanted):
    role = role_of_name(f"out/{name}", "gerber")
    part, _, side = wanted.partition(" ")
    assert (role.part, role.side) == (part, side)


def test_drills_are_known_by_content():
    assert role_of_name("holes.txt", "excellon") == Role("drill", Source.NAME)
    assert role_of_name("top.txt", "") == Role("", Source.NAME)
    assert role_of_name("empty.drl", "") == Role("drill", Source.NAME)


@pytest.mark.parametrize(
    ("name", "plated"),
    [
        ("eel-PTH.drl", True), ("eel-NPTH.drl", False), ("eel_np.xln", False), ("eel.plated-drill.cnc", True), ("eel.unplated-drill.cnc", False),
        ("ThruHolePlated.ncd", True), ("ThruHoleNonPlated.ncd", False), ("Drill_NPTH_Through.DRL", False), ("drill_1_16.xln", None), ("eel.npt.drl", False),
        ("inputs.drl", None), ("vias.drl", True),
    ],
)  # fmt: skip
def test_plating_by_name(name, plated):
    assert plating_in(name) is plated


def test_span_by_name():
    assert span_in("eel-L1-L2.drl", 4) == (1, 2)
    assert span_in("eel_layer2_to_layer3.drl", 4) == (2, 3)
    assert span_in("eel-front-in1.drl", 4) == (1, 2)
    assert span_in("eel-in1-in2.drl", 4) == (2, 3)
    assert span_in("eel-in2-back.drl", 4) == (3, 4)
    assert span_in("eel-via-1-2.drl", 4) == (1, 2)
    for name in ("eel-pth.drl", "eel-2024-11.drl", "eel-1-2.drl", "eel-L3-L9.drl"):
        assert span_in(name, 4) is None


def named(**orders):
    return {name: Role("copper", Source.NAME, side="inner", order=order) for name, order in orders.items()}


def test_numbers_in_names_count_inner_layers_or_all():
    assert number_inner(named(a=(0, 1), b=(0, 2)), [2, 3]) == {"a": 2, "b": 3}  # inner 1 and 2 of four
    assert number_inner(named(a=(0, 2), b=(0, 3)), [2, 3]) == {"a": 2, "b": 3}  # layers 2 and 3 of four
    assert number_inner(named(a=(3, 3), b=(3, 10), c=(3, 2)), [2, 3, 4]) == {"c": 2, "a": 3, "b": 4}
    assert number_inner(named(a=(3, 2)), [2, 3]) == {"a": 2}
    assert number_inner(named(a=(3, 1)), [2, 3]) == {}
    assert number_inner(named(a=(0, 1), b=(1, 1)), [2, 3]) == {}  # signals and planes numbered apart: their order is not said
    assert number_inner({}, [2]) == {}
