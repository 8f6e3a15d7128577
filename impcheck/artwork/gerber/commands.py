"""Carries out the %...% commands of a file. In: its pieces; out: tables, and changes by byte offset; lengths in mm, angles in degrees."""

from __future__ import annotations

import re
from dataclasses import dataclass, replace
from typing import Literal

from impcheck.artwork.gerber.apertures import FARTHEST, parse_aperture
from impcheck.artwork.gerber.attributes import Attributes, fields
from impcheck.artwork.gerber.macro import Macro, MacroError, parse_macro
from impcheck.artwork.gerber.notes import Notes
from impcheck.artwork.gerber.scan import Piece
from impcheck.artwork.gerber.whole import NUMBER, WHOLE, Whole, WholeError
from impcheck.artwork.image import Aperture, Transform
from impcheck.artwork.limits import Limits

INCH = 25.4
_LINE_END = re.compile(rb"[\r\n]")
_STANDARD_COMMENT = re.compile(r"G\s*0*4\s*#@!\s*(T[FAOD])(.*)", re.DOTALL)
_MACRO_BLOCK = re.compile(r"\s*(?:[\d$-]|$|G0*4\b)")
_MOST_WORK = 5_000_000  # numbers and operators of all macros evaluated; real boards stay under a million
_MOST_ATTRIBUTES = 1_000  # aperture attributes at one time; the specification knows about ten
NOT_DEFINED = -1_000_000  # index of an aperture whose definition could not be read; that is an error of its own


@dataclass(frozen=True)
class Format:
    """How coordinate numbers are written (FS)."""

    trailing: bool  # trailing zeros left out
    incremental: bool
    digits: tuple[tuple[int, int], tuple[int, int]]  # (integer, decimal) digits of x, of y


@dataclass(frozen=True)
class Structure:
    """An SR or AB command, in the order of the file."""

    offset: int
    kind: Literal["repeat", "end repeat", "block", "end block"]
    code: int = 0  # of a block aperture
    counts: tuple[int, int] = (1, 1)
    steps: tuple[float, float] = (0.0, 0.0)  # mm


class Commands:
    """The commands of one file, carried out in order."""

    def __init__(self, pieces: tuple[Piece, ...], unit: float, limits: Limits, notes: Notes) -> None:
        """unit: mm of the unit that holds before a MO command."""
        self.notes = notes
        self.limits = limits
        self.mm = unit
        self.formats: list[tuple[int, Format]] = []
        self.units: list[tuple[int, float]] = [(-1, unit)]
        self.apertures: list[Aperture] = []
        self.blocks = 0
        self.definitions: dict[int, list[tuple[int, int]]] = {}  # code: (offset, index), index -2 and below for blocks
        self.transforms: dict[Transform, int] = {Transform(): 0}
        self.dark: list[tuple[int, bool]] = [(-1, True)]
        self.transform: list[tuple[int, int]] = [(-1, 0)]
        self.structure: list[Structure] = []
        self.whole = Whole()
        self.attributes = Attributes()
        self._macros: dict[str, Macro] = {}
        self._transform = Transform()
        self._work = 0
        self._open_blocks: list[int] = []
        names = self.attributes.objects
        seen: dict[bytes, tuple[int, int]] = {}  # a board repeats its nets; each text is taken apart once
        for offset, text, comment in pieces:
            known = seen.get(text)
            if known:
                names.change(offset, *known)
            elif comment:
                self._comment(text, offset)
            elif text == b"TD*" and not self.attributes.aperture:
                names.change(offset, *names.deleted(""))
            elif text.startswith((b"TO.N,", b"TO.P,", b"TO.C,")) and text.find(b"*") == len(text) - 1 and not _LINE_END.search(text):
                name, values = fields(self._text(text[2:-1], offset).strip())
                seen[text] = names.entry(name, values)
                names.change(offset, *seen[text])
            else:
                self._piece(text, offset)

    def transform_index(self, transform: Transform) -> int:
        """Index of a transform in the table, which grows."""
        return self.transforms.setdefault(transform, len(self.transforms))

    def _comment(self, raw: bytes, offset: int) -> None:
        if b"#@!" in raw:
            match = _STANDARD_COMMENT.fullmatch(self._text(raw, offset))
            if match:
                self._attribute(match[1], match[2], offset)

    def _text(self, raw: bytes, offset: int) -> str:
        try:
            return raw.decode()
        except UnicodeDecodeError:
            self.notes.odd("text that is not UTF-8 is read as Latin-1", offset)
            return raw.decode("latin-1")

    def _piece(self, text: bytes, offset: int) -> None:
        parts = self._text(text, offset).split("*")
        if parts[-1].strip():
            self.notes.odd("a %...% command does not end with *", offset)
        elif len(parts) == 1:
            return
        at = offset + 1
        position = 0
        while position < len(parts):
            raw = parts[position]
            where = at + len(raw) - len(raw.lstrip())
            at += len(raw) + 1
            position += 1
            if raw[:2] in ("TO", "TA", "TD", "TF"):
                self._attribute(raw[:2], raw[2:], where)
                continue
            command = "".join(raw.split())
            if not command:
                continue
            if command[:2] in ("TO", "TA", "TD", "TF"):
                self._attribute(command[:2], raw.strip()[2:], where)
                continue
            if command.startswith("AM"):
                body = []
                while position < len(parts) and _MACRO_BLOCK.match(parts[position]):
                    body.append(parts[position])
                    at += len(parts[position]) + 1
                    position += 1
                self._macro(command[2:], body, where)
                continue
            method = _METHODS.get(command[:2])
            if re.match(r"\s*G0*4\b", raw):
                continue  # a comment inside of %...%
            if command[:2] in WHOLE:
                self._whole(command[:2], command[2:], where)
            elif method is None:
                self.notes.error(where, f"unknown command '{command[:24]}'", _UNKNOWN.get(command[:2], "remove it, or export as Gerber X2"))
            else:
                method(self, command[2:], where)

    def _attribute(self, command: str, text: str, offset: int) -> None:
        if "\n" in text or "\r" in text:
            text = text.replace("\n", "").replace("\r", "")
        odd = self.attributes.apply(command, text.strip(), offset)
        if odd:
            self.notes.odd(odd, offset)
        if len(self.attributes.aperture) > _MOST_ATTRIBUTES:
            raise self.notes.fatal(offset, "too many aperture attributes", f"limit {_MOST_ATTRIBUTES:,} at one time; %TD*% drops them")

    def _macro(self, name: str, body: list[str], offset: int) -> None:
        if not name:
            self.notes.error(offset, "a macro without a name", "as in AMDONUT*1,1,$1,0,0*1,0,$2,0,0*")
            return
        if name in self._macros:
            self.notes.odd(f"the macro '{name}' is defined twice; apertures use the one before them", offset)
        try:
            self._macros[name] = parse_macro(name, body)
        except MacroError as error:
            self.notes.error(offset, f"macro '{name}': {error.message}", error.remedy)
            self._macros[name] = Macro(name, ())

    def _aperture(self, text: str, offset: int) -> None:
        line = self.notes.line(offset)
        macro = self._macros.get(re.sub(r"^D\d*", "", text.split(",", 1)[0]))
        self._work += macro.cost if macro else 1
        if self._work > _MOST_WORK:
            raise self.notes.fatal(offset, "the aperture macros take too long to work out", f"limit {_MOST_WORK:,} numbers in all")
        try:
            code, aperture, odd = parse_aperture(
                text,
                self._macros,
                mm=self.mm,
                most_primitives=self.limits.macro_primitives,
                attributes=self.attributes.aperture,
                line=line,
            )
        except MacroError as error:
            self.notes.error(offset, error.message, error.remedy)
            match = re.match(r"D(\d{1,9})", text)
            if match:
                self.definitions.setdefault(int(match[1]), []).append((offset, NOT_DEFINED))
            return
        for sentence in odd:
            self.notes.odd(sentence, offset)
        self._work += 10 * len(aperture.primitives)
        self._define(code, len(self.apertures), offset)
        self.apertures.append(aperture)

    def _define(self, code: int, index: int, offset: int) -> None:
        known = self.definitions.setdefault(code, [])
        if known:
            self.notes.odd(f"aperture D{code} is defined twice; what is selected later uses the later one", offset)
        known.append((offset, index))

    def _format(self, text: str, offset: int) -> None:
        match = re.fullmatch(r"([LTD]?)([AI]?)(?:[NGDM]\d+)*X(\d)(\d)Y(\d)(\d)(?:[ZNGDM]\d+)*", text)
        if not match:
            self.notes.error(offset, f"'FS{text[:24]}' is no coordinate format", "as in %FSLAX46Y46*%")
            return
        if match[1] in ("", "D") or not match[2]:
            self.notes.odd("the format leaves something out; read as leading zeros omitted, absolute", offset)
        if match[1] == "T":
            self.notes.odd("trailing zeros are left out (withdrawn from the specification)", offset)
        x, y = (int(match[3]), int(match[4])), (int(match[5]), int(match[6]))
        self.formats.append((offset, Format(match[1] == "T", match[2] == "I", (x, y))))

    def _unit(self, text: str, offset: int) -> None:
        if text not in ("MM", "IN"):
            self.notes.error(offset, f"unknown unit 'MO{text[:12]}'", "%MOMM*% or %MOIN*%")
            return
        mm = 1.0 if text == "MM" else INCH
        if len(self.units) > 1 and mm != self.mm:
            self.notes.odd("the unit changes within the file", offset)
        self.mm = mm
        self.units.append((offset, mm))

    def _polarity(self, text: str, offset: int) -> None:
        if text not in ("D", "C"):
            self.notes.error(offset, f"unknown polarity 'LP{text[:12]}'", "%LPD*% is dark, %LPC*% is clear")
            return
        self.dark.append((offset, text == "D"))

    def _change(self, offset: int, transform: Transform) -> None:
        self._transform = transform
        self.transform.append((offset, self.transform_index(transform)))

    def _mirror(self, text: str, offset: int) -> None:
        if text not in ("N", "X", "Y", "XY", "YX"):
            self.notes.error(offset, f"unknown mirroring 'LM{text[:12]}'", "N, X, Y or XY")
            return
        self._change(offset, replace(self._transform, mirror_x="X" in text, mirror_y="Y" in text))

    def _rotate(self, text: str, offset: int) -> None:
        value = self._number("LR", text, offset)
        if value is not None:
            self._change(offset, replace(self._transform, rotation=value % 360.0))

    def _scale(self, text: str, offset: int) -> None:
        value = self._number("LS", text, offset)
        if value is not None and not 0 < value <= FARTHEST:
            self.notes.error(offset, f"scale {value:g} out of range", "a scale is over 0")
        elif value is not None:
            self._change(offset, replace(self._transform, scale=value))

    def _number(self, name: str, text: str, offset: int) -> float | None:
        if re.fullmatch(NUMBER, text):
            return float(text)
        self.notes.error(offset, f"'{name}{text[:24]}' has no number", f"as in %{name}1.5*%")
        return None

    def _repeat(self, text: str, offset: int) -> None:
        match = re.fullmatch(rf"(?:X(\d{{1,12}}))?(?:Y(\d{{1,12}}))?(?:I({NUMBER}))?(?:J({NUMBER}))?", text)
        if not match:
            self.notes.error(offset, f"'SR{text[:24]}' is no step and repeat", "as in %SRX2Y3I5.0J4.0*%")
            return
        counts = int(match[1] or 1), int(match[2] or 1)
        steps = float(match[3] or 0) * self.mm, float(match[4] or 0) * self.mm
        if 0 in counts or max(abs(step) for step in steps) > FARTHEST:
            self.notes.error(offset, f"'SR{text[:24]}': a number is out of range", "at least one copy; steps of less than 10 m")
            return
        if counts == (1, 1):
            self.structure.append(Structure(offset, "end repeat"))
        else:
            self.structure.append(Structure(offset, "repeat", 0, counts, steps))

    def _block(self, text: str, offset: int) -> None:
        match = re.fullmatch(r"D(\d{1,9})", text)
        if not text:
            if not self._open_blocks:
                self.notes.error(offset, "a block aperture ends that was not begun", "%ABD12*% begins block D12, %AB*% ends it")
                return
            code = self._open_blocks.pop()
            self.structure.append(Structure(offset, "end block", code))
            self.blocks += 1
            self._define(code, -1 - self.blocks, offset)
        elif not match or int(match[1]) < 10:
            self.notes.error(offset, f"'AB{text[:24]}' is no block aperture", "%ABD12*% begins block D12, %AB*% ends it")
        else:
            self._open_blocks.append(int(match[1]))
            self.structure.append(Structure(offset, "block", int(match[1])))

    def _whole(self, name: str, text: str, offset: int) -> None:
        try:
            self.whole.apply(name, text, self.mm)
        except WholeError as error:
            self.notes.error(offset, f"'{name}{text[:24]}': {error.message}", error.remedy)

    def _name(self, text: str, offset: int) -> None:
        """IN and LN name the image or what follows; they change nothing."""

    def _input_code(self, text: str, offset: int) -> None:
        if text != "AS":
            self.notes.error(offset, f"'IC{text[:12]}' asks for another character code than ASCII", "export as Gerber X2")


_METHODS = {
    "AB": Commands._block,
    "AD": Commands._aperture,
    "FS": Commands._format,
    "IC": Commands._input_code,
    "IN": Commands._name,
    "LM": Commands._mirror,
    "LN": Commands._name,
    "LP": Commands._polarity,
    "LR": Commands._rotate,
    "LS": Commands._scale,
    "MO": Commands._unit,
    "SR": Commands._repeat,
}
_UNKNOWN = {
    "IF": "IF includes another file, which nobody can see from here; put its contents into this file",
    "KO": "KO (knockout) was withdrawn decades ago; use %LPC*% and a region",
    "IJ": "IJ (image justify) moves the image to an unknown place; leave it out",
}
