"""The report a person reads on a terminal. In: a result document; out: text, per net its target, range and verdict, per finding its
place and limit."""

from __future__ import annotations

from collections import Counter, defaultdict

from rich.console import Console
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from impcheck.report.document import Document, FindingPart, NetPart, RemarkPart

STYLE = {"error": "bold red", "warning": "yellow", "note": "cyan"}
REMARK_WORDS = {"guess": "assumed", "odd": "read as is", "disagreement": "differs", "limit": "not judged"}
PIPE_WIDTH = 120  # columns where the output is no terminal
REMARKS_SHOWN = 12


def console() -> Console:
    """The console reports go to: as wide as the terminal, or PIPE_WIDTH columns where there is none."""
    screen = Console(highlight=False)
    return screen if screen.is_terminal else Console(highlight=False, width=PIPE_WIDTH)


def clean(text: str) -> str:
    """Names from files made safe for a terminal: what does not print is shown as its escape."""
    return "".join(c if c.isprintable() else c.encode("unicode_escape").decode() for c in text)


def print_document(document: Document) -> None:
    """Prints a whole report."""
    screen = console()
    board = document.board
    size = f"{board.size_mm[0]:.1f} x {board.size_mm[1]:.1f} mm"
    screen.print(
        Text.assemble(
            (clean(board.name), "bold"), f"   {len(board.layers)} copper layers, {size}, {count(document.summary.nets, 'net')} declared"
        )
    )
    screen.print()
    screen.print(Padding(net_table(document), (0, 0, 1, 2)))
    for finding in document.findings:
        print_finding(screen, finding)
    print_remarks(screen, document.rests_on)
    screen.print(verdict(document))
    screen.print(Text(document.about, style="dim"))


def net_table(document: Document) -> Table:
    """One row a net."""
    by_net: dict[str, Counter[str]] = defaultdict(Counter)
    for finding in document.findings:
        if finding.waived is None:
            by_net[finding.net][finding.level] += 1
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0), header_style="dim")
    for heading, justify in (
        ("net", "left"),
        ("class", "left"),
        ("target", "right"),
        ("least", "right"),
        ("mean", "right"),
        ("most ohm", "right"),
        ("length mm", "right"),
        ("delay ps", "right"),
        ("verdict", "left"),
    ):
        table.add_column(heading, justify=justify, no_wrap=heading != "verdict", overflow="ellipsis")  # type: ignore[arg-type]
    for net in document.nets:
        found = net.impedance_ohm
        ohms = [f"{found.min:.1f}", f"{found.mean:.1f}", f"{found.max:.1f}"] if found else ["", "", ""]
        delay = "" if net.delay_ps is None else f"{net.delay_ps:.1f}"
        table.add_row(
            clean(net.name), clean(net.net_class), target(net), *ohms, f"{net.length_mm:.2f}", delay, net_verdict(net, by_net[net.name])
        )
    return table


def target(net: NetPart) -> str:
    """The allowed range of a net, "45..55"."""
    if net.target_ohm is None:
        return ""
    low, _, high = net.target_ohm
    return f"{low:.4g}..{high:.4g}"


def net_verdict(net: NetPart, levels: Counter[str]) -> Text:
    """What to say of a net at the end of its row."""
    if net.status != "walked" and not levels:
        return Text(f"{net.status}: {clean(net.reason or '')}", style=STYLE["error"])
    words = [count(levels[level], level) for level in ("error", "warning", "note") if levels[level]]
    if not words:
        return Text("ok", style="green")
    worst = next(level for level in ("error", "warning", "note") if levels[level])
    return Text(", ".join(words), style=STYLE[worst])


def print_finding(screen: Console, finding: FindingPart) -> None:
    """Prints one finding: level, rule, net and place on a line, then what it is."""
    place = f"({finding.at[0]:.3f}, {finding.at[1]:.3f})"
    where = f" on {finding.layer}" if finding.layer else ""
    along = "" if finding.along_mm is None else f", {finding.along_mm[0]:.2f} to {finding.along_mm[1]:.2f} mm along"
    waived = "" if finding.waived is None else f"   waived: {clean(finding.waived.reason)}"
    screen.print(
        Text.assemble(
            (finding.level.upper(), STYLE[finding.level]),
            f" {finding.rule}  ",
            (clean(finding.net), "bold"),
            f"{where} at {place}{along}{waived}",
        )
    )
    screen.print(Padding(Text(clean(finding.message)), (0, 0, 0, 6)))
    if finding.measured is not None and finding.limit is not None:
        unit = f" {finding.unit}" if finding.unit else ""
        screen.print(Padding(Text(f"measured {finding.measured:.4g}{unit}, limit {finding.limit:.4g}{unit}", style="dim"), (0, 0, 0, 6)))
    screen.print()


def print_remarks(screen: Console, remarks: list[RemarkPart]) -> None:
    """Prints what the check rests on, once."""
    if not remarks:
        return
    screen.print(Text("What this check rests on", style="bold"))
    for remark in remarks[:REMARKS_SHOWN]:
        where = f"{remark.file}:{remark.line}: " if remark.line else f"{remark.file}: " if remark.file else ""
        screen.print(Padding(Text.assemble((f"{REMARK_WORDS[remark.kind]}: ", "dim"), clean(where + remark.text)), (0, 0, 0, 2)))
    if len(remarks) > REMARKS_SHOWN:
        screen.print(
            Padding(
                Text(f"and {count(len(remarks) - REMARKS_SHOWN, 'remark')} more in the result file (-o FILE.json)", style="dim"),
                (0, 0, 0, 2),
            )
        )
    screen.print()


def verdict(document: Document) -> Text:
    """The last line: counts."""
    summary = document.summary
    walked = f"{summary.walked} of {count(summary.nets, 'net')} walked"
    if not (summary.errors or summary.warnings or summary.notes):
        return Text(f"No findings. {walked}.", style="green" if summary.walked == summary.nets else "")
    parts = [count(summary.errors, "error"), count(summary.warnings, "warning"), count(summary.notes, "note")]
    waived = f", {summary.waived} waived" if summary.waived else ""
    return Text(f"{', '.join(parts)}{waived}. {walked}.", style="bold")


def print_seconds(seconds: dict[str, float]) -> None:
    """Prints how long each step took."""
    console().print(
        Text("  ".join(f"{name} {value:.2f} s" for name, value in seconds.items()) + f"  all {sum(seconds.values()):.2f} s", style="dim")
    )


def count(number: int, word: str) -> str:
    """A number with its word, in the plural where it should be."""
    return f"{number} {word}" if number == 1 else f"{number} {word}s"
