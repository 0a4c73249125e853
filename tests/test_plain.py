"""The engine's copy of a package: parts and vocabularies named as the engine knows them, nothing else changed."""

from __future__ import annotations

import io
import re
import zipfile
from collections.abc import Callable
from pathlib import Path

import pytest
from books import MAIN, build, parts

from beamfuncs.hosts.headless.filling import fill
from beamfuncs.hosts.headless.plain import packed

STRICT = {
    MAIN: "http://purl.oclc.org/ooxml/spreadsheetml/main",
    "http://schemas.openxmlformats.org/officeDocument/2006/relationships": (
        "http://purl.oclc.org/ooxml/officeDocument/relationships"
    ),
}
CELLS = {"A1": "fixed 8 pinned", "A2": "udl 12", "B1": "=reaction(A1,A2,1)", "Data!A1": "=Plan!B1*2"}
REACTION = 5 / 8 * 12 * 8


def unpacked(package: bytes) -> dict[str, bytes]:
    """The parts of a package."""
    with zipfile.ZipFile(io.BytesIO(package)) as archive:
        return {name: archive.read(name) for name in archive.namelist()}


def rebuilt(path: Path, contents: dict[str, bytes]) -> Path:
    """Write a package of these parts."""
    with zipfile.ZipFile(path, "w") as archive:
        for name, content in contents.items():
            archive.writestr(name, content)
    return path


def test_a_usual_package_stays_as_it_is(tmp_path: Path) -> None:
    """Parts that are spelt as usual keep their names, their order and their bytes."""
    usual = parts(build(tmp_path / "book.xlsx", CELLS)) | {"xl/media/a.png": bytes(range(256))}
    copy = unpacked(packed(usual))
    assert list(copy.items()) == list(usual.items())


@pytest.mark.parametrize("spelt", [str.lower, str.upper, str.title])
def test_names_of_parts_follow_those_that_refer_to_them(tmp_path: Path, spelt: Callable[[str], str]) -> None:
    """Parts that are named in another case than they are referred to by get the names that are looked for."""
    usual = parts(build(tmp_path / "book.xlsx", CELLS))
    other = {name if name.endswith(".rels") else spelt(name): content for name, content in usual.items()}
    assert unpacked(packed(other)) == usual


def test_a_strict_workbook_is_filled_and_stays_strict(tmp_path: Path) -> None:
    """A workbook in the strict vocabulary has its values, and keeps its own words in every part."""
    contents = parts(build(tmp_path / "usual.xlsx", CELLS))
    for old, new in STRICT.items():
        contents = {
            name: content.replace(old.encode(), new.encode()) if name.startswith(("xl/", "_rels/")) else content
            for name, content in contents.items()
        }
    strict = rebuilt(tmp_path / "strict.xlsx", contents)
    report = fill(strict)
    assert report.errors == []
    filled = parts(report.target)
    assert {name for name in filled if filled[name] != contents[name]} == {
        "xl/worksheets/sheet1.xml",
        "xl/worksheets/sheet2.xml",
    }
    assert f"<f>reaction(A1,A2,1)</f><v>{REACTION:g}</v>".encode() in filled["xl/worksheets/sheet1.xml"]
    assert f"<f>Plan!B1*2</f><v>{2 * REACTION:g}</v>".encode() in filled["xl/worksheets/sheet2.xml"]
    assert STRICT[MAIN].encode() in filled["xl/worksheets/sheet1.xml"]


def test_texts_in_a_part_of_another_case_are_read(tmp_path: Path) -> None:
    """Shared texts stand in a part whose name differs in case from what refers to it: they are read all the same."""
    contents = parts(build(tmp_path / "usual.xlsx", {"A1": 0, "A2": "udl 12", "B1": "=reaction(A1,A2,1)"}))
    sheet, relations = "xl/worksheets/sheet1.xml", "xl/_rels/workbook.xml.rels"
    shared = f'<sst xmlns="{MAIN}" count="1" uniqueCount="1"><si><t>fixed 8 pinned</t></si></sst>'
    kind = "http://schemas.openxmlformats.org/officeDocument/2006/relationships/sharedStrings"
    relation = f'<Relationship Type="{kind}" Target="sharedStrings.xml" Id="shared"/></Relationships>'
    contents[sheet], count = re.subn(rb'<c r="A1"[^>]*>', b'<c r="A1" t="s">', contents[sheet])
    assert count == 1
    contents[relations] = contents[relations].replace(b"</Relationships>", relation.encode())
    contents["xl/SharedStrings.xml"] = shared.encode()
    report = fill(rebuilt(tmp_path / "other.xlsx", contents))
    assert report.errors == []
    assert f"<v>{REACTION:g}</v>".encode() in parts(report.target)[sheet]
