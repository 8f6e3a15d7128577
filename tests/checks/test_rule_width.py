import pytest

from tests.checks.small import BOARD, found, neck


def test_another_width_than_the_class_states(tmp_path):
    hit = next(f for f in found(tmp_path, top_gbr=neck(8, 12, 0.25)) if f.rule == "width")
    assert (hit.level, hit.layer) == ("warning", "L1")
    assert hit.measured == pytest.approx(0.25, abs=1e-3)
    assert hit.limit == pytest.approx(0.27)
    assert "17% narrower than the class's 0.300 mm" in hit.message
    assert hit.along_mm == pytest.approx((6.0, 10.0), abs=0.15)  # 6 mm from the pad's middle, less the round ends of the wide strokes


def test_within_ten_per_cent_is_fine(tmp_path):
    assert found(tmp_path, top_gbr=neck(8, 12, 0.28)) == []


def test_only_layers_the_class_names_are_judged(tmp_path):
    board = BOARD.replace("width: 0.3mm", "width: {L2: 0.3mm}")
    assert "width" not in {f.rule for f in found(tmp_path, board, top_gbr=neck(8, 12, 0.25))}
