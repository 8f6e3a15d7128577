"""The main job from end to end. In: a board file; out: everything each step found, and the result document."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from time import perf_counter

from impcheck.artwork.assemble import read_artwork
from impcheck.artwork.limits import Limits
from impcheck.artwork.parts import Artwork
from impcheck.checks.deck import load_deck
from impcheck.checks.finding import Finding
from impcheck.checks.run import run_checks
from impcheck.copper.build import rebuild
from impcheck.copper.copper import Copper
from impcheck.errors import InputError, Problem, Remark
from impcheck.fields.profile import NetProfile
from impcheck.fields.profiles import profile_nets
from impcheck.nets.connect import connect
from impcheck.nets.nets import Nets
from impcheck.path.build import walk_nets
from impcheck.report.build import build_document
from impcheck.report.document import Document

BOARD_FILE_NAMES = ("board.yaml", "board.yml")


@dataclass(frozen=True)
class Checked:
    """One board, checked: what each step gave."""

    artwork: Artwork
    copper: Copper
    nets: Nets
    profiles: tuple[NetProfile, ...]
    findings: tuple[Finding, ...]
    remarks: tuple[Remark, ...]
    document: Document
    seconds: dict[str, float] = field(default_factory=dict)  # time of each step

    @property
    def counts(self) -> dict[str, int]:
        """How much there was to do: stations measured."""
        return {"stations": sum(len(run.stations) for profile in self.profiles for run in profile.walk.runs)}


def board_file(path: Path) -> Path:
    """The board file a user means: the file itself, or board.yaml in the folder named. Raises InputError where there is none."""
    if path.is_dir():
        for name in BOARD_FILE_NAMES:
            if (path / name).is_file():
                return path / name
        raise InputError(Problem(str(path), 0, "this folder holds no board.yaml", "write a board file that says `files:` and name it here"))
    if path.suffix.lower() == ".zip":
        raise InputError(
            Problem(
                str(path), 0, "a board file is needed to know which nets to follow", f"write a board.yaml that says `files: {path.name}`"
            )
        )
    if not path.is_file():
        raise InputError(Problem(str(path), 0, "there is no such file", "name a board file (board.yaml)"))
    return path


def run(board: Path, *, jobs: int = 1, progress: Callable[[str], None] | None = None, limits: Limits | None = None) -> Checked:
    """Checks one board.

    `progress` is told what is being done, a few words at a time. `jobs` is the number of processes that may solve cross-sections. Raises
    InputError where the board file or the artwork cannot be used.
    """
    seconds: dict[str, float] = {}

    @contextmanager
    def step(name: str, words: str) -> Iterator[None]:
        if progress is not None:
            progress(words)
        begin = perf_counter()
        yield
        seconds[name] = perf_counter() - begin

    with step("read", "reading the artwork"):
        artwork = read_artwork(board_file(board), limits or Limits(), progress)
        deck = load_deck(artwork.board)
    with step("rebuild", "rebuilding the copper"):
        copper = rebuild(artwork)
    with step("connect", "finding the nets"):
        nets = connect(artwork, copper)
    with step("walk", "walking the declared nets"):
        walks = walk_nets(artwork, copper, nets)
    with step("solve", "solving the cross-sections"):
        profiles, remarks = profile_nets(walks, artwork.stackup, nets, copper, jobs=jobs)
    with step("judge", "judging"):
        findings, judged = run_checks(artwork, copper, nets, profiles, deck)
        everything = (*artwork.remarks, *nets.remarks, *remarks, *judged)
        document = build_document(artwork, copper, nets, profiles, findings, everything)
    return Checked(artwork, copper, nets, profiles, findings, everything, document, seconds)


def check(board: str | Path, *, jobs: int = 1) -> Document:
    """Checks one board and returns its result document.

    Parameters: `board`, the path of a board file or of a folder that holds a board.yaml; `jobs`, how many processes may solve cross-
    sections. Raises impcheck.errors.InputError, with every problem found, where the input cannot be used.
    """
    return run(Path(board), jobs=jobs).document
