"""How long reading Gerber takes, as ratios to gerbonara in the same run. `python -m tests.benchmarks.reading`; nothing is judged.

A made-up layer of 40,000 objects with net names (gerbonara is far faster on such plain text than on real layers), its growth, and the
layers over 100 kB of the open boards where they were fetched.
"""

from __future__ import annotations

import random
import time
import warnings

import gerbonara

from impcheck.artwork.gerber import read_gerber
from tests.open_data import fetch


def made_up_layer(objects: int) -> str:
    """Traces of a few draws, each with its net, pads with pins, and filled pieces: the mixture of a dense layer."""
    dice = random.Random(11)
    lines = ["%FSLAX46Y46*%", "%MOMM*%", "%TF.FileFunction,Copper,L1,Top*%", "G75*"]
    lines += [f"%ADD{10 + k}{'C' if k < 10 else 'R'},{0.1 + 0.05 * k:.3f}{'' if k < 10 else 'X0.5'}*%" for k in range(20)]
    lines.append("G01*")
    made = 0
    while made < objects:
        x, y = dice.randrange(200_000_000), dice.randrange(200_000_000)
        lines += [f"%TO.N,NET{dice.randrange(600)}*%", f"D{10 + dice.randrange(10)}*", f"X{x}Y{y}D02*"]
        for _ in range(dice.randrange(2, 9)):
            x += dice.randrange(-5_000_000, 5_000_000)
            y += dice.randrange(-5_000_000, 5_000_000)
            lines.append(f"X{x}Y{y}D01*")
            made += 1
        if dice.random() < 0.1:
            lines += ["G03*", f"X{x + 1_000_000}Y{y + 1_000_000}I0J1000000D01*", "G01*"]
            made += 1
        lines += [f"D{20 + dice.randrange(10)}*", f"%TO.P,U{dice.randrange(200)},{dice.randrange(100)}*%", f"X{x}Y{y}D03*", "%TD*%"]
        made += 1
        if dice.random() < 0.2:
            corners = "\n".join(f"X{x + dx}Y{y + dy}D01*" for dx, dy in ((0, 900_000), (800_000, 700_000), (400_000, 0), (0, 0)))
            lines += ["G36*", f"X{x}Y{y}D02*", corners, "G37*"]
            made += 1
    return "\n".join([*lines, "M02*", ""])


def best_of(data: bytes, name: str, repeat: int = 3) -> float:
    """The shortest of several readings, s."""
    times = []
    for _ in range(repeat):
        begin = time.perf_counter()
        read_gerber(data, name)
        times.append(time.perf_counter() - begin)
    return min(times)


def gerbonaras(data: bytes) -> float:
    """Time gerbonara takes, s."""
    begin = time.perf_counter()
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        gerbonara.GerberFile.from_string(data.decode("latin-1"))
    return time.perf_counter() - begin


def main() -> None:
    """Prints the ratios."""
    sizes = {factor: made_up_layer(10_000 * factor).encode() for factor in (1, 4, 8)}
    mine = {factor: best_of(data, "dense.gbr") for factor, data in sizes.items()}
    print(f"made-up layer, 40,000 objects: {mine[4] / gerbonaras(sizes[4]):.3f} of gerbonara's time")
    print(f"8 times 10,000 objects take {mine[8] / mine[1]:.1f} times as long")
    folder = fetch("tracespace")
    if folder is None:
        print("open boards: not fetched (python -m tests.open_data)")
        return
    suffixes = {".gtl", ".gbl", ".cmp", ".sol", ".gbr", ".pho", ".gto", ".gbo"}
    large = [p for p in sorted(folder.rglob("*")) if p.suffix.lower() in suffixes and p.stat().st_size >= 100_000]
    ours = sum(best_of(path.read_bytes(), path.name) for path in large)
    theirs = sum(gerbonaras(path.read_bytes()) for path in large)
    print(f"open boards, {len(large)} layers over 100 kB: {ours / theirs:.3f} (target 0.25)")


if __name__ == "__main__":
    main()
