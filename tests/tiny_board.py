"""The smallest board that can be checked: one trace over a plane, two pads, two layers. Tests spoil it in one place each."""

from __future__ import annotations

from pathlib import Path

TOP = """\
G04 made for tests*
%FSLAX46Y46*%
%MOMM*%
%TF.FileFunction,Copper,L1,Top*%
%ADD10C,0.300000*%
%ADD11R,1.000000X1.000000*%
%TO.N,CLK*%
G01*
D10*
X2000000Y5000000D02*
X18000000Y5000000D01*
D11*
%TO.P,U1,1*%
X2000000Y5000000D03*
%TO.P,J1,1*%
X18000000Y5000000D03*
%TD*%
M02*
"""

BOTTOM = """\
G04 made for tests*
%FSLAX46Y46*%
%MOMM*%
%TF.FileFunction,Copper,L2,Bot*%
%TO.N,GND*%
G36*
X0Y0D02*
G01*
X20000000Y0D01*
X20000000Y10000000D01*
X0Y10000000D01*
X0Y0D01*
G37*
%TD*%
M02*
"""

OUTLINE = """\
%FSLAX46Y46*%
%MOMM*%
%TF.FileFunction,Profile,NP*%
%ADD10C,0.100000*%
D10*
X0Y0D02*
G01*
X20000000Y0D01*
X20000000Y10000000D01*
X0Y10000000D01*
X0Y0D01*
M02*
"""

DRILL = """\
M48
; #@! TF.FileFunction,Plated,1,2,PTH
METRIC
T1C0.300
%
T1
X1.0Y1.0
M30
"""

BOARD = """\
impcheck: 1
board: Tiny
files: fab
stackup:
  - {copper: L1, thickness: 35um}
  - {dielectric: 160um, er: 4.2}
  - {copper: L2, thickness: 35um}
returns: [GND]
classes:
  clock: {impedance: 50 ohm, tolerance: 10%, rise_time: 300ps, width: 0.3mm}
nets:
  - {net: CLK, class: clock, from: U1.1, to: J1.1}
"""

FILES = {"top.gbr": TOP, "bottom.gbr": BOTTOM, "edge.gbr": OUTLINE, "pth.drl": DRILL}


def write(folder: Path, board: str = BOARD, **changed: str | bytes | None) -> Path:
    """Writes the board and returns its board file. `changed` replaces files by name with `_` for `.` (top_gbr=...); None leaves one out."""
    fab = folder / "fab"
    fab.mkdir(parents=True)
    for name, text in FILES.items():
        content = changed.pop(name.replace(".", "_"), text)
        if content is not None:
            (fab / name).write_bytes(content if isinstance(content, bytes) else content.encode())
    for name, content in changed.items():
        if content is not None:
            (fab / name.replace("_", ".")).write_bytes(content if isinstance(content, bytes) else content.encode())
    (folder / "board.yaml").write_text(board, encoding="utf-8")
    return folder / "board.yaml"
