"""Bounds on what one input may cost. In: nothing; out: numbers every reader obeys, named in the error when one is met."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Limits:
    """Limits on hostile or broken input; each error names the limit that was met."""

    file_bytes: int = 400_000_000  # one file, unpacked
    package_bytes: int = 2_000_000_000  # all files of an archive, unpacked
    package_files: int = 2_000
    compression_ratio: int = 200  # unpacked over packed, for members over 1 MB
    objects: int = 5_000_000  # draws, flashes, arcs and regions of one file after step-and-repeat and blocks
    vertices: int = 40_000_000  # vertices of one file
    nesting: int = 16  # blocks in blocks
    macro_primitives: int = 10_000  # of one aperture
    yaml_nodes: int = 200_000
    board_file_bytes: int = 8_000_000
