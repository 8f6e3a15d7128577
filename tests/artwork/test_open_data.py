"""Real files of many layout tools, read in full. Sources and licences: tests/open_data.py. The second opinion is gerbonara (test only).

Where gerbonara is known to be wrong or to refuse, the reason stands beside the file's name; there the check is the file itself.
"""

from __future__ import annotations

import warnings
from collections import Counter
from pathlib import Path

import gerbonara
import numpy as np
import pytest
from gerbonara.graphic_objects import Arc, Flash, Line, Region
from gerbonara.utils import MM

from impcheck.artwork.gerber import read_gerber
from impcheck.artwork.image import Image, Kind
from impcheck.errors import InputError, RemarkKind
from tests.open_data import fetch, reasons

_NOT_GERBER = {
    ".txt",
    ".drl",
    ".drd",
    ".json",
    ".md",
    ".svg",
    ".ps",
    ".png",
    ".jpg",
    ".pdf",
    ".pcb",
    ".csv",
    ".xy",
    ".exc",
    ".cnc",
    ".ncd",
    ".tap",
}
_NOT_GERBER |= {".apt", ".gap", ".rul", ".ldp", ".apr", ".drr", ".rep", ".html", ".js", ".py", ""}

# Files that really are malformed or no Gerber (folder/name): what the one error, or one of the errors, says.
REFUSED = {
    "ekf/l1.off": "RS-274-D",  # says so itself: apertures in a separate list
    "numpres/numpres.pcb.output_plated-drill.grb": "Excellon drill file",
    "numpres/numpres.pcb.output_unplated-drill.grb": "Excellon drill file",
    "polarity/6_vbat.gbr": "unknown command 'X.015'",  # %ADD181C,.031*X.015%: the * stands before the last number
} | {
    # Every file of this set: a rectangle with one side (R,0.035), and two numbers without the X between them (R,0.03260.326).
    f"ekf2/{name}.grb": "aperture D74 (rectangle) has 1 numbers"
    for name in ["d1", "gnd", "l0", "l1", "l2", "l3", "l4", "l5", "pow", "pow3", "resplan", "sieb0", "sieb1", "stp0", "stp1"]
}

# Files on which gerbonara 1.5 and this reader differ, and why gerbonara is no judge there.
NO_SECOND_OPINION = {
    "examples/ucamco_ex_2_shapes.grb": "refuses the specification's own example: a comment inside a macro",
    "am-test/am-test.gbx": "refuses macro primitive 22",
    "dan/top_sr.gbx": "ignores SR",
    "cslk/cslk.gbx": "drops arcs in G74 mode when their end is not repeated",
    "numpres/numpres.pcb.output_componentsilk.grb": "drops arcs in G74 mode when their end is not repeated",
    "protel-pnp/SE_SG_IF_V2.GTO": "keeps 93 arcs whose I and J are 0 as arcs; they are dots",
    "amacro-ref/1.grb": "refuses a selected aperture that is not defined and not used",
    "amacro-ref/stp0.grb": "refuses a selected aperture that is not defined and not used",
    "amacro-ref/limit-ex.grb": "refuses a file without a unit",
    "amacro-ref/full-ex.grb": "refuses a file without a unit",
    "amacro-ref/gerbv_am_expression_bug.ger": "refuses coordinates without an operation code",
    "jj/l1-orig.grb": "refuses modal flashes",
    "jj/l1-3.grb": "refuses modal flashes",
    "exposure/example.grb": "refuses an X too many in an aperture definition",
    "macro-primitives/lower-left-rect-primitive.gbr": "refuses macro primitive 22",
    "macro-primitives/rotated-lower-left-rect-primitive.gbr": "refuses macro primitive 22",
    "pads/circle-with-rect-hole.gbr": "refuses rectangular holes",
    "pads/obround-with-rect-hole.gbr": "refuses rectangular holes",
    "pads/polygon-with-rect-hole.gbr": "refuses rectangular holes",
    "pads/rectangle-with-rect-hole.gbr": "refuses rectangular holes",
    "arc-strokes/zero-length.gbr": "drops an arc of no length; it is a dot",
    "step-repeats/multi-polarity-over-existing.gbr": "ignores SR",
    "step-repeats/multi-polarity-over-self.gbr": "ignores SR",
    "step-repeats/multi-polarity.gbr": "ignores SR",
    "step-repeats/one-polarity.gbr": "ignores SR",
}


def files(package: str) -> list[Path]:
    root = fetch(package)
    if root is None:
        pytest.skip(reasons[package])
    return sorted(
        p for p in root.rglob("*") if p.is_file() and p.suffix.lower() not in _NOT_GERBER and not p.name.startswith(("LICENSE", "README"))
    )


def key(path: Path) -> str:
    return f"{path.parent.name}/{path.name}"


def read(path: Path) -> Image:
    return read_gerber(path.read_bytes(), path.name)


def second_opinion(path: Path) -> gerbonara.GerberFile:
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        return gerbonara.GerberFile.from_string(path.read_bytes().decode("latin-1"))


@pytest.mark.parametrize(("package", "least"), [("tracespace", 115), ("pygerber", 6), ("gerbv", 53)])
def test_every_file_is_read_or_refused_for_a_known_reason(package: str, least: int) -> None:
    refused = {}
    read_in_full = 0
    for path in files(package):
        try:
            image = read(path)
        except InputError as error:
            refused[key(path)] = "\n".join(problem.message for problem in error.problems)
            continue
        read_in_full += 1
        assert len(image) > 0, path
        assert np.isfinite(image.start).all() and np.isfinite(image.end).all(), path
        assert np.array_equal(np.isfinite(image.centre[:, 0]), image.kind == Kind.ARC), path
        assert (image.line > 0).all() and (np.diff(image.contours.first) > 0).all(), path
    expected = {name: text for name, text in REFUSED.items() if package == "gerbv"}
    assert sorted(refused) == sorted(expected)
    for name, text in expected.items():
        assert text in refused[name], name
    assert read_in_full >= least


@pytest.mark.parametrize("package", ["tracespace", "pygerber", "gerbv"])
def test_kinds_and_places_agree_with_gerbonara(package: str) -> None:
    names = {Line: Kind.DRAW, Arc: Kind.ARC, Flash: Kind.FLASH, Region: Kind.REGION}
    compared = 0
    for path in files(package):
        if key(path) in REFUSED or key(path) in NO_SECOND_OPINION:
            continue
        if path.stat().st_size > 1_000_000:
            continue  # 20 s of parsing for nothing new
        image, other = read(path), second_opinion(path)
        found = Counter(int(kind) for kind in image.kind)
        assert found == Counter(names[type(item)] for item in other.objects), path
        for cls, kind in ((Line, Kind.DRAW), (Arc, Kind.ARC), (Flash, Kind.FLASH)):
            theirs = [item.converted(MM) for item in other.objects if isinstance(item, cls)]
            places = [(i.x, i.y, i.x, i.y) if cls is Flash else (i.x1, i.y1, i.x2, i.y2) for i in theirs]
            mine = image.kind == kind
            # Arcs in gerbonara keep both radii; the ends are those of the file in both.
            np.testing.assert_allclose(
                np.hstack([image.start[mine], image.end[mine]]), np.array(places).reshape(-1, 4), atol=1e-6, err_msg=str(path)
            )
        if image.negative:
            compared += 1
            continue  # gerbonara swaps the polarity of objects for IPNEG until the first LP
        assert image.dark.tolist() == [bool(item.polarity_dark) for item in other.objects], path
        compared += 1
    assert compared >= {"tracespace": 100, "pygerber": 5, "gerbv": 35}[package]


def test_nets_of_a_board_with_x2_attributes() -> None:
    root = fetch("pygerber")
    if root is None:
        pytest.skip(reasons["pygerber"])
    path = next(root.rglob("simple_2layer-F_Cu.gbr"))
    image = read(path)
    assert image.attributes[".FileFunction"] == ("Copper", "L1", "Top")
    # The names as they stand in the text, found by other means.
    text = path.read_text()
    written = {line.split("TO.N,")[1].split("*")[0] for line in text.splitlines() if "TO.N," in line}
    assert {name for names in image.nets for name in names} == {name for name in written if name and name != "N/C"}
    assert {f"{pin.component},{pin.number}" for pin in image.pins} == {
        ",".join(line.split("TO.P,")[1].split("*")[0].split(",")[:2]) for line in text.splitlines() if "TO.P," in line
    }
    flashed = image.kind == Kind.FLASH
    assert (image.pin[~flashed] == -1).all()


def test_step_and_repeat_of_a_real_file_is_six_times_the_same() -> None:
    root = fetch("gerbv")
    if root is None:
        pytest.skip(reasons["gerbv"])
    once, six = (read(next(root.rglob(name))) for name in ("top.gbx", "top_sr.gbx"))
    # Its README: the same file with %SRX2Y3I4.000J3.000*% in inches.
    assert len(six) == 6 * len(once)
    steps = [(25.4 * 4 * i, 25.4 * 3 * j) for i in range(2) for j in range(3)]
    np.testing.assert_allclose(six.start, np.concatenate([once.start + step for step in steps]), atol=1e-9)


def test_a_file_cut_into_its_three_layers_by_hand_holds_the_same() -> None:
    root = fetch("gerbv")
    if root is None:
        pytest.skip(reasons["gerbv"])
    whole, *parts = (read(next(root.rglob(f"l1-{name}.grb"))) for name in ("orig", "1", "2", "3"))
    # Its README: l1-1, l1-2 and l1-3 are the dark, clear and dark layers of l1-orig.
    assert len(whole) == sum(len(part) for part in parts)
    np.testing.assert_array_equal(whole.start, np.concatenate([part.start for part in parts]))
    assert [bool(whole.dark[0]), bool(whole.dark[2]), bool(whole.dark[-1])] == [True, False, True]


def test_remarks_of_old_files_are_few_and_kind() -> None:
    for path in files("gerbv"):
        if key(path) in REFUSED:
            continue
        remarks = read(path).remarks
        assert len(remarks) <= 6, (path, remarks)
        assert all(remark.kind in (RemarkKind.ODD, RemarkKind.GUESS, RemarkKind.DISAGREEMENT) for remark in remarks)
