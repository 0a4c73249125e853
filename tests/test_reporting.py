"""Reports of a filled workbook: every beam cell with its value or error and what was understood, in three forms."""

from __future__ import annotations

import csv
import html
import io
import json
import re
from collections.abc import Callable
from datetime import date
from html.parser import HTMLParser
from pathlib import Path
from typing import Any

import pytest
from books import FIRST_SHEET, build, parts, rewrite
from openpyxl.worksheet.formula import ArrayFormula
from test_cli import run
from test_headless import FUNCTIONS

from beamfuncs import cli
from beamfuncs.errors import BeamError
from beamfuncs.functions import beam_reads, loads_read, moment_max, reaction, reactions
from beamfuncs.hosts.headless import page
from beamfuncs.hosts.headless.calls import Calls
from beamfuncs.hosts.headless.engine import Call
from beamfuncs.hosts.headless.filling import NotFilled, fill

LINE, LOADS = "fixed 8 pinned", "G: udl 12; Q: point 40 at 3"
BEAM = {"A1": LINE, "B1": LOADS, "C1": 24000}
HOSTILE = "</td><script>alert('x')</script><img src=x onerror=alert(1)>&\"'"


def report(path: Path, ending: str, **options: Any) -> str:
    """The text of a report on a workbook."""
    listing = path.with_suffix(ending)
    fill(path, listing=listing, **options)
    return listing.read_bytes().decode("utf-8")


def table(path: Path, **options: Any) -> dict[str, dict[str, str]]:
    """The rows of a CSV report by sheet and cell, as a reader of CSV has them."""
    text = report(path, ".csv", **options)
    assert text.startswith("\ufeff")
    rows = csv.DictReader(io.StringIO(text.removeprefix("\ufeff"), newline=""))
    return {f"{row['sheet']}!{row['cell']}": row for row in rows}


def data(path: Path, **options: Any) -> dict[str, dict[str, Any]]:
    """The objects of a JSON report by sheet and cell."""
    return {f"{one['sheet']}!{one['cell']}": one for one in json.loads(report(path, ".json", **options))}


class Page(HTMLParser):
    """What a browser would see of a page: its tags, its text, and its attributes."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.tags: list[str] = []
        self.open: list[str] = []
        self.attributes: list[tuple[str, str]] = []
        self.text = ""
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append(tag)
        self.attributes += [(name, value or "") for name, value in attrs]
        if tag not in ("meta", "br"):
            self.open.append(tag)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.handle_starttag(tag, attrs)
        self.open.pop()

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop() == tag

    def handle_data(self, data: str) -> None:
        self.text += data


# --- what is told ----------------------------------------------------------------------------------


def test_every_beam_cell_is_told_and_no_other(tmp_path: Path) -> None:
    """Each cell with a beam call anywhere in it: sheet, cell, formula, value, and what was understood."""
    cells = BEAM | {
        "D1": '=ROUND(reaction(A1,B1,1,C1,"1.35 G + 1.5 Q"),2)',
        "D2": "=D1/2",
        "Data!A1": "=moment_max(Plan!A1,Plan!B1)",
    }
    path = build(tmp_path / "plan.xlsx", cells)
    for told in (table(path), data(path)):
        assert list(told) == ["Plan!D1", "Data!A1"]
    first, second = data(path).values()
    assert first["formula"] == cells["D1"]
    assert first["value"] == round(reaction(LINE, LOADS, 1, None, "1.35 G + 1.5 Q"), 2)
    assert (first["error"], first["reason"]) == (None, None)
    assert first["calls"] == [
        {
            "function": "reaction",
            "beam": beam_reads(LINE, 24000),
            "loads": loads_read(LINE, LOADS),
            "combination": "1.35 G + 1.5 Q",
        }
    ]
    assert second["calls"][0]["beam"] == beam_reads(LINE)
    assert second["calls"][0]["combination"] == "every load once"
    assert second["value"] == moment_max(LINE, LOADS)


def test_errors_have_their_reason(tmp_path: Path) -> None:
    """An error has its value and reason and no number; what could not be read is said where it is."""
    path = build(tmp_path / "plan.xlsx", BEAM | {"D1": "=reaction(A1,B1,3)", "D2": '=reaction("fixed",B1,1)'})
    with pytest.raises(BeamError) as refusal:
        reaction(LINE, LOADS, 3)
    one, other = data(path).values()
    assert (one["value"], one["error"], one["reason"]) == (None, "#N/A", refusal.value.reason)
    assert one["calls"][0]["beam"] == beam_reads(LINE)
    assert other["calls"][0]["beam"].startswith("not understood: beam: ")
    assert other["calls"][0]["loads"] == ""
    row = table(path)["Plan!D1"]
    assert (row["value"], row["error"], row["reason"]) == ("", "#N/A", refusal.value.reason)


def test_an_array_is_one_row(tmp_path: Path) -> None:
    """An array formula is told once, with its extent; its values in words in the table, as rows in the data."""
    cells = BEAM | {
        "E2": ArrayFormula("E2:H3", "=reactions(A1,B1)"),
        "E5": ArrayFormula("E5:E6", "=moment_at(A1,B1,E9:E10)"),
    }
    path = build(tmp_path / "plan.xlsx", cells | {"E9": 2, "E10": 4})
    told = table(path)
    assert list(told) == ["Plan!E2:H3", "Plan!E5:E6"]
    expected = reactions(LINE, LOADS)
    numbers = [number for row in expected for number in row]
    assert told["Plan!E2:H3"]["value"] == f"2 by 4: 8 numbers from {min(numbers):.6g} to {max(numbers):.6g}"
    assert told["Plan!E5:E6"]["value"].count(";") == 1
    assert data(path)["Plan!E2:H3"]["value"] == expected


def test_an_array_says_which_of_its_cells_are_in_error(tmp_path: Path) -> None:
    """Errors among the values of an array are counted, and named with their reasons; in the data they are null."""
    path = build(tmp_path / "plan.xlsx", {"A1": ArrayFormula("A1:C3", "=grid(3,3)")})
    row = table(path, functions=FUNCTIONS)["Plan!A1:C3"]
    assert row["value"] == "3 by 3: 8 numbers from 11 to 33, 1 in error"
    assert (row["error"], row["reason"]) == ("#N/A", "B2: #N/A x: beyond the end")
    assert data(path, functions=FUNCTIONS)["Plan!A1:C3"]["value"] == [[11, 12, 13], [21, None, 23], [31, 32, 33]]


def test_a_cell_with_several_calls_tells_of_each(tmp_path: Path) -> None:
    """Two beams in one formula are both told; the same beam twice is told once."""
    asked = [("pinned 6 roller", 1), ("pinned 7 roller", 1), ("pinned 7 roller", 2)]
    formula = "=" + "+".join(f'reaction("{line}","udl 1",{support})' for line, support in asked)
    path = build(tmp_path / "plan.xlsx", {"A1": formula})
    row = table(path)["Plan!A1"]
    assert row["beam"] == f"{beam_reads('pinned 6 roller')} | {beam_reads('pinned 7 roller')}"
    assert [call["function"] for call in data(path)["Plan!A1"]["calls"]] == ["reaction"] * 3


def test_a_call_that_was_not_made_is_not_told(tmp_path: Path) -> None:
    """A cell whose call stands in a branch not taken is told without anything understood."""
    path = build(tmp_path / "plan.xlsx", BEAM | {"D1": "=IF(C1>0,5,reaction(A1,B1,1))"})
    one = data(path)["Plan!D1"]
    assert (one["value"], one["calls"]) == (5, [])


def test_each_shared_formula_is_told_as_it_reads_in_its_cell(tmp_path: Path) -> None:
    """Cells that share a formula are told each with its own."""
    path = build(tmp_path / "plan.xlsx", {"A1": 1, "A2": 2, "B1": "=twice(A1)", "B2": "=1"})
    shared = b'<f t="shared" ref="B1:B2" si="0">twice(A1)</f>'
    rewrite(
        path,
        FIRST_SHEET,
        lambda xml: xml.replace(b"<f>twice(A1)</f>", shared).replace(b"<f>1</f>", b'<f t="shared" si="0"/>'),
    )
    told = data(path, functions=FUNCTIONS)
    assert [(one["formula"], one["value"]) for one in told.values()] == [("=twice(A1)", 2), ("=twice(A2)", 4)]


def test_a_new_round_of_evaluation_replaces_the_calls_of_the_last() -> None:
    """A cell that is evaluated anew is told with its new calls alone; one that is not keeps what it called."""
    calls = Calls()
    one, other, newer = (Call("reaction", (LINE, LOADS, float(n))) for n in (1, 2, 3))
    for call in (one, other, one):
        calls.note((0, 1, 1), call)
    calls.note((0, 2, 1), one)
    assert calls.of((0, 1, 1)) == (one, other)
    calls.begin_round()
    calls.note((0, 1, 1), newer)
    assert calls.of((0, 1, 1)) == (newer,)
    assert calls.of((0, 2, 1)) == (one,)
    assert calls.of((0, 3, 1)) == ()


def test_only_the_arguments_of_the_final_value_are_told(tmp_path: Path) -> None:
    """Where an ordinary formula points to a range, its beam is that of the cell in its row, told once."""
    cells = {"A1": 5, "A2": 6, "A3": 7, "B2": "=A1:A3", "C2": '=reaction("pinned "&B2&" roller","udl 1",1)'}
    path = build(tmp_path / "plan.xlsx", cells)
    (one,) = data(path).values()
    assert one["value"] == 3
    assert [call["beam"] for call in one["calls"]] == [beam_reads("pinned 6 roller")]


def test_the_report_changes_nothing_in_the_workbook(tmp_path: Path) -> None:
    """With or without a report the filled workbook is the same to the byte."""
    path = build(tmp_path / "plan.xlsx", BEAM | {"D1": "=reaction(A1,B1,1)"})
    fill(path, tmp_path / "plain.xlsx")
    fill(path, tmp_path / "told.xlsx", listing=tmp_path / "told.html")
    assert parts(tmp_path / "plain.xlsx") == parts(tmp_path / "told.xlsx")


# --- the table for a spreadsheet -------------------------------------------------------------------


@pytest.mark.parametrize("text", ["=1+1", "+1", "-1", "@A1", "\t=1", "\r=1", 'plain, "quoted"\nline'])
def test_no_text_in_the_table_begins_a_formula(tmp_path: Path, text: str) -> None:
    """A text that a spreadsheet would take for a formula has an apostrophe before it; others are as they are."""
    path = build(tmp_path / "plan.xlsx", {"A1": "=say()"})
    functions: dict[str, Callable[..., object]] = {"say": lambda: text}
    row = table(path, functions=functions)["Plan!A1"]
    assert row["value"] == (text if text.startswith("plain") else f"'{text}")
    assert row["formula"] == "'=say()"


def test_sheet_names_in_the_table_are_harmless(tmp_path: Path) -> None:
    """So is the name of a sheet."""
    path = build(tmp_path / "plan.xlsx", {"=cmd|1!A1": "=twice(1)"})
    assert table(path, functions=FUNCTIONS)["'=cmd|1!A1"]["value"] == "2.0"


def test_numbers_in_the_table_stay_numbers(tmp_path: Path) -> None:
    """A negative number has no apostrophe, and comes back to the last bit."""
    path = build(tmp_path / "plan.xlsx", {"A1": "=-twice(1/3)"})
    assert float(table(path, functions=FUNCTIONS)["Plan!A1"]["value"]) == -2 / 3


# --- the page --------------------------------------------------------------------------------------


def test_the_page_says_what_it_is_about(tmp_path: Path) -> None:
    """Title, workbook, date, counts, cautions, every cell and every beam with its drawing stand on the page."""
    cells = BEAM | {"D1": '=reaction(A1,B1,1,C1,"G + Q")', "D2": "=reaction(A1,B1,5)", "D3": "=D1*2", "D4": "=D2*2"}
    seen = Page(report(build(tmp_path / "plan.xlsx", cells), ".html"))
    assert seen.open == []
    for text in (
        "Beam cells of plan.xlsx",
        date.today().isoformat(),
        "Verify every result by independent means",
        "Local codes decide",
        "a licensed engineer decides",
        "linear elastic, small deflections",
        "=reaction(A1,B1,5)",
        "#N/A: support: support 5 is not there",
        beam_reads(LINE, 24000),
        loads_read(LINE, LOADS),
        "Shear V and moment M under G + Q",
        "Plan!D4: #N/A: takes #N/A from Plan!D2",
    ):
        assert text in seen.text, text
    assert seen.tags.count("svg") == 2


def test_stored_values_that_differ_are_told_on_the_page(tmp_path: Path) -> None:
    """An ordinary cell that stores another value than is computed is told, with the beam cell that uses it."""
    path = build(tmp_path / "plan.xlsx", {"A1": 3, "B1": "=A1*2", "C1": '=reaction("pinned "&B1&" roller","udl 1",1)'})
    rewrite(path, FIRST_SHEET, lambda xml: re.sub(rb"<f>A1\*2</f><v\s*/?>(?:</v>)?", b"<f>A1*2</f><v>8</v>", xml))
    text = Page(report(path, ".html")).text
    assert "Plan!B1: stores 8, computed 6" in text
    assert "used by Plan!C1" in text


def test_nothing_is_fetched_and_no_script_runs(tmp_path: Path) -> None:
    """The page refers to nothing but its own places, has no script, and forbids both to the browser."""
    text = report(build(tmp_path / "plan.xlsx", BEAM | {"D1": "=reaction(A1,B1,1)"}), ".html")
    seen = Page(text)
    assert not {"script", "link", "img", "iframe", "object", "embed", "form", "base"} & set(seen.tags)
    links = [value for name, value in seen.attributes if name in ("href", "src", "action", "xlink:href")]
    assert links
    assert all(re.fullmatch(r"#beam-\d+", link) for link in links)
    assert {link[1:] for link in links} <= {value for name, value in seen.attributes if name == "id"}
    assert not [name for name, _ in seen.attributes if name.startswith("on")]
    policies = [value for name, value in seen.attributes if name == "content" and "-src" in value]
    assert policies == ["default-src 'none'; style-src 'unsafe-inline'"]
    assert not re.search(r"@import|url\(", text)


@pytest.mark.parametrize("where", ["sheet", "value", "formula", "beam", "loads", "combination", "book"])
def test_everything_on_the_page_is_escaped(tmp_path: Path, where: str) -> None:
    """Hostile text is shown as text, wherever in the workbook it stands."""
    sheet = "<script>a</script>&'\"".replace("/", "") if where == "sheet" else "Plan"
    name = "<img src=x onerror=a>.xlsx" if where == "book" else "plan.xlsx"
    prefix = f"{sheet}!"
    cells: dict[str, object] = {f"{prefix}A1": LINE, f"{prefix}B1": LOADS, f"{prefix}C1": HOSTILE}
    formula = {
        "value": "=say(C1)",
        "formula": f'=reaction(A1,B1,1)&"{HOSTILE.replace(chr(34), "")}"',
        "beam": "=reaction(C1,B1,1)",
        "loads": "=reaction(A1,C1,1)",
        "combination": "=reaction(A1,B1,1,,C1)",
    }.get(where, "=reaction(A1,B1,1)")
    path = build(tmp_path / name, cells | {f"{prefix}D1": formula})
    functions: dict[str, Callable[..., object]] = {"reaction": reaction, "say": lambda text: text}
    text = report(path, ".html", functions=functions)
    seen = Page(text)
    assert seen.open == []
    assert not {"script", "img"} & set(seen.tags)
    assert not [attribute for attribute, _ in seen.attributes if attribute.startswith("on")]
    shown = {"sheet": sheet, "book": name, "value": HOSTILE, "formula": formula}.get(where, "script>alert")
    assert shown in seen.text
    assert html.escape(shown)[:12] in text


def test_control_codes_do_not_break_the_page(tmp_path: Path) -> None:
    """Codes that no page may hold are shown as such."""
    path = build(tmp_path / "plan.xlsx", {"A1": "=say()"})
    functions: dict[str, Callable[..., object]] = {"say": lambda: "a\x00b\x1bc"}
    assert "a\ufffdb\ufffdc" in Page(report(path, ".html", functions=functions)).text


def test_each_different_beam_is_drawn_once(tmp_path: Path) -> None:
    """One drawing a beam, loads and combination, however many cells ask, with or without a stiffness."""
    cells: dict[str, object] = {}
    for row in range(1, 6):
        cells |= {
            f"A{row}": f'=reaction("pinned {1 + row % 2} roller","G: udl 2",1,,"1.35 G")',
            f"B{row}": f'=deflection_max("pinned {1 + row % 2} roller","G: udl 2",,900,"1.35 G")',
            f"C{row}": f'=moment_max("pinned {1 + row % 2} roller","G: udl 2",,,"1 G")',
        }
    text = report(build(tmp_path / "plan.xlsx", cells), ".html")
    seen = Page(text)
    assert seen.tags.count("svg") == 4
    assert len(re.findall(r"<h3>Beam \d+</h3>", text)) == 2
    assert beam_reads("pinned 2 roller", 900) in seen.text
    assert beam_reads("pinned 2 roller") not in seen.text
    assert "Cells: Plan!A1, Plan!B1, Plan!C1, Plan!A3" in seen.text


def test_beams_of_another_stiffness_are_other_beams(tmp_path: Path) -> None:
    """The same line with two stiffnesses is two beams."""
    cells = {f"A{n}": f'=deflection_max("pinned 6 roller","udl 2",,{n}000)' for n in (1, 2)}
    text = report(build(tmp_path / "plan.xlsx", cells), ".html")
    assert len(re.findall(r"<h3>Beam \d+</h3>", text)) == 2


def test_very_many_drawings_are_counted(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Of very many beams the first are drawn, every beam is told, and how many are not drawn is said."""
    monkeypatch.setattr(page, "MOST_DRAWINGS", 3)
    cells = {f"A{n}": f'=reaction("pinned {n} roller","udl 2",1)' for n in range(1, 8)}
    text = report(build(tmp_path / "plan.xlsx", cells), ".html")
    assert text.count("<svg") == 3
    assert len(re.findall(r"<h3>Beam \d+</h3>", text)) == 7
    assert "4 more drawings are left out: the first 3 are drawn." in text


# --- the file --------------------------------------------------------------------------------------


@pytest.mark.parametrize("listing", ["told.txt", "told", "none/told.csv"])
def test_a_report_that_cannot_be_written_is_refused_before_anything_is_done(tmp_path: Path, listing: str) -> None:
    """Another ending, or a folder that is not there: nothing is written."""
    path = build(tmp_path / "plan.xlsx", BEAM)
    with pytest.raises(NotFilled):
        fill(path, listing=tmp_path / listing)
    assert [one.name for one in tmp_path.iterdir()] == ["plan.xlsx"]


def test_progress_is_told_for_the_report_too(tmp_path: Path) -> None:
    """The cells are counted once while they are computed and again while they are told of."""
    path = build(tmp_path / "plan.xlsx", {f"A{n}": f"=twice({n})" for n in range(1, 4)})
    for ending in (".csv", ".json", ".html"):
        seen: list[tuple[int, int]] = []

        def progress(done: int, of: int, seen: list[tuple[int, int]] = seen) -> None:
            seen.append((done, of))

        fill(path, functions=FUNCTIONS, listing=tmp_path / f"told{ending}", progress=progress)
        assert seen == [(1, 3), (2, 3), (3, 3)] * 2


def test_report_from_the_command_line(tmp_path: Path) -> None:
    """`--report` writes the file beside the filled workbook; an ending that is not known ends with 2."""
    path = build(tmp_path / "plan.xlsx", BEAM | {"D1": "=reaction(A1,B1,1)"})
    status, out, _ = run("fill", path, "--report", tmp_path / "told.HTML")
    assert status == cli.DONE
    assert "no errors" in out
    assert (tmp_path / "told.HTML").read_text(encoding="utf-8").startswith("<!DOCTYPE html>")
    status, _, err = run("fill", path, "--report", tmp_path / "told.pdf")
    assert status == cli.NOTHING_DONE
    assert ".csv, .json, .html" in err
