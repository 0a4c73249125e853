"""Formulas respelt for the engine: calls that tell their cell, tables as plain areas."""

from __future__ import annotations

import pytest

from beamfuncs.hosts.headless.formulas import Speller, Table, plain_reference
from beamfuncs.hosts.headless.grid import Area, area, cell_name, column_name, column_number
from beamfuncs.hosts.headless.names import Name, Names

BEAMS = Table("Beams", "Bo's plan", Area(2, 3, 7, 6), ("Mark", "Span", "Load [kN/m]", "No. #"), total_rows=1)
HERE = "'Bo''s plan'!"


@pytest.mark.parametrize(
    ("formula", "expected"),
    [
        ("reaction(A1,B1,2)", "reaction.at(0,1,1,A1,B1,2)"),
        ("REACTION(A1)+Reaction( B1 )", "reaction.at(0,1,1,A1)+reaction.at(0,1,1,B1 )"),
        ("_xlfn.reaction(A1)", "reaction.at(0,1,1,A1)"),
        ("_xludf.reaction(A1)", "reaction.at(0,1,1,A1)"),
        ("reaction()", "reaction.at(0,1,1)"),
        ("reaction( )", "reaction.at(0,1,1)"),
        ("reaction(reaction(A1))", "reaction.at(0,1,1,reaction.at(0,1,1,A1))"),
        ('IF(A1="reaction(",reaction(B1),"a ""reaction(1)""")', None),
        ("SUM(my_reaction(A1),reaction.old(A1),reaction_sum(A1))", "="),
        ("'reaction('!A1+reaction", "="),
        ("SUM(A1:A9)", "="),
        ("'It''s reaction('!A1&reaction(A1)", "'It''s reaction('!A1&reaction.at(0,1,1,A1)"),
    ],
)
def test_only_calls_of_ours_are_respelt(formula: str, expected: str | None) -> None:
    """A call is respelt in any case and behind a future-function prefix; texts, sheets, other names are not."""
    if expected is None:
        expected = formula.replace("reaction(B1)", "reaction.at(0,1,1,B1)")
    text, calls = Speller({"reaction"}, []).respell(formula, "0,1,1")
    assert text == (formula if expected == "=" else expected)
    assert calls is (expected != "=")


@pytest.mark.parametrize(
    ("part", "row", "expected"),
    [
        ("Span", 1, "$D$3:$D$6"),
        ("span", 1, "$D$3:$D$6"),
        ("", 1, "$C$3:$F$6"),
        ("[Mark]:[Span]", 1, "$C$3:$D$6"),
        ("#All", 1, "$C$2:$F$7"),
        ("#Headers", 1, "$C$2:$F$2"),
        ("[#Headers],[Span]", 1, "$D$2"),
        ("[#Totals],[Span]", 1, "$D$7"),
        ("[#Headers],[#Data],[Span]", 1, "$D$2:$D$6"),
        ("[#Data],[#Totals],[Mark]:[Span]", 1, "$C$3:$D$7"),
        ("[#All], [Span]", 1, "$D$2:$D$7"),
        ("@Span", 4, "$D4"),
        ("@[Span]", 4, "$D4"),
        ("@", 4, "$C4:$F4"),
        ("[#This Row],[Mark]:[Span]", 4, "$C4:$D4"),
        ("Load '[kN/m']", 1, "$E$3:$E$6"),
        ("[Load '[kN/m']]", 1, "$E$3:$E$6"),
        ("No. '#", 1, "$F$3:$F$6"),
    ],
)
def test_a_table_reference_names_its_area(part: str, row: int, expected: str) -> None:
    """Columns, spans of columns, the special items and this row become the area they stand for."""
    assert plain_reference(BEAMS, part, row) == HERE + expected


@pytest.mark.parametrize(
    ("part", "row", "error"),
    [("Depth", 1, "#REF!"), ("@Span", 2, "#VALUE!"), ("@Span", 7, "#VALUE!"), ("[#This Row],[Span]", 8, "#VALUE!")],
)
def test_a_table_reference_to_nothing_is_an_error(part: str, row: int, error: str) -> None:
    """An unknown column is #REF!; this row, asked for outside the table's data, is #VALUE!."""
    assert plain_reference(BEAMS, part, row) == error


def test_totals_of_a_table_without_a_totals_row() -> None:
    """Totals that a table has not got are #REF!."""
    table = Table("T", "S", Area(1, 1, 3, 1), ("a",))
    assert plain_reference(table, "#Totals", 1) == "#REF!"


def test_tables_are_found_inside_a_formula() -> None:
    """A table is known by name in any case; unknown tables and texts stay as they are."""
    speller = Speller({"reaction"}, [BEAMS])
    text, calls = speller.respell('SUM(beams[Span])&"Beams[Span]"&Other[x]', "0,4,1", 4)
    assert text == f'SUM({HERE}$D$3:$D$6)&"Beams[Span]"&Other[x]'
    assert not calls
    text, calls = speller.respell("reaction(Beams[[#This Row],[Span]])", "0,4,1", 4)
    assert text == f"reaction.at(0,4,1,{HERE}$D4)"
    assert calls


@pytest.mark.parametrize(
    "reference",
    [
        "[1]Plan!A1",
        "'[1]Bo''s plan'!$A$1:B2",
        "[1]Plan!A:A",
        "[1]Plan!$2:$3",
        "[1]!Spans",
        "'C:\\jobs\\[b.xlsx]P'!A1",
        "[1]Plan!#REF!",
    ],
)
def test_other_workbooks_become_errors(reference: str) -> None:
    """A reference to another workbook, in whatever spelling, is a call that says so; what stands beside it stays."""
    text, calls = Speller({"reaction"}, []).respell(f"SUM({reference},A1)&Plan!B2", "0,4,1")
    assert text == "SUM(elsewhere.at(0,4,1),A1)&Plan!B2"
    assert not calls


@pytest.mark.parametrize(
    ("formula", "expected"),
    [
        ("SUM(2:3)", "SUM($A2:$XFD3)"),
        ("SUM($2:$3,Data!4:4)", "SUM($A$2:$XFD$3,Data!$A4:$XFD4)"),
        ('A1:B2&"2:3"&C:C', None),
        ("SUM(A1:A2:A3)", None),
        ("SUM(Plan:Data!B2)", "SUM('Plan'!B2,'Bo''s'!B2,'Data'!B2)"),
        ("MAX( 'Bo''s:Data'!B2:C3,1)", "MAX( 'Bo''s'!B2:C3,'Data'!B2:C3,1)"),
        ("SUM(data:plan!B2)", "SUM('Plan'!B2,'Bo''s'!B2,'Data'!B2)"),
        ("LARGE(Plan:Data!B2,2)", None),
        ("SUM(Plan:Roof!B2)", None),
        ("SUM(Data!B2)", None),
        ("_xlfn.SINGLE(A1:A3)+1", "@(A1:A3)+1"),
    ],
)
def test_references_that_the_engine_does_not_know_become_plain_areas(formula: str, expected: str | None) -> None:
    """Whole rows, and an area through several sheets where a function takes it, are areas; others stay as they are."""
    speller = Speller(set(), [], sheets=["Plan", "Bo's", "Data"])
    assert speller.respell(formula, "0,1,1") == (formula if expected is None else expected, False)


def test_names_for_formulas_are_put_in_their_place() -> None:
    """A name means its formula, moved along where it is relative, in any case; texts and other names stay."""
    names = Names(
        [
            Name("Force", None, "reaction(Plan!$A$1,Loads)"),
            Name("Loads", None, '"udl "&Plan!$B$1'),
            Name("Left", None, "Plan!A1*2"),
            Name("Left", "Data", "Plan!$A$9*3"),
            Name("Loop", None, "Loop+1"),
        ]
    )
    speller = Speller({"reaction"}, [], names, ["Plan", "Data"])
    force = 'reaction.at(0,4,2,Plan!$A$1,("udl "&Plan!$B$1))'
    assert speller.respell('FORCE+1&"Force"', "0,4,2", 4, 2) == (f'({force})+1&"Force"', True)
    assert speller.respell("Left", "0,4,2", 4, 2) == ("(Plan!B4*2)", False)
    assert speller.respell("Left+Force.x+Left(1)", "1,4,2", 4, 2) == ("(Plan!$A$9*3)+Force.x+Left(1)", False)
    assert speller.respell("Loop", "0,4,2", 4, 2) == ("(#NAME?+1)", False)


@pytest.mark.parametrize(
    ("number", "letters"), [(1, "A"), (26, "Z"), (27, "AA"), (702, "ZZ"), (703, "AAA"), (16384, "XFD")]
)
def test_columns_have_letters(number: int, letters: str) -> None:
    """Columns count A to Z, AA to ZZ and on to XFD, the last."""
    assert column_name(number) == letters
    assert column_number(letters) == number
    assert cell_name(7, number) == f"{letters}7"
    assert area(f"${letters}$7:{letters}9") == Area(7, number, 9, number)


def test_what_names_no_cell_is_refused() -> None:
    """Text that is no cell or area raises instead of naming some other cell."""
    for text in ("", "A0", "7", "A1:B", "A1B2"):
        with pytest.raises(ValueError, match="names no cell"):
            area(text)
