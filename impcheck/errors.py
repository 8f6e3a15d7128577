"""Errors a user can cause, and remarks a user should read. In: what a reader found; out: text with file, line and remedy."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from enum import StrEnum


@dataclass(frozen=True, order=True)
class Problem:
    """One mistake in the input: where it is, what is wrong and what would be right."""

    file: str
    line: int  # 1-based; 0 where a line means nothing
    message: str
    remedy: str = ""

    def __str__(self) -> str:
        where = f"{self.file}:{self.line}" if self.line else self.file
        remedy = f" ({self.remedy})" if self.remedy else ""
        return f"{where}: {self.message}{remedy}"


class InputError(Exception):
    """The input cannot be used: one or more problems, all that were found in one go. Exit status 2."""

    def __init__(self, problems: Problem | Iterable[Problem]) -> None:
        found = (problems,) if isinstance(problems, Problem) else tuple(problems)
        self.problems: tuple[Problem, ...] = tuple(dict.fromkeys(found))
        super().__init__("\n".join(map(str, self.problems)))


class Problems:
    """Collects problems so that a user sees all of them at once."""

    def __init__(self) -> None:
        self.found: list[Problem] = []

    def add(self, file: str, line: int, message: str, remedy: str = "") -> None:
        """Adds one problem; line 0 where a line means nothing."""
        self.found.append(Problem(file, line, message, remedy))

    def take(self, error: InputError) -> None:
        """Adds the problems of an error that was raised."""
        self.found.extend(error.problems)

    def raise_if_any(self) -> None:
        """Raises InputError when at least one problem was added."""
        if self.found:
            raise InputError(self.found)


class RemarkKind(StrEnum):
    """Why a remark is made."""

    GUESS = "guess"  # the files do not say it; this was assumed
    ODD = "odd"  # unusual but harmless; read as described
    DISAGREEMENT = "disagreement"  # two sources differ; which one was taken
    LIMIT = "limit"  # something the result cannot know


@dataclass(frozen=True, order=True)
class Remark:
    """What the check rests on: a guess, an oddity, a disagreement or a limit that the user is told."""

    kind: RemarkKind
    text: str
    file: str = ""
    line: int = 0

    def __str__(self) -> str:
        where = f"{self.file}:{self.line}: " if self.line else f"{self.file}: " if self.file else ""
        return f"{where}{self.text}"
