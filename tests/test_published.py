"""The functions give the figures printed in handbooks, standards and textbooks."""

from __future__ import annotations

import json
import re
from collections import Counter
from collections.abc import Callable
from fractions import Fraction
from pathlib import Path
from typing import Any

import openpyxl
import pytest
from printed import Factors, printed
from scipy.optimize import minimize_scalar

from beamfuncs.functions import beam_result, contraflexure, highest, lowest
from beamfuncs.hosts.headless.filling import fill
from beamfuncs.standards import combinations

Row = dict[str, Any]
Ask = dict[str, Any]

FOLDER = Path(__file__).parent / "published"
TABLES: dict[str, list[Row]] = {
    path.stem: json.loads(path.read_text("utf-8")) for path in sorted(FOLDER.glob("*.json"))
}
ROWS = [row for table in TABLES.values() for row in table]

EXACT = 1e-12
"""Agreement asked of an exact fraction, relative to it."""
TIE = 1 + 1e-9
"""Lets a figure exactly half way between two printed ones (0.4375 as 0.438) pass in floats."""

WAITING = {
    "foundation_shear": {"elastic foundation": 20, "shear factors of sections": 4},
    "limits": {"deflection limits": 28},
    "sections": {"sections": 84},
}
"""The rows no function answers yet, by reason."""


def asks(row: Row) -> list[Ask]:
    """Return every way the row asks for its figure."""
    ask = row.get("ask", [])
    return ask if isinstance(ask, list) else [ask]


ASKED = {f"{row['id']}/{count}": (row, ask) for row in ROWS for count, ask in enumerate(asks(row), 1)}
LISTS = {name: (row, ask) for name, (row, ask) in ASKED.items() if "standard" in ask}
QUESTIONS = {name: asked for name, asked in ASKED.items() if name not in LISTS}
ANSWERS: dict[str, Callable[..., Any]] = {"phrase": beam_result, "highest": highest, "lowest": lowest}
"""The functions that answer a phrase, by the key under which it stands."""
IN_A_WORKBOOK = [name for name, (_, ask) in QUESTIONS.items() if ANSWERS.keys() & ask and "vary" not in ask][::9]


def question(ask: Ask) -> tuple[str, str]:
    """Return the key under which a phrase stands, and the phrase."""
    [key] = ANSWERS.keys() & ask
    return key, ask[key]


def number(text: str) -> float:
    """Return the number that a fraction or a decimal stands for."""
    return float(Fraction(text))


def tolerance(row: Row) -> float:
    """Return how far from the printed figure an answer may be."""
    if row["tolerance"] == "exact fraction":
        return EXACT * abs(number(row["value"]))
    return number(row["tolerance"])


def agrees(row: Row, figure: float) -> bool:
    """Tell whether a figure is the printed one."""
    return abs(figure - number(row["value"])) <= tolerance(row) * TIE


def answer(ask: Ask, loads: str) -> float:
    """Return what the functions answer for these loads, `times` applied."""
    beam, stiffness = ask["beam"], ask["stiffness"]
    if ANSWERS.keys() & ask:
        key, phrase = question(ask)
        result = ANSWERS[key](beam, loads, phrase, stiffness=stiffness)
    else:
        (places,) = contraflexure(beam, loads, stiffness)
        result = places[ask["contraflexure"] - 1]
    return number(ask.get("times", "1")) * result


def extreme(ask: Ask) -> tuple[float, float]:
    """Return the greatest answer over all places of the load, and that place."""
    length = sum(float(part) for part in ask["beam"].split()[1::2])

    def negative(place: float) -> float:
        return -answer(ask, ask["loads"].format(place=float(place)))

    found = minimize_scalar(negative, bounds=(0, length), method="bounded", options={"xatol": 1e-8})
    return -found.fun, found.x


def figure(ask: Ask) -> float:
    """Return the figure that the printed one is compared with."""
    if "vary" in ask:
        greatest, place = extreme(ask)
        return greatest if ask["vary"] == "greatest" else place
    return answer(ask, ask["loads"]) - number(ask.get("less", "0"))


@pytest.mark.parametrize("name", QUESTIONS)
def test_published_figure(name: str) -> None:
    """The text lines, asked of the functions, give the printed figure; a nearby one would fail.

    Three tolerances off is no agreement, so every tolerance bites.
    """
    row, ask = QUESTIONS[name]
    given = figure(ask)
    assert agrees(row, given), f"{row['quantity']}: {given!r}, printed {row['value']}"
    assert not agrees(row, given + 3 * tolerance(row))
    assert not agrees(row, given - 3 * tolerance(row))


def listed(ask: Ask) -> list[Factors]:
    """Return the factors of every combination that the function lists."""
    rows = combinations(ask["standard"], ask["actions"], ask.get("leading"), ask.get("factors"))
    return [factors for [text] in rows for factors in printed(text)]


@pytest.mark.parametrize("name", [name for name, (_, ask) in LISTS.items() if "printed" in ask])
def test_published_factor(name: str) -> None:
    """The greatest, or least, factor of a case in the list is the printed one, exactly."""
    row, ask = LISTS[name]
    case, choose = (ask["greatest"], max) if "greatest" in ask else (ask["least"], min)
    numbers = re.findall(r"[0-9]+(?:\.[0-9]+)?", row["value"])
    assert choose(factors.get(case, 0) for factors in listed(ask)) == Fraction(numbers[ask["printed"] - 1])


@pytest.mark.parametrize("name", [name for name, (_, ask) in LISTS.items() if "printed" not in ask])
def test_published_combination(name: str) -> None:
    """The list has every combination that the printed line allows; with any factor a hundredth off, it has it not."""
    row, ask = LISTS[name]
    found = listed(ask)
    for wanted in (one for text in ask.get("text", row["value"]).split(";") for one in printed(text)):
        assert wanted in found, ask
        for case in wanted:
            assert wanted | {case: wanted[case] + Fraction(1, 100)} not in found


@pytest.mark.parametrize("table", TABLES)
def test_every_row_is_asked_or_waits_for_a_reason(table: str) -> None:
    """No figure is dropped silently: each is asked for, or waits for a reason listed here."""
    assert all(("ask" in row) != ("waits" in row) for row in TABLES[table])
    waiting = Counter(row["waits"] for row in TABLES[table] if "waits" in row)
    assert waiting == WAITING.get(table, {})


def test_every_static_figure_is_asked() -> None:
    """All loads at a stated place are answered, and so is all shear deflection."""
    assert {row["id"] for row in ROWS if "model" in row and "ask" not in row} == set()
    assert {row["id"] for row in ROWS if row["id"].startswith("G6-SH-") and "waits" in row} == set()


def test_the_train_and_the_pattern_are_sought() -> None:
    """Every train whose governing place was printed nowhere, and every pattern chosen adversely, is left to the
    functions to find."""
    sought = [name for name, (_, ask) in QUESTIONS.items() if {"highest", "lowest"} & ask.keys()]
    assert len({name.split("/")[0] for name in sought if name.startswith("G5-")}) == 87
    assert len({name.split("/")[0] for name in sought if name.startswith("G2-ADV")}) == 31


def test_every_row_names_its_source() -> None:
    """All 590 figures are there, each once, with its source and how it was obtained."""
    assert len({row["id"] for row in ROWS}) == len(ROWS) == 590
    needed = ("value", "tolerance", "source", "obtained", "printed_as")
    assert all(row.get(key, "").strip() for row in ROWS for key in needed)


def test_tolerances_are_no_wider_than_the_print() -> None:
    """A tolerance is at most one unit of the last printed place of its figure."""
    for row in ROWS:
        if "ask" in row and row["printed_as"] == "digits" and row["tolerance"] != "exact fraction":
            decimals = len(row["value"].partition(".")[2])
            assert number(row["tolerance"]) <= 10.0**-decimals, row["id"]


@pytest.fixture(scope="module")
def filled(tmp_path_factory: pytest.TempPathFactory) -> dict[str, float]:
    """Return, by name, the figures in a workbook filled without a spreadsheet program."""
    folder = tmp_path_factory.mktemp("published")
    source, target = folder / "published.xlsx", folder / "published.filled.xlsx"
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.append(["beam", "loads", "asked", "stiffness", "answer", "figure"])
    for line, name in enumerate(IN_A_WORKBOOK, 2):
        _, ask = QUESTIONS[name]
        key, phrase = question(ask)
        formula = "beam_result(A{0},B{0},C{0},D{0})" if key == "phrase" else f"{key}(A{{0}},B{{0}},C{{0}},,D{{0}})"
        printed = f"={ask.get('times', '1')}*E{line}-{ask.get('less', '0')}"
        sheet.append([ask["beam"], ask["loads"], phrase, ask["stiffness"], "=" + formula.format(line), printed])
    book.save(source)
    report = fill(source, target)
    assert report.errors == []
    assert report.beam_cells == len(IN_A_WORKBOOK)
    values = openpyxl.load_workbook(target, data_only=True).active
    return {name: values.cell(line, 6).value for line, name in enumerate(IN_A_WORKBOOK, 2)}


@pytest.mark.parametrize("name", IN_A_WORKBOOK)
def test_published_figure_in_a_filled_workbook(name: str, filled: dict[str, float]) -> None:
    """The same lines in the cells of a workbook give the same figure when it is filled."""
    row, _ = QUESTIONS[name]
    assert agrees(row, filled[name])


def test_a_tenth_goes_through_a_workbook() -> None:
    """The filled workbook holds at least a tenth of all that is asked."""
    assert 10 * len(IN_A_WORKBOOK) >= len(QUESTIONS)
