"""Mechanisms are recognised, whole and partial, and the part that moves is named."""

from __future__ import annotations

from itertools import product

import numpy as np
import pytest

from beamfuncs import functions as f
from beamfuncs.errors import NUM, BeamError
from beamfuncs.notation import read_line
from beamfuncs.stability import mechanism

ENDS = ("fixed", "pinned", "guided", "free", "spring(5)", "spring(0, 5)", "spring(0)")
INSIDE = ("pinned", "hinge", "guided", "step", "fixed")
HOLDS_DEFLECTION = {"fixed", "pinned", "spring(5)"}
HOLDS_ROTATION = {"fixed", "guided", "spring(0, 5)"}


def rigid_motions(marks: tuple[str, ...]) -> int:
    """Return the number of independent rigid motions, by the rank of the conditions on them.

    Every part between hinges has a deflection at x = 0 and a rotation. Marks stand at x = 0, 1, 2 ...
    """
    parts = [0]
    for mark in marks[1:]:
        parts.append(parts[-1] + (mark == "hinge"))
    rows = []
    for x, (mark, part) in enumerate(zip(marks, parts, strict=True)):
        deflection = {2 * part: 1.0, 2 * part + 1: float(x)}
        if mark in HOLDS_DEFLECTION:
            rows.append(deflection)
        if mark in HOLDS_ROTATION:
            rows.append({2 * part + 1: 1.0})
        if mark == "hinge":
            rows.append(deflection | {2 * part - 2: -1.0, 2 * part - 1: -float(x)})
    matrix = np.zeros((len(rows) + 1, 2 * (parts[-1] + 1)))
    for r, row in enumerate(rows):
        for column, factor in row.items():
            matrix[r, column] = factor
    return matrix.shape[1] - int(np.linalg.matrix_rank(matrix))


@pytest.mark.parametrize("lengths", [1, 2, 3, 4])
def test_mechanisms_are_those_of_the_rank_of_the_conditions(lengths: int) -> None:
    """A line is refused exactly where the conditions on its rigid parts leave a motion free."""
    count = 0
    for marks in product(ENDS, *[INSIDE] * (lengths - 1), ENDS):
        line = " 1 ".join(marks)
        assert (mechanism(read_line(line)) is not None) == (rigid_motions(marks) > 0), line
        count += rigid_motions(marks) > 0
    assert count > 0


@pytest.mark.parametrize(
    ("line", "part"),
    [
        ("pinned 8 free", "the whole beam can turn about x = 0"),
        ("free 3 pinned 5 free", "the whole beam can turn about x = 3"),
        ("free 8 free", "the whole beam can move up and down, and turn"),
        ("guided 4 guided", "the whole beam can move up and down"),
        ("fixed 3 hinge 4 hinge 3 free", "the part from x = 3 to 7 can turn about x = 3 with the parts hinged to it"),
        ("pinned 3 hinge 5 pinned", "the part from x = 0 to 3 can turn about x = 0 with the parts hinged to it"),
        ("fixed 3 hinge 1 free", "the part from x = 3 to 4 can turn about x = 3;"),
    ],
)
def test_the_part_that_moves_is_named(line: str, part: str) -> None:
    """The reason says which part can move, and how."""
    with pytest.raises(BeamError) as caught:
        f.moment_max(line, "udl 0")
    assert caught.value.value == NUM
    assert part in caught.value.reason


@pytest.mark.parametrize(
    "line",
    ["fixed 3 hinge 4 hinge 3 fixed", "pinned 4 pinned 2 hinge 3 pinned", "guided 3 pinned", "fixed 2 hinge 2 guided"],
)
def test_hanging_spans_that_hold_are_solved(line: str) -> None:
    """A span that hangs between held parts is no mechanism."""
    assert f.beam_result(line, "udl 2", "total load") == pytest.approx(
        sum(row[2] for row in f.reactions(line, "udl 2")), rel=1e-14
    )
