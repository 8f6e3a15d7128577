"""Writing result files. In: a document and a path; out: the file in the format its ending names, whole or not at all."""

from __future__ import annotations

import contextlib
import importlib
import os
import pkgutil
import tempfile
from collections.abc import Callable
from pathlib import Path

import impcheck.report
from impcheck.errors import InputError, Problem
from impcheck.report.document import Document


def formats() -> dict[str, Callable[[Document], str]]:
    """File ending -> function that renders a document. A format is a module of this folder named `format_*` with SUFFIX and render."""
    found: dict[str, Callable[[Document], str]] = {}
    for module in pkgutil.iter_modules(impcheck.report.__path__):
        if module.name.startswith("format_"):
            loaded = importlib.import_module(f"impcheck.report.{module.name}")
            found[loaded.SUFFIX] = loaded.render
    return found


def renderer_for(path: Path) -> Callable[[Document], str]:
    """The renderer for a file's ending. Raises InputError where no format has that ending."""
    known = formats()
    for suffix, render in sorted(known.items(), key=lambda item: -len(item[0])):
        if path.name.lower().endswith(suffix):
            return render
    raise InputError(Problem(str(path), 0, f"no result format has the ending '{path.suffix}'", f"use one of {', '.join(sorted(known))}"))


def write_atomically(path: Path, text: str) -> None:
    """Writes UTF-8 text to a file so that a reader sees the old content or the new, never a half. Raises InputError where it cannot."""
    name = ""
    try:
        handle, name = tempfile.mkstemp(dir=path.parent, prefix=f".{path.name}.")
        with os.fdopen(handle, "w", encoding="utf-8", newline="\n") as file:
            file.write(text)
        mask = os.umask(0)
        os.umask(mask)
        Path(name).chmod(0o666 & ~mask)  # mkstemp makes private files; a result file is as readable as any other
        Path(name).replace(path)
    except OSError as error:
        raise InputError(
            Problem(str(path), 0, f"cannot be written: {error.strerror}", "name a file in a folder that exists and may be written")
        ) from None
    finally:
        with contextlib.suppress(OSError):
            if name:
                Path(name).unlink()
