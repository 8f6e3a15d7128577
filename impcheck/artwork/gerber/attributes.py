"""X2 and X3 attributes. In: the text of TF, TA, TO and TD commands; out: dictionaries of names and decoded values."""

from __future__ import annotations

import re
from dataclasses import dataclass, field

from impcheck.artwork.image import Pin

_ESCAPE = re.compile(r"\\(?:u([0-9A-Fa-f]{4})|U([0-9A-Fa-f]{8})|(.))", re.DOTALL)
_COMMA = re.compile(r"(?<!\\),")
Values = tuple[str, ...]


def fields(text: str) -> tuple[str, Values]:
    """Name and values of `.Name,value,value`; a comma inside a value is written \\u002C, or with a backslash before it."""
    if "\\" not in text:
        name, *values = text.split(",")
        return name.strip(), tuple(values)
    name, *values = _COMMA.split(text)
    return name.strip(), tuple(_ESCAPE.sub(_decode, value) for value in values)


def _decode(match: re.Match[str]) -> str:
    digits = match[1] or match[2]
    if digits:
        number = int(digits, 16)
        # Lone surrogates could not be written to any report.
        return chr(number) if number <= 0x10FFFF and not 0xD800 <= number <= 0xDFFF else "�"
    return match[3]


_SLOTS = {".N": 0, ".P": 1, ".C": 2}
_ALL, _OTHER = 3, 4


class Names:
    """Nets, pins and components of objects: tables of them, and where in the file which of them hold."""

    def __init__(self) -> None:
        self.nets: dict[Values, int] = {}
        self.pins: dict[Pin, int] = {}
        self.components: dict[str, int] = {}
        self.changes: list[tuple[int, int, int, int]] = [(-1, -1, -1, -1)]  # offset; index of net, pin and component, -1 none
        self._now = [-1, -1, -1]

    def change(self, offset: int, slot: int, index: int) -> None:
        """From the offset on, the index holds in the slot (`entry` and `deleted` give both)."""
        if slot == _ALL:
            self._now = [-1, -1, -1]
        elif slot != _OTHER:
            self._now[slot] = index
        net, pin, component = self._now
        self.changes.append((offset, net, pin, component))

    def entry(self, name: str, values: Values) -> tuple[int, int]:
        """Slot and index of an object attribute; what is new enters its table."""
        if name == ".N":
            # N/C marks a pad that is no net's, each one for itself.
            nets = tuple(value for value in values if value and value != "N/C")
            return 0, self.nets.setdefault(nets, len(self.nets)) if nets else -1
        if name == ".P":
            pin = Pin(values[0], values[1], values[2] if len(values) > 2 else "") if len(values) >= 2 else None
            return 1, self.pins.setdefault(pin, len(self.pins)) if pin else -1
        if name == ".C":
            return 2, self.components.setdefault(values[0], len(self.components)) if values and values[0] else -1
        return _OTHER, -1

    def deleted(self, name: str) -> tuple[int, int]:
        """Slot and index for TD: of one attribute, or of all where the name is empty."""
        return (_ALL if not name else _SLOTS.get(name, _OTHER)), -1


@dataclass
class Attributes:
    """The attribute dictionaries at one point of a file."""

    file: dict[str, Values] = field(default_factory=dict)
    aperture: dict[str, Values] = field(default_factory=dict)
    objects: Names = field(default_factory=Names)

    def apply(self, command: str, text: str, offset: int) -> str | None:
        """Carries out one command ("TF", "TA", "TO" or "TD" and the text behind it); returns what was odd, or None."""
        name, values = fields(text)
        if command == "TD":
            if not name:
                self.aperture = {}
            elif name in self.aperture:
                self.aperture = {key: value for key, value in self.aperture.items() if key != name}
            self.objects.change(offset, *self.objects.deleted(name))
            return None
        if not name:
            return f"a {command} command without a name has no effect"
        if command == "TF":
            before = self.file.setdefault(name, values)
            if before != values:
                self.file[name] = values
                return f"the file attribute {name} is set twice; the later one counts"
        elif command == "TA":
            self.aperture = {**self.aperture, name: values}  # apertures keep the dictionary of their time
        else:
            self.objects.change(offset, *self.objects.entry(name, values))
        return None
