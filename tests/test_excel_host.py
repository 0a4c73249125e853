"""The Excel host, asked through xlwings' own COM server with what Excel hands over."""

from __future__ import annotations

import ast
import importlib
import io
import logging
import math
import subprocess
import sys
from collections.abc import Callable, Iterator
from datetime import UTC
from decimal import Decimal
from pathlib import Path
from types import ModuleType, SimpleNamespace
from typing import Any

import com
import numpy as np
import pytest
from com import MISSING, Content, Date, Money, Range, Sheet, call, cell, cells, error
from golden import GOLDEN, Argument, Row, answer, bits_of
from golden import rows_of as rows_of_answer
from hypothesis import given, settings
from hypothesis import strategies as st

import beamfuncs
from beamfuncs.catalogue import Entry, catalogue
from beamfuncs.errors import BeamError, ErrorValue
from beamfuncs.functions import beam_line, deflection_max, moment_at, reaction, shear_at
from beamfuncs.hosts.excel_addin.places import places

VALUE, NUM, NA = com.ERRORS["#VALUE!"], com.ERRORS["#NUM!"], com.ERRORS["#N/A"]
BY_CODE = {code: ErrorValue(text) for text, code in com.ERRORS.items()}
ENTRIES = list(catalogue().values())
by_name = pytest.mark.parametrize("entry", ENTRIES, ids=[entry.name for entry in ENTRIES])


@pytest.fixture(scope="module", autouse=True)
def served(tmp_path_factory: pytest.TempPathFactory) -> Iterator[ModuleType]:
    """The module that xlwings serves, its log in a profile that is thrown away."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setenv("LOCALAPPDATA", str(tmp_path_factory.mktemp("profile")))
        with com.installed() as module:
            yield module


@pytest.fixture
def profile(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Iterator[Path]:
    """A new profile whose log is not open yet, and the module served anew."""
    monkeypatch.setenv("LOCALAPPDATA", str(tmp_path / "local"))
    com.close_log()
    with com.installed():
        yield tmp_path / "local"


def shown(result: object) -> list[list[object]]:
    """The cells that the add-in fills: an int is an error code, and nothing else is."""
    return [[BY_CODE[one] if type(one) is int else one for one in row] for row in com.rows_of(result)]


def log() -> str:
    """What has been logged."""
    return places().log.read_text(encoding="utf-8")


# --- what COM hands over for a row of the shared table --------------------------------------------


def scode(content: Any) -> Any:
    """A cell of the table as it stands in Excel."""
    return error(content) if isinstance(content, ErrorValue) else content


def as_typed(argument: Argument) -> object:
    """Ranges as references, everything else typed into the formula."""
    if isinstance(argument, list):
        return cells([[scode(one) for one in row] for row in argument])
    return MISSING if argument is None else scode(argument)


def all_in_cells(argument: Argument) -> object:
    """Everything as references, what is left out as a blank cell."""
    return as_typed(argument if isinstance(argument, list) else [[argument]])


def as_arrays(argument: Argument) -> object:
    """Ranges as arrays: rows of rows, a lone row being flat."""
    if isinstance(argument, list):
        rows = tuple(tuple(scode(one) for one in row) for row in argument)
        return rows if len(rows) > 1 else rows[0]
    return None if argument is None else scode(argument)


def asked(row: Row, hand_over: Callable[[Argument], object]) -> Any:
    """The answer over COM; VBA marks every argument that is left out at the end."""
    arguments = [hand_over(argument) for argument in row.arguments]
    repeats = any(argument.repeats for argument in catalogue()[row.function].arguments)
    left_out = 0 if repeats else len(catalogue()[row.function].arguments) - len(arguments)
    return call(row.function, *arguments, *[MISSING] * left_out)


@pytest.mark.parametrize("hand_over", [as_typed, all_in_cells, as_arrays])
@pytest.mark.parametrize("row", GOLDEN, ids=[f"{row.function}-{n}" for n, row in enumerate(GOLDEN)])
def test_excel_is_answered_as_python(row: Row, hand_over: Callable[[Argument], object]) -> None:
    """Numbers to the last bit, texts and error values are the function's own, however the arguments come."""
    assert bits_of(shown(asked(row, hand_over))) == bits_of(rows_of_answer(answer(row)))


@pytest.mark.parametrize("row", GOLDEN, ids=[f"{row.function}-{n}" for n, row in enumerate(GOLDEN)])
def test_cells_get_floats_texts_and_error_codes_only(row: Row) -> None:
    """No result is an int, nothing is None, NaN or infinite, and rows have one length: what VBA's walk relies on."""
    rows = com.rows_of(asked(row, as_typed))
    assert len({len(line) for line in rows}) == 1
    for one in (one for line in rows for one in line):
        assert type(one) in (float, str, int)
        assert not isinstance(one, int) or one in BY_CODE
        assert not isinstance(one, float) or math.isfinite(one)
        assert not isinstance(one, str) or not one.startswith(("#", "Traceback"))


# --- arguments that are left out or blank ---------------------------------------------------------


def test_arguments_left_out_in_the_middle_and_at_the_end_are_not_given() -> None:
    """What VBA marks as missing is the same as None, a blank cell, and blank text."""
    beam, loads, factors = "pinned 8 roller", "Q: udl 12", "1.5 Q"
    right = deflection_max(beam, loads, None, 32000.0, factors)
    for blank in (MISSING, None, "", "  ", cell(None), cell(""), 0.0, 0):
        assert call("deflection_max", beam, loads, blank, 32000.0, factors) == right
        assert call("deflection_max", beam, loads, blank, blank, factors) == VALUE
        assert call("reaction", beam, loads, 1.0, blank, "1.5 Q") == reaction(beam, loads, 1.0, None, factors)
    for blank in (MISSING, None, "", "  ", cell(None), cell("")):
        assert call("reaction", beam, loads, 1.0, 32000.0, blank) == reaction(beam, loads, 1.0)


@pytest.mark.parametrize("blank", [MISSING, None, "", cell(None), cells([[None, None]])])
@pytest.mark.parametrize("position", [0, 1, 2])
def test_a_needed_argument_that_is_left_out_is_an_error(blank: object, position: int) -> None:
    """A beam, loads or a support that is not there gives #VALUE! and never a number."""
    arguments: list[object] = ["fixed 8 pinned", "udl 12", 1.0]
    arguments[position] = blank
    assert call("reaction", *arguments) == VALUE


@pytest.mark.parametrize("blank", [MISSING, None, cell(None)])
def test_a_blank_among_repeated_arguments_is_an_error(blank: object) -> None:
    """In `beam_line` each part counts, so that one left out, at the end too, does not vanish."""
    assert call("beam_line", "fixed", 8.0, "pinned") == "fixed 8 pinned"
    assert call("beam_line", "fixed", blank, "pinned") == VALUE
    assert call("beam_line", "fixed", 8.0, "pinned", blank) == VALUE
    assert call("load_line", blank, "udl", 12.0) == VALUE


def test_repeated_arguments_may_be_none_at_all_or_many() -> None:
    """No part is an error; 60 parts, as many as a worksheet function takes, are joined."""
    assert call("beam_line") == VALUE
    parts = ["pinned", *[1.5, "pinned"] * 29, 1.5, "free"][:60]
    parts = [*parts[:59], "free"] if isinstance(parts[58], float) else parts[:59]
    assert call("beam_line", *parts) == beam_line(*parts)
    assert call("beam_line", *map(cell, parts)) == beam_line(*parts)


# --- errors that come in --------------------------------------------------------------------------


@pytest.mark.parametrize("value", com.ERRORS)
@by_name
def test_an_error_value_is_handed_on_unchanged(entry: Entry, value: str) -> None:
    """An error in the first argument, typed, in a cell or in a range, is what the cell shows; `fault` names it."""
    arguments = ["udl 12", 1.0, 24000.0][: max(0, len(entry.arguments) - 1)]
    for first in (error(value), cell(error(value)), cells([["fixed", error(value)]])):
        got = call(entry.name, first, *arguments)
        if entry.name == "fault":
            assert value in got
        else:
            assert got == com.ERRORS[value]
            assert type(got) is int


@pytest.mark.parametrize("code", [2024, 2044, 2051, 2222, 40000])
def test_an_error_value_that_is_not_known_by_name_is_handed_on_too(code: int) -> None:
    """A later Excel's error comes back with its own number, whole and in an entry, and `fault` says the number."""
    assert call("reaction", cell(error(code)), "udl 12", 1.0) == code
    assert call("moment_at", "fixed 8 pinned", "udl 12", cells([[5.0, error(code)]])) == [54.0, code]
    assert f"#ERR{code}!" in call("fault", "fixed 8 pinned", error(code))


def test_numbers_around_the_band_of_errors_are_numbers() -> None:
    """Only ints are error values: a double of the same size is a number, and so are ints beside the band."""
    for number in (float(error("#REF!")), error(0) - 1, error(0xFFFF) + 1):
        assert call("reaction", "fixed 8 pinned", "udl 12", number) == NA
        assert call("fault", "fixed 8 pinned", "udl 12", 1.0, number) != ""
        assert "#" not in call("fault", "fixed 8 pinned", "udl 12", 1.0, number)


# --- what is no number ----------------------------------------------------------------------------


@pytest.mark.parametrize("content", [True, False, Date(45000.0), Date(45000.5)])
@pytest.mark.parametrize("position", [2, 3])
def test_dates_and_truth_values_are_refused(content: Content, position: int) -> None:
    """A date or TRUE is never a number: typed, in a cell, in an array and in a range."""
    arguments: list[object] = ["fixed 8 pinned", "udl 12", 1.0, 24000.0]
    typed = cell(content).Value
    for one in (typed, cell(content), cells([[content], [None]]), (typed,), ((typed,), (None,))):
        arguments[position] = one
        result = call("moment_at", *arguments)
        assert com.rows_of(result)[0][0] == VALUE


def test_in_a_range_only_the_date_fails() -> None:
    """Among numbers the entry of a date or a truth value is an error, and the others have their answers."""
    places_of = cells([[1.0, Date(2.0)], [True, 3.0]])
    expected = moment_at("fixed 8 pinned", "udl 12", [[1.0, 3.0]])
    assert call("moment_at", "fixed 8 pinned", "udl 12", places_of) == [
        [expected[0][0], VALUE],
        [VALUE, expected[0][1]],
    ]


# --- money ----------------------------------------------------------------------------------------

LONG = 3.123456789012345


def test_money_counts_with_all_its_digits() -> None:
    """A currency cell comes cut to four decimals; the number that stands in the cell is what counts."""
    assert float(cell(Money(LONG)).Value) != LONG  # type: ignore[arg-type]
    expected = moment_at("fixed 8 pinned", "udl 12", LONG)
    assert expected != moment_at("fixed 8 pinned", "udl 12", round(LONG, 4))
    assert call("moment_at", "fixed 8 pinned", "udl 12", cell(Money(LONG))) == expected
    assert call("beam_line", "fixed", cell(Money(LONG)), "pinned") == f"fixed {LONG!r} pinned"
    assert call("moment_at", "fixed 8 pinned", "udl 12", Decimal("3.1235")) == moment_at(
        "fixed 8 pinned", "udl 12", 3.1235
    )


def test_money_in_a_range_leaves_the_other_cells_as_they_are() -> None:
    """Texts, blanks, numbers, dates and errors beside money stay what they are: a date is no number even then."""
    beam = cells([["fixed", Money(LONG)], [None, "pinned"], [Money(-0.00004), "free"]])
    assert call("beam_line", cells([["fixed", Money(LONG), None, "pinned"]])) == f"fixed {LONG!r} pinned"
    assert call("beam_reads", beam) == NUM
    mixed = cells([[Money(LONG), Date(2.0), 1.0], [None, error("#REF!"), Money(1 / 3)]])
    [[first, second]] = moment_at("fixed 8 pinned", "udl 12", [[LONG, 1.0]])  # type: ignore[misc]
    third = moment_at("fixed 8 pinned", "udl 12", 1 / 3)
    assert call("moment_at", "fixed 8 pinned", "udl 12", mixed) == [
        [first, VALUE, second],
        [VALUE, com.ERRORS["#REF!"], third],
    ]


def test_a_number_of_lower_and_higher_rank_is_the_same_number() -> None:
    """VBA code may hand over whole numbers: they are taken as numbers, and the answer is a double all the same."""
    assert call("reaction", "fixed 8 pinned", "udl 12", 1) == 60.0
    assert type(call("reaction", "fixed 8 pinned", "udl 12", 1)) is float
    assert call("moment_at", "fixed 8 pinned", "udl 12", (0, 5)) == [-96.0, 54.0]
    assert call("beam_line", "fixed", 8, "pinned") == "fixed 8 pinned"


# --- references -----------------------------------------------------------------------------------


@by_name
def test_a_reference_of_several_areas_is_refused(entry: Entry, profile: Path) -> None:
    """`(A1:A2,C1)` is no rectangle: reading its first area alone would be a silent loss."""
    for position in range(len(entry.arguments)):
        arguments: list[object] = ["fixed 8 pinned", "udl 12", 1.0, 24000.0, "G", "lowest", None, None, None][
            : len(entry.arguments)
        ]
        arguments[position] = cells([["fixed"], [8.0], ["pinned"]], areas=2)
        shown = call(entry.name, *arguments)
        if entry.name == "fault" and position < 4:
            assert (
                shown
                == f"{entry.arguments[position].name}: a reference to 2 areas was given; give one rectangle of cells"
            )
        else:
            assert shown == VALUE
    assert entry.name == "fault" or "2 areas" in log()


def column(contents: dict[tuple[int, int], Content], first: int = 1, number: int = 1) -> Range:
    """A whole column of a sheet, or what lies below its row `first`."""
    return Range(Sheet(contents), first, number, com.SHEET_ROWS - first + 1, 1)


def test_a_whole_column_is_read_as_far_as_its_sheet_is_used() -> None:
    """`A:A` is read to the last row in use, every cell of it and in order, not a million blanks."""
    held: dict[tuple[int, int], Content] = {(1, 1): "fixed", (2, 1): 8.0, (4, 1): "pinned", (6, 2): "beside"}
    assert call("beam_line", column(held)) == "fixed 8 pinned"
    xs: dict[tuple[int, int], Content] = {(1, 1): 1.0, (2, 1): 2.5, (3, 1): 4.0}
    expected = moment_at("fixed 8 pinned", "udl 12", [[1.0], [2.5], [4.0]])
    assert call("moment_at", "fixed 8 pinned", "udl 12", column(xs)) == expected
    assert call("moment_at", "fixed 8 pinned", "udl 12", column(xs, first=2)) == expected[1:]  # type: ignore[index]
    money: dict[tuple[int, int], Content] = {(1, 1): "fixed", (2, 1): Money(LONG), (3, 1): "pinned"}
    assert call("beam_line", column(money)) == f"fixed {LONG!r} pinned"


def test_whole_columns_beside_each_other_keep_their_columns() -> None:
    """`A:C` is read in full width, also where the sheet's cells in use begin further down or to the right."""
    held: dict[tuple[int, int], Content] = {(3, 2): "fixed", (3, 3): 8.0, (5, 2): "pinned"}
    assert call("beam_line", Range(Sheet(held), 1, 1, com.SHEET_ROWS, 3)) == "fixed 8 pinned"


def test_a_whole_column_without_anything_is_blank() -> None:
    """Columns in which nothing stands, or nothing from a row on, are blank: an error for a beam, "not given" else."""
    nothing: dict[tuple[int, int], Content] = {}
    above: dict[tuple[int, int], Content] = {(1, 1): 24000.0}
    for blank in (column(nothing), column(above, first=5)):
        assert call("reaction", blank, "udl 12", 1.0) == VALUE
        assert call("reaction", "fixed 8 pinned", "udl 12", 1.0, blank) == 60.0


def test_long_ranges_within_the_sheet_are_read_whole() -> None:
    """Ten thousand rows and more are answered row by row, to the last."""
    xs = [[n / 2000] for n in range(12_000)]
    got = call("shear_at", "fixed 8 pinned", "udl 12", cells(xs, row=7, column=3))
    assert got == shear_at("fixed 8 pinned", "udl 12", xs)
    assert len(got) == 12_000


def test_cells_that_excel_does_not_let_read_are_an_error_value_with_its_reason(profile: Path) -> None:
    """Where reading a range fails, the cell shows #VALUE!, the log says which argument, and no exception leaves."""

    class Busy(Range):
        @property
        def Value(self) -> object:
            raise com.ComError("Excel is busy")

    held = Busy(Sheet(), 1, 1, 2, 1)
    assert call("moment_at", "fixed 8 pinned", "udl 12", held) == VALUE
    assert "x: these cells cannot be read (ComError: Excel is busy)" in log()
    assert "cannot be read" in call("fault", held, "udl 12")


# --- what must never leave ------------------------------------------------------------------------


@by_name
def test_an_unexpected_exception_is_an_error_value_and_is_logged(
    entry: Entry, profile: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Whatever goes wrong inside, the cell shows #VALUE!, never a text, and the log says what it was."""

    def fails(*_: object) -> float:
        raise RuntimeError(f"wires crossed in {entry.name}")

    monkeypatch.setitem(vars(entry), "function", fails)
    result = call(entry.name, "fixed 8 pinned")
    assert (type(result), result) == (int, VALUE)
    assert f"RuntimeError: wires crossed in {entry.name}" in log()


@pytest.mark.parametrize("result", [math.nan, math.inf, -math.inf, np.float64("nan"), 10**400, None, object()])
def test_what_is_no_finite_number_never_reaches_a_cell(result: object, monkeypatch: pytest.MonkeyPatch) -> None:
    """NaN and infinity would be a blank text or a number in Excel: they are error values, whole and in entries."""
    entry = catalogue()["reactions"]
    monkeypatch.setitem(vars(entry), "function", lambda *_: result)
    assert call("reactions", "beam", "loads") in (NUM, VALUE)
    monkeypatch.setitem(vars(entry), "function", lambda *_: [[1.0, result], [2.0, 3.0]])
    rows = call("reactions", "beam", "loads")
    assert rows in (VALUE, [[1.0, NUM], [2.0, 3.0]])
    assert type(rows) is int or type(rows[0][1]) is int


@pytest.mark.parametrize("result", [60, np.float64(60), np.int64(60), np.float32(60)])
def test_every_number_reaches_the_cell_as_a_double(result: object, monkeypatch: pytest.MonkeyPatch) -> None:
    """A whole number that came back as an int would be shown as an error value: it is made a double."""
    entry = catalogue()["reaction"]
    monkeypatch.setitem(vars(entry), "function", lambda *_: result)
    got = call("reaction", "beam", "loads", 1.0)
    assert (type(got), got) == (float, 60.0)
    monkeypatch.setitem(vars(entry), "function", lambda *_: [[result, result]])
    assert [type(one) for one in call("reaction", "beam", "loads", 1.0)] == [float, float]


SCALARS = st.one_of(
    st.none(),
    st.booleans(),
    st.integers(),
    st.floats(),
    st.integers(0, 0xFFFF).map(error),
    st.sampled_from(
        [MISSING, "", "fixed 8 pinned", "fixed", "udl 12", "G: point 4 at 1", "1.35 G", "moment max", "kN"]
    ),
    st.text(max_size=12),
    st.decimals(allow_nan=False, allow_infinity=False, places=4),
    st.just(com.Moment(2026, 1, 2, tzinfo=UTC)),
    st.builds(object),
)
GRIDS = st.tuples(st.integers(1, 3), st.integers(1, 3)).flatmap(
    lambda size: st.lists(st.lists(SCALARS, min_size=size[1], max_size=size[1]), min_size=size[0], max_size=size[0])
)
HANDED_OVER = st.one_of(
    SCALARS, SCALARS.map(cell), GRIDS.map(cells), GRIDS.map(lambda rows: tuple(map(tuple, rows))), GRIDS.map(tuple)
)


@settings(max_examples=400, deadline=None, derandomize=True)
@given(entry=st.sampled_from(ENTRIES), arguments=st.lists(HANDED_OVER, max_size=6))
def test_whatever_is_handed_over_only_values_for_cells_come_back(entry: Entry, arguments: list[object]) -> None:
    """Any number of any values, in any shape: what comes back is doubles, texts and codes of error values."""
    rows = com.rows_of(call(entry.name, *arguments))
    assert len({len(line) for line in rows}) == 1
    for one in (one for line in rows for one in line):
        assert type(one) in (float, str, int)
        assert not isinstance(one, int) or 0 <= one <= 0xFFFF
        assert not isinstance(one, float) or math.isfinite(one)


def test_an_error_of_an_unknown_kind_in_an_answer_is_an_error_value(monkeypatch: pytest.MonkeyPatch) -> None:
    """An error whose text is no error value of Excel's is still an error value: #VALUE!."""
    entry = catalogue()["reaction"]
    monkeypatch.setitem(vars(entry), "function", lambda *_: [[BeamError("#ODD!", "odd"), 1.0]])
    assert call("reaction", "beam", "loads", 1.0) == [VALUE, 1.0]


# --- the log --------------------------------------------------------------------------------------


def test_each_failure_is_logged_with_its_reason_where_the_diagnosis_says(profile: Path) -> None:
    """The log lies in the profile, is made when it is needed, and holds value, reason and call of a failure."""
    assert call("reaction", "fixed 8 pinned", "udl 12", 1.0) == 60.0
    assert not places().log.exists()
    assert call("reaction", "fixed 8 pinned", "udl 12", 4.0) == NA
    assert profile in places().log.parents
    [line] = log().splitlines()
    with pytest.raises(BeamError) as raised:
        reaction("fixed 8 pinned", "udl 12", 4.0)
    assert f"#N/A {raised.value.reason}" in line
    assert "reaction('fixed 8 pinned', 'udl 12', 4.0" in line


def test_failing_entries_of_an_array_are_logged_one_by_one(profile: Path) -> None:
    """Each entry in error has its own line with its own reason; those that are answered have none."""
    assert call("moment_at", "fixed 8 pinned", "udl 12", cells([[1.0, "one"], [None, 9.0]])) == [
        [moment_at("fixed 8 pinned", "udl 12", 1.0), VALUE],
        [VALUE, NA],
    ]
    lines = log().splitlines()
    assert len(lines) == 3
    assert "row 1, column 2" in lines[0]
    assert "row 2, column 1" in lines[1]
    assert "#N/A" in lines[2]


def test_a_failure_is_logged_once_however_often_it_is_recalculated(profile: Path) -> None:
    """A sheet that recalculates does not fill the disk with the same line."""
    for _ in range(5):
        call("reaction", "fixed 8 pinned", "udl 12", 4.0)
    call("reaction", "fixed 8 pinned", "udl 12", 5.0)
    assert len(log().splitlines()) == 2


def test_texts_of_any_language_and_length_are_logged_in_one_line(profile: Path) -> None:
    """Line breaks and letters of any script in a cell neither break the log nor the answer."""
    assert call("reaction", "fixed 8\npinned \u2013 Träger \U0001f6a7" * 500, "udl 12", 1.0) == VALUE
    [line] = log().splitlines()
    assert len(line) < 1000


def blocked_by_a_file(local: Path) -> None:
    """A file stands where the folder should be."""
    local.write_text("")


def log_is_a_folder(local: Path) -> None:
    """A folder stands where the log should be."""
    places().log.mkdir(parents=True)


def disk_is_full(local: Path) -> None:
    """Nothing can be written to the log."""
    places().log.parent.mkdir(parents=True)
    places().log.symlink_to("/dev/full")


@pytest.mark.parametrize("broken", [blocked_by_a_file, log_is_a_folder, disk_is_full])
def test_a_log_that_cannot_be_written_does_no_harm(profile: Path, broken: Callable[[Path], None]) -> None:
    """Answers and errors are the same when the log's folder cannot be made or the log cannot be written."""
    if broken is disk_is_full and not Path("/dev/full").exists():
        pytest.skip("no /dev/full here")
    broken(profile)
    for support in (4.0, 5.0):
        assert call("reaction", "fixed 8 pinned", "udl 12", support) == NA
    assert call("reaction", "fixed 8 pinned", "udl 12", 1.0) == 60.0
    assert not places().log.is_file()


# --- the module as xlwings sees it ----------------------------------------------------------------


def exported(module: ModuleType) -> dict[str, dict[str, Any]]:
    """What a module holds for xlwings, by the attribute under which it stands."""
    found = ((name, getattr(held, "__xlfunc__", None)) for name, held in vars(module).items())
    return {name: said for name, said in found if said is not None}


def test_the_import_of_functions_that_xlwings_brings_along_finds_none(served: ModuleType) -> None:
    """VBA that xlwings writes itself would show the code of an error as a number: it must write no function of ours."""
    text = io.StringIO()
    sys.modules["xlwings.udfs"].generate_vba_wrapper(com.SERVED, served, text, SimpleNamespace(Name="Book.xlsm"))
    assert text.getvalue() == ""
    assert call("reaction", "fixed 8 pinned", "udl 12", 1.0) == 60.0


def test_the_module_exports_exactly_the_catalogue(served: ModuleType) -> None:
    """Every function once, under its own name, with the arguments, help and category of the catalogue."""
    found = exported(served)
    assert sorted(found) == sorted(catalogue())
    for name, said in found.items():
        entry = catalogue()[name]
        assert (said["name"], said["category"], said["sub"]) == (name, entry.category, False)
        assert (said["async_mode"], said["volatile"], said["ret"]["doc"]) == (None, False, entry.summary)
        assert [(a["name"], "optional" in a, a["vararg"], a["doc"]) for a in said["args"]] == [
            (a.name, a.optional, a.repeats, a.help) for a in entry.arguments
        ]
        assert all(a["vba"] is None and a.get("optional") is None for a in said["args"])


def test_nothing_else_imports_xlwings(served: ModuleType) -> None:
    """xlwings is imported by the one module, so that other hosts and the command line never load it."""
    package = Path(beamfuncs.__file__ or "").parent
    importing = [path for path in package.rglob("*.py") if "xlwings" in imported(path)]
    assert importing == [Path(served.__file__ or "")]


def imported(path: Path) -> set[str]:
    """The packages that a module imports, anywhere in it."""
    nodes = list(ast.walk(ast.parse(path.read_text(encoding="utf-8"))))
    plain = {name.name for node in nodes if isinstance(node, ast.Import) for name in node.names}
    return {name.partition(".")[0] for name in plain} | {
        (node.module or "").partition(".")[0] for node in nodes if isinstance(node, ast.ImportFrom)
    }


def test_the_module_works_after_xlwings_has_loaded_it_again(profile: Path) -> None:
    """When its file has changed, xlwings reloads the module within the process: all functions are still there."""
    assert call("reaction", "fixed 8 pinned", "udl 12", 1.0) == 60.0
    udfs = importlib.import_module("xlwings.udfs")
    old = sys.modules[com.SERVED]
    before = exported(old)
    known = udfs.udf_modules[com.SERVED]
    known.update(filename=old.__file__, filetime=0.0)
    assert call("reaction", "fixed 8 pinned", cell("udl 12"), cell(2)) == 36.0
    assert known["filetime"] > 0
    after = exported(known["module"])
    assert sorted(after) == sorted(before)
    assert all(after[name] is not before[name] for name in after)
    assert call("reaction", "fixed 8 pinned", "udl 12", 4.0) == NA
    assert call("moment_at", "fixed 8 pinned", "udl 12", cells([[5.0, Date(1.0)]])) == [54.0, VALUE]
    assert len(log().splitlines()) == 2


# --- the harness itself ---------------------------------------------------------------------------


def test_the_server_is_xlwings_own(served: ModuleType) -> None:
    """The server and the decorators under test are those of the installed xlwings, not stand-ins."""
    import xlwings

    folder = Path(xlwings.__file__).parent
    for name in ("com_server", "udfs", "_xlwindows"):
        assert Path(sys.modules[f"xlwings.{name}"].__file__ or "") == folder / f"{name}.py"
    assert xlwings.func is sys.modules["xlwings.udfs"].xlfunc  # type: ignore[comparison-overlap]


def test_nothing_is_left_behind() -> None:
    """After the harness is put away, modules, `ctypes`, the platform and the log are as they were before."""
    script = """
import ctypes, logging, sys, xlwings, com
import beamfuncs.hosts
before = {name: module for name, module in sys.modules.items() if com._ours(name)}
with com.installed():
    assert com.call("reaction", "fixed 8 pinned", com.cell("udl 12"), 4) == 2042
    assert "pythoncom" in sys.modules and sys.modules["xlwings"] is not xlwings
after = {name: module for name, module in sys.modules.items() if com._ours(name)}
assert after == before and all(after[name] is before[name] for name in before)
assert not hasattr(ctypes, "windll") and not hasattr(beamfuncs.hosts, "excel")
assert not logging.getLogger(com.SERVED).handlers
com.install()
print(com.call("reaction", "fixed 8 pinned", "udl 12", 1.0), sys.platform)
"""
    run = subprocess.run(
        [sys.executable, "-c", script], cwd=Path(__file__).parent, capture_output=True, text=True, check=False
    )
    assert (run.stdout.split(), run.stderr) == (["60.0", sys.platform], "")


def test_a_range_resized_as_a_call_is_one_cell() -> None:
    """As pywin32 reads it, `Resize(2, 1)` is the cell in row 2; sizes go to `GetResize`."""
    three = cells([[1.0], [2.0], [3.0]])
    assert three.Resize(2, 1).Value == 2.0
    assert three.GetResize(2, 1).Value == ((1.0,), (2.0,))
    assert three.Worksheet.Range(three(1), three(2)).Value == ((1.0,), (2.0,))


def test_money_and_dates_come_as_excel_gives_them() -> None:
    """`Value` cuts money to four decimals and makes dates moments; `Value2` gives the numbers in the cells."""
    row = cells([[Money(LONG), Date(45000.25)]])
    [[amount, moment]] = row.Value  # type: ignore[misc]
    assert str(amount) == "3.1235"
    assert moment.isoformat() == "2023-03-15T06:00:00+00:00"
    assert row.Value2 == ((LONG, 45000.25),)


def test_the_log_of_the_module_is_its_own(profile: Path) -> None:
    """Failing cells are no business of a log that another program set up for itself."""
    assert call("reaction", "fixed 8 pinned", "udl 12", 7.0) == NA
    assert not logging.getLogger(com.SERVED).propagate
