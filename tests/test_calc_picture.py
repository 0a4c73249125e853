"""The Kestrel Quay workbook in a real Calc: a span is changed, all follows, and the README's picture shows it."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import pytest
from calc_office import CalcOffice, running
from calc_picture import AFTER, BEFORE, DRAWN_BY, PICTURE, SHEET, Page, change, difference, page, workbook
from PIL import Image

from beamfuncs.functions import beam_result, deflection_at, diagram, reaction, reactions

README = (PICTURE.parent.parent.parent / "README.md").read_text(encoding="utf-8")
LOADS = (
    "G: udl 3.2; Q: udl 6.5 in span 2; Q: varying 0 to 9 from 13.2 to 18.6; Q: point 45 at 3 in span 1;"
    "Q: point 12 at 0; G: couple 10 at 2 in span 3; S: settle 0.006 at support 3"
)
STIFFNESS = "64000 64000 64000 48000 48000"
STRENGTH, CHARACTERISTIC = "1.35 G + 1.5 Q + S + T", "G + Q + S + T"
SUPPORTS, PHRASES, STATIONS = "K13:O16", "G25:J36", "A26:D59"
NEAR = 1e-9
ALIKE = 20.0
"""The `difference` up to which two pictures are the same; a span that is changed by a hundredth makes it 38."""


def runway(last: float) -> str:
    """The beam of the sheet, with a last span of that length."""
    return f"free 1.2 pinned 6 pinned 1.5 hinge 4.5 pinned {last} fixed"


@dataclass(frozen=True)
class Shown:
    """What Calc shows of the sheet, and the page."""

    supports: list[list[float]]
    phrases: list[list[str | float | None]]
    stations: list[list[float]]
    page: Page


@pytest.fixture(scope="module")
def shown(tmp_path_factory: pytest.TempPathFactory) -> Iterator[dict[float, Shown]]:
    """What Calc shows before and after the change, by the length of the span."""

    def seen(calc: CalcOffice, book: int, folder: Path) -> Shown:
        supports, phrases, stations = (calc.read(book, place, SHEET) for place in (SUPPORTS, PHRASES, STATIONS))
        return Shown(supports, phrases, stations, page(calc, book, folder))

    folder = tmp_path_factory.mktemp("calc")
    with running(folder / "profile", folder / "server") as calc, workbook(calc, folder) as book:
        before = seen(calc, book, folder)
        change(calc, book)
        yield {BEFORE: before, AFTER: seen(calc, book, folder)}


@pytest.mark.parametrize("last", [BEFORE, AFTER])
def test_the_sheet_follows_the_span(shown: dict[float, Shown], last: float) -> None:
    """Reactions, results by phrase and stations are what the functions give in Python, of loads written by hand."""
    beam, sheet = runway(last), shown[last]
    at_strength = reactions(beam, LOADS, STIFFNESS, STRENGTH)
    characteristic = [reaction(beam, LOADS, number, STIFFNESS, CHARACTERISTIC) for number in (1, 2, 3, 4)]
    assert [row[:4] for row in sheet.supports] == [pytest.approx(row, rel=NEAR, abs=NEAR) for row in at_strength]
    assert [row[4] for row in sheet.supports] == pytest.approx(characteristic, rel=NEAR)
    for column, combination in ((2, STRENGTH), (3, CHARACTERISTIC)):
        results = [beam_result(beam, LOADS, row[0], STIFFNESS, combination) for row in sheet.phrases]
        assert [row[column] for row in sheet.phrases] == pytest.approx(results, rel=NEAR, abs=NEAR)
    table = [row[:3] for row in diagram(beam, LOADS, 21, STIFFNESS, STRENGTH)]
    places = [row[0] for row in table]
    assert [row[:3] for row in sheet.stations[: len(table)]] == [
        pytest.approx(row, rel=NEAR, abs=1e-6) for row in table
    ]
    sinking = [1000 * deflection_at(beam, LOADS, x, STIFFNESS, CHARACTERISTIC) for x in places]
    assert [row[3] for row in sheet.stations[: len(table)]] == pytest.approx(sinking, rel=NEAR, abs=1e-6)
    assert len(table) in (len(sheet.stations), len(sheet.stations) - 1)


@pytest.mark.parametrize("last", [BEFORE, AFTER])
def test_the_page_shows_the_numbers(shown: dict[float, Shown], last: float) -> None:
    """Each reaction stands on the printed page, the changed length too, and no cell is too narrow or in error."""
    text = shown[last].page.text
    rows = [re.findall(r"-?\d+\.\d+", line) for line in text.splitlines()]
    for number, row in enumerate(reactions(runway(last), LOADS, STIFFNESS, STRENGTH), 1):
        characteristic = reaction(runway(last), LOADS, number, STIFFNESS, CHARACTERISTIC)
        told = [f"{row[1]:.2f}", f"{row[2]:.1f}", f"{row[3]:.1f}", f"{characteristic:.1f}"]
        assert any(line[-4:] == told for line in rows), told
    assert f"{last:.2f}" in [word for line in rows[:15] for word in line]
    assert "#" not in text
    assert "Err:" not in text


def test_the_picture_is_what_calc_draws(shown: dict[float, Shown]) -> None:
    """The picture kept for the README is the page after the change, and not the one before."""
    with Image.open(PICTURE) as kept:
        now = shown[AFTER].page
        if kept.info[DRAWN_BY] != now.drawn_by:
            pytest.skip(f"not compared: the picture was drawn by {kept.info[DRAWN_BY]}, here draws {now.drawn_by}")
        assert difference(kept, now.image) < ALIKE
        assert difference(kept, shown[BEFORE].page.image) > 2 * ALIKE


def test_the_readme_says_what_was_changed() -> None:
    """The picture is there, not too large, and the numbers of its caption are those of the functions."""
    caption = re.search(rf"\n!\[[^\]]+\]\(workbooks/pictures/{PICTURE.name}\)\n\n(.+?)\n\n", README, re.DOTALL)
    assert caption
    pad = [reaction(runway(last), LOADS, 3, STIFFNESS, STRENGTH) for last in (BEFORE, AFTER)]
    words = " ".join(caption[1].split())
    assert f"from {BEFORE:.2f} m to {AFTER:.2f} m" in words
    assert f"from {pad[0]:.1f} kN to {pad[1]:.1f} kN" in words
    assert PICTURE.stat().st_size < 300_000
