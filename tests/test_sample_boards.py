"""The sample boards give exactly the defects listed beside them: each by its rule, on its net and layer, within 0.1 mm of its place."""

import math
from pathlib import Path

import pytest
import yaml

from impcheck.pipeline import run

BOARDS = sorted(Path(__file__).parent.parent.glob("sample_boards/*/board.yaml"))
NEAR = 0.1  # mm, the bar of the design


def test_there_are_sample_boards():
    assert len(BOARDS) >= 4


@pytest.mark.parametrize("board", BOARDS, ids=lambda path: path.parent.name)
def test_sample_board_gives_its_listed_defects_and_nothing_else(board):
    listed = yaml.safe_load((board.parent / "expected.yaml").read_text())["findings"]
    found = list(run(board).document.findings)
    missing = []
    for wanted in listed:
        match = next(
            (
                f
                for f in found
                if (f.rule, f.net) == (wanted["rule"], wanted["net"])
                and f.layer == wanted.get("layer", f.layer)
                and math.dist(f.at, wanted["at"]) <= NEAR
            ),
            None,
        )
        if match is None:
            missing.append(wanted)
        else:
            found.remove(match)
    assert missing == []
    assert [(f.rule, f.net, f.layer, f.at, f.message) for f in found] == []
