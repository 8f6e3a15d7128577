"""The artwork of whole boards: what each file is taken for, what is guessed and said, and what is refused, all in one go."""
# ruff: noqa: E501  the tables below hold whole messages and whole lines of files

from __future__ import annotations

import json
import re
import zipfile
from pathlib import Path

import pytest

from impcheck.artwork.assemble import read_artwork
from impcheck.artwork.limits import Limits
from impcheck.errors import InputError, RemarkKind
from tests import open_data
from tests.tiny_board import BOARD, BOTTOM, DRILL, OUTLINE, TOP

STACKUP = """\
stackup:
  - {mask: 20um, er: 3.6}
  - {copper: L1, thickness: 35um}
  - {dielectric: 200um, er: 4.2}
  - {copper: L2, thickness: 17um}
  - {dielectric: 1mm, er: 4.5, name: core}
  - {copper: L3, thickness: 17um}
  - {dielectric: 200um, er: 4.2}
  - {copper: L4, thickness: 35um}
"""
FOUR = "impcheck: 1\nfiles: fab\n" + STACKUP + "nets: [{net: CLK, class: c}]\nclasses: {c: {impedance: 50 ohm}}\n"


def copper(number, side, function=True):
    """A plane of one square, its net named after the layer."""
    head = f"%TF.FileFunction,Copper,L{number},{side}*%\n" if function else ""
    return f"%FSLAX46Y46*%\n%MOMM*%\n{head}%TO.N,NET{number}*%\nG36*\nX0Y0D02*\nG01*\nX9000000Y0D01*\nX9000000Y9000000D01*\nX0Y9000000D01*\nX0Y0D01*\nG37*\nM02*\n"


def flash(function="", at=(1, 1)):
    return f"%FSLAX46Y46*%\n%MOMM*%\n{function}%ADD10C,0.6*%\nD10*\nX{at[0]}000000Y{at[1]}000000D03*\nM02*\n"


def drill(function="", at="X1.0Y1.0"):
    return f"M48\n{function}METRIC\nT1C0.300\n%\nT1\n{at}\nM30\n"


def plain(text):
    """The same without attributes."""
    return re.sub(r"%T[FOD].*?\*%\n|; #@!.*\n", "", text)


def four(**names):
    sides = ["Top", "Inr", "Inr", "Bot"]
    files = {f"c{number}.gbr": copper(number, side) for number, side in enumerate(sides, 1)}
    files |= {
        "edge.gbr": OUTLINE,
        "mask-top.gbr": flash("%TF.FileFunction,Soldermask,Top*%\n"),
        "pth.drl": drill("; #@! TF.FileFunction,Plated,1,4,PTH\n"),
    }
    return files | {name.replace("__", "-").replace("_", "."): text for name, text in names.items()}


def made(folder: Path, files, board=FOUR):
    (folder / "fab").mkdir()
    for name, text in files.items():
        if text is not None:
            path = folder / "fab" / name
            path.parent.mkdir(exist_ok=True)
            path.write_bytes(text if isinstance(text, bytes) else text.encode())
    (folder / "board.yaml").write_text(board)
    return folder / "board.yaml"


def read(folder, files, board=FOUR):
    return read_artwork(made(folder, files, board))


def refused(folder, files, board=FOUR, limits=None):
    with pytest.raises(InputError) as error:
        read_artwork(made(folder, files, board), limits or Limits())
    return [str(problem) for problem in error.value.problems]


def said(artwork, kind):
    return [str(remark) for remark in artwork.remarks if remark.kind is kind]


def test_files_that_say_what_they_are(tmp_path):
    told = []
    artwork = read_artwork(made(tmp_path, four()), progress=told.append)
    assert artwork.names == ("L1", "L2", "L3", "L4")
    assert [layer.file for layer in artwork.layers] == ["c1.gbr", "c2.gbr", "c3.gbr", "c4.gbr"]
    assert [layer.nets for layer in artwork.layers] == [(("NET1",),), (("NET2",),), (("NET3",),), (("NET4",),)]
    assert (artwork.mask_top.file, artwork.mask_bottom, artwork.outline.file, artwork.netlist) == ("mask-top.gbr", None, "edge.gbr", None)
    (holes,) = artwork.drills
    assert (holes.first, holes.last, holes.holes.plated.tolist(), holes.holes.start.tolist()) == (0, 3, [1], [[1.0, 1.0]])
    assert said(artwork, RemarkKind.GUESS) == said(artwork, RemarkKind.DISAGREEMENT) == []
    assert "reading c1.gbr" in told


def test_a_zip_with_a_folder_in_it(tmp_path):
    board = made(tmp_path, {}, FOUR.replace("files: fab", "files: fab.zip"))
    with zipfile.ZipFile(tmp_path / "fab.zip", "w") as archive:
        for name, text in four().items():
            archive.writestr(f"out/{name}", text)
    assert [layer.file for layer in read_artwork(board).layers] == ["out/c1.gbr", "out/c2.gbr", "out/c3.gbr", "out/c4.gbr"]


def test_files_beside_the_board_file(tmp_path):
    for name, text in four().items():
        (tmp_path / name).write_text(text)
    (tmp_path / "old").mkdir()
    (tmp_path / "old" / "c1.gbr").write_text(copper(1, "Top"))
    (tmp_path / "board.yaml").write_text(FOUR.replace("files: fab\n", ""))
    assert len(read_artwork(tmp_path / "board.yaml").layers) == 4


@pytest.mark.parametrize(
    "names",
    [
        "x.GTL x.G1 x.G2 x.GBL", "x.GTL x.G2L x.G3L x.GBL", "x-F_Cu.gbr x-In1_Cu.gbr x-In2_Cu.gbr x-B_Cu.gbr", "L1.gbr L2.gbr L3.gbr L4.gbr",
        "x_copper_l1.gbr x_copper_l2.gbr x_copper_l3.gbr x_copper_l4.gbr", "top.gbr inner1.gbr inner2.gbr bottom.gbr", "top.gbr layer2.gbr layer3.gbr bottom.gbr",
        "x.top x.in1 x.in2 x.bot", "x.gtl x.gp1 x.gp2 x.gbl",
    ],
)  # fmt: skip
def test_names_are_guesses_that_are_said(tmp_path, names):
    files = {name: plain(copper(number, "")) for number, name in enumerate(names.split(), 1)}
    artwork = read(tmp_path, files | {"x.gko": plain(OUTLINE), "x.gts": flash(), "readme.txt": "hello", "x.gto": "broken silk"})
    assert [layer.file for layer in artwork.layers] == names.split()
    assert (artwork.mask_top.file, artwork.outline.file) == ("x.gts", "x.gko")
    guesses = said(artwork, RemarkKind.GUESS)
    assert len(guesses) == 6
    assert f"{names.split()[1]}: taken for copper layer L2 by its name" in guesses


def test_signal_and_plane_files_numbered_apart_are_not_guessed(tmp_path):
    files = {name: plain(copper(1, "")) for name in ("x.gtl", "x.g1", "x.gp1", "x.gbl")}
    found = refused(tmp_path, files)
    assert len(found) == 2
    assert found[0].startswith("board.yaml:7: copper layer L2 of the stackup has no file")


def test_the_board_file_wins_and_the_user_is_told(tmp_path):
    board = FOUR.replace("copper: L2,", "copper: L2, file: c3.gbr,").replace("copper: L3,", "copper: L3, file: c2.gbr,")
    artwork = read(tmp_path, four(), board)
    assert [layer.file for layer in artwork.layers] == ["c1.gbr", "c3.gbr", "c2.gbr", "c4.gbr"]
    assert said(artwork, RemarkKind.DISAGREEMENT) == [
        "c3.gbr: the board file calls this copper layer L2, its file attribute copper layer 3; the board file was followed",
        "c2.gbr: the board file calls this copper layer L3, its file attribute copper layer 2; the board file was followed",
    ]


def job(functions, stackup=None, negative=()):
    entries = [
        {"Path": path, "FileFunction": use, "FilePolarity": "Negative" if path in negative else "Positive"}
        for path, use in functions.items()
    ]
    return json.dumps({"Header": {}, "GeneralSpecs": {"LayerNumber": 4}, "FilesAttributes": entries, "MaterialStackup": stackup or []})


MATERIALS = [
    {"Type": "Copper", "Thickness": 0.035, "Name": "L1"}, {"Type": "Dielectric", "Thickness": 0.2, "DielectricConstant": 4.2, "LossTangent": 0.02, "Name": "p"},
    {"Type": "Copper", "Thickness": 0.017, "Name": "L2"}, {"Type": "Dielectric", "Thickness": 1.0, "DielectricConstant": 4.5, "LossTangent": 0.02, "Name": "c"},
    {"Type": "Copper", "Thickness": 0.017, "Name": "L3"}, {"Type": "Dielectric", "Thickness": 0.2, "DielectricConstant": 4.2, "LossTangent": 0.02, "Name": "p"},
    {"Type": "Copper", "Thickness": 0.035, "Name": "L4"},
]  # fmt: skip
FUNCTIONS = {
    "a.gbr": "Copper,L1,Top",
    "b.gbr": "Copper,L2,Inr",
    "c.gbr": "Copper,L3,Inr",
    "d.gbr": "Copper,L4,Bot",
    "e.gbr": "Profile,NP",
    "f.drl": "Plated,1,4,PTH",
}


def test_the_job_file_tells_what_files_are(tmp_path):
    files = {name: plain(copper(1, "")) for name in ("a.gbr", "b.gbr", "c.gbr", "d.gbr")} | {"e.gbr": plain(OUTLINE), "f.drl": drill()}
    artwork = read(tmp_path, files | {"x.gbrjob": job(FUNCTIONS | {"gone.gbr": "Copper,L4,Bot"}, negative=("b.gbr",))})
    assert [layer.file for layer in artwork.layers] == ["a.gbr", "b.gbr", "c.gbr", "d.gbr"]
    assert [layer.negative for layer in artwork.layers] == [False, True, False, False]
    assert (artwork.outline.file, artwork.drills[0].holes.plated.tolist()) == ("e.gbr", [1])
    assert said(artwork, RemarkKind.GUESS) == []
    assert "x.gbrjob: the job file lists 'gone.gbr', which is not there" in said(artwork, RemarkKind.ODD)


def test_an_attribute_is_stronger_than_the_job_file(tmp_path):
    swapped = {"c2.gbr": "Copper,L3,Inr", "c3.gbr": "Copper,L2,Inr"}
    artwork = read(tmp_path, four(x_gbrjob=job(swapped)))
    assert [layer.file for layer in artwork.layers] == ["c1.gbr", "c2.gbr", "c3.gbr", "c4.gbr"]
    text = "c2.gbr: the job file calls this copper layer 3, its file attribute copper layer 2; the attribute was followed"
    assert text in said(artwork, RemarkKind.DISAGREEMENT)


def test_the_stackup_of_the_job_file(tmp_path):
    board = FOUR.replace(STACKUP, "").replace("50 ohm}", "50 ohm, width: {L2: 0.2mm}}")
    artwork = read(tmp_path, four(x_gbrjob=job({}, MATERIALS)), board)
    assert [round(item.thickness, 6) for item in artwork.stackup.items] == [0.035, 0.2, 0.017, 1.0, 0.017, 0.2, 0.035]
    assert any("the stackup is the job file's" in text for text in said(artwork, RemarkKind.GUESS))


def test_layer_names_are_checked_against_the_job_files_stackup_too(tmp_path):
    board = FOUR.replace(STACKUP, "").replace("50 ohm}", "50 ohm, width: {L7: 0.2mm}}")
    found = refused(tmp_path, four(x_gbrjob=job({}, MATERIALS)), board)
    assert found == ["board.yaml:4: 'L7' is no copper layer of the stackup (there are L1, L2, L3, L4)"]


def test_a_job_file_that_disagrees_on_the_stackup(tmp_path):
    thinner = [*MATERIALS[:3], MATERIALS[3] | {"Thickness": 0.8}, *MATERIALS[4:]]
    artwork = read(tmp_path, four(x_gbrjob=job({}, thinner)))
    assert artwork.stackup.items[4].thickness == 1.0
    text = "the job file's stackup differs from the board file's: between L2 and L3 there are 800 um of dielectric, not 1000 um; the board file was followed"
    assert said(artwork, RemarkKind.DISAGREEMENT) == [f"board.yaml:3: {text}"]


def test_no_stackup_anywhere(tmp_path):
    board = FOUR.replace(STACKUP, "")
    found = refused(tmp_path, four(), board)
    assert found == ["board.yaml:1: there is no stackup (write `stackup:` with every layer top to bottom, as the fab house quoted it)"]


def test_a_stackup_of_the_job_file_with_something_missing(tmp_path):
    partial = [*MATERIALS[:1], {"Type": "Dielectric", "Thickness": 0.2, "Name": "p"}, *MATERIALS[2:]]
    (found,) = refused(tmp_path, four(x_gbrjob=job({}, partial)), FOUR.replace(STACKUP, ""))
    assert "there is no stackup, and the job file's cannot be used: " in found
    assert "`stackup:`" in found


DRILL_BOARDS = {
    "X2 blind": ("blind.drl", drill("; #@! TF.FileFunction,Plated,1,2,Blind\n"), "", (0, 1, 1, None, None), 0),
    "X2 not plated": ("h.drl", drill("; #@! TF.FileFunction,NonPlated,1,4,NPTH\n"), "", (0, 3, 0, None, None), 0),
    "X2 back-drill": ("h.drl", drill("; #@! TF.FileFunction,NonPlated,3,4,Blind\n"), "", (2, 3, 0, 3, 1), 1),
    "X2 back-drill from above": ("h.drl", drill("; #@! TF.FileFunction,NonPlated,1,2,Blind\n"), "", (0, 1, 0, 0, 2), 1),
    "board file": ("h.drl", drill(), "{file: h.drl, plated: true, layers: [L3, L2]}", (1, 2, 1, None, None), 0),
    "board file, back-drill": ("h.drl", drill(), "{file: h.drl, backdrill: {from: L4, keep: L2}}", (2, 3, 0, 3, 1), 0),
    "board file, back-drill from above": ("h.drl", drill(), "{file: h.drl, backdrill: {from: L1, keep: L3}}", (0, 1, 0, 0, 2), 0),
    "board file over a file that needs no more": ("h.drl", drill("; #@! TF.FileFunction,Plated,1,2,Blind\n"), "{file: h.drl}", (0, 1, 1, None, None), 0),
    "name": ("x-NPTH.drl", drill(), "", (0, 3, 0, None, None), 1),
    "name with a span": ("x-L1-L2-pth.drl", drill(), "", (0, 1, 1, None, None), 2),
    "pads": ("h.drl", drill(), "", (0, 3, 1, None, None), 1),
    "no pads": ("h.drl", drill(at="X5.0Y5.0"), "", (0, 3, 0, None, None), 1),
    "net names": ("h.drl", drill(at="X5.0Y5.0").replace("T1\nX", "T1\n; #@! TO.N,GND\nX"), "", (0, 3, 1, None, None), 1),
    "Gerber": ("h.gbr", flash("%TF.FileFunction,Plated,2,3,Buried*%\n"), "", (1, 2, 1, None, None), 0),
}  # fmt: skip


@pytest.mark.parametrize("name", DRILL_BOARDS)
def test_drills(tmp_path, name):
    file, text, entry, wanted, guesses = DRILL_BOARDS[name]
    pads = copper(1, "Top").replace("M02*", "%ADD10C,0.6*%\nD10*\nX1000000Y1000000D03*\nM02*")
    board = FOUR + (f"drills: [{entry}]\n" if entry else "")
    artwork = read(tmp_path, four(c1_gbr=pads) | {file: text}, board)
    (found,) = [found for found in artwork.drills if found.holes.file == file]
    plated = found.holes.plated.tolist()
    assert (found.first, found.last, plated[0], found.backdrill_from, found.backdrill_keep) == wanted
    assert len(said(artwork, RemarkKind.GUESS)) == guesses, said(artwork, RemarkKind.GUESS)


def test_the_only_drill_file_is_plated(tmp_path):
    artwork = read(tmp_path, four(pth_drl=None) | {"holes.txt": drill(at="X5.0Y5.0")})
    assert artwork.drills[0].holes.plated.tolist() == [1]
    assert said(artwork, RemarkKind.GUESS) == ["holes.txt: as the only drill file its holes are taken for plated"]


def test_a_board_file_that_disagrees_on_drills(tmp_path):
    artwork = read(tmp_path, four(), FOUR + "drills: [{file: pth.drl, plated: false, layers: [L1, L2]}]\n")
    (found,) = artwork.drills
    assert (found.first, found.last, found.holes.plated.tolist()) == (0, 1, [0])
    assert len(said(artwork, RemarkKind.DISAGREEMENT)) == 2


def test_the_same_holes_in_two_formats_count_once(tmp_path):
    artwork = read(tmp_path, four(pth__drl_gbr=flash("%TF.FileFunction,Plated,1,4,PTH*%\n")))
    assert [found.holes.file for found in artwork.drills] == ["pth.drl"]
    assert "pth-drl.gbr: the same holes as an Excellon file by its file attribute; left out" in said(artwork, RemarkKind.ODD)


NETLIST = (
    "P  JOB eel\nP  UNITS CUST 1\n"
    "327CLK              U1    -1          A01X+001000Y+002000X0600Y0300R000S2\n"
    "327CLK              J1    -1          A01X+003000Y+002000X0600Y0300R000S2\n999\n"
)


def test_a_netlist_is_found_by_content_in_the_package_or_beside_the_board_file(tmp_path):
    for folder in "abc":
        (tmp_path / folder).mkdir()
    assert read(tmp_path / "a", four() | {"points.txt": NETLIST}).netlist.net == ("CLK", "CLK")
    board = FOUR + "netlist: eel.ipc\n"
    (tmp_path / "b" / "eel.ipc").write_text(NETLIST)
    assert read(tmp_path / "b", four(), board).netlist.file == "eel.ipc"
    assert read(tmp_path / "c", four() | {"eel.ipc": NETLIST, "old.ipc": NETLIST}, board).netlist.file == "eel.ipc"


def test_files_that_are_not_part_of_the_copper_are_not_read(tmp_path):
    files = four() | {
        "silk.gbr": "%TF.FileFunction,Legend,Top*%\nbroken",
        "fab.pdf": b"%PDF-1.4",
        "place.csv": "a,b",
        "x.gtp": "%FSLAX46Y46*%broken",
    }
    artwork = read(tmp_path, files)
    assert artwork.remarks == read_artwork(tmp_path / "board.yaml").remarks
    assert not [text for text in map(str, artwork.remarks) if "silk" in text or "x.gtp" in text]


def test_gerber_files_of_unknown_use_are_told(tmp_path):
    artwork = read(tmp_path, four() | {"what.gbr": plain(copper(1, "")), "inner7.gbr": plain(copper(1, ""))})
    odd = said(artwork, RemarkKind.ODD)
    assert "what.gbr: neither an attribute nor its name says what this Gerber file is; left out" in odd
    assert "inner7.gbr: looks like copper by its name and has no place in the stackup; left out" in odd


SPOILT = {
    "layer without a file": ({"c3.gbr": None}, FOUR, "board.yaml:9: copper layer L3 of the stackup has no file (put its Gerber file into 'fab', or write `file:` in its line)"),
    "layer without a file, candidates": (
        {"c3.gbr": plain(copper(3, ""))}, FOUR,
        "board.yaml:9: copper layer L3 of the stackup has no file (write `file:` in its line; not known is what c3.gbr is)",
    ),
    "two claim one layer": (
        {"c3.gbr": copper(2, "Inr")}, FOUR,
        "c3.gbr: its file attribute says it is copper layer L2, and so says that of c2.gbr (write the right one as `file:` at L2 in the stackup of board.yaml)",
    ),
    "copper beyond the stackup": (
        {"c5.gbr": copper(5, "Inr")}, FOUR,
        "c5.gbr: its file attribute says it is copper layer 5, and the stackup has 4 copper layers (add the layer to the stackup, or take the file out)",
    ),
    "drill beyond the stackup": (
        {"pth.drl": drill("; #@! TF.FileFunction,Plated,1,6,PTH\n")}, FOUR,
        "pth.drl: its file attribute says its holes reach copper layer 6, and the stackup has 4 copper layers (correct the stackup, or name the layers under `drills:`)",
    ),
    "file not there": ({}, FOUR.replace("copper: L2,", "copper: L2, file: c22.gbr,"), "board.yaml:7: there is no file 'c22.gbr' in 'fab' (did you mean 'c2.gbr'?)"),
    "one file, two parts": (
        {}, FOUR.replace("copper: L2,", "copper: L2, file: c2.gbr,") + "outline: C2.GBR\n",
        "board.yaml:14: file 'C2.GBR' is given to copper layer L2 and to the outline (give each part of the board its own file)",
    ),
    "no outline": ({}, FOUR + "outline: egde.gbr\n", "board.yaml:14: there is no file 'egde.gbr' in 'fab' (did you mean 'edge.gbr'?)"),
    "no drill": ({}, FOUR + "drills: [{file: npth.drl}]\n", "board.yaml:14: there is no file 'npth.drl' in 'fab' (did you mean 'pth.drl'?)"),
    "no netlist": ({}, FOUR + "netlist: x.ipc\n", "board.yaml:14: there is no file 'x.ipc' in 'fab' or beside the board file (there are"),
    "two netlists": ({"a.ipc": NETLIST, "b.ipc": NETLIST}, FOUR, "b.ipc: there is another netlist, a.ipc (write the right one as `netlist:` in board.yaml)"),
    "two outlines": ({"edge2.gbr": OUTLINE}, FOUR, "edge2.gbr: its file attribute says it is the board's outline, and so says that of edge.gbr (write `outline:` in board.yaml)"),
    "no files": ({}, FOUR.replace("files: fab", "files: fba"), "board.yaml:2: there is no folder or archive 'fba' (did you mean 'fab'?)"),
    "files is no archive": ({}, FOUR.replace("files: fab", "files: board.yaml"), "board.yaml: this is no zip archive: File is not a zip file (only folders and .zip are read; unpack other archives)"),
    "empty drill file": ({"npth.drl": ""}, FOUR, "npth.drl: "),
    "back-drills of unknown depth": (
        {"x-backdrill.drl": drill()}, FOUR,
        "x-backdrill.drl: by its name it holds back-drills, and nothing says from where and how deep (write `- {file: x-backdrill.drl, backdrill: {from: ..., keep: ...}}`",
    ),
    "two job files": ({"a.gbrjob": job({}), "b.gbrjob": job({})}, FOUR, "b.gbrjob: there is another job file, a.gbrjob (keep one of them)"),
    "broken job file": ({"a.gbrjob": "{"}, FOUR, "a.gbrjob:1: this is no JSON"),
}  # fmt: skip


@pytest.mark.parametrize("name", SPOILT)
def test_one_error_a_mistake(tmp_path, name):
    changed, board, text = SPOILT[name]
    found = refused(tmp_path, four() | changed, board)
    assert len(found) == 1, found
    assert found[0].startswith(text)


def test_mistakes_in_several_files_and_the_board_file_in_one_go(tmp_path):
    files = four() | {
        "c1.gbr": copper(1, "Top")[:90],
        "c2.gbr": copper(2, "Inr").replace("G37*\n", ""),
        "pth.drl": "M48\nMETRIC\nT1C0.3\n%\nT9\nX1Y1\nM30\n",
    }
    found = refused(tmp_path, files, FOUR.replace("class: c}", "class: d}") + "outline: edg.gbr\n")
    assert [text.split(":")[0] for text in found] == ["board.yaml", "board.yaml", "c1.gbr", "c2.gbr", "pth.drl"]


def test_a_wrong_stackup_still_lets_other_files_be_looked_for(tmp_path):
    found = refused(tmp_path, four(), FOUR.replace("er: 4.5", "er: 0.5") + "outline: edg.gbr\n")
    assert [text.split(": ")[0] for text in found] == ["board.yaml:8", "board.yaml:14"]


def test_limits_reach_the_readers(tmp_path):
    found = refused(tmp_path, four(), limits=Limits(file_bytes=150))
    assert any("limit file_bytes = 150" in text for text in found)


def test_the_tiny_board(tmp_path):
    artwork = read(tmp_path, {"top.gbr": TOP, "bottom.gbr": BOTTOM, "edge.gbr": OUTLINE, "pth.drl": DRILL}, BOARD)
    assert artwork.remarks == ()
    assert artwork.board.nets[0].net == "CLK"


TYPES = {"copper": "copper", "soldermask": "mask", "outline": "outline", "drill": "drill"}


@pytest.mark.parametrize(
    "name", ["8bit-mixtape", "arduino-uno", "bus-pirate", "clockblock", "core", "freeduino", "mchck", "usbvil"]
)  # what each file is, by the manifest that goes with each board
def test_open_boards_are_told_apart(tmp_path, name):
    folder = open_data.fetch("tracespace")
    if folder is None:
        pytest.skip(open_data.reasons["tracespace"])
    (manifest,) = folder.rglob(f"boards/{name}/manifest.json")
    stackup = "stackup: [{copper: T, thickness: 35um}, {dielectric: 1.5mm, er: 4.2}, {copper: B, thickness: 35um}]\n"
    (tmp_path / "board.yaml").write_text(f"impcheck: 1\nfiles: {manifest.parent}\n{stackup}")
    artwork = read_artwork(tmp_path / "board.yaml")
    layers = [(layer["type"], layer["side"], layer["name"]) for layer in json.loads(manifest.read_text())["layers"]]
    wanted = {(TYPES[kind], side, file) for kind, side, file in layers if kind in TYPES}
    found = {("copper", "top", artwork.layers[0].file), ("copper", "bottom", artwork.layers[1].file)}
    found |= {("mask", side, mask.file) for side, mask in (("top", artwork.mask_top), ("bottom", artwork.mask_bottom)) if mask}
    found |= {("drill", "all", each.holes.file) for each in artwork.drills}
    found |= {("outline", "all", artwork.outline.file)} if artwork.outline else set()
    assert found == wanted
