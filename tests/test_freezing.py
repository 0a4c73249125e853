"""Workbooks handed over without the functions: values in place of their formulas, which are kept in notes."""

from __future__ import annotations

import re
import shutil
import subprocess
from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import openpyxl
import pytest
from books import FIRST_SHEET, MAIN, build, formulas, from_xml, parts, rewrite, values
from openpyxl.comments import Comment
from openpyxl.worksheet.formula import ArrayFormula
from test_cli import run
from test_headless import FUNCTIONS

from beamfuncs.errors import BeamError
from beamfuncs.functions import moment_max, reaction, reactions
from beamfuncs.hosts.headless.filling import NotFilled, Report, fill

BEAM = {"A1": "fixed 8 pinned", "B1": "udl 12"}
COMMENTS = "xl/comments/comment1.xml"
TYPES = "[Content_Types].xml"


def frozen(path: Path, **options: Any) -> tuple[dict[str, Any], Report]:
    """The values of the first sheet of a frozen copy, and the report."""
    report = fill(path, freeze=True, **options)
    return values(report.target), report


def notes(path: Path, sheet: str = "Plan") -> dict[str, str]:
    """The texts of the notes of a sheet, by cell."""
    rows = openpyxl.load_workbook(path)[sheet].iter_rows()
    return {cell.coordinate: cell.comment.text for row in rows for cell in row if cell.comment}


def with_notes(path: Path, cells: dict[str, object], texts: dict[str, str]) -> Path:
    """A workbook with notes in it already."""
    build(path, cells)
    book = openpyxl.load_workbook(path)
    for name, text in texts.items():
        book["Plan"][name].comment = Comment(text, "Mara")
    book.save(path)
    return path


# --- formulas and values ---------------------------------------------------------------------------


def test_beam_formulas_give_way_to_values_and_others_stay_live(tmp_path: Path) -> None:
    """A cell with a beam call anywhere in its formula holds its plain value; every other formula is as it was."""
    cells = BEAM | {
        "C1": "=reaction(A1,B1,1)",
        "C2": "=ROUND(2*moment_max(A1,B1)+1,1)",
        "C3": "=C1/2",
        "C4": "=SUM(C1:C3)",
    }
    got, report = frozen(build(tmp_path / "plan.xlsx", cells))
    force, moment = reaction("fixed 8 pinned", "udl 12", 1), moment_max("fixed 8 pinned", "udl 12")
    assert report.target == tmp_path / "plan.frozen.xlsx"
    assert (report.beam_cells, report.recomputed, report.errors) == (2, 2, [])
    assert [got[name] for name in ("C1", "C2", "C3")] == [force, round(2 * moment + 1, 1), force / 2]
    assert formulas(report.target) == [b"<f>C1/2</f>", b"<f>SUM(C1:C3)</f>"]
    assert re.search(rb'<c r="C1"><v>60</v></c>', parts(report.target)[FIRST_SHEET])


def test_the_formula_is_kept_in_a_note(tmp_path: Path) -> None:
    """The note on a frozen cell holds its formula word for word; other cells have none."""
    formula = '=IF(A1<>"<&>",reaction(A1,B1,1),"")'
    _, report = frozen(build(tmp_path / "plan.xlsx", BEAM | {"C1": formula, "D1": "=C1"}))
    (note,) = notes(report.target).values()
    assert note.splitlines() == ["beamfuncs computed this value from", formula]
    assert list(notes(report.target)) == ["C1"]


def test_every_other_part_keeps_its_bytes(tmp_path: Path) -> None:
    """Only the sheet with beam formulas and the lists of parts change; the notes' parts are new."""
    path = build(tmp_path / "plan.xlsx", BEAM | {"C1": "=reaction(A1,B1,1)", "Data!A1": "=1+1", "Rest!A1": 5})
    fill(path, tmp_path / "filled.xlsx")
    _, report = frozen(path)
    before, after = parts(tmp_path / "filled.xlsx"), parts(report.target)
    assert {name for name in before if before[name] != after.get(name)} == {TYPES, FIRST_SHEET}
    assert after.keys() - before.keys() == {
        "xl/comments1.xml",
        "xl/drawings/vmlDrawing1.vml",
        "xl/worksheets/_rels/sheet1.xml.rels",
    }


def test_a_workbook_without_beam_formulas_is_only_filled(tmp_path: Path) -> None:
    """Where there is nothing to freeze, the frozen copy is the filled one, calculation order included."""
    path = build(tmp_path / "plan.xlsx", {"A1": "=1+1"})
    fill(path, tmp_path / "filled.xlsx")
    _, report = frozen(path)
    assert parts(report.target) == parts(tmp_path / "filled.xlsx")


def test_arrays_become_values_in_all_their_cells(tmp_path: Path) -> None:
    """No cell of an array formula of ours has a formula left; one note, on the first cell, names the extent."""
    cells = BEAM | {"D2": ArrayFormula("D2:G3", "=reactions(A1,B1)"), "D5": ArrayFormula("D5:D6", "=A1:A2")}
    got, report = frozen(build(tmp_path / "plan.xlsx", cells))
    expected = reactions("fixed 8 pinned", "udl 12")
    assert [[got[f"{column}{row}"] for column in "DEFG"] for row in (2, 3)] == expected
    assert [b"A1:A2" in one for one in formulas(report.target)] == [True]
    note = notes(report.target)
    assert list(note) == ["D2"]
    assert note["D2"].splitlines() == ["beamfuncs computed the values of D2:G3 from", "=reactions(A1,B1)"]


def test_shared_formulas_of_ours_are_frozen_each_with_its_own_formula(tmp_path: Path) -> None:
    """Each cell that shares a beam formula has a value, and the formula as it reads in that cell in its note."""
    rows = (
        '<row r="1"><c r="A1"><v>1</v></c><c r="B1"><f t="shared" ref="B1:B3" si="0">twice(A1)</f></c>'
        '<c r="C1"><f t="shared" ref="C1:C3" si="1">A1+1</f></c></row>'
        '<row r="2"><c r="A2"><v>2</v></c><c r="B2"><f t="shared" si="0"/></c>'
        '<c r="C2"><f t="shared" si="1"/></c></row>'
        '<row r="3"><c r="A3"><v>3</v></c><c r="B3"><f t="shared" si="0"/></c>'
        '<c r="C3"><f t="shared" si="1"/></c></row>'
    )
    got, report = frozen(from_xml(tmp_path / "plan.xlsx", rows), functions=FUNCTIONS)
    assert [got[f"B{row}"] for row in (1, 2, 3)] == [2, 4, 6]
    assert [got[f"C{row}"] for row in (1, 2, 3)] == [2, 3, 4]
    assert [b'si="1"' in one for one in formulas(report.target)] == [True, True, True]
    assert [text.splitlines()[-1] for text in notes(report.target).values()] == [
        "=twice(A1)",
        "=twice(A2)",
        "=twice(A3)",
    ]


def test_a_spill_becomes_plain_values(tmp_path: Path) -> None:
    """A dynamic array of ours loses its formula and its mark; the cells that it filled keep their values."""
    rows = (
        '<row r="1"><c r="A1" cm="1"><f t="array" ref="A1:B1">grid(2,2)</f><v>0</v></c></row>'
        '<row r="4"><c r="A4" cm="1"><f t="array" ref="A4">1+1</f></c></row>'
    )
    got, report = frozen(from_xml(tmp_path / "plan.xlsx", rows), functions=FUNCTIONS)
    assert [got[name] for name in ("A1", "B1", "A2")] == [11, 12, 21]
    xml = parts(report.target)[FIRST_SHEET]
    assert b'<c r="A1"><v>11</v></c>' in xml
    assert xml.count(b'cm="1"') == 1
    assert len(formulas(report.target)) == 1


def test_references_to_a_spill_become_references_to_its_cells(tmp_path: Path) -> None:
    """`A1#` means nothing once A1 has no formula: formulas and names refer to the frozen cells, on any sheet."""
    rows = (
        '<row r="1"><c r="A1" cm="1"><f t="array" ref="A1:B1">grid(1,3)</f><v>0</v></c>'
        '<c r="F1"><f>SUM(_xlfn.ANCHORARRAY($A$1))&amp;"&lt;"</f></c>'
        "<c r=\"G1\"><f>SUM(_xlfn.ANCHORARRAY('Plan'!A1))+SUM(_xlfn.ANCHORARRAY(H9))</f></c></row>"
        '<row r="9"><c r="H9" cm="1"><f t="array" ref="H9:I9">_xlfn.SEQUENCE(1,2)</f></c></row>'
    )
    path = from_xml(tmp_path / "plan.xlsx", rows)
    name = b'<definedNames><definedName name="row">_xlfn.ANCHORARRAY(Plan!$A$1)</definedName></definedNames></workbook>'
    rewrite(path, "xl/workbook.xml", lambda xml: re.sub(rb"<definedNames\s*/>", b"", xml).replace(b"</workbook>", name))
    got, report = frozen(path, functions=FUNCTIONS)
    assert [got[cell] for cell in ("A1", "B1", "C1")] == [11, 12, 13]
    assert got["F1"] == "36<"
    assert formulas(report.target)[:2] == [
        b'<f>SUM($A$1:$C$1)&amp;"&lt;"</f>',
        b"<f>SUM('Plan'!$A$1:$C$1)+SUM(_xlfn.ANCHORARRAY(H9))</f>",
    ]
    assert b">Plan!$A$1:$C$1</definedName>" in parts(report.target)["xl/workbook.xml"]


# --- errors and texts ------------------------------------------------------------------------------


def test_errors_stay_errors_with_their_reason_in_the_note(tmp_path: Path) -> None:
    """A frozen error is a genuine error value; the note says why; what builds on it is listed and stays live."""
    cells = BEAM | {"C1": "=reaction(A1,B1,3)", "D1": "=C1*2"}
    got, report = frozen(build(tmp_path / "plan.xlsx", cells))
    with pytest.raises(BeamError) as refusal:
        reaction("fixed 8 pinned", "udl 12", 3)
    assert got["C1"] == got["D1"] == "#N/A"
    assert b'<c r="C1" t="e"><v>#N/A</v></c>' in parts(report.target)[FIRST_SHEET]
    assert notes(report.target)["C1"].splitlines()[1:] == ["=reaction(A1,B1,3)", f"#N/A: {refusal.value.reason}"]
    assert [(one.cell, one.value) for one in report.errors] == [("C1", "#N/A"), ("D1", "#N/A")]


def test_an_error_inside_an_array_has_a_note_of_its_own(tmp_path: Path) -> None:
    """The entry of an array that is in error says so in its own cell."""
    path = build(tmp_path / "plan.xlsx", {"B2": ArrayFormula("B2:C3", "=grid()")})
    got, report = frozen(path, functions=FUNCTIONS)
    note = notes(report.target)
    assert got["C3"] == "#N/A"
    assert list(note) == ["B2", "C3"]
    assert note["C3"].startswith("beamfuncs: #N/A: x: beyond the end\n")


@pytest.mark.parametrize("text", ["=1+1", "+1", "-1", "@SUM(A1)", "<b>&amp;\n ", ""])
def test_texts_stay_texts(tmp_path: Path, text: str) -> None:
    """A frozen text is that text, whatever it begins with: no formula, no number."""
    _, report = frozen(build(tmp_path / "plan.xlsx", {"A1": "=say()"}), functions={"say": lambda: text})
    (cell,) = ElementTree.fromstring(parts(report.target)[FIRST_SHEET]).iter(f"{{{MAIN}}}c")
    assert cell.get("t") == "str"
    assert [child.tag for child in cell] == [f"{{{MAIN}}}v"]
    assert values(report.target).get("A1", "") == text


# --- notes that are there already ------------------------------------------------------------------


def test_a_note_that_a_cell_has_is_kept_and_added_to(tmp_path: Path) -> None:
    """The old text comes first, the formula below it; notes of other cells, and their authors, stay."""
    path = with_notes(
        tmp_path / "plan.xlsx", BEAM | {"C1": "=reaction(A1,B1,1)"}, {"C1": "Check & sign", "A1": "Bay 3"}
    )
    _, report = frozen(path)
    assert notes(report.target) == {
        "C1": "Check & sign\nbeamfuncs computed this value from\n=reaction(A1,B1,1)",
        "A1": "Bay 3",
    }
    sheet = openpyxl.load_workbook(report.target)["Plan"]
    assert sheet["A1"].comment.author == "Mara"
    before, after = parts(path), parts(report.target)
    assert before.keys() == after.keys()
    drawing = next(name for name in before if name.endswith(".vml"))
    assert before[drawing] == after[drawing], "both cells have their boxes already"


def test_notes_join_those_of_other_cells(tmp_path: Path) -> None:
    """Where a sheet has notes, new ones go into the same parts: one box a note, no two with one name."""
    path = with_notes(tmp_path / "plan.xlsx", BEAM | {"C1": "=reaction(A1,B1,1)", "C2": "=C1"}, {"A1": "Bay 3"})
    _, report = frozen(path)
    assert set(notes(report.target)) == {"A1", "C1"}
    before, after = parts(path), parts(report.target)
    assert before.keys() == after.keys()
    drawing = next(name for name in before if name.endswith(".vml"))
    shapes = [one for one in ElementTree.fromstring(after[drawing]) if one.tag.endswith("}shape")]
    assert len(shapes) == 2
    assert len({one.get("id") for one in shapes}) == 2
    blocks = {re.search(rb'idmap [^>]*data="([^"]*)"', xml[drawing])[1] for xml in (before, after)}  # type: ignore[index]
    assert blocks == {b"1", b"1,2"}
    assert b'id="_x0000_s2049"' in after[drawing]
    cut = after[drawing].index(b"<v:shape xmlns:v")
    assert before[drawing][: -len(b"</xml>")].split(b"data=")[0] in after[drawing][:cut]


TEXTS = {
    "plain": (b"<text><t>Old</t></text>", "Old\n{}"),
    "runs": (b"<text><r><rPr><b/></rPr><t>Ol</t></r><r><t>d</t></r></text>", "Old\n{}"),
    "blank": (b"<text/>", "\n{}"),
    "empty": (b"<text></text>", "\n{}"),
    "spoken": (b'<text><t>Old</t><rPh sb="0" eb="1"><t>o</t></rPh></text>', "Old\n{}"),
}


@pytest.mark.parametrize("name", TEXTS)
def test_every_form_of_a_note_takes_the_formula(tmp_path: Path, name: str) -> None:
    """Plain text, formatted runs, nothing at all: the formula is readable below what there was."""
    text, expected = TEXTS[name]
    path = with_notes(tmp_path / "plan.xlsx", BEAM | {"C1": "=reaction(A1,B1,1)"}, {"C1": "Old"})
    rewrite(path, COMMENTS, lambda xml: re.sub(rb"<text\b.*?</text>", lambda _: text, xml, flags=re.DOTALL))
    _, report = frozen(path)
    got = notes(report.target)["C1"]
    assert got == expected.format("beamfuncs computed this value from\n=reaction(A1,B1,1)")


def test_threaded_comments_are_kept(tmp_path: Path) -> None:
    """The parts of threaded comments keep their bytes, and the sheet keeps its relation to them."""
    path = with_notes(tmp_path / "plan.xlsx", BEAM | {"C1": "=reaction(A1,B1,1)"}, {"A1": "[Threaded comment]"})
    thread = b'<ThreadedComments xmlns="http://schemas.microsoft.com/office/spreadsheetml/2018/threadedcomments"/>'
    relation = (
        b'<Relationship Id="rIdT" Type="http://schemas.microsoft.com/office/2017/10/relationships/threadedComment"'
        b' Target="../threadedComments/threadedComment1.xml"/></Relationships>'
    )
    rewrite(path, "xl/threadedComments/threadedComment1.xml", lambda _: thread)
    listed = "xl/worksheets/_rels/sheet1.xml.rels"
    rewrite(path, listed, lambda xml: xml.replace(b"</Relationships>", relation))
    _, report = frozen(path)
    after = parts(report.target)
    assert after["xl/threadedComments/threadedComment1.xml"] == thread
    assert relation in after[listed]
    assert set(notes(report.target)) == {"A1", "C1"}


# --- the rest of the package -----------------------------------------------------------------------


def test_the_order_of_calculation_is_dropped(tmp_path: Path) -> None:
    """The remembered order names cells without a formula: its part, type and relation go, nothing else."""
    path = build(tmp_path / "plan.xlsx", BEAM | {"C1": "=reaction(A1,B1,1)"})
    kind = b"http://schemas.openxmlformats.org/officeDocument/2006/relationships/calcChain"
    relation = b'<Relationship Id="rIdC" Type="%s" Target="calcChain.xml"/>' % kind
    declared = b'<Override PartName="/xl/calcChain.xml" ContentType="application/vnd.calc"/>'
    before = parts(path)
    rewrite(path, "xl/calcChain.xml", lambda _: b'<calcChain xmlns="%s"><c r="C1" i="1"/></calcChain>' % MAIN.encode())
    rewrite(
        path, "xl/_rels/workbook.xml.rels", lambda xml: xml.replace(b"</Relationships>", relation + b"</Relationships>")
    )
    rewrite(path, TYPES, lambda xml: xml.replace(b"</Types>", declared + b"</Types>"))
    _, report = frozen(path)
    after = parts(report.target)
    assert "xl/calcChain.xml" not in after
    assert after["xl/_rels/workbook.xml.rels"] == before["xl/_rels/workbook.xml.rels"]
    assert b"calcChain" not in after[TYPES]


@pytest.mark.parametrize("behind", ["", "<pageMargins/>|<tableParts/>", "<drawing/>|<extLst/>", "|<picture/><extLst/>"])
def test_the_drawing_of_notes_stands_where_the_format_wants_it(tmp_path: Path, behind: str) -> None:
    """The reference to the notes' drawing comes behind margins and drawings and before pictures, tables, extensions."""
    before, _, after = behind.partition("|")
    path = from_xml(tmp_path / "plan.xlsx", '<row r="1"><c r="A1"><f>twice(1)</f></c></row>')
    rewrite(path, FIRST_SHEET, lambda xml: xml.replace(b"</worksheet>", f"{before}{after}</worksheet>".encode()))
    report = fill(path, freeze=True, functions=FUNCTIONS)
    found = re.search(rb"</sheetData>(.*)<legacyDrawing [^>]*/>(.*)</worksheet>", parts(report.target)[FIRST_SHEET])
    assert found
    assert (found[1].decode(), found[2].decode()) == (before, after)


def test_prefixed_tags_get_prefixed_tags(tmp_path: Path) -> None:
    """In a sheet whose tags have a prefix the reference to the drawing has it too."""
    root = f'<x:worksheet xmlns:x="{MAIN}">'
    path = from_xml(tmp_path / "plan.xlsx", '<x:row r="1"><x:c r="A1"><x:f>twice(1)</x:f></x:c></x:row>', root)
    report = fill(path, freeze=True, functions=FUNCTIONS)
    xml = parts(report.target)[FIRST_SHEET]
    assert b'<x:c r="A1"><x:v>2</x:v></x:c>' in xml
    assert b"<x:legacyDrawing " in xml
    assert "=twice(1)" in notes(report.target)["A1"]


def test_many_notes_keep_apart(tmp_path: Path) -> None:
    """More notes than one block of names holds: every box has its own name, inside the blocks that are declared."""
    cells: dict[str, object] = {f"A{row}": f"=twice({row})" for row in range(1, 1301)}
    _, report = frozen(build(tmp_path / "plan.xlsx", cells), functions=FUNCTIONS)
    drawing = parts(report.target)["xl/drawings/vmlDrawing1.vml"]
    numbers = [int(number) for number in re.findall(rb'id="_x0000_s(\d+)"', drawing)]
    assert len(set(numbers)) == len(numbers) == 1300
    declared = re.search(rb'idmap [^>]*data="([\d,]+)"', drawing)
    assert declared
    assert {number // 1024 for number in numbers} == {int(block) for block in declared[1].split(b",")}
    assert len(notes(report.target)) == 1300


def test_damaged_notes_are_refused(tmp_path: Path) -> None:
    """Where the notes of a sheet cannot be read nothing is written, and one line says why."""
    path = with_notes(tmp_path / "plan.xlsx", BEAM | {"C1": "=reaction(A1,B1,1)"}, {"A1": "Bay 3"})
    rewrite(path, COMMENTS, lambda xml: xml[:-20])
    with pytest.raises(NotFilled, match="notes of a sheet are damaged"):
        fill(path, freeze=True)
    assert [one.name for one in tmp_path.iterdir()] == ["plan.xlsx"]


def test_freezing_twice_says_the_same(tmp_path: Path) -> None:
    """A frozen workbook has nothing left to freeze: a second time no byte of it changes."""
    _, first = frozen(build(tmp_path / "plan.xlsx", BEAM | {"C1": "=reaction(A1,B1,1)", "C2": "=C1"}))
    _, second = frozen(first.target)
    assert second.beam_cells == 0
    assert parts(first.target) == parts(second.target)


def test_freeze_from_the_command_line(tmp_path: Path) -> None:
    """The command says what it froze; it ends with 1 where a cell is in error, with 2 where nothing is done."""
    path = build(tmp_path / "plan.xlsx", BEAM | {"C1": "=reaction(A1,B1,1)"})
    status, out, _ = run("freeze", path, "-o", tmp_path / "out.xlsx")
    assert (status, out) == (0, f"{tmp_path / 'out.xlsx'}: 1 beam cell frozen, 0 other cells recomputed, no errors\n")
    bad = build(tmp_path / "bad.xlsx", BEAM | {"C1": "=reaction(A1,B1,7)"})
    status, out, _ = run("freeze", bad)
    assert status == 1
    assert "Plan!C1  #N/A" in out
    assert (tmp_path / "bad.frozen.xlsx").exists()
    assert run("freeze", tmp_path / "none.xlsx")[0] == 2
    assert run("freeze", path, "-o", path)[0] == 2


@pytest.mark.skipif(shutil.which("soffice") is None, reason="LibreOffice is not installed")
def test_another_program_reads_the_frozen_workbook(tmp_path: Path) -> None:
    """LibreOffice opens it, keeps the values and the notes, old and new, and evaluates the live formulas."""
    cells = BEAM | {"C1": "=reaction(A1,B1,1)", "C2": "=C1/2", "C3": "=reaction(A1,B1,9)"}
    path = with_notes(tmp_path / "plan.xlsx", cells, {"A1": "Bay 3", "C1": "Check"})
    _, report = frozen(path)
    office = ["soffice", f"-env:UserInstallation=file://{tmp_path}/profile", "--headless", "--convert-to", "xlsx"]
    subprocess.run([*office, "--outdir", tmp_path / "out", report.target], check=True, capture_output=True, timeout=120)
    again = tmp_path / "out" / report.target.name
    got = values(again)
    assert [got["C1"], got["C2"], got["C3"]] == [60, 30, "#N/A"]
    told = notes(again)
    assert set(told) == {"A1", "C1", "C3"}
    assert "Check" in told["C1"]
    assert "=reaction(A1,B1,1)" in told["C1"]
