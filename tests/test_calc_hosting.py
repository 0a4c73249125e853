"""The extension put into an office and taken out; several offices, and a server that dies while they compute."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import threading
import time
from collections.abc import Callable, Iterator
from importlib.metadata import version
from pathlib import Path

import pytest
from calc_office import FOLDER, CalcOffice, an_office, running
from typer.testing import CliRunner

from beamfuncs.cli import app
from beamfuncs.hosts.calc import installing, offices
from beamfuncs.hosts.calc.component.beamfuncs_client import places

ROWS = 6_000


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Path]:
    """The folder of the function server, which is told to every client."""
    folder = tmp_path_factory.mktemp("calc") / "server"
    folder.mkdir(mode=0o700)
    with pytest.MonkeyPatch.context() as patch:
        patch.setenv(FOLDER, str(folder))
        yield folder


@pytest.fixture(scope="module")
def calc(folder: Path) -> Iterator[CalcOffice]:
    """An office with the extension."""
    with running(folder.parent / "profile", folder) as office:
        yield office


def column(calc: CalcOffice, rows: int) -> int:
    """A workbook with a column of places, and one of moments there on a simply supported beam."""
    book = calc.new()
    block = [[f"={n / 1000}", f'=moment_at("pinned 20 roller"; "udl 12"; A{n})'] for n in range(1, rows + 1)]
    calc.enter_block(book, f"A1:B{rows}", block)
    return book


def moments(rows: int) -> list[float]:
    """The moments of `column` by statics."""
    return [120.0 * x - 6.0 * x**2 for x in (n / 1000 for n in range(1, rows + 1))]


def found(calc: CalcOffice, book: int, rows: int) -> list[float]:
    """The moments of `column` as Calc shows them."""
    return [row[0] for row in calc.data(book, f"B1:B{rows}")]


def server() -> places.Running:
    """The server that runs."""
    running = places.running()
    assert running
    return running


def test_the_server_dies_while_it_is_asked(calc: CalcOffice) -> None:
    """The server is killed in the middle of a recalculation: another takes over, and every cell has its value."""
    book = column(calc, ROWS)
    assert found(calc, book, ROWS) == pytest.approx(moments(ROWS), rel=1e-12)
    first = server()
    work = threading.Thread(target=calc.recalculate, args=(book,))
    work.start()
    time.sleep(0.1)
    assert work.is_alive()
    os.kill(first.pid, signal.SIGKILL)
    work.join()
    assert server().pid != first.pid
    assert found(calc, book, ROWS) == pytest.approx(moments(ROWS), rel=1e-12)
    calc.close(book)


def test_two_offices_at_once(calc: CalcOffice, folder: Path) -> None:
    """Two offices of one user compute at the same time with one server."""
    with running(folder.parent / "second", folder) as other:
        books = {office: column(office, 2000) for office in (calc, other)}
        pid = server().pid
        work = [threading.Thread(target=office.recalculate, args=(book,)) for office, book in books.items()]
        for one in work:
            one.start()
        for one in work:
            one.join()
        for office, book in books.items():
            assert found(office, book, 2000) == pytest.approx(moments(2000), rel=1e-12)
        assert server().pid == pid
        for office, book in books.items():
            office.close(book)


def test_a_server_that_cannot_be_started(calc: CalcOffice) -> None:
    """Without a server every cell is a genuine error, and the office lives."""
    book = column(calc, 3)
    command = places.command()
    os.kill(server().pid, signal.SIGKILL)
    places.keep_command([sys.executable, "-c", "raise SystemExit('no numbers today')"])
    calc.recalculate(book)
    places.keep_command(command)
    calc.enter(book, {"C1": "=SUM(B1:B3)"})
    assert [cell[0][0] for cell in calc.read(book, "B1:B3")] == [519] * 3
    assert calc.read(book, "C1")[0][0][0] == 519
    calc.close(book)


def run(*arguments: str) -> tuple[int, str]:
    """The exit status and the words of a command."""
    result = CliRunner().invoke(app, ["calc", *arguments])
    return result.exit_code, result.output


def test_install_check_uninstall(folder: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The commands put the extension into a profile and take it out, and `check` says which it is and what to do."""
    an_office()
    monkeypatch.setenv(FOLDER, str(tmp_path / "server"))
    profile = tmp_path / "profile"
    status, told = run("check", "--profile", str(profile))
    assert status == 1
    assert "BAD  extension: not installed" in told
    assert "BAD  function server: " in told
    assert told.count(f"run `beamfuncs calc install --profile {profile}`") == told.count("calc install") == 3
    with monkeypatch.context() as patch:
        patch.setattr(offices, "profile", lambda: profile)
        assert run("check")[1].count("run `beamfuncs calc install`") == 3
    assert run("install", "--profile", str(profile))[0] == 0
    status, told = run("check", "--profile", str(profile))
    assert status == 0, told
    assert f"ok   extension: {version('beamfuncs')}, in {profile}" in told
    assert "ok   function server: answers 60 " in told
    assert "BAD" not in told
    assert run("install", "--profile", str(profile))[0] == 0
    (profile / ".lock").touch()
    status, told = run("uninstall", "--profile", str(profile))
    assert (status, installing.installed(profile)) == (2, version("beamfuncs"))
    assert "close it first" in told
    (profile / ".lock").unlink()
    assert run("uninstall", "--profile", str(profile)) == (0, f"taken out of {profile}\n")
    assert installing.installed(profile) is None
    assert run("uninstall", "--profile", str(profile)) == (0, f"there was nothing in {profile}\n")
    assert places.running() is None


@pytest.fixture
def taking(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Callable[[str], None]:
    """An office without its programs, in whose place a script is run each time its extensions change."""
    if sys.platform == "win32":
        pytest.skip("not run: there is no shell for the script")
    monkeypatch.setenv(FOLDER, str(tmp_path / "server"))
    monkeypatch.setattr(installing, "_is_root", lambda: False)
    monkeypatch.setattr(offices, "_programs", lambda: iter([tmp_path]))
    monkeypatch.setattr(offices, "profile", lambda: tmp_path / "own")
    there = version("beamfuncs")
    monkeypatch.setattr(installing, "installed", lambda profile: there if (profile / "there").exists() else None)
    (tmp_path / "soffice").touch()
    script = tmp_path / "unopkg"
    script.touch(0o755)
    profile = """for one in "$@"; do case $one in -env:*) profile=${one#*//};; esac; done"""

    def take(words: str) -> None:
        script.write_text(f"#!/bin/sh\n{profile}\n{words}\n")

    return take


TAKEN = 'mkdir -p "$profile"; if [ $1 = add ]; then touch "$profile/there"; else rm "$profile/there"; fi'
BREAKS_OFF = "echo 'ERROR: (com.sun.star.deployment.DeploymentException) {' >&2; echo '}' >&2; exit 1"


def test_one_of_several_profiles(tmp_path: Path, taking: Callable[[str], None]) -> None:
    """How the server is started stays known as long as a profile has the extension, the user's own or another."""
    taking(TAKEN)
    own, first, second = (tmp_path / name for name in ("own", "first", "second"))
    for profile in (first, own, second):
        assert run("install", "--profile", str(profile))[0] == 0
    command = places.command()
    for profile in (first, own):
        assert run("uninstall", "--profile", str(profile))[0] == 0
        assert places.command() == command
    assert run("uninstall", "--profile", str(second))[0] == 0
    assert not places.settings().exists()


def test_an_install_that_breaks_off(tmp_path: Path, taking: Callable[[str], None]) -> None:
    """It is tried once more; then it is said in words, nothing being installed."""
    tries = tmp_path / "tries"
    taking(f"echo >>{tries}; if [ $(wc -l <{tries}) = 1 ]; then {BREAKS_OFF}; fi; {TAKEN}")
    assert run("install", "--profile", str(tmp_path / "first"))[0] == 0
    taking(f"echo >>{tries}; {BREAKS_OFF}")
    told = run("install", "--profile", str(tmp_path / "second"))
    assert told == (2, "beamfuncs: not installed: run it again\n")
    assert len(tries.read_text()) == 4
    taking("echo >&2; echo 'no room' >&2; exit 1")
    assert run("install", "--profile", str(tmp_path / "second")) == (2, f"beamfuncs: {tmp_path / 'unopkg'}: no room\n")


def test_the_offices_own_tool_takes_the_extension(tmp_path: Path) -> None:
    """A user who is not root has the extension put in and taken out by the office's own tool."""
    office = an_office()
    if not hasattr(os, "geteuid") or os.geteuid() != 0:
        pytest.skip("not run: the test before was by a user who is not root")
    if subprocess.run(["setpriv", "--version"], capture_output=True, check=False).returncode:
        pytest.skip("not run: there is no setpriv to be another user with")
    extension, home = tmp_path / "beamfuncs.oxt", Path("/tmp") / f"beamfuncs-test-{os.getpid()}"
    assert run("build", "-o", str(extension))[0] == 0
    home.mkdir()
    try:
        os.chown(home, 65534, 65534)
        copy = home / "beamfuncs.oxt"
        copy.write_bytes(extension.read_bytes())
        where = f"-env:UserInstallation={(home / 'profile').as_uri()}"
        for words in (["add", "--suppress-license", "--force", where, str(copy)], ["remove", where, "beamfuncs.calc"]):
            command = ["setpriv", "--reuid=65534", "--regid=65534", "--clear-groups", str(office.unopkg), *words]
            done = subprocess.run(
                command, capture_output=True, text=True, check=False, env={**os.environ, "HOME": str(home)}
            )
            assert done.returncode == 0, done.stderr
            there = installing.installed(home / "profile")
            assert there == (version("beamfuncs") if words[0] == "add" else None)
    finally:
        subprocess.run(["rm", "-r", str(home)], check=False)


def test_no_office(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Where there is no office the commands say so in one line, with what to do."""
    monkeypatch.setattr(offices, "_programs", lambda: iter([tmp_path]))
    monkeypatch.setenv(FOLDER, str(tmp_path / "server"))
    assert run("install", "--profile", str(tmp_path)) == (
        2,
        "beamfuncs: LibreOffice is not found; say where its programs are: --office FOLDER\n",
    )
    assert "BAD  office: LibreOffice is not found" in run("check", "--profile", str(tmp_path))[1]


def test_offices_of_other_systems(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """On Windows and macOS the office is looked for where its installer puts it, and the profile where it keeps it."""
    program = tmp_path / "LibreOffice" / "program"
    program.mkdir(parents=True)
    for name in ("soffice.com", "unopkg.com", "python.exe"):
        (program / name).touch()
    monkeypatch.setattr(offices.sys, "platform", "win32")
    monkeypatch.setattr(offices.shutil, "which", lambda *_, **__: None)
    monkeypatch.setenv("ProgramFiles", str(tmp_path))
    monkeypatch.setenv("APPDATA", str(tmp_path / "Roaming"))
    (office,) = offices.offices()
    assert (office.soffice.name, office.unopkg.name, office.program) == ("soffice.com", "unopkg.com", program)
    assert offices.profile() == tmp_path / "Roaming" / "LibreOffice" / "4"
    monkeypatch.setattr(offices.sys, "platform", "darwin")
    monkeypatch.setattr(Path, "home", lambda: tmp_path)
    program = tmp_path / "Applications" / "LibreOffice.app" / "Contents" / "MacOS"
    program.mkdir(parents=True)
    (program / "soffice").touch()
    assert [office.program for office in offices.offices()] == [program]
    assert offices.profile() == tmp_path / "Library" / "Application Support" / "LibreOffice" / "4"
