import pytest

from tests.checks.small import cleared, found


def edges(findings):
    return [f for f in findings if f.rule == "plane-edge"]


def test_a_trace_along_the_edge_of_its_plane(tmp_path):
    (hit,) = edges(found(tmp_path, bottom_gbr=cleared((-1, -1, 21, 4.8))))
    assert hit.level == "warning"
    assert hit.measured == pytest.approx(0.05, abs=2e-3)  # edge of the trace at 4.85
    assert hit.limit == pytest.approx(0.16)  # one height
    assert hit.at == pytest.approx((10.0, 5.0), abs=0.1)
    assert "to the edge of its reference on L2" in hit.message


def test_two_heights_away_is_fine(tmp_path):
    assert edges(found(tmp_path, bottom_gbr=cleared((-1, -1, 21, 4.5)))) == []


def test_a_short_approach_is_fine(tmp_path):
    assert edges(found(tmp_path, bottom_gbr=cleared((9, 4, 10, 4.8)))) == []  # 1 mm, under 3 % of the edge's 51 mm
