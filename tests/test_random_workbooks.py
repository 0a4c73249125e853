"""Small workbooks made at random: what `fill` stores is what a direct computation in Python gives, to the last bit."""

from __future__ import annotations

import operator
from collections.abc import Callable
from typing import Any, NamedTuple

import openpyxl
import pytest
from books import build
from hypothesis import given, settings
from hypothesis import strategies as st

from beamfuncs.errors import BeamError, ErrorValue
from beamfuncs.functions import beam_line, deflection_at, load_line, moment_at, moment_max, reaction, shear_min
from beamfuncs.hosts.headless.filling import fill

SHEETS = ("Plan", "Roof 2", "Bo's")
ERROR = ErrorValue("#VALUE!")
"""Stands for any error: which one goes on where two meet is not looked at."""
ROWS, COLUMNS = 6, "ABCD"
DECIMALS = st.floats(0.25, 12.0).map(lambda number: round(number, 12))  # as many as the workbook's writer keeps
NUMBERS = st.one_of(st.integers(-40, 40).map(lambda n: n / 4), DECIMALS)
LENGTHS = st.one_of(st.integers(1, 12).map(float), DECIMALS)


class Node(NamedTuple):
    """A cell: where it stands, what is entered, and the value that it must have."""

    sheet: str
    cell: str
    entry: object
    value: Any

    def seen_from(self, sheet: str) -> str:
        """How a formula refers to it."""
        return self.cell if sheet == self.sheet else "'" + self.sheet.replace("'", "''") + "'!" + self.cell


class Term(NamedTuple):
    """A part of a formula, and its value."""

    text: str
    value: Any


def answered(function: Callable[..., Any], *arguments: Any) -> Any:
    """What a function answers, or `ERROR`."""
    try:
        return function(*arguments)
    except (BeamError, ZeroDivisionError):
        return ERROR


def arithmetic(function: Callable[..., float], *arguments: Any) -> Any:
    """What a worksheet makes of arguments, of which any may be an error."""
    return ERROR if any(isinstance(one, ErrorValue) for one in arguments) else answered(function, *arguments)


ORDINARY: list[tuple[str, Callable[..., float]]] = [
    ("({0}+{1})", operator.add),
    ("({0}-{1})", operator.sub),
    ("{0}*{1}", operator.mul),
    ("{0}/{1}", operator.truediv),
    ("MAX({0},{1})", max),
    ("MIN({0},{1})", min),
    ("IF({0}>{1},{0},0)", lambda a, b: a if a > b else 0.0),
    ("ABS({0})-{1}/2", lambda a, b: abs(a) - b / 2),
]
ASKING: list[tuple[str, Callable[[Any, Any, Any], float]]] = [
    ("moment_max({0},{1},,1000)", lambda beam, loads, _: moment_max(beam, loads, None, 1000)),
    ("shear_min({0},{1})", lambda beam, loads, _: shear_min(beam, loads)),
    ("reaction({0},{1},2)", lambda beam, loads, _: reaction(beam, loads, 2)),
    ("reaction({0},{1},3)", lambda beam, loads, _: reaction(beam, loads, 3)),
    ("moment_at({0},{1},{2})", moment_at),
    ("Deflection_At({0},{1},{2},2500)", lambda beam, loads, x: deflection_at(beam, loads, x, 2500)),
]
MARKS = ("pinned", "fixed", "roller", "free")


@st.composite
def workbooks(draw: st.DrawFn) -> list[Node]:
    """The cells of a workbook, each built on some before it, wherever they stand."""
    places = draw(
        st.lists(
            st.tuples(st.sampled_from(SHEETS), st.sampled_from(COLUMNS), st.integers(1, ROWS)),
            min_size=5,
            max_size=20,
            unique=True,
        )
    )
    kinds: dict[str, list[Node]] = {"number": [], "length": [], "beam": [], "loads": []}

    def term(kind: str, fresh: st.SearchStrategy[Any], sheet: str) -> Term:
        if kinds[kind] and draw(st.integers(0, 3)):
            node = draw(st.sampled_from(kinds[kind]))
            return Term(node.seen_from(sheet), node.value)
        value = draw(fresh)
        return Term(f'"{value}"' if isinstance(value, str) else repr(value), value)

    def entry(kind: str, sheet: str) -> tuple[object, Any]:
        number = [term("number", NUMBERS, sheet) for _ in range(2)]
        if kind == "length":
            value = draw(LENGTHS)
            return value, value
        if kind == "constant":
            value = draw(NUMBERS)
            return value, value
        if kind == "beam":
            first, last = draw(st.sampled_from(MARKS)), draw(st.sampled_from(MARKS))
            spans = [term("length", LENGTHS, sheet) for _ in range(2)]
            text = f'=beam_line("{first}",{spans[0].text},"pinned",{spans[1].text},"{last}")'
            return text, answered(beam_line, first, spans[0].value, "pinned", spans[1].value, last)
        if kind == "loads":
            text = f'=load_line("udl",{number[0].text},"; point",{number[1].text},"at 1 in span 1")'
            return text, answered(load_line, "udl", number[0].value, "; point", number[1].value, "at 1 in span 1")
        if kind == "asking":
            form, function = draw(st.sampled_from(ASKING))
            beam = term("beam", st.sampled_from(["pinned 6 roller", "fixed 4 pinned 5 roller", "nonsense"]), sheet)
            loads = term("loads", st.sampled_from(["udl 3", "udl 2; point 5 at 0.5", "point 4 at 3"]), sheet)
            value = answered(function, beam.value, loads.value, number[0].value)
            return "=" + form.format(beam.text, loads.text, number[0].text), value
        form, function = draw(st.sampled_from(ORDINARY))
        return "=" + form.format(*(one.text for one in number)), arithmetic(function, *(one.value for one in number))

    nodes = []
    for index, (sheet, column, row) in enumerate(places):
        some = ("length", "constant") if index < 2 else ("beam", "loads", "asking", "asking", "ordinary", "ordinary")
        kind = draw(st.sampled_from(some))
        node = Node(sheet, f"{column}{row}", *entry(kind, sheet))
        kinds[kind if kind in kinds else "number"].append(node)
        nodes.append(node)
    return nodes


@settings(max_examples=200, deadline=None, derandomize=True)
@given(nodes=workbooks())
def test_the_filled_values_are_those_of_python(tmp_path_factory: pytest.TempPathFactory, nodes: list[Node]) -> None:
    """Every cell holds what Python computes from the same functions and operations; an error is an error."""
    path = tmp_path_factory.mktemp("books") / "book.xlsx"
    report = fill(build(path, {f"{node.sheet}!{node.cell}": node.entry for node in nodes}))
    book = openpyxl.load_workbook(report.target, data_only=True)
    failing = {(fault.sheet, fault.cell) for fault in report.errors}
    for sheet, cell, entry, value in nodes:
        held = book[sheet][cell]
        if isinstance(value, ErrorValue):
            assert held.data_type == "e", (sheet, cell, entry, held.value)
            assert (sheet, cell) in failing
        else:
            assert held.value == value, (sheet, cell, entry)
            assert (sheet, cell) not in failing
    assert report.beam_cells + report.recomputed == sum(str(node.entry).startswith("=") for node in nodes)


@settings(max_examples=120, deadline=None, derandomize=True, database=None)
@given(nodes=workbooks())
def collected(nodes: list[Node]) -> None:
    """Note what the generated workbooks hold."""
    SEEN.append(nodes)


SEEN: list[list[Node]] = []


def test_the_workbooks_are_worth_the_while() -> None:
    """Among them are references between sheets and upwards, beams built on beams, numbers and errors in plenty."""
    collected()
    nodes = [node for nodes in SEEN for node in nodes]
    asked = [node for node in nodes if "(" in str(node.entry) and "_line" not in str(node.entry)]
    assert sum("!" in str(node.entry) for node in nodes) > 100
    assert sum(isinstance(node.value, float) and node.value != 0 for node in asked) > 100
    assert sum(isinstance(node.value, ErrorValue) for node in asked) > 20
    for name in ("moment_max", "shear_min", "reaction", "moment_at", "Deflection_At", "beam_line", "load_line"):
        assert sum(f"{name}(" in str(node.entry) for node in nodes) > 10, name
