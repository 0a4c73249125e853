"""What the README says of functions, marks, loads and phrases is what the program takes."""

from __future__ import annotations

import re
from pathlib import Path

from beamfuncs import functions as f
from beamfuncs.beam import MARK_ALIASES, MARK_KINDS
from beamfuncs.catalogue import catalogue
from beamfuncs.loads import LOAD_KINDS
from beamfuncs.notation import HEADERS, read_clauses, read_line
from beamfuncs.results import read_phrase

README = (Path(__file__).parent.parent / "README.md").read_text(encoding="utf-8")


def section(title: str) -> str:
    """Return the text under a heading."""
    return README.split(f"\n## {title}\n")[1].split("\n## ")[0]


def test_the_table_of_functions_is_the_catalogue() -> None:
    """One row a function, with its call and its summary."""
    rows = [line for line in section("The functions").splitlines() if line.startswith("| `")]
    assert rows == [
        f"| `{entry.call}` | {entry.summary.removeprefix('Return ').removesuffix('.')} |"
        for entry in catalogue().values()
    ]


def test_every_example_line_is_read() -> None:
    """Beam lines, load clauses and phrases of the README are read as they stand."""
    beams, loads = re.findall(r"\n\n((?:    .*\n)+)", section("The notation"))
    for line in re.split(r"\s{4,}|\n", beams.replace("\n    ", "\n").strip()):
        assert read_line(line)
    for line in loads.strip().splitlines():
        assert read_clauses(re.split(r"\s{2,}", line.strip())[0])
    phrases = section("The notation").split("**A result phrase**")[1].split("`max`")[0]
    for phrase in re.findall(r"`([^`]+)`", phrases):
        assert read_phrase(phrase)


def test_every_mark_load_and_header_is_named() -> None:
    """The notation leaves none out."""
    text = section("The notation")
    for word in (*MARK_KINDS, *MARK_ALIASES):
        assert f"`{word}" in text
    for word in LOAD_KINDS:
        assert f"{word} " in text
    for word in HEADERS:
        assert f"`{word}`" in text


def test_what_is_said_of_signs_holds() -> None:
    """A jump of V at a point load is -P, at a support +R; M jumps by +C at a clockwise couple."""
    beam = "pinned 4 pinned 4 pinned"

    def jump(loads: str, what: str) -> float:
        [[left, right]] = f.beam_result(beam, loads, [[f"{what} left", f"{what} right"]])
        return right - left

    assert jump("point 6 at 1", "shear at 1") == -6.0
    assert abs(jump("udl 6", "shear at 4") - f.reaction(beam, "udl 6", 2)) < 1e-12
    assert jump("couple 6 at 1", "moment at 1") == 6.0
