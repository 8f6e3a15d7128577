"""JSON with the line of each object. In: bytes; out: objects whose keys are found whatever their spelling in older revisions."""

from __future__ import annotations

import json
import math
import re
from typing import Any

from impcheck.errors import InputError, Problem

_TOKEN = re.compile(r'"(?:[^"\\]|\\.)*"|[{}\n]', re.DOTALL)


class JobObject:
    """One JSON object. A key is found without regard to case and underscores (Files_Attributes is FilesAttributes)."""

    def __init__(self, pairs: list[tuple[str, Any]], line: int) -> None:
        self.line = line
        self._values = {_plain(key): value for key, value in pairs}

    def get_any(self, *keys: str) -> Any:
        """The value of the first of these keys that is there, else None."""
        return next((self._values[_plain(key)] for key in keys if self._values.get(_plain(key)) is not None), None)

    def child(self, *keys: str) -> JobObject:
        """The object under one of the keys; an empty one where there is none."""
        found = self.get_any(*keys)
        return found if isinstance(found, JobObject) else JobObject([], self.line)

    def children(self, *keys: str) -> list[JobObject]:
        """The objects of the list under one of the keys."""
        found = self.get_any(*keys)
        return [entry for entry in found if isinstance(entry, JobObject)] if isinstance(found, list) else []

    def text(self, key: str) -> str:
        """A text (a number as its text), "" where there is none."""
        found = self.get_any(key)
        return str(found).strip() if isinstance(found, str | int | float) and not isinstance(found, bool) else ""

    def number(self, key: str) -> float | None:
        """A finite number, also one written in quotes; None where there is none."""
        found = self.get_any(key)
        if isinstance(found, bool) or not isinstance(found, int | float | str):
            return None
        try:
            value = float(found)
        except (ValueError, OverflowError):
            return None
        return value if math.isfinite(value) else None


def load(data: bytes, file: str) -> JobObject:
    """The object a JSON file holds. Raises InputError with the line where it holds none."""
    if not data.strip():
        raise InputError(Problem(file, 0, "the file is empty", "export the job file again"))
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError:
        text = data.decode("latin-1")
    # The decoder finishes objects in the order of their closing braces.
    lines = iter(_lines_by_end(text))
    try:
        found = json.loads(text, object_pairs_hook=lambda pairs: JobObject(pairs, next(lines, 0)), strict=False)
    except json.JSONDecodeError as error:
        said = f"this is no JSON: {error.msg[:1].lower()}{error.msg[1:]} (column {error.colno})"
        raise InputError(Problem(file, error.lineno, said, "export the job file again")) from None
    except RecursionError:
        raise InputError(Problem(file, 0, "the JSON is nested too deep", "export the job file again")) from None
    except ValueError:  # an integer of thousands of digits
        raise InputError(Problem(file, 0, "the JSON holds a number beyond any length", "export the job file again")) from None
    if not isinstance(found, JobObject):
        raise InputError(Problem(file, 1, "a job file holds one JSON object, {...}", "export the job file again"))
    return found


def _lines_by_end(text: str) -> list[int]:
    """The line on which each object begins, in the order in which they end."""
    line, open_, found = 1, [], []
    for match in _TOKEN.finditer(text):
        token = match[0]
        if token == "\n":
            line += 1
        elif token == "{":
            open_.append(line)
        elif token == "}":
            if open_:
                found.append(open_.pop())
        else:
            line += token.count("\n")
    return found


def _plain(key: str) -> str:
    return key.replace("_", "").casefold()
