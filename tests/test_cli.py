"""The commands as a user types them: exit status, text, files, and the README that names them."""

from __future__ import annotations

import json
import os
import re
import shlex
import subprocess
import sys
import time
from pathlib import Path

import pytest
from click.testing import CliRunner

import impcheck
from impcheck.cli import main
from tests.tiny_board import BOARD, TOP, write

ROOT = Path(__file__).parent.parent
NARROW = TOP.replace(
    "X18000000Y5000000D01*\nD11*",
    "X8000000Y5000000D01*\n%ADD12C,0.150000*%\nD12*\nX12000000Y5000000D01*\nD10*\nX18000000Y5000000D01*\nD11*",
)


def typed(*words):
    return CliRunner().invoke(main, [str(word) for word in words])


@pytest.fixture
def narrow(tmp_path):
    """The tiny board with 4 mm of its trace at half its width, from x = 8 to 12 mm."""
    return write(tmp_path, top_gbr=NARROW)


def test_findings_give_status_1_and_their_place(narrow):
    result = typed("check", narrow)
    assert result.exit_code == 1, result.output
    assert "ERROR impedance  CLK on L1" in result.stdout
    assert "WARNING neck-down  CLK on L1" in result.stdout
    assert "WARNING width  CLK on L1" in result.stdout
    assert "1 error, 2 warnings, 0 notes. 1 of 1 net walked." in result.stdout


@pytest.mark.parametrize(("level", "status"), [("error", 1), ("warning", 1), ("note", 1), ("never", 0)])
def test_fail_on_sets_the_gate(narrow, level, status):
    assert typed("check", narrow, "--fail-on", level).exit_code == status


def test_fail_on_error_passes_warnings(tmp_path):
    board = write(tmp_path, BOARD.replace("impedance: 50 ohm, ", ""), top_gbr=NARROW)
    assert typed("check", board, "--fail-on", "error").exit_code == 0
    assert typed("check", board).exit_code == 1


def test_json_file_is_the_document_of_the_python_api(narrow, tmp_path):
    out = tmp_path / "result.json"
    assert typed("check", narrow, "-o", out).exit_code == 1
    written = json.loads(out.read_text())
    assert written == json.loads(impcheck.check(narrow).to_json())
    assert written["impcheck"] == 1
    assert written["summary"] == {"errors": 1, "warnings": 2, "notes": 0, "waived": 0, "nets": 1, "walked": 1}
    spot = next(f for f in written["findings"] if f["rule"] == "neck-down")
    assert (spot["net"], spot["layer"], spot["unit"]) == ("CLK", "L1", "mm")
    assert spot["measured"] == pytest.approx(0.15, abs=1e-3)
    # drawn with round ends: the wide strokes reach their half width, 0.15 mm, into the narrow one at both ends
    # (circle of the wide end, where its chord falls below 80 % of the width: sqrt(0.15**2 - 0.12**2) = 0.09 mm)
    assert spot["span"][0][0] == pytest.approx(8.09, abs=0.05)
    assert spot["span"][1][0] == pytest.approx(11.91, abs=0.05)


def test_same_bytes_in_same_bytes_out(narrow, tmp_path):
    for name in ("a.json", "b.json"):
        typed("check", narrow, "-o", tmp_path / name)
    assert (tmp_path / "a.json").read_bytes() == (tmp_path / "b.json").read_bytes()
    assert str(tmp_path) not in (tmp_path / "a.json").read_text()


def test_unknown_ending_is_refused_before_the_work(narrow, tmp_path):
    result = typed("check", narrow, "-o", tmp_path / "result.doc")
    assert result.exit_code == 2
    assert "no result format has the ending '.doc'" in result.stderr
    assert ".json" in result.stderr


def test_output_folder_that_is_not_there(narrow, tmp_path):
    result = typed("check", narrow, "-o", tmp_path / "none" / "result.json")
    assert result.exit_code == 2
    assert "cannot be written" in result.stderr


def test_several_boards_one_of_them_broken(tmp_path):
    fine, broken = write(tmp_path / "fine"), write(tmp_path / "broken", top_gbr="")
    result = typed("check", fine, broken)
    assert result.exit_code == 2
    assert "No findings." in result.stdout  # nothing lost of the one that works
    assert "top.gbr" in result.stderr


def test_walk_prints_the_stretches(narrow):
    result = typed("walk", narrow, "CLK")
    assert result.exit_code == 0, result.output
    assert "0.1500" in result.stdout
    assert "0.3000" in result.stdout


def test_walk_of_a_net_that_is_not_declared(narrow):
    result = typed("walk", narrow, "CLKK")
    assert result.exit_code == 2
    assert "did you mean 'CLK'?" in result.stderr


def test_rules_lists_and_explains():
    listed = typed("rules").stdout
    for rule in (
        "impedance",
        "width",
        "neck-down",
        "reference-gap",
        "plane-edge",
        "return-via",
        "via-stub",
        "branch-stub",
        "open",
        "short",
    ):
        assert rule in listed
        assert len(typed("rules", rule).stdout) > 200
    assert "via-stub" in typed("rules", "via-stubs").stderr
    assert typed("rules", "via-stubs").exit_code == 2


def test_schemas_are_json():
    assert "classes" in json.loads(typed("schema", "board").stdout)["properties"]
    assert "findings" in json.loads(typed("schema", "result").stdout)["properties"]


def test_names_with_control_characters_do_not_reach_the_terminal(tmp_path):
    evil = "CLK\\u001b[31m"
    board = write(tmp_path, BOARD.replace("net: CLK,", f'net: "{evil}",'), top_gbr=TOP.replace("TO.N,CLK", f"TO.N,{evil}"))
    result = typed("check", board)
    assert "\x1b" not in result.output


def test_help_needs_no_heavy_import():
    heavy = "{'numpy', 'scipy', 'shapely', 'pydantic', 'rich', 'networkx', 'gerbonara'}"
    code = f"import sys; from impcheck.cli import main; main(['--help'], standalone_mode=False); print(sorted({heavy} & set(sys.modules)))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True, cwd=ROOT)
    assert done.stdout.splitlines()[-1] == "[]"


def test_every_command_and_option_is_in_the_readme():
    readme = (ROOT / "README.md").read_text()
    for name, command in main.commands.items():
        assert f"impcheck {name}" in readme
        for parameter in command.params:
            for option in getattr(parameter, "opts", []):
                if option.startswith("--"):
                    assert option in readme, f"{name} {option}"


def test_readme_command_checks_a_sample_board():
    command = re.search(r"<!-- check -->\n```\n(.*)\n```", (ROOT / "README.md").read_text()).group(1)
    words = shlex.split(command.split("&&")[-1])
    assert words[0] == ".venv/bin/impcheck"
    begin = time.monotonic()
    code = "from impcheck.cli import main; main(prog_name='impcheck')"
    done = subprocess.run(
        [sys.executable, "-c", code, *words[1:]], capture_output=True, text=True, cwd=ROOT, check=False, env={**os.environ, "NO_COLOR": "1"}
    )
    assert done.returncode == 1, done.stderr
    assert "reference-gap" in done.stdout
    assert time.monotonic() - begin < 300  # a hang, not a speed, is what this looks for
