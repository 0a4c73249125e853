"""Filled workbooks in LibreOffice: it opens them, comes to the same values when it recalculates, and prints them."""

from __future__ import annotations

import re
import zipfile
from pathlib import Path

import pytest
from battery import build
from office import Office
from real_files import NotFetchedError, workbooks
from test_real_files import Outcome, filled_or_refused
from unfilled import Value, sheets, stored

from beamfuncs.catalogue import catalogue
from beamfuncs.hosts.headless.filling import fill

KESTREL_QUAY = Path(__file__).parent.parent / "workbooks" / "kestrel_quay.xlsx"
RELATIVE = 1e-9

BATTERY_DIFFERS = {
    '"x"&2/3',  # the number's 16 digits: the miss that is known
    "0.1+0.2=0.3",  # known misses too
    '"1,234"+1',
    'SUM("7.25",1)',  # here LibreOffice has its own ways with text
    '"t"&TRUE',
}
"""The formulas of the battery where it does not agree with `fill`."""

REAL_FILES_DIFFER = {
    "DATE.xlsx",  # days of the years before 1900, which its calendar has
    "YEAR.xlsx",
    "VDB.xlsx",  # parts of a period
    "reveng1.xlsx",  # a character of another code page
}
"""The workbooks in which it does not agree with every value that the program stored that saved them."""

NOT_OPENED = {"issue150.xlsx", "apachepoi_49609.xlsx"}
"""The workbooks that it does not open as they were, their parts being named in another case, or with backslashes."""

LAST_NAMES = ("XLOOKUP", "LET", "FILTER", "SEQUENCE", "ANCHORARRAY", "@")
"""What later versions know, and the one in use may not: not compared where it gives an error."""


@pytest.fixture(scope="module")
def office(tmp_path_factory: pytest.TempPathFactory) -> Office:
    """The office program with a profile of its own."""
    return Office(tmp_path_factory.mktemp("office"))


def frozen(path: Path, target: Path) -> int:
    """Write a copy in which the cells that call our functions hold their values alone; return how many did."""
    count = 0
    ours = re.compile(rf"\b(?:{'|'.join(catalogue())})\(".encode(), re.IGNORECASE)

    def without_formula(found: re.Match[bytes]) -> bytes:
        nonlocal count
        if not ours.search(found[0]):
            return found[0]
        count += 1
        return b""

    worksheets = sheets(path)
    with zipfile.ZipFile(path) as archive, zipfile.ZipFile(target, "w", zipfile.ZIP_DEFLATED) as copy:
        for name in archive.namelist():
            xml = archive.read(name)
            copy.writestr(name, re.sub(rb"<f\b[^>]*?>[^<]*</f>", without_formula, xml) if name in worksheets else xml)
    return count


def differing(ours: Path, theirs: Path) -> dict[tuple[str, str], tuple[Value, Value]]:
    """The formula cells of `ours` that hold something else in `theirs`; an error of any kind is an error."""
    recalculated = stored(theirs)
    both = {place: (value, recalculated[place]) for place, value in stored(ours).items()}
    return {
        place: (value, other)
        for place, (value, other) in both.items()
        if not (value.agrees(other, RELATIVE) or (value.is_error and other.is_error))
        and not (other.is_error and any(name in value.formula for name in LAST_NAMES))
    }


def test_the_example_workbook_agrees_and_prints(office: Office, tmp_path: Path) -> None:
    """Each ordinary formula of the filled example, recalculated from the beams' values, comes to what `fill` stored."""
    filled = fill(KESTREL_QUAY, tmp_path / "kestrel_quay.xlsx").target
    copy = tmp_path / "frozen.xlsx"
    assert frozen(filled, copy) > 200
    (tmp_path / "out").mkdir()
    (recalculated,) = office.recalculated([copy], tmp_path / "out")
    assert len(stored(copy)) > 100
    assert differing(copy, recalculated) == {}
    (printed,) = office.printed([filled], tmp_path / "out")
    assert printed.read_bytes().startswith(b"%PDF-")


def test_it_does_recalculate(office: Office, tmp_path: Path) -> None:
    """A stored value that is not the formula's is put right on opening: the comparison is of two computations."""
    filled = fill(KESTREL_QUAY, tmp_path / "kestrel_quay.xlsx").target
    copy = tmp_path / "stale.xlsx"
    frozen(filled, copy)
    place, value = next((place, one) for place, one in stored(copy).items() if one.formula.startswith("ROUND("))
    with zipfile.ZipFile(copy) as archive:
        contents = {name: archive.read(name) for name in archive.namelist()}
    (part,) = (name for name, title in sheets(copy).items() if title == place[0])
    old = f"<f>{value.formula}</f><v>{value.text}</v>".encode()
    assert contents[part].count(old) == 1
    contents[part] = contents[part].replace(old, f"<f>{value.formula}</f><v>-12345</v>".encode())
    with zipfile.ZipFile(copy, "w") as archive:
        for name, content in contents.items():
            archive.writestr(name, content)
    assert stored(copy)[place].text == "-12345"
    (tmp_path / "out").mkdir()
    (recalculated,) = office.recalculated([copy], tmp_path / "out")
    assert value.agrees(stored(recalculated)[place], RELATIVE)
    assert place in differing(copy, recalculated)


@pytest.mark.parametrize("counts_from_1904", [False, True])
def test_the_battery_agrees(office: Office, tmp_path: Path, counts_from_1904: bool) -> None:
    """The battery of ordinary formulas, filled, agrees but for what is told of; and it prints."""
    filled = fill(build(tmp_path / "battery.xlsx", counts_from_1904)).target
    (tmp_path / "out").mkdir()
    (recalculated,) = office.recalculated([filled], tmp_path / "out")
    assert {value.formula for value, _ in differing(filled, recalculated).values()} <= BATTERY_DIFFERS
    assert office.printed([filled], tmp_path / "out")[0].stat().st_size > 0


@pytest.fixture(scope="module")
def real_files(pytestconfig: pytest.Config, tmp_path_factory: pytest.TempPathFactory) -> list[Outcome]:
    """The workbooks of other packages that `fill` fills and that LibreOffice opens, filled."""
    try:
        sources = workbooks(pytestconfig.cache.mkdir("real_files"))
    except NotFetchedError as error:
        pytest.skip(f"NOT RUN: the workbooks of other packages are not there ({error})")
    outcomes = filled_or_refused(sources, tmp_path_factory.mktemp("filled"))
    return [one for one in outcomes if not one.refusal and one.name not in NOT_OPENED]


def test_real_files_agree(office: Office, real_files: list[Outcome], tmp_path: Path) -> None:
    """Over a hundred workbooks of others are opened when filled; their formulas agree, but for those of a few."""
    targets = [outcome.target for outcome in real_files]
    wrong, formulas = set(), 0
    for outcome, recalculated in zip(real_files, office.recalculated(targets, tmp_path), strict=True):
        formulas += len(stored(outcome.target))
        if differing(outcome.target, recalculated):
            wrong.add(outcome.name)
    assert formulas > 3000
    assert wrong <= REAL_FILES_DIFFER


def test_real_files_print(office: Office, real_files: list[Outcome], tmp_path: Path) -> None:
    """Some of them, with charts, macros, tables, comments and pictures, are printed."""
    names = {"any_sheets.xlsx", "table-multiple.xlsx", "use_case_01.xlsm", "sheets_order.xlsx", "bad_dimensions.xlsx"}
    some = [one.target for one in real_files if one.name in names | {"test_comments_excel.xlsx", "IF.xlsx"}]
    assert len(some) == len(names) + 2
    for printed in office.printed(some, tmp_path):
        assert printed.read_bytes().startswith(b"%PDF-")
