"""Values spliced into the XML of a sheet: right value, right type, every other byte as it was."""

from __future__ import annotations

import math
from xml.etree import ElementTree

import pytest
from books import MAIN

from beamfuncs.errors import ErrorValue
from beamfuncs.hosts.headless.grid import Area
from beamfuncs.hosts.headless.layout import SheetError, read
from beamfuncs.hosts.headless.splice import CellValue, filled, for_engine, written

HEAD = f'<worksheet xmlns="{MAIN}"><sheetData>'
TAIL = "</sheetData></worksheet>"


def sheet(rows: str) -> bytes:
    """A sheet of these rows."""
    return f"{HEAD}{rows}{TAIL}".encode()


def stored(
    xml: bytes, values: dict[tuple[int, int], CellValue], extents: dict[tuple[int, int], Area] | None = None
) -> bytes:
    """The sheet with values stored."""
    return filled(xml, read(xml), values, extents or {})


def cells(xml: bytes) -> dict[str, tuple[str | None, str | None]]:
    """Type and value of every cell, by an independent parser."""
    found = {}
    for cell in ElementTree.fromstring(xml).iter(f"{{{MAIN}}}c"):
        found[cell.attrib["r"]] = cell.get("t"), cell.findtext(f"{{{MAIN}}}v")
    return found


@pytest.mark.parametrize(
    ("value", "kind", "text"),
    [
        (5.0, None, "5"),
        (-0.0, None, "0"),
        (0.1, None, "0.1"),
        (1e22, None, "1e+22"),
        (5e-324, None, "5e-324"),
        (123456789012345678.0, None, "1.2345678901234568e+17"),
        (True, "b", "1"),
        (False, "b", "0"),
        ("fixed 8 pinned", "str", "fixed 8 pinned"),
        ("", "str", ""),
        ("a<b & c>d", "str", "a<b & c>d"),
        ("line\nline", "str", "line\nline"),
        ("\r\x07_x000D_", "str", "_x000D__x0007__x005F_x000D_"),
        ("=1+1", "str", "=1+1"),
        (ErrorValue("#DIV/0!"), "e", "#DIV/0!"),
        (ErrorValue("#N/A"), "e", "#N/A"),
        (ErrorValue("#SPILL!"), "e", "#VALUE!"),
        (ErrorValue("#CIRC!"), "e", "#VALUE!"),
    ],
)
def test_each_kind_of_value_is_stored(value: CellValue, kind: str, text: str) -> None:
    """Whatever a cell held before, it holds the new value with its type beside an untouched formula."""
    for before in ("", "<v></v>", "<v/>", "<v>7</v>", '<v xml:space="preserve"> x </v>'):
        for old in ("", ' t="str"', ' t="n"', " t='b'", ' t="e"'):
            cell = f'<c r="B2" s="3"{old}><f>A1&amp;"&lt;"</f>{before}</c>'
            new = stored(sheet(f'<row r="2">{cell}<c r="C2"><v>9</v></c></row>'), {(2, 2): value})
            assert cells(new)["B2"] == (kind, text)
            assert new.startswith(f'{HEAD}<row r="2"><c r="B2" s="3"'.encode())
            assert b'><f>A1&amp;"&lt;"</f><v' in new
            assert new.endswith(f'</c><c r="C2"><v>9</v></c></row>{TAIL}'.encode())


def test_a_value_that_stands_there_changes_no_byte() -> None:
    """Equal values stay in whatever spelling the file has them."""
    xml = sheet(
        '<row r="1"><c r="A1"><f>1/10</f><v>0.10000000000000001</v></c><c t="n" r="B1"><f>1</f><v>1.0</v></c>'
        '<c r="C1" t="str"><f>x</f><v xml:space="preserve"> a&#62;</v></c><c r="D1" t="b"><f>TRUE</f><v>1</v></c>'
        '<c r="E1" t="e"><f>NA()</f><v>#N/A</v></c><c r="F1" t="str"><f>""</f><v></v></c></row>'
    )
    values: dict[tuple[int, int], CellValue] = dict(
        enumerate([0.1, 1.0, " a>", True, ErrorValue("#N/A"), ""], 1)  # type: ignore[arg-type]
    )
    assert stored(xml, {(1, column): value for column, value in values.items()}) == xml  # type: ignore[misc]


def test_numbers_one_step_apart_differ() -> None:
    """The next number after the stored one is a change, and is stored to the last bit."""
    xml = sheet('<row r="1"><c r="A1"><f>1/10</f><v>0.1</v></c></row>')
    new = cells(stored(xml, {(1, 1): math.nextafter(0.1, 1)}))["A1"][1]
    assert new is not None
    assert float(new) == math.nextafter(0.1, 1)


def test_a_type_alone_is_a_change() -> None:
    """The text 1, the number 1 and TRUE are stored alike but for their types."""
    xml = sheet('<row r="1"><c r="A1" t="str"><f>B1</f><v>1</v></c></row>')
    assert cells(stored(xml, {(1, 1): 1.0}))["A1"] == (None, "1")
    assert cells(stored(xml, {(1, 1): True}))["A1"] == ("b", "1")
    assert stored(xml, {(1, 1): "1"}) == xml


@pytest.mark.parametrize("number", [math.nan, math.inf, -math.inf])
def test_no_cell_holds_what_is_not_finite(number: float) -> None:
    """NaN and infinity are refused rather than written."""
    with pytest.raises(ValueError, match="finite"):
        written(number)


def test_cells_and_rows_that_are_missing_are_put_in_order() -> None:
    """A cell that an array fills is inserted between its neighbours; a row between its own."""
    xml = sheet(
        '<row r="2"><c r="B2"><f t="array" ref="B2:D7">x</f></c><c r="E2"><v>1</v></c></row>'
        '<row r="4" ht="20"/><row r="5"><c r="A5"><v>2</v></c><c r="C5" s="1"/></row><row r="6"></row>'
    )
    values = {place: float(100 * place[0] + place[1]) for place in Area(2, 2, 7, 4).cells()}
    root = ElementTree.fromstring(stored(xml, dict(values)))
    rows = {int(row.attrib["r"]): [c.attrib["r"] for c in row] for row in root.iter(f"{{{MAIN}}}row")}
    assert list(rows) == [2, 3, 4, 5, 6, 7]
    assert rows[2] == ["B2", "C2", "D2", "E2"]
    assert rows[3] == ["B3", "C3", "D3"]
    assert rows[4] == ["B4", "C4", "D4"]
    assert rows[5] == ["A5", "B5", "C5", "D5"]
    assert rows[6] == ["B6", "C6", "D6"]
    assert rows[7] == ["B7", "C7", "D7"]
    new = cells(ElementTree.tostring(root))
    assert new["D7"] == (None, "704")
    assert new["C5"] == (None, "503")
    assert new["A5"] == (None, "2")


def test_a_spilling_array_takes_its_new_extent() -> None:
    """The extent in the formula's tag changes, the formula does not; cells left over are cleared."""
    xml = sheet(
        '<row r="1"><c r="A1" cm="1"><f t="array" ref="A1:A2">SEQUENCE(B1)</f><v>1</v></c></row>'
        '<row r="2"><c r="A2" s="4" t="str"><v>old</v></c></row>'
    )
    new = stored(xml, {(1, 1): 1.0, (2, 1): None}, {(1, 1): Area(1, 1, 1, 1)})
    assert b'<c r="A1" cm="1"><f t="array" ref="A1">SEQUENCE(B1)</f><v>1</v></c>' in new
    assert b'<c r="A2" s="4"/>' in new


def test_prefixes_missing_names_comments_and_entities() -> None:
    """A sheet that spells its XML in other ways is read and kept in its own."""
    xml = (
        f"<?xml version='1.0' encoding='UTF-8'?>\n<x:worksheet xmlns:x='{MAIN}'><x:sheetData><!-- <c r='A1'> -->"
        "<x:row><x:c><x:v>3</x:v></x:c><x:c s='1'><x:f ><![CDATA[A1>2]]></x:f ></x:c ></x:row>"
        '<x:row><x:c/><x:c><x:f>B1&amp;"/>"</x:f><x:v/></x:c></x:row></x:sheetData></x:worksheet>'
    ).encode()
    layout = read(xml)
    assert {place: cell.formula for place, cell in layout.cells.items()} == {(1, 2): "A1>2", (2, 2): 'B1&"/>"'}
    new = filled(xml, layout, {(1, 2): True, (2, 2): 'TRUE"/>', (3, 1): 5.0}, {})
    assert new == (
        xml.replace(b"<x:c s='1'>", b"<x:c s='1' t=\"b\">")
        .replace(b"</x:f ></x:c >", b"</x:f ><x:v>1</x:v></x:c >")
        .replace(b"<x:c><x:f>B1", b'<x:c t="str"><x:f>B1')
        .replace(b"<x:v/>", b'<x:v>TRUE"/&gt;</x:v>')
        .replace(b"</x:sheetData>", b'<x:row r="3"><x:c r="A3"><x:v>5</x:v></x:c></x:row></x:sheetData>')
    )


def test_a_cell_s_own_name_goes_before_its_row_s_count() -> None:
    """Where rows are not numbered, the cells' names say which they are."""
    xml = sheet(
        '<row><c r="A1"><f>1</f></c></row><row><c r="B5"><f>2</f></c><c><f>3</f></c></row><row><c><f>4</f></c></row>'
    )
    assert list(read(xml).cells) == [(1, 1), (5, 2), (5, 3), (6, 1)]


def test_the_engine_sees_spelt_formulas_and_no_stored_results() -> None:
    """In the engine's copy a formula has its new spelling; its value and what an array filled are left out."""
    xml = sheet(
        '<row r="1"><c r="A1" t="str"><f ca="1">old()</f><v>stale</v></c><c r="B1"><v>7</v></c></row>'
        '<row r="2"><c r="A2" cm="1"><f t="array" ref="A2:B3">all()</f><v>1</v></c><c r="B2" t="str"><v>x</v></c></row>'
        '<row r="3"><c r="A3"><v>2</v></c><c r="B3"><f ca="1"/><v>3</v></c><c r="C3"><v>8</v></c></row>'
        '<row r="4"><c r="A4"><f t="dataTable" ref="A4:A4" r1="B1"/><v>4</v></c></row>'
    )
    copy = ElementTree.fromstring(for_engine(xml, read(xml), {(1, 1): 'new("<")', (2, 1): "more()"}))
    seen = {c.attrib["r"]: [(part.tag.partition("}")[2], part.text) for part in c] for c in copy.iter(f"{{{MAIN}}}c")}
    assert seen == {
        "A1": [("f", 'new("<")')],
        "B1": [("v", "7")],
        "A2": [("f", "more()")],
        "B2": [],
        "A3": [],
        "B3": [("v", "3")],
        "C3": [("v", "8")],
        "A4": [("v", "4")],
    }


@pytest.mark.parametrize(
    ("xml", "why"),
    [
        (b'<!DOCTYPE x [<!ENTITY a "b">]><worksheet/>', "document type"),
        (b'<?xml version="1.0" encoding="ISO-8859-1"?><worksheet/>', "UTF-8"),
        ("<?xml version='1.0' encoding='UTF-16'?><worksheet/>".encode("utf-16"), "UTF-16"),
        (b"<worksheet><sheetData></worksheet>", "mismatched tag"),
        (b"", "no element"),
        (sheet('<row r="one"/>'), "invalid literal"),
        (sheet('<row r="1"><c r="A1"><f t="array">x</f></c></row>'), "ref"),
    ],
)
def test_xml_that_cannot_be_read_is_refused(xml: bytes, why: str) -> None:
    """Broken XML, a document type, an encoding other than UTF-8: each is refused with its reason."""
    with pytest.raises(SheetError, match=why):
        read(xml)
