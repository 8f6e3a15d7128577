import pytest

from tests.checks.small import BOARD, found, neck


def test_a_long_narrow_piece_is_an_error_at_its_place(tmp_path):
    hit = next(f for f in found(tmp_path, top_gbr=neck(8, 12, 0.15)) if f.rule == "impedance")
    assert (hit.level, hit.net, hit.layer, hit.unit) == ("error", "CLK", "L1", "ohm")
    assert hit.at == pytest.approx((10.0, 5.0), abs=0.1)
    assert hit.limit == pytest.approx(55.0)  # 50 ohm and 10 %
    assert hit.measured > 60
    assert "above the class's 45 to 55 ohm" in hit.message
    assert "width 0.150 mm, reference below on L2, 0.160 mm away" in hit.message


def test_a_wide_piece_is_below(tmp_path):
    hit = next(f for f in found(tmp_path, top_gbr=neck(8, 12, 0.6)) if f.rule == "impedance")
    assert "below the class's 45 to 55 ohm" in hit.message
    assert hit.limit == pytest.approx(45.0)


def test_a_piece_shorter_than_the_edge_sees_is_none(tmp_path):
    # 3 % of 300 ps at about 5.8 ps/mm is 1.5 mm
    assert "impedance" not in {f.rule for f in found(tmp_path, top_gbr=neck(9, 10.2, 0.15))}


def test_a_class_without_impedance_asks_for_nothing(tmp_path):
    board = BOARD.replace("impedance: 50 ohm, ", "")
    assert "impedance" not in {f.rule for f in found(tmp_path, board, top_gbr=neck(8, 12, 0.15))}


def test_a_class_without_rise_time_is_remarked(tmp_path):
    from impcheck.pipeline import run
    from tests.tiny_board import write

    remarks = [r.text for r in run(write(tmp_path, BOARD.replace("rise_time: 300ps, ", ""))).document.rests_on]
    assert "class 'clock' states no rise time: 500 ps taken from the rule deck" in remarks


def test_a_limit_of_the_board_file_wins(tmp_path):
    board = BOARD + "rules: [standard, {impedance: {shortest: 0.2mm, level: note}}]\n"
    hit = next(f for f in found(tmp_path, board, top_gbr=neck(9, 10.2, 0.15)) if f.rule == "impedance")
    assert hit.level == "note"
