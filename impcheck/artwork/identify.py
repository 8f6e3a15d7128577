"""What one fabrication file is. In: its first bytes and its name; out: its Role (copper, mask, outline, drill) and how that is known."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from enum import IntEnum
from functools import cache

from impcheck.artwork.identify_names import role_by_name

SNIFF = 20_000  # bytes that tell what a file is; file attributes stand in the header


class Source(IntEnum):
    """How it is known what a file is, the strongest first."""

    BOARD_FILE = 0
    ATTRIBUTE = 1
    JOB_FILE = 2
    NAME = 3

    def __str__(self) -> str:
        return ("the board file", "its file attribute", "the job file", "its name")[self]


@dataclass(frozen=True)
class Role:
    """What a file is. `part`: copper, mask, outline, drill, other (known, and no part of the check), or "" (not known)."""

    part: str
    source: Source
    layer: int | None = None  # copper: 1 = top; drill: first layer it passes, as the file says
    last: int | None = None  # drill: last layer it passes
    side: str = ""  # copper and mask: "top", "bottom"; copper: "inner" where the layer's number is not sure
    order: tuple[int, ...] = ()  # copper by name: the number in the name, which counts inner layers in some tools and all in others
    plated: bool | None = None  # drill


UNKNOWN = Role("", Source.NAME)

_ATTRIBUTE = re.compile(rb"(?:%|#@!)\s*TF\.FileFunction,([^*%\r\n]*)")
_GERBER = re.compile(
    rb"%\s*(?:FS|MO|AD|AM|LP|TF|IN|IP|OF|SF|AS|LN|SR)|\bG04\b[^*]*\*|^\s*(?:G54)?D[1-9]\d+\*|X-?\d+(?:Y-?\d+)?D0?[123]\*", re.MULTILINE
)
_EXCELLON = re.compile(
    rb"^[ \t]*(?:M48|T\d{1,5}(?:[CFSBHZ]\d{0,9}\.?\d{1,9}){1,6})[ \t]*(?:[;(].*)?\r?$|^[ \t]*%[ \t]*\r?\n[ \t]*(?:T\d|G\d|M\d|X|Y)",
    re.MULTILINE,
)
_EXCELLON_BODY = re.compile(rb"^[ \t]*T\d{1,4}[ \t]*\r?\n[ \t]*(?:G0?5[ \t]*\r?\n[ \t]*)?[XY][-+]?[\d.]", re.MULTILINE)
_IPC356 = re.compile(
    rb"^(?:P  (?:JOB|UNITS|VER|TITLE|CODE|NUM|REV|IMAGE|NNAME)|3[0-8][0-9].{20,60}X[+\- ]?\d)", re.MULTILINE | re.IGNORECASE
)
DRILL_SUFFIXES = (".drl", ".xln", ".exc", ".tap", ".nc", ".cnc", ".ncd", ".drill")
_TEXT = bytes([9, 10, 12, 13, *range(32, 127)])
_BINARY = re.compile(rb"\A(?:%PDF|PK\x03\x04|\x89PNG|\xff\xd8\xff|GIF8|BM|\x1f\x8b|7z\xbc\xaf|Rar!)|\x00")


def content_kind(head: bytes) -> str:
    """What the first bytes of a file look like: gerber, excellon, netlist, job, binary, or "" (some text, or nothing)."""
    if _BINARY.search(head[:2000]) or len(head.translate(None, _TEXT)) > 0.2 * len(head):
        return "binary"
    text = head.removeprefix(b"\xef\xbb\xbf").lstrip()
    if text.startswith(b"{"):
        return "job" if re.search(rb'"(?:FilesAttributes|MaterialStackup|GeneralSpecs)"', text) else ""
    if text.startswith(b"<"):
        return ""
    if len(_IPC356.findall(head)) >= 2:
        return "netlist"
    if re.search(rb"^[ \t]*M48[ \t]*(?:[;(].*)?\r?$", head, re.MULTILINE):
        return "excellon"
    if _GERBER.search(head):
        return "gerber"
    if _EXCELLON.search(head) or _EXCELLON_BODY.search(head):
        return "excellon"
    return ""


def function_in(head: bytes) -> tuple[str, ...]:
    """The values of the .FileFunction attribute in the first bytes of a file, also in a comment; () where there is none."""
    match = _ATTRIBUTE.search(head)
    return () if match is None else split_function(match[1].decode("utf-8", "replace"))


def split_function(text: str) -> tuple[str, ...]:
    """The fields of a file function."""
    return tuple(part.strip() for part in text.split(","))


def role_of_function(function: Sequence[str], source: Source) -> Role:
    """The role a file function gives (Gerber Layer Format Specification, attribute .FileFunction, cited from memory)."""
    kind = function[0].casefold() if function else ""
    rest = [part.casefold() for part in function[1:]]
    if kind == "copper":
        number = re.fullmatch(r"l([1-9]\d{0,2})", rest[0]) if rest else None
        if number is None:
            return Role("copper", source)
        side = {"top": "top", "bot": "bottom"}.get(rest[1], "") if len(rest) > 1 else ""
        return Role("copper", source, layer=int(number[1]), side=side)
    if kind == "soldermask":
        side = {"top": "top", "bot": "bottom"}.get(rest[0] if rest else "", "")
        outermost = len(rest) < 2 or rest[1] in ("", "1")
        return Role("mask", source, side=side) if side and outermost else Role("other", source)
    if kind == "profile":
        return Role("outline", source)
    if kind in ("plated", "nonplated"):
        numbers = [int(part) for part in rest[:2] if re.fullmatch(r"[1-9]\d{0,2}", part)]
        first, last = (min(numbers), max(numbers)) if len(numbers) == 2 else (None, None)
        return Role("drill", source, layer=first, last=last, plated=kind == "plated")
    return Role("other", source) if kind else UNKNOWN


def role_of_name(name: str, kind: str) -> Role:
    """The role a file's name suggests, by the habits of layout tools. `kind` is what its content looks like: by it a drill file is one."""
    part, side, order, plated = role_by_name(name)
    if kind == "excellon" or (kind == "" and name.lower().endswith(DRILL_SUFFIXES)):  # empty ones are told of later
        return Role("drill", Source.NAME)
    if kind in ("netlist", "job", "binary") or (part == "drill" and kind == "gerber"):
        return Role("other", Source.NAME)
    return Role(part, Source.NAME, side=side, order=order, plated=plated)


@cache
def plating_in(name: str) -> bool | None:
    """What a drill file's name says of plating."""
    words = re.sub(r"[^a-z]+", " ", name.rsplit("/", 1)[-1].casefold())
    if re.search(r"\b(?:npth|np|npt|non ?plated|unplated|nonpth)\b|npth|non ?plated|unplated", words):
        return False
    if re.search(r"\bpth\b|pth\b|plated|\bvias?\b", words):
        return True
    return None


def span_in(name: str, count: int) -> tuple[int, int] | None:
    """The span a drill file's name says: 1-based first and last copper layer of `count`, None where it says none."""
    stem = name.rsplit("/", 1)[-1].rsplit(".", 1)[0].casefold()
    match = re.search(r"(?<![a-z])(?:l|ly|layer)_?(\d{1,2})(?:-|_|to|_to_)+(?:l|ly|layer)_?(\d{1,2})(?!\d)", stem)
    match = match or re.search(r"(?<![a-z])(?:vias?|blind|buried|drills?)[-_](\d{1,2})[-_](\d{1,2})(?!\d)", stem)
    if match:
        first, last = int(match[1]), int(match[2])
    else:
        words = {"front": 1, "top": 1, "back": count, "bottom": count, "bot": count}
        match = re.search(r"(?<![a-z])(front|top|in\d{1,2})(?:_cu)?-(back|bottom|bot|in\d{1,2})(?:_cu)?(?![a-z0-9])", stem)
        if not match:
            return None
        first, last = (words[word] if word in words else int(word[2:]) + 1 for word in match.groups())
    return (first, last) if 1 <= first < last <= count else None


def back_drill_in(name: str) -> bool:
    """True where a drill file's name says that it holds back-drills."""
    return re.search(r"back[-_ ]?drill", name.rsplit("/", 1)[-1], re.IGNORECASE) is not None


def number_inner(roles: Mapping[str, Role], free: Sequence[int]) -> dict[str, int]:
    """Layer numbers of copper files whose names only say which inner layer they are.

    `free` holds the numbers of the layers that no file has yet, rising. As many files as free layers: in the order of the numbers in their
    names. Otherwise the numbers are taken to count all layers (L2, L3) when they are among the free ones, else nothing is told. {} where it
    cannot be told: two names with one number, or none.
    """
    orders = sorted((role.order, name) for name, role in roles.items())
    if not orders or any(not order for order, _ in orders) or len({order for order, _ in orders}) < len(orders):
        return {}
    if len({order[0] for order, _ in orders}) > 1:  # signal and plane files numbered separately: how they alternate is not said
        return {}
    if len(orders) == len(free):
        return {name: layer for (_, name), layer in zip(orders, free, strict=True)}
    counted = {name: order[1] for order, name in orders}
    return counted if set(counted.values()) <= set(free) else {}
