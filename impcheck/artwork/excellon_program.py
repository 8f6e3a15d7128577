"""Carries out the blocks of a drill file. In: its lines and a Format; out: columns of holes and slots in mm, problems and remarks.

Written from the Excellon CNC-7 command set and the XNC Format Specification (Ucamco 2021), both cited from memory.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence

from impcheck.artwork.excellon_format import Format
from impcheck.artwork.excellon_holes import Holes
from impcheck.artwork.excellon_notes import NotedTool, Notes
from impcheck.artwork.excellon_route import Route
from impcheck.artwork.excellon_tools import Tools
from impcheck.artwork.limits import Limits
from impcheck.errors import Problem, Remark, RemarkKind

FARTHEST = 5_000.0  # mm; no board reaches farther out
MOST_PROBLEMS = 20
_NUMBER = r"[+-]?(?:\d+\.?\d*|\.\d+)"
_HIT = re.compile(rf"\s*(?:X({_NUMBER}))?(?:Y({_NUMBER}))?\s*")
_WORD = re.compile(rf"([A-Z])({_NUMBER})")
_SETTING = re.compile(
    r"(?:INCH|METRIC|FMAT|ICI|VER|ATC|AFS|BLKD|CCW|CP|DETECT|DN|DTMDIST|EXDA|FSB|HPCK|LCOR|NCSL|OM48|OSTOP|OTCLMP|PCKPARA?M|PF|PLTOFF|RSB|R,"
    r"|SBK|SG|SIXM|T,|TCST|UP|ZA|ZC|ZS|P,|[ZSFB][+-]?[\d.]+$|M4[57](?!\d)|\$)"
)
_UNREAD = {
    "G32": "a routed circle cycle",
    "G33": "a routed circle cycle",
    "G82": "a dual in-line cycle",
    "G83": "an eight-pin cycle",
    "G84": "a circle cycle",
    "M70": "a repeat with swapped axes",
    "M80": "a mirrored repeat",
    "M90": "a mirrored repeat",
    "M99": "a subroutine",
}
# Stops, tips and lights of the machine, feeds, and words whose effect is told elsewhere (M71, M72, G70, G71 in the Format).
_NO_EFFECT = {"M06", "M09", "M18", "M21", "M22", "M47", "M60", "M71", "M72", "G07", "G70", "G71", "G80"}


class Program:
    """The machine while it works through one file. Each hole is five numbers (start, end, diameter) and four integers."""

    def __init__(self, file: str, limits: Limits, form: Format, noted: dict[int, NotedTool], selects: bool) -> None:
        self.file = file
        self.number: Callable[[str], float] = form.reader()
        self.notes = Notes()
        self.tools = Tools(noted, form.unit, self.number)
        self.route = Route(self._add, self._remark)
        self.holes = Holes(file, limits)
        self.problems: list[Problem] = []
        self._remarks: dict[tuple[RemarkKind, str], list[int]] = {}
        self.x = self.y = 0.0
        self.incremental = self.in_header = self.ended = self.text = False
        self.tool: int | None = None
        self.named: int | None = None  # the tool last named in the header
        self.diameter: float | None = None
        self.plated = -1
        self.counted = bool(noted) and not selects  # no T words: M00 changes to the next tool of the table
        self.blamed: set[object] = set()
        self.last_line = 0

    def run(self, lines: Sequence[str]) -> None:
        """Works through all lines. Raises InputError where a limit is met."""
        if self.counted:
            self._select(min(self.tools.noted), 0)
        hit, number_of = _HIT.fullmatch, self.number
        geometry, info, most = self.holes.geometry, self.holes.info, 4 * self.holes.most
        for number, raw in enumerate(lines, 1):
            if self._plain() and (match := hit(raw)) and (match[1] or match[2]):
                x, y = match.groups()
                try:
                    if x:
                        self.x = number_of(x)
                    if y:
                        self.y = number_of(y)
                except (ValueError, OverflowError):
                    self._problem(number, f"the coordinate '{raw.strip()[:40]}' is too long", "export the drill file again")
                    continue
                geometry.extend((self.x, self.y, self.x, self.y, self.diameter or 0.0))
                info.extend((number, self.plated, self.notes.net, self.notes.pin))
                self.last_line = number
                if len(info) > most:
                    raise self.holes.too_many(number)
                continue
            self._line(raw, number)
            if len(self.problems) >= MOST_PROBLEMS:
                break
        self.route.lift(self.x, self.y, self.last_line)

    def remarks(self) -> tuple[Remark, ...]:
        """All remarks, each text once, at its first line."""
        found = []
        for (kind, text), lines in self._remarks.items():
            times = f" ({len(lines)} times)" if len(lines) > 1 else ""
            found.append(Remark(kind, text + times, self.file, lines[0]))
        return tuple(found)

    def _plain(self) -> bool:
        """True while a line of coordinates is one hole."""
        return not (self.in_header or self.ended or self.text or self.route.on or self.incremental or self.diameter is None)

    def _problem(self, line: int, message: str, remedy: str, key: object = None) -> None:
        if key is None or key not in self.blamed:
            self.problems.append(Problem(self.file, line, message, remedy))
            self.blamed.add(key)

    def _remark(self, text: str, line: int, kind: RemarkKind = RemarkKind.ODD) -> None:
        self._remarks.setdefault((kind, text), []).append(line)

    def _line(self, raw: str, number: int) -> None:
        text, semicolon, comment = raw.partition(";")
        if semicolon:
            odd = self.notes.read(comment, number)
            if odd:
                self._remark(odd, number)
            self._settle_plating()
        text = re.sub(r"\([^)]*\)?|\s", "", text).upper()
        text = re.sub(r"^N\d+", "", text)
        if text.startswith("/"):
            text = text[1:]
            if text:
                self._remark("an optional block (/) was carried out", number)
        if not text:
            return
        if self.ended:
            if text != "%":
                self._remark("what follows the end of the program (M30) was left out", number)
            return
        self.last_line = number
        if self.text:
            self.text = False
            return
        if text in ("%", "M95"):
            if self.in_header:
                self.in_header = False
                self.notes.type = -1
        elif text == "M48":
            self.in_header = True
        elif text.startswith(("M97", "M98")):
            self.text = True
            self._remark("drilled text (M97, M98) was left out", number, RemarkKind.LIMIT)
        elif _SETTING.match(text):
            self._setting(text, number)
        else:
            words = _WORD.findall(text)
            if sum(len(letter) + len(value) for letter, value in words) == len(text):
                self._block(words, number)
            elif self.in_header and text[0] not in "TXYG":
                self._remark(f"'{raw.strip()[:40]}' in the header is not known; it has no effect here", number)
            else:
                self._problem(number, f"'{raw.strip()[:40]}' is no drill command", "export the drill file again, as Excellon or XNC")

    def _setting(self, text: str, number: int) -> None:
        if text.startswith("ICI"):
            self.incremental = text in ("ICI", "ICI,ON")
        elif text.startswith("FMAT") and text != "FMAT,2":
            self._remark(f"the command format {text} is read like FMAT,2", number)

    def _block(self, words: list[tuple[str, str]], number: int) -> None:
        """One line of words."""
        place: dict[str, float] = {}
        slot: tuple[float, float] | None = None
        repeat: int | None = None
        tool: int | None = None
        size: str | None = None
        step = False
        for index, (letter, value) in enumerate(words):
            if letter in "TGMR" and not value.isdigit():
                said = f"{letter}{value[:24]} is no code; a whole number stands behind {letter}"
                self._problem(number, said, "export the drill file again, as Excellon or XNC")
                return
            if letter in "XYIJA":
                if self.in_header and letter in "XY":
                    self._remark("the header does not end with %; the first coordinate ends it", number)
                    self.in_header = False
                    if self.named is not None:
                        self._select(self.named, number)
                if letter in place:
                    self._go(place, slot, number)
                    place, slot = {}, None
                try:
                    place[letter] = self.number(value)
                except (ValueError, OverflowError):
                    place[letter] = float("inf")
                if not abs(place[letter]) <= FARTHEST:
                    said = f"{letter}{value[:24]} is {place[letter]:.4g} mm, farther out than any board reaches"
                    self._problem(number, said, "state the format of the numbers, as in METRIC,TZ,000.000", "far")
                    return
            elif letter == "G":
                code = f"G{int(value[:9]):02d}"
                if code in ("G85", "G87"):
                    slot = self._target(place)
                    place = {}
                elif code == "G04":
                    return  # a pause, whose X is a time
                elif code == "G93":
                    self._zero(words[index + 1 :], number)
                    return
                else:
                    self._preparatory(code, number)
            elif letter == "M":
                code = f"M{int(value[:9]):02d}"
                if code == "M02" and index + 1 < len(words):
                    step = True
                    continue
                if place:
                    self._go(place, slot, number)
                    place, slot = {}, None
                self._auxiliary(code, number)
            elif letter == "T":
                tool = self.tools.code(value, any(other == "C" for other, _ in words[index + 1 :]))
            elif letter == "C" and tool is not None:
                size = value
            elif letter == "R":
                repeat = int(value[:18])
            elif letter not in "FSBHZ":
                self._problem(number, f"the word {letter}{value[:24]} is not known", "export the drill file again, as Excellon or XNC")
                return
            if tool is not None and (index + 1 == len(words) or words[index + 1][0] not in "CFSBHZ"):
                self._tool(tool, size, number)
                tool = None
        if step:
            self._step(place, repeat or 1, number)
        elif repeat is not None:
            self._repeat(place, repeat, number)
        elif place or slot is not None:
            self._go(place, slot, number)

    # tools

    def _tool(self, code: int, size: str | None, number: int) -> None:
        if size is not None or self.in_header:
            odd = self.tools.define(code, size, self.notes, number)
            if odd:
                self._remark(odd, number)
        if self.in_header:
            self.named = code
        elif code == 0 and self.tools.diameter(0) is None:
            self.tool = self.diameter = None  # the tool is put away
            self.route.end(self.x, self.y, number)
        else:
            self._select(code, number)

    def _select(self, code: int, number: int) -> None:
        self.route.end(self.x, self.y, number)
        self.tool, self.diameter = code, self.tools.diameter(code)
        if code not in self.tools.table and self.diameter is not None:
            self._remark("tool diameters are those of the table in the comments", self.tools.noted[code].line or number, RemarkKind.GUESS)
        self._settle_plating()

    def _settle_plating(self) -> None:
        """What the next holes are: by the comment in the body, else their tool, else the whole file (filled in at the end)."""
        tool = -1 if self.tool is None else self.tools.plated(self.tool)
        self.plated = self.notes.type if self.notes.type >= 0 and not self.in_header else tool  # in the header it speaks of the tools
        if self.plated < 0 and self.tool is not None:
            self.plated = self.notes.by_start(self.tool)

    # holes

    def _add(self, x0: float, y0: float, x1: float, y1: float, number: int) -> None:
        if self.diameter is None:
            self._blame_tool(number)
            return
        self.holes.add((x0, y0, x1, y1, self.diameter), (number, self.plated, self.notes.net, self.notes.pin))

    def _blame_tool(self, number: int) -> None:
        if self.tool is None:
            self._problem(number, "a hole is drilled before any tool is selected", "write a tool before it, as in T1", "none")
        elif self.tool not in self.tools.table:
            remedy = f"define it in the header, as in T{self.tool}C0.300"
            self._problem(number, f"tool T{self.tool} is not defined", remedy, self.tool)
        else:
            said = "has no diameter" if self.tools.table[self.tool].diameter is None else "has an impossible diameter"
            remedy = f"write it in the header, as in T{self.tool}C0.300, or in a comment, as in ; T{self.tool} = 0.300mm"
            self._problem(number, f"tool T{self.tool} {said}", remedy, self.tool)

    def _target(self, place: dict[str, float]) -> tuple[float, float]:
        if self.incremental:
            return self.x + place.get("X", 0.0), self.y + place.get("Y", 0.0)
        return place.get("X", self.x), place.get("Y", self.y)

    def _go(self, place: dict[str, float], slot: tuple[float, float] | None, number: int) -> None:
        """Moves to a place and makes there, or on the way, what the mode asks for."""
        if slot is not None:
            self.x, self.y = slot
        x, y = self._target(place)
        if slot is not None:
            if not place:
                self._problem(number, "a slot (G85) has no end", "write it as X...Y...G85X...Y...")
            self._add(*slot, x, y, number)
        elif self.route.on:
            said = self.route.move((self.x, self.y), (x, y), place, number)
            if said:
                self._problem(number, said, "write an arc as G02X...Y...A<radius>, or with I and J for its centre")
        elif place.keys() & {"X", "Y"}:
            self._add(x, y, x, y, number)
        self.x, self.y = x, y

    def _zero(self, words: list[tuple[str, str]], number: int) -> None:
        if any(float(value) != 0 for letter, value in words if letter in "XY"):
            said = "G93 moves the origin, so that the holes lie elsewhere than their numbers say"
            self._problem(number, said, "export the drill file with its origin at 0")

    def _preparatory(self, code: str, number: int) -> None:
        if code in ("G00", "G01", "G02", "G03"):
            self.route.begin(int(code[1:]), self.x, self.y, number)
        elif code in ("G05", "G81"):
            self.route.end(self.x, self.y, number)
        elif code in ("G90", "G91"):
            self.incremental = code == "G91"
        elif code in ("G40", "G41", "G42"):
            if code != "G40":
                said = "cutter compensation (G41, G42) was not applied: routed slots lie along the path as written"
                self._remark(said, number, RemarkKind.LIMIT)
        elif code not in _NO_EFFECT:
            self._unread(code, number)

    def _auxiliary(self, code: str, number: int) -> None:
        if code in ("M14", "M15"):
            self.route.plunge()
        elif code in ("M16", "M17"):
            self.route.lift(self.x, self.y, number)
        elif code == "M00" and self.counted:
            later = [tool for tool in self.tools.noted if self.tool is not None and tool > self.tool]
            if later:
                self._select(min(later), number)
        elif code == "M00":
            self.route.end(self.x, self.y, number)
        elif code in ("M30", "M02"):
            if code == "M30" or self.holes.pattern is None:
                self.ended = True
                if code == "M02":
                    self._remark("the program ends with M02, which is read like M30", number)
        elif code == "M25":
            self.holes.begin()
        elif code == "M01":
            self.holes.finish()
        elif code == "M08":
            self.holes.pattern = None
        elif code not in _NO_EFFECT:
            self._unread(code, number)

    def _unread(self, code: str, number: int) -> None:
        what = _UNREAD.get(code)
        said = f"{code} ({what}) is not read" if what else f"the code {code} is not known"
        self._problem(number, said, "export the drill file with plain holes, slots and routes", code)

    # repeats

    def _repeat(self, place: dict[str, float], times: int, number: int) -> None:
        x, y = place.get("X", 0.0), place.get("Y", 0.0)
        if self.diameter is None:
            self._blame_tool(number)
        elif not len(self.holes):
            self._problem(number, "a repeat (R) follows no hole", "write the hole before it")
        else:
            self.holes.repeat(times, x, y, number)
            self.x, self.y = self.x + times * x, self.y + times * y

    def _step(self, place: dict[str, float], times: int, number: int) -> None:
        if self.holes.pattern is None:
            self._problem(number, "a repeat (M02) follows no pattern", "a pattern stands between M25 and M01")
            return
        self.holes.step(times, place.get("X", 0.0), place.get("Y", 0.0), number)
        if self.holes.steps > 1:
            said = "several repeats of one pattern (M02): each offset is counted from the copy before it"
            self._remark(said, number, RemarkKind.GUESS)
