"""Gerber files that stand for drills. In: an Image; out: a DrillFile in mm."""

from __future__ import annotations

import numpy as np

from impcheck.artwork.image import Image, Kind
from impcheck.artwork.parts import DrillFile
from impcheck.errors import InputError, Problem

CHORD = 0.001  # mm, of routed arcs


def drills_from_gerber(image: Image) -> DrillFile:
    """Round flashes are holes, strokes of round apertures slots. Raises InputError where something else is drawn."""
    start, end, owner = [], [], []
    diameter_of = [aperture.parameters[0] if aperture.shape == "circle" else np.nan for aperture in image.apertures]
    for index in range(len(image)):
        if not image.dark[index]:
            raise InputError(Problem(image.file, int(image.line[index]), "a clear object in a drill file", "drill files hold dark flashes and draws only"))
        if image.kind[index] == Kind.REGION or np.isnan(diameter_of[image.aperture[index]]):
            what = "a region" if image.kind[index] == Kind.REGION else "an aperture that is not round"
            raise InputError(Problem(image.file, int(image.line[index]), f"{what} in a drill file", "holes are flashes or draws of round apertures"))
        points = np.array([image.start[index], image.end[index]])
        if image.kind[index] == Kind.ARC:
            points = _chopped(image, index)
        start.extend(points[:-1])
        end.extend(points[1:])
        owner.extend([index] * (len(points) - 1))
    mine = np.array(owner, np.int64)
    scale = np.array([transform.scale for transform in image.transforms])
    function = image.attributes.get(".FileFunction", ("",))[0]
    plated = {"Plated": 1, "NonPlated": 0}.get(function, -1)
    return DrillFile(
        file=image.file,
        attributes=image.attributes,
        start=np.array(start, float).reshape(-1, 2),
        end=np.array(end, float).reshape(-1, 2),
        diameter=np.array(diameter_of, float)[image.aperture[mine]] * scale[image.transform[mine]] if len(mine) else np.empty(0),
        plated=np.full(len(mine), plated, np.int8),
        line=image.line[mine],
        net=image.net[mine],
        pin=image.pin[mine],
        nets=image.nets,
        pins=image.pins,
        remarks=image.remarks,
    )


def _chopped(image: Image, index: int) -> np.ndarray[tuple[int, int], np.dtype[np.float64]]:
    centre, sweep = image.centre[index], float(image.sweep[index])
    arm = image.start[index] - centre
    radius = float(np.hypot(*arm))
    step = 2 * np.arccos(max(0.0, 1 - CHORD / max(radius, CHORD)))
    phi = np.arctan2(arm[1], arm[0]) + sweep * np.linspace(0, 1, max(1, int(np.ceil(abs(sweep) / max(step, 1e-3)))) + 1)
    points = centre + radius * np.column_stack([np.cos(phi), np.sin(phi)])
    points[0], points[-1] = image.start[index], image.end[index]
    return points
