"""Drill files in Gerber format. In: an Image (mm); out: a DrillFile, its flashes as holes and its strokes as slots, in mm."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np

from impcheck.artwork.chop import chop
from impcheck.artwork.image import Aperture, Image, Kind, Transform
from impcheck.artwork.parts import DrillFile
from impcheck.errors import InputError, Problem, Remark, RemarkKind

_MOST_PROBLEMS = 20
_PLATING = {"Plated": 1, "NonPlated": 0}
_CONCENTRIC = 1e-6  # mm
Line = tuple[tuple[float, float], tuple[float, float]]


def drills_from_gerber(image: Image) -> DrillFile:
    """The holes and slots of a Gerber drill file (X2 FileFunction Plated or NonPlated, or any file named as a drill file).

    A flash of a round aperture is a hole, one of an obround aperture a slot; a straight or circular stroke of a round aperture is a slot
    (arcs are chopped to 1 um chord error). Raises InputError, with the line of each, for what no drill can make: flashes with corners,
    strokes of other apertures, regions, clear objects.
    """
    problems: list[Problem] = []
    shape = [_hole_of(aperture) for aperture in image.apertures]
    starts, ends, diameters, source = [], [], [], []
    for index in range(len(image)):
        kind, aperture = Kind(int(image.kind[index])), int(image.aperture[index])
        said = _unfit(image, index, kind, shape[aperture] if aperture >= 0 else None)
        if said:
            problems.append(Problem(image.file, int(image.line[index]), said, "a drill file holds round holes and slots only"))
            if len(problems) >= _MOST_PROBLEMS:
                break
            continue
        found = shape[aperture]
        assert found is not None  # _unfit
        diameter, reach = found
        transform = image.transforms[int(image.transform[index])]
        for start, end in _lines(image, index, kind, _turned(reach, transform)):
            starts.append(start)
            ends.append(end)
            diameters.append(diameter * transform.scale)
            source.append(index)
    if problems:
        raise InputError(problems)
    rows = np.array(source, dtype=np.int64)
    remarks = image.remarks
    if image.negative:
        remarks = (*remarks, Remark(RemarkKind.ODD, "the drill file is declared negative; its objects are holes all the same", image.file))
    return DrillFile(
        file=image.file,
        attributes=image.attributes,
        start=np.array(starts, dtype=np.float64).reshape(-1, 2),
        end=np.array(ends, dtype=np.float64).reshape(-1, 2),
        diameter=np.array(diameters, dtype=np.float64),
        plated=_plated(image)[rows] if len(rows) else np.zeros(0, np.int8),
        line=image.line[rows],
        net=image.net[rows],
        pin=image.pin[rows],
        nets=image.nets,
        pins=image.pins,
        remarks=remarks,
    )


def _hole_of(aperture: Aperture) -> tuple[float, tuple[float, float]] | None:
    """Diameter of the drill an aperture stands for and how far it moves to each side of the middle, both in mm; None: no drill makes it."""
    if aperture.shape == "circle":
        return aperture.parameters[0], (0.0, 0.0)
    if aperture.shape == "obround":
        width, height = aperture.parameters
        return min(width, height), (max(width - height, 0.0) / 2, max(height - width, 0.0) / 2)
    if aperture.shape == "macro" and len(aperture.primitives) == 1:
        (only,) = aperture.primitives
        if only.code == 1 and only.dark and math.hypot(*only.numbers[1:3]) <= _CONCENTRIC:
            return only.numbers[0], (0.0, 0.0)
    return None


def _unfit(image: Image, index: int, kind: Kind, hole: tuple[float, tuple[float, float]] | None) -> str:
    """Why an object is no hole and no slot, "" where it is one."""
    if kind is Kind.REGION:
        return "a filled region is neither a hole nor a slot"
    aperture = image.apertures[int(image.aperture[index])]
    if not image.dark[index]:
        return "a clear object stands among the holes"
    if hole is None:
        return f"aperture {aperture.code} ({aperture.shape}) is not round"
    if not hole[0] > 0:
        return f"aperture {aperture.code} has no diameter"
    if kind is not Kind.FLASH and hole[1] != (0.0, 0.0):
        return f"a slot is drawn with aperture {aperture.code}, which is not round"
    return ""


def _turned(reach: tuple[float, float], transform: Transform) -> tuple[float, float]:
    """The half length of an obround after mirroring (which changes nothing of it), rotation and scaling."""
    x, y = -reach[0] if transform.mirror_x else reach[0], -reach[1] if transform.mirror_y else reach[1]
    angle = math.radians(transform.rotation)
    c, s = math.cos(angle), math.sin(angle)
    return (c * x - s * y) * transform.scale, (s * x + c * y) * transform.scale


def _lines(image: Image, index: int, kind: Kind, reach: tuple[float, float]) -> list[Line]:
    """Start and end of the middle line of each slot an object gives."""
    (x0, y0), (x1, y1) = image.start[index].tolist(), image.end[index].tolist()
    if kind is Kind.FLASH:
        return [((x0 - reach[0], y0 - reach[1]), (x0 + reach[0], y0 + reach[1]))]
    if kind is Kind.DRAW:
        return [((x0, y0), (x1, y1))]
    cx, cy = image.centre[index].tolist()
    points = [(x, y) for x, y in chop((x0, y0), (x1, y1), (cx, cy), float(image.sweep[index])).tolist()]
    return list(pairwise(points))


def _plated(image: Image) -> np.ndarray[tuple[int], np.dtype[np.int8]]:
    """1, 0 or -1 for each object: by its aperture's function where that says so, else by the file's."""
    function = image.attributes.get(".FileFunction", ("",))
    whole = _PLATING.get(function[0] if function else "", -1)
    known = [_PLATING.get((aperture.attributes.get(".AperFunction") or ("",))[0], whole) for aperture in image.apertures]
    return np.array([*known, whole], dtype=np.int8)[image.aperture]
