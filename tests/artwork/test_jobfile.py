"""Gerber job files. The example is made up, in the form the Gerber Job Format Specification gives (from memory); values are exact."""

from __future__ import annotations

import json
import random
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from impcheck.artwork.jobfile import Job, read_job
from impcheck.artwork.limits import Limits
from impcheck.artwork.stackup import CopperItem, Dielectric, Mask
from impcheck.errors import InputError, RemarkKind


def example() -> dict[str, Any]:
    return {
        "Header": {"GenerationSoftware": {"Vendor": "Tide", "Application": "draw", "Version": "1"}},
        "GeneralSpecs": {
            "ProjectId": {"Name": "Tide logger", "GUID": "0", "Revision": "C"},
            "Size": {"X": 60.5, "Y": 40},
            "LayerNumber": 4,
            "BoardThickness": 1.6,
        },
        "FilesAttributes": [
            {"Path": "tide-L1.gbr", "FileFunction": "Copper,L1,Top", "FilePolarity": "Positive"},
            {"Path": "tide-L2.gbr", "FileFunction": "Copper,L2,Inr", "FilePolarity": "Negative"},
            {"Path": "drill\\tide-pth.drl", "FileFunction": "Plated,1,4,PTH"},
            {"Path": "tide-edge.gbr", "FileFunction": "Profile"},
        ],
        "MaterialStackup": [
            {"Type": "Legend", "Name": "top legend"},
            {"Type": "SolderPaste", "Name": "top paste"},
            {"Type": "SolderMask", "Thickness": 0.02, "DielectricConstant": 3.6, "LossTangent": 0.03, "Name": "top mask"},
            {"Type": "Copper", "Thickness": 0.042, "Name": "top"},
            {
                "Type": "Dielectric",
                "Thickness": 0.11,
                "Material": "2x1080",
                "DielectricConstant": 4.0,
                "LossTangent": 0.015,
                "Notes": "prepreg",
            },
            {"Type": "Copper", "Thickness": 0.017, "Name": "ground"},
            {"Type": "Dielectric", "Thickness": 1.2, "Name": "core", "DielectricConstant": "4.4", "LossTangent": 0.016},
            {"Type": "Copper", "Thickness": 0.017},
            {"Type": "Dielectric", "Thickness": 0.11, "Material": "FR4", "DielectricConstant": 4.0, "LossTangent": 0.015},
            {"Type": "Copper", "Thickness": 0.042, "Name": "bottom"},
            {"Type": "SolderMask", "Thickness": 0.02, "DielectricConstant": 3.6, "Name": "bottom mask"},
        ],
    }


def read(document: object) -> Job:
    return read_job(json.dumps(document, indent=1).encode(), "tide.gbrjob")


def line_of(document: object, text: str) -> int:
    lines = json.dumps(document, indent=1).splitlines()
    return next(number for number, line in enumerate(lines, 1) if text in line)


def test_everything_a_job_file_states() -> None:
    job = read(example())
    assert (job.file, job.name, job.size, job.layer_count, job.thickness) == ("tide.gbrjob", "Tide logger", (60.5, 40.0), 4, 1.6)
    assert job.functions == {
        "tide-L1.gbr": ("Copper", "L1", "Top"),
        "tide-L2.gbr": ("Copper", "L2", "Inr"),
        "drill/tide-pth.drl": ("Plated", "1", "4", "PTH"),
        "tide-edge.gbr": ("Profile",),
    }
    assert job.polarities == {"tide-L1.gbr": "Positive", "tide-L2.gbr": "Negative"}
    assert (job.missing, job.remarks) == ((), ())


def test_the_stackup_top_to_bottom() -> None:
    stackup = read(example()).stackup
    assert stackup is not None
    line = line_of(example(), '"top"') - 3  # its opening brace
    assert stackup.items[0] == Mask(0.02, 3.6, 0.03)
    assert stackup.items[1] == CopperItem("L1", 0.042, line=line)
    dielectrics = [item for item in stackup.items if isinstance(item, Dielectric)]
    assert [(item.thickness, item.er, item.loss_tangent, item.name, item.core) for item in dielectrics] == [
        (0.11, 4.0, 0.015, "2x1080", False),
        (1.2, 4.4, 0.016, "core", True),
        (0.11, 4.0, 0.015, "FR4", None),
    ]
    assert [copper.name for copper in stackup.coppers] == ["L1", "L2", "L3", "L4"]
    # exact: the sum of all but the masks
    assert stackup.heights[0][1] == pytest.approx(0.042 + 0.11 + 0.017 + 1.2 + 0.017 + 0.11 + 0.042, abs=1e-12)


@pytest.mark.parametrize(
    ("change", "sentence"),
    [
        ((3, "Thickness", None), "the copper layer 'top' (line {line}) has no Thickness"),
        ((3, "Thickness", 0), "the copper layer 'top' (line {line}) has no Thickness"),
        ((3, "Thickness", -0.035), "the copper layer 'top' (line {line}) has the impossible Thickness -0.035 mm"),
        ((7, "Thickness", "thin"), "the copper layer (line {line}) has no Thickness"),
        ((6, "DielectricConstant", None), "the dielectric 'core' (line {line}) has no DielectricConstant"),
        ((6, "DielectricConstant", 0.4), "the dielectric 'core' (line {line}) has the impossible DielectricConstant 0.4"),
        ((6, "DielectricConstant", True), "the dielectric 'core' (line {line}) has no DielectricConstant"),
        ((6, "LossTangent", 15), "the dielectric 'core' (line {line}) has the impossible LossTangent 15"),
        ((2, "DielectricConstant", None), "the solder mask 'top mask' (line {line}) has no DielectricConstant"),
        ((10, "Thickness", None), "the solder mask 'bottom mask' (line {line}) has no Thickness"),
        ((5, "Type", "Dielectric"), "the dielectric 'ground' (line {line}) has no DielectricConstant"),
    ],
)
def test_what_is_missing_is_said_and_nothing_is_assumed(change: tuple[int, str, object], sentence: str) -> None:
    document = example()
    index, key, value = change
    document["MaterialStackup"][index] = {k: v for k, v in {**document["MaterialStackup"][index], key: value}.items() if v is not None}
    text = json.dumps(document["MaterialStackup"][: index + 1], indent=1)
    whole = json.dumps(document, indent=1).splitlines()
    begin = next(number for number, line in enumerate(whole, 1) if '"MaterialStackup"' in line)
    line = begin + max(number for number, row in enumerate(text.splitlines()) if row == " {")
    job = read(document)
    assert job.missing == (sentence.format(line=line),)
    assert job.stackup is None
    assert len(job.items) == 9


@pytest.mark.parametrize(
    ("items", "sentences"),
    [
        (slice(3, 4), ["the stackup lists 1 of the 2 copper layers that a trace and its reference need at least"]),
        (slice(4, 10), ["the dielectric (line {line}) lies outside the outer copper layers"]),
    ],
)
def test_incomplete_orders_are_said(items: slice, sentences: list[str]) -> None:
    document = example()
    document["MaterialStackup"] = document["MaterialStackup"][items]
    job = read(document)
    assert job.stackup is None
    line = line_of(document, '"2x1080"') - 3 if items.start == 4 else 0
    assert list(job.missing) == [sentence.format(line=line) for sentence in sentences]


def test_copper_upon_copper_is_said() -> None:
    document = example()
    del document["MaterialStackup"][6]
    (sentence,) = read(document).missing
    assert sentence.startswith("there is no dielectric above the copper layer")


def test_a_job_file_without_a_stackup_has_none_and_misses_nothing() -> None:
    document = example()
    del document["MaterialStackup"]
    job = read(document)
    assert (job.stackup, job.missing, job.items) == (None, (), ())


def test_an_absent_loss_is_said_and_does_not_keep_the_stackup_from_use() -> None:
    document = example()
    del document["MaterialStackup"][6]["LossTangent"]
    job = read(document)
    assert job.stackup is not None
    assert [(remark.kind, remark.text) for remark in job.remarks] == [
        (RemarkKind.LIMIT, "the job file gives no loss tangent for core: no loss is calculated there")
    ]


def test_contradictions_are_said() -> None:
    document = example()
    document["GeneralSpecs"]["LayerNumber"] = 6
    document["GeneralSpecs"]["BoardThickness"] = 0.8
    document["FilesAttributes"].append({"Path": "tide-L1.gbr", "FileFunction": "Copper,L3,Inr"})
    document["FilesAttributes"].append({"FileFunction": "Copper,L4,Bot"})
    remarks = read(document).remarks
    assert [remark.kind for remark in remarks] == [RemarkKind.ODD] * 2 + [RemarkKind.DISAGREEMENT] * 2
    assert "'tide-L1.gbr' is listed twice" in remarks[0].text
    assert "has no Path" in remarks[1].text
    assert "says 6 copper layers and lists 4" in remarks[2].text
    assert "board is 0.8 mm thick, its stackup adds up to 1.578 mm" in remarks[3].text
    assert all(remark.line > 0 for remark in remarks)


def test_the_older_spelling_of_the_sections_is_read() -> None:
    document = {{"GeneralSpecs": "Overall", "FilesAttributes": "Files_Attributes"}.get(k, k): v for k, v in example().items()}
    job = read(document)
    assert (job.name, len(job.functions)) == ("Tide logger", 4)


@pytest.mark.parametrize(
    ("data", "line", "message"),
    [
        (b"", 0, "the file is empty"),
        (b'{"Header": {},\n "GeneralSpecs": {"Size": \n}}', 3, "this is no JSON: expecting value (column 1)"),
        (b'{"Header": {},\n "GeneralSpecs": {', 2, "this is no JSON"),
        (b"Dear fab house", 1, "this is no JSON"),
        (b"[1, 2]", 1, "a job file holds one JSON object"),
        (b'{"name": "something else"}', 1, "this JSON is no Gerber job file"),
        (b"[" * 100_000, 0, "the JSON is nested too deep"),
        (b'{"Header": ' + b"9" * 10_000 + b"}", 0, "a number beyond any length"),
    ],
)
def test_what_is_no_job_file_gives_one_error(data: bytes, line: int, message: str) -> None:
    with pytest.raises(InputError) as caught:
        read_job(data, "tide.gbrjob")
    (problem,) = caught.value.problems
    assert message in problem.message
    assert (problem.file, problem.line) == ("tide.gbrjob", line)
    assert problem.remedy


def test_the_size_limit_is_named() -> None:
    with pytest.raises(InputError, match="limit file_bytes = 10"):
        read_job(json.dumps(example()).encode(), "tide.gbrjob", Limits(file_bytes=10))


@settings(max_examples=150, deadline=None)
@given(st.integers(0, 2**32))
def test_values_of_any_type_anywhere_never_give_a_traceback(seed: int) -> None:
    rng = random.Random(seed)
    document: Any = example()
    for _ in range(rng.randint(1, 4)):
        node = document
        while isinstance(node, dict | list) and node:
            key = rng.choice(list(node)) if isinstance(node, dict) else rng.randrange(len(node))
            if not isinstance(node[key], dict | list) or rng.random() < 0.3:
                node[key] = rng.choice([None, True, -1, 1e308, "x", "", [], {}, [[1]], {"a": []}, float("inf")])
                break
            node = node[key]
    try:
        read(document)
    except InputError as error:
        assert all(problem.message for problem in error.problems)
