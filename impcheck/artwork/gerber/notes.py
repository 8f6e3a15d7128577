"""What one file has wrong or odd. In: byte offsets and sentences; out: problems and remarks with 1-based line numbers."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from impcheck.artwork.image import Ints
from impcheck.errors import InputError, Problem, Remark, RemarkKind

MOST_PROBLEMS = 20  # of one file; a file with more is broken as a whole


class Notes:
    """Collects problems (the file cannot be used) and remarks (it can, read as described) of one file."""

    def __init__(self, file: str, data: bytes) -> None:
        self.file = file
        raw = np.frombuffer(data, np.uint8)
        breaks = np.flatnonzero(raw == 10)
        self._breaks: NDArray[np.int64] = breaks if len(breaks) else np.flatnonzero(raw == 13)  # CR-only files exist
        self._problems: dict[Problem, None] = {}
        self._remarks: dict[tuple[RemarkKind, str], list[int]] = {}

    def lines(self, offsets: ArrayLike) -> Ints:
        """Lines (n,) that hold the byte offsets (n,)."""
        return (np.searchsorted(self._breaks, np.asarray(offsets), side="left") + 1).astype(np.int32)

    def line(self, offset: int) -> int:
        """The line that holds one byte offset."""
        return int(np.searchsorted(self._breaks, offset, side="left")) + 1

    def error(self, offset: int, message: str, remedy: str = "") -> None:
        """Notes a mistake; reading goes on to find more. Raises InputError when there are too many to be worth it."""
        self._problems[Problem(self.file, self.line(offset), message, remedy)] = None
        if len(self._problems) >= 10 * MOST_PROBLEMS:
            self.raise_if_any()

    def fatal(self, offset: int | None, message: str, remedy: str = "") -> InputError:
        """The error to raise for a mistake after which nothing more can be read; with those found before it. None: no line."""
        last = Problem(self.file, 0 if offset is None else self.line(offset), message, remedy)
        return InputError([*sorted(self._problems)[: MOST_PROBLEMS - 1], last])

    def remark(self, kind: RemarkKind, text: str, offset: int | None = None) -> None:
        """Notes an oddity; the same text again only counts."""
        self._remarks.setdefault((kind, text), []).append(0 if offset is None else self.line(offset))

    def odd(self, text: str, offset: int | None = None) -> None:
        """Notes something unusual but harmless."""
        self.remark(RemarkKind.ODD, text, offset)

    def raise_if_any(self) -> None:
        """Raises InputError with the first problems, by line."""
        if not self._problems:
            return
        found = sorted(self._problems)
        more = len(found) - MOST_PROBLEMS
        if more > 0:
            found = [
                *found[:MOST_PROBLEMS],
                Problem(self.file, 0, f"at least {more} more problems of this kind follow", "export the file again"),
            ]
        raise InputError(found)

    def remarks(self) -> tuple[Remark, ...]:
        """All remarks, each text once, at its first line."""
        found = []
        for (kind, text), lines in self._remarks.items():
            times = f" ({len(lines)} times)" if len(lines) > 1 else ""
            found.append(Remark(kind, text + times, self.file, min(lines)))
        return tuple(sorted(found, key=lambda remark: (remark.line, remark.text)))
