"""A LibreOffice without a window, with a profile of its own: recalculates workbooks and prints them."""

from __future__ import annotations

import shutil
import subprocess
from collections.abc import Sequence
from pathlib import Path

import pytest

PATIENCE = 300
"""Seconds that one start may take, all its workbooks together."""

_ALWAYS_RECALCULATE = """<?xml version="1.0" encoding="UTF-8"?>
<oor:items xmlns:oor="http://openoffice.org/2001/registry" xmlns:xs="http://www.w3.org/2001/XMLSchema">
<item oor:path="/org.openoffice.Office.Calc/Formula/Load"><prop oor:name="OOXMLRecalcMode" oor:op="fuse">
<value>0</value></prop></item></oor:items>
"""


class Office:
    """The office program, its profile in a folder; each call starts it once for all its workbooks."""

    def __init__(self, folder: Path) -> None:
        program = shutil.which("soffice") or shutil.which("libreoffice")
        if program is None:
            pytest.skip("NOT RUN: LibreOffice is not installed")
        self._program = program
        self._profile = folder / "profile"
        user = self._profile / "user"
        user.mkdir(parents=True)
        (user / "registrymodifications.xcu").write_text(_ALWAYS_RECALCULATE)

    def recalculated(self, books: Sequence[Path], folder: Path) -> list[Path]:
        """Write each workbook anew, every formula of it recalculated."""
        return self._convert("xlsx:Calc MS Excel 2007 XML", books, folder)

    def printed(self, books: Sequence[Path], folder: Path) -> list[Path]:
        """Write each workbook as PDF."""
        return self._convert("pdf", books, folder)

    def _convert(self, form: str, books: Sequence[Path], folder: Path) -> list[Path]:
        profile = f"-env:UserInstallation={self._profile.as_uri()}"
        command = [self._program, profile, "--headless", "--norestore", "--convert-to", form, "--outdir", str(folder)]
        done = subprocess.run(
            [*command, *map(str, books)], capture_output=True, text=True, check=False, timeout=PATIENCE
        )
        made = [folder / f"{book.stem}.{form[:4].rstrip(':')}" for book in books]
        missing = [path.name for path in made if not path.is_file()]
        assert not missing, f"{missing} not written, status {done.returncode}: {done.stdout} {done.stderr}"
        assert "error" not in done.stderr.casefold(), done.stderr
        return made
