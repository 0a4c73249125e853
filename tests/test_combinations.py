"""The combinations of actions are those of the standards, complete, each once."""

from __future__ import annotations

import json
from collections.abc import Iterator, Sequence
from fractions import Fraction
from itertools import chain, permutations, product
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st
from printed import Factors, printed
from scipy.optimize import linprog

from beamfuncs.cells import Argument
from beamfuncs.errors import NA, NUM, VALUE, BeamError, ErrorValue
from beamfuncs.notation import read_combination
from beamfuncs.standards import combinations
from beamfuncs.standards.asce_7 import LISTS
from beamfuncs.standards.en_1990 import EXPRESSIONS, TABLE_A1_1, WORDS

FOUR = "G permanent; Q office; S snow; W wind; T temperature"
SHARES = {"Q": "0.7 0.5 0.3", "S": "0.5 0.2 0", "W": "0.6 0.2 0", "T": "0.6 0.5 0"}
"""psi0, psi1 and psi2 of these actions in table A1.1."""
LETTERS = "D; L; Lr; S; R; W; WT; Ev; Eh"


def texts(*arguments: Argument) -> list[str]:
    """Return the list, one text a row."""
    rows = combinations(*arguments)
    assert all(len(row) == 1 for row in rows)
    return [text for [text] in rows]


def factors(found: Sequence[str]) -> list[Factors]:
    """Return the factors of each text, read without the product."""
    return [one for text in found for one in printed(text)]


def as_set(found: Sequence[Factors]) -> set[frozenset[tuple[str, Fraction]]]:
    """Return combinations as a set, terms of factor 0 left out."""
    return {frozenset((case, size) for case, size in one.items() if size) for one in found} - {frozenset()}


# --- EN 1990 --------------------------------------------------------------------------------------


def test_two_variable_actions_by_hand() -> None:
    """(6.10) with each of two actions leading, present or absent; permanent action adverse, then favourable."""
    assert texts("EN 1990 6.10", "G permanent; S snow; W wind") == [
        "1.35 G",
        "1.35 G + 1.5 S",
        "1.35 G + 1.5 S + 0.9 W",
        "1.35 G + 1.5 W",
        "1.35 G + 1.5 W + 0.75 S",
        "G",
        "G + 1.5 S",
        "G + 1.5 S + 0.9 W",
        "G + 1.5 W",
        "G + 1.5 W + 0.75 S",
    ]


def test_the_pair_of_expressions_by_hand() -> None:
    """(6.10a) has no leading action and the full permanent factor, (6.10b) the reduced one and a leading action."""
    a = ["1.35 G", "1.35 G + 1.05 Q", "G", "G + 1.05 Q"]
    b = ["1.1475 G", "1.1475 G + 1.5 Q", "G", "G + 1.5 Q"]
    assert texts("6.10a", "G permanent; Q office") == a
    assert texts("6.10b", "G permanent; Q office") == b
    assert texts("6.10a/b", "G permanent; Q office") == list(dict.fromkeys(a + b))


def test_serviceability_by_hand() -> None:
    """Permanent actions once, psi0, psi1 and psi2 as (6.14b), (6.15b) and (6.16b) have them."""
    actions = "G permanent; Q office; W wind"
    both = ["G", "G + Q", "G + Q + 0.6 W", "G + W", "G + W + 0.7 Q"]
    assert texts("characteristic", actions) == both
    assert texts("frequent", actions) == ["G", "G + 0.5 Q", "G + 0.2 W", "G + 0.2 W + 0.3 Q"]
    assert texts("quasi-permanent", actions) == ["G", "G + 0.3 Q"]


# Adverse and favourable factor of the permanent action, of the variable ones; what leads, what accompanies (an index of
# psi, None: it is taken whole), False where nothing leads. From clauses 6.4.3.2 and 6.5.3 and tables A1.2 and A1.4.
BY_CLAUSE = {
    "6.10": [("1.35", "1", "1.5", None, 0)],
    "6.10a": [("1.35", "1", "1.5", False, 0)],
    "6.10b": [("1.1475", "1", "1.5", None, 0)],
    "6.10a/b": [("1.35", "1", "1.5", False, 0), ("1.1475", "1", "1.5", None, 0)],
    "EQU": [("1.1", "0.9", "1.5", None, 0)],
    "set C": [("1", "1", "1.3", None, 0)],
    "characteristic": [("1", "1", "1", None, 0)],
    "frequent": [("1", "1", "1", 1, 2)],
    "quasi-permanent": [("1", "1", "1", False, 2)],
}


def by_brute_force(name: str, cases: Sequence[str]) -> Iterator[Factors]:
    """Yield all choices: the permanent factor, which actions are present, and which of those leads."""
    psi = {case: [Fraction(share) for share in SHARES[case].split()] for case in cases}
    for adverse, favourable, gamma, leads, rest in BY_CLAUSE[name]:
        for held, presence in product((adverse, favourable), product((False, True), repeat=len(cases))):
            present = [case for case, there in zip(cases, presence, strict=True) if there]
            for lead in [None] if leads is False or not present else present:
                shares = {case: psi[case][rest] for case in present}
                if lead:
                    shares[lead] = Fraction(1) if leads is None else psi[lead][leads]
                yield {"G": Fraction(held)} | {case: Fraction(gamma) * share for case, share in shares.items()}


@pytest.mark.parametrize("count", range(5))
@pytest.mark.parametrize("name", EXPRESSIONS)
def test_every_choice_of_leading_present_and_favourable_is_listed(name: str, count: int) -> None:
    """Up to four variable actions: all that brute force finds, and nothing else, each once."""
    actions = "; ".join(FOUR.split("; ")[: 1 + count])
    found = factors(texts(name, actions))
    assert as_set(found) == as_set(list(by_brute_force(name, list(SHARES)[:count])))
    assert len(as_set(found)) == len(found)


@pytest.mark.parametrize("name", EXPRESSIONS)
def test_the_order_of_the_actions_does_not_matter(name: str) -> None:
    """Every permutation of four actions gives the same set."""
    rows = FOUR.split("; ")[:4]
    sets = {frozenset(as_set(factors(texts(name, "; ".join(order))))) for order in permutations(rows)}
    assert len(sets) == 1


@pytest.mark.parametrize("name", ["6.10", "6.10b", "characteristic", "EQU"])
def test_the_lists_by_leading_action_make_up_the_whole(name: str) -> None:
    """Those that Q, S, W and T lead, and the permanent action alone, are the list without a leading action."""
    parts = [texts(name, FOUR, case) for case in SHARES]
    assert set(chain(*parts)) | set(texts(name, "G permanent")) == set(texts(name, FOUR))
    for case, part in zip(SHARES, parts, strict=True):
        full = Fraction("1" if name == "characteristic" else "1.5")
        assert all(one[case] == full for one in factors(part))


def test_the_leading_action_is_named_as_the_row_is() -> None:
    """Any of its cases, in any case of letters, or the whole row's cell."""
    actions = [["G", "permanent"], ["Q", "office"], ["W1 or W2", "wind"]]
    led = texts("6.10", actions, "W1 or W2")
    assert led == texts("6.10", actions, "w2")
    assert led[:4] == ["1.35 G + 1.5 W1", "1.35 G + 1.5 W2", "1.35 G + 1.5 W1 + 1.05 Q", "1.35 G + 1.5 W2 + 1.05 Q"]
    assert texts("quasi-permanent", actions, "W1") == texts("quasi-permanent", actions)


def test_an_action_whose_frequent_value_is_zero_may_lead() -> None:
    """A roof's imposed load that leads with psi1 = 0 leaves the others with psi2."""
    assert texts("frequent", "G permanent; H roof; Q office", "H") == ["G", "G + 0.3 Q"]


def test_terms_of_factor_zero_are_left_out() -> None:
    """Snow has psi2 = 0, a roof's imposed load psi0 = 0: neither stands in a text with a 0."""
    found = texts("6.10a/b", "G permanent; H roof; Q office") + texts("quasi-permanent", FOUR)
    assert all(size for one in factors(found) for size in one.values())
    assert "1.35 G + 1.05 Q" in found


def test_several_permanent_actions() -> None:
    """Each row is a source of its own, adverse or favourable by itself; joined cases are one source."""
    assert texts("6.10", "G permanent; P dead") == ["1.35 G + 1.35 P", "1.35 G + P", "G + 1.35 P", "G + P"]
    assert texts("6.10", "G + P permanent") == ["1.35 G + 1.35 P", "G + P"]
    assert texts("set C", "G permanent; P self-weight") == ["G + P"]


def test_cases_that_exclude_each_other() -> None:
    """Wind from the left or from the right, a temperature up or down: one at a time."""
    assert texts("characteristic", "W1 or W2 wind") == ["W1", "W2"]
    assert texts("characteristic", "T or -T temperature; W wind", "W") == ["W", "W + 0.6 T", "W - 0.6 T"]
    assert texts("characteristic", "-T or T + U temperature") == ["-T", "T + U"]


def test_imposed_loads_of_one_category_are_one_action() -> None:
    """Their parts lead together and accompany together, any of them absent (EN 1991-1-1 3.3.1(2)P)."""
    found = texts("6.10", "A office; B office; W wind")
    assert found == [
        *("1.5 A", "1.5 A + 0.9 W", "1.5 B", "1.5 B + 0.9 W", "1.5 A + 1.5 B", "1.5 A + 1.5 B + 0.9 W"),
        *("1.5 W", "1.5 W + 1.05 A", "1.5 W + 1.05 B", "1.5 W + 1.05 A + 1.05 B"),
    ]
    assert "1.5 A + 1.05 C" in texts("6.10", "A office; C shopping")


def test_own_psi_factors() -> None:
    """In columns or after the action's name; a blank one is that of table A1.1, a 0 is a 0."""
    rows = [
        ["psi2", "ACTION", " ψ₀ ", "Case", "psi 1"],
        [None, None, None, None, None],
        [None, "Permanent", "", "G", None],
        [0.4, "office", 0, "Q", None],
        [None, "wind", 0.5, "W", None],
    ]
    text = "G: permanent; Q: office 0 0.5 0.4; W: wind 0.5"
    for actions in (rows, text, [["G permanent"], [text.partition(";")[2]]]):
        assert texts("characteristic", actions, "W") == ["G + W"]
        assert texts("characteristic", actions, "Q") == ["G + Q", "G + Q + 0.5 W"]
        assert texts("frequent", actions, "W") == ["G + 0.2 W", "G + 0.2 W + 0.4 Q"]
    assert texts("frequent", "V variable 1 0.9 0.8; W wind") == ["0.9 V", "0.2 W", "0.2 W + 0.8 V"]


@pytest.mark.parametrize(
    "given_factors",
    [
        "G 1.25/0.95; Q 1.4; xi 0.9",
        "q=1.4\nXI = 0.9\ng 1.25 / 0.95",
        [["G", 1.25, 0.95], ["Q", 1.4, ""], ["xi", 0.9, None]],
    ],
)
def test_own_partial_factors(given_factors: Argument) -> None:
    """Those of a national annex, as text or as rows, in place of the recommended ones."""
    assert texts("6.10b", "G permanent; Q office", None, given_factors) == [
        *("1.125 G", "1.125 G + 1.4 Q", "0.95 G", "0.95 G + 1.4 Q")
    ]
    assert texts("6.10", "G permanent; Q office", "Q", given_factors) == ["1.25 G + 1.4 Q", "0.95 G + 1.4 Q"]


def test_one_partial_factor_alone() -> None:
    """The rest stay as recommended."""
    assert texts("6.10", "G permanent; Q office", "Q", "G 1.2") == ["1.2 G + 1.5 Q", "G + 1.5 Q"]
    assert texts("EQU", "G permanent; Q office", "Q", [["Q", 1.4]]) == ["1.1 G + 1.4 Q", "0.9 G + 1.4 Q"]


@pytest.mark.parametrize(
    ("one", "other"),
    [
        ("en1990 6.10", "6.10"),
        ("EN 1990:2002+A1:2005, (6.10)", "6.10"),
        (6.1, "6.10"),
        ([["6.10"]], "6.10"),
        ("EN 1990  6.10A with 6.10B", "6.10a/b"),
        ("(6.10a) and (6.10b)", "6.10a/b"),
        ("Quasi Permanent", "quasi-permanent"),
        ("EN 1990 6.14b", "characteristic"),
        ("equ", "EQU"),
    ],
)
def test_names_of_the_expressions(one: Argument, other: str) -> None:
    """A standard is named as it comes to mind, in any case of letters; a cell with 6.10 in it holds 6.1."""
    assert texts(one, FOUR) == texts(other, FOUR)


@pytest.mark.parametrize(("word", "kind"), WORDS.items())
def test_words_for_actions(word: str, kind: str) -> None:
    """Every word, in any case of letters, means the action of table A1.1."""
    assert texts("6.10", f"A {word.upper()}; X variable 1 1 1") == texts("6.10", f"A {kind}; X variable 1 1 1")


@pytest.mark.parametrize("letter", "ABCFH")
def test_letters_of_the_categories(letter: str) -> None:
    """A letter alone is a category where it can mean nothing else."""
    words = (letter, f"category {letter}", f"imposed {letter.lower()}", f"cat. {letter}")
    assert len({str(texts("6.10", [["Q1", word], ["W", "wind"]])) for word in words}) == 1


# --- ASCE 7 ---------------------------------------------------------------------------------------


def test_strength_by_hand() -> None:
    """ASCE 7-22, 2.3.1, with dead and live load, snow and wind."""
    assert texts("ASCE 7-22 strength", "D; L; S; W") == [
        "1.4 D",
        *("1.2 D + 1.6 L", "1.2 D + 1.6 L + 0.3 S"),
        *("1.2 D + S", "1.2 D + S + L", "1.2 D + S + 0.5 W"),
        *("1.2 D + W", "1.2 D + W + 0.3 S", "1.2 D + W + L", "1.2 D + W + L + 0.3 S"),
        *("0.9 D", "0.9 D + W"),
    ]


def test_allowable_by_hand() -> None:
    """ASCE 7-16, 2.4.1 and 2.4.5, with dead and live load and an earthquake in both directions."""
    assert texts("ASCE 7-16 ASD", "D; L; E; Ev") == [
        *("D", "D + L", "0.6 D"),
        *("D + 0.7 Ev + 0.7 E", "D + 0.7 Ev - 0.7 E"),
        *("D + 0.525 Ev + 0.525 E + 0.75 L", "D + 0.525 Ev - 0.525 E + 0.75 L"),
        *("0.6 D - 0.7 Ev + 0.7 E", "0.6 D - 0.7 Ev - 0.7 E"),
    ]


def lines(name: str) -> list[Factors]:
    """Return the combinations of a list as printed, an earthquake in both directions."""
    edition, method = name[2:4], {"strength": "L", "allowable": "A"}[name.split()[1]]
    rows = json.loads((Path(__file__).parent / "published" / "combinations.json").read_text("utf-8"))
    found = [one for row in rows if row["id"].startswith(f"G7-7{edition}{method}-") for one in printed(row["value"])]
    return found + [one | {"Eh": -one["Eh"]} for one in found if "Eh" in one]


def less(line: Factors) -> list[Factors]:
    """Return a printed combination with any of its loads but the dead one not acting."""
    transient = [case for case in line if case not in ("D", "Ev")]
    return [
        {case: size for case, size in line.items() if case not in gone and not (case == "Ev" and "Eh" in gone)}
        for presence in product((True, False), repeat=len(transient))
        for gone in [{case for case, there in zip(transient, presence, strict=True) if not there}]
    ]


def actions_of(name: str) -> str:
    """Return every action that a list knows."""
    return LETTERS if "22" in name else LETTERS.replace("WT; ", "")


@pytest.mark.parametrize("name", LISTS)
def test_every_combination_is_printed_or_less_than_a_printed_one(name: str) -> None:
    """Nothing is listed but printed combinations, some of their loads not acting."""
    found = as_set(factors(texts(f"ASCE {name}", actions_of(name))))
    assert found <= as_set([one for line in lines(name) for one in less(line)])
    assert as_set(lines(name)) <= found


def lies_among(one: Factors, found: Sequence[Factors]) -> bool:
    """Tell whether a combination is a mean of others with weights, so that its effects lie between theirs."""
    cases = LETTERS.split("; ")
    points = [[float(other.get(case, 0)) for case in cases] + [1.0] for other in found]
    wanted = [float(one.get(case, 0)) for case in cases] + [1.0]
    return bool(linprog([0.0] * len(found), A_eq=list(zip(*points, strict=True)), b_eq=wanted).status == 0)


@pytest.mark.parametrize("name", LISTS)
def test_loads_that_do_not_act_give_nothing_beyond_the_list(name: str) -> None:
    """A printed combination, whichever of its loads act, is listed or lies between listed ones.

    Without D at its least, or any combination of five loads, the list would fall short.
    """
    found = factors(texts(f"ASCE {name}", actions_of(name)))
    assert all(lies_among(one, found) for line in lines(name) for one in less(line))
    least = {"D": Fraction("0.9" if "strength" in name else "0.6")}
    for one in (least, *(one for one in found if len(one) == 5)):
        assert one in found
        assert not lies_among(one, [other for other in found if other != one]), one


@pytest.mark.parametrize("name", LISTS)
def test_the_order_of_the_loads_does_not_matter(name: str) -> None:
    """Backwards the same set comes, and a load's name may be a word."""
    actions = actions_of(name)
    words = "D dead; L live; Lr roof live; S snow; R rain; W wind; WT tornado; Ev ev; Eh earthquake"
    whole = as_set(factors(texts(f"ASCE {name}", actions)))
    assert whole == as_set(factors(texts(f"ASCE {name}", "; ".join(reversed(actions.split("; "))))))
    assert whole == as_set(factors(texts(f"ASCE {name}", words if "22" in name else words.replace("WT tornado; ", ""))))


def test_several_rows_of_a_load() -> None:
    """Dead loads act together, live loads any of them, winds one at a time; Ev alone is an earthquake too."""
    assert texts("ASCE 7-22 LRFD", [["D1", "D"], ["D2", "dead"]]) == ["1.4 D1 + 1.4 D2", "0.9 D1 + 0.9 D2"]
    assert texts("ASCE 7-22 ASD", "A live; B live") == ["A", "B", "A + B"]
    assert texts("ASCE 7-22 ASD", "W1 or W2 wind") == ["0.6 W1", "0.6 W2"]
    assert texts("ASCE/SEI 7-16, allowable stress design", "Ev") == ["0.7 Ev", "-0.7 Ev"]


# --- both -----------------------------------------------------------------------------------------

CASE = st.from_regex(r"[A-Za-zäé][A-Za-z0-9_]{0,4}", fullmatch=True).filter(lambda name: name.lower() != "or")
EN_ACTION = st.sampled_from(["permanent", *TABLE_A1_1, "variable 0.35 0.25 0.15"])


@given(
    st.sampled_from(list(EXPRESSIONS)),
    st.lists(CASE, min_size=1, max_size=5, unique_by=str.casefold),
    st.lists(EN_ACTION, min_size=5, max_size=5, unique=True),
)
def test_every_text_can_be_read_back(name: str, cases: list[str], kinds: list[str]) -> None:
    """Any names of cases, e5 and the like too: the notation reads the factors that the text shows, and no others."""
    actions = "; ".join(f"{case} {kind}" for case, kind in zip(cases, kinds, strict=False))
    try:
        found = texts(name, actions)
    except BeamError as error:
        assert error.value == NA  # noqa: PT017  # every factor is 0
        return
    for text in found:
        read = read_combination(text)
        assert read is not None
        shown = [word for word in text.split() if word not in "+-"]
        names = [word for word in shown if word.lstrip("-").casefold() in {case.casefold() for case in cases}]
        assert [case for case, *_ in read] == [case.lstrip("-").casefold() for case in names]
        assert all(factor != 0 for _, factor, *_ in read)


@pytest.mark.parametrize(
    ("arguments", "value", "says"),
    [
        ((None, FOUR), VALUE, "standard: blank"),
        ((6.2, FOUR), VALUE, "quasi-permanent"),
        (("EN 1990", FOUR), VALUE, "6.10a/b"),
        (("ASCE 7 strength", FOUR), VALUE, "give the edition"),
        (("ASCE 7-10 strength", FOUR), VALUE, "'ASCE 7-22 strength'"),
        (([["6.10", "EQU"]], FOUR), VALUE, "standard: a range"),
        ((ErrorValue("#REF!"), FOUR), "#REF!", "mend that cell"),
        (("6.10", None), VALUE, "'G permanent; Q office; S snow; W wind'"),
        (("6.10", 5), VALUE, "the number 5"),
        (("6.10", "G"), VALUE, "it does not say what G is"),
        (("6.10", "Q imposed"), VALUE, "category A to H"),
        (("6.10", "G G"), VALUE, "write 'category G'"),
        (("6.10", "D D"), VALUE, "permanent"),
        (("6.10", "1G permanent"), VALUE, "does not begin with a case"),
        (("6.10", "G permanent; g wind"), VALUE, "a case belongs to one action"),
        (("6.10", "G permanent; V wind; W wind"), VALUE, "clause 3: V and W are both wind; write 'V or W'"),
        (("6.10", "W + w wind"), VALUE, "joins a case to itself"),
        (("6.10", "W wind 1.5"), NUM, "between 0 and 1"),
        (("6.10", "W wind -0.1"), NUM, "between 0 and 1"),
        (("6.10", "W wind 0,5"), VALUE, "decimals with a point"),
        (("6.10", "W wind 0.1 0.2 0.3 0.4"), VALUE, "'wind 0.1' is not known"),
        (("6.10", "G permanent 0.7"), VALUE, "no psi"),
        (("frequent", "V variable 0.7"), VALUE, "no psi1"),
        (("6.10", [["G", None], ["Q", "office"]]), VALUE, "row 1: it does not say what G is"),
        (("6.10", [[1, "permanent"]]), VALUE, "row 1: case 1"),
        (("6.10", [["G", 3]]), VALUE, "row 1: action 3"),
        (("6.10", [[None, "permanent"], ["Q", "office"]]), VALUE, "row 1"),
        (("6.10", [["case", "kind"], ["G", "permanent"]]), VALUE, "header 'kind' is not known"),
        (("6.10", [["case", "case"], ["G", "permanent"]]), VALUE, "stands twice"),
        (("6.10", [["action", "psi0"], ["wind", 1]]), VALUE, "no header 'case'"),
        (("6.10", [["case", "action", ""], ["G", "permanent", "x"]]), VALUE, "row 2: 'x' in column 3"),
        (("6.10", [["G", "permanent", "", "", "", "y"]]), VALUE, "column 6"),
        (("6.10", [["G", "permanent"], ["Q", ErrorValue("#N/A")]]), NA, "row 2, column 2"),
        (("6.10", [["G", "permanent"], ["Q", True]]), VALUE, "truth value"),
        (("6.10", FOUR, "X"), NA, "they are Q, S, W, T"),
        (("6.10", FOUR, "G"), NA, "no variable action"),
        (("6.10", FOUR, 2), VALUE, "leading: the number 2"),
        (("6.10", FOUR, "1.5 Q"), VALUE, "no case"),
        (("6.10", FOUR, None, "G 1,35"), VALUE, "decimals with a point"),
        (("6.10", FOUR, None, "R 1.2"), VALUE, "'G 1.35/1.0; Q 1.5; xi 0.85'"),
        (("6.10", FOUR, None, "Q 1.5/0"), VALUE, "not understood"),
        (("6.10", FOUR, None, "G 1.2; G 1.3"), VALUE, "twice"),
        (("6.10", FOUR, None, "G 135"), NUM, "at most 10"),
        (("6.10", FOUR, None, "Q 0"), NUM, "greater than 0"),
        (("6.10b", FOUR, None, "xi 1.2"), NUM, "at most 1"),
        (("6.10", FOUR, None, 1.35), VALUE, "factors: the number 1.35"),
        (("frequent", FOUR, None, "G 1.2"), VALUE, "table A1.4"),
        (("quasi-permanent", "W wind"), NA, "every factor is 0"),
        (("6.10", "; ".join(f"A{n} office" for n in range(14))), NUM, "more than 10000"),
        (("6.10", "; ".join(f"A{n} office" for n in range(101))), NUM, "at most 100"),
        (("ASCE 7-16 ASD", "D; WT"), VALUE, "'WT' is not known"),
        (("ASCE 7-22 ASD", "D; Q"), VALUE, "D, L, Lr, S, R, W, WT, Eh, Ev"),
        (("ASCE 7-22 ASD", "D; L live 0.3"), VALUE, "no psi"),
        (("ASCE 7-22 ASD", "D; W; V wind"), VALUE, "'W or V'"),
        (("ASCE 7-22 ASD", "D; L", "L"), VALUE, "leading: ASCE 7 has none"),
        (("ASCE 7-22 ASD", "D; L", None, "G 1.2"), VALUE, "factors: ASCE 7 has none"),
        (("ASCE 7-22 ASD", "; ".join(f"A{n} live" for n in range(60))), NUM, "more than 10000"),
        (("ASCE 7-22 ASD", "; ".join(f"A{n} or B{n} dead" for n in range(60))), NUM, "more than 10000"),
    ],
)
def test_what_cannot_be_read(arguments: tuple[Argument, ...], value: str, says: str) -> None:
    """One whole line that says which argument, what was read and what would be right."""
    with pytest.raises(BeamError) as caught:
        combinations(*arguments)
    assert caught.value.value == value
    assert says in caught.value.reason
    assert not caught.value.reason.endswith("...")


def test_the_longest_list_is_given() -> None:
    """Thirteen parts of one action, 8191 choices, are listed: the limit is at 10,000."""
    assert len(texts("6.10", "; ".join(f"A{n} office" for n in range(13)))) == 2**13 - 1
