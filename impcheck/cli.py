"""The commands. In: what a user types; out: text on the terminal, files, and the exit status (0 nothing at the gate, 1 findings, 2 bad
input)."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING

import click

from impcheck import __version__

if TYPE_CHECKING:
    from impcheck.errors import InputError

FINDINGS, BAD_INPUT, INTERRUPTED = 1, 2, 130
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")  # sections are small: processes share the work, not threads


@click.group(context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(__version__, prog_name="impcheck")
def main() -> None:
    """Follow every declared net of a board through its fabrication files and list each impedance discontinuity by place.

    Exit status: 0 nothing at or over the gate, 1 findings, 2 the input or the call is wrong.
    """


@main.command()
@click.argument("boards", nargs=-1, required=True, metavar="BOARD...", type=click.Path(path_type=Path))
@click.option(
    "-o",
    "--output",
    "outputs",
    multiple=True,
    metavar="FILE",
    type=click.Path(path_type=Path),
    help="Write the result to FILE as well; the ending chooses the format (.json). May be given several times, with one BOARD.",
)
@click.option(
    "--fail-on",
    type=click.Choice(["error", "warning", "note", "never"]),
    default="warning",
    show_default=True,
    help="The lowest level of a finding that gives exit status 1.",
)
@click.option("--jobs", type=click.IntRange(1, 256), metavar="N", help="Processes that solve cross-sections; one a core unless said.")
@click.option("--timing", is_flag=True, help="Say how long each step took.")
def check(boards: tuple[Path, ...], outputs: tuple[Path, ...], fail_on: str, jobs: int | None, timing: bool) -> None:
    """Check boards: read, rebuild, walk, solve, judge.

    BOARD is a board file (board.yaml), or a folder that holds one.
    """
    if outputs and len(boards) > 1:
        raise click.UsageError("-o goes with one BOARD: check the boards one at a time to write files")
    failed = refused = False
    for board in boards:
        with refusals() as refusal:
            from impcheck.pipeline import run
            from impcheck.report.files import renderer_for, write_atomically
            from impcheck.report.terminal import print_document, print_seconds

            renderers = [(path, renderer_for(path)) for path in outputs]  # before the long work: a wrong ending is told at once
            with progress_line() as progress:
                checked = run(board, jobs=jobs or os.cpu_count() or 1, progress=progress)
            for path, render in renderers:
                write_atomically(path, render(checked.document))
            print_document(checked.document)
            if timing:
                print_seconds(checked.seconds)
            failed |= checked.document.gate(fail_on)
        refused |= bool(refusal)
    sys.exit(BAD_INPUT if refused else FINDINGS if failed else 0)


@main.command()
@click.argument("board", type=click.Path(path_type=Path))
@click.argument("net")
def walk(board: Path, net: str) -> None:
    """Print one NET of a BOARD stretch by stretch: place, width, references, impedance, delay."""
    with refusals() as refusal:
        from impcheck.pipeline import run
        from impcheck.report.walk_table import print_walk

        with progress_line() as progress:
            checked = run(board, progress=progress)
        print_walk(checked.document, net)
    sys.exit(BAD_INPUT if refusal else 0)


@main.command()
@click.argument("rule", required=False)
def rules(rule: str | None) -> None:
    """List the rules, or explain one RULE: what it measures, why it matters, its limits and their source."""
    with refusals() as refusal:
        from impcheck.report.rule_pages import print_rule, print_rules

        if rule is None:
            print_rules()
        else:
            print_rule(rule)
    sys.exit(BAD_INPUT if refusal else 0)


@main.command()
@click.argument("document", type=click.Choice(["board", "result"]))
def schema(document: str) -> None:
    """Print the JSON Schema of the board file or of the result file, for editors and other programs."""
    import json

    if document == "board":
        from impcheck.artwork.schema import json_schema as chosen
    else:
        from impcheck.report.document import result_schema as chosen
    click.echo(json.dumps(chosen(), indent=2))


@contextmanager
def refusals() -> Iterator[list[InputError]]:
    """Turns an InputError into text on stderr and an entry of the list it gives; the caller sets the exit status."""
    from impcheck.errors import InputError

    refused: list[InputError] = []
    try:
        yield refused
    except InputError as error:
        refused.append(error)
        for problem in error.problems:
            click.echo(f"error: {printable(str(problem))}", err=True)
        if len(error.problems) > 1:
            click.echo(f"{len(error.problems)} problems", err=True)
    except KeyboardInterrupt:
        click.echo("interrupted", err=True)
        sys.exit(INTERRUPTED)


def printable(text: str) -> str:
    """Text from a file made safe for a terminal: control characters and marks that change the direction of writing are shown as escapes."""
    return "".join(c if c.isprintable() or c == " " else c.encode("unicode_escape").decode() for c in text)


@contextmanager
def progress_line() -> Iterator[Callable[[str], None] | None]:
    """A line on stderr that says what is being done, on a terminal only."""
    if not sys.stderr.isatty():
        yield None
        return
    from rich.console import Console
    from rich.markup import escape

    with Console(stderr=True).status("starting") as status:
        yield lambda words: status.update(escape(printable(words)))
