"""Board files: what a right one means, and that every mistake in a wrong one is told with its line, all in one go."""
# ruff: noqa: E501  the tables below hold whole messages and whole lines of files

from __future__ import annotations

import json

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from impcheck.artwork.boardfile import DrillWish, read_board_file
from impcheck.artwork.limits import Limits
from impcheck.artwork.schema import json_schema
from impcheck.artwork.stackup import CopperItem, Dielectric, Mask
from impcheck.errors import InputError

FULL = """\
impcheck: 1
board: Eel counter, revision B
files: fab
netlist: eel.ipc
outline: eel-edge.gbr
stackup:
  - {mask: 20um, er: 3.6}
  - {copper: L1, thickness: 42um, file: eel-L1.gbr, etch: 12um, roughness: 1.5um}
  - {dielectric: 110um, er: 4.0, loss_tangent: 0.015, name: prepreg 2x1080}
  - {copper: L2, thickness: 17um, file: eel-L2.gbr, negative: true}
  - {dielectric: 28mil, er: 4.3, name: FR4 core}
  - {copper: L3, thickness: 17um}
  - {dielectric: 110um, er: 4.0, core: false}
  - {copper: L4, thickness: 42um}
drills:
  - {file: eel-pth.drl, plated: true, layers: [L4, L1]}
  - {file: eel-back.drl, backdrill: {from: L4, keep: L2}}
returns: [GND, "VCC*"]
joins: [C12, R7]
classes:
  clock: {impedance: 50 ohm, tolerance: 10%, rise_time: 300ps, width: {L1: 0.19mm, L3: 6mil}}
  link:  {differential: 100 ohm, common: 25 ohm, rise_time: 0.1ns, gap: 0.18mm, max_skew: 5ps}
nets:
  - {net: CLK_OUT, class: clock, from: U3.7, to: J1.1}
  - {pair: LANE0, p: LANE0_P, n: LANE0_N, class: link, from: [U1.A4, U1.A5], to: [J2.3, J2.4]}
  - {net: RF_IN, class: clock, from: {x: 12.5mm, y: 1.2in, layer: L1}, to: J4.1}
  - {net: "NO", class: clock}
groups:
  - {name: byte0, nets: ["DQ[0-7]", DQS0], match: 20ps}
rules: [standard, {via-stub: {longest: 0.5mm, level: error, shortest: 3}}]
"""

SMALL = """\
impcheck: 1
stackup:
  - {copper: top, thickness: 35um}
  - {dielectric: 160um, er: 4.2}
  - {copper: bot, thickness: 35um}
classes:
  clock: {impedance: 50 ohm}
nets:
  - {net: CLK, class: clock, from: U1.1, to: J1.1}
"""


def read(tmp_path, text, limits=None):
    path = tmp_path / "board.yaml"
    path.write_bytes(text if isinstance(text, bytes) else text.encode())
    return read_board_file(path, limits or Limits())


def problems(tmp_path, text, limits=None):
    with pytest.raises(InputError) as refused:
        read(tmp_path, text, limits)
    return [str(problem) for problem in refused.value.problems]


def spoilt(tmp_path, old, new):
    assert SMALL.count(old) >= 1
    return problems(tmp_path, SMALL.replace(old, new, 1))


def test_everything_a_board_file_can_say(tmp_path):
    plan = read(tmp_path, FULL)
    board = plan.board
    assert (board.name, board.file) == ("Eel counter, revision B", "board.yaml")
    assert plan.stackup is not None
    assert plan.stackup.items[:5] == (
        Mask(0.02, 3.6),
        CopperItem("L1", 0.042, 0.012, 0.0015, "eel-L1.gbr", None, 8),
        Dielectric(0.11, 4.0, 0.015, "prepreg 2x1080", False, 9),
        CopperItem("L2", 0.017, 0.0, 0.0, "eel-L2.gbr", True, 10),
        Dielectric(0.7112, 4.3, 0.0, "FR4 core", True, 11),  # exact: 28 mil are 0.7112 mm
    )
    assert plan.stackup.items[6].core is False
    assert [item.name for item in plan.stackup.coppers] == ["L1", "L2", "L3", "L4"]
    assert plan.drills == (DrillWish("eel-pth.drl", True, ("L4", "L1"), None, 16), DrillWish("eel-back.drl", None, None, ("L4", "L2"), 17))
    assert (plan.files.name, plan.files.line, plan.netlist.name, plan.outline.name) == ("fab", 3, "eel.ipc", "eel-edge.gbr")
    assert board.returns == ("GND", "VCC*")
    assert board.joins == ("C12", "R7")

    clock, link = board.classes["clock"], board.classes["link"]
    assert (clock.impedance, clock.tolerance, clock.rise_time, clock.line) == (50.0, 0.1, 3e-10, 21)
    assert (clock.width_on("L1"), clock.width_on("L3"), clock.width_on("L2")) == (0.19, 0.1524, None)
    assert (link.impedance, link.differential, link.common, link.rise_time, link.max_skew) == (None, 100.0, 25.0, 1e-10, 5e-12)
    assert link.gap_on("L2") == 0.18

    single, pair, place, no = board.nets
    assert (single.net, single.net_class, single.legs, single.line) == ("CLK_OUT", "clock", None, 24)
    assert [str(end) for end in single.begin + single.end] == ["U3.7", "J1.1"]
    assert (pair.net, pair.legs) == ("LANE0", ("LANE0_P", "LANE0_N"))
    assert [str(end) for end in pair.begin + pair.end] == ["U1.A4", "U1.A5", "J2.3", "J2.4"]
    assert (place.begin[0].at, place.begin[0].layer) == ((12.5, 30.48), "L1")
    assert (no.net, no.begin, no.end) == ("NO", (), ())
    assert (board.groups[0].name, board.groups[0].nets, board.groups[0].match) == ("byte0", ("DQ[0-7]", "DQS0"), 20e-12)
    assert board.decks == ("standard",)
    assert (board.overrides[0].rule, board.overrides[0].line) == ("via-stub", 30)
    assert board.overrides[0].limits == {"longest": "0.5mm", "level": "error", "shortest": 3}


def test_what_may_be_left_out(tmp_path):
    plan = read(tmp_path, "impcheck: 1\n")
    assert (plan.board.name, plan.stackup, plan.stackup_line, plan.files) == ("board", None, 0, None)
    assert plan.board.decks == ("standard",)
    assert read(tmp_path, "impcheck: 1\ndrills:\nreturns:\n").drills == ()  # a key whose entries are all commented out


@pytest.mark.parametrize("word", ["NO", "yes", "1e3", "12:30", "007", "~x", "null1", "0x1F", "2026-01-01"])
def test_a_net_may_be_called_anything(tmp_path, word):
    assert read(tmp_path, SMALL.replace("net: CLK", f"net: {word}")).board.nets[0].net == word


def test_only_overrides_keep_the_standard_deck(tmp_path):
    assert read(tmp_path, SMALL + "rules: [{width: {limit: 5%}}]\n").board.decks == ("standard",)


def test_a_deck_by_path_is_found_beside_the_board_file(tmp_path):
    (tmp_path / "own.yaml").write_text("")
    assert read(tmp_path, SMALL + "rules: [own.yaml]\n").board.decks == (str((tmp_path / "own.yaml").resolve()),)


MISTAKES = {
    "no unit": ("thickness: 35um", "thickness: 35", "board.yaml:3: thickness '35' has no unit; write 35um"),
    "no unit on a width": ("50 ohm", "50 ohm, width: 0.2", "board.yaml:7: width '0.2' has no unit; write 0.2mm"),
    "negative": ("50 ohm", "50 ohm, width: -0.2mm", "board.yaml:7: width '-0.2mm' is impossible; it must be above 0 and at most 1000 mm"),
    "zero thickness": ("35um", "0um", "board.yaml:3: thickness '0um' is impossible; it must be above 0 and at most 2 mm"),
    "er": ("er: 4.2", "er: 0.4", "board.yaml:4: er '0.4' is impossible; it must be at least 1 and at most 1000"),
    "er of nan": ("er: 4.2", "er: .nan", "board.yaml:4: er '.nan' is not a number"),
    "tolerance": ("50 ohm", "50 ohm, tolerance: 250%", "board.yaml:7: tolerance '250%' is impossible; it must be above 0 and at most 0.9, where 1 is 100%"),
    "unknown key": ("nets:", "netz:", "board.yaml:8: unknown key 'netz' (did you mean 'nets'?)"),
    "unknown key in an item": ("er: 4.2", "er: 4.2, los_tangent: 0.1", "board.yaml:4: unknown key 'los_tangent' (did you mean 'loss_tangent'?)"),
    "missing key": (", er: 4.2", "", "board.yaml:4: the key 'er' is missing in this dielectric (write `er: 4.2`)"),
    "unknown class": ("class: clock", "class: Clok", "board.yaml:9: class 'Clok' is not declared (did you mean 'clock'?)"),
    "no version": ("impcheck: 1\n", "", "board.yaml:1: the key 'impcheck' is missing (write `impcheck: 1` in the first line)"),
    "wrong version": ("impcheck: 1", "impcheck: 2", "board.yaml:1: the board file has the format '2'; this version of impcheck reads format 1, write `impcheck: 1`"),
    "no pin": ("U1.1", "U1", "board.yaml:9: 'U1' names no pin (write part and pin as U3.7, or a place as {x: 12.5mm, y: 30mm, layer: L1})"),
    "layer of a width": ("50 ohm", "50 ohm, width: {tpo: 1mm}", "board.yaml:7: 'tpo' is no copper layer of the stackup (did you mean 'top'?)"),
    "layer of a place": ("from: U1.1", "from: {x: 1mm, y: 2mm, layer: mid}", "board.yaml:9: 'mid' is no copper layer of the stackup (there are bot, top)"),
    "no dielectric": (
        "  - {dielectric: 160um, er: 4.2}\n", "",
        "board.yaml:4: there is no dielectric between top and bot (write `- {dielectric: 110um, er: 4.2}` between them)",
    ),
    "dielectric below": (
        "classes:", "  - {dielectric: 1mm, er: 4}\nclasses:",
        "board.yaml:6: a dielectric is the bottom of the stackup (the outermost items are copper, with or without mask)",
    ),
    "mask inside": ("  - {copper: bot", "  - {mask: 20um, er: 3}\n  - {copper: bot", "board.yaml:5: solder mask inside the stackup (a mask is the first or the last item)"),
    "layer twice": ("copper: bot", "copper: top", "board.yaml:5: the copper layer 'top' stands here already in line 3 (give each layer its own name)"),
    "pair without a leg": (
        "- {net: CLK, class: clock, from: U1.1, to: J1.1}", "- {pair: CLK, p: A, class: clock}",
        "board.yaml:9: the key 'n' is missing in this pair (write `n: and the name of the negative leg's net`)",
    ),
    "class written out": (
        "class: clock", "class: {use: clock}",
        "board.yaml:9: a class is named here, not written out (this version knows no `use`; write the class under `classes:`)",
    ),
    "class from elsewhere": ("{impedance: 50 ohm}", "{use: memory}", "board.yaml:7: class 'clock' cannot be taken over from elsewhere (this version knows no `use`; write the class out)"),
    "no list": ("nets:\n  - {net: CLK, class: clock, from: U1.1, to: J1.1}", "nets: CLK", "board.yaml:8: 'nets' must be a list, not 'CLK' (write each entry as `- ...` or all of them in [ ])"),
    "twice the same": (
        "nets:", "nets:\n  - {net: CLK, class: clock, from: U1.1, to: J1.1}",
        "board.yaml:10: 'CLK' is declared already in line 9 (keep one of the two)",
    ),
    "class of pairs": (
        "{impedance:", "{differential:",
        "board.yaml:9: class 'clock' is for pairs and 'CLK' is a single net (give the class an `impedance`, or write {pair: NAME, p: ..., n: ..., class: ...})",
    ),
    "key twice": ("classes:", "impcheck: 1\nclasses:", "board.yaml:6: the key 'impcheck' stands here already in line 1 (keep one of the two)"),
    "plated back-drill": (
        "classes:", "drills: [{file: a.drl, plated: true, backdrill: {from: bot, keep: top}}]\nclasses:",
        "board.yaml:6: a back-drill cannot be plated (leave `plated: true` out)",
    ),
    "truth": ("classes:", "drills: [{file: a.drl, plated: yes}]\nclasses:", "board.yaml:6: plated must be true or false, not 'yes'"),
    "one layer of two": ("classes:", "drills: [{file: a.drl, layers: [top]}]\nclasses:", "board.yaml:6: 'layers' takes two entries (write [first, second])"),
    "waivers": ("classes:", "waivers: waivers.yaml\nclasses:", "board.yaml:6: there is no file 'waivers.yaml' (did you mean 'board.yaml'?)"),
}  # fmt: skip


@pytest.mark.parametrize("name", MISTAKES)
def test_one_error_a_mistake(tmp_path, name):
    old, new, said = MISTAKES[name]
    assert spoilt(tmp_path, old, new) == [said]


def test_all_mistakes_in_one_go(tmp_path):
    text = (
        SMALL.replace("35um", "35", 1)
        .replace("er: 4.2", "er: 0.42")
        .replace("class: clock", "class: clok")
        .replace("impcheck: 1", "impcheck: 9")
    )
    found = problems(tmp_path, text + "retruns: [GND]\n")
    assert [line.split(" ")[0] for line in found] == ["board.yaml:1:", "board.yaml:3:", "board.yaml:4:", "board.yaml:9:", "board.yaml:10:"]


def test_a_layer_with_a_mistake_is_still_known_by_name(tmp_path):
    found = spoilt(tmp_path, "{copper: top, thickness: 35um}", "{copper: top, thickness: 35}")
    assert len(found) == 1
    text = SMALL.replace("{copper: top, thickness: 35um}", "{copper: top, thickness: 35}").replace("50 ohm", "50 ohm, width: {top: 0.2mm}")
    assert len(problems(tmp_path, text)) == 1


def test_yaml_that_is_none(tmp_path):
    assert "board.yaml:2: this is no YAML" in problems(tmp_path, "nets: [a\nb: c: d\n")[0]
    assert problems(tmp_path, "- a\n") == ["board.yaml:1: this is no board file (a board file begins with `impcheck: 1`, key by key)"]
    assert "this is no board file" in problems(tmp_path, "")[0]
    assert "this is no UTF-8 text" in problems(tmp_path, b"impcheck: 1\nboard: \xff\xfe\n")[0]
    assert "board.yaml:2: a second document starts here" in problems(tmp_path, "impcheck: 1\n---\na: b\n")[0]
    assert "this is no YAML" in problems(tmp_path, "a: \x00")[0]


@pytest.mark.parametrize("tag", ["!!python/object/apply:os.system [echo]", "!local x", "!!int '3'", "!<tag:yaml.org,2002:binary> aGk="])
def test_tags_are_refused(tmp_path, tag):
    found = problems(tmp_path, f"impcheck: 1\nboard: {tag}\n")
    assert len(found) == 1
    assert found[0].startswith("board.yaml:2: the tag '")


def test_aliases(tmp_path):
    text = SMALL.replace("{impedance: 50 ohm}", "&c {impedance: 50 ohm}\n  other: *c")
    assert read(tmp_path, text).board.classes["other"].impedance == 50.0
    assert "no anchor above" in problems(tmp_path, "impcheck: *x\n")[0]
    assert "inside the value it stands for" in problems(tmp_path, "impcheck: 1\nnets: &x [*x]\n")[0]


def test_anchors_that_explode_and_deep_nesting_are_bounded(tmp_path):
    lines = ["a0: &a0 [x, x, x, x, x, x, x, x, x, x]"] + [f"a{i}: &a{i} [{', '.join([f'*a{i - 1}'] * 10)}]" for i in range(1, 30)]
    found = problems(tmp_path, "\n".join(lines))
    assert "limit yaml_nodes = 200,000" in found[-1]
    chain = ["a0: &a0 [x]"] + [f"a{i}: &a{i} [*a{i - 1}]" for i in range(1, 600)]
    assert "nested more than 40 deep" in problems(tmp_path, "\n".join(chain))[-1]
    assert "nest" in problems(tmp_path, "[" * 5000)[-1]  # libyaml or ours, whichever counts first
    assert "limit yaml_nodes = 50" in problems(tmp_path, "x: [" + "1, " * 60 + "]", Limits(yaml_nodes=50))[-1]
    assert "limit board_file_bytes = 100" in problems(tmp_path, "#" * 101, Limits(board_file_bytes=100))[-1]


def test_no_such_file(tmp_path):
    for path in (tmp_path / "none.yaml", tmp_path, tmp_path / "x" / "y"):
        with pytest.raises(InputError, match="there is no such file"):
            read_board_file(path)


SHAPES = st.recursive(
    st.sampled_from(["1", "", "L1", "5mm", "-1", "50 ohm", "true", "~", "U1.2", "1e400", "\\", "[", "x" * 600]),
    lambda inner: (
        st.lists(inner, max_size=3)
        | st.dictionaries(
            st.sampled_from(["copper", "mask", "dielectric", "net", "pair", "class", "from", "x", "y", "file", "width", "er", "use"]),
            inner,
            max_size=4,
        )
    ),
    max_leaves=12,
)
KEYS = [
    "impcheck",
    "board",
    "files",
    "stackup",
    "drills",
    "returns",
    "classes",
    "nets",
    "groups",
    "rules",
    "waivers",
    "netlist",
    "outline",
    "x",
]


@settings(max_examples=200, deadline=None)
@given(st.dictionaries(st.sampled_from(KEYS), SHAPES, max_size=6))
def test_any_shape_is_read_or_refused_with_a_line(tmp_path_factory, content):
    path = tmp_path_factory.getbasetemp() / "board.yaml"
    path.write_text(json.dumps(content))  # JSON is YAML
    try:
        read_board_file(path)
    except InputError as refused:
        assert all(problem.line >= 1 and problem.message for problem in refused.problems)


def test_the_json_schema_says_what_the_reader_knows():
    schema = json_schema()
    assert schema["additionalProperties"] is False
    assert schema["required"] == ["impcheck"]
    assert set(KEYS) - {"x"} <= set(schema["properties"])
    classes = schema["$defs"]["ClassEntry"]["properties"]
    assert set(classes) == {"impedance", "differential", "common", "tolerance", "rise_time", "width", "gap", "max_skew"}
    assert "from" in schema["$defs"]["NetEntry"]["properties"]
