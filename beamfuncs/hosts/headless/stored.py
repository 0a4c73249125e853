"""What the cells of a workbook stored when it was saved, against what the engine gives for them.

The values that a spreadsheet program saved are a second opinion on the engine. Where the two differ
in a cell that does not build on a beam, one of them is wrong, and it is said; by default the
stored value is trusted as long as nothing that the cell builds on is known to have changed, and all that
builds on the cell is evaluated from it.
"""

from __future__ import annotations

import math
import re
from collections import defaultdict
from collections.abc import Callable, Collection, Iterable, Iterator
from dataclasses import dataclass, field

from beamfuncs.cells import is_number
from beamfuncs.errors import ErrorValue
from beamfuncs.hosts.headless.engine import CIRCULAR, NOT_READ, Engine
from beamfuncs.hosts.headless.graph import IN_CIRCLE, Graph
from beamfuncs.hosts.headless.grid import Place
from beamfuncs.hosts.headless.layout import Cell
from beamfuncs.hosts.headless.markup import decoded
from beamfuncs.hosts.headless.splice import CellValue, written
from beamfuncs.trust import Trust

CLOSE = 1e-9
"""Relative: numbers that are closer are one."""
CLOSE_IN_TEXT = 1e-14
"""Relative: a spreadsheet joins 15 digits of a number to a text, the engine 16."""
ROUNDS = 6
"""After so many evaluations all that still differs is trusted at once, and no longer what comes first."""
USERS = 3
"""So many beam cells are named that used a value."""
LINKS_FOLLOWED = 2_000_000
"""So many references are followed to find them."""

BEAM, CHANGED, VOLATILE, SUSPECT, LISTED = 2, 4, 8, 16, 32
"""Marks of a cell: it is or builds on a beam cell; on what has changed since the workbook was saved; on a
volatile function; its stored value is trusted against the engine's; it is listed."""

_NUMBER = re.compile(r"(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d+)?")
_VOLATILE = re.compile(
    r"\b(?:NOW|TODAY|RAND|RANDBETWEEN|RANDARRAY|INFO|CELL|OFFSET|INDIRECT)\(|\)\s*:|:\s*[A-Z.]+\(", re.IGNORECASE
)
"""Functions whose value changes by itself or comes from cells that the formula does not name."""


@dataclass(frozen=True)
class Difference:
    """A cell whose stored value is not the engine's; `kept` tells that the stored one is taken.

    `reason` says why the engine's is an error or why the stored value is not taken; `used_by` names beam
    cells that build on the value taken, the first few.
    """

    sheet: str
    cell: str
    stored: CellValue
    computed: CellValue
    formula: str
    volatile: bool
    kept: bool
    reason: str = ""
    used_by: list[str] = field(default_factory=list)


def stored_value(cell: Cell) -> CellValue:
    """Return the value that a formula's cell holds in the file, None if it holds none that can be told here."""
    if cell.value_start < 0:
        return None
    text = cell.value
    if cell.type in ("", "n"):
        return float(text) if is_number(text.strip()) and math.isfinite(float(text)) else None
    if cell.type == "b":
        return text.strip() in ("1", "true")
    if cell.type == "e":
        return ErrorValue(text)
    if cell.type == "str":
        return decoded(text)
    return None


def shown(value: CellValue) -> CellValue:
    """Return a value as the file would hold it, for people to read."""
    return written(value)[1] if isinstance(value, ErrorValue) else value


def agree(stored: CellValue, computed: CellValue) -> bool:
    """Tell whether a stored value and a computed one are the same for all purposes.

    >>> agree(1.0, 1.0 + 1e-12), agree(1.0, 1.0 + 1e-8), agree("x0.333333333333333", "x0.3333333333333333")
    (True, False, True)
    >>> agree(1.0, True), agree("1", 1.0), agree(ErrorValue("#N/A"), "#N/A")
    (False, False, False)
    """
    if identical(stored, computed):
        return True
    if isinstance(stored, ErrorValue) or isinstance(computed, ErrorValue):
        return False
    if isinstance(stored, str) and isinstance(computed, str):
        return _agree_in_text(stored, computed)
    if type(stored) is not float or type(computed) is not float:
        return False
    return math.isclose(stored, computed, rel_tol=CLOSE)


def identical(stored: CellValue, computed: CellValue) -> bool:
    """Tell whether to store a computed value would change nothing."""
    if isinstance(computed, ErrorValue):
        return isinstance(stored, ErrorValue) and stored == written(computed)[1]
    return type(stored) is type(computed) and stored == computed


def _agree_in_text(stored: str, computed: str) -> bool:
    if _NUMBER.split(stored) != _NUMBER.split(computed):
        return False
    pairs = zip(_NUMBER.findall(stored), _NUMBER.findall(computed), strict=True)
    return all(one == other or math.isclose(float(one), float(other), rel_tol=CLOSE_IN_TEXT) for one, other in pairs)


@dataclass(frozen=True)
class Filled:
    """A place that a formula fills, and whether it did so when the file was saved: what it held, what it is to hold.

    None stands for nothing.
    """

    place: Place
    before: bool
    stored: CellValue
    computed: CellValue


@dataclass
class Found:
    """A difference on its way to the list."""

    node: Place
    filled: Filled
    volatile: bool
    kept: bool
    reason: str
    users: list[Place] = field(default_factory=list)


class Comparison:
    """The stored values of one workbook against its engine's, and what is decided on each.

    `nodes` are the cells with formulas, `arrays` those among them that fill more than their own place,
    `beam_cells` those that call our functions, `refused` those whose formulas the engine was not given.
    `fills` gives what a node fills as the engine has it now, `why` the reason of an error. With
    `placeholders` a stored 0 may have been written without a look at the formula, as programs do that ask
    for the workbook to be calculated when it is opened.
    """

    def __init__(
        self,
        engine: Engine,
        nodes: Collection[Place],
        arrays: Collection[Place],
        beam_cells: Collection[Place],
        refused: Collection[Place],
        fills: Callable[[Place], Iterable[Filled]],
        why: Callable[[Place, Place, ErrorValue], str],
        evaluate: Callable[[], None],
        placeholders: bool = False,
    ) -> None:
        self._engine = engine
        self._nodes = nodes
        self._arrays = arrays
        self._beam_cells = beam_cells
        self._refused = refused
        self._fills = fills
        self._why = why
        self._evaluate = evaluate
        self._placeholders = placeholders
        self._now: dict[Place, tuple[Filled, ...]] = {}
        self._differing: set[Place] = set()
        self._changes: dict[Place, str] = {}
        self._graph: Graph | None = None
        self._below_beams: set[Place] = set()
        """Nodes that differ because they build on beam cells, so far as it is known."""
        self.kept: set[Place] = set()
        """Nodes that stay as they are stored, byte for byte."""
        self.found: list[Found] = []

    def settle(self, trust: Trust) -> None:
        """Decide on every difference, and let the engine evaluate all else from what is decided."""
        for attempt in range(ROUNDS):
            near, unequal = self._compare()
            self._below_beams.update(node for node in unequal if self._marks(node) & BEAM)
            unequal = [node for node in unequal if node not in self._below_beams]
            if not near and not unequal:
                break
            pinned = []
            if trust is Trust.STORED:
                suspects = [node for node in unequal if self._marks(node) & SUSPECT]
                first = [node for node in suspects if not self._above(node) & SUSPECT]
                pinned = suspects if attempt == ROUNDS - 1 else first
                self.kept |= {node for node in near if self._kept_if_near(node)}
            if not pinned:
                self._list(unequal, kept=False)
                break
            self._list(pinned, kept=True)
            for node in pinned:
                self._pin(node)
            self._evaluate()
        self._find_users()

    def stale(self) -> Iterator[tuple[Place, Filled]]:
        """Yield the nodes among beam cells, and cells that build on them, with what the file holds of them that is
        not what is computed.
        """
        self._forget()
        for node in self._nodes:
            if node in self.kept:
                continue
            for one in self._fills(node):
                if not agree(one.stored, one.computed) and self._marks(node) & (BEAM | IN_CIRCLE):
                    yield node, one

    # --- what differs ---

    def _compare(self) -> tuple[list[Place], list[Place]]:
        """Return the nodes that are near their stored values but not the same, and those that differ."""
        self._forget()
        near: list[Place] = []
        unequal: list[Place] = []
        for node in self._nodes:
            if node in self.kept or node in self._beam_cells or node in self._below_beams:
                continue
            fills = tuple(self._fills(node))
            if any(map(self._is_missing, fills)):
                continue
            if all(identical(one.stored, one.computed) for one in fills):
                continue
            self._now[node] = fills
            (near if all(agree(one.stored, one.computed) for one in fills) else unequal).append(node)
        self._differing.update(unequal)
        return near, unequal

    def _forget(self) -> None:
        self._now.clear()
        self._differing.clear()
        self._changes.clear()
        self._graph = None

    def _is_missing(self, one: Filled) -> bool:
        if one.stored is None:
            return one.before
        return self._placeholders and one.stored == 0.0 and not agree(one.stored, one.computed)

    def _marks(self, node: Place) -> int:
        return self._graph_now().marks(node)

    def _above(self, node: Place) -> int:
        return self._graph_now().above(node)

    def _kept_if_near(self, node: Place) -> bool:
        return not self._marks(node) & (BEAM | CHANGED)

    def _graph_now(self) -> Graph:
        if self._graph is None:
            self._graph = Graph(self._places(), self._engine.references, self._own_marks, ends=self._beam_cells)
        return self._graph

    def _places(self) -> dict[Place, Place]:
        """Return the node that fills each place."""
        places = {one.place: node for node in self._arrays for one in self._fills(node)}
        places.update((node, node) for node in self._nodes)
        return places

    def _own_marks(self, node: Place, above: int) -> int:
        if node in self._beam_cells:
            return BEAM | CHANGED
        if node in self.kept:
            return 0
        volatile = VOLATILE if _VOLATILE.search(self._engine.formula(node)) else 0
        differs = node in self._differing
        if not self._beam_cells:
            # Nothing here is ours to compute: what is stored stands.
            return volatile | (SUSPECT if differs else 0)
        change = self._change(node, above, bool(volatile))
        if change:
            self._changes[node] = change
            return volatile | CHANGED
        return volatile | (SUSPECT if differs and not above & (BEAM | CHANGED) else 0)

    def _change(self, node: Place, above: int, volatile: bool) -> str:
        """Return why a cell by itself is not what it was when the workbook was saved, "" if it may well be."""
        if node not in self._differing:
            return "has no stored value" if any(map(self._is_missing, self._fills(node))) else ""
        values = [one.computed for one in self._now[node]]
        if volatile:
            return "is volatile"
        if above & IN_CIRCLE or CIRCULAR in values:
            return "is in a circle of references, or builds on one"
        if NOT_READ in values or node in self._refused or not self._engine.knows_inputs(node):
            return "builds on cells that cannot be told from its formula"
        return ""

    # --- what is decided ---

    def _pin(self, node: Place) -> None:
        self.kept.add(node)
        before = [one for one in self._now[node] if one.before]
        if node in self._arrays and len(before) > 1:
            rows: dict[int, list[CellValue]] = {}
            for one in sorted(before, key=lambda one: one.place):
                rows.setdefault(one.place[1], []).append(one.stored)
            if self._engine.set_array(node, list(rows.values())):
                return
        for one in self._now[node]:
            self._engine.set_constant(one.place, one.stored)

    def _list(self, nodes: Iterable[Place], kept: bool) -> None:
        for node in nodes:
            volatile = bool(self._marks(node) & VOLATILE)
            for one in self._now[node]:
                if not agree(one.stored, one.computed):
                    reason = "" if kept else self._cause(node)
                    if kept and isinstance(one.computed, ErrorValue):
                        reason = self._why(one.place, node, one.computed)
                    self.found.append(Found(node, one, volatile, kept, reason))
                    if isinstance(one.computed, ErrorValue) and one.place == node:
                        break  # of an array that cannot be evaluated its first cell tells all

    def _cause(self, node: Place) -> str:
        """Return which change is the reason that the stored value of a cell is not taken."""
        graph = self._graph_now()
        seen: set[Place] = set()
        while node not in self._changes and node not in seen:
            seen.add(node)
            node = next(graph.inputs_bearing(CHANGED, node), node)
        change = self._changes.get(node)
        return f"{self._engine.name(node)} {change}" if change else ""

    def _find_users(self) -> None:
        """Note for every difference the first beam cells that build on it."""
        listed = {one.node for one in self.found}
        if not listed or not self._beam_cells:
            return
        graph = Graph(self._places(), self._engine.references, lambda node, _: LISTED if node in listed else 0)
        for node in self._beam_cells:
            graph.marks(node)
        users: defaultdict[Place, list[Place]] = defaultdict(list)
        followed = 0
        for node in reversed(graph.order):
            passed_on = [node] if node in self._beam_cells else users.get(node)
            if not passed_on or followed > LINKS_FOLLOWED:
                continue
            for above in graph.inputs_bearing(LISTED, node):
                followed += 1
                users[above] = sorted({*users[above], *passed_on})[: USERS + 1]
        for one in self.found:
            one.users = users.get(one.node, [])
