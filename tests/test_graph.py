"""What follows for a cell from the cells above it, against a plain search."""

from __future__ import annotations

from hypothesis import given, settings
from hypothesis import strategies as st

from beamfuncs.hosts.headless.graph import IN_CIRCLE, Graph, Place, Reference
from beamfuncs.hosts.headless.grid import Area

ROWS, COLUMNS = 6, 3
CELLS = [(0, row, column) for row in range(1, ROWS + 1) for column in range(1, COLUMNS + 1)]
MARK = 8


@st.composite
def areas(draw: st.DrawFn) -> Reference:
    """A reference to one cell, a range, or whole columns."""
    top, bottom = sorted(draw(st.tuples(*[st.integers(1, ROWS)] * 2)))
    left, right = sorted(draw(st.tuples(*[st.integers(1, COLUMNS)] * 2)))
    kind = draw(st.sampled_from(["cell", "range", "columns"]))
    if kind == "cell":
        return 0, Area(top, left, top, left)
    return 0, Area(top, left, bottom, right) if kind == "range" else Area(1, left, 1_048_576, right)


BOOKS = st.dictionaries(st.sampled_from(CELLS), st.lists(areas(), max_size=3), min_size=1)


def above(references: dict[Place, list[Reference]], node: Place) -> set[Place]:
    """All that a cell builds on, found by a plain search."""
    found: set[Place] = set()
    waiting = [node]
    while waiting:
        for _, area in references[waiting.pop()]:
            reached = {cell for cell in references if area.holds(*cell[1:])} - found
            found |= reached
            waiting += reached
    return found


@settings(max_examples=300, deadline=None, derandomize=True)
@given(BOOKS, st.sets(st.sampled_from(CELLS)), st.permutations(CELLS))
def test_a_cell_bears_the_marks_of_all_it_builds_on(
    references: dict[Place, list[Reference]], marked: set[Place], asked: list[Place]
) -> None:
    """In whatever order cells are asked for; a cell that may refer to itself, or builds on one, is marked as such."""
    graph = Graph(
        {cell: cell for cell in references}, lambda node: references[node], lambda node, _: MARK * (node in marked)
    )
    nodes = [node for node in asked if node in references]
    for node in nodes:
        graph.marks(node)
    reached = {node: above(references, node) for node in nodes}
    for node in nodes:
        circular = {
            one for one in {node, *reached[node]} if any(one in reached[two] and two != one for two in reached[one])
        }
        if circular:
            assert graph.marks(node) & IN_CIRCLE
        else:
            assert bool(graph.marks(node) & MARK) is bool(({node} | reached[node]) & marked)
            assert bool(graph.above(node) & MARK) is bool(reached[node] - {node} & marked)
            assert not graph.marks(node) & IN_CIRCLE
            place = {one: number for number, one in enumerate(graph.order)}
            assert all(place[one] < place[node] for one in reached[node] - {node})


def test_ends_are_not_looked_behind() -> None:
    """Above an end nothing is looked for: it has the marks of its own."""
    cells = [(0, row, 1) for row in (1, 2, 3)]
    inputs = {(0, 1, 1): [], (0, 2, 1): [(0, Area(1, 1, 1, 1))], (0, 3, 1): [(0, Area(2, 1, 2, 1))]}
    graph = Graph(
        {cell: cell for cell in cells}, inputs.__getitem__, lambda node, _: 1 << node[1] + 1, ends={(0, 2, 1)}
    )
    assert graph.marks((0, 3, 1)) == (1 << 3) + (1 << 4)
    assert list(graph.inputs_bearing(1 << 3, (0, 3, 1))) == [(0, 2, 1)]


def test_what_an_array_fills_bears_its_marks() -> None:
    """A reference to any cell of an array is one to the cell that fills it."""
    anchor, user = (0, 1, 1), (0, 9, 9)
    filled = {anchor: anchor, (0, 2, 1): anchor, user: user}
    inputs = {anchor: [], user: [(0, Area(2, 1, 5, 1))]}
    graph = Graph(filled, inputs.__getitem__, lambda node, _: MARK * (node == anchor))
    assert graph.marks(user) == MARK
