"""Decks are read with their units, board files override single limits, and each mistake is told by file and line."""

import re
from pathlib import Path

import pytest

import impcheck.checks
from impcheck.artwork.board import Board, RuleOverride
from impcheck.checks.deck import deck_folder, load_deck
from impcheck.checks.discover import all_rules
from impcheck.checks.explain import explain, limits_with_source, rule_names
from impcheck.checks.limits import Length, factor, length, level, share
from impcheck.errors import InputError
from tests.checks.small import BOARD
from tests.tiny_board import write

STANDARD = (deck_folder() / "standard.yaml").read_text(encoding="utf-8")


def deck(*decks, overrides=()):
    return load_deck(Board("b", "board.yaml", decks=decks or ("standard",), overrides=tuple(overrides)))


def of_text(folder, text):
    path = folder / "mine.yaml"
    path.write_text(text, encoding="utf-8")
    return str(path)


def mistakes(*decks, overrides=()):
    with pytest.raises(InputError) as caught:
        deck(*decks, overrides=overrides)
    return [str(problem) for problem in caught.value.problems]


def test_the_defaults_are_the_agreed_ones():
    # the table of rules of the project's design
    limits = deck().limits
    assert limits["impedance"].shortest == Length(rise=0.03)
    assert (limits["width"].deviation, limits["width"].shortest) == (0.1, Length(mm=0.1))
    assert (limits["neck-down"].share, limits["neck-down"].shortest) == (0.8, Length(mm=0.1))
    assert limits["reference-gap"].shortest == Length(mm=0.1)
    assert (limits["plane-edge"].heights, limits["plane-edge"].longest) == (1.0, Length(rise=0.03))
    assert (limits["return-via"].reach, limits["return-via"].at_most) == (Length(rise=0.1), Length(mm=3.0))
    assert limits["via-stub"].longest == Length(rise=0.03)
    assert limits["branch-stub"].longest == Length(rise=0.05)
    assert {name for name in limits if limits[name].level == "error"} == {"open", "short", "reference-gap", "impedance"}
    assert {name for name in limits if limits[name].level == "warning"} == set(limits) - {"open", "short", "reference-gap", "impedance"}


@pytest.mark.parametrize("name", sorted(all_rules()))
def test_every_rule_has_its_entry_its_page_and_its_tests(name):
    found = {key: source for key, _, source in limits_with_source(name)}
    assert set(found) == set(all_rules()[name].limits.__dataclass_fields__)
    assert all(source for key, source in found.items() if key != "level"), "a limit without its source"
    page = all_rules()[name].page
    assert [word in page for word in ("Measured:", "Why it matters:", "What to do:")] == [True] * 3
    # the page names no number that the deck could contradict
    assert re.findall(r"\d+(?:\.\d+)?\s*(?:%|mm\b|um\b|ps\b)", page) == []
    assert (Path(__file__).parent / f"test_rule_{name.replace('-', '_')}.py").is_file()


def test_every_module_of_a_rule_is_found():
    modules = Path(impcheck.checks.__file__).parent.glob("rule_*.py")
    assert sorted(rule_names()) == sorted(path.stem.removeprefix("rule_").replace("_", "-") for path in modules)


def test_a_page_ends_with_the_limits_and_their_source():
    text = explain("return-via")
    assert text.startswith("return-via\n\nA layer change moves the return current to another plane")
    assert "Limits of the standard deck:" in text
    assert "  reach: 10% rise   (common practice)" in text


def test_a_page_that_is_not_there():
    with pytest.raises(InputError, match=r"no rule is called 'impedence' .did you mean 'impedance'"):
        explain("impedence")


def test_a_length_against_the_edge():
    # exact: 5 % of 300 ps at 6 ps/mm is 2.5 mm
    assert length("5% rise").against(300e-12 / 6e-12) == pytest.approx(2.5)
    assert length("20 mil").against(50.0) == pytest.approx(0.508)


@pytest.mark.parametrize(
    ("read", "text", "said"),
    [
        (length, "0.5", "has no unit; write 0.5mm"),
        (length, "-1mm", "is not over zero"),
        (length, "0% rise", "is not over zero"),
        (length, "5 rise", "share of the rise '5'"),
        (share, "0.8", "has no unit; write 80%"),
        (share, "-5%", "is not between 0 and 1000 %"),
        (factor, "1mm", "takes no unit"),
        (factor, "0", "is not a number between 0 and 1000"),
        (level, "fatal", "is no level; write error, warning or note"),
    ],
)
def test_a_limit_that_means_nothing(read, text, said):
    with pytest.raises(ValueError, match=re.escape(said)):
        read(text)


def test_a_board_overrides_single_limits():
    found = deck(overrides=[RuleOverride("via-stub", {"longest": "0.5mm", "level": "error"}, 7)]).limits
    assert (found["via-stub"].longest, found["via-stub"].level) == (Length(mm=0.5), "error")
    assert found["branch-stub"] == deck().limits["branch-stub"]


def test_a_second_deck_goes_over_the_first(tmp_path):
    mine = of_text(tmp_path, "impcheck-rules: 1\nrise_time: 1ns\nrules:\n  width: {deviation: 5%}\n")
    found = deck("standard", mine)
    assert (found.limits["width"].deviation, found.limits["width"].shortest) == (0.05, Length(mm=0.1))
    assert found.rise_time == pytest.approx(1e-9)
    assert deck().rise_time == pytest.approx(5e-10)


def test_every_mistake_of_a_deck_and_a_board_in_one_go(tmp_path):
    text = "impcheck-rules: 1\nrise_time: 0ps\nrules:\n  width: {deviation: 5}\n  wdth: {}\n  open: error\n  via-stub:\n    longst: 1mm\n"
    override = RuleOverride("impedance", {"shortest": 3}, 21)
    found = mistakes("standard", of_text(tmp_path, text), overrides=[override, RuleOverride("stub", {"longest": "1mm"}, 22)])
    assert sorted(found) == sorted(
        [
            "mine.yaml:5: rule 'wdth' is not known (did you mean 'width'?)",
            "mine.yaml:6: the limits of rule 'open' are no mapping (write each limit as `name: value` below the rule)",
            "board.yaml:22: rule 'stub' is not known (did you mean 'via-stub'?)",
            "board.yaml:21: impedance: shortest: length '3' has no unit; write 3mm (for example 0.5mm or 5% rise)",
            "mine.yaml:8: rule via-stub has no limit 'longst' (did you mean 'longest'?)",
            "mine.yaml:4: width: deviation: share '5' has no unit; write 5% (for example 10%)",
            "mine.yaml:2: rise_time '0ps' is not over zero (write a time, as in 500ps)",
        ]
    )


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("rules: {}\n", "this is no rule deck of format 1 (begin it with impcheck-rules: 1)"),
        ("- 1\n", "this is no rule deck of format 1"),
        ("", "this is no rule deck of format 1"),
        ("impcheck-rules: 1\n", "the deck holds no rules"),
        ("impcheck-rules: 1\nrules: [width]\n", "mine.yaml:2: the deck holds no rules"),
        ("impcheck-rules: 1\nrulez: {}\n", "'rulez' is not known in a rule deck (did you mean 'rules'?)"),
        ("impcheck-rules: 1\nrules: {width: {deviation: !!python/none ''}}\n", "tag"),
        ("impcheck-rules: 1\nrules: {width: [\n", "this is no YAML"),
        ("impcheck-rules: 1\nrules: {width: {deviation: [5%]}}\n", "mine.yaml:2: width: deviation: share"),
    ],
)
def test_a_file_that_is_no_deck(text, said, tmp_path):
    assert any(said in found for found in mistakes("standard", of_text(tmp_path, text)))


def test_a_deck_that_is_nowhere():
    assert mistakes("standart") == ["board.yaml: rule deck 'standart' is nowhere (did you mean 'standard'?)"]


def test_a_deck_alone_must_give_every_limit(tmp_path):
    found = mistakes(of_text(tmp_path, "impcheck-rules: 1\nrules:\n  width: {deviation: 5%}\n"))
    assert "rules: no deck gives the limit 'level' of the rule width (put the deck `standard` first in the board file's rules)" in found


def test_a_deck_named_in_the_board_file(tmp_path):
    from impcheck.pipeline import run
    from tests.checks.small import neck

    path = write(tmp_path, BOARD + "rules: [standard, strict.yaml]\n", top_gbr=neck(8, 12, 0.28))
    (tmp_path / "strict.yaml").write_text("impcheck-rules: 1\nrules:\n  width: {deviation: 5%, level: error}\n", encoding="utf-8")
    (hit,) = [f for f in run(path).document.findings if f.rule == "width"]
    assert hit.level == "error"
    assert "7% narrower" in hit.message
