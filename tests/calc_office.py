"""A real LibreOffice without a window, spoken to through `office_driver.py`: workbooks are entered, read, saved."""

from __future__ import annotations

import json
import os
import subprocess
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import pytest

from beamfuncs.hosts.calc import installing, offices, remote
from beamfuncs.hosts.server import control

XLSX, ODS = "Calc MS Excel 2007 XML", "calc8"
DRIVER = Path(__file__).with_name("office_driver.py")
FOLDER = "BEAMFUNCS_FOLDER"


def an_office() -> offices.Office:
    """The office of this machine with a Python that can talk to it; skip where there is none."""
    office = next(offices.offices(), None)
    if office is None:
        pytest.skip("not run: LibreOffice is not installed")
    if office.python is None:
        pytest.skip("not run: no Python knows LibreOffice (Debian: python3-uno)")
    return office


class CalcOffice:
    """A running office; every method of the driver is one of its methods."""

    def __init__(self, office: offices.Office, profile: Path, folder: Path) -> None:
        command = [
            str(office.python),
            str(DRIVER),
            str(office.soffice),
            str(profile),
            str(Path(remote.__file__).parent),
        ]
        environment = {**os.environ, FOLDER: str(folder)}
        pipe = subprocess.PIPE
        self.process = subprocess.Popen(command, stdin=pipe, stdout=pipe, text=True, env=environment)
        assert self._told() == "ready"

    def __getattr__(self, name: str) -> Callable[..., Any]:
        if name.startswith("_"):
            raise AttributeError(name)

        def ask(*arguments: Any, **named: Any) -> Any:
            assert self.process.stdin
            words = [str(a) if isinstance(a, Path) else a for a in arguments]
            self.process.stdin.write(json.dumps([name, words, named]) + "\n")
            self.process.stdin.flush()
            return self._told()

        return ask

    def end(self) -> None:
        """End the office."""
        assert self.process.stdin
        self.process.stdin.close()
        self.process.wait(60)

    def _told(self) -> Any:
        assert self.process.stdout
        line = self.process.stdout.readline()
        assert line, f"the driver of the office ended with status {self.process.wait()}"
        told = json.loads(line)
        assert "error" not in told, told["error"]
        return told["answer"]


@contextmanager
def running(profile: Path, folder: Path, *, extension: bool = True) -> Iterator[CalcOffice]:
    """An office with a profile of its own, with the extension or without; `folder` is that of its function server.

    At the end the extension must have told of no failure of its own.
    """
    office = an_office()
    folder.mkdir(mode=0o700, exist_ok=True)
    with pytest.MonkeyPatch.context() as patch:
        patch.setenv(FOLDER, str(folder))
        if extension and installing.installed(profile) is None:
            installing.install(office, profile)
    calc = CalcOffice(office, profile, folder)
    try:
        yield calc
    finally:
        calc.end()
        with pytest.MonkeyPatch.context() as patch:
            patch.setenv(FOLDER, str(folder))
            control.stop()
    told = folder / "office.log"
    assert not told.exists(), told.read_text()
