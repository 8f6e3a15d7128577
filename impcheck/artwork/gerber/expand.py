"""Step-and-repeat and block apertures. In: objects as they stand in the file; out: all objects they stand for, within the limits."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from impcheck.artwork.gerber.commands import NOT_DEFINED, Commands, Structure
from impcheck.artwork.gerber.notes import Notes
from impcheck.artwork.gerber.objects import (
    Indices,
    Objects,
    composed,
    join,
    mapped,
    matrix_of,
    ranges,
    replaced,
    segments_of,
    shifted,
    take,
)
from impcheck.artwork.image import Kind, Transform
from impcheck.artwork.limits import Limits


@dataclass
class _Frame:
    """A block or repeat that is open, with what it holds so far."""

    opened: Structure | None  # None: the file itself
    parts: list[Objects] = field(default_factory=list)


class Expansion:
    """Carries out the SR and AB commands of one file."""

    def __init__(self, commands: Commands, limits: Limits, notes: Notes) -> None:
        self.commands = commands
        self.limits = limits
        self.notes = notes
        self.transforms = list(commands.transforms)
        self._blocks: dict[int, Objects] = {}  # index of the aperture: its objects
        self._made = [0, 0]  # objects and segments made so far, inside blocks too

    def run(self, flat: Objects) -> Objects:
        """All objects. Raises InputError where a limit is met or a block is never ended."""
        stack = [_Frame(None)]
        done = 0
        number = 0
        for structure in self.commands.structure:
            until = int(np.searchsorted(flat.offset, structure.offset))
            self._add(stack[-1], flat, done, until)
            done = until
            repeating = stack[-1].opened is not None and stack[-1].opened.kind == "repeat"
            if structure.kind in ("repeat", "end repeat", "end block") and repeating:
                if structure.kind == "end block":
                    self.notes.odd("a step-and-repeat ends with the block around it", structure.offset)
                self._close_repeat(stack)
            if structure.kind in ("repeat", "block"):
                if len(stack) > self.limits.nesting:
                    raise self.notes.fatal(
                        structure.offset,
                        f"blocks are nested too deeply (limit nesting = {self.limits.nesting})",
                        "export without nested blocks",
                    )
                stack.append(_Frame(structure))
            elif structure.kind == "end block":
                number += 1
                frame = stack.pop()
                self._blocks[-1 - number] = join(frame.parts) if frame.parts else take(flat, np.zeros(0, np.int64))
        self._add(stack[-1], flat, done, len(flat))
        while stack[-1].opened is not None:
            opened = stack[-1].opened
            if opened.kind == "block":
                raise self.notes.fatal(
                    opened.offset, f"the file ends inside block D{opened.code} that begins here", "the file is cut off, or %AB*% is missing"
                )
            self.notes.odd("a step-and-repeat is not ended; it ends with the file", opened.offset)
            self._close_repeat(stack)
        parts = stack[0].parts
        return join(parts) if parts else flat

    def _add(self, frame: _Frame, flat: Objects, first: int, last: int) -> None:
        if first < last:
            part = flat if last - first == len(flat) else take(flat, np.arange(first, last))
            frame.parts.append(self._with_blocks(part))

    def _close_repeat(self, stack: list[_Frame]) -> None:
        frame = stack.pop()
        if frame.opened is None or not frame.parts:
            return
        content = join(frame.parts)
        (columns, rows), (dx, dy) = frame.opened.counts, frame.opened.steps
        copies = columns * rows
        self._check(
            len(content) * copies, len(content.segment_sweep) * copies, frame.opened.offset, f"a step-and-repeat of {columns} x {rows}"
        )
        out = take(content, np.tile(np.arange(len(content)), copies))
        x, y = np.meshgrid(np.arange(columns) * dx, np.arange(rows) * dy, indexing="ij")  # a column upwards, then the next to the right
        stack[-1].parts.append(shifted(out, np.repeat(np.column_stack([x.ravel(), y.ravel()]), len(content), axis=0)))

    def _check(self, objects: int, segments: int, offset: int | None, what: str) -> None:
        objects += self._made[0]
        segments += self._made[1]
        self._made = [objects, segments]
        if objects > self.limits.objects:
            raise self.notes.fatal(
                offset, f"{what} makes {objects:,} objects (limit objects = {self.limits.objects:,})", "check the counts"
            )
        if segments > self.limits.vertices:
            raise self.notes.fatal(
                offset, f"{what} makes {segments:,} vertices (limit vertices = {self.limits.vertices:,})", "check the counts"
            )

    def _with_blocks(self, part: Objects) -> Objects:
        """Every flash of a block replaced by the block's objects: turned, scaled and moved; a clear flash swaps dark and clear."""
        placed = (part.kind == Kind.FLASH) & (part.aperture <= -2) & (part.aperture > NOT_DEFINED)
        if not placed.any():
            return part
        used = sorted({int(code) for code in np.unique(part.aperture[placed])} & set(self._blocks), reverse=True)
        pool = [part, *(self._blocks[code] for code in used)]
        sizes = np.array([len(p) for p in pool], np.int64)
        weights = np.array([len(p.segment_sweep) for p in pool], np.int64)
        which = np.zeros(len(part), np.int64)
        for k, code in enumerate(used, 1):
            which[placed & (part.aperture == code)] = k
        counts = np.where(which > 0, sizes[which], 1)
        # Python's whole numbers do not overflow, whatever the nesting multiplies up to.
        total = sum(map(int, counts))
        segments = len(part.segment_sweep) + sum(
            int(weights[k]) * int(n) for k, n in enumerate(np.bincount(which, minlength=len(pool))) if k
        )
        self._check(total, segments, int(part.offset[np.flatnonzero(placed)[0]]), "flashing blocks")
        first = np.where(which > 0, (np.cumsum(sizes) - sizes)[which], np.arange(len(part)))
        out = take(join(pool), ranges(first, counts))
        flash = np.repeat(np.arange(len(part)), counts)
        return self._placed(out, part, flash, which[flash] > 0)

    def _placed(self, out: Objects, part: Objects, flash: Indices, inner: np.ndarray[tuple[int], np.dtype[np.bool_]]) -> Objects:
        for index in np.unique(part.transform[flash[inner]]):
            outer = self.transforms[int(index)]
            if outer == Transform():
                continue
            mine = inner & (part.transform[flash] == index)
            turned = mapped(out, matrix_of(outer))
            owner = segments_of(out)
            pairs = {f: (mine if not f.startswith("segment") else mine[owner]) for f in _PLACES}
            out = replaced(
                out,
                transform=self.turned(out, outer, mine & (out.kind != Kind.REGION)),
                **{
                    f: np.where(sel[:, None] if getattr(out, f).ndim == 2 else sel, getattr(turned, f), getattr(out, f))
                    for f, sel in pairs.items()
                },
            )
        out = shifted(out, np.where(inner[:, None], part.start[flash], 0.0))
        names = {
            # What stands inside a block keeps its own net; else it is that of the flash.
            name: np.where(inner & (getattr(out, name) < 0), getattr(part, name)[flash], getattr(out, name)).astype(np.int32)
            for name in ("net", "pin", "component")
        }
        return replaced(out, dark=np.where(inner & ~part.dark[flash], ~out.dark, out.dark), **names)

    def turned(
        self, objects: Objects, outer: Transform, which: np.ndarray[tuple[int], np.dtype[np.bool_]]
    ) -> np.ndarray[tuple[int], np.dtype[np.int32]]:
        """The transform column (n,) with `outer` done after the transforms of the chosen objects."""
        column = objects.transform.copy()
        for index in np.unique(objects.transform[which]):
            new = composed(outer, self.transforms[int(index)])
            if new not in self.transforms:
                self.transforms.append(new)
            column[which & (objects.transform == index)] = self.transforms.index(new)
        return column


_PLACES = ("start", "end", "centre", "sweep", "segment_start", "segment_centre", "segment_sweep")
