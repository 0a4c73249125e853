"""The command line: what it prints, what it writes, and with which status it ends."""

from __future__ import annotations

import json
import os
import re
import subprocess
import sys
from pathlib import Path

import pytest
from books import build, values
from openpyxl import load_workbook
from typer.testing import CliRunner

from beamfuncs import cli
from beamfuncs.catalogue import catalogue
from beamfuncs.cli import app
from beamfuncs.functions import reaction
from beamfuncs.hosts.headless import filling

BEAM = {"A1": "fixed 8 pinned", "B1": "udl 12"}
GOOD = BEAM | {"C1": "=reaction(A1,B1,1)", "D1": "=C1/2"}
BAD = GOOD | {"C2": "=reaction(A1,B1,3)", "C3": "=C2*2"}


def run(*words: str | Path) -> tuple[int, str, str]:
    """Status, standard output and standard error of a command."""
    result = CliRunner().invoke(app, [str(word) for word in words])
    if result.exception and not isinstance(result.exception, SystemExit):
        raise result.exception
    return result.exit_code, result.stdout, result.stderr


def test_fill_writes_a_copy_and_says_what_it_did(tmp_path: Path) -> None:
    """Without errors the status is 0; the copy stands beside the workbook with the values in it."""
    path = build(tmp_path / "plan.xlsx", GOOD)
    status, out, err = run("fill", path)
    target = tmp_path / "plan.filled.xlsx"
    assert (status, err) == (0, "")
    assert out == f"{target}: 1 beam cell filled, 1 other cell recomputed, no errors\n"
    force = reaction("fixed 8 pinned", "udl 12", 1)
    assert values(target) == BEAM | {"C1": force, "D1": force / 2}


def test_fill_lists_each_error_and_ends_with_1(tmp_path: Path) -> None:
    """Each cell in error is one line: sheet and cell, value, reason; the workbook is written all the same."""
    target = tmp_path / "out.xlsx"
    status, out, err = run("fill", build(tmp_path / "plan.xlsx", BAD), "-o", target)
    assert (status, err) == (1, "")
    first, *lines = out.splitlines()
    assert first == f"{target}: 2 beam cells filled, 2 other cells recomputed, 2 cells in error"
    assert len(lines) == 2
    assert lines[0].split(maxsplit=2)[:2] == ["Plan!C2", "#N/A"]
    with pytest.raises(ValueError, match="support") as refusal:
        reaction("fixed 8 pinned", "udl 12", 3)
    assert lines[0].endswith(str(refusal.value))
    assert lines[1].split(maxsplit=2) == ["Plan!C3", "#N/A", "takes #N/A from Plan!C2"]
    assert values(target)["D1"] == 30


def test_fill_as_json(tmp_path: Path) -> None:
    """A script reads the same from JSON, every error with its formula."""
    target = tmp_path / "out.xlsx"
    status, out, _ = run("fill", build(tmp_path / "plan.xlsx", BAD), "-o", target, "--json")
    told = json.loads(out)
    assert status == 1
    assert [told["target"], told["beam_cells"], told["recomputed"]] == [str(target), 2, 2]
    assert [(one["sheet"], one["cell"], one["value"], one["formula"]) for one in told["errors"]] == [
        ("Plan", "C2", "#N/A", "=reaction(A1,B1,3)"),
        ("Plan", "C3", "#N/A", "=C2*2"),
    ]


def test_a_long_list_of_errors_is_cut(tmp_path: Path) -> None:
    """Of very many errors the first are printed and the rest counted; JSON has them all."""
    path = build(tmp_path / "plan.xlsx", {f"A{row}": "=1/0" for row in range(1, 201)})
    status, out, _ = run("fill", path)
    assert status == 1
    assert len(out.splitlines()) == 1 + cli.LISTED + 1
    assert out.splitlines()[-1].strip() == f"and {200 - cli.LISTED} more, which --json lists"
    assert len(json.loads(run("fill", path, "--json")[1])["errors"]) == 200


def test_what_is_printed_is_not_taken_for_markup(tmp_path: Path) -> None:
    """Brackets in a sheet's name are printed as they are."""
    path = build(tmp_path / "[red]plan[bold].xlsx", {"A1": "=1/0"})
    assert "[red]plan[bold].filled.xlsx" in run("fill", path)[1]


@pytest.mark.parametrize("name", ["none.xlsx", "text.xlsx", "."])
def test_when_nothing_is_done_one_line_says_why(tmp_path: Path, name: str) -> None:
    """The status is 2, the reason one line on standard error, standard output empty."""
    (tmp_path / "text.xlsx").write_text("a,b\n")
    status, out, err = run("fill", tmp_path / name)
    assert (status, out) == (2, "")
    assert err.startswith(f"beamfuncs: {tmp_path / name}: ")
    assert err.count("\n") == 1
    assert sorted(path.name for path in tmp_path.iterdir()) == ["text.xlsx"]


def test_fill_never_writes_over_the_workbook(tmp_path: Path) -> None:
    """Given the workbook itself as target, nothing is done."""
    path = build(tmp_path / "plan.xlsx", GOOD)
    before = path.read_bytes()
    status, _, err = run("fill", path, "-o", path)
    assert status == 2
    assert "never written over" in err
    assert path.read_bytes() == before


def test_an_interrupted_fill_is_nothing_done(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Interrupted from the keyboard, it ends with 2 and one line."""

    def interrupted(*_: object, **__: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(filling, "fill", interrupted)
    assert run("fill", tmp_path / "plan.xlsx") == (2, "", "beamfuncs: interrupted: nothing was written\n")


def test_list_names_every_function() -> None:
    """The table has a row for each function, with its arguments and what it returns."""
    status, out, _ = run("list")
    assert status == 0
    for name, entry in catalogue().items():
        (row,) = [line for line in out.splitlines() if line.startswith(f"  {name} ")]
        assert entry.arguments[0].name in row
    assert "[stiffness]" in out


def test_list_of_one_function_is_its_whole_help() -> None:
    """The help of one function, its name in any case: the call and the whole documentation."""
    status, out, _ = run("list", "Moment_AT")
    entry = catalogue()["moment_at"]
    assert status == 0
    assert out == f"{entry.call}\n\n{entry.documentation}\n"


def test_list_as_json() -> None:
    """JSON has for each function what a script would read: name, arguments with help, documentation."""
    told = json.loads(run("list", "--json")[1])
    assert [one["name"] for one in told] == list(catalogue())
    (one,) = [one for one in told if one["name"] == "beam_line"]
    assert one == json.loads(run("list", "beam_line", "--json")[1])
    assert one["arguments"][0]["repeats"] is True
    assert one["documentation"].startswith(one["summary"])


@pytest.mark.parametrize(
    ("name", "near"), [("moment_mx", "moment_max"), ("reacton", "reaction"), ("zzz", "beamfuncs list")]
)
def test_an_unknown_function_has_near_ones(name: str, near: str) -> None:
    """A name that is misspelt ends with 2 and names what is near it, or how to find all."""
    status, out, err = run("list", name)
    assert (status, out) == (2, "")
    assert err.startswith(f"beamfuncs: no function is called {name}; ")
    assert near in err


def test_wrong_usage_is_nothing_done() -> None:
    """Missing or unknown words end with 2."""
    assert run("fill")[0] == 2
    assert run("fil")[0] == 2
    assert run("fill", "a.xlsx", "--bogus")[0] == 2


def test_a_bar_shows_on_a_terminal_only_after_a_while(monkeypatch: pytest.MonkeyPatch) -> None:
    """In a pipe progress goes nowhere; on a terminal a bar starts once the work has lasted."""

    def told(terminal: bool, patience: float) -> bool:
        started: list[bool] = []
        monkeypatch.setattr(sys.stderr, "isatty", lambda: terminal, raising=False)
        monkeypatch.setattr(cli, "PATIENCE", patience)
        monkeypatch.setattr("rich.progress.Progress.start", lambda self: started.append(True))
        with cli._progress_bar() as progress:
            progress(1, 2)
        return bool(started)

    assert not told(terminal=False, patience=-1.0)
    assert not told(terminal=True, patience=60.0)
    assert told(terminal=True, patience=-1.0)


def python(*words: str | Path, cwd: Path | None = None) -> subprocess.CompletedProcess[str]:
    """Run Python in a process of its own, this project on its path."""
    root = Path(cli.__file__).parents[1]
    environment = os.environ | {"PYTHONPATH": str(root), "PYTHONIOENCODING": "utf-8"}
    command = [sys.executable, *map(str, words)]
    return subprocess.run(command, cwd=cwd, env=environment, capture_output=True, text=True, check=False, timeout=60)


def test_as_a_process(tmp_path: Path) -> None:
    """Run as a program in a pipe it gives the same statuses, and prints no escape codes and no bar."""
    build(tmp_path / "bad.xlsx", BAD)
    build(tmp_path / "good.xlsx", GOOD)
    good, bad, none = (
        python("-m", "beamfuncs.cli", "fill", f"{name}.xlsx", cwd=tmp_path) for name in ("good", "bad", "none")
    )
    assert (good.returncode, bad.returncode, none.returncode) == (0, 1, 2)
    assert good.stderr == bad.stderr == ""
    assert "\x1b" not in good.stdout + bad.stdout + none.stderr
    assert none.stderr == "beamfuncs: none.xlsx: there is no such file\n"


def test_help_loads_nothing_heavy() -> None:
    """The program and its help load no solver, engine, workbook library or server: those come when they are needed."""
    heavy = ["numpy", "scipy", "openpyxl", "formualizer", "pint", "xlwings", "multiprocessing"]
    heavy += ["beamfuncs.functions", "beamfuncs.hosts.headless", "beamfuncs.hosts.server.serving"]
    look = f"print([name for name in {heavy} if name in sys.modules], file=sys.stderr)"
    code = f"import sys, beamfuncs.cli as cli; {look}\ntry: cli.app(['--help'])\nfinally: {look}"
    done = python("-c", code)
    assert done.stderr.splitlines() == ["[]", "[]"]
    assert "fill" in done.stdout


def test_the_version_is_the_package_s() -> None:
    """`--version` prints the name and the version that is installed."""
    from importlib.metadata import version

    assert run("--version")[:2] == (0, f"beamfuncs {version('beamfuncs')}\n")


@pytest.mark.parametrize("part", ["Plan", "plan", "'Plan'!$A$1:$D$1", "Plan!A1:D1", "Plan!D1"])
def test_filled_values_of_a_part_are_printed(part: str, tmp_path: Path) -> None:
    """`--show` takes a sheet or an area of it, and prints what stands there after filling."""
    status, out, _ = run("fill", build(tmp_path / "plan.xlsx", GOOD | {"D1": "=C1/7"}), "--show", part)
    assert status == 0
    assert ("fixed 8 pinned" in out) == (part != "Plan!D1")
    assert "8.57143" in out


def test_a_defined_name_is_shown(tmp_path: Path) -> None:
    """`--show` takes a defined name."""
    book = Path(__file__).parent.parent / "workbooks" / "kestrel_quay.xlsx"
    status, out, _ = run("fill", book, "-o", tmp_path / "out.xlsx", "--show", "pads")
    assert status == 0
    shown = load_workbook(tmp_path / "out.xlsx", data_only=True)["Foundations"]
    totals = {row[0]: row[2] for row in shown["N7:P17"] for row in [[cell.value for cell in row]]}
    assert totals["P1"] > 0
    for pad, total in totals.items():
        assert re.search(rf"{pad} .* {total:.6g} ", out)


def test_a_part_that_is_not_there_is_said_before_anything_is_done(tmp_path: Path) -> None:
    """`--show` with an unknown part does nothing and says so."""
    status, _, err = run("fill", build(tmp_path / "plan.xlsx", GOOD), "--show", "Roof")
    assert status == 2
    assert "called Roof" in err
    assert not (tmp_path / "plan.filled.xlsx").exists()
