"""Step-and-repeat, block apertures and aperture transforms, and how they nest. Expected places are worked out by hand (exact)."""

from __future__ import annotations

import numpy as np
import pytest

from impcheck.artwork.gerber import read_gerber
from impcheck.artwork.gerber.objects import composed, matrix_of
from impcheck.artwork.image import Image, Kind, Transform
from impcheck.artwork.limits import Limits
from impcheck.errors import InputError

DEFAULTS = Limits()
HEAD = "%FSLAX33Y33*%%MOMM*%%ADD10C,0.5*%%ADD11R,2X1*%D10*G01*"


def read(body: str, limits: Limits = DEFAULTS) -> Image:
    return read_gerber((HEAD + body + "M02*").encode(), "tide.gbr", limits)


def transforms(image: Image) -> list[Transform]:
    return [image.transforms[k] for k in image.transform]


def test_step_and_repeat_goes_up_first_then_right() -> None:
    image = read("%SRX2Y3I10J5*%X1000Y0D03*%SR*%X0Y0D03*")
    assert image.start.tolist() == [[1, 0], [1, 5], [1, 10], [11, 0], [11, 5], [11, 10], [0, 0]]


def test_each_copy_is_drawn_whole_before_the_next() -> None:
    # The specification repeats the block, not its objects: polarity alternates.
    image = read("%SRX2Y1I10J0*%X0Y0D03*%LPC*%X1000Y0D03*%SR*%")
    assert image.dark.tolist() == [True, False, True, False]


def test_step_and_repeat_in_inches() -> None:
    text = "%FSLAX24Y24*%%MOIN*%%ADD10C,0.1*%D10*%SRX2Y1I1.0J0*%X0Y0D03*%SRX1Y1I0J0*%M02*"
    assert read_gerber(text.encode(), "tide.gbr").start.tolist() == [[0, 0], [25.4, 0]]


def test_a_new_step_and_repeat_ends_the_one_before() -> None:
    image = read("%SRX2Y1I10J0*%X0Y0D03*%SRX1Y2I0J10*%X1000Y0D03*%SR*%X2000Y0D03*")
    assert image.start.tolist() == [[0, 0], [10, 0], [1, 0], [1, 10], [2, 0]]


def test_repeated_regions_and_arcs_move_with_their_contours() -> None:
    image = read("G75*%SRX2Y1I10J0*%G36*X0Y0D02*X1000D01*Y1000D01*X0Y0D01*G37*X1000Y0D02*G03X1000Y0I1000J0D01*%SR*%")
    assert image.kind.tolist() == [Kind.REGION, Kind.ARC] * 2
    assert image.contours.object.tolist() == [0, 2]
    assert image.contours.first.tolist() == [0, 3, 6]
    assert image.contours.start[3:].tolist() == [[10, 0], [11, 0], [11, 1]]
    assert image.centre[[1, 3]].tolist() == [[2, 0], [12, 0]]
    assert image.start[2].tolist() == [10, 0]


def test_a_block_aperture_is_placed_where_it_is_flashed() -> None:
    image = read("%ABD20*%X1000Y0D03*D11*X0Y1000D03*%AB*%D20*X5000Y5000D03*D10*X0Y0D03*")
    assert image.start.tolist() == [[6, 5], [5, 6], [0, 0]]
    assert [image.apertures[k].code for k in image.aperture] == ["D10", "D11", "D10"]
    assert len(image.apertures) == 2  # blocks leave no aperture behind


def test_a_clear_flash_swaps_dark_and_clear_inside_a_block() -> None:
    image = read("%ABD20*%X0Y0D03*%LPC*%X1000Y0D03*%LPD*%%AB*%D20*X0Y0D03*%LPC*%X9000D03*")
    assert image.dark.tolist() == [True, False, False, True]


def test_a_block_is_mirrored_then_rotated_then_scaled_with_its_places() -> None:
    # (1, 0) and a draw to (2, 1): mirrored in x (-1, 0), (-2, 1); rotated by 90 degrees (0, -1), (-1, -2); doubled (0, -2), (-2, -4).
    image = read("%ABD20*%X1000Y0D02*X2000Y1000D01*%AB*%%LMX*%%LR90*%%LS2*%D20*X10000Y10000D03*")
    np.testing.assert_allclose(image.start, [[10, 8]], atol=1e-12)
    np.testing.assert_allclose(image.end, [[8, 6]], atol=1e-12)
    assert transforms(image) == [Transform(True, False, 90, 2)]


def test_arcs_and_regions_inside_a_mirrored_block_turn_the_other_way() -> None:
    image = read(
        "G75*%ABD20*%X1000Y0D02*G03X0Y1000I-1000J0D01*G36*X0Y0D02*G01X1000D01*G03X0Y1000I-1000J0D01*G01Y0D01*G37*%AB*%%LMY*%D20*X0Y0D03*"
    )
    np.testing.assert_allclose(image.sweep[0], -np.pi / 2)
    np.testing.assert_allclose(image.end[0], [0, -1], atol=1e-12)
    np.testing.assert_allclose(image.contours.sweep, [0, -np.pi / 2, 0], atol=1e-12)
    np.testing.assert_allclose(image.contours.start, [[0, 0], [1, 0], [0, -1]], atol=1e-12)
    assert image.transform[1] == 0  # a region's transform is in its contour already


def test_blocks_in_blocks_compose() -> None:
    # Inner: a rectangle at (1, 0), rotated by 30. Middle flashes it at (0, 2), rotated by 90: place (0, 3), rotation 120.
    # Outer flash mirrored in x at (10, 0): place (10, 3), mirrored, rotation -120 = 240.
    image = read("%ABD20*%D11*%LR30*%X1000Y0D03*%LR0*%%AB*%%ABD21*%D20*%LR90*%X0Y2000D03*%LR0*%%AB*%%LMX*%D21*X10000Y0D03*")
    np.testing.assert_allclose(image.start, [[10, 3]], atol=1e-12)
    assert transforms(image) == [Transform(True, False, 240, 1)]


def test_a_block_defined_inside_a_block() -> None:
    image = read("%ABD20*%X0Y0D03*%ABD21*%X1000Y0D03*%AB*%D21*X0Y1000D03*%AB*%D20*X5000Y0D03*D21*X0Y0D03*")
    assert image.start.tolist() == [[5, 0], [6, 1], [1, 0]]


def test_step_and_repeat_inside_a_block_and_a_block_inside_it() -> None:
    image = read("%ABD20*%%SRX2Y1I3J0*%X0Y0D03*%SR*%%AB*%%SRX1Y2I0J7*%D20*X1000Y0D03*%SR*%")
    assert image.start.tolist() == [[1, 0], [4, 0], [1, 7], [4, 7]]
    turned = read("%ABD20*%%SRX2Y1I3J0*%X0Y0D03*%SR*%%AB*%%LR90*%D20*X1000Y0D03*")
    np.testing.assert_allclose(turned.start, [[1, 0], [1, 3]], atol=1e-12)


def test_the_net_of_a_flash_goes_to_what_has_none_inside_the_block() -> None:
    image = read("%ABD20*%X0Y0D03*%TO.N,TIDE*%X1000D03*%TD*%%AB*%%TO.N,GND*%D20*X0Y0D03*")
    assert [image.nets[k] for k in image.net] == [("GND",), ("TIDE",)]


def test_transforms_hold_for_flashes_draws_and_arcs_not_regions() -> None:
    image = read("G75*D11*%LMXY*%%LR-90*%%LS0.5*%X0Y0D03*X1000D01*G02X0Y0I-500J0D01*G36*X0Y0D02*G01X1D01*Y1D01*X0Y0D01*G37*%LMN*%X0Y0D03*")
    turned = Transform(True, True, 270, 0.5)
    assert transforms(image) == [turned, turned, turned, Transform(), Transform(False, False, 270, 0.5)]
    assert image.transforms[0] == Transform()


@pytest.mark.parametrize(
    "outer", [Transform(True, False, 30, 2), Transform(False, True, 100, 0.5), Transform(True, True, 77), Transform(rotation=90)]
)
@pytest.mark.parametrize("inner", [Transform(True, False, 10, 3), Transform(False, True, 45), Transform(), Transform(True, True, 200)])
def test_composition_is_the_product_of_the_matrices(outer: Transform, inner: Transform) -> None:
    np.testing.assert_allclose(matrix_of(composed(outer, inner)), matrix_of(outer) @ matrix_of(inner), atol=1e-12)


@pytest.mark.parametrize(
    ("body", "message"),
    [
        ("%SRX1000000000Y1I0J0*%X0Y0D03*%SR*%", "makes 1,000,000,000 objects (limit objects = 5,000,000)"),
        ("%SRX100000Y100000I1J1*%X0Y0D03*%SR*%", "limit objects"),
        ("%SRX0Y1I1J1*%X0Y0D03*%SR*%", "out of range"),
        ("%SRQ*%X0Y0D03*", "no step and repeat"),
        ("%ABD20*%X0Y0D03*", "the file ends inside block D20"),
        ("%AB*%", "ends that was not begun"),
        ("%ABD20*%D20*X0Y0D03*%AB*%", "used before it ends"),
        ("%ABD20*%X0Y0D03*%AB*%D20*X0Y0D02*X1000D01*", "a draw with a block aperture"),
        ("%ABD5*%X0Y0D03*%AB*%", "no block aperture"),
        ("%LMZ*%X0Y0D03*", "unknown mirroring"),
        ("%LRx*%X0Y0D03*", "has no number"),
        ("%LS0*%X0Y0D03*", "out of range"),
        ("%LPX*%X0Y0D03*", "unknown polarity"),
        ("G36*X0Y0D02*%LPC*%X1000D01*Y1000D01*X0Y0D01*G37*", "a polarity command inside a region"),
        ("G36*X0Y0D02*%SRX2Y2I1J1*%X1000D01*Y1000D01*X0Y0D01*G37*", "inside a region"),
    ],
)
def test_what_is_refused(body: str, message: str) -> None:
    with pytest.raises(InputError) as caught:
        read(body)
    assert message in caught.value.problems[0].message
    assert caught.value.problems[0].line == 1
    assert caught.value.problems[0].remedy


def test_blocks_that_multiply_are_stopped_before_memory_is_spent() -> None:
    # Ten flashes of a block of ten flashes of a block ...: 10^15 objects.
    body = "%ABD20*%X0Y0D03*%AB*%"
    for code in range(21, 36):
        body += f"%ABD{code}*%D{code - 1}*" + "".join(f"X{k}Y0D03*" for k in range(10)) + "%AB*%"
    with pytest.raises(InputError, match="limit objects"):
        read(body + "D35*X0Y0D03*")


def test_many_repeats_one_after_the_other_count_together() -> None:
    with pytest.raises(InputError, match="limit objects"):
        read("%SRX30Y30I1J1*%X0Y0D03*%SR*%" * 5, Limits(objects=3000))


def test_nesting_is_limited() -> None:
    body = "".join(f"%ABD{code}*%" for code in range(20, 40)) + "X0Y0D03*" + "%AB*%" * 20
    with pytest.raises(InputError, match="limit nesting = 16"):
        read(body)


def test_repeated_vertices_are_limited() -> None:
    region = "G36*X0Y0D02*X1000D01*Y1000D01*X0Y0D01*G37*"
    with pytest.raises(InputError, match="limit vertices"):
        read("%SRX30Y30I1J1*%" + region + "%SR*%", Limits(vertices=1000))
