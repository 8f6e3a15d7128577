"""Holes as columns, and their repeats. In: holes and offsets in mm; out: five numbers and four integers a hole, in drilling order."""

from __future__ import annotations

from array import array

from impcheck.artwork.limits import Limits
from impcheck.errors import InputError, Problem


class Holes:
    """What has been drilled so far. `geometry` holds x0, y0, x1, y1, diameter (mm) of each hole, `info` its line, plating, net and pin."""

    def __init__(self, file: str, limits: Limits) -> None:
        self.file, self.most = file, limits.objects
        self.geometry, self.info = array("d"), array("i")
        self.first: int | None = None  # first hole of the pattern being recorded (M25)
        self.pattern: tuple[int, int] | None = None  # the pattern recorded, up to M01
        self.offset = (0.0, 0.0)  # of its last copy
        self.steps = 0  # how many M02 commands repeated it

    def __len__(self) -> int:
        return len(self.info) // 4

    def add(self, numbers: tuple[float, float, float, float, float], info: tuple[int, int, int, int]) -> None:
        """One more hole. Raises InputError at the limit."""
        self.geometry.extend(numbers)
        self.info.extend(info)
        if len(self.info) > 4 * self.most:
            raise self.too_many(info[0])

    def too_many(self, line: int) -> InputError:
        """The error for a file that drills more holes than the limit allows."""
        return InputError(Problem(self.file, line, f"the file drills more than {self.most:,} holes", f"limit objects = {self.most:,}"))

    def repeat(self, times: int, x: float, y: float, line: int) -> None:
        """R3X2Y0: the last hole or slot three times more, each a step farther. Raises InputError where that goes past the limit."""
        last = len(self)
        if last + times > self.most:
            raise self.too_many(line)
        for time in range(1, times + 1):
            self._copy(last - 1, last, time * x, time * y, line)

    def begin(self) -> None:
        """M25: a pattern begins."""
        self.first, self.pattern = len(self), None

    def finish(self) -> None:
        """M01: the pattern ends. Without a pattern this is a stop of the machine."""
        if self.first is not None:
            self.pattern, self.first = (self.first, len(self)), None
            self.offset, self.steps = (0.0, 0.0), 0

    def step(self, times: int, x: float, y: float, line: int) -> None:
        """M02X10: the pattern once more (R4M02X10: four times), each copy counted from the one before. Raises InputError at the limit."""
        if self.pattern is None:
            return
        first, last = self.pattern
        if len(self) + times * (last - first) > self.most:
            raise self.too_many(line)
        self.steps += 1
        for _ in range(times if last > first else 0):
            self.offset = self.offset[0] + x, self.offset[1] + y
            self._copy(first, last, *self.offset, line)

    def _copy(self, first: int, last: int, x: float, y: float, line: int) -> None:
        for hole in range(first, last):
            x0, y0, x1, y1, diameter = self.geometry[5 * hole : 5 * hole + 5]
            self.geometry.extend((x0 + x, y0 + y, x1 + x, y1 + y, diameter))
            self.info.extend((line, *self.info[4 * hole + 1 : 4 * hole + 4]))
