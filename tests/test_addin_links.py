"""Calls by way of the add-in: Excel stores `[1]!reaction(...)` and a link to the add-in's file, in some user's folder.

That it stores such formulas is common practice with functions of add-ins, no source; no file of a real Excel is here.
"""

from __future__ import annotations

from pathlib import Path

import openpyxl
import pytest
from openpyxl.packaging.relationship import Relationship
from openpyxl.workbook.external_link.external import ExternalBook, ExternalLink

from beamfuncs.hosts.headless.filling import fill
from beamfuncs.hosts.headless.package import Package

MINE = "file:///C:\\Users\\an%20engineer\\AppData\\Roaming\\Microsoft\\Excel\\XLSTART\\BeamFuncs.xlam"
OTHER = "/Tools/other.xlam"


def linked(path: Path, formulas: dict[str, str], *targets: str) -> Path:
    """Write a workbook with links to the files, which formulas name by `[1]`, `[2]`..."""
    book = openpyxl.Workbook()
    book.active.title = "Plan"
    for cell, formula in formulas.items():
        book["Plan"][cell] = formula
    for target in targets:
        link = ExternalLink(externalBook=ExternalBook(id="rId1"))
        link.file_link = Relationship(type="externalLinkPath", Target=target, TargetMode="External", Id="rId1")
        book._external_links.append(link)
    book.save(path)
    return path


@pytest.mark.parametrize(
    "target", [MINE, "beamfuncs.xlam", "../XLSTART/beamfuncs.xlam", "https://x.example/beamfuncs.xlam"]
)
def test_a_call_by_way_of_the_add_in_is_a_call_of_ours(tmp_path: Path, target: str) -> None:
    """The link to another workbook before it is not ours; the add-in may lie in any folder."""
    formula = '=2*[2]!Reaction("fixed 8 pinned","udl 12",1)&"[2]!reaction("'
    book = linked(tmp_path / "book.xlsx", {"A1": formula, "A2": "=[2]!fault()"}, OTHER, target)
    report = fill(book)
    assert (report.beam_cells, [fault.cell for fault in report.errors]) == (2, ["A2"])
    assert openpyxl.load_workbook(report.target, data_only=True)["Plan"]["A1"].value == "120[2]!reaction("
    assert openpyxl.load_workbook(report.target)["Plan"]["A1"].value == formula


def test_a_function_of_another_add_in_is_not_taken_for_ours(tmp_path: Path) -> None:
    """It may compute anything: what it answers is not known here, and it is never opened."""
    formulas = {"A1": '=[1]!reaction("fixed 8 pinned","udl 12",1)', "A2": "=1+[1]!other()", "A3": "=[3]!reaction(1)"}
    report = fill(linked(tmp_path / "book.xlsx", formulas, OTHER, MINE))
    assert report.beam_cells == 0
    assert [(fault.cell, fault.value) for fault in report.errors] == [(cell, "#REF!") for cell in formulas]
    assert all("another workbook" in fault.reason for fault in report.errors)


def test_links_are_told_apart_by_the_name_of_their_file(tmp_path: Path) -> None:
    """Only the file's own name counts, in any case of letters."""
    book = linked(tmp_path / "book.xlsx", {}, "/beamfuncs.xlam/x.xlsx", MINE, "notbeamfuncs.xlam")
    assert Package.read(book).links_to("beamfuncs.xlam") == {2}
