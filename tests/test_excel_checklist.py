"""The check list for a person with Excel: complete, its formulas valid, its numbers those that Python answers."""

from __future__ import annotations

import re
from dataclasses import dataclass
from datetime import date, datetime
from pathlib import Path
from typing import Any

import pytest
from openpyxl import Workbook, load_workbook
from openpyxl.formula import Tokenizer
from openpyxl.formula.tokenizer import Token
from openpyxl.formula.translate import Translator
from openpyxl.worksheet.formula import ArrayFormula
from openpyxl.worksheet.worksheet import Worksheet

from beamfuncs.catalogue import CATEGORY, catalogue
from beamfuncs.errors import BeamError
from beamfuncs.functions import moment_at
from beamfuncs.hosts.excel_addin.vba import MODULE, module_text
from beamfuncs.hosts.headless.filling import fill

CHECKLIST = (Path(__file__).parent / "excel_checklist.md").read_text(encoding="utf-8")
KESTREL_QUAY = Path(__file__).parents[1] / "workbooks" / "kestrel_quay.xlsm"
ARRAY, DOWN = " as one array", " filled down"
DATES = {("8", "A1")}
"""Cells that read a date: in a file it is a number, which the headless mode takes; Excel hands over the date."""
NOTED = re.compile(r"^Date: \.+ Excel: \.+ Result: \.+$", re.MULTILINE)


@dataclass(frozen=True)
class Line:
    """A line of a table: what is entered where, and what is shown then."""

    cell: str
    entered: str
    shown: str


def steps() -> dict[str, str]:
    """The text of each step by its number."""
    _, *rest = re.split(r"^## (\d+)\. ", CHECKLIST, flags=re.MULTILINE)
    return dict(zip(rest[::2], rest[1::2], strict=True))


def lines(step: str) -> list[Line]:
    """The lines of a step's table."""
    rows = re.findall(r"^\| ([A-Z]+\d.*?) \| `(.*)` \|(.*)\|$", step, re.MULTILINE)
    return [Line(cell, entered, shown.strip()) for cell, entered, shown in rows]


def calls(formula: str) -> list[tuple[str, int]]:
    """Every function that a formula calls, with the number of its arguments.

    >>> calls('=SUM(reaction((A1,B1),"a,b",,C1),1)')
    [('reaction', 4), ('SUM', 2)]
    """
    found: list[tuple[str, int]] = []
    open_calls: list[tuple[str, int] | None] = []
    for token in Tokenizer(formula).items:
        opens, closes = token.subtype == Token.OPEN, token.subtype == Token.CLOSE
        if token.type == Token.FUNC and opens:
            open_calls.append((token.value.rstrip("("), 1))
        elif token.type == Token.PAREN and opens:
            open_calls.append(None)
        elif token.type in (Token.FUNC, Token.PAREN) and closes:
            done = open_calls.pop()
            if done:
                found.append(done)
        elif token.type == Token.SEP and token.subtype == Token.ARG and open_calls[-1]:
            name, count = open_calls[-1]
            open_calls[-1] = name, count + 1
    assert not open_calls, formula
    return found


def test_there_are_twenty_steps_each_with_a_place_for_its_result() -> None:
    """Numbered from 1 to 20, each saying what to do, what to expect, and where to note what came."""
    found = steps()
    assert list(found) == [str(n) for n in range(1, 21)]
    for number, step in found.items():
        do, expect, noted = step.find("**Do.**"), step.find("**Expect.**"), NOTED.search(step)
        assert noted, number
        assert 0 <= do < expect < noted.start(), number


def test_its_head_says_that_it_is_not_run() -> None:
    """Not run, with a place for every version, and no word that a pass says anything about engineering judgement."""
    head = CHECKLIST.split("\n## 1.")[0]
    assert "**Not run.**" in head
    for word in ("date", "Windows", "Excel", "Python", "xlwings", "beamfuncs"):
        assert re.search(rf"^\| {word}.*\|( \|){{3}}$", head, re.MULTILINE), word
    assert "says nothing about engineering" in head


def test_every_line_of_a_table_is_read() -> None:
    """No line is passed over by the tests below."""
    listed = [line for step in steps().values() for line in step.splitlines() if line.startswith("|")]
    headings = sum(line.startswith(("| cell |", "|---|")) for line in listed)
    assert len(listed) - headings == sum(len(lines(step)) for step in steps().values()) > 80


def takes(name: str, count: int) -> bool:
    """Whether a function of ours takes so many arguments."""
    arguments = catalogue()[name].arguments
    least = sum(not argument.optional for argument in arguments)
    return least <= count and (count <= len(arguments) or any(argument.repeats for argument in arguments))


def test_every_formula_is_a_valid_call() -> None:
    """Each function that is not Excel's own is in the catalogue, and takes as many arguments as it is given."""
    seen = set()
    for formula in re.findall(r"`(=[^`]+)`", CHECKLIST):
        for name, count in calls(formula):
            if not name.isupper():
                assert takes(name, count), formula
                seen.add(name)
    assert len(seen) > 8


@pytest.mark.parametrize("formula", ['=reaction("x","udl 1")', "=reaction(1,2,3,4,5,6)", '=unit_factor("m","mm",1)'])
def test_a_wrong_number_of_arguments_shows(formula: str) -> None:
    """Too few and too many are found."""
    ((name, count),) = calls(formula)
    assert not takes(name, count)


def test_every_macro_that_it_names_is_in_the_module() -> None:
    """The user finds what is to be run, under that name, and the module and the category too."""
    macros = set(re.findall(rf"`({MODULE}\w+)`", CHECKLIST))
    assert macros
    assert macros <= set(re.findall(r"Public Sub (\w+)\(", module_text()))
    assert f"The module `{MODULE}` appears" in steps()["4"]
    assert f"category {CATEGORY} lists" in steps()["6"]


def test_every_number_is_what_python_answers(tmp_path: Path) -> None:
    """The tables entered into a workbook, a sheet a step, and filled: each cell shows what the check list says."""
    book = Workbook()
    book.remove(book.worksheets[0])
    for number, step in steps().items():
        if lines(step):
            _enter(book.create_sheet(number), lines(step))
    book.save(tmp_path / "checklist.xlsx")
    filled = load_workbook(fill(tmp_path / "checklist.xlsx").target, data_only=True)
    compared = 0
    for number, step in steps().items():
        for line in lines(step):
            place = line.cell.split(" ")[0]
            if line.shown and (number, place) not in DATES:
                assert _shown(filled[number], place) == _expected(line.shown), f"step {number}, {line}"
                compared += 1
            assert line.shown or not line.entered.startswith("=") or ":" in place, f"step {number}, {line}"
    assert compared > 60


def test_a_date_that_excel_hands_over_is_refused() -> None:
    """What the check list says of the cell that reads a date, with the date as Excel's interface gives it."""
    with pytest.raises(BeamError) as refused:
        moment_at("pinned 8 pinned", "udl 12", datetime(2026, 1, 2))  # type: ignore[arg-type]
    ((shown, entered),) = ((line.shown, line.entered) for line in lines(steps()["8"]) if line.cell == "A1")
    assert refused.value.value == shown
    assert entered == '=moment_at("pinned 8 pinned","udl 12",D1)'


def test_the_numbers_of_the_macro_workbook_are_those_of_its_filled_copy(tmp_path: Path) -> None:
    """Each cell named in the last step shows what `fill` stores in it."""
    told = re.findall(r"`(\w+)!([A-Z]+\d+)` shows (-?[\d.]+\d|\d)", steps()["20"])
    assert len(told) == 4
    filled = load_workbook(fill(KESTREL_QUAY, tmp_path / "filled.xlsm").target, data_only=True)
    for sheet, cell, shown in told:
        assert filled[sheet][cell].value == pytest.approx(float(shown), rel=1e-9, abs=1e-9), cell


def test_the_wizard_lists_as_many_functions_as_the_catalogue() -> None:
    """The number of functions in the category, and the arguments of the one that is gone through."""
    assert f"lists {len(catalogue())} functions" in steps()["6"]
    names = ", ".join(argument.name for argument in catalogue()["reaction"].arguments)
    assert f"({names})" in steps()["6"]


def _enter(sheet: Worksheet, table: list[Line]) -> None:
    for line in table:
        place = line.cell.split(" ")[0]
        first = place.split(":")[0]
        if line.cell.endswith(ARRAY):
            sheet[first] = ArrayFormula(place, line.entered)
        elif line.cell.endswith(DOWN):
            for (cell,) in sheet[place]:
                cell.value = Translator(line.entered, first).translate_formula(cell.coordinate)
        else:
            assert place == line.cell
            sheet[place] = _typed(line.entered)


def _typed(text: str) -> Any:
    """What a cell holds after a text has been typed into it."""
    if re.fullmatch(r"\d{4}-\d\d-\d\d", text):
        return date.fromisoformat(text)
    return _value(text)


def _value(text: str) -> Any:
    if text in ("TRUE", "FALSE"):
        return text == "TRUE"
    return float(text) if re.fullmatch(r"-?\d+(\.\d+)?", text) else text


def _expected(shown: str) -> list[list[Any]]:
    rows = [[_value(cell) for cell in row.split(" ; ")] for row in shown.split(" / ")]
    return [[pytest.approx(one, rel=1e-12, abs=1e-12) if type(one) is float else one for one in row] for row in rows]


def _shown(sheet: Worksheet, place: str) -> list[list[Any]]:
    block = sheet[place]
    rows = block if isinstance(block, tuple) else ((block,),)
    return [[cell.value for cell in row] for row in rows]
