"""The example design workbook: what its script builds, filled, against beams worked by hand."""

from __future__ import annotations

import subprocess
import sys
from collections import defaultdict
from collections.abc import Callable, Iterator
from dataclasses import replace
from math import ceil, sqrt
from pathlib import Path
from typing import Any

import pytest
from openpyxl import Workbook, load_workbook
from openpyxl.worksheet.formula import ArrayFormula
from openpyxl.worksheet.worksheet import Worksheet
from schedule_by_hand import FORMS, SUPPORTS, TABLED, Answer, Row, loading, worked

from beamfuncs.functions import beam_result, moment_at, reaction
from beamfuncs.hosts.headless import Report, fill

WORKBOOKS = Path(__file__).parents[1] / "workbooks"
SCRIPT, COMMITTED = WORKBOOKS / "kestrel_quay.py", WORKBOOKS / "kestrel_quay.xlsx"
STRENGTH, CHARACTERISTIC = (1.35, 1.5), (1.0, 1.0)
CLOSE = 1e-9
FILL = "import sys; from beamfuncs.cli import main; sys.exit(main())"

Change = Callable[[Workbook], None]


class Schedule:
    """The schedule of a filled workbook, read by its headings."""

    def __init__(self, book: Workbook) -> None:
        self.sheet: Worksheet = book["Schedule"]
        group = ""
        self.columns: dict[tuple[str, str], int] = {}
        for column in range(1, self.sheet.max_column + 1):
            group = self.sheet.cell(6, column).value or group
            self.columns[group, str(self.sheet.cell(7, column).value)] = column
        marks = ((row, self.sheet.cell(row, 1).value) for row in range(9, self.sheet.max_row + 1))
        self.rows = {str(mark): row for row, mark in marks if str(mark) in FORMS}

    def __getitem__(self, place: tuple[str, str]) -> Any:
        """Return the value in the row of a beam, under `heading` or `group | heading`."""
        return self.sheet.cell(*self.cell(*place)).value

    def cell(self, mark: str, heading: str) -> tuple[int, int]:
        group, _, head = heading.rpartition(" | ")
        (column,) = (n for (g, h), n in self.columns.items() if h == head and g.startswith(group))
        return self.rows[mark], column

    def inputs(self, mark: str) -> Row:
        heads = ("L1", "L2", "L3", "E", "I", "Line G", "Line Q", "Q from", "Q to")
        heads += ("Point G", "Point Q", "Point at x", "Other")
        return Row(*(float(self[mark, head] or 0.0) for head in heads))

    def reactions(self, mark: str, combination: str) -> list[float]:
        group = f"Reaction at support, {combination}"
        values = [self[mark, f"{group} | {n}"] for n in (1, 2, 3)]
        return [value for value in values if value != "–"]


@pytest.fixture(scope="module")
def built(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The workbook as the script builds it."""
    target = tmp_path_factory.mktemp("built") / "kestrel_quay.xlsx"
    subprocess.run([sys.executable, SCRIPT, target], check=True, capture_output=True)
    return target


@pytest.fixture(scope="module")
def filled(built: Path) -> tuple[Report, Workbook]:
    """The workbook filled: the report, and its values."""
    return refilled(built, built.with_name("filled.xlsx"))


@pytest.fixture(scope="module")
def schedule(filled: tuple[Report, Workbook]) -> Schedule:
    return Schedule(filled[1])


def refilled(source: Path, target: Path, change: Change | None = None) -> tuple[Report, Workbook]:
    """Fill a workbook, after a change of its cells where one is given."""
    if change:
        book = load_workbook(source)
        change(book)
        source = target.with_name(f"changed_{target.name}")
        book.save(source)
    report = fill(source, target)
    return report, load_workbook(target, data_only=True)


def values(sheet: Worksheet, first: str, row: int) -> Iterator[tuple[Any, ...]]:
    """Yield the rows of a table from `row` on, as long as the cell in its column `first` holds something."""
    column = sheet[f"{first}1"].column
    while sheet.cell(row, column).value is not None:
        yield tuple(cell.value for cell in sheet[row][column - 1 :])
        row += 1


def test_the_committed_workbook_is_what_the_script_builds(built: Path) -> None:
    """Every cell of the committed workbook, with its look, and every page set-up is as the script has it."""
    committed, fresh = load_workbook(COMMITTED), load_workbook(built)
    assert committed.sheetnames == fresh.sheetnames
    for name in fresh.sheetnames:
        here, there = committed[name], fresh[name]
        assert (here.dimensions, here.print_area) == (there.dimensions, there.print_area)
        for row in there.iter_rows():
            for cell in row:
                other = here[cell.coordinate]
                assert _content(other.value) == _content(cell.value), f"{name}!{cell.coordinate}"
                assert other.number_format == cell.number_format, f"{name}!{cell.coordinate}"
                assert other.fill.fgColor.rgb == cell.fill.fgColor.rgb, f"{name}!{cell.coordinate}"


def _content(value: Any) -> Any:
    return (value.ref, value.text) if isinstance(value, ArrayFormula) else value


def test_the_script_builds_the_same_workbook_twice(built: Path, tmp_path: Path) -> None:
    """Two builds have the same sheets, byte for byte."""
    from zipfile import ZipFile

    again = tmp_path / "again.xlsx"
    subprocess.run([sys.executable, SCRIPT, again], check=True, capture_output=True)
    with ZipFile(built) as one, ZipFile(again) as other:
        parts = [name for name in one.namelist() if name.startswith("xl/")]
        assert parts == [name for name in other.namelist() if name.startswith("xl/")]
        assert all(one.read(name) == other.read(name) for name in parts)


def test_every_sheet_is_set_up_for_the_printer(built: Path) -> None:
    """Every sheet prints in landscape, one page wide, with numbered pages and a title block."""
    for sheet in load_workbook(built):
        assert sheet.print_area
        assert sheet.page_setup.orientation == "landscape"
        assert sheet.page_setup.fitToWidth == 1
        assert sheet.sheet_properties.pageSetUpPr.fitToPage
        assert sheet.oddFooter.right.text == "Page &P of &N"
        assert sheet["A1"].value == "Kestrel Quay boat store"


def test_no_cell_is_in_error(filled: tuple[Report, Workbook]) -> None:
    """Filling answers every formula: none in error, every beam's fault blank."""
    report, book = filled
    assert report.errors == []
    assert report.beam_cells > 400
    schedule = Schedule(book)
    assert len(schedule.rows) == len(FORMS) == 18
    assert all(not schedule[mark, "Fault (blank: none)"] for mark in schedule.rows)
    assert (schedule.sheet["V3"].value, schedule.sheet["V4"].value) == (0, 0)


@pytest.mark.parametrize("mark", FORMS)
def test_reactions_follow_from_the_closed_form(schedule: Schedule, mark: str) -> None:
    """Reactions at both combinations equal the closed form, and would not if a length were 0.1% longer."""
    row = schedule.inputs(mark)
    for name, factors in (("strength", STRENGTH), ("characteristic", CHARACTERISTIC)):
        read = schedule.reactions(mark, name)
        assert read == pytest.approx(worked(mark, row, *factors).reactions, rel=CLOSE)
        at = row.at * 1.001 if mark == "B11" else row.at
        longer = worked(mark, replace(row, L1=row.L1 * 1.001, at=at), *factors)
        assert read != pytest.approx(longer.reactions, rel=CLOSE)


@pytest.mark.parametrize("mark", FORMS)
def test_moments_and_shears_follow_by_statics(schedule: Schedule, mark: str) -> None:
    """The extremes of moment and shear at strength are those of the statics of the closed form."""
    answer = worked(mark, schedule.inputs(mark), *STRENGTH)
    scale = max(answer.moment_max, -answer.moment_min)
    assert schedule[mark, "M max"] == pytest.approx(answer.moment_max, abs=CLOSE * scale)
    assert schedule[mark, "M min"] == pytest.approx(answer.moment_min, abs=CLOSE * scale)
    assert schedule[mark, "|V| max"] == pytest.approx(answer.shear, rel=CLOSE)


@pytest.mark.parametrize("mark", FORMS)
def test_deflections_follow_by_integrating_the_moment(schedule: Schedule, mark: str) -> None:
    """The largest deflection is that of the moment integrated twice; ratio and check follow from it."""
    row = schedule.inputs(mark)
    answer = worked(mark, row, *CHARACTERISTIC)
    assert schedule[mark, "δ max"] == pytest.approx(1000 * answer.deflection, rel=CLOSE)
    if mark in TABLED:
        tabled = TABLED[mark](row, loading(mark, row, *CHARACTERISTIC))
        assert answer.deflection == pytest.approx(tabled, rel=CLOSE)
    ratio = round(schedule[mark, "Deflection | L"] / answer.deflection)
    assert schedule[mark, "L/δ"] == ratio
    limit = schedule[mark, "Limit"]
    assert schedule[mark, "Check"] == ("OK" if ratio >= limit else "CHECK")


@pytest.mark.parametrize("mark", FORMS)
def test_every_beam_is_in_equilibrium(schedule: Schedule, filled: tuple[Report, Workbook], mark: str) -> None:
    """Reactions balance the loads, upward and in moment about the left end, and the sheet says so."""
    row = schedule.inputs(mark)
    load = loading(mark, row, *CHARACTERISTIC)
    reactions = schedule.reactions(mark, "characteristic")
    fixing = [each[8] for each in values(filled[1]["Foundations"], "A", 7) if each[0] == mark]
    at = [row.nodes[node] for node in SUPPORTS[mark]]
    turning = sum(each.total * each.centre for each in load.spreads)
    turning += sum(each.size * each.x for each in load.forces) + sum(c.size for c in load.couples)
    held = sum(R * x for R, x in zip(reactions, at, strict=True)) - sum(fixing)
    assert sum(reactions) == pytest.approx(load.total, rel=CLOSE)
    assert held == pytest.approx(turning, rel=CLOSE)
    assert schedule[mark, "ΣR less load"] == 0


RUNWAY = "free 1.2 pinned 6 pinned 1.5 hinge 4.5 pinned 5.4 fixed"
RUNWAY_LOADS = (
    "G: udl 3.2; Q: udl 6.5 from 7.2 to 13.2; Q: varying 0 to 9 from 13.2 to 18.6; "
    "Q: point 45 at 4.2; Q: point 12 at 0; G: couple 10 at 15.2; G: settle 0.004 at support 3"
)
RUNWAY_STIFFNESS = "64000 64000 64000 48000 48000"


def test_the_beam_in_depth_is_the_one_laid_out(filled: tuple[Report, Workbook]) -> None:
    """Cells and load table are read as the line of text that says the same: arrays, phrases, stations."""
    sheet = filled[1]["Runway"]
    asked = (RUNWAY, RUNWAY_LOADS)
    for row in values(sheet, "K", 13):
        support, _, strength, *_ = row
        if not isinstance(support, (int, float)):
            break
        told = reaction(*asked, support, RUNWAY_STIFFNESS, "1.35 G + 1.5 Q")
        assert strength == pytest.approx(told, rel=CLOSE)
    assert support == "Sum of reactions"
    phrases = [(row[0], row[2], row[3]) for row in values(sheet, "G", 25)]
    assert len(phrases) == 12
    for phrase, strength, characteristic in phrases:
        for value, combination in ((strength, "1.35 G + 1.5 Q"), (characteristic, "G + Q")):
            told = beam_result(*asked, phrase, RUNWAY_STIFFNESS, combination)
            assert value == pytest.approx(told, rel=CLOSE), phrase
    stations = [row[:5] for row in values(sheet, "A", 27)]
    assert len(stations) == 32
    assert stations[-1][0] == pytest.approx(18.6)
    for x, _, moment, deflection, in_mm in stations:
        told = moment_at(*asked, x, RUNWAY_STIFFNESS, "1.35 G + 1.5 Q")
        assert moment == pytest.approx(told, abs=1e-9)
        assert in_mm == 1000 * deflection


def test_the_beam_in_depth_is_in_equilibrium(filled: tuple[Report, Workbook]) -> None:
    """Its moments at the stations follow by statics from its reactions and from the loads of its table."""
    sheet = filled[1]["Runway"]
    rows = [row for row in values(sheet, "K", 13) if isinstance(row[0], (int, float))]
    supports = [(row[1], row[2]) for row in rows]
    w, q, P, tip, C = 1.35 * 3.2, 1.5 * 6.5, 1.5 * 45, 1.5 * 12, 1.35 * 10
    assert sum(R for _, R in supports) == pytest.approx(w * 18.6 + q * 6 + 1.5 * 9 * 5.4 / 2 + P + tip, rel=CLOSE)

    def moment(x: float) -> float:
        def over(start: float) -> float:
            return max(x - start, 0.0)

        M = sum(R * over(at) for at, R in supports) - tip * x - P * over(4.2) - w * x**2 / 2
        M -= q * (over(7.2) ** 2 - over(13.2) ** 2) / 2 + 1.5 * 9 / 5.4 * over(13.2) ** 3 / 6
        return M + (C if x >= 15.2 else 0.0)

    for row in values(sheet, "A", 27):
        assert row[2] == pytest.approx(moment(row[0]), abs=1e-8)
    assert rows[-1][3] == pytest.approx(-moment(18.6), rel=CLOSE)
    assert moment(8.7) == pytest.approx(0.0, abs=1e-8)


def test_totals_by_support_mark_are_the_sums_of_the_reactions(
    schedule: Schedule, filled: tuple[Report, Workbook]
) -> None:
    """G and Q apart: each pad carries what the beams that bear on it carry in closed form."""
    sheet = filled[1]["Foundations"]
    carried: dict[str, list[float]] = defaultdict(lambda: [0.0, 0.0])
    for mark in FORMS:
        row = schedule.inputs(mark)
        pads = [schedule[mark, f"Pad at support | {n}"] for n in (1, 2, 3)]
        for case, factors in enumerate(((1.0, 0.0), (0.0, 1.0))):
            reactions = worked(mark, row, *factors).reactions
            for pad, R in zip(filter(None, pads), reactions, strict=True):
                carried[pad][case] += R
    for number, pad in enumerate(("P6", "P7", "P8", "P9"), 1):
        for case, name in enumerate(("1 G", "1 Q")):
            told = reaction(RUNWAY, RUNWAY_LOADS, number, RUNWAY_STIFFNESS, name)
            carried[pad][case] += told
    pads = {row[0]: row for row in values(sheet, "K", 7)}
    assert list(pads) == [f"P{n}" for n in range(1, 10)] + ["All"]
    for pad, (G, Q) in carried.items():
        _, _, total_G, total_Q, both, _, _, pressure, depth, area, side, volume, *_ = pads[pad]
        assert (total_G, total_Q, both) == pytest.approx((G, Q, G + Q), rel=CLOSE)
        assert area == pytest.approx((G + Q) / (pressure - 24 * depth), rel=CLOSE)
        assert side == pytest.approx(ceil(sqrt(area) * 10) / 10)
        assert volume == pytest.approx(side**2 * depth, rel=CLOSE)
    everything = [sum(each[case] for each in carried.values()) for case in (0, 1)]
    assert pads["All"][2:4] == pytest.approx(everything, rel=CLOSE)


def test_nothing_is_lost_between_loads_and_pads(schedule: Schedule, filled: tuple[Report, Workbook]) -> None:
    """The proof on the sheet compares the pads with the loads of the inputs, and the difference is 0."""
    applied = [
        sum(loading(mark, schedule.inputs(mark), *case).total for mark in FORMS) for case in ((1.0, 0.0), (0.0, 1.0))
    ]
    applied[0] += 3.2 * 18.6
    applied[1] += 6.5 * 6 + 9 * 5.4 / 2 + 45 + 12
    proof = {row[0]: row[6:8] for row in values(filled[1]["Foundations"], "K", 20)}
    for line in ("Loads on all beams", "Reactions of all bearings", "Totals of all pads"):
        assert proof[line] == pytest.approx(applied, rel=CLOSE)
    assert proof["Pads less loads"] == (0, 0)


def test_the_sentences_say_what_was_read(filled: tuple[Report, Workbook]) -> None:
    """A sentence for each beam and its loads, with the length and the total load beside it."""
    rows = list(values(filled[1]["As understood"], "A", 7))
    assert [row[0] for row in rows] == [f"B{n}" for n in range(1, 20)]
    for row in rows:
        assert row[1].startswith(f"Beam of length {row[3]:g}:")
        assert "downward" in row[2]


def test_a_changed_span_changes_its_beam_and_the_pads_below(
    built: Path, filled: tuple[Report, Workbook], tmp_path: Path
) -> None:
    """A longer B1 refilled has the closed-form results of the new span, fails its check, loads its pads."""

    def lengthen(book: Workbook) -> None:
        book["Schedule"]["C9"] = 6.5

    report, book = refilled(built, tmp_path / "longer.xlsx", lengthen)
    assert report.errors == []
    schedule = Schedule(book)
    row = schedule.inputs("B1")
    assert row.L1 == 6.5
    answer: Answer = worked("B1", row, *CHARACTERISTIC)
    assert schedule.reactions("B1", "characteristic") == pytest.approx(answer.reactions, rel=CLOSE)
    assert schedule["B1", "δ max"] == pytest.approx(1000 * answer.deflection, rel=CLOSE)
    assert schedule["B1", "Check"] == "CHECK"
    assert schedule.sheet["V3"].value == 1
    before = {each[0]: each[4] for each in values(filled[1]["Foundations"], "K", 7)}
    after = {each[0]: each[4] for each in values(book["Foundations"], "K", 7)}
    grown = {pad: after[pad] - before[pad] for pad in before}
    more = (2.1 + 4.0) * (6.5 - 5.4)
    assert grown == pytest.approx(dict.fromkeys(before, 0.0) | {"P1": more / 2, "P2": more / 2, "All": more}, abs=1e-9)


@pytest.fixture(scope="module")
def spoilt(built: Path) -> tuple[Report, Workbook]:
    """The workbook with a decimal comma in the beam line of B1, filled."""
    return refilled(built, built.with_name("spoilt.xlsx"), spoil)


def spoil(book: Workbook) -> None:
    book["Schedule"]["U9"] = "fixed 6,5 pinned"


def test_a_line_that_cannot_be_read_is_an_error_with_its_reason(
    spoilt: tuple[Report, Workbook],
) -> None:
    """`#VALUE!` all along its row, the reason beside it and in the report; the other beams stand."""
    report, book = spoilt
    schedule = Schedule(book)
    heads = ("M max", "M min", "|V| max", "δ max", "L/δ", "Check", "ΣR less load")
    assert {schedule["B1", head] for head in heads} == {"#VALUE!"}
    assert "6,5" in schedule["B1", "Fault (blank: none)"]
    assert schedule.sheet["V4"].value == 1
    assert schedule["B3", "Check"] == "OK"
    told = {(fault.sheet, fault.cell): fault for fault in report.errors}
    fault = told["Schedule", "W9"]
    assert fault.value == "#VALUE!"
    assert "decimals with a point" in fault.reason


def test_a_pad_is_in_error_when_a_beam_that_bears_on_it_is(spoilt: tuple[Report, Workbook]) -> None:
    """The totals under B1 are errors, not sums without it; the proof fails; a pad apart keeps its sum."""
    sheet = spoilt[1]["Foundations"]
    pads = {row[0]: row for row in values(sheet, "K", 7)}
    for mark in ("P1", "P2"):
        assert pads[mark][2:6] == ("#VALUE!",) * 4
        assert pads[mark][9:12] == ("#VALUE!",) * 3
    assert isinstance(pads["P4"][2], float)
    assert pads["All"][2] == "#VALUE!"
    proof = {row[0]: row[6:8] for row in values(sheet, "K", 20)}
    assert proof["Pads less loads"] == ("#VALUE!",) * 2


def test_the_command_line_ends_with_1_when_a_cell_is_in_error(built: Path, tmp_path: Path) -> None:
    """`beamfuncs fill` ends with 0 on the workbook as built, with 1 and the cell listed when it is spoilt."""
    spoilt, target = tmp_path / "spoilt.xlsx", tmp_path / "out.xlsx"
    book = load_workbook(built)
    spoil(book)
    book.save(spoilt)
    for source, status in ((built, 0), (spoilt, 1)):
        command = [sys.executable, "-c", FILL, "fill", str(source), "-o", str(target)]
        done = subprocess.run(command, capture_output=True, text=True, check=False)
        assert done.returncode == status, done.stderr
        assert ("6,5" in done.stdout + done.stderr) == (status == 1)
