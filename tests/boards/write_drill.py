"""Writes Excellon drill files. In: holes in mm; out: one file as text in the dialect asked for. Shares no code with impcheck."""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass

from tests.boards.model import Point


@dataclass(frozen=True)
class Drilled:
    """One hole or slot with what an X2 comment says of it."""

    at: Point
    diameter: float
    end: Point | None = None
    function: str = ""  # Plated,PTH,ViaDrill


def excellon(holes: list[Drilled], unit: str = "mm", zeros: str = "decimal", function: tuple[str, ...] = (), routed: bool = False) -> str:
    """`zeros`: decimal (points written), LZ (leading zeros kept), TZ (trailing zeros kept). `function`: X2 file function written as a
    comment."""
    per = 25.4 if unit == "inch" else 1.0
    whole, decimals = (2, 4) if unit == "inch" else (3, 3)

    def number(value: float) -> str:
        value /= per
        if zeros == "decimal":
            return f"{value:.{6 if unit == 'inch' else 5}f}"
        digits = f"{abs(round(value * 10**decimals)):0{whole + decimals}d}"
        digits = (digits.rstrip("0") or "0") if zeros == "LZ" else (digits.lstrip("0") or "0")
        return ("-" if value < 0 else "") + digits

    def xy(at: Point) -> str:
        return f"X{number(at[0])}Y{number(at[1])}"

    tools: dict[tuple[float, str], list[Drilled]] = defaultdict(list)
    for hole in holes:
        tools[(round(hole.diameter, 6), hole.function)].append(hole)
    lines = ["M48"]
    if function:
        lines.append("; #@! TF.FileFunction," + ",".join(function))
    if zeros == "decimal":
        lines += ["FMAT,2", "INCH" if unit == "inch" else "METRIC"]
    else:
        lines += [f";FILE_FORMAT={whole}:{decimals}", f"{'INCH' if unit == 'inch' else 'METRIC'},{zeros}"]
    for n, (diameter, use) in enumerate(tools, 1):
        if use and function:
            lines.append(f"; #@! TA.AperFunction,{use}")
        lines.append(f"T{n}C{diameter / per:.5f}")
        if use and function:
            lines.append("; #@! TD")
    lines += ["%", "G05", "G90"]
    for n, found in enumerate(tools.values(), 1):
        lines.append(f"T{n}")
        for hole in found:
            if hole.end is None:
                lines.append(xy(hole.at))
            elif routed:
                lines += [f"G00{xy(hole.at)}", "M15", f"G01{xy(hole.end)}", "M16", "G05"]
            else:
                lines.append(f"{xy(hole.at)}G85{xy(hole.end)}")
    return "\n".join([*lines, "M30", ""])
