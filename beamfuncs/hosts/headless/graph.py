"""Which cells a workbook's formulas build on, and what follows for a cell from the cells above it.

A node is a cell whose formula gives values: its own, and those that its array fills. What is told of a
node are a few marks, such as "depends on a beam"; a node bears its own marks and all those of the nodes
that it refers to. The walk goes upwards only from the cells that are asked for, keeps no recursion,
and meets each node once, also where thousands of formulas refer to overlapping ranges.
"""

from __future__ import annotations

from bisect import bisect_left, bisect_right, insort
from collections import defaultdict
from collections.abc import Callable, Collection, Iterable, Iterator, Mapping
from typing import TypeAlias

from beamfuncs.hosts.headless.grid import Area, Place

Reference: TypeAlias = "tuple[int, Area]"
"""The number of a sheet and an area in it."""
Inputs: TypeAlias = "Callable[[Place], Iterable[Reference]]"
"""The sheets and areas that the formula of a cell refers to."""

IN_CIRCLE = 1
"""The mark of a node that refers back to itself, if only on a way that is not taken, or builds on one that does."""


class _Column:
    """The places in one column that nodes fill: their rows, and which of them are settled and bear which mark."""

    def __init__(self, rows: list[int]) -> None:
        self.rows = rows
        self.next = list(range(len(rows) + 1))
        self.marked: defaultdict[int, list[int]] = defaultdict(list)

    def unsettled(self, area: Area) -> Iterator[int]:
        """Yield the rows of an area whose nodes are not settled yet."""
        last = bisect_right(self.rows, area.bottom)
        index = self._skip(bisect_left(self.rows, area.top))
        while index < last:
            yield self.rows[index]
            index = self._skip(index + 1)

    def settle(self, row: int, marks: int) -> None:
        index = bisect_left(self.rows, row)
        self.next[index] = index + 1
        for mark in _each(marks):
            insort(self.marked[mark], row)

    def marks(self, area: Area) -> int:
        return sum(mark for mark in list(self.marked) if next(self.bearing(mark, area), 0))

    def bearing(self, mark: int, area: Area) -> Iterator[int]:
        rows = self.marked.get(mark, [])
        for index in range(bisect_left(rows, area.top), bisect_right(rows, area.bottom)):
            yield rows[index]

    def _skip(self, index: int) -> int:
        """Return the first index from `index` on that is not settled, shortening the way for the next."""
        end = index
        while self.next[end] != end:
            end = self.next[end]
        while self.next[index] != end:
            self.next[index], index = end, self.next[index]
        return end


class Graph:
    """The marks of nodes, found as they are asked for.

    `filled` has for each place that a node fills the node; `own` gives the marks of a node by itself,
    and is told those that come from above. Above the nodes in `ends` nothing is looked for.
    """

    def __init__(
        self,
        filled: Mapping[Place, Place],
        inputs: Inputs,
        own: Callable[[Place, int], int],
        ends: Collection[Place] = (),
    ) -> None:
        self._filled = filled
        self._inputs = inputs
        self._own = own
        self._ends = ends
        self._places: defaultdict[Place, list[Place]] = defaultdict(list)
        rows: defaultdict[tuple[int, int], list[int]] = defaultdict(list)
        for place, node in filled.items():
            self._places[node].append(place)
            rows[place[0], place[2]].append(place[1])
        self._columns = {column: _Column(sorted(found)) for column, found in rows.items()}
        self._by_sheet: defaultdict[int, list[int]] = defaultdict(list)
        for number, column in self._columns:
            self._by_sheet[number].append(column)
        self._marks: dict[Place, int] = {}
        self._above: dict[Place, int] = {}
        self.order: list[Place] = []
        """The nodes settled so far, each after those it builds on."""

    def marks(self, node: Place) -> int:
        """Return the marks of a node."""
        if node not in self._marks:
            self._settle(node)
        return self._marks[node]

    def above(self, node: Place) -> int:
        """Return the marks that a node has from the nodes above it."""
        self.marks(node)
        return self._above[node]

    def inputs_bearing(self, mark: int, node: Place) -> Iterator[Place]:
        """Yield the nodes with a mark that a node refers to itself; all must be settled."""
        for number, area in self._inputs(node):
            for column in self._columns_of(number, area):
                for row in self._columns[number, column].bearing(mark, area):
                    yield self._filled[number, row, column]

    def _settle(self, asked: Place) -> None:
        open_nodes = {asked: self._opened(asked)}
        while open_nodes:
            node, (references, unsettled) = next(reversed(open_nodes.items()))
            above = next((one for one in unsettled if one not in open_nodes and one not in self._marks), None)
            if above is not None:
                open_nodes[above] = self._opened(above)
                continue
            # What is still unsettled among those above is open: it builds on this node.
            circle = any(one != node for one in self._unsettled(references))
            from_above = self._marks_of(references) | (IN_CIRCLE if circle else 0)
            marks = from_above | self._own(node, from_above)
            self._above[node], self._marks[node] = from_above, marks
            for number, row, column in self._places[node]:
                self._columns[number, column].settle(row, marks)
            self.order.append(node)
            del open_nodes[node]

    def _opened(self, node: Place) -> tuple[list[Reference], Iterator[Place]]:
        references = [] if node in self._ends else list(self._inputs(node))
        return references, self._unsettled(references)

    def _unsettled(self, references: Iterable[Reference]) -> Iterator[Place]:
        for number, area in references:
            if _is_cell(area):
                node = self._filled.get((number, area.top, area.left))
                if node is not None and node not in self._marks:
                    yield node
                continue
            for column in self._columns_of(number, area):
                for row in self._columns[number, column].unsettled(area):
                    yield self._filled[number, row, column]

    def _marks_of(self, references: Iterable[Reference]) -> int:
        marks = 0
        for number, area in references:
            if _is_cell(area):
                node = self._filled.get((number, area.top, area.left))
                marks |= 0 if node is None else self._marks.get(node, 0)
                continue
            for column in self._columns_of(number, area):
                marks |= self._columns[number, column].marks(area)
        return marks

    def _columns_of(self, number: int, area: Area) -> Iterable[int]:
        if len(area.columns) <= len(self._by_sheet[number]):
            return [column for column in area.columns if (number, column) in self._columns]
        return [column for column in self._by_sheet[number] if column in area.columns]


def _is_cell(area: Area) -> bool:
    return area.top == area.bottom and area.left == area.right


def _each(marks: int) -> Iterator[int]:
    while marks:
        mark = marks & -marks
        yield mark
        marks ^= mark
