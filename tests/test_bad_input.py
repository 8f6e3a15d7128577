"""Bad input, end to end: exit status 2, one error a mistake with file, line and remedy, never a traceback, and soon."""

from __future__ import annotations

import io
import re
import zipfile

import pytest
from click.testing import CliRunner

from impcheck.cli import main
from tests.tiny_board import BOARD, BOTTOM, DRILL, TOP, write


def check(board):
    """Output lines on stderr of a check that must be refused."""
    result = CliRunner().invoke(main, ["check", str(board)])
    assert result.exit_code == 2, result.output
    assert result.exception is None or isinstance(result.exception, SystemExit)
    assert result.stdout == ""
    return [line.removeprefix("error: ") for line in result.stderr.splitlines() if line.startswith("error: ")]


def only(board):
    lines = check(board)
    assert len(lines) == 1, lines
    return lines[0]


def test_the_unspoilt_board_passes(tmp_path):
    result = CliRunner().invoke(main, ["check", str(write(tmp_path))])
    assert result.exit_code == 0, result.output
    assert "No findings. 1 of 1 net walked." in result.stdout


def test_no_board_file(tmp_path):
    assert "there is no such file" in only(tmp_path / "none.yaml")


def test_folder_without_board_file(tmp_path):
    assert "board.yaml" in only(tmp_path)


SPOILT_FILES = {
    "missing file": ({"top_gbr": None}, "L1"),
    "empty file": ({"top_gbr": ""}, "top.gbr"),
    "a text that is no Gerber": ({"top_gbr": "Dear fab,\nplease find the files attached.\n"}, "top.gbr"),
    "truncated in a region": ({"bottom_gbr": BOTTOM[: BOTTOM.index("X20000000Y10000000D01")]}, "bottom.gbr"),
    "truncated in a command": ({"top_gbr": TOP[: TOP.index("0.300000") + 4]}, "top.gbr:5"),
    "undefined aperture": ({"top_gbr": TOP.replace("D11*", "D12*", 1).replace("ADD12", "ADD11")}, "top.gbr"),
    "two files claim one layer": ({"bottom_gbr": BOTTOM.replace("L2,Bot", "L1,Top")}, "L1"),
    "step and repeat of a billion": ({"top_gbr": TOP.replace("%TO.N,CLK*%", "%SRX100000Y10000I1J1*%\n%TO.N,CLK*%")}, "top.gbr"),
    "undefined tool": ({"pth_drl": DRILL.replace("\nT1\n", "\nT2\n")}, "pth.drl:7"),
}


@pytest.mark.parametrize("name", SPOILT_FILES)
def test_spoilt_files(name, tmp_path):
    changed, where = SPOILT_FILES[name]
    line = only(write(tmp_path, **changed))
    assert where in line
    assert "(" in line  # the remedy


SPOILT_BOARDS = {
    "stackup without a dielectric": ("  - {dielectric: 160um, er: 4.2}\n", "", r"board\.yaml:\d+: .*dielectric"),
    "a net that is nowhere": ("net: CLK,", "net: CLOCK,", r"board\.yaml:12: .*CLOCK.*CLK"),
    "a pin that is nowhere": ("from: U1.1", "from: U9.1", r"board\.yaml:12: .*U9"),
    "a class that is not declared": ("class: clock", "class: clok", r"board\.yaml:12: .*clok.*clock"),
    "a thickness without a unit": ("thickness: 35um}\n  - {diel", "thickness: 35}\n  - {diel", r"board\.yaml:5: .*unit"),
    "a negative width": ("width: 0.3mm", "width: -0.3mm", r"board\.yaml:10: .*-0\.3"),
    "an unknown key": ("returns: [GND]", "return: [GND]", r"board\.yaml:8: .*return.*returns"),
    "er below that of air": ("er: 4.2", "er: 0.42", r"board\.yaml:6: .*0\.42"),
    "files that are not there": ("files: fab", "files: fba", r"board\.yaml:3: .*fba.*fab"),
    "a wrong version": ("impcheck: 1", "impcheck: 7", r"board\.yaml:1: .*7"),
    "a tag": ("board: Tiny", "board: !!python/object/apply:os.system [echo]", r"board\.yaml:2: .*tag"),
    "a key twice": ("board: Tiny", "board: Tiny\nboard: Tine", r"board\.yaml:3: .*board.*(twice|already)"),
    "broken YAML": ("returns: [GND]", "returns: [GND", r"board\.yaml:\d+: "),
    "a rule that is not": (
        "nets:\n",
        "rules: [standard, {via-stubs: {longest: 0.5mm}}]\nnets:\n",
        r"board\.yaml:11: .*via-stubs.*via-stub",
    ),
}


@pytest.mark.parametrize("name", SPOILT_BOARDS)
def test_spoilt_board_files(name, tmp_path):
    old, new, wanted = SPOILT_BOARDS[name]
    assert old in BOARD
    line = only(write(tmp_path, BOARD.replace(old, new, 1)))
    assert re.search(wanted, line), line


def test_all_mistakes_in_one_go(tmp_path):
    board = BOARD.replace("class: clock", "class: clok").replace("width: 0.3mm", "width: -0.3mm").replace("er: 4.2", "er: 0.42")
    assert len(check(write(tmp_path, board))) == 3


def test_yaml_anchors_that_explode(tmp_path):
    lines = ["a0: &a0 [x, x, x, x, x, x, x, x, x, x]"] + [f"a{i}: &a{i} [{', '.join([f'*a{i - 1}'] * 10)}]" for i in range(1, 12)]
    assert "board.yaml" in only(write(tmp_path, "\n".join(lines) + "\n" + BOARD))


def zipped(members):
    data = io.BytesIO()
    with zipfile.ZipFile(data, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in members.items():
            archive.writestr(name, content)
    return data.getvalue()


def test_zip_with_a_path_out(tmp_path):
    board = write(tmp_path, BOARD.replace("files: fab", "files: fab.zip"))
    (tmp_path / "fab.zip").write_bytes(zipped({"../top.gbr": TOP, "bottom.gbr": BOTTOM}))
    assert "../top.gbr" in only(board)
    assert not (tmp_path.parent / "top.gbr").exists()


def test_zip_bomb(tmp_path):
    board = write(tmp_path, BOARD.replace("files: fab", "files: fab.zip"))
    (tmp_path / "fab.zip").write_bytes(zipped({"top.gbr": TOP, "bottom.gbr": b"0" * 50_000_000}))
    assert "bottom.gbr" in only(board)


def test_a_zip_is_read_like_a_folder(tmp_path):
    board = write(tmp_path, BOARD.replace("files: fab", "files: fab.zip"))
    (tmp_path / "fab.zip").write_bytes(zipped({"out/top.gbr": TOP, "out/bottom.gbr": BOTTOM, "out/pth.drl": DRILL}))
    result = CliRunner().invoke(main, ["check", str(board)])
    assert result.exit_code == 0, result.output
