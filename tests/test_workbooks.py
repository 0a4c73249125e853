"""The example design workbook: what its script builds, filled, against beams worked by hand."""

from __future__ import annotations

import subprocess
import sys
from collections.abc import Callable, Iterator, Sequence
from dataclasses import replace
from itertools import pairwise
from math import ceil, sqrt
from pathlib import Path
from typing import Any
from zipfile import ZipFile

import pytest
from openpyxl import Workbook, load_workbook
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.formula import ArrayFormula
from openpyxl.worksheet.worksheet import Worksheet
from schedule_by_hand import FORMS, SUPPORTS, TABLED, Answer, Row, loading, worked

from beamfuncs.functions import beam_result, diagram, reaction, reaction_moment
from beamfuncs.hosts.headless.filling import Report, fill

WORKBOOKS = Path(__file__).parents[1] / "workbooks"
SCRIPT, COMMITTED = WORKBOOKS / "kestrel_quay.py", WORKBOOKS / "kestrel_quay.xlsx"
STRENGTH, CHARACTERISTIC = (1.35, 1.5, 1.0, 1.0), (1.0, 1.0, 1.0, 1.0)
CASES = {"G": (1, 0, 0, 0), "Q": (0, 1, 0, 0), "S": (0, 0, 1, 0), "T": (0, 0, 0, 1)}
PADS = tuple(f"P{n}" for n in range(1, 11))
PROOF = 43
"""The row of the first line of the proof on sheet Foundations."""
STRENGTH_TEXT, CHARACTERISTIC_TEXT = "1.35 G + 1.5 Q + S + T", "G + Q + S + T"
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


def refilled(
    source: Path, target: Path, change: Change | None = None, leave: Sequence[str] = ("Actions",)
) -> tuple[Report, Workbook]:
    """Fill a workbook; where a change of its cells is given, after it, and without the sheets it cannot reach."""
    if change:
        book = load_workbook(source)
        change(book)
        for name in leave:
            del book[name]
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


def attention(book: Workbook) -> tuple[Any, Any]:
    """Return the numbers of deflections not met and of beams with a fault."""
    return book["Schedule"]["V4"].value, book["Schedule"]["AA4"].value


def proof(book: Workbook) -> dict[str, tuple[Any, ...]]:
    """Return the lines of the proof: the values under G, Q, S, T and all loads, or the one value of a check."""
    lines = {row[0]: row[5:10] for row in values(book["Foundations"], "N", PROOF)}
    return {label: line if line[0] is not None else line[-1:] for label, line in lines.items()}


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


def test_the_sheet_of_design_actions_stands_by_itself(built: Path) -> None:
    """No formula of it reads another sheet, and none of another sheet reads it."""
    for sheet in load_workbook(built):
        contents = [cell.value for row in sheet.iter_rows() for cell in row]
        formulas = [str(one.text if isinstance(one, ArrayFormula) else one) for one in contents]
        if sheet.title == "Actions":
            assert not [formula for formula in formulas if formula.startswith("=") and "!" in formula]
        assert not [formula for formula in formulas if "Actions!" in formula or "'Actions'" in formula]


def test_the_script_builds_the_same_workbook_twice(built: Path, tmp_path: Path) -> None:
    """Two builds have the same sheets, byte for byte."""
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
    assert attention(book) == (0, 0)


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
    ratio = schedule[mark, "Deflection | L"] / answer.deflection
    assert schedule[mark, "L/δ"] == pytest.approx(ratio, rel=CLOSE)
    limit = schedule[mark, "Limit"]
    assert schedule[mark, "Check"] == ("OK" if ratio >= limit else "CHECK")


@pytest.mark.parametrize("mark", FORMS)
def test_every_beam_is_in_equilibrium(schedule: Schedule, filled: tuple[Report, Workbook], mark: str) -> None:
    """Reactions balance the loads, upward and in moment about the left end, and the sheet says so."""
    row = schedule.inputs(mark)
    load = loading(mark, row, *CHARACTERISTIC)
    reactions = schedule.reactions(mark, "characteristic")
    line, loads, EI = (
        schedule[mark, f"What the functions read | {head}"] for head in ("Beam line", "Loads line", "EI")
    )
    fixing = [reaction_moment(line, loads, n, EI, "G + Q + S + T") for n in range(1, len(reactions) + 1)]
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
    "Q: point 45 at 4.2; Q: point 12 at 0; G: couple 10 at 15.2; S: settle 0.006 at support 3"
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
        told = reaction(*asked, support, RUNWAY_STIFFNESS, STRENGTH_TEXT)
        assert strength == pytest.approx(told, rel=CLOSE)
    assert support == "Sum of reactions"
    phrases = [(row[0], row[2], row[3]) for row in values(sheet, "G", 25)]
    assert len(phrases) == 12
    for phrase, strength, characteristic in phrases:
        for value, combination in ((strength, STRENGTH_TEXT), (characteristic, CHARACTERISTIC_TEXT)):
            told = beam_result(*asked, phrase, RUNWAY_STIFFNESS, combination)
            assert value == pytest.approx(told, rel=CLOSE), phrase


def test_the_stations_are_those_of_the_diagram(filled: tuple[Report, Workbook]) -> None:
    """Both sides of every jump; rows to spare repeat the right end, and their number is told."""
    sheet = filled[1]["Runway"]
    asked = (RUNWAY, RUNWAY_LOADS, 21, RUNWAY_STIFFNESS)
    stations = [row[:4] for row in values(sheet, "A", 26)]
    told = diagram(*asked, STRENGTH_TEXT)
    assert len(told) == sheet["E25"].value <= len(stations) == 38
    told += [told[-1]] * (len(stations) - len(told))
    assert [row[:3] for row in stations] == [pytest.approx(tuple(row[:3]), abs=1e-9) for row in told]
    sagged = {row[0]: row[4] for row in diagram(*asked, CHARACTERISTIC_TEXT)}
    for x, _, _, deflection in stations:
        assert deflection == pytest.approx(1000 * sagged[x], abs=1e-9)
    jumps = [x for (x, *_), (again, *_) in pairwise(stations[: len(diagram(*asked))]) if x == again]
    assert {1.2, 4.2, 7.2, 13.2, 15.2} <= {round(x, 9) for x in jumps}


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

    for row in values(sheet, "A", 26):
        if abs(row[0] - 15.2) > 1e-9:
            assert row[2] == pytest.approx(moment(row[0]), abs=1e-8)
    assert rows[-1][3] == pytest.approx(-moment(18.6), rel=CLOSE)
    assert moment(8.7) == pytest.approx(0.0, abs=1e-8)


def carried(schedule: Schedule) -> dict[str, dict[str, float]]:
    """What the beams bring to each pad in closed form: the reactions by case, and `M`, the fixing moments by size."""
    pads = {pad: dict.fromkeys((*CASES, "M"), 0.0) for pad in PADS}
    for mark in FORMS:
        row = schedule.inputs(mark)
        under = [pad for n in (1, 2, 3) if (pad := schedule[mark, f"Pad at support | {n}"])]
        for case, factors in CASES.items():
            answer = worked(mark, row, *factors)
            for pad, R, M in zip(under, answer.reactions, answer.moments, strict=True):
                pads[pad][case] += R
                pads[pad]["M"] += abs(M)
    for number, pad in enumerate(("P6", "P7", "P8", "P9"), 1):
        for case in CASES:
            asked = (RUNWAY, RUNWAY_LOADS, number, RUNWAY_STIFFNESS, f"1 {case}")
            pads[pad][case] += reaction(*asked)
            pads[pad]["M"] += abs(reaction_moment(*asked))
    return pads


def test_totals_by_support_mark_are_the_sums_of_the_reactions(
    schedule: Schedule, filled: tuple[Report, Workbook]
) -> None:
    """G, Q, S and T apart: each pad carries what the beams that bear on it carry in closed form."""
    told = {row[0]: row[2:11] for row in values(filled[1]["Foundations"], "N", 7)}
    assert tuple(told)[:11] == (*PADS, "All")
    for pad, loads in carried(schedule).items():
        G, Q, S, T, M = loads.values()
        assert told[pad][:4] == pytest.approx((G, Q, S, T), rel=CLOSE, abs=CLOSE)
        highest, lowest = G + Q + max(S, 0) + max(T, 0), G + min(Q, 0) + min(S, 0) + min(T, 0)
        assert told[pad][4:6] == pytest.approx((highest, lowest), rel=CLOSE)
        highest, lowest = 1.35 * G + 1.5 * Q + max(S, 0) + max(T, 0), G + min(S, 0) + min(T, 0)
        assert told[pad][6:8] == pytest.approx((highest, lowest), rel=CLOSE)
        assert told[pad][8] == pytest.approx(M, rel=CLOSE, abs=CLOSE)
    for n, case in enumerate(CASES):
        total = sum(loads[case] for loads in carried(schedule).values())
        assert told["All"][n] == pytest.approx(total, rel=CLOSE, abs=CLOSE)


def test_settlement_and_warming_show_by_themselves(schedule: Schedule, filled: tuple[Report, Workbook]) -> None:
    """S and T move load from pad to pad and add none; the pad that settles is let off, once for both its beams."""
    pads = carried(schedule)
    assert pads["P8"]["S"] < -10
    assert abs(pads["P5"]["T"]) > 1
    told = proof(filled[1])
    assert told["Totals of all pads"][2:4] == pytest.approx((0, 0), abs=CLOSE)
    settling = [row for row in values(filled[1]["Foundations"], "A", 7) if row[3] == "P8"]
    assert [row[0] for row in settling] == ["B9", "B19"]
    assert filled[1]["Runway"]["B19"].value == schedule["B9", "Other"] / 1000


def sizes(book: Workbook) -> dict[str, tuple[Any, ...]]:
    """Return the table of sizes: pressure, depth, e, area, side, concrete and remark of each pad."""
    return {row[0]: (row[1], *row[3:9]) for row in values(book["Foundations"], "N", 25) if row[0] in PADS}


def test_a_pad_has_a_size_only_where_its_moment_is_small(
    schedule: Schedule, filled: tuple[Report, Workbook], built: Path, tmp_path: Path
) -> None:
    """Side b from b (b - 2e) = area; no size but a word where e > b/6, and none of it in the sum."""

    def check(told: dict[str, tuple[Any, ...]], pads: dict[str, dict[str, float]]) -> set[str]:
        by_hand = set()
        for pad, loads in pads.items():
            pressure, depth, e, area, side, concrete, remark = told[pad]
            N = loads["G"] + loads["Q"] + max(loads["S"], 0) + max(loads["T"], 0)
            eccentric = loads["M"] / N
            assert (e, area) == pytest.approx((eccentric, N / (pressure - 24 * depth)), rel=CLOSE, abs=CLOSE)
            b = ceil((eccentric + sqrt(eccentric**2 + area)) * 10) / 10
            if eccentric > b / 6:
                assert (side, concrete, remark) == ("–", "–", "moment: design by hand")
                by_hand.add(pad)
            else:
                assert (side, concrete) == pytest.approx((b, b**2 * depth), rel=CLOSE)
                assert b * (b - 2 * eccentric) >= area > (b - 0.1) * (b - 0.1 - 2 * eccentric)
                assert not remark
        return by_hand

    assert check(sizes(filled[1]), carried(schedule)) == {"P5", "P9"}
    sheet = filled[1]["Foundations"]
    sized = [side_row[5] for side_row in sizes(filled[1]).values() if side_row[5] != "–"]
    assert sheet["U35"].value == pytest.approx(sum(sized), rel=CLOSE)
    assert sheet["V35"].value == "2 by hand, not in the sum"

    def move(book: Workbook) -> None:
        book["Schedule"]["Q12"] = "P4"  # the built-in end of B4 comes to a pad with a large load

    report, book = refilled(built, tmp_path / "moved.xlsx", move)
    assert report.errors == []
    pads = carried(Schedule(book))
    assert 0.1 < pads["P4"]["M"] / (pads["P4"]["G"] + pads["P4"]["Q"]) < 0.2
    assert "P4" not in check(sizes(book), pads)
    assert sizes(book)["P4"][4] > sizes(filled[1])["P4"][4]


def test_moments_of_opposite_sign_do_not_cancel_on_a_pad(
    schedule: Schedule, filled: tuple[Report, Workbook], built: Path, tmp_path: Path
) -> None:
    """With both built-in ends of B5, which turn against each other, on one pad: the sum of their sizes."""

    def join(book: Workbook) -> None:
        book["Schedule"]["Q13"] = "P10"
        book["Schedule"]["R13"] = "P10"

    book = refilled(built, tmp_path / "joined.xlsx", join)[1]
    moments = worked("B5", schedule.inputs("B5"), *CHARACTERISTIC).moments
    assert moments[0] < 0 < moments[1]
    told = {row[0]: row[10] for row in values(book["Foundations"], "N", 7)}
    assert told["P10"] == pytest.approx(moments[1] - moments[0], rel=CLOSE)


def test_nothing_is_lost_between_loads_and_pads(schedule: Schedule, filled: tuple[Report, Workbook]) -> None:
    """The proof on the sheet compares the pads with the loads of the inputs, and the difference is 0."""
    applied = [
        sum(loading(mark, schedule.inputs(mark), *factors).total for mark in FORMS) for factors in CASES.values()
    ]
    applied[0] += 3.2 * 18.6
    applied[1] += 6.5 * 6 + 9 * 5.4 / 2 + 45 + 12
    applied.append(sum(applied))
    told = proof(filled[1])
    for line in ("Loads on all beams", "Reactions of all bearings", "Totals of all pads"):
        assert told[line] == pytest.approx(applied, rel=CLOSE, abs=CLOSE)
    assert told["Pads less loads"] == (0,) * 5
    assert told["Strength: bearings less factors × totals of the pads [kN]"] == (0,)
    assert told["Bearings without a known pad"] == (0,)
    assert told["Bearings with a load in another case than G, Q, S, T"] == (0,)


def test_a_load_in_a_case_that_no_pad_sums_shows_in_the_proof(built: Path, tmp_path: Path) -> None:
    """A snow load on B1: its whole size is the difference, and both bearings are counted."""

    def snow(book: Workbook) -> None:
        book["Schedule"]["V9"] = book["Schedule"]["V9"].value + '&"; W: udl 3"'

    report, book = refilled(built, tmp_path / "snow.xlsx", snow)
    assert report.errors == []
    told = proof(book)
    assert told["Pads less loads"] == pytest.approx((0, 0, 0, 0, -3 * 5.4))
    assert told["Bearings with a load in another case than G, Q, S, T"] == (2,)
    assert [row[9] for row in values(book["Foundations"], "A", 7)][:3] == pytest.approx([8.1, 8.1, 0.0])
    assert _alarmed(book["Foundations"], "W46", "ABS(")


def test_a_couple_in_such_a_case_shows_too(built: Path, tmp_path: Path) -> None:
    """A couple adds no force, but its reactions stand in no column of a case: both bearings are counted."""

    def turn(book: Workbook) -> None:
        book["Schedule"]["V9"] = book["Schedule"]["V9"].value + '&"; W: couple 27 at 1"'

    told = proof(refilled(built, tmp_path / "turn.xlsx", turn)[1])
    assert told["Pads less loads"] == (0,) * 5
    assert told["Bearings with a load in another case than G, Q, S, T"] == (2,)


@pytest.mark.parametrize("pad", ["P77", None])
def test_a_bearing_without_a_known_pad_is_counted(built: Path, tmp_path: Path, pad: str | None) -> None:
    """A pad that is not in the table, or none: one bearing, and the load that it takes is missing below."""

    def misplace(book: Workbook) -> None:
        book["Schedule"]["Q9"] = pad

    told = proof(refilled(built, tmp_path / "misplaced.xlsx", misplace)[1])
    assert told["Bearings without a known pad"] == (1,)
    assert told["Pads less loads"][4] == pytest.approx(-6.1 * 5.4 / 2)


def _alarmed(sheet: Worksheet, cell: str, condition: str) -> bool:
    """Whether a rule with `condition` in it can colour `cell`."""
    return any(
        cell in area.sqref and any(condition in formula for formula in rule.formula)
        for area in sheet.conditional_formatting
        for rule in area.rules
    )


COMBINED = (
    ("1.35 G + 1.5 Q + S + T", "OK", (1.35, 1.5, 1, 1)),
    ("G+0.3Q+S+T", "OK", (1, 0.3, 1, 1)),
    ("1.35 G + 1.5 QK + S + T", "case?", (1.35, 0, 1, 1)),
    ("G + Q + S + T + W", "case?", (1, 1, 1, 1)),
    ("1.35 G + 1.5 Q", "OK", (1.35, 1.5, 0, 0)),
    (None, "blank", (1, 1, 1, 1)),
    ("  ", "blank", (1, 1, 1, 1)),
    ("1,35 G", "unreadable", ("#VALUE!",) * 4),
)


@pytest.mark.parametrize(("text", "check", "factors"), COMBINED)
def test_a_combination_shows_what_it_was_read_as(
    built: Path, tmp_path: Path, text: str | None, check: str, factors: tuple[Any, ...]
) -> None:
    """The factor of every case beside the text; blank, unreadable and unknown cases are told and coloured."""

    def combine(book: Workbook) -> None:
        book["Schedule"]["V2"] = text

    book = refilled(built, tmp_path / "combined.xlsx", combine)[1]
    sheet = book["Schedule"]
    assert sheet["AA2"].value == check
    assert tuple(sheet[f"{letter}2"].value for letter in "WXYZ") == pytest.approx(factors)
    assert sheet["AA3"].value == "OK"
    assert _alarmed(sheet, "AA2", '$AA2<>"OK"')
    assert _alarmed(sheet, "Z2", "W2=0")
    if check == "unreadable":
        assert attention(book) == (0, 18)


def test_only_cells_that_the_row_reads_look_like_inputs(built: Path) -> None:
    """An input of a row is named in its formulas, and open; the others are hatched, blank and refuse an entry."""
    sheet = load_workbook(built)["Schedule"]
    schedule = Schedule(load_workbook(built))
    rules = {str(rule.sqref): rule for rule in sheet.data_validations.dataValidation}
    (refused,) = [rule for rule in rules.values() if rule.formula1 == "FALSE"]
    looks = set()
    for mark, row in schedule.rows.items():
        formulas = " ".join(str(cell.value) for cell in sheet[row] if str(cell.value).startswith("="))
        supports = sum(1 for n in (1, 2, 3) if schedule[mark, f"Pad at support | {n}"])
        for column in range(3, 20):
            cell = sheet.cell(row, column)
            read = f"${cell.column_letter}{row}" in formulas or 0 <= column - 17 < supports
            if column == 16:
                read = f"$O{row}" in formulas
            hatched = cell.fill.patternType == "lightUp"
            assert hatched == (not read), cell.coordinate
            assert (cell.coordinate in refused.sqref) == hatched, cell.coordinate
            assert not (hatched and cell.value is not None), cell.coordinate
            looks.add(hatched)
    assert looks == {True, False}
    assert sheet["C4"].fill.patternType == "lightUp"
    assert sheet["D4"].value == "not used by this row"


def test_the_workbook_does_not_ask_to_be_computed_on_opening(built: Path) -> None:
    """A filled copy opened without the functions shows its stored values."""
    with ZipFile(built) as archive:
        assert b'fullCalcOnLoad="1"' not in archive.read("xl/workbook.xml")


def test_the_notes_of_the_pads_stand_in_the_part_that_is_shown(built: Path, tmp_path: Path) -> None:
    """`fill --show Pads` prints loads and the notes that qualify them, in no more than 140 columns."""
    command = [sys.executable, "-c", FILL, "fill", str(built), "-o", str(tmp_path / "out.xlsx"), "--show", "Pads"]
    told = subprocess.run(command, capture_output=True, text=True, check=True).stdout
    assert "P10" in told
    for note in ("without signs: an upper bound", "Verify before use"):
        assert note in " ".join(told.split())
    assert max(len(line.rstrip()) for line in told.splitlines() if "out.xlsx" not in line) <= 140
    assert "…" not in told


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
    assert attention(book) == (1, 0)
    before, after = ({each[0]: each[6] for each in values(b["Foundations"], "N", 7)} for b in (filled[1], book))
    grown = {pad: after[pad] - before[pad] for pad in (*PADS, "All")}
    more = (2.1 + 4.0) * (6.5 - 5.4)
    assert grown == pytest.approx(dict.fromkeys(grown, 0.0) | {"P1": more / 2, "P2": more / 2, "All": more}, abs=1e-9)


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
    assert attention(book) == (1, 1)
    assert schedule["B3", "Check"] == "OK"
    told = {(fault.sheet, fault.cell): fault for fault in report.errors}
    fault = told["Schedule", "W9"]
    assert fault.value == "#VALUE!"
    assert "decimals with a point" in fault.reason


def test_a_pad_is_in_error_when_a_beam_that_bears_on_it_is(spoilt: tuple[Report, Workbook]) -> None:
    """The totals under B1 are errors, not sums without it; the proof fails; a pad apart keeps its sum."""
    sheet = spoilt[1]["Foundations"]
    pads = {row[0]: row for row in values(sheet, "N", 7)}
    for mark in ("P1", "P2"):
        assert pads[mark][2:11] == ("#VALUE!",) * 9
        assert sizes(spoilt[1])[mark][2:] == ("#VALUE!",) * 5
    assert isinstance(pads["P4"][2], float)
    assert pads["All"][2] == "#VALUE!"
    told = proof(spoilt[1])
    assert told["Pads less loads"] == ("#VALUE!",) * 5
    assert told["Bearings with a load in another case than G, Q, S, T"] == (2,)
    assert _alarmed(sheet, "S46", "ISERROR")


def test_an_error_in_one_result_of_a_row_is_a_fault(built: Path, tmp_path: Path) -> None:
    """A spoilt cell of moments or of the check: the fault column says so, and both counts leave none out."""

    def spoil_a_result(book: Workbook) -> None:
        book["Schedule"]["AC10"] = "=1/0"
        book["Schedule"]["AI11"] = "=NA()"

    book = refilled(built, tmp_path / "result.xlsx", spoil_a_result)[1]
    schedule = Schedule(book)
    assert (schedule["B2", "M max"], schedule["B2", "Check"]) == ("#DIV/0!", "OK")
    assert schedule["B3", "Check"] == "#N/A"
    for mark in ("B2", "B3"):
        assert "error in the row" in schedule[mark, "Fault (blank: none)"]
    assert attention(book) == (1, 2)


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


@pytest.mark.parametrize(("limit", "check"), [(431, "OK"), (432, "CHECK")])
def test_the_check_compares_what_is_computed_not_what_is_shown(
    built: Path, tmp_path: Path, limit: int, check: str
) -> None:
    """B1 deflects by L/431.76, which shows as L/432: it meets L/431 and fails L/432."""
    letter = get_column_letter(
        next(cell.column for cell in load_workbook(built)["Schedule"][7] if cell.value == "Limit")
    )

    def tighten(book: Workbook) -> None:
        book["Schedule"][f"{letter}9"] = limit

    schedule = Schedule(refilled(built, tmp_path / "tight.xlsx", tighten)[1])
    assert schedule["B1", "Check"] == check
