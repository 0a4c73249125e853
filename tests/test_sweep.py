"""Sweeps answer as the functions do row by row: numbers, errors and reasons."""

from __future__ import annotations

import random
import re
import tracemalloc
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest
from beams import FORCES, Beam, beams
from hypothesis import HealthCheck, Phase, given, settings

from beamfuncs import batch
from beamfuncs import functions as f
from beamfuncs.batch.columns import SLOT, combinations, stiffnesses, texts
from beamfuncs.batch.roots import roots
from beamfuncs.errors import NUM, VALUE, BeamError, ErrorValue
from beamfuncs.fields import FIELDS
from beamfuncs.results import Result, read_phrase
from beamfuncs.solving import solved

Cells = tuple[str, str, object, str]
"""Beam, loads, stiffness and combination of a row."""

PHRASES = [
    "reaction 1",
    "reaction moment 1",
    "reaction 3",
    "total load",
    *(f"{field} {sign}" for field in FIELDS for sign in ("max", "min")),
    *(f"{field} max in span 2" for field in FIELDS),
    *(f"{field} at 1.7" for field in FIELDS),
    *(f"{field} at support 2 left" for field in FIELDS),
    "shear at 0.9 in span 1 left",
    "moment at 2.3 in span 2",
    "deflection max over length",
    "deflection min in span 1 over length",
    "moment largest",
]
POSITIONS = [f"position of {field} {sign}" for field in FIELDS for sign in ("max", "min")]
NEAR = 3e-6
"""Of the beam's length: where an extreme is flat, values that are equal but for rounding lie that far apart."""
TOLERANCE = 4e-13
"""Of the peak of the field, under forces and couples."""
CANCELLING = 4e-12
"""The same where imposed movements may raise forces that cancel: each of two ways to add them up rounds them off."""


def miss_of(result: Result, phrase: str, beam: Beam) -> float:
    """What an error of a result is measured by: the peak of its field, or a part of what its loads could raise.

    That part counts where loads next to a support, or loads that cancel, leave a field next to nothing.
    """
    field = field_of(phrase)
    resisted = float(beam.restrained[field])
    least = resisted if rounding(result, field, beam) else 1e-4 * resisted
    return max(result.fields.peak(FIELDS.index(field)), least) / read_phrase(phrase).scale(result.beam)


def field_of(phrase: str) -> str:
    """The field that a phrase asks for, or that its result belongs to."""
    quantity = read_phrase(phrase).quantity
    return {"reaction": "shear", "total load": "shear", "reaction moment": "moment"}.get(quantity, quantity)


def rounding(result: Result, field: str, beam: Beam) -> bool:
    """Whether a field is zero but for rounding, so that no place of its extreme means anything."""
    return result.fields.peak(FIELDS.index(field)) <= 1e-9 * float(beam.restrained[field])


_NUMBER = re.compile(r"(?<![\w.(-])[0-9.]+(?![\w.])")
WRONG = ("1e400", "0", "-3", "2,5", "six", "", "1e61", "1e-61", "+4.")


def altered(text: str, chance: random.Random, wrong: float) -> str:
    """A text in which numbers differ somewhat, and a few are wrong; those that count supports or spans stay."""

    def number(found: re.Match[str]) -> str:
        if re.search(r"(support|span) $", text[: found.start()]) or chance.random() < 0.4:
            return found[0]
        if chance.random() < wrong:
            return chance.choice(WRONG)
        return repr(round(float(found[0]) * chance.uniform(0.8, 1.25), chance.choice((2, 3, 9))))

    return _NUMBER.sub(number, text)


def rows_like(beam: Beam, count: int, chance: random.Random) -> Iterator[Cells]:
    """Rows of the topology of a beam; among them faulty ones, mechanisms, and ones of a stiffness that is not given."""
    for _ in range(count):
        line, loads, stiffness = (altered(text, chance, 0.02) for text in beam.cells[:3])
        combination = altered(beam.combination, chance, 0.0)
        if combination and chance.random() < 0.04:
            combination = chance.choice(["1e400 G", "2,5 G", "G + G", "1.35/1 G", "six G"])
        stiff: object = stiffness
        if chance.random() < 0.04:
            line = line.replace("pinned", "hinge", 1) if chance.random() < 0.5 else line.replace("fixed", "free", 1)
        if chance.random() < 0.06:
            stiff = chance.choice([None, 0.0, 24000.0, "", "24 000", ErrorValue("#REF!"), True])
        yield line, loads, stiff, combination


def row_by_row(cells: Cells, phrases: list[str]) -> list[float | BeamError]:
    """What the function of a single row answers, its error in every entry where it has none."""
    try:
        answered = f.beam_result(cells[0], cells[1], [phrases], cells[2], cells[3])
    except BeamError as error:
        return [error] * len(phrases)
    assert isinstance(answered, list)
    return answered[0]


def difference(one: float | BeamError, many: float | BeamError, size: float) -> str:
    """How an answer of a sweep differs from that of a row by itself by more than a size; blank text if it does not."""
    if isinstance(one, BeamError) and isinstance(many, BeamError):
        alike = (one.value, one.reason) == (many.value, many.reason)
    elif isinstance(one, BeamError) or isinstance(many, BeamError):
        alike = False
    else:
        alike = abs(one - many) <= size
    return "" if alike else f"{one!r} alone, {many!r} in the sweep"


def as_extreme(cells: Cells, phrase: str, position: float | BeamError, tolerance: float, beam: Beam) -> bool:
    """Whether a position is one of several where the extreme occurs: the field has its value there, on some side."""
    if isinstance(position, BeamError) or not phrase.startswith("position of "):
        return False
    asked = phrase.removeprefix("position of ")
    field = asked.split()[0]
    sides = [f"{field} at {position!r} {side}" for side in ("left", "right")]
    extreme, *values = row_by_row(cells, [asked, *sides])
    size = tolerance * size_of(cells, asked, beam, tolerance)
    return any(not isinstance(value, BeamError) and not difference(extreme, value, size) for value in values)


# --- the same as row by row ------------------------------------------------------------------------------


class TestRows:
    """5,000 rows of a hundred topologies, some of them faulty, against the function of a single row."""

    @pytest.mark.parametrize(
        ("kinds", "tolerance"), [(FORCES, TOLERANCE), (None, CANCELLING)], ids=["forces", "movements too"]
    )
    def test_a_sweep_answers_as_its_rows_do(self, kinds: tuple[type, ...] | None, tolerance: float) -> None:
        """Numbers are within the tolerance, errors have the same value and reason, and few rows are solved singly."""
        strategy = beams(most_lengths=5, most_loads=4, **({"kinds": kinds} if kinds else {}))
        rows_in_all = in_error = singly = 0

        @settings(
            max_examples=50,
            deadline=None,
            derandomize=True,
            database=None,
            suppress_health_check=HealthCheck,
            phases=[Phase.generate],
        )
        @given(strategy)
        def check(beam: Beam) -> None:
            nonlocal rows_in_all, in_error, singly
            rows = list(rows_like(beam, 50, random.Random(repr(beam))))
            columns = [list(column) for column in zip(*rows, strict=True)]
            asked = PHRASES + POSITIONS
            swept = batch.sweep(columns[0], columns[1], [asked], columns[2], columns[3], fewest=1)
            for cells, answers in zip(rows, swept.rows(), strict=True):
                alone = row_by_row(cells, asked)
                failed = all(isinstance(answer, BeamError) for answer in alone)
                rows_in_all, in_error = rows_in_all + 1, in_error + failed
                for phrase, one, many in zip(asked, alone, answers, strict=True):
                    size = 0.0 if failed else tolerance * size_of(cells, phrase, beam, tolerance)
                    told = difference(one, many, size)
                    assert not told or as_extreme(cells, phrase, many, tolerance, beam), f"{cells}, {phrase}: {told}"
            singly += swept.singly

        check()
        assert rows_in_all >= 2500
        assert in_error > 100
        assert singly - in_error <= 0.02 * rows_in_all

    def test_the_comparison_bites(self) -> None:
        """A number that is off by a little more than the tolerance, a missing error and another reason are seen."""
        assert not difference(1.0, 1.0 + 0.9 * TOLERANCE, TOLERANCE)
        assert difference(1.0, 1.0 + 1.2 * TOLERANCE, TOLERANCE)
        assert difference(1.0, float("nan"), TOLERANCE)
        assert difference(BeamError(NUM, "a"), 1.0, TOLERANCE)
        assert difference(BeamError(NUM, "a"), BeamError(NUM, "b"), TOLERANCE)
        assert not difference(BeamError(NUM, "a"), BeamError(NUM, "a"), TOLERANCE)


def size_of(cells: Cells, phrase: str, beam: Beam, tolerance: float) -> float:
    """What an error is measured by; 0 where there is no answer to a phrase."""
    try:
        if phrase in POSITIONS:
            result = solved(*cells)  # type: ignore[arg-type]
            near = 2.0 if rounding(result, field_of(phrase), beam) else NEAR
            return near / tolerance * result.beam.length
        return miss_of(solved(*cells), phrase, beam)  # type: ignore[arg-type]
    except BeamError:
        return 0.0


# --- laws ------------------------------------------------------------------------------------------------

LINES = [f"fixed {5 + n / 8} pinned {7 - n / 16} pinned {4 + n % 5} free" for n in range(40)]
LOADS = [f"G: udl {5 + n}; Q: point {40 - n} at {n / 8}; Q: varying 0 to {n} from 1 to {6 + n / 32}" for n in range(40)]
ASKED = [
    ["reaction 1", "reaction moment 1", "moment max", "shear min in span 2", "position of moment min", "total load"]
]


def swept(lines: object = LINES, loads: object = LOADS, **options: object) -> np.ndarray:
    """The array of a sweep of the sample."""
    return batch.sweep(lines, loads, ASKED, 24000.0, "1.35 G + 1.5 Q", fewest=1, **options).values  # type: ignore[arg-type]


def test_the_order_of_rows_does_not_matter() -> None:
    """Rows in another order give the same rows to the last bit."""
    order = np.random.default_rng(7).permutation(len(LINES))
    shuffled = swept([LINES[n] for n in order], [LOADS[n] for n in order])
    assert np.array_equal(shuffled, swept()[order])


def test_chunks_do_not_matter_and_progress_is_told() -> None:
    """Chunks of any size give the same to the last bit, and each is told."""
    told: list[tuple[int, int]] = []
    assert np.array_equal(swept(chunk=7, progress=lambda done, of: told.append((done, of))), swept())
    assert told == [(7, 40), (14, 40), (21, 40), (28, 40), (35, 40), (40, 40)]


def test_a_faulty_row_leaves_the_others_alone() -> None:
    """A row in error, of whatever kind, changes no bit of its neighbours."""
    lines: list[object] = list(LINES)
    for place, wrong in (
        (3, "x"),
        (11, None),
        (17, ErrorValue("#REF!")),
        (18, "free 8 free"),
        (30, "fixed 1e400 free"),
    ):
        lines[place] = wrong
    found = batch.sweep(lines, LOADS, ASKED, 24000.0, "1.35 G + 1.5 Q", fewest=1)
    bad = [3, 11, 17, 18, 30]
    assert np.isnan(found.values[bad]).all()
    assert np.array_equal(np.delete(found.values, bad, axis=0), np.delete(swept(), bad, axis=0))
    assert [found.errors[row, 0].value for row in bad] == [VALUE, VALUE, "#REF!", NUM, NUM]


def test_equilibrium_holds_in_every_row() -> None:
    """The reactions of a beam carry all of its loads."""
    asked = [["reaction 1", "reaction 2", "reaction 3", "total load"]]
    found = batch.sweep(LINES, LOADS, asked, 24000.0, "1.35 G + 1.5 Q").values
    assert np.allclose(found[:, :3].sum(axis=1), found[:, 3], rtol=1e-14, atol=0.0)


def test_closed_forms_of_a_propped_cantilever() -> None:
    """Under q on L: 5qL/8 and 3qL/8, -qL²/8 and 9qL²/128 at 5L/8."""
    length, load = np.linspace(1.0, 12.0, 50), np.linspace(3.0, 40.0, 50)
    asked = ["reaction 1", "reaction 2", "moment min", "moment max", "position of moment max"]
    found = batch.sweep_over("fixed {L} pinned", "udl {q}", asked, {"L": length, "q": load}).values.T
    square = load * length**2
    expected = [5 * load * length / 8, 3 * load * length / 8, -square / 8, 9 * square / 128, 5 * length / 8]
    assert np.allclose(found, expected, rtol=1e-14, atol=0.0)


def test_twice_the_load_is_twice_the_result() -> None:
    """The solution is linear: a power of two changes no digit."""
    values = {"q": np.linspace(1.0, 9.0, 30)}
    asked = ["moment max", "deflection max", "reaction 2"]
    once, twice = (
        batch.sweep_over("fixed 6 pinned 5 pinned", f"udl {{q}}; point {p} at 2", asked, values_, 9000.0).values
        for p, values_ in ((4, values), (8, {"q": 2 * values["q"]}))
    )
    assert np.array_equal(twice, 2 * once)


# --- names in braces -------------------------------------------------------------------------------------


def test_names_in_braces_are_the_texts_that_they_stand_for() -> None:
    """A beam with names in braces is answered as the texts are, to the last bit."""
    chance = random.Random(11)
    names = ["L", "q", "a", "b", "P", "k", "EI", "g"]
    rows = [[round(chance.uniform(low, low + 3), 3) for low in (5, 9, 0, 4, 20, 900, 24000, 1)] for _ in range(300)]
    parts = (
        "fixed {L} spring({k}) {L} pinned",
        "G: udl {q}; Q: udl {q} from {a} to {b}; Q: point {P} at {a} in span 2",
        "EI {EI}; GA 5e5",
        "{g} G + 1.5 Q",
    )
    filled = [tuple(part.format(**dict(zip(names, row, strict=True))) for part in parts) for row in rows]
    columns = [list(column) for column in zip(*filled, strict=True)]
    asked = [["moment max", "deflection min", "shear at 2.5", "position of moment min", "reaction moment 1"]]
    found = batch.sweep_over(parts[0], parts[1], asked, [names, *rows], parts[2], parts[3])
    texts_ = batch.sweep(columns[0], columns[1], asked, columns[2], columns[3])
    assert found.singly == texts_.singly == 0
    assert np.array_equal(found.values, texts_.values)


def test_values_may_be_marks_and_numbers_of_supports() -> None:
    """Texts, and numbers that count supports or spans, stand in braces too."""
    table = [["end", "n", "P"], *([end, n, 10 + n] for end in ("fixed", "pinned", "free") for n in (1, 2))]
    found = f.sweep_over("{end} 4 pinned 3 {End}", "point {p} at 1 in span {n}", "reaction 1", table)
    for (end, n, p), [answer] in zip(table[1:], found, strict=True):
        alone = row_by_row((f"{end} 4 pinned 3 {end}", f"point {p} at 1 in span {n}", None, ""), ["reaction 1"])
        assert not difference(alone[0], answer, TOLERANCE * 10)


@pytest.mark.parametrize("wrong", [None, ErrorValue("#DIV/0!"), "2,5", float("nan"), -4.0, True])
def test_a_value_that_is_none_is_an_error_of_its_row(wrong: object) -> None:
    """Blanks, errors, texts that are no numbers and numbers out of range leave the other rows alone."""
    rows = f.sweep_over("fixed {L} pinned", "udl 12", "reaction 1", [["L"], [8.0], [wrong], [4.0], [4.0], [4.0]])  # type: ignore[list-item]
    assert [row[0] for n, row in enumerate(rows) if n != 1] == [60.0, 30.0, 30.0, 30.0]
    assert isinstance(rows[1][0], BeamError)


@pytest.mark.parametrize(
    ("arguments", "value", "words"),
    [
        (("fixed {L} pinned", "udl {q}", "moment max", [["L"], [8.0]]), VALUE, "{q}"),
        (("fixed {L} pinned", "udl 1", "moment max", [["L", "l"], [8.0, 7.0]]), VALUE, "twice"),
        (("fixed {L} pinned", "udl 1", "moment max", 8.0), VALUE, "row of names"),
        (("fixed 8 pinned", "udl 1", "moment max", {}), VALUE, "names"),
        (("fixed {L} pinned", "udl 1", "moment max", {"L": [1.0], "q": [1.0, 2.0]}), VALUE, "unequal"),
        (([["fixed", "{L}", "pinned"]], "udl 1", "moment max", {"L": [1.0]}), VALUE, "one text"),
    ],
)
def test_values_that_do_not_fit_are_refused_as_a_whole(arguments: tuple[object, ...], value: str, words: str) -> None:
    """A name that has no values, or values that are no table, are an error of the whole call."""
    with pytest.raises(BeamError, match=re.escape(words)) as caught:
        batch.sweep_over(*arguments)  # type: ignore[arg-type]
    assert caught.value.value == value


# --- arguments -------------------------------------------------------------------------------------------


def test_arrays_lists_and_ranges_are_alike() -> None:
    """Arrays of one dimension, plain lists, and ranges of one column give the same to the last bit."""
    ranges = swept([[line] for line in LINES], [[load] for load in LOADS])
    arrays = swept(np.array(LINES), np.array(LOADS, dtype=object))
    assert np.array_equal(ranges, swept())
    assert np.array_equal(arrays, swept())
    table = np.array([["L", "q"], [8.0, 12.0], [4.0, 12.0]], dtype=object)
    by_array = batch.sweep_over("fixed {L} pinned", "udl {q}", "reaction 1", table).values
    columns = {"L": np.array([8, 4]), "q": np.array([12.0, 12.0])}
    assert by_array.tolist() == batch.sweep_over("fixed {L} pinned", "udl {q}", "reaction 1", columns).values.tolist()


def test_loads_may_be_a_table_for_all_beams_or_a_column() -> None:
    """A load table counts for every beam; a column that is too short is refused."""
    table = [["load", "size", "at"], ["udl", 12.0, None], ["point", 5.0, 1.0]]
    written = f.sweep([[line] for line in LINES], "udl 12; point 5 at 1", ASKED)  # type: ignore[arg-type]
    assert f.sweep([[line] for line in LINES], table, ASKED) == written  # type: ignore[arg-type]
    with pytest.raises(BeamError, match="2 cells beside 40 beams"):
        f.sweep(LINES, ["udl 1", "udl 2"], "moment max")  # type: ignore[arg-type]


@pytest.mark.parametrize("stiffness", [None, 0.0, "", 24000.0, "24000", [[24000.0, 30000.0, 24000.0]]])
def test_a_stiffness_for_all_is_read_as_by_the_other_functions(stiffness: object) -> None:
    """One number, a text, a row with a value for each length; blank and 0 are not given."""
    found = batch.sweep(LINES[:6], "udl 3", ["deflection max", "reaction 2"], stiffness)  # type: ignore[arg-type]
    for line, answers in zip(LINES[:6], found.rows(), strict=True):
        alone = row_by_row((line, "udl 3", stiffness, ""), ["deflection max", "reaction 2"])
        assert not any(difference(one, many, 1e-12) for one, many in zip(alone, answers, strict=True))


def test_forms_keep_what_is_no_number_of_its_own() -> None:
    """Cases, counts of supports and spans, marks and signs of combinations belong to the form of a text."""
    column = texts(["S1: udl -1.5e3 in span 2; settle .1 at Support 10", "udl 1,5", "spring(2, 3) 4. free", 7.0])
    assert column.forms == (
        f"S1: udl {SLOT} in span 2; settle {SLOT} at Support 10",
        "udl 1,5",
        f"spring({SLOT}, {SLOT}) {SLOT} free",
    )
    assert column.form.tolist() == [0, 1, 2, -1]
    assert column.numbers.tolist() == [-1500.0, 0.1, 2.0, 3.0, 4.0]
    assert combinations(["1.35 G -1.5 Q", None, 0.0]).forms[0] == f"{SLOT} G -{SLOT} Q"
    assert stiffnesses(["24 500", 3.0, None]).form.tolist()[0] == -1


def test_a_million_texts_of_one_form_are_one_form() -> None:
    """Memory stays bounded: beyond its results a sweep holds no more than a chunk needs."""
    count = 60_000
    length = np.linspace(3.0, 9.0, count)

    def peak(chunk: int) -> int:
        tracemalloc.start()
        batch.sweep_over("fixed {L} pinned", "udl 12", ["moment max"], {"L": length}, chunk=chunk)
        found = tracemalloc.get_traced_memory()[1]
        tracemalloc.stop()
        return found

    peak(1000)
    assert peak(1000) < 8 * count + 4_000_000


def test_the_example_of_the_readme_runs(capsys: pytest.CaptureFixture[str]) -> None:
    """It finds the span whose hogging moment, (1.35 * 5 + 1.5 * 60 / L) L² / 8, is 120, and tells progress."""
    readme = (Path(__file__).parent.parent / "README.md").read_text(encoding="utf-8")
    code = readme.split("```python\n")[1].split("```")[0]
    found: dict[str, object] = {}
    exec(code, found)
    # 6.75 L² + 90 L = 960
    assert abs(found["permissible"] - (np.sqrt(90.0**2 + 4 * 6.75 * 960) - 90.0) / (2 * 6.75)) < 1e-4  # type: ignore[operator]
    assert capsys.readouterr().out.endswith("100000 of 100000\n")


# --- roots -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize("degree", [1, 2, 3, 4])
def test_roots_are_those_that_a_polynomial_was_made_of(degree: int) -> None:
    """Polynomials multiplied out of roots in (0, 1) give them back, in order; a neighbour is told apart."""
    chance = np.random.default_rng(degree)
    made = np.sort((np.arange(degree)[:, None] + chance.uniform(0.2, 0.8, (degree, 200))) / degree, axis=0)
    rows = np.array([np.polynomial.polynomial.polyfromroots(column) for column in made.T]).T
    found = roots(tuple(rows), np.ones(200))
    assert np.allclose(found, made, rtol=0.0, atol=1e-12)
    assert not np.allclose(found, made + 1e-9, rtol=0.0, atol=1e-12)
