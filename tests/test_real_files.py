"""Workbooks that nobody here made come through `fill` whole: spreadsheets of many programs and many years."""

from __future__ import annotations

import re
import zipfile
from collections import Counter
from pathlib import Path
from typing import NamedTuple
from xml.etree import ElementTree

import pytest
from books import parts
from real_files import NotFetchedError, workbooks
from second_opinion import second_opinion
from unfilled import Value, sheets, stored, without_values

from beamfuncs.hosts.headless.filling import NotFilled, fill

FEWEST = 100
REFUSED = {
    "empty_file.xlsx": "not a workbook",
    "password.xlsx": "protected by a password",
}
"""The workbooks that are not filled, and what is said of each."""


MISSES = {
    "BASES.xlsx": 482,  # numbers in other bases: negative ones in two's complement are #NUM!, and a width of 0 digits
    "CEILING.xlsx": 3,  # where a sign or a zero is out of the ordinary
    "DATE.xlsx": 3,  # days before 1900 or after 9999, which are no days
    "SQRT.xlsx": 1,  # which error the root of a negative number is
    "VDB.xlsx": 44,  # a function that is not known: each is #NAME?
    "VLOOKUP.xlsx": 1,  # a search for the nearest in a column out of order
    "reader.xlsm": 1,  # a whole row that spills over a whole row: an error
    "reveng1.xlsx": 1,  # where two areas meet
}
"""The workbooks that do not get the stored values when worked out afresh, and how many of their cells do not."""

FALSE_NUMBERS = {("CEILING.xlsx", "A3"), ("CEILING.xlsx", "A9"), ("DATE.xlsx", "A12"), ("DATE.xlsx", "A13")} | {
    ("DATE.xlsx", "A14")
}
"""Those of them where the miss is a number: the others are errors, or texts."""

LAST_ROW = 1_048_576
APART = "BZ"
"""A column to which no formula of those workbooks refers."""
RELATIVE = 1e-9


class Outcome(NamedTuple):
    """What `fill` made of a workbook: the file written, or why none was."""

    source: Path
    target: Path
    refusal: str

    @property
    def name(self) -> str:
        """The file's own name, without the letters that tell it from its namesakes."""
        return self.source.name.partition("-")[2]


@pytest.fixture(scope="module")
def outcomes(pytestconfig: pytest.Config, tmp_path_factory: pytest.TempPathFactory) -> list[Outcome]:
    """Every workbook through `fill`; any exception but `NotFilled` fails the test that asks first."""
    try:
        sources = workbooks(pytestconfig.cache.mkdir("real_files"))
    except NotFetchedError as error:
        pytest.skip(f"NOT RUN: the workbooks of other packages are not there ({error})")
    return filled_or_refused(sources, tmp_path_factory.mktemp("filled"))


def filled_or_refused(sources: list[Path], folder: Path) -> list[Outcome]:
    """Each workbook through `fill`, into a folder."""
    return [_outcome(source, folder) for source in sources]


def _outcome(source: Path, folder: Path) -> Outcome:
    target = folder / source.parent.name / source.name
    target.parent.mkdir(exist_ok=True)
    try:
        fill(source, target)
    except NotFilled as error:
        return Outcome(source, target, str(error))
    except Exception as error:
        raise AssertionError(f"{source}: fill broke off with {type(error).__name__}: {error}") from error
    return Outcome(source, target, "")


def _named(element: ElementTree.Element) -> str:
    return element.tag.rpartition("}")[2]


def cells(xml: bytes) -> list[tuple[bool, ElementTree.Element]]:
    """Every cell of a sheet, and whether a formula stands there whose value is not stored."""
    found = []
    for cell in ElementTree.fromstring(xml).iter():
        if _named(cell) == "c":
            inside = {_named(one): one for one in cell}
            value = inside.get("v")
            stored = value is not None and (value.text or cell.get("t") == "str")
            found.append(("f" in inside and not stored, cell))
    return found


def without_value(cell: ElementTree.Element) -> bytes:
    """A cell but for its value and the value's type."""
    copy = ElementTree.fromstring(ElementTree.tostring(cell))
    copy.attrib.pop("t", None)
    for value in [one for one in copy if _named(one) == "v"]:
        copy.remove(value)
    return ElementTree.tostring(copy)


def changes(before: bytes, after: bytes) -> list[str]:
    """The cells that hold something else than before, where a value was stored or more than a value differs."""
    old, new = cells(before), cells(after)
    changed = [
        f"{cell.get('r')}: {ElementTree.tostring(cell)!r} became {ElementTree.tostring(other)!r}"
        for (lacking, cell), (_, other) in zip(old, new, strict=True)
        if ElementTree.tostring(cell) != ElementTree.tostring(other)
        and not (lacking and without_value(cell) == without_value(other))
    ]
    return changed or ([] if any(lacking for lacking, _ in old) or before == after else ["bytes outside the cells"])


def test_all_but_the_broken_ones_are_filled(outcomes: list[Outcome]) -> None:
    """More than a hundred are filled; those that are not are no workbooks, and one line says so."""
    refused = {outcome.name: outcome.refusal for outcome in outcomes if outcome.refusal}
    assert set(refused) == set(REFUSED), refused
    for name, why in REFUSED.items():
        assert why in refused[name]
        assert "\n" not in refused[name]
    assert len(outcomes) - len(refused) >= FEWEST


def test_every_part_but_the_sheets_keeps_its_bytes(outcomes: list[Outcome]) -> None:
    """Parts keep their names, their order and their bytes; of a sheet every formula stays as it was."""
    for source, target, refusal in outcomes:
        if refusal:
            assert not target.exists()
            continue
        old, new = parts(source), parts(target)
        assert list(old) == list(new), source
        changed = {name for name in old if old[name] != new[name]}
        assert changed <= set(sheets(source)), source
        for name in changed:
            formulas = [
                re.findall(rb"<(?:\w+:)?f\b(?:[^>]*/>|.*?</(?:\w+:)?f>)", xml[name], re.S) for xml in (old, new)
            ]
            assert formulas[0] == formulas[1], source


def test_no_stored_value_changes(outcomes: list[Outcome]) -> None:
    """Where no beam is asked for, a sheet keeps every byte, but for the values of formulas that had none stored."""
    changed = [
        f"{source.name} {name} {change}"
        for source, target, refusal in outcomes
        if not refusal
        for name in sheets(source)
        for change in changes(parts(source)[name], parts(target)[name])
    ]
    assert not changed, "\n".join(changed[:20])


def test_filling_again_changes_no_byte(outcomes: list[Outcome], tmp_path: Path) -> None:
    """A workbook that has gained values is filled again: it keeps every byte of every part."""
    gained = [one for one in outcomes if not one.refusal and parts(one.source) != parts(one.target)]
    for _, target, _ in gained:
        again = fill(target, tmp_path / target.name).target
        assert parts(again) == parts(target), target


@pytest.fixture(scope="module")
def afresh(outcomes: list[Outcome], tmp_path_factory: pytest.TempPathFactory) -> list[tuple[Path, Path, Path]]:
    """Each workbook with formulas; its copy that has lost their values; and that copy filled."""
    folder = tmp_path_factory.mktemp("afresh")
    copies = []
    for source, _, refusal in outcomes:
        bare = folder / source.name
        if not refusal and without_values(source, bare):
            copies.append((source, bare, fill(bare).target))
    return copies


def numeric(value: Value) -> bool:
    """Whether a cell stores a number."""
    try:
        float(value.text)
    except ValueError:
        return False
    return not value.is_error


def test_values_worked_out_afresh_are_those_stored(afresh: list[tuple[Path, Path, Path]]) -> None:
    """Without the values that other programs stored, `fill` comes to the same, but for the misses told of."""
    misses: Counter[str] = Counter()
    false_numbers = set()
    formulas = 0
    for source, _, filled in afresh:
        before, after = stored(source), stored(filled)
        assert before.keys() == after.keys()
        formulas += len(before)
        for (_, cell), value in before.items():
            other = after[_, cell]
            if value.text and not value.agrees(other, RELATIVE):
                name = source.name.partition("-")[2]
                misses[name] += 1
                if numeric(other):
                    false_numbers.add((name, cell))
    assert formulas > 3000
    assert misses == MISSES
    assert false_numbers == FALSE_NUMBERS


def test_another_engine_works_out_the_same(afresh: list[tuple[Path, Path, Path]]) -> None:
    """Where a second engine and `fill` both come to a number or a text, it is the same, but for the misses told of."""
    both, differing, unread = 0, set(), []
    for source, bare, filled in afresh:
        theirs = second_opinion(bare)
        if theirs is None:
            unread.append(source.name.partition("-")[2])
            continue
        for place, ours in stored(filled).items():
            their = theirs.get(place)
            if ours.is_error or their is None or str(their).startswith("#"):
                continue
            both += 1
            number = float(their) if isinstance(their, bool) else their
            if not ours.agrees(Value("", str(number), False), RELATIVE):
                differing.add((source.name.partition("-")[2], place[1]))
    assert unread == ["bug_176.xlsx"]  # a strict workbook
    assert both > 1900
    assert differing == {("CEILING.xlsx", "A3")}


def test_a_beam_in_a_workbook_of_others_is_all_that_is_filled(outcomes: list[Outcome], tmp_path: Path) -> None:
    """A beam entered below what stands there gets its value (5/8 of 12 by 8), and no other byte changes."""
    filled = 0
    for source, _, refusal in outcomes:
        if refusal:
            continue
        contents = parts(source)
        sheet = next(
            (name for name, title in sheets(source).items() if title and b"</sheetData>" in contents[name]), None
        )
        if sheet is None:
            continue
        rows = [int(row) for row in re.findall(rb'<row\b[^>]*?\sr="(\d+)"', contents[sheet])]
        if not rows or max(rows) > LAST_ROW - 2:
            continue
        before, formula, after = (
            f'<row r="{max(rows) + 2}"><c r="{APART}{max(rows) + 2}">',
            '<f>reaction("fixed 8 pinned","udl 12",1)</f>',
            "</c></row></sheetData>",
        )
        whole = contents[sheet].replace(b"</sheetData>", f"{before}{formula}{{}}{after}".encode())
        path = tmp_path / source.name
        with zipfile.ZipFile(path, "w") as archive:
            for name, content in contents.items():
                archive.writestr(name, whole.replace(b"{}", b"") if name == sheet else content)
        target = fill(path, tmp_path / f"filled-{source.name}").target
        got = parts(target)
        assert changes(whole.replace(b"{}", b""), got[sheet]) == [], source
        assert f"{before}{formula}<v>60</v>{after}".encode() in got[sheet], source
        filled += 1
    assert filled > FEWEST


def test_a_changed_cell_would_be_noticed() -> None:
    """The comparison finds a value, a type or a style that is other than before, and lets a new value pass."""
    before = b'<s><c r="A1" s="1"><f>1+1</f><v>2</v></c><c r="A2"><f>1</f></c><c r="A3"><v>5</v></c></s>'
    assert changes(before, before.replace(b"<f>1</f>", b"<f>1</f><v>1</v>")) == []
    for old, new in [
        (b"<v>2", b"<v>3"),
        (b"<v>5", b"<v>6"),
        (b's="1"', b's="2"'),
        (b"<f>1</f>", b"<f>2</f><v>1</v>"),
        (b"<v>2", b" <v>2"),
    ]:
        assert changes(before, before.replace(old, new)), new
    full = before.replace(b"<f>1</f>", b"<f>1</f><v>1</v>")
    assert changes(full, full.replace(b"<s>", b"<s >")) == ["bytes outside the cells"]
