import pytest

from sample_boards.draw import sampler
from tests.checks.small import of_board


def stubs(findings):
    return [f for f in findings if f.rule == "via-stub"]


def test_a_barrel_that_goes_on_and_its_quarter_wave(tmp_path):
    board, _ = sampler()
    hits = stubs(of_board(tmp_path, board))
    assert [(hit.net, hit.layer, hit.level) for hit in hits] == [("DQ3", "L3", "warning")] * 2
    # from the lower side of L3 down: 250 + 17 + 200 + 17 + 110 + 42 um
    assert hits[0].measured == pytest.approx(0.636, abs=1e-4)
    # c / (4 L sqrt(er)) with er 4.1 to 4.15: 58 GHz
    assert "a quarter wave at 58" in hits[0].message


def test_back_drilled_or_used_to_the_end_is_fine(tmp_path):
    board, _ = sampler()
    hits = stubs(of_board(tmp_path, board))
    assert not {hit.net for hit in hits} & {"DQ0", "DQ1", "STB", "REF_CLK"}


def test_a_slow_edge_does_not_see_it(tmp_path):
    board, _ = sampler()
    board.classes["bus"]["rise_time"] = "300ps"
    assert stubs(of_board(tmp_path, board)) == []
