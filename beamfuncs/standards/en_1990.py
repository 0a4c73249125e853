"""EN 1990:2002+A1:2005, Basis of structural design: combinations of actions for buildings (annex A1)."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from decimal import Decimal
from itertools import product

from beamfuncs.cells import Frozen, as_text, not_given, number, rows_of
from beamfuncs.errors import absent, impossible, quoted, unreadable
from beamfuncs.standards.actions import PSI, Action, read_ways, twice
from beamfuncs.standards.listing import Terms, acting, selections

ONE = Decimal(1)


@dataclass(frozen=True)
class Partial:
    """Partial factors: of permanent actions, adverse and favourable; of variable ones; and xi of (6.10b)."""

    adverse: Decimal
    favourable: Decimal
    variable: Decimal
    xi: Decimal = ONE


SET_A = Partial(Decimal("1.10"), Decimal("0.90"), Decimal("1.50"))
"""Table A1.2(A): EQU."""
SET_B = Partial(Decimal("1.35"), Decimal("1.00"), Decimal("1.50"), Decimal("0.85"))
"""Table A1.2(B): STR and GEO."""
SET_C = Partial(Decimal("1.00"), Decimal("1.00"), Decimal("1.30"))
"""Table A1.2(C): STR and GEO."""
SERVICE = Partial(ONE, ONE, ONE)
"""Table A1.4: serviceability."""

ALL, NONE = "all of it", "none"
"""What the leading action is multiplied with, beside a psi: nothing; or there is no leading action."""


@dataclass(frozen=True)
class Expression:
    """An expression for the combination of actions: its factors, and what the variable actions are multiplied with."""

    partial: Partial
    leading: str
    accompanying: str
    reduced: bool = False
    """Whether xi reduces the adverse permanent actions."""


_A = Expression(SET_B, NONE, "psi0")
_B = Expression(SET_B, ALL, "psi0", reduced=True)
EXPRESSIONS: dict[str, tuple[Expression, ...]] = {
    "6.10": (Expression(SET_B, ALL, "psi0"),),
    "6.10a/b": (_A, _B),
    "6.10a": (_A,),
    "6.10b": (_B,),
    "EQU": (Expression(SET_A, ALL, "psi0"),),
    "set C": (Expression(SET_C, ALL, "psi0"),),
    "characteristic": (Expression(SERVICE, ALL, "psi0"),),
    "frequent": (Expression(SERVICE, "psi1", "psi2"),),
    "quasi-permanent": (Expression(SERVICE, NONE, "psi2"),),
}
"""Clauses 6.4.3.2 (6.10, 6.10a, 6.10b) and 6.5.3 (6.14b, 6.15b, 6.16b)."""

NAMES = {name.lower().replace("-", " "): name for name in EXPRESSIONS} | {
    "6.1": "6.10",  # as a cell keeps the number 6.10
    "6.10a/6.10b": "6.10a/b",
    "6.14b": "characteristic",
    "6.15b": "frequent",
    "6.16b": "quasi-permanent",
}
"""What an expression may be called."""

TABLE_A1_1 = {
    "category a": "0.7 0.5 0.3",
    "category b": "0.7 0.5 0.3",
    "category c": "0.7 0.7 0.6",
    "category d": "0.7 0.7 0.6",
    "category e": "1.0 0.9 0.8",
    "category f": "0.7 0.7 0.6",
    "category g": "0.7 0.5 0.3",
    "category h": "0 0 0",
    "snow above 1000 m": "0.7 0.5 0.2",
    "snow": "0.5 0.2 0",
    "wind": "0.6 0.2 0",
    "temperature": "0.6 0.5 0",
}
"""psi0, psi1 and psi2 that table A1.1 recommends."""

PERMANENT, VARIABLE = "permanent", "variable"
WORDS = {
    "domestic": "category a",
    "residential": "category a",
    "office": "category b",
    "offices": "category b",
    "congregation": "category c",
    "shopping": "category d",
    "storage": "category e",
    "roof": "category h",
    "roofs": "category h",
    "dead": PERMANENT,
    "self weight": PERMANENT,
    "snow up to 1000 m": "snow",
    "thermal": "temperature",
} | {f"snow in {country}": "snow above 1000 m" for country in ("finland", "iceland", "norway", "sweden")}
"""Other words for what an action is: the category's use, by table A1.1."""

_CATEGORY = re.compile(r"(?:imposed )?(?:(?:category|cat\.?) )?([a-h])")
_AMBIGUOUS = ("d", "e", "g")
"""Letters that may be meant as dead, earthquake or permanent, and are categories too."""


def combined(name: str, actions: Sequence[Action], leading: Frozen, factors: Frozen) -> Iterator[Terms]:
    """Yield the combinations of an expression, or of two that belong together."""
    actions = [replace(action, kind=_kind(action)) for action in actions]
    permanent = [action for action in actions if action.kind == PERMANENT]
    variable = [action for action in actions if action.kind != PERMANENT]
    groups = _groups(variable)
    led: list[Sequence[Action]] = [(), *groups] if not_given(leading) else [_leading(leading, groups)]
    for expression in EXPRESSIONS[name]:
        partial = _partial(name, expression.partial, factors)
        adverse = partial.adverse * (partial.xi if expression.reduced else ONE)
        sides = [adverse] if adverse == partial.favourable else [adverse, partial.favourable]
        for permanent_factors in product(sides, repeat=len(permanent)):
            held = list(zip(permanent_factors, permanent, strict=True))
            for present in _present(replace(expression, partial=partial), variable, led):
                yield from acting(held + present)


def _present(
    expression: Expression, variable: Sequence[Action], led: Sequence[Sequence[Action]]
) -> Iterator[list[tuple[Decimal, Action]]]:
    """Yield the variable actions that are present, with their factors: some of a group of `led` lead, or none does."""

    def factored(times: str, these: Sequence[Action]) -> list[tuple[Decimal, Action]]:
        factors = [expression.partial.variable * _times(times, action) for action in these]
        return [(factor, action) for factor, action in zip(factors, these, strict=True) if factor]

    if expression.leading == NONE:
        yield from map(list, selections(factored(expression.accompanying, variable)))
        return
    for group in led:
        if not group:
            yield []
            continue
        leads = factored(expression.leading, group)
        others = factored(expression.accompanying, [action for action in variable if action not in group])
        for lead in selections(leads, 1 if leads else 0):
            for rest in selections(others):
                yield [*lead, *rest]


def _times(which: str, action: Action) -> Decimal:
    """Return what an action is multiplied with: its own psi, or that of table A1.1."""
    if which == ALL:
        return ONE
    index = PSI.index(which)
    own = action.psi[index]
    if own is not None:
        return own
    if action.kind == VARIABLE:
        raise unreadable(f"{action.where}: no {which}; a 'variable' action has none in table A1.1, so give all three")
    return Decimal(TABLE_A1_1[action.kind].split()[index])


# --- what is given --------------------------------------------------------------------------------


def _kind(action: Action) -> str:
    """Return what an action is, in the words of table A1.1."""
    words = action.kind.replace("-", " ")
    category = _CATEGORY.fullmatch(words)
    if category and words in _AMBIGUOUS:
        raise unreadable(
            f"{action.where}: '{words.upper()}' may be meant as a category or not; write 'category {words.upper()}',"
            f" or what {action.text} is: permanent, snow, wind"
        )
    kind = f"category {category[1]}" if category else words.removeprefix("imposed ")
    kind = WORDS.get(kind, kind)
    if kind == PERMANENT and any(psi is not None for psi in action.psi):
        raise unreadable(f"{action.where}: a permanent action has no psi; leave them blank")
    if kind not in (PERMANENT, VARIABLE, *TABLE_A1_1):
        read = f"{quoted(action.kind, 30)} is not known" if kind else f"it does not say what {action.text} is"
        raise unreadable(
            f"{action.where}: {read}; write permanent, category A to H (or domestic, office, congregation, shopping,"
            " storage, roof), snow, wind, temperature, or variable with psi0, psi1, psi2"
        )
    return kind


def _groups(variable: Sequence[Action]) -> list[list[Action]]:
    """Return the actions that lead together: imposed loads of one category, else each by itself."""
    groups: dict[str, list[Action]] = {}
    for count, action in enumerate(variable):
        group = groups.setdefault(f"{VARIABLE} {count}" if action.kind == VARIABLE else action.kind, [])
        if group and not action.kind.startswith("category"):
            raise twice(action, group[0], action.kind)
        group.append(action)
    return list(groups.values())


def _leading(leading: Frozen, groups: Sequence[list[Action]]) -> list[Action]:
    if not isinstance(leading, str):
        read = "a range" if isinstance(leading, tuple) else f"the number {leading:g}"
        raise unreadable(f"leading: {read}; give the case of one variable action, or leave it blank")
    wanted = {case.casefold() for way in read_ways("leading", leading) for _, case in way}
    for group in groups:
        if any(wanted <= action.cases for action in group):
            return group
    known = ", ".join(action.text for group in groups for action in group)
    raise absent(f"leading: {quoted(leading, 30)} is no variable action; they are {known or 'none'}")


_NAMED = re.compile(r"(g|q|xi)[ =]+(\S+?)(?: ?/ ?(\S+))?")
_FACTORS = "give e.g. 'G 1.35/1.0; Q 1.5; xi 0.85'"
MOST_FACTOR = 10


def _partial(name: str, recommended: Partial, factors: Frozen) -> Partial:
    """Return the partial factors, those that are given in place of the recommended ones."""
    if not_given(factors):
        return recommended
    if recommended is SERVICE:
        raise unreadable(f"factors: {name} combinations have none (6.5.3, table A1.4); leave them blank")
    if isinstance(factors, float):
        raise unreadable(f"factors: the number {factors:g}; {_FACTORS}")
    given: dict[str, Decimal] = {}
    for text in _factor_texts(factors):
        term = _NAMED.fullmatch(" ".join(text.lower().split()))
        if term is None or (term[3] and term[1] != "g"):
            raise unreadable(f"factors: {quoted(text, 40)} is not understood; {_FACTORS}")
        parts = {"g": ("adverse", "favourable"), "q": ("variable",), "xi": ("xi",)}[term[1]]
        for part, word in zip(parts, term.groups()[1:], strict=False):
            if part in given:
                raise unreadable(f"factors: {quoted(text, 40)} gives a factor twice; {_FACTORS}")
            if word:
                given[part] = _factor(f"factors, {quoted(text, 40)}", word, 1 if part == "xi" else MOST_FACTOR)
    return replace(recommended, **given)


def _factor_texts(factors: Frozen) -> Iterator[str]:
    """Yield the text of each factor; a row of a range holds a name and one or two numbers."""
    for row in rows_of(factors):
        cells = [as_text(cell) if isinstance(cell, float) else cell for cell in row if cell is not None]
        numbers = " / ".join(cell for cell in cells[1:])
        text = f"{cells[0]} {numbers}".strip() if cells else ""
        yield from (part for part in re.split(r"[;\n\r]", text) if part.strip())


def _factor(where: str, word: str, most: int) -> Decimal:
    size = number(where, word)
    if not 0 < size <= most:
        raise impossible(f"{where}: {size:g}; the factor is greater than 0 and at most {most}")
    return Decimal(as_text(size))
