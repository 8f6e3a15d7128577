"""Splits a file into plain statements and everything else. In: bytes; out: a byte array with only plain statements left, and pieces."""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from impcheck.artwork.gerber.notes import Notes

# The G of every comment is first replaced by a byte that occurs in no statement. A piece then starts at the first byte that cannot be
# part of a statement made of words like X or D with numbers: one class and no alternatives, which is what makes the search fast.
_MARK = b"\x01"
_STAR_AND_BLANKS = b"*" + b" " * 1023
_COMMENT = re.compile(rb"G(\s*0*4)(?![0-9])")
_PIECE = re.compile(rb"[^XYIJDGMN0-9+\-.*\s](?:(?<=%)[^%]*%?|(?<=\x01)\s*0*4(?![0-9])[^*]*\*?|(?<![%\x01])[^*%]*\*?)")
_CODE = re.compile(rb"[XY]\s*[-+]?[0-9]|G(?!\s*0*4(?![0-9]))\s*[0-9]|[DM]0*[0-9]{1,2}\s*$")
_END = re.compile(rb"M\s*(?:0*2|0+|30)\s*\*")
_PADDING = b"\x00\x1a \t\r\n\f\v"


# One part of the file that is not made of plain statements: its offset; its text without the "%" around a command or the "*" after a
# comment; whether it is a comment. A plain tuple, because there are tens of thousands of them.
Piece = tuple[int, bytes, bool]


@dataclass(frozen=True)
class Scan:
    """A file taken apart."""

    plain: NDArray[
        np.uint8
    ]  # (bytes,) the file, every piece overwritten with "*" and blanks, so that offsets still hold; up to its end code
    pieces: tuple[Piece, ...]


def scan(data: bytes, notes: Notes) -> Scan:
    """Takes the file apart. Raises InputError where it is no Gerber file at all or a command is never closed."""
    end = len(data.rstrip(_PADDING))
    refuse_other_files(data[:end], notes)
    plain = bytearray(data[:end])
    pieces: list[Piece] = []
    ends = _END.finditer(data, 0, end)
    last = next(ends, None)
    last_at = last.start() if last else end
    for match in _PIECE.finditer(_marked(data), 0, end):
        start, stop = match.span()
        first = data[start]
        if last_at < start:  # outside of every piece, so it is the code
            break
        while last_at < stop and last:
            last = next(ends, None)
            last_at = last.start() if last else end
        if first == 37:  # %
            text = data[start + 1 : stop - 1]
            if stop < start + 2 or data[stop - 1] != 37:
                raise notes.fatal(
                    start, "the file ends inside a %...% command", "the file is cut off, or a closing % is missing; export it again"
                )
            if (b"\n" in text or b"\r" in text) and not text.startswith(b"AM"):
                _refuse_code_inside(text, start + 1, notes)
            pieces.append((start, text, False))
        elif first == 71 and stop > start + 1:  # G04
            if data[stop - 1] != 42:
                raise notes.fatal(start, "the file ends inside a comment", "the file is cut off; export it again")
            pieces.append((start, data[start : stop - 1], True))
        else:
            shown = data[start:stop].split(b"*")[0].strip()[:24].decode("latin-1")
            notes.error(
                start, f"unknown statement at '{shown}'", "a Gerber statement is made of X, Y, I, J, D, G and M codes and ends with *"
            )
        plain[start:stop] = _STAR_AND_BLANKS[: stop - start] if stop - start <= len(_STAR_AND_BLANKS) else b"*".ljust(stop - start)
    if last:
        if data[last.end() : end].strip(_PADDING):
            notes.odd("what follows the end of the file (M02) is not read", last.end() + 1)
        end = last.end()
    else:
        _refuse_cut_end(data, end, notes)
    return Scan(np.frombuffer(plain, np.uint8, end), tuple(pieces))


def _marked(data: bytes) -> bytes:
    marked = data.replace(_MARK, b"?").replace(b"G04", _MARK + b"04")
    return _COMMENT.sub(_MARK + rb"\1", marked) if _COMMENT.search(marked) else marked


def refuse_other_files(data: bytes, notes: Notes) -> None:
    """Raises InputError with one clear sentence for what is no Gerber file: empty, binary, some other text, RS-274-D."""
    if not data:
        raise notes.fatal(None, "the file is empty", "export it again")
    head = data[:65536]
    raw = np.frombuffer(head, np.uint8)
    control = (raw < 32) & ~np.isin(raw, (9, 10, 11, 12, 13, 26))
    if np.count_nonzero(control) > len(raw) // 200:
        raise notes.fatal(
            None, "this is a binary file, not a Gerber file", "a Gerber file is text and starts with lines like %FSLAX46Y46*%"
        )
    if re.search(rb"%[^%]*FS", data):
        return
    if b"M48" in head or re.search(rb"(?m)^T\d+[CFS]", head):
        raise notes.fatal(None, "this looks like an Excellon drill file, not a Gerber file", "list it under drills")
    if re.search(rb"D0*[1-3]\s*\*", head) and b"%AD" not in data:
        raise notes.fatal(
            None,
            "this is RS-274-D: it has neither a coordinate format nor apertures",
            "export as Gerber X2, or as RS-274X with embedded apertures",
        )
    if re.search(rb"%\s*(AD|MO|AM|LP|TF)", data):
        raise notes.fatal(None, "the coordinate format is missing", "a Gerber file starts with a line like %FSLAX46Y46*%")
    raise notes.fatal(None, "this is not a Gerber file", "a Gerber file starts with lines like %FSLAX46Y46*% and %MOMM*%")


def _refuse_cut_end(data: bytes, end: int, notes: Notes) -> None:
    if data[end - 1] in b"*%":
        return
    last = data[max(data.rfind(b"*", 0, end), data.rfind(b"%", 0, end)) + 1 : end].strip()
    if re.fullmatch(rb"M0*[02]", last):
        notes.odd("the * after M02 is missing", end - 1)
    else:
        raise notes.fatal(
            end - 1, f"the file ends inside the statement '{last[:24].decode('latin-1')}'", "the file is cut off; export it again"
        )


def _refuse_code_inside(text: bytes, start: int, notes: Notes) -> None:
    """One clear error where a missing "%" turned drawing code and commands inside out."""
    position = 0
    for part in text.split(b"*"):
        if _CODE.match(part.lstrip()):
            where = start + position + len(part) - len(part.lstrip())
            remedy = f"the % opened in line {notes.line(start - 1)} is not closed there"
            raise notes.fatal(where, "drawing code stands inside a %...% command", remedy)
        position += len(part) + 1
