"""What a file's name says, by the habits of layout tools. In: a name; out: part of the board, side and number, "" where it says none."""

from __future__ import annotations

import re
from functools import cache

Named = tuple[str, str, tuple[int, ...], bool | None]  # part, side, order, plated

NOTHING: Named = ("", "", (), None)

# suffix -> part, side. Habits in the field, common practice; the numbered ones follow below.
_SUFFIXES: dict[str, tuple[str, str]] = {
    "gtl": ("copper", "top"), "gbl": ("copper", "bottom"), "cmp": ("copper", "top"), "sol": ("copper", "bottom"),
    "top": ("copper", "top"), "bot": ("copper", "bottom"), "sld": ("copper", "bottom"),
    "gts": ("mask", "top"), "gbs": ("mask", "bottom"), "stc": ("mask", "top"), "sts": ("mask", "bottom"),
    "smt": ("mask", "top"), "smb": ("mask", "bottom"), "tsm": ("mask", "top"), "bsm": ("mask", "bottom"),
    "gko": ("outline", ""), "gm1": ("outline", ""), "gml": ("outline", ""), "dim": ("outline", ""),
    "oln": ("outline", ""), "bor": ("outline", ""),
    "gto": ("other", ""), "gbo": ("other", ""), "gtp": ("other", ""), "gbp": ("other", ""), "plc": ("other", ""), "pls": ("other", ""),
    "crc": ("other", ""), "crs": ("other", ""), "sst": ("other", ""), "ssb": ("other", ""), "spt": ("other", ""), "spb": ("other", ""),
    "tsk": ("other", ""), "bsk": ("other", ""), "tsp": ("other", ""), "bsp": ("other", ""), "fab": ("other", ""), "gd1": ("other", ""),
    "gg1": ("other", ""), "gpt": ("other", ""), "gpb": ("other", ""), "drd": ("other", ""), "ast": ("other", ""), "asb": ("other", ""),
}  # fmt: skip
_GERBER_SUFFIXES = ("gbr", "ger", "grb", "gbx", "pho", "art", "gdo", "gb", "274", "rs274x", "x274", "fph", "gerber", "")
_OTHER_WORDS = (
    r"silk|legend|overlay|screen|paste|cream|stencil|assembl|assy|fab(?:rication)?$|drill[_ -]?(?:map|drawing|chart|dwg|guide|table)"
    r"|courtyard|adhesive|glue|keep|dwgs?\b|drawing|comments?\b|eco\d|readme|pick|place|bom|carbon|peel|v[-_ ]?(?:cut|score)"
    r"|margin|user\d?\b"
)
_TOP, _BOTTOM = (
    r"top|front|component ?(?:side|mask)|\bf\b|\bcmp\b|\bcs\b|primary",
    r"bot(?:tom)?|back|solder ?side|\bb\b|\bsol\b|\bss\b|secondary",
)


@cache
def role_by_name(path: str) -> Named:
    """Part of the board, side, order and plating a file's name suggests; NOTHING where it suggests none."""
    name = path.rsplit("/", 1)[-1].casefold()
    stem, _, suffix = name.rpartition(".") if "." in name else (name, "", "")
    if suffix in _SUFFIXES and not (suffix in ("top", "bot") and re.search(_OTHER_WORDS, stem)):
        part, side = _SUFFIXES[suffix]
        return part, side, (), None
    for rank, pattern in enumerate((r"g(\d{1,2})l?", r"gp(\d{1,2})", r"in(\d{1,2})|ly(\d{1,2})")):
        match = re.fullmatch(pattern, suffix)
        if match:
            return "copper", "inner", (rank, int(next(group for group in match.groups() if group))), None
    if re.fullmatch(r"gm\d{1,2}", suffix):
        return "other", "", (), None
    if suffix in _GERBER_SUFFIXES:
        found = _by_words(stem)
        if found != NOTHING:
            return found
    return _by_library(name)


def _by_words(stem: str) -> Named:
    words = re.sub(r"[^a-z0-9]+", " ", stem)
    if re.search(_OTHER_WORDS, stem) or re.search(_OTHER_WORDS, words):
        return "other", "", (), None
    side = "top" if re.search(_TOP, words) else "bottom" if re.search(_BOTTOM, words) else ""
    if re.search(r"mask|\bsmask|resist|\bstop(?:top|bot)?", words) and not re.search(r"\bcu\b|copper", words):
        return ("mask", side, (), None) if side else ("other", "", (), None)
    if re.search(r"outline|profile|\bedges?\b|edge ?cuts|board ?edge|contour|boarder|\bborder\b|dimension|\brout(?:e|ing)\b", words):
        return "outline", "", (), None
    if re.search(r"\bdrills?\b|\bpth\b|\bnpth\b|holes", words):
        return "drill", "", (), None
    match = re.search(
        r"\b(?:in|inn|inner|internal|int|internalplane|inner l|inner layer|innerlayer|mid|midlayer|mid layer|plane) ?(\d{1,2})\b", words
    )
    if match:
        return "copper", "inner", (3, int(match[1])), None
    match = re.search(r"\b(?:copper |cu |signal )?(?:l|layer|ly|lay|lyr|group) ?(\d{1,2})\b", words)
    if match:
        return "copper", "inner", (3, int(match[1])), None
    last = words.split()[-1] if words.split() else ""
    if side and (re.search(r"copper|\bcu\b|etch|signal|layer|conductor", words) or re.fullmatch(f"{_TOP}|{_BOTTOM}", last)):
        return "copper", side, (), None
    return NOTHING


@cache
def _by_library(name: str) -> Named:
    """What the habits that gerbonara knows say of a name, where all the tools that know it agree."""
    if name.rpartition(".")[2] in ("gbr", "ger", "txt", "pdf", "csv", "md", "png", "zip", "json", "xml", "html", "step", "stp"):
        return NOTHING
    from gerbonara.layer_rules import MATCH_RULES

    found: set[Named] = set()
    for rules in MATCH_RULES.values():
        for what, pattern in rules.items():
            if not isinstance(pattern, str) or what is None or what in ("autoguess", "gerber params", "excellon params", "ipc-2581"):
                continue
            match = re.fullmatch(pattern, name, re.IGNORECASE)
            if match:
                side, _, part = what.partition(" ")
                if part == "copper" and side == "inner":
                    number = next((group for group in match.groups() if group and group.isdigit()), "")
                    found.add(("copper", "inner", (4, int(number)) if number else (), None))
                elif part in ("copper", "mask"):
                    found.add((part, side, (), None))
                elif part == "outline":
                    found.add(("outline", "", (), None))
                elif part in ("silk", "paste"):
                    found.add(("other", "", (), None))
    return found.pop() if len(found) == 1 else NOTHING
