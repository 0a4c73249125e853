"""What a design workbook holds: the beams, the pads, the combinations and the words."""

from __future__ import annotations

from dataclasses import dataclass

from sheets.paper import TitleBlock


@dataclass(frozen=True)
class Member:
    """A beam of the schedule; in its formulas a word in braces is the cell of that column."""

    mark: str
    where: str
    lengths: tuple[float, ...]
    modulus: float
    inertia: float
    loads: dict[str, float | str]
    pads: tuple[str, ...]
    line: str
    clauses: str
    other: tuple[float, str] | None = None
    reference: str = "={L1}"
    limit: int = 300
    stiffness: str = "={E}*{I}/100"


@dataclass(frozen=True)
class LaidOut:
    """A beam laid out over a row of cells, with one stiffness a length and its loads in a table.

    In a formula of the table a mark in braces is the cell `Other` of that beam in the schedule.
    """

    mark: str
    where: str
    line: tuple[str | float, ...]
    stiffness: tuple[float, ...]
    loads: tuple[tuple[str | float | None, ...], ...]
    pads: tuple[str, ...]


@dataclass(frozen=True)
class Crossed:
    """A continuous beam with an overhang, its last length, that a train of axles crosses.

    `actions` holds for each case what it is, and its own psi factors where it has them; `strength` and `service` are
    the combinations that a standard makes of them; `influence` is the result whose influence line is shown.
    """

    mark: str
    where: str
    lengths: tuple[float, float, float, float]
    modulus: float
    inertia: float
    permanent: float
    variable: float
    axles: tuple[float, float, float]
    spacings: tuple[float, float]
    actions: tuple[tuple[str | float, ...], ...]
    strength: str
    service: str
    influence: str
    note: str


@dataclass(frozen=True)
class Pad:
    """A foundation: its mark, the bearing pressure allowed [kN/m²] and its depth [m]."""

    mark: str
    pressure: float
    depth: float


Words = tuple[tuple[str, str], ...]
"""Lines of a note, each with the word it stands under."""


@dataclass(frozen=True)
class Design:
    """All that the sheets of one workbook show; the notes in the columns of their sheet."""

    issue: TitleBlock
    members: tuple[Member, ...]
    laid_out: LaidOut
    crossed: Crossed
    pads: tuple[Pad, ...]
    strength: str
    characteristic: str
    footnotes: Words
    load_notes: tuple[str, ...]
    size_notes: tuple[str, ...]
    notes: tuple[tuple[tuple[str, Words], ...], ...]
