"""X2 and X3 attributes. In: the text of TF, TA, TO and TD commands; out: dictionaries of names and decoded values."""

from __future__ import annotations

import re
from dataclasses import dataclass, field

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


@dataclass
class Attributes:
    """The attribute dictionaries at one point of a file."""

    file: dict[str, Values] = field(default_factory=dict)
    aperture: dict[str, Values] = field(default_factory=dict)
    object: dict[str, Values] = field(default_factory=dict)

    def apply(self, command: str, text: str) -> str | None:
        """Carries out one command ("TF", "TA", "TO" or "TD" and the text behind it); returns what was odd, or None."""
        name, values = fields(text)
        if command == "TD":
            if not name:
                self.aperture, self.object = {}, {}
            else:
                self.aperture = {key: value for key, value in self.aperture.items() if key != name}
                self.object.pop(name, None)
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
            self.object[name] = values
        return None
