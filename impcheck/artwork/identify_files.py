"""Which file plays which part on the board. In: a plan, the files' first bytes, a job file; out: Parts, by file name, with remarks."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field

from impcheck.artwork.boardfile import DrillWish, Plan
from impcheck.artwork.identify import (
    DRILL_SUFFIXES,
    SNIFF,
    UNKNOWN,
    Role,
    Source,
    back_drill_in,
    content_kind,
    function_in,
    number_inner,
    role_of_function,
    role_of_name,
)
from impcheck.artwork.package import Package
from impcheck.artwork.stackup import Stackup
from impcheck.errors import InputError, Problems, Remark, RemarkKind

_OUTLINE_WORDS = ("gko", "edge", "outline", "profile", "contour", "gm1", "gml", "dim")  # by name: the likelier first


@dataclass
class Parts:
    """The files that have a part on the board, by their path in the package; None where no file was found."""

    copper: list[str | None]
    mask_top: str | None = None
    mask_bottom: str | None = None
    outline: str | None = None
    drills: dict[str, tuple[Role, DrillWish | None]] = field(default_factory=dict)
    remarks: list[Remark] = field(default_factory=list)


@dataclass(frozen=True)
class Heads:
    """What the first bytes of every file say."""

    kinds: Mapping[str, str]  # content_kind
    functions: Mapping[str, tuple[str, ...]]  # .FileFunction


@dataclass(frozen=True)
class Known:
    """What every file looks like and is said to be."""

    kinds: Mapping[str, str]
    roles: Mapping[str, Role]
    remarks: tuple[Remark, ...] = ()


def sniff(package: Package, problems: Problems) -> Heads:
    """Looks at the first bytes of every file."""
    kinds: dict[str, str] = {}
    functions: dict[str, tuple[str, ...]] = {}
    for name in package.names:
        try:
            head = package.head(name, SNIFF)
        except InputError as error:
            problems.take(error)
            continue
        kinds[name] = content_kind(head)
        functions[name] = function_in(head) if kinds[name] in ("gerber", "excellon") else ()
    return Heads(kinds, functions)


def know(heads: Heads, job_functions: Mapping[str, Sequence[str]]) -> Known:
    """The role of each file by its attribute, else the job file, else its name; and where attribute and job file disagree."""
    roles: dict[str, Role] = {}
    remarks: list[Remark] = []
    for name, kind in heads.kinds.items():
        said = role_of_function(heads.functions[name], Source.ATTRIBUTE)
        listed = role_of_function(job_functions.get(name, ()), Source.JOB_FILE)
        if said.part == "copper" and said.layer is None:  # an old or broken attribute: it does not say which layer
            said = UNKNOWN
        if (
            said.part
            and listed.part
            and (said.part, said.layer, said.side) != (listed.part, listed.layer, listed.side)
            and listed.part != "other"
        ):
            text = f"the job file calls this {called(listed)}, its file attribute {called(said)}; the attribute was followed"
            remarks.append(Remark(RemarkKind.DISAGREEMENT, text, name))
        roles[name] = said if said.part else listed if listed.part else role_of_name(name, kind)
    return Known(heads.kinds, roles, tuple(remarks))


def called(role: Role) -> str:
    """A role in words."""
    if role.part == "copper":
        return (
            f"copper layer {role.layer}"
            if role.layer
            else f"the {role.side} copper"
            if role.side in ("top", "bottom")
            else "an inner copper layer"
        )
    if role.part == "mask":
        return f"the {role.side} solder mask"
    return {"outline": "the board's outline", "drill": "a drill file"}.get(role.part, "no part of the copper")


def identify(plan: Plan, stackup: Stackup, package: Package, known: Known, problems: Problems) -> Parts:
    """Gives each part of the board its file. What cannot be settled is added to `problems`."""
    found = _Identifier(plan, stackup, package, known, problems)
    found.claims()
    found.copper()
    found.masks()
    found.outline()
    found.drills()
    found.leftovers()
    return found.parts


class _Identifier:
    def __init__(self, plan: Plan, stackup: Stackup, package: Package, known: Known, problems: Problems) -> None:
        self.plan, self.stackup, self.package, self.problems = plan, stackup, package, problems
        self.kinds, self.roles = known.kinds, known.roles
        self.count = len(stackup.coppers)
        self.parts = Parts([None] * self.count)
        self.claimed: dict[str, str] = {}  # file -> what the board file says it is
        self.quarrel = False  # files quarrelled about a layer: a layer without a file is then no further mistake

    def remark(self, kind: RemarkKind, text: str, file: str) -> None:
        self.parts.remarks.append(Remark(kind, text, file))

    def claim(self, wanted: str, line: int, what: str, role: Role) -> str | None:
        """The file the board file names for a part, taken away from all other parts."""
        name = self.package.find(wanted)
        if name is None:
            said = f"there is no file '{wanted}' in '{self.package.shown}'"
            self.problems.add(self.plan.board.file, line, said, self.package.like(wanted))
            return None
        if name in self.claimed:
            said = f"file '{wanted}' is given to {self.claimed[name]} and to {what}"
            self.problems.add(self.plan.board.file, line, said, "give each part of the board its own file")
            return None
        self.claimed[name] = what
        said_role = self.roles.get(name, UNKNOWN)
        same = said_role.part == role.part and (role.part != "copper" or said_role.layer == role.layer)
        if said_role.source in (Source.ATTRIBUTE, Source.JOB_FILE) and not same:
            text = f"the board file calls this {what}, {said_role.source} {called(said_role)}; the board file was followed"
            self.remark(RemarkKind.DISAGREEMENT, text, name)
        return name

    def claims(self) -> None:
        for index, item in enumerate(self.stackup.coppers):
            if item.file is not None:
                role = Role("copper", Source.BOARD_FILE, layer=index + 1)
                self.parts.copper[index] = self.claim(item.file, item.line, f"copper layer {item.name}", role)
        if self.plan.outline is not None:
            self.parts.outline = self.claim(
                self.plan.outline.name, self.plan.outline.line, "the outline", Role("outline", Source.BOARD_FILE)
            )
        for wish in self.plan.drills:
            name = self.claim(wish.file, wish.line, "a drill file", Role("drill", Source.BOARD_FILE))
            if name is not None:
                said = self.roles.get(name, UNKNOWN)
                self.parts.drills[name] = (said if said.part == "drill" else Role("drill", Source.BOARD_FILE), wish)

    def of(self, part: str, source: Source) -> dict[str, Role]:
        """The files not claimed by the board file that are this part, by this source."""
        return {n: role for n, role in self.roles.items() if n not in self.claimed and role.part == part and role.source is source}

    def copper(self) -> None:
        named = [item.file is not None for item in self.stackup.coppers]
        for source in (Source.ATTRIBUTE, Source.JOB_FILE, Source.NAME):
            found = self.of("copper", source)
            layers = (
                self.by_name(found, named) if source is Source.NAME else {name: role.layer for name, role in found.items() if role.layer}
            )
            wanted: dict[int, list[str]] = {}
            for name, layer in sorted(layers.items()):
                wanted.setdefault(layer, []).append(name)
            taken = {index + 1 for index in range(self.count) if named[index] or self.parts.copper[index] is not None}
            for layer, names in sorted(wanted.items()):
                self.settle(layer, names, source, layer in taken)
        if self.quarrel:
            return
        for index, item in enumerate(self.stackup.coppers):
            if self.parts.copper[index] is None and not named[index]:
                unknown = [name for name, role in self.roles.items() if not role.part and self.kinds.get(name) == "gerber"]
                remedy = f"write `file:` in its line; not known is what {_listed(unknown)} {'is' if len(unknown) == 1 else 'are'}"
                if not unknown:
                    remedy = f"put its Gerber file into '{self.package.shown}', or write `file:` in its line"
                line = item.line or self.plan.stackup_line
                self.problems.add(self.plan.board.file, line, f"copper layer {item.name} of the stackup has no file", remedy)

    def settle(self, layer: int, names: Sequence[str], source: Source, taken: bool) -> None:
        """Gives a copper layer its file, or says why not."""
        if layer > self.count:
            for name in names:
                said = f"{source} says it is copper layer {layer}, and the stackup has {self.count} copper layers"
                self.problems.add(name, 0, said, "add the layer to the stackup, or take the file out")
            return
        label = self.stackup.coppers[layer - 1].name
        if taken:
            for name in names:
                text = f"{source} says it is copper layer {label}, which has a file already; left out"
                self.remark(RemarkKind.DISAGREEMENT, text, name)
            return
        if len(names) > 1:
            self.quarrel = True
            said = f"{source} says it is copper layer {label}, and so says that of {_listed(names[:-1])}"
            self.problems.add(names[-1], 0, said, f"write the right one as `file:` at {label} in the stackup of {self.plan.board.file}")
            return
        self.parts.copper[layer - 1] = names[0]
        if source is Source.NAME:
            self.remark(RemarkKind.GUESS, f"taken for copper layer {label} by its name", names[0])

    def by_name(self, found: Mapping[str, Role], named: Sequence[bool]) -> dict[str, int]:
        """Layers of copper files that only their names tell. Names that fit no free layer are left for the remarks."""
        free = [index + 1 for index in range(self.count) if not named[index] and self.parts.copper[index] is None]
        layers = {}
        for name, role in found.items():
            layer = {"top": 1, "bottom": self.count}.get(role.side)
            if layer in free:
                layers[name] = layer
        inner = {name: role for name, role in found.items() if role.side == "inner"}
        layers.update(number_inner(inner, [layer for layer in free if layer not in layers.values()]))
        return layers

    def single(self, part: str, what: str, candidates: Mapping[Source, Sequence[str]]) -> str | None:
        """One file for a part that is not copper: the strongest source's, by name the first."""
        for source, names in candidates.items():
            if not names:
                continue
            if len(names) > 1 and source is not Source.NAME:
                said = f"{source} says it is {what}, and so says that of {_listed(names[:-1])}"
                remedy = f"write `outline:` in {self.plan.board.file}" if part == "outline" else "keep one of them"
                self.problems.add(names[-1], 0, said, remedy)
                return None
            if source is Source.NAME:
                others = f" (and not {_listed(names[1:])})" if len(names) > 1 else ""
                self.remark(RemarkKind.GUESS, f"taken for {what} by its name{others}", names[0])
            return names[0]
        return None

    def masks(self) -> None:
        for side in ("top", "bottom"):
            candidates = {
                source: sorted(name for name, role in self.of("mask", source).items() if role.side == side)
                for source in (Source.ATTRIBUTE, Source.JOB_FILE, Source.NAME)
            }
            name = self.single("mask", f"the {side} solder mask", candidates)
            if side == "top":
                self.parts.mask_top = name
            else:
                self.parts.mask_bottom = name

    def outline(self) -> None:
        if self.plan.outline is not None:
            return
        candidates = {
            source: sorted(self.of("outline", source), key=_likeness) for source in (Source.ATTRIBUTE, Source.JOB_FILE, Source.NAME)
        }
        self.parts.outline = self.single("outline", "the board's outline", candidates)

    def drills(self) -> None:
        for source in (Source.ATTRIBUTE, Source.JOB_FILE, Source.NAME):
            for name, role in self.of("drill", source).items():
                if role.last is not None and role.last > self.count:
                    said = f"{source} says its holes reach copper layer {role.last}, and the stackup has {self.count} copper layers"
                    self.problems.add(name, 0, said, "correct the stackup, or name the layers under `drills:`")
                elif role.layer is None and back_drill_in(name):
                    said = "by its name it holds back-drills, and nothing says from where and how deep"
                    remedy = f"write `- {{file: {name}, backdrill: {{from: ..., keep: ...}}}}` under `drills:` in {self.plan.board.file}"
                    self.problems.add(name, 0, said, remedy)
                self.parts.drills[name] = (role, None)
        listed = {name for name, (_, wish) in self.parts.drills.items() if wish is not None}
        same = {(role.layer, role.last, role.plated) for name, (role, _) in self.parts.drills.items() if self.kinds[name] == "excellon"}
        for name, (role, _) in list(self.parts.drills.items()):
            if name not in listed and self.kinds[name] == "gerber" and (role.layer, role.last, role.plated) in same:
                del self.parts.drills[name]
                self.remark(RemarkKind.ODD, "the same holes as an Excellon file by its file attribute; left out", name)

    def leftovers(self) -> None:
        """Tells of files that look as if they mattered and have no part."""
        used = {*self.parts.copper, self.parts.mask_top, self.parts.mask_bottom, self.parts.outline, *self.parts.drills}
        for name, role in sorted(self.roles.items()):
            if name in used or name in self.claimed:
                continue
            if role.part == "copper" and role.source is Source.NAME and not self.quarrel:
                self.remark(RemarkKind.ODD, "looks like copper by its name and has no place in the stackup; left out", name)
            elif self.kinds.get(name) == "binary" and name.lower().endswith(DRILL_SUFFIXES):
                self.remark(RemarkKind.ODD, "a drill file by its name, but no text; left out", name)
            elif not role.part and self.kinds.get(name) == "gerber":
                self.remark(RemarkKind.ODD, "neither an attribute nor its name says what this Gerber file is; left out", name)


def _likeness(name: str) -> tuple[int, str]:
    folded = name.casefold()
    return next((rank for rank, word in enumerate(_OUTLINE_WORDS) if word in folded), len(_OUTLINE_WORDS)), name


def _listed(names: Iterable[str]) -> str:
    given = list(names)
    return ", ".join(given[:6]) + (", ..." if len(given) > 6 else "")
