"""Image-wide commands (withdrawn, met in old files): IP, MI, SF, OF, IR, AS. Their fixed order and their effects are cited from memory."""

from __future__ import annotations

import numpy as np
import pytest

from impcheck.artwork.gerber import read_gerber
from impcheck.artwork.image import Image, Transform
from impcheck.errors import InputError

BODY = "%FSLAX33Y33*%%MOMM*%%ADD10R,2X1*%D10*X1000Y2000D02*G75*G03X2000Y3000I0J1000D01*D03*"


def read(commands: str, body: str = BODY) -> Image:
    return read_gerber(f"{commands}{body}M02*".encode(), "tide.gbr")


@pytest.mark.parametrize(
    ("commands", "start", "sign", "transform"),
    [
        ("%MIA1B0*%", (-1, 2), -1, Transform()),
        ("%MIB1*%", (1, -2), -1, Transform()),
        ("%MIA1B1*%", (-1, -2), 1, Transform()),
        ("%MIA0B0*%", (1, 2), 1, Transform()),
        ("%SFA2.0B2.0*%", (2, 4), 1, Transform()),
        ("%MOMM*%%OFA10B-1*%", (11, 1), 1, Transform()),
        ("%IR90*%", (-2, 1), 1, Transform(rotation=90)),
        ("%IR180*%", (-1, -2), 1, Transform(rotation=180)),
        ("%IR270*%", (2, -1), 1, Transform(rotation=270)),
        ("%ASAYBX*%", (2, 1), -1, Transform(True, False, 270)),
        ("%ASAXBY*%", (1, 2), 1, Transform()),
        ("%MOMM*%%IR90*OFA10*MIA1*%", (-2, 9), -1, Transform(rotation=90)),  # MI, OF, IR: (-1, 2), (9, 2), (-2, 9)
    ],
)
def test_places_arcs_and_apertures(commands: str, start: tuple[float, float], sign: int, transform: Transform) -> None:
    image = read(commands)
    np.testing.assert_allclose(image.start[0], start, atol=1e-12)
    np.testing.assert_allclose(image.sweep[0], sign * np.pi / 2, atol=1e-12)
    assert image.transforms[image.transform[1]] == transform
    plain = read("")
    distance = np.hypot(*(plain.start[0] - plain.centre[0])) * (2 if "SF" in commands else 1)
    np.testing.assert_allclose(np.hypot(*(image.start[0] - image.centre[0])), distance)


def test_swapped_axes_swap_an_apertures_sides() -> None:
    image = read("%ASAYBX*%")
    transform = image.transforms[image.transform[1]]
    corner = np.array([1.0, 0.5])  # of the 2 x 1 rectangle
    angle = np.radians(transform.rotation)
    mirrored = corner * (-1 if transform.mirror_x else 1, 1)
    turned = [np.cos(angle) * mirrored[0] - np.sin(angle) * mirrored[1], np.sin(angle) * mirrored[0] + np.cos(angle) * mirrored[1]]
    np.testing.assert_allclose(np.abs(turned), [0.5, 1.0])


def test_offset_in_inches() -> None:
    text = "%MOIN*%%OFA1B0*%%FSLAX24Y24*%%ADD10C,0.1*%D10*X0Y0D03*M02*"
    assert read_gerber(text.encode(), "tide.gbr").start.tolist() == [[25.4, 0]]


@pytest.mark.parametrize(
    ("commands", "negative"),
    [
        ("", False),
        ("%IPPOS*%", False),
        ("%IPNEG*%", True),
        ("%TF.FilePolarity,Negative*%", True),
        ("%TF.FilePolarity,Positive*%", False),
        ("G04 #@! TF.FilePolarity,Negative*", True),
        ("%IPNEG*%%TF.FilePolarity,Negative*%", True),
        ("%IPNEG*LPD*%", True),
    ],
)
def test_negative_images(commands: str, negative: bool) -> None:
    image = read(commands)
    assert image.negative is negative
    assert image.dark.all()  # polarity of the objects is not changed by it


@pytest.mark.parametrize(
    ("command", "message"),
    [
        ("IR45", "not one of the values"),
        ("IPXXX", "not one of the values"),
        ("ASAXBX", "not one of the values"),
        ("MIC1", "no mirroring"),
        ("SFA0", "out of range"),
        ("SFA1B2C3", "no two numbers"),
        ("OFA99999999", "out of range"),
        ("ICEB", "another character code"),
        ("IFother.gbr", "unknown command 'IFother.gbr'"),
        ("KOC", "unknown command 'KOC'"),
    ],
)
def test_what_is_refused(command: str, message: str) -> None:
    with pytest.raises(InputError) as caught:
        read(f"%{command}*%")
    assert message in caught.value.problems[0].message
    assert caught.value.problems[0].remedy


def test_an_included_file_is_refused_with_a_remedy() -> None:
    with pytest.raises(InputError, match="put its contents into this file"):
        read("%IFother.gbr*%")


def test_unequal_scales_and_arcs_do_not_go_together() -> None:
    with pytest.raises(InputError, match="elliptic"):
        read("%SFA1B2*%")
    assert read("%SFA1B2*%", "%FSLAX33Y33*%%MOMM*%%ADD10R,2X1*%D10*X1000Y2000D03*").start.tolist() == [[1, 4]]
