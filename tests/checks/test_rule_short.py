import pytest

from tests.checks.small import TOP, found


def with_other(*lines, name="OTHER"):
    return TOP.replace("%TD*%", f"%TO.N,{name}*%\n" + "\n".join(lines) + "\n%TD*%")


def test_a_foreign_trace_that_touches(tmp_path):
    crossing = with_other("D10*", "X12000000Y7000000D02*", "X12000000Y5100000D01*")
    (hit,) = [f for f in found(tmp_path, top_gbr=crossing) if f.rule == "short"]
    assert (hit.level, hit.net) == ("error", "CLK")
    assert hit.at == pytest.approx((12.0, 5.1), abs=0.15)
    assert "nets CLK and OTHER are one piece of copper" in hit.message


def test_one_that_keeps_away_is_fine(tmp_path):
    assert found(tmp_path, top_gbr=with_other("D10*", "X12000000Y7000000D02*", "X12000000Y5500000D01*")) == []


def test_a_pad_named_for_both_nets_is_a_tie(tmp_path):
    tie = TOP.replace("%TD*%", "%TO.N,CLK,OTHER*%\nX12000000Y5000000D03*\n%TD*%")
    (hit,) = [f for f in found(tmp_path, top_gbr=tie) if f.rule == "short"]
    assert hit.level == "note"
    assert "net tie" in hit.message
