import pytest

from tests.checks.small import found, neck


def test_a_short_neck_is_found_with_its_length(tmp_path):
    hit = next(f for f in found(tmp_path, top_gbr=neck(9, 10, 0.15)) if f.rule == "neck-down")
    assert (hit.level, hit.net) == ("warning", "CLK")
    assert hit.at == pytest.approx((9.5, 5.0), abs=0.1)
    assert hit.limit == pytest.approx(0.24)  # 80 % of 0.3
    assert "50% of the net's usual 0.300 mm on this layer" in hit.message


def test_eighty_five_per_cent_is_no_neck(tmp_path):
    assert "neck-down" not in {f.rule for f in found(tmp_path, top_gbr=neck(9, 10, 0.255))}


def test_one_spot_gives_one_finding(tmp_path):
    assert [f.rule for f in found(tmp_path, top_gbr=neck(8, 12, 0.15))].count("neck-down") == 1
