"""Reads one Gerber file. In: its bytes; out: an Image of typed arrays, lengths in mm, angles in radians (sweeps) or degrees (apertures)."""

from __future__ import annotations

import re

import numpy as np

from impcheck.artwork.gerber.commands import INCH, Commands
from impcheck.artwork.gerber.expand import Expansion
from impcheck.artwork.gerber.graphics import draw
from impcheck.artwork.gerber.notes import Notes
from impcheck.artwork.gerber.objects import Objects, mapped, matrix_of, replaced, shifted
from impcheck.artwork.gerber.scan import Piece, scan
from impcheck.artwork.gerber.whole import Whole
from impcheck.artwork.gerber.words import Rows, rows_of
from impcheck.artwork.image import Contours, Image, Kind, Transform
from impcheck.artwork.limits import Limits
from impcheck.errors import InputError, Problem, RemarkKind

_DEFAULTS = Limits()


def read_gerber(data: bytes, file: str, limits: Limits = _DEFAULTS) -> Image:
    """Reads a Gerber file (X1, X2, X3, with what older writers did).

    data: the file's bytes. file: its name as shown to the user. Raises InputError with all mistakes found (at most 20), each with
    its line. Written from the Gerber Layer Format Specification (Ucamco, revisions of 2012 to 2024), cited from memory.
    """
    if len(data) > limits.file_bytes:
        raise InputError(Problem(file, 0, f"the file has {len(data):,} bytes", f"limit file_bytes = {limits.file_bytes:,}"))
    data = data.removeprefix(b"\xef\xbb\xbf")
    notes = Notes(file, data)
    found = scan(data, notes)
    rows = rows_of(found.plain, notes)
    commands = Commands(found.pieces, _first_unit(found.pieces, rows, notes), limits, notes)
    if not commands.formats:
        notes.raise_if_any()
        raise notes.fatal(None, "the coordinate format is missing", "a Gerber file starts with a line like %FSLAX46Y46*%")
    flat = draw(rows, commands, notes)
    notes.raise_if_any()
    if len(flat) > limits.objects:
        raise notes.fatal(None, f"the file holds {len(flat):,} objects", f"limit objects = {limits.objects:,}")
    if len(flat.segment_sweep) > limits.vertices:
        raise notes.fatal(None, f"the regions hold {len(flat.segment_sweep):,} vertices", f"limit vertices = {limits.vertices:,}")
    expansion = Expansion(commands, limits, notes)
    objects = _whole(expansion.run(flat), commands.whole, expansion, notes)
    if not rows.ended:
        notes.odd("the file does not end with M02", max(len(found.plain) - 1, 0))
    if not len(objects):
        notes.odd("the file draws nothing")
    return _image(file, objects, expansion, commands, notes)


def _first_unit(pieces: tuple[Piece, ...], rows: Rows, notes: Notes) -> float:
    """mm of the unit that holds from the start: the first MO, else the first G70 or G71, else inches."""
    for _, text, comment in pieces:
        match = None if comment or b"MO" not in text else re.search(rb"(?:^|\*)\s*MO\s*(MM|IN)", text)
        if match:
            return 1.0 if match[1] == b"MM" else INCH
    said = rows.unit[rows.unit >= 0]
    if len(said):
        notes.odd(
            "the unit is said by G70 or G71 only (withdrawn from the specification)", int(rows.offset[np.flatnonzero(rows.unit >= 0)[0]])
        )
        return 1.0 if said[0] == 71 else INCH
    notes.remark(RemarkKind.GUESS, "the file does not say its unit; inches are assumed, as in the oldest files")
    return INCH


def _whole(objects: Objects, whole: Whole, expansion: Expansion, notes: Notes) -> Objects:
    """The image-wide commands, in the order the specification fixes whatever their order in the file: MI, SF, OF, IR, AS (from memory)."""
    a, b = whole.scale
    if a != b and (np.any(objects.sweep) or np.any(objects.segment_sweep)):
        raise notes.fatal(None, "SF scales the two axes differently, which makes arcs elliptic", "export at true size")
    if whole.mirror != (False, False) or whole.scale != (1.0, 1.0):
        # MI and SF change coordinates, not apertures.
        factors = np.array([-a if whole.mirror[0] else a, -b if whole.mirror[1] else b])
        turns = float(np.sign(factors[0] * factors[1]))
        objects = replaced(
            objects,
            **{name: getattr(objects, name) * factors for name in ("start", "end", "centre", "segment_start", "segment_centre")},
            **{name: getattr(objects, name) * turns for name in ("sweep", "segment_sweep")},
        )
        notes.odd("MI or SF changes the whole image: places are mirrored and scaled, apertures are not")
    if whole.offset != (0.0, 0.0):
        objects = shifted(objects, np.tile(whole.offset, (len(objects), 1)))
        notes.odd("OF moves the whole image")
    for turn in (Transform(rotation=whole.rotation), Transform(mirror_x=True, rotation=270.0) if whole.swap else Transform()):
        if turn != Transform():
            chosen = objects.kind != Kind.REGION
            objects = replaced(mapped(objects, matrix_of(turn)), transform=expansion.turned(objects, turn, chosen))
            notes.odd("IR or AS turns the whole image")
    return objects


def _image(file: str, objects: Objects, expansion: Expansion, commands: Commands, notes: Notes) -> Image:
    attributes = commands.attributes.file
    polarity = attributes.get(".FilePolarity", ())
    return Image(
        file=file,
        attributes=dict(attributes),
        negative=commands.whole.negative or polarity[:1] == ("Negative",),
        apertures=tuple(commands.apertures),
        transforms=tuple(expansion.transforms),
        kind=objects.kind,
        dark=objects.dark,
        aperture=objects.aperture,
        transform=objects.transform,
        start=objects.start,
        end=objects.end,
        centre=objects.centre,
        sweep=objects.sweep,
        contours=Contours(
            object=objects.contour_object,
            first=np.concatenate([[0], np.cumsum(objects.contour_size)]).astype(np.int32),
            start=objects.segment_start,
            centre=objects.segment_centre,
            sweep=objects.segment_sweep,
        ),
        line=notes.lines(objects.offset),
        net=objects.net,
        pin=objects.pin,
        component=objects.component,
        nets=tuple(commands.attributes.objects.nets),
        pins=tuple(commands.attributes.objects.pins),
        components=tuple(commands.attributes.objects.components),
        remarks=notes.remarks(),
    )
