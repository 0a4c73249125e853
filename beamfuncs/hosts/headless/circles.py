"""Circular references: which cells refer back to themselves, and by way of which others."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator

from beamfuncs.hosts.headless.grid import Place

LARGEST_TRACED = 60
"""In a circle of more cells one chain is found for all of them, and not for each the shortest."""
MOST_SHOWN = 6
"""Of a longer chain only the ends are shown."""


class Circles:
    """The circles among the cells that the engine finds to be in one or to build on one.

    `above` gives those of them that the formula of a cell refers to, itself included where it does so.
    """

    def __init__(self, above: Callable[[Place], Iterable[Place]], name: Callable[[Place], str]) -> None:
        self._above_of = above
        self._name = name
        self._above: dict[Place, list[Place]] = {}
        self._circle: dict[Place, frozenset[Place]] = {}
        """For a cell the cells of its circle; none if it is in no circle."""
        self._source: dict[Place, Place] = {}
        """For a cell in no circle one above it that is in one."""
        self._chains: dict[frozenset[Place], str] = {}

    def reason(self, place: Place) -> str:
        """Return how a cell refers to itself, or on which circle it builds."""
        circle = self._circle_of(place)
        if circle:
            return f"circular reference: {self._chain(place, circle)}"
        source = self._source.get(place)
        if source is None:
            return "builds on a circular reference"
        return f"builds on {self._name(source)}, in a circular reference: {self._chain(source, self._circle[source])}"

    def _chain(self, place: Place, circle: frozenset[Place]) -> str:
        if len(circle) <= LARGEST_TRACED:
            return self._shown(self._shortest(place, circle))
        if circle not in self._chains:
            self._chains[circle] = self._shown(self._shortest(min(circle), circle))
        return self._chains[circle]

    def _shown(self, chain: list[Place]) -> str:
        names = [self._name(one) for one in chain]
        if len(names) > MOST_SHOWN:
            half = MOST_SHOWN // 2
            left_out = len(names) - 2 * half
            names = [*names[:half], f"{left_out} more", *names[-half:]]
        return " -> ".join([*names, names[0]])

    def _shortest(self, place: Place, circle: frozenset[Place]) -> list[Place]:
        """Return the cells of the shortest way from a cell back to itself."""
        came_from = {place: place}
        row = [place]
        while row:
            following = []
            for one in row:
                for above in self._inputs(one):
                    if above == place:
                        chain = [one]
                        while chain[-1] != place:
                            chain.append(came_from[chain[-1]])
                        return chain[::-1]
                    if above in circle and above not in came_from:
                        came_from[above] = one
                        following.append(above)
            row = following
        return [place]

    def _inputs(self, place: Place) -> list[Place]:
        if place not in self._above:
            self._above[place] = list(dict.fromkeys(self._above_of(place)))
        return self._above[place]

    def _circle_of(self, asked: Place) -> frozenset[Place]:
        """Return the cells from which the cell is reached that it reaches itself (Tarjan, 1972), without recursion."""
        if asked in self._circle:
            return self._circle[asked]
        low: dict[Place, int] = {}
        met: dict[Place, int] = {}
        pending: list[Place] = []
        on_way: list[tuple[Place, Iterator[Place]]] = []

        def meet(place: Place) -> None:
            met[place] = low[place] = len(met)
            pending.append(place)
            on_way.append((place, iter(self._inputs(place))))

        meet(asked)
        while on_way:
            place, inputs = on_way[-1]
            above = next(inputs, None)
            if above is None:
                on_way.pop()
                if on_way:
                    below = on_way[-1][0]
                    low[below] = min(low[below], low[place])
                if low[place] == met[place]:
                    circle = [pending.pop()]
                    while circle[-1] != place:
                        circle.append(pending.pop())
                    self._note(circle)
            elif above not in met and above not in self._circle:
                meet(above)
            elif above not in self._circle:
                low[place] = min(low[place], met[above])
        return self._circle[asked]

    def _note(self, cells: list[Place]) -> None:
        alone = len(cells) == 1 and cells[0] not in self._inputs(cells[0])
        circle = frozenset() if alone else frozenset(cells)
        for cell in cells:
            self._circle[cell] = circle
        if alone:
            sources = (one if self._circle[one] else self._source.get(one) for one in self._inputs(cells[0]))
            source = next(filter(None, sources), None)
            if source:
                self._source[cells[0]] = source
