"""Gerber job files (.gbrjob). In: bytes of JSON; out: file functions and the stackup they state, in mm."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from impcheck.artwork.limits import Limits
from impcheck.artwork.stackup import CopperItem, Dielectric, Mask, Stackup
from impcheck.errors import InputError, Problem


@dataclass(frozen=True)
class Job:
    """What a job file says."""

    file: str
    name: str = ""
    size: tuple[float, float] | None = None  # mm
    layer_count: int | None = None
    thickness: float | None = None  # mm
    functions: Mapping[str, tuple[str, ...]] = field(default_factory=dict)  # file path -> ("Copper", "L1", "Top")
    polarities: Mapping[str, str] = field(default_factory=dict)  # file path -> "Positive" or "Negative"
    stackup: Stackup | None = None  # None where the file states none, or not all of it
    missing: tuple[str, ...] = ()  # what a stackup would still need, one sentence each


def read_job(data: bytes, file: str, limits: Limits | None = None) -> Job:
    """Reads a job file. Raises InputError where it is no JSON object, with the line."""
    limits = limits or Limits()
    if len(data) > limits.file_bytes:
        raise InputError(Problem(file, 0, f"the file is larger than {limits.file_bytes} bytes (limit file_bytes)", "leave it out of the package"))
    try:
        document = json.loads(data.decode("utf-8-sig", errors="replace"))
    except json.JSONDecodeError as error:
        raise InputError(Problem(file, error.lineno, f"this is no JSON: {error.msg}", "export the job file again")) from None
    except RecursionError:
        raise InputError(Problem(file, 0, "the JSON is nested too deep", "export the job file again")) from None
    if not isinstance(document, dict):
        raise InputError(Problem(file, 1, "a job file is a JSON object", "export the job file again"))
    general = _mapping(document.get("GeneralSpecs"))
    size = _mapping(general.get("Size"))
    functions, polarities = {}, {}
    for entry in _list(document.get("FilesAttributes")):
        path, function = entry.get("Path"), entry.get("FileFunction")
        if isinstance(path, str) and isinstance(function, str):
            functions[path] = tuple(part.strip() for part in function.split(","))
            if isinstance(entry.get("FilePolarity"), str):
                polarities[path] = entry["FilePolarity"]
    stackup, missing = _stackup(_list(document.get("MaterialStackup")))
    name = _mapping(general.get("ProjectId")).get("Name")
    width, height = _number(size.get("X")), _number(size.get("Y"))
    count = general.get("LayerNumber")
    return Job(
        file=file,
        name=name if isinstance(name, str) else "",
        size=None if width is None or height is None else (width, height),
        layer_count=count if isinstance(count, int) and not isinstance(count, bool) else None,
        thickness=_number(general.get("BoardThickness")),
        functions=functions,
        polarities=polarities,
        stackup=stackup,
        missing=missing,
    )


def _stackup(entries: list[dict[str, Any]]) -> tuple[Stackup | None, tuple[str, ...]]:
    items: list[Mask | CopperItem | Dielectric] = []
    missing: list[str] = []
    for number, entry in enumerate(entries, 1):
        kind = str(entry.get("Type", "")).lower()
        name = str(entry.get("Name", "")) or f"item {number}"
        thickness, er, loss = _number(entry.get("Thickness")), _number(entry.get("DielectricConstant")), _number(entry.get("LossTangent"))
        if kind == "copper":
            layer = f"L{sum(isinstance(item, CopperItem) for item in items) + 1}"
            if thickness is None or thickness <= 0:
                missing.append(f"copper {name} has no thickness")
            items.append(CopperItem(layer, thickness or 0.0))
        elif kind == "dielectric":
            if thickness is None or thickness <= 0:
                missing.append(f"dielectric {name} has no thickness")
            if er is None or er < 1:
                missing.append(f"dielectric {name} has no dielectric constant")
            words = f"{name} {entry.get('Material', '')} {entry.get('Notes', '')}".lower()
            core = True if "core" in words else False if "prepreg" in words else None
            items.append(Dielectric(thickness or 0.0, er or 1.0, loss or 0.0, name, core))
        elif kind == "soldermask":
            outer = not any(isinstance(item, CopperItem) for item in items) or number == len(entries) or not _copper_follows(entries[number:])
            if outer and thickness is not None and thickness > 0 and er is not None and er >= 1:
                items.append(Mask(thickness, er, loss or 0.0))
            else:
                missing.append(f"solder mask {name} has no thickness or dielectric constant, so the board is taken without it")
    coppers = sum(isinstance(item, CopperItem) for item in items)
    complete = coppers >= 2 and not any("mask" not in text for text in missing)
    return (Stackup(tuple(items)) if complete else None), tuple(missing)


def _copper_follows(entries: list[dict[str, Any]]) -> bool:
    return any(str(entry.get("Type", "")).lower() == "copper" for entry in entries)


def _mapping(value: object) -> dict[str, Any]:
    return value if isinstance(value, dict) else {}


def _list(value: object) -> list[dict[str, Any]]:
    return [entry for entry in value if isinstance(entry, dict)] if isinstance(value, list) else []


def _number(value: object) -> float | None:
    return float(value) if isinstance(value, int | float) and not isinstance(value, bool) and 0 <= value < 1e5 else None
