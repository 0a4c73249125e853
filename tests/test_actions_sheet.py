"""The sheet of design actions, filled, against patterns tried one by one and a train moved in small steps."""

from __future__ import annotations

import re
import subprocess
import sys
from collections.abc import Callable, Iterator
from functools import cache
from itertools import product
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from openpyxl import Workbook, load_workbook
from openpyxl.worksheet.worksheet import Worksheet
from test_workbooks import SCRIPT, Change, refilled

from beamfuncs.functions import beam_result, moment_at, reaction
from beamfuncs.hosts.headless.filling import Report

BEAM, EI = "pinned 6.5 roller 8 roller 5.5 roller 1.8 free", 210 * 48_000 / 100
LENGTH, SUPPORTS = 21.8, (0.0, 6.5, 14.5, 20.0)
PARTS = ((0.0, 6.5), (6.5, 14.5), (14.5, 20.0), (20.0, 21.8))
G, Q = 6.5, 9.0
AXLES, OFFSETS = (60, 60, 45), (0.0, 1.6, 5.0)
FACTORS = ((0.0, 0.0), (1.5, 0.0), (1.5, 1.5 * 0.7), (0.0, 1.5), (1.5 * 1.0, 1.5))
"""The factors of Q and T in 6.10: none leads, Q leads alone and with T, T leads alone and with Q (storage)."""
STRENGTH = [(g, *factors) for g in (1.35, 1.0) for factors in FACTORS]
SERVICE = [(1.0, q, t) for q, t in ((0, 0), (1, 0), (1, 0.7), (0, 1), (1, 1))]

STEP = 0.02
"""The step of the train, 0.3% of a span; the distances of the axles are multiples of it."""
PLACES = np.linspace(0.0, LENGTH, round(LENGTH / STEP) + 1)
CLOSE = 1e-9
COARSE = 0.006
"""What may lie between two steps, as a part of the largest result of its kind."""

ROWS = (*range(15, 36), *range(37, 42))
"""The rows of the results by phrase."""
SERVICE_FROM = 37
STATIONS = range(47, 71)
PHRASES = tuple(
    dict.fromkeys(
        (
            *(f"reaction {n}" for n in (1, 2, 3, 4)),
            "shear at support 1",
            *(f"shear at support {n} {side}" for n in (2, 3, 4) for side in ("left", "right")),
            *(f"moment at support {n}" for n in (2, 3, 4)),
            "deflection at 21.8",
            *(f"moment at {x:.10g}" for x in np.linspace(0, 20, 81)),
            *(f"deflection at {x:.10g}" for x in np.linspace(0, 20, 81)),
        )
    )
)


@pytest.fixture(scope="module")
def built(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The workbook as the script builds it."""
    target = tmp_path_factory.mktemp("built") / "kestrel_quay.xlsx"
    subprocess.run([sys.executable, SCRIPT, target], check=True, capture_output=True)
    return target


@pytest.fixture(scope="module")
def filled(built: Path) -> tuple[Report, Worksheet]:
    """The workbook filled: the report, and the values of the sheet."""
    report, book = refilled(built, built.with_name("filled.xlsx"))
    return report, book["Actions"]


@pytest.fixture(scope="module")
def sheet(filled: tuple[Report, Worksheet]) -> Worksheet:
    return filled[1]


def changed(built: Path, target: Path, change: Change) -> tuple[Report, Worksheet]:
    """Fill the sheet alone, after a change of its cells."""

    def alone(book: Workbook) -> None:
        change(book)
        book.defined_names.clear()

    report, book = refilled(
        built, target, alone, [name for name in load_workbook(built).sheetnames if name != "Actions"]
    )
    return report, book["Actions"]


def rows_of(sheet: Worksheet, area: str) -> list[tuple[Any, ...]]:
    return [tuple(cell.value for cell in row) for row in sheet[area]]


# --- everything tried, by ordinary functions ------------------------------------------------------------


class Effects:
    """What G, each part of Q, and the train at each place do to the results named by phrases."""

    def __init__(self, beam: str, phrases: tuple[str, ...]) -> None:
        asked = [[phrase] for phrase in phrases]

        def under(loads: str) -> np.ndarray:
            return np.array(beam_result(beam, loads, asked, EI), float)[:, 0]

        self.number = {phrase: n for n, phrase in enumerate(phrases)}
        self.permanent = under(f"udl {G}")
        self.parts = np.array([under(f"udl {Q} from {start} to {end}") for start, end in PARTS])
        units = np.array([under(f"point 1 at {x:.10g}") for x in PLACES])
        self.trains = np.concatenate([_train(units, sign) for sign in (1, -1)])

    def extreme(self, phrase: str, factors: list[tuple[float, float, float]], sign: int) -> float:
        """Return the highest (`sign` 1) or lowest result over combinations, all 16 patterns, and all positions."""
        n = self.number[phrase]
        patterns = [sum(on * part[n] for on, part in zip(which, self.parts, strict=True)) for which in ON_OR_OFF]
        trains = np.append(self.trains[:, n], 0.0)
        every = (g * self.permanent[n] + q * pattern + t * trains for (g, q, t), pattern in product(factors, patterns))
        return sign * max(float((sign * one).max()) for one in every)


ON_OR_OFF = tuple(product((0, 1), repeat=len(PARTS)))


def _train(units: np.ndarray, sign: int) -> np.ndarray:
    """Return the sums over the axles, a row for each position of the first one, axles beyond the beam left out."""
    steps = [round(sign * offset / STEP) for offset in OFFSETS]
    reach = max(abs(step) for step in steps)
    around = np.pad(units, ((2 * reach, 2 * reach), (0, 0)))
    positions = range(reach, len(around) - reach)
    return np.array([sum(a * around[p + s] for a, s in zip(AXLES, steps, strict=True)) for p in positions])


@cache
def effects() -> Effects:
    return Effects(BEAM, PHRASES)


def tried(phrase: str, factors: list[tuple[float, float, float]], sign: int) -> float:
    """Return an extreme of a phrase; one anywhere in a span is sought every 0.25 m."""
    extreme = re.fullmatch(r"(\w+) (?:max|min) in span (\d)", phrase)
    if not extreme:
        return effects().extreme(phrase, factors, sign)
    start, end = PARTS[int(extreme[2]) - 1]
    places = [x for x in np.linspace(0, 20, 81) if start <= x <= end]
    return sign * max(sign * effects().extreme(f"{extreme[1]} at {x:.10g}", factors, sign) for x in places)


# --- the tests ------------------------------------------------------------------------------------------


def test_no_cell_is_in_error(filled: tuple[Report, Worksheet]) -> None:
    """Every formula is answered, and the fault is blank."""
    report, sheet = filled
    assert report.errors == []
    assert not sheet["N10"].value
    texts = {str(cell.value) for row in sheet.iter_rows() for cell in row}
    assert not [text for text in texts if text.startswith("#")]


def test_the_inputs_are_read_as_beam_and_loads(sheet: Worksheet) -> None:
    """The lines joined from the cells, and the sentences that say what was read."""
    assert sheet["N7"].value == BEAM
    assert sheet["N8"].value == "G: udl 6.5; Q: udl 9 each span; T: axles 60 60 45 spaced 1.6 3.4 both ways"
    assert sheet["N6"].value.startswith("Beam of length 21.8: pinned at 0 (support 1)")
    assert "axles 60, 60 and 45 spaced 1.6 and 3.4" in sheet["N9"].value


def test_the_combinations_are_those_of_the_standard(sheet: Worksheet) -> None:
    """6.10 and the characteristic ones as written out by hand; rows to spare are blank."""

    def text(g: float, q: float, t: float) -> str:
        terms = [(g, "G"), (t, "T"), (q, "Q")] if t >= q > 0 else [(g, "G"), (q, "Q"), (t, "T")]
        return " + ".join(case if factor == 1 else f"{factor:g} {case}" for factor, case in terms if factor)

    def told(first: str) -> list[str]:
        return [row[0] or "" for row in rows_of(sheet, f"{first}19:{first}30")]

    for first, count, factors in (("B", "E18", STRENGTH), ("G", "J18", SERVICE)):
        written = [text(*each) for each in factors]
        assert told(first) == written + [""] * (12 - len(written))
        assert sheet[count].value == len(written)
    assert told("B")[4] == "1.35 G + 1.5 T + 1.5 Q"


@pytest.mark.parametrize("row", ROWS)
def test_results_are_the_extremes_of_all_that_is_tried(sheet: Worksheet, row: int) -> None:
    """Never below what patterns and positions tried one by one give, and hardly above."""
    side, phrase, value = (sheet[f"{letter}{row}"].value for letter in "LMN")
    factors, times = (STRENGTH, 1) if row < SERVICE_FROM else (SERVICE, 1000)
    sign = 1 if side == "highest" else -1
    found = times * tried(phrase, factors, sign)
    scale = {"moment": 280.0, "shear": 285.0, "reaction": 408.0, "deflection": 9.2}[phrase.split()[0]]
    assert -CLOSE * scale <= sign * (value - found) <= COARSE * scale


def test_what_is_tried_shows_what_is_left_out(sheet: Worksheet) -> None:
    """With Q on all spans at once, or with the train one way only, some results would be missed by more than that."""
    own = effects()
    n = own.number["reaction 1"]
    at_once = 1.0 * own.permanent[n] + 1.5 * own.parts[:, n].sum() + 1.5 * own.trains[:, n].min()
    assert at_once - sheet["N32"].value > 10 * COARSE * 408
    n = own.number["moment at support 2"]
    one_way, other = (own.trains[half, n].min() for half in np.split(np.arange(len(own.trains)), 2))
    assert 1.5 * abs(one_way - other) > 2 * COARSE * 280


@pytest.mark.parametrize("row", ROWS)
def test_what_governs_gives_the_value_again(sheet: Worksheet, row: int) -> None:
    """The combination, the spans and the position that the words name, as ordinary loads, give that value."""
    phrase, value, words = (sheet[f"{letter}{row}"].value for letter in "MNP")
    combination, *told = words.split("; ")
    factors = {case: float(factor or 1) for factor, case in re.findall(r"([\d.]+)? ?\b([GQT])\b", combination)}
    loads, axles = [f"udl {factors['G'] * G}"], []
    for part in told:
        for start, end in re.findall(r"([\d.]+) to ([\d.]+)", part if " on " in part else ""):
            loads.append(f"udl {factors['Q'] * Q} from {start} to {end}")
        train = re.match(r"T: first axle at x = ([-\d.]+), the others to its (left|right)", part)
        if train:
            sign = 1 if train[2] == "right" else -1
            at = [float(train[1]) + sign * offset for offset in OFFSETS]
            axles = [(factors["T"] * axle, x) for axle, x in zip(AXLES, at, strict=True)]

    def again(margin: float) -> float:
        on = [f"point {axle} at {_beside(x, phrase)}" for axle, x in axles if -margin < x < LENGTH + margin]
        return beam_result(BEAM, "; ".join(loads + on), phrase, EI) * (1 if row < SERVICE_FROM else 1000)

    # An axle at the very end may be the one that has just left the beam.
    assert any(again(margin) == pytest.approx(value, rel=1e-5) for margin in (1e-5, -1e-5))


def _beside(x: float, phrase: str) -> float:
    """Return the place of an axle, on that side of a support where it makes the shear that is asked for."""
    side = 0.0
    if phrase.startswith("shear") and any(abs(x - support) < 1e-5 for support in SUPPORTS):
        side = -1e-6 if phrase.endswith("left") else 1e-6
    return min(max(x + side, 0.0), LENGTH)


def test_uplift_is_told_where_a_reaction_is_negative(sheet: Worksheet) -> None:
    """Three supports are lifted in some combination, and these rows say so."""
    told = {row: sheet[f"T{row}"].value for row in ROWS if row < SERVICE_FROM}
    lifted = {row for row, remark in told.items() if remark == "uplift: hold down"}
    assert lifted == {32, 34, 35}
    assert lifted == {
        row
        for row in told
        if sheet[f"M{row}"].value.startswith("reaction")
        and tried(sheet[f"M{row}"].value, STRENGTH, -1) < 0
        and sheet[f"L{row}"].value == "lowest"
    }
    assert not any(remark for row, remark in told.items() if row not in lifted)


def test_deflections_are_told_as_parts_of_the_span(sheet: Worksheet) -> None:
    """Of its own span each, and of twice the overhang at the tip."""
    for row, length in zip(range(37, 42), (6.5, 8.0, 5.5, 3.6, 3.6), strict=True):
        assert sheet[f"T{row}"].value == f"L/{round(1000 * length / abs(sheet[f'N{row}'].value))}"


def test_reactions_by_case_are_those_of_each_case_alone(sheet: Worksheet) -> None:
    """G as it is, Q on the spans that add or relieve, T where it stands worst: unfactored."""
    header, *rows = rows_of(sheet, "A32:H36")
    assert header == ("support", "x", "result", "G", "Q highest", "Q lowest", "T highest", "T lowest")
    for number, (row, x) in enumerate(zip(rows, SUPPORTS, strict=True), 1):
        n = effects().number[f"reaction {number}"]
        parts, trains = effects().parts[:, n], np.append(effects().trains[:, n], 0.0)
        assert row[:3] == (number, x, "reaction")
        assert row[3] == pytest.approx(effects().permanent[n], rel=CLOSE)
        assert row[4:6] == pytest.approx((parts[parts > 0].sum(), parts[parts < 0].sum()), rel=CLOSE)
        for value, found, sign in ((row[6], trains.max(), 1), (row[7], trains.min(), -1)):
            assert -CLOSE <= sign * (value - found) <= COARSE * 162


def test_the_proof_by_ordinary_formulas_holds_and_bites(built: Path, sheet: Worksheet, tmp_path: Path) -> None:
    """Loads in all and the overhang by statics; a heavier second axle, and wider spacing, change both sides alike."""
    told = rows_of(sheet, "H39:J41")
    by_hand = (G * LENGTH, Q * LENGTH, -(60 * 1.8 + 60 * 0.2))
    assert [row[1] for row in told] == pytest.approx(by_hand)
    assert [row[0] for row in told] == pytest.approx(by_hand)
    assert [row[2] for row in told] == [0, 0, 0]

    def other(book: Workbook) -> None:
        book["Actions"]["D11"] = 90
        book["Actions"]["G11"] = 0.5

    told = rows_of(changed(built, tmp_path / "axles.xlsx", other)[1], "H39:J41")
    assert told[2][:2] == pytest.approx((-(90 * 1.8 + 45 * 1.3), -(90 * 1.8 + 45 * 1.3)))
    assert told[2][2] == 0


# --- along the beam -------------------------------------------------------------------------------------


def stations() -> Iterator[tuple[float, str]]:
    """Yield the places of the envelope and their sides."""
    for start, end in PARTS[:3]:
        yield from ((x, side) for x, side in zip(np.linspace(start, end, 7), ["right"] * 6 + ["left"], strict=True))
    yield from ((20.0, "right"), (20.9, "right"), (21.8, "left"))


def test_the_envelope_is_that_of_its_own_places(sheet: Worksheet) -> None:
    """Shear and moment, highest and lowest, at the sixths of the spans, on both sides of the supports inside."""
    told = rows_of(sheet, "C47:G70")
    phrases = {(kind, x, side): f"{kind} at {x:.15g} {side}" for kind in ("shear", "moment") for x, side in stations()}
    own = Effects(BEAM, tuple(phrases.values()))
    for (x, side), row in zip(stations(), told, strict=True):
        assert row[0] == pytest.approx(x)
        for value, (kind, sign) in zip(row[1:], product(("shear", "moment"), (1, -1)), strict=True):
            found = own.extreme(phrases[kind, x, side], STRENGTH, sign)
            assert -1e-6 <= sign * (value - found) <= 2 * COARSE * 280, (x, side, kind, sign)


def test_the_envelope_meets_the_results_by_phrase(sheet: Worksheet) -> None:
    """At the supports it is what the phrases say; no moment of it is beyond the extremes of the spans."""
    told = {(round(row[0], 6), n): row for n, row in enumerate(rows_of(sheet, "C47:G70"))}
    left = {x: row for (x, _), row in sorted(told.items(), reverse=True)}
    right = {x: row for (x, _), row in sorted(told.items())}
    for support, moment, shears in ((6.5, 18, (22, 23)), (14.5, 19, (24, 25)), (20.0, 20, (26, 27))):
        assert left[support][4] == pytest.approx(sheet[f"N{moment}"].value, rel=CLOSE)
        assert left[support][2] == pytest.approx(sheet[f"N{shears[0]}"].value, rel=CLOSE)
        assert right[support][1] == pytest.approx(sheet[f"N{shears[1]}"].value, rel=CLOSE)
    largest = max(row[3] for row in left.values())
    assert 0.99 * sheet["N16"].value <= largest <= sheet["N16"].value


def test_the_charts_draw_the_tables(built: Path, sheet: Worksheet) -> None:
    """Moment and shear envelope, two lines each, and the influence line: the whole table, numbers all of it."""
    drawn = {}
    for chart in load_workbook(built)["Actions"]._charts:
        title = "".join(run.t for run in chart.title.tx.rich.p[0].r)
        refs = [(one.xVal.numRef.f, one.yVal.numRef.f) for one in chart.series]
        names = [one.tx.v for one in chart.series]
        drawn[title.split(" [")[0].split(" chosen")[0]] = (refs, names, chart.y_axis.scaling.orientation)
    x = "'Actions'!$C$47:$C$70"
    assert drawn["Moment envelope"] == (
        [(x, "'Actions'!$F$47:$F$70"), (x, "'Actions'!$G$47:$G$70")],
        ["highest", "lowest"],
        "maxMin",
    )
    assert drawn["Shear envelope"][0] == [(x, "'Actions'!$D$47:$D$70"), (x, "'Actions'!$E$47:$E$70")]
    assert drawn["Influence line"][0] == [("'Actions'!$I$47:$I$70", "'Actions'!$J$47:$J$70")]
    assert len(drawn) == 3
    for letter in "CDEFGIJ":
        column = [row[0] for row in rows_of(sheet, f"{letter}47:{letter}70")]
        assert all(isinstance(value, (int, float)) for value in column)
        assert max(column) > min(column)


def test_the_charts_stand_below_the_results_and_within_the_page(built: Path) -> None:
    """None reaches beyond the last row that is printed."""
    sheet = load_workbook(built)["Actions"]
    assert sheet.print_area == "'Actions'!$A$1:$T$70"
    heights = [sheet.row_dimensions[row].height for row in range(1, 71)]
    for chart in sheet._charts:
        top = chart.anchor._from.row
        assert top >= 43
        height = chart.anchor.ext.height / 12_700
        assert height < sum(heights[top:])


def test_an_influence_line_is_the_result_under_a_unit_load(built: Path, sheet: Worksheet, tmp_path: Path) -> None:
    """The chosen result, and another one, with both sides of its jump; rows to spare repeat the right end."""

    def check(sheet: Worksheet, value: Callable[[float], Any], jump: float | None) -> None:
        rows, needed = rows_of(sheet, "I47:J70"), sheet["H46"].value
        assert 18 <= needed < len(rows)
        assert set(rows[needed:]) == {rows[needed - 1]}
        assert rows[needed - 1][0] == pytest.approx(LENGTH)
        for x, ordinate in rows:
            if x != jump:
                assert ordinate == pytest.approx(value(x), abs=1e-9)
        assert [row[1] for row in rows if row[0] == jump] == pytest.approx([-1.0, 0.0] if jump else [], abs=1e-9)

    check(sheet, lambda x: moment_at(BEAM, f"point 1 at {x}", 6.5, EI), None)

    def choose(book: Workbook) -> None:
        book["Actions"]["I45"] = "shear at support 2 left"

    report, other = changed(built, tmp_path / "chosen.xlsx", choose)
    assert report.errors == []
    check(other, lambda x: beam_result(BEAM, f"point 1 at {x}", "shear at support 2 left", EI), 6.5)


# --- what changes, and what goes wrong ----------------------------------------------------------------


def test_everything_follows_a_changed_span(built: Path, sheet: Worksheet, tmp_path: Path) -> None:
    """Equal spans of round numbers: lines, results, envelope and proof follow, and no cell is in error."""

    def equal(book: Workbook) -> None:
        for letter, length in zip("BCDE", (5, 5, 5, 2.5), strict=True):
            book["Actions"][f"{letter}8"] = length

    report, other = changed(built, tmp_path / "equal.xlsx", equal)
    assert report.errors == []
    assert not other["N10"].value
    assert other["N7"].value == "pinned 5 roller 5 roller 5 roller 2.5 free"
    assert [row[2] for row in rows_of(other, "H39:J41")] == [0, 0, 0]
    assert other["C70"].value == pytest.approx(17.5)
    assert other["M40"].value == "deflection at 17.5"
    assert other["D33"].value == pytest.approx(reaction(other["N7"].value, "udl 6.5", 1, EI), rel=CLOSE)
    assert other["D33"].value != pytest.approx(sheet["D33"].value, rel=0.01)


def test_own_factors_take_the_place_of_the_recommended_ones(built: Path, sheet: Worksheet, tmp_path: Path) -> None:
    """Factors of an annex change the list and what follows from it, and leave the service list."""

    def annex(book: Workbook) -> None:
        book["Actions"]["H17"] = "G 1.2/0.9; Q 1.6"

    report, other = changed(built, tmp_path / "annex.xlsx", annex)
    assert report.errors == []
    assert other["B23"].value == "1.2 G + 1.6 T + 1.6 Q"
    assert other["B24"].value == "0.9 G"
    factors = [(g, q / 1.5 * 1.6, t / 1.5 * 1.6) for g in (1.2, 0.9) for _, q, t in STRENGTH[:5]]
    found = tried("reaction 1", factors, -1)
    assert -CLOSE <= found - other["N32"].value <= COARSE * 408
    assert other["N38"].value == pytest.approx(sheet["N38"].value, rel=CLOSE)


FAULTS = {
    "B8": (0, "beam: is the error value #NUM! itself"),
    "C11": ("60,5", "loads: is the error value #VALUE! itself"),
    "F11": (None, "loads: is the error value #VALUE! itself"),
    "H15": ("EN 1990 6.12", "[strength list: error]"),
    "H15 ": ("EN 1990 6.10a/b", "[strength list: rows missing]"),
    "B17": ("breeze", "[service list: error]"),
    "M15": ("moment most", "[error on the sheet]"),
    "I45": ("moment max", "[influence line: error]"),
}


@pytest.mark.parametrize("cell", FAULTS)
def test_a_fault_is_never_hidden(built: Path, tmp_path: Path, cell: str) -> None:
    """What is wrong with an input stands in the cell of the fault, which is coloured then."""
    value, reason = FAULTS[cell]

    def spoil(book: Workbook) -> None:
        book["Actions"][cell.strip()] = value

    sheet = changed(built, tmp_path / "spoilt.xlsx", spoil)[1]
    assert reason in sheet["N10"].value
    rules = {str(area.sqref): rule for area in sheet.conditional_formatting for rule in area.rules}
    assert "LEN($N$10)>0" in rules["N10:T11"].formula[0]


def test_only_inputs_look_like_inputs(built: Path) -> None:
    """No cell with a formula has the fill of an input, and every input is guarded or a word."""
    sheet = load_workbook(built)["Actions"]
    typed = [cell for row in sheet.iter_rows() for cell in row if cell.fill.fgColor.rgb == "00FFF6DF"]
    assert len(typed) > 60
    assert not [cell.coordinate for cell in typed if str(cell.value).startswith("=")]
    guarded = " ".join(str(rule.sqref) for rule in sheet.data_validations.dataValidation)
    assert all(part in guarded for part in ("B8:G8", "C11:G11", "A11:B11", "L15:L35", "I45"))
    assert all(len(str(rule.formula1 or "")) <= 255 for rule in sheet.data_validations.dataValidation)
