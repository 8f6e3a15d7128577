"""How long the check takes, as ratios to gerbonara parsing the same files in the same run. `python -m tests.benchmarks [--tiles 1 2 4
8]`.

Prints, for a board of ten copper layers, 40,000 objects and 100 declared nets (and for 2, 4, 8 times that board where asked for), the
time of every step over the time gerbonara takes to parse the same files, the growth from size to size, and the peak memory. Nothing is
judged: read it.
"""

from __future__ import annotations

import argparse
import json
import os
import resource
import subprocess
import sys
import tempfile
import warnings
from pathlib import Path
from time import perf_counter

TARGETS = {"read": 0.25, "all": 1.5}


def parse_with_gerbonara(folder: Path) -> tuple[float, int]:
    """Seconds and objects of gerbonara parsing every Gerber and Excellon file of a folder."""
    from gerbonara import ExcellonFile, GerberFile

    seconds, objects = 0.0, 0
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        for path in sorted(folder.iterdir()):
            reader = {".gbr": GerberFile, ".drl": ExcellonFile}.get(path.suffix)
            if reader is None:
                continue
            begin = perf_counter()
            parsed = reader.open(path)
            seconds += perf_counter() - begin
            objects += len(parsed.objects)
    return seconds, objects


def one(board: Path) -> None:
    """Runs one board in this process and prints its numbers as JSON (a fresh process a size, so that peak memory is its own)."""
    from impcheck.pipeline import run

    begin = perf_counter()
    checked = run(board, jobs=os.cpu_count() or 1)
    whole = perf_counter() - begin
    summary = checked.document.summary
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    sections = checked.counts
    print(
        json.dumps(
            {
                "seconds": checked.seconds,
                "all": whole,
                "peak_mb": peak,
                "walked": summary.walked,
                "nets": summary.nets,
                "findings": len(checked.document.findings),
                **sections,
            }
        )
    )


def main() -> None:
    """Prints the table."""
    parser = argparse.ArgumentParser(prog="python -m tests.benchmarks", description=__doc__)
    parser.add_argument("--tiles", type=int, nargs="+", default=[1])
    parser.add_argument("--repeat", type=int, default=1, help="best of this many runs")
    parser.add_argument("--one", type=Path, help=argparse.SUPPRESS)
    chosen = parser.parse_args()
    if chosen.one:
        one(chosen.one)
        return
    from tests.benchmarks.big_board import write_big_board

    for tiles in chosen.tiles:
        with tempfile.TemporaryDirectory() as folder:
            board = write_big_board(Path(folder), tiles=tiles)
            yardstick, objects = parse_with_gerbonara(board.parent / "fab")
            for _ in range(chosen.repeat - 1):
                yardstick = min(yardstick, parse_with_gerbonara(board.parent / "fab")[0])
            runs = []
            for _ in range(chosen.repeat):
                done = subprocess.run(
                    [sys.executable, "-m", "tests.benchmarks", "--one", str(board)], check=True, capture_output=True, text=True
                )
                runs.append(json.loads(done.stdout))
            best = min(runs, key=lambda found: found["all"])
            print(
                f"{tiles} x: {objects} objects, {best['walked']} of {best['nets']} nets walked, "
                f"{best['findings']} findings, {best['stations']} stations"
            )
            print(f"  gerbonara parses in {yardstick:.2f} s; ratios to that:")
            for name, value in (*best["seconds"].items(), ("all", best["all"])):
                aim = f"   (target {TARGETS[name]})" if name in TARGETS else ""
                print(f"    {name:8s} {value / yardstick:6.2f}{aim}")
            print(f"  peak memory {best['peak_mb']:.0f} MB (target 1500)", flush=True)


if __name__ == "__main__":
    main()
