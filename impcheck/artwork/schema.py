"""The shape of a board file. In: text, lists and mappings as YAML holds them; out: models in mm, s, ohm, and a JSON Schema for editors."""

from __future__ import annotations

from collections.abc import Callable
from typing import Annotated, Any, Literal

from pydantic import BaseModel, BeforeValidator, ConfigDict, Discriminator, Field, StringConstraints, Tag, ValidationInfo, WithJsonSchema

from impcheck import units

VERSION = "1"


def _between(read: Callable[[str, str], float], low: float, high: float, unit: str = "", reaches: bool = False) -> BeforeValidator:
    """A validator: `read` turns text into a number, which must lie above `low` (or be it, where it `reaches` it) and not above `high`."""

    def validate(value: object, info: ValidationInfo) -> float:
        what = (info.field_name or "value").replace("_", " ")
        if not isinstance(value, str):
            raise ValueError(f"{what} must be one quantity, not {described(value)}")
        number = read(value, what)
        if number < low or (number == low and not reaches) or number > high:
            bound = f"at least {low:g}" if reaches else f"above {low:g}"
            raise ValueError(f"{what} '{value}' is impossible; it must be {bound} and at most {high:g}{unit}")
        return number

    return BeforeValidator(validate)


def _length(text: str, what: str) -> float:
    try:
        bare = abs(float(text))
    except ValueError:
        bare = 0.0
    return units.length(text, what, "um" if bare >= 5 else "mm")


def _place(text: str, what: str) -> float:
    return units.length(text, what, "mm")


def _written(example: str, meaning: str) -> WithJsonSchema:
    return WithJsonSchema({"type": "string", "pattern": r"^\s*[+-]?[0-9.]", "examples": [example], "description": meaning})


_LENGTH = _written("0.19mm", "A length with its unit: mm, um, mil, in")
_TIME = _written("300ps", "A time with its unit: ps, ns")

CopperThickness = Annotated[float, _between(_length, 0, 2, " mm"), _LENGTH]
DielectricThickness = Annotated[float, _between(_length, 0, 20, " mm"), _LENGTH]
MaskThickness = Annotated[float, _between(_length, 0, 1, " mm"), _LENGTH]
Width = Annotated[float, _between(_length, 0, 1000, " mm"), _LENGTH]
SmallLength = Annotated[float, _between(_length, 0, 1, " mm", reaches=True), _LENGTH]
Coordinate = Annotated[float, _between(_place, -10_000, 10_000, " mm", reaches=True), _LENGTH]
Duration = Annotated[float, _between(units.time, 0, 1e-3, " s"), _TIME]
Ohms = Annotated[float, _between(units.impedance, 0, 10_000, " ohm"), _written("50 ohm", "An impedance with its unit: ohm")]
Tolerance = Annotated[float, _between(units.ratio, 0, 0.9, ", where 1 is 100%"), _written("10%", "A share in per cent")]
Permittivity = Annotated[
    float,
    _between(units.number, 1, 1000, reaches=True),
    WithJsonSchema({"type": "number", "minimum": 1, "maximum": 1000, "description": "Relative permittivity"}),
]
LossTangent = Annotated[
    float,
    _between(units.number, 0, 1, reaches=True),
    WithJsonSchema({"type": "number", "minimum": 0, "maximum": 1, "description": "Loss tangent"}),
]


def _name(value: object) -> object:
    if isinstance(value, str) and value.strip():
        return value.strip()
    raise ValueError(f"a name is expected here, not {described(value)}")


def _yes_or_no(value: object, info: ValidationInfo) -> object:
    if isinstance(value, str) and value.lower() in ("true", "false"):
        return value.lower() == "true"
    raise ValueError(f"{info.field_name} must be true or false, not {described(value)}")


def _version(value: object) -> object:
    if value == VERSION:
        return value
    raise ValueError(f"the board file has the format {described(value)}; this version of impcheck reads format 1, write `impcheck: 1`")


Name = Annotated[str, BeforeValidator(_name), StringConstraints(max_length=500), WithJsonSchema({"type": ["string", "number"]})]
YesNo = Annotated[bool, BeforeValidator(_yes_or_no), WithJsonSchema({"type": "boolean"})]


def described(value: object) -> str:
    """How a wrong value is called in an error."""
    if value is None:
        return "nothing"
    if isinstance(value, list):
        return "a list"
    if isinstance(value, dict):
        return "a mapping"
    text = str(value)
    return f"'{text if len(text) <= 40 else text[:37] + '...'}'"


class Entry(BaseModel):
    """Anything in a board file: keys not named here are mistakes."""

    model_config = ConfigDict(extra="forbid", frozen=True, populate_by_name=False)


class MaskEntry(Entry):
    """Solder mask over an outer layer."""

    mask: MaskThickness = Field(description="Thickness of the solder mask")
    er: Permittivity
    loss_tangent: LossTangent = 0.0
    name: Name = ""


class CopperEntry(Entry):
    """A copper layer."""

    copper: Name = Field(description="Name of the layer, used everywhere else")
    thickness: CopperThickness = Field(description="Finished thickness of the copper")
    file: Name | None = Field(None, description="Its Gerber file; may be left out where the files say it themselves")
    etch: SmallLength = Field(0.0, json_schema_extra={"default": "0"}, description="How much narrower the far side is, in total")
    roughness: SmallLength = Field(0.0, json_schema_extra={"default": "0"}, description="Roughness, rms")
    negative: YesNo | None = Field(None, description="true: what is drawn is etched away")


class DielectricEntry(Entry):
    """A dielectric between two copper layers."""

    dielectric: DielectricThickness = Field(description="Thickness as pressed")
    er: Permittivity
    loss_tangent: LossTangent = 0.0
    name: Name = Field("", description="Material; the words core and prepreg are understood")
    core: YesNo | None = Field(None, description="true: a core, false: prepreg")


ITEMS = {"mask": MaskEntry, "copper": CopperEntry, "dielectric": DielectricEntry}


def _kind(value: Any) -> str | None:
    """Which of the three items a stackup entry is, by the key it holds; the tag is no key, so that a path in the file stays clear."""
    keys = value if isinstance(value, dict) else type(value).model_fields if isinstance(value, Entry) else ()
    return next((f"<{kind}>" for kind in ITEMS if kind in keys), None)


StackupEntry = Annotated[
    Annotated[MaskEntry, Tag("<mask>")] | Annotated[CopperEntry, Tag("<copper>")] | Annotated[DielectricEntry, Tag("<dielectric>")],
    Discriminator(_kind),
]


class BackdrillEntry(Entry):
    """From which side a back-drill comes, and up to which layer the barrel stays."""

    begin: Name = Field(alias="from")
    keep: Name


class DrillEntry(Entry):
    """A drill file."""

    file: Name
    plated: YesNo | None = None
    layers: tuple[Name, Name] | None = Field(None, description="First and last copper layer the holes pass")
    backdrill: BackdrillEntry | None = None


LayeredWidth = Annotated[
    Annotated[Width, Tag("<everywhere>")] | Annotated[dict[str, Width], Tag("<by layer>")],
    Discriminator(lambda value: "<by layer>" if isinstance(value, dict) else "<everywhere>"),
]


class ClassEntry(Entry):
    """What nets of a class are held to."""

    impedance: Ohms | None = None
    differential: Ohms | None = None
    common: Ohms | None = None
    tolerance: Tolerance = Field(0.1, description="Share of the target, both ways", json_schema_extra={"default": "10%"})
    rise_time: Duration | None = None
    width: LayeredWidth | None = Field(None, description="Width of the trace, or widths by layer")
    gap: LayeredWidth | None = Field(None, description="Gap inside a pair, or gaps by layer")
    max_skew: Duration | None = None


class PlaceEntry(Entry):
    """A place where a net begins or ends."""

    x: Coordinate
    y: Coordinate
    layer: Name | None = None


EndEntry = Annotated[
    Annotated[Name, Tag("<pin>")] | Annotated[PlaceEntry, Tag("<place>")],
    Discriminator(lambda value: "<place>" if isinstance(value, dict | Entry) else "<pin>"),
]


class NetEntry(Entry):
    """A net to check; a shell pattern stands for several."""

    net: Name
    net_class: Name = Field(alias="class")
    begin: EndEntry | None = Field(None, alias="from")
    end: EndEntry | None = Field(None, alias="to")


class PairEntry(Entry):
    """A differential pair to check."""

    pair: Name
    p: Name
    n: Name
    net_class: Name = Field(alias="class")
    begin: tuple[EndEntry, EndEntry] | None = Field(None, alias="from")
    end: tuple[EndEntry, EndEntry] | None = Field(None, alias="to")


def _net_or_pair(value: Any) -> str | None:
    keys = value if isinstance(value, dict) else type(value).model_fields if isinstance(value, Entry) else ()
    return "<pair>" if any(key in keys for key in ("pair", "p", "n")) else "<net>" if "net" in keys else None


RequestEntry = Annotated[Annotated[NetEntry, Tag("<net>")] | Annotated[PairEntry, Tag("<pair>")], Discriminator(_net_or_pair)]


class GroupEntry(Entry):
    """Nets whose delays are to agree."""

    name: Name
    nets: tuple[Name, ...] = Field(min_length=1)
    match: Duration


RuleEntry = Annotated[
    Annotated[Name, Tag("<deck>")] | Annotated[dict[str, dict[str, Any]], Tag("<limits>")],
    Discriminator(lambda value: "<limits>" if isinstance(value, dict) else "<deck>"),
]


class BoardFile(Entry):
    """An impcheck board file: which files make the board, how it is built, and what its nets are held to."""

    model_config = ConfigDict(extra="forbid", frozen=True, title="impcheck board file")

    impcheck: Annotated[Literal["1"], BeforeValidator(_version), WithJsonSchema({"const": 1})] = Field(description="Version of this format")
    board: Name = Field("", description="Name of the board")
    files: Name | None = Field(None, description="Folder or .zip of the fabrication files, relative to this file")
    netlist: Name | None = Field(None, description="IPC-D-356 netlist; found by content when left out")
    outline: Name | None = Field(None, description="Gerber file of the board's outline; found by attribute or name when left out")
    stackup: tuple[StackupEntry, ...] = Field((), description="Top to bottom")
    drills: tuple[DrillEntry, ...] = ()
    returns: tuple[Name, ...] = Field((), description="Nets that may carry return current; patterns")
    joins: tuple[Name, ...] = Field((), description="Two-pin parts the signal runs through")
    classes: dict[str, ClassEntry] = Field(default_factory=dict)
    nets: tuple[RequestEntry, ...] = ()
    groups: tuple[GroupEntry, ...] = ()
    rules: tuple[RuleEntry, ...] = Field(("standard",), description="Rule decks by name or path; a mapping overrides single limits")
    waivers: Name | None = Field(None, description="File of waived findings")


def json_schema() -> dict[str, Any]:
    """The JSON Schema (draft 2020-12) of a board file, for editors and other programs. Keys and shapes; that names agree with each other is
    checked by the reader alone."""
    schema = BoardFile.model_json_schema(by_alias=True)
    schema["$schema"] = "https://json-schema.org/draft/2020-12/schema"
    return schema
