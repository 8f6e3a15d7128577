"""Names and shell patterns. In: a pattern and names; out: the names it means, and what a misspelt name was meant to be."""

from __future__ import annotations

import difflib
import re
from collections.abc import Iterable
from fnmatch import fnmatchcase


def matching(pattern: str, names: Iterable[str]) -> list[str]:
    """Names a pattern stands for, in natural order. A name with brackets of its own (DATA[3]) matches itself before it is a pattern."""
    known = list(names)
    if pattern in known:
        return [pattern]
    return sorted((name for name in known if fnmatchcase(name, pattern)), key=natural)


def natural(name: str) -> tuple[tuple[int, int | str], ...]:
    """A sort key in which D2 stands before D10."""
    return tuple((0, int(part)) if part.isascii() and part.isdigit() else (1, part) for part in re.split(r"([0-9]+)", name) if part)


def did_you_mean(name: str, names: Iterable[str], otherwise: str = "the files name none") -> str:
    """A remedy that names what was probably meant (case does not count), or lists some of the names there are, or says `otherwise`."""
    known = sorted(set(names), key=natural)
    folded = {choice.casefold(): choice for choice in reversed(known)}
    near = difflib.get_close_matches(name[:100].casefold(), folded, 1, 0.6)  # the measure of likeness takes quadratic time
    if near:
        return f"did you mean '{folded[near[0]]}'?"
    if not known:
        return otherwise
    shown = ", ".join(known[:8])
    return f"there are {shown}" + (", ..." if len(known) > 8 else "")
