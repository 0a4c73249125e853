"""Workbooks checked without being written: what is stale, missing or in error, and with which status it ends."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from books import build, from_xml, store
from typer.testing import CliRunner

from beamfuncs.cli import app
from beamfuncs.functions import reaction
from beamfuncs.hosts.headless import checking
from beamfuncs.hosts.headless.checking import check, workbooks
from beamfuncs.hosts.headless.filling import fill
from beamfuncs.trust import Trust

BEAM = {"A1": "fixed 8 pinned", "B1": "udl 12", "C1": "=reaction(A1,B1,1)", "D1": "=C1/2", "E1": "=1+1"}
FORCE = reaction("fixed 8 pinned", "udl 12", 1)
assert FORCE == 60.0, "5/8 of the load, by the tables"


def run(*words: str | Path) -> tuple[int, str, str]:
    """Status, standard output and standard error of a command."""
    result = CliRunner().invoke(app, [str(word) for word in words])
    if result.exception and not isinstance(result.exception, SystemExit):
        raise result.exception
    return result.exit_code, result.stdout, result.stderr


def saved(path: Path, stored: dict[str, object], cells: dict[str, object] = BEAM) -> Path:
    """A workbook with what it stores."""
    path.parent.mkdir(parents=True, exist_ok=True)
    return store(build(path, cells), stored)


def stale(path: Path, trust: Trust = Trust.STORED) -> dict[str, tuple[object, object]]:
    """Stored and computed value of each stale cell."""
    return {one.cell: (one.stored, one.computed) for one in check(path, trust).stale}


def test_what_fill_writes_is_up_to_date(tmp_path: Path) -> None:
    """A filled workbook passes, and is not written to."""
    target = fill(build(tmp_path / "plan.xlsx", BEAM)).target
    before = target.read_bytes()
    assert run("check", target) == (0, f"{target}: 1 beam cell, up to date\n", "")
    assert target.read_bytes() == before
    assert sorted(path.name for path in tmp_path.iterdir()) == ["plan.filled.xlsx", "plan.xlsx"]


@pytest.mark.parametrize(
    ("stored", "expected"),
    [
        ({"C1": 60, "D1": 30, "E1": 2}, {}),
        ({"C1": 60 * (1 + 0.9e-9), "D1": 30}, {}),
        ({"C1": 60 * (1 + 2e-9), "D1": 30}, {"C1": (60 * (1 + 2e-9), 60.0)}),
        ({"C1": 60, "D1": 29}, {"D1": (29.0, 30.0)}),
        ({"C1": "60", "D1": 30}, {"C1": ("60", 60.0)}),
        ({"C1": "#NAME?", "D1": "#NAME?"}, {"C1": ("#NAME?", 60.0), "D1": ("#NAME?", 30.0)}),
        ({"D1": 30}, {"C1": (None, 60.0)}),
        ({"C1": 60}, {"D1": (None, 30.0)}),
        ({"C1": 60, "D1": 30, "E1": 3}, {}),
    ],
)
def test_stale_is_what_builds_on_beams_and_is_not_as_computed(
    stored: dict[str, object], expected: dict[str, object], tmp_path: Path
) -> None:
    """Beam cells and their dependents, beyond 1e-9, of another kind, or not stored; other cells are not judged."""
    assert stale(saved(tmp_path / "plan.xlsx", stored)) == expected


def test_a_trusted_value_is_no_reason_to_fail(tmp_path: Path) -> None:
    """An ordinary cell stored otherwise than computed is told; beams are stale only by whose value is trusted."""
    cells = BEAM | {"A1": '="fixed "&E1&" pinned"', "E1": "=4+4"}
    path = saved(tmp_path / "plan.xlsx", {"A1": "fixed 4 pinned", "E1": 4, "C1": 30, "D1": 15}, cells)
    assert stale(path) == {}
    assert stale(path, Trust.ENGINE) == {"C1": (30, 60), "D1": (15, 30)}
    status, out, _ = run("check", path)
    assert status == 0
    assert out.splitlines() == [
        f"{path}: 1 beam cell, up to date, 1 stored otherwise than computed",
        "  Plan!E1  stores 4, computed 8; the stored value is kept; used by Plan!C1",
    ]
    status, out, _ = run("check", path, "--trust", "engine")
    assert status == 1
    assert "  Plan!C1  stores 30, computed 60\n  Plan!D1  stores 15, computed 30\n" in out


def test_a_spilled_array_that_grows_or_shrinks_is_stale(tmp_path: Path) -> None:
    """What an array of ours fills anew, or no longer, is compared with what stands there."""

    def cells(row: int, *values: float) -> str:
        named = zip("DEF", values[1:], strict=True)
        first = "" if row == 1 else f'<c r="C{row}"><v>{values[0]}</v></c>'
        return first + "".join(f'<c r="{column}{row}"><v>{value}</v></c>' for column, value in named)

    texts = "".join(
        f'<c r="{cell}" t="inlineStr"><is><t>{text}</t></is></c>'
        for cell, text in (("A1", "pinned 6 roller"), ("B1", "udl 2"))
    )
    anchor = '<c r="C1" cm="1"><f t="array" ref="C1:F2">reactions(A1,B1)</f><v>1</v></c>'
    row = f'<row r="1">{texts}{anchor}{cells(1, 1, 0, 6, 0)}</row>'
    rest = f'<row r="2">{cells(2, 2, 6, 6, 0)}</row>'
    assert stale(from_xml(tmp_path / "same.xlsx", row + rest)) == {}
    shorter = row.replace("C1:F2", "C1:F1")
    grown = stale(from_xml(tmp_path / "grown.xlsx", shorter))
    assert grown == {"C2": (None, 2), "D2": (None, 6), "E2": (None, 6), "F2": (None, 0)}
    longer = row.replace("C1:F2", "C1:F3") + rest + '<row r="3"><c r="C3"><v>3</v></c></row>'
    assert stale(from_xml(tmp_path / "shrunk.xlsx", longer)) == {"C3": (3, None)}


def test_a_cell_in_error_fails(tmp_path: Path) -> None:
    """Any cell in error fails, stored as such or not, with its reason."""
    path = saved(tmp_path / "plan.xlsx", {"C1": 60, "D1": 30, "E1": "#DIV/0!"}, BEAM | {"E1": "=1/0"})
    status, out, _ = run("check", path)
    assert status == 1
    assert out.splitlines() == [
        f"{path}: 1 beam cell, 1 in error",
        "  Plan!E1  #DIV/0!  the formula gives #DIV/0!",
    ]


def test_folders_are_searched_and_the_order_is_stable(tmp_path: Path) -> None:
    """Folders give their workbooks, in order of name and each once; locks, hidden and other files are passed by."""
    for name in ("b/two.xlsx", "b/c/three.XLSM", "b/one.xlsx", "~$a.xlsx", ".a.xlsx", "b/text.txt", "b/d/four.xls"):
        path = tmp_path / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.touch()
    expected = [tmp_path / "b" / name for name in ("two.xlsx", "one.xlsx", "c/three.XLSM")]
    assert list(workbooks([expected[0], tmp_path, tmp_path / "b"])) == expected


def test_several_jobs_say_the_same_as_one(tmp_path: Path) -> None:
    """With several processes the answers, their order and the status are those of one."""
    for number in range(6):
        saved(tmp_path / f"{number}.xlsx", {"C1": 60 + number % 3, "D1": 30})
    (tmp_path / "5.xlsx").write_text("no workbook")
    one, several = run("check", tmp_path), run("check", tmp_path, "--jobs", "2")
    assert one == several
    assert one[0] == 2
    lines = [line for line in one[1].splitlines() if not line.startswith(" ")]
    assert [line.partition(":")[0] for line in lines] == [str(tmp_path / f"{number}.xlsx") for number in range(6)]
    assert lines[0].endswith("1 beam cell, up to date")
    assert lines[1].endswith("1 beam cell, 1 stale")
    assert "cannot be read: " in lines[5]


@pytest.mark.parametrize("name", ["none.xlsx", "folder", "text.xlsx"])
def test_what_cannot_be_read_ends_with_2(name: str, tmp_path: Path) -> None:
    """A file that is not there, a folder without workbooks, a file of another kind: one line each; the rest is done."""
    good = saved(tmp_path / "plan.xlsx", {"C1": 61, "D1": 30})
    (tmp_path / "text.xlsx").write_text("a,b\n")
    (tmp_path / "folder").mkdir()
    status, out, err = run("check", tmp_path / name, good)
    assert (status, err) == (2, "")
    first, second, _ = out.splitlines()
    assert first.startswith(f"{tmp_path / name}: cannot be read: ")
    assert second == f"{good}: 1 beam cell, 1 stale"


def test_check_as_json(tmp_path: Path) -> None:
    """A script reads the same from JSON."""
    path = saved(tmp_path / "plan.xlsx", {"C1": 61})
    status, out, _ = run("check", path, tmp_path / "none.xlsx", "--json")
    first, second = json.loads(out)
    assert status == 2
    assert [first["book"], first["unread"], first["beam_cells"]] == [str(path), "", 1]
    assert [(one["cell"], one["stored"], one["computed"], one["formula"]) for one in first["stale"]] == [
        ("C1", 61, 60, "=reaction(A1,B1,1)"),
        ("D1", None, 30, "=C1/2"),
    ]
    assert second["unread"] == "there is no such file"


def test_fill_tells_of_differences_volatile_ones_apart(tmp_path: Path) -> None:
    """What is stored otherwise than computed stands below the errors, a line each."""
    cells = BEAM | {"E1": "=4+4", "E2": "=TODAY()", "E3": '="x"', "F1": "=E1+C1"}
    path = saved(tmp_path / "plan.xlsx", {"E1": 4, "E2": 1, "E3": "y"}, cells)
    _, out, _ = run("fill", path)
    head, *lines = out.splitlines()
    assert head.endswith(": 1 beam cell filled, 3 other cells recomputed, no errors, 3 stored otherwise than computed")
    assert lines[:2] == [
        "  Plan!E1  stores 4, computed 8; the stored value is kept",
        '  Plan!E3  stores "y", computed "x"; the stored value is kept',
    ]
    assert lines[2] == "  depending on volatile functions:"
    assert lines[3].startswith("  Plan!E2  stores 1, computed 4")
    assert lines[3].endswith("; the computed value is taken (Plan!E2 is volatile)")
    assert len(lines) == 4


def test_more_jobs_than_processors_are_not_started(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A large number of jobs cannot fill the memory with processes."""
    started: list[int] = []

    class Pool(checking.ProcessPoolExecutor):
        def __init__(self, workers: int) -> None:
            started.append(workers)
            super().__init__(workers)

    monkeypatch.setattr(checking, "ProcessPoolExecutor", Pool)
    monkeypatch.setattr(checking.os, "cpu_count", lambda: 2)
    books = [build(tmp_path / f"plan{n}.xlsx", {"A1": 1.0}) for n in range(3)]
    assert len(list(checking.check_all(books, jobs=99_999))) == 3
    assert started == [2]
