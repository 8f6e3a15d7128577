"""One net as a table. In: a result document and a net's name; out: its stretches on the terminal, in order."""

from __future__ import annotations

import difflib

from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from impcheck.errors import InputError, Problem
from impcheck.report.document import Document, NetPart, StretchPart
from impcheck.report.terminal import clean, console, count, print_finding, target


def print_walk(document: Document, name: str) -> None:
    """Prints one net stretch by stretch, its vias and its findings. Raises InputError where no declared net has that name."""
    net = next((net for net in document.nets if net.name == name), None)
    if net is None:
        names = [net.name for net in document.nets]
        near = difflib.get_close_matches(name, names, 1)
        remedy = f"did you mean '{near[0]}'?" if near else f"declared are {', '.join(names[:10])}"
        raise InputError(Problem(document.board.file, 0, f"no declared net is called '{name}'", remedy))
    screen = console()
    aim = f", target {target(net)} ohm" if net.target_ohm else ""
    delay = f", {net.delay_ps:.1f} ps" if net.delay_ps is not None else ""
    screen.print(
        Text.assemble((clean(net.name), "bold"), f"   class {clean(net.net_class)}{aim}, {net.status}, {net.length_mm:.3f} mm{delay}")
    )
    if net.reason:
        screen.print(Text(clean(net.reason)))
    screen.print(Padding(stretch_table(net), (1, 0, 1, 2)))
    for via in net.vias:
        joint = "no return via needed or found" if via.return_via_mm is None else f"return via {via.return_via_mm:.2f} mm away"
        screen.print(
            Padding(
                Text(
                    f"via {clean(via.start)} to {clean(via.end)} at ({via.at[0]:.3f}, {via.at[1]:.3f}), stub {via.stub_mm:.2f} mm, {joint}"
                ),
                (0, 0, 0, 2),
            )
        )
    found = [finding for finding in document.findings if finding.net == name]
    screen.print(count(len(found), "finding"))
    for finding in found:
        print_finding(screen, finding)


def stretch_table(net: NetPart) -> Table:
    """One row a stretch."""
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0), header_style="dim")
    headings = ("from mm", "to mm", "layer", "at", "width mm", "above", "below", "covered", "ohm", "eps_eff", "delay ps", "")
    for heading in headings:
        table.add_column(heading, justify="left" if heading in ("layer", "above", "below", "") else "right", no_wrap=True)
    for stretch in net.stretches:
        table.add_row(*cells(stretch, net), style=row_style(stretch, net))
    return table


def cells(stretch: StretchPart, net: NetPart) -> tuple[str, ...]:
    """The row of one stretch."""
    return (
        f"{stretch.along_mm[0]:.3f}",
        f"{stretch.along_mm[1]:.3f}",
        clean(stretch.layer),
        f"({stretch.start[0]:.2f}, {stretch.start[1]:.2f})",
        f"{stretch.width_mm:.4f}",
        clean(stretch.above or "-"),
        clean(stretch.below or "-"),
        f"{stretch.coverage:.0%}",
        "?" if stretch.impedance_ohm is None else f"{stretch.impedance_ohm:.2f}",
        "" if stretch.eps_eff is None else f"{stretch.eps_eff:.3f}",
        "" if stretch.delay_ps is None else f"{stretch.delay_ps:.2f}",
        "" if stretch.zone == "trace" else stretch.zone,
    )


def row_style(stretch: StretchPart, net: NetPart) -> str:
    """Dim where trace rules do not judge, red where the impedance is out of the class's range."""
    if stretch.zone not in ("trace", "bend"):
        return "dim"
    if net.target_ohm is None or stretch.impedance_ohm is None:
        return ""
    return "" if net.target_ohm[0] <= stretch.impedance_ohm <= net.target_ohm[2] else "red"
