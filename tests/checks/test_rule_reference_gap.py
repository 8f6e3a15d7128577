import pytest

from sample_boards.draw import box
from tests.boards.model import Plane, Via
from tests.boards.parts import via
from tests.checks.small import BOARD, BOTTOM, cleared, found, four, of_board

GAP = "reference-gap"
SPLIT = BOARD.replace("returns: [GND]", "returns: [GND, VCC]")


def two_planes(moat):
    """GND up to x = 10, VCC from there on, `moat` mm between."""
    left, right = 10 - moat / 2, 10 + moat / 2
    halves = []
    for net, x0, x1 in (("GND", 0, left), ("VCC", right, 20)):
        corners = [(x0, 0), (x1, 0), (x1, 10), (x0, 10), (x0, 0)]
        points = "\n".join(f"X{x * 1e6:.0f}Y{y * 1e6:.0f}D0{2 if k == 0 else 1}*" for k, (x, y) in enumerate(corners))
        halves.append(f"%TO.N,{net}*%\nG36*\n{points}\nG37*")
    return BOTTOM[: BOTTOM.index("%TO.N")] + "G01*\n" + "\n".join(halves) + "\nM02*\n"


def gaps(findings):
    return [f for f in findings if f.rule == GAP]


def test_a_void_under_the_trace(tmp_path):
    (hit,) = gaps(found(tmp_path, bottom_gbr=cleared((9, 4, 10, 6))))
    assert (hit.level, hit.layer) == ("error", "L1")
    assert hit.at == pytest.approx((9.5, 5.0), abs=0.02)
    assert hit.measured == pytest.approx(1.0, abs=0.02)
    assert "a void in GND, 1.98 mm across the trace" in hit.message or "a void in GND, 1.99 mm across" in hit.message
    assert "no whole plane above it makes up for it" in hit.message


def test_a_slot_across_and_the_way_round_its_nearer_end(tmp_path):
    (hit,) = gaps(found(tmp_path, bottom_gbr=cleared((9, 3, 9.3, 9))))
    assert "a slot in GND" in hit.message
    assert "the return goes round its nearer end, 3.9" in hit.message  # twice 2 mm, less the hairline that closes cut-ins


def test_a_slot_that_runs_out_of_the_plane(tmp_path):
    (hit,) = gaps(found(tmp_path, bottom_gbr=cleared((9, -1, 9.3, 7))))
    assert "a slot in GND that runs out of the plane" in hit.message


@pytest.mark.parametrize("moat", [0.4, 0.05])
def test_a_split_is_found_however_narrow(moat, tmp_path):
    (hit,) = gaps(found(tmp_path, SPLIT, bottom_gbr=two_planes(moat)))
    assert hit.at == pytest.approx((10.0, 5.0), abs=0.05)
    assert "a split between GND and VCC" in hit.message


def test_a_void_shorter_than_the_limit_is_none(tmp_path):
    assert gaps(found(tmp_path, bottom_gbr=cleared((9, 4, 9.08, 6)))) == []


def test_an_opening_beside_the_trace_is_none(tmp_path):
    assert gaps(found(tmp_path, bottom_gbr=cleared((9, 5.3, 10, 7)))) == []


def test_part_of_the_width_counts(tmp_path):
    (hit,) = gaps(found(tmp_path, bottom_gbr=cleared((9, 5.05, 10, 7))))
    assert hit.at == pytest.approx((9.5, 5.0), abs=0.02)
    assert "a void in GND, 1.9" in hit.message  # 1.95 mm, less the hairline that closes cut-ins
    assert "the plane still runs under part of the trace" in hit.message


def test_a_plane_that_ends_for_good(tmp_path):
    (hit,) = gaps(found(tmp_path, bottom_gbr=cleared((13, -1, 21, 11))))
    assert "ends here and does not come back" in hit.message
    assert hit.at == pytest.approx((15.25, 5.0), abs=0.1)  # from the plane's end at 13 to the pad at 17.5


def inset(*boxes):
    """A plane that keeps 0.5 mm from the board's edge, as planes do, with boxes taken out."""
    return cleared((-1, -1, 21, 0.5), (-1, 9.5, 21, 11), (-1, -1, 0.5, 11), (19.5, -1, 21, 11), *boxes)


def test_a_slot_that_runs_out_of_a_plane_within_the_board(tmp_path):
    (hit,) = gaps(found(tmp_path, bottom_gbr=inset((9, -1, 9.3, 7))))
    assert "a slot in GND that runs out of the plane" in hit.message
    assert "closed end, 3.9" in hit.message  # there and back again from 5 to 7, less the hairline


def test_a_slot_within_a_plane_within_the_board(tmp_path):
    (hit,) = gaps(found(tmp_path, bottom_gbr=inset((9, 4, 9.3, 7))))
    assert "a slot in GND, 2.9" in hit.message
    assert "the return goes round its nearer end, 1.9" in hit.message


def test_two_areas_of_one_net(tmp_path):
    (hit,) = gaps(found(tmp_path, bottom_gbr=cleared((9.8, -1, 10.2, 11))))
    assert "a split between two separate pieces of GND" in hit.message


def test_a_split_softened_by_a_whole_plane_on_the_other_side(tmp_path):
    board = four()
    board.pads = []
    board.vias = [Via("S", (x, 10.0), 0.3, 0.6, 0.9, component=part, pin="1") for part, x in (("U1", 10.0), ("J1", 60.0))]
    via(board, "GND", (5, 45))
    via(board, "VDD", (75, 45))
    board.trace("S", 2, 0.2, (10, 10), (60, 10))
    board.planes = [
        Plane("GND", 1, box(0.5, 0.5, 79.5, 49.5)),
        Plane("GND", 3, box(0.5, 0.5, 30.0, 49.5)),
        Plane("VDD", 3, box(30.6, 0.5, 79.5, 49.5)),
    ]
    board.returns = ("GND", "VDD")
    (hit,) = gaps(of_board(tmp_path, board))
    assert hit.at == pytest.approx((30.3, 10.0), abs=0.05)
    assert hit.layer == "L3"
    assert "a split between GND and VDD" in hit.message
    assert "the plane above it on L2 is whole there and softens the change" in hit.message


@pytest.mark.parametrize(("first", "length"), [(1.5, 15.0), (7.0, 10.5)])
def test_a_plane_that_is_missing_for_most_of_the_way(first, length, tmp_path):
    # from the pad at 2.5 (or the plane's end) to the pad at 17.5: no run has a usual reference there, and still it does not pass
    (hit,) = gaps(found(tmp_path, bottom_gbr=cleared((first, -1, 21, 11))))
    assert hit.level == "error"
    assert hit.measured == pytest.approx(length, abs=0.05)
    assert "nothing to return on" in hit.message
