"""The functions put into Excel and taken out again, and the diagnosis: on a made-up machine in a folder."""

from __future__ import annotations

import codecs
import json
import os
import struct
import subprocess
import sys
from collections.abc import Callable, Iterator
from contextlib import suppress
from dataclasses import dataclass, field
from importlib.metadata import requires
from pathlib import Path
from tempfile import TemporaryDirectory
from types import SimpleNamespace
from typing import Any
from zipfile import ZipFile

import pytest
from addins import build_addin
from hypothesis import given, settings
from hypothesis import strategies as st
from oletools.olevba import VBA_Parser
from typer.testing import CliRunner

from beamfuncs.catalogue import catalogue
from beamfuncs.cli import app
from beamfuncs.hosts.excel_addin import checking, installing, machine, places, server, windows
from beamfuncs.hosts.excel_addin import settings as conf
from beamfuncs.hosts.excel_addin.addin import read_addin
from beamfuncs.hosts.excel_addin.receipt import read_receipt
from beamfuncs.hosts.excel_addin.templates import template
from beamfuncs.hosts.excel_addin.vba import MODULE, SERVED, module_text
from beamfuncs.hosts.excel_addin.vbaproject import NotRead, modules

PIN = next(one for one in requires("beamfuncs") or () if one.startswith("xlwings")).partition("==")[2]
OLDER = "0.1.2"
TEMPLATE = template("quickstart_addin.xlam")
EMPTY = modules(TEMPLATE)
PYTHON = sys.executable
FOREIGN = b"an add-in of somebody else"
EXCEL_64, EXCEL_32 = 0x8664, 0x14C
OFFICE = r"Software\Microsoft\Office\16.0"
POLICY = r"Software\Policies\Microsoft\Office\16.0"
ANSWERS = "#!/bin/sh\necho noise\necho beamfuncs answers 60.0\n"
SILENT = "#!/bin/sh\necho 'ImportError: no such thing' >&2\nexit 1\n"


def program(processor: int) -> bytes:
    """The first bytes of a program for Windows that is made for a processor."""
    return b"MZ" + bytes(58) + struct.pack("<I", 0x80) + bytes(64) + b"PE\0\0" + struct.pack("<H", processor)


@dataclass
class Machine:
    """A machine with Windows: a folder for its disk, and its registry."""

    disk: Path
    registry: dict[tuple[str, str, str], str | int] = field(default_factory=dict)
    importable: set[str] = field(default_factory=lambda: {"pythoncom", "win32com.client"})

    @property
    def profile(self) -> Path:
        """The home folder of the user."""
        return self.disk / "Users" / "kestrel"

    @property
    def environment(self) -> dict[str, str]:
        """The variables that Windows sets."""
        data = self.profile / "AppData"
        folders = {"USERPROFILE": self.profile, "APPDATA": data / "Roaming", "LOCALAPPDATA": data / "Local"}
        return {name: str(folder) for name, folder in folders.items()}

    @property
    def places(self) -> places.Places:
        """Where everything belongs."""
        return places.places(self.environment)

    @property
    def scripts(self) -> Path:
        """The folder of the programs of the environment."""
        return self.disk / "venv" / "Scripts"

    @property
    def excel(self) -> Path:
        """The program of Excel."""
        return self.disk / "Office16" / "EXCEL.EXE"

    def library(self, bits: int) -> Path:
        """The library of xlwings for an Excel of so many bits, where `pip` puts it."""
        return self.scripts.parent / f"xlwings{bits}-{PIN}.dll"

    def put(self, path: Path, content: bytes = b"") -> Path:
        """Write a file and the folders above it."""
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(content)
        return path

    def program(self, path: Path, script: str) -> Path:
        """Write a program that can be started."""
        self.put(path, script.encode()).chmod(0o755)
        return path

    def tree(self) -> dict[str, bytes | None]:
        """Every file and folder of the profile; half-written files that a killed run leaves are no part of it."""
        return {
            str(path.relative_to(self.profile)): path.read_bytes() if path.is_file() else None
            for path in sorted(self.profile.rglob("*"))
            if not path.name.startswith(".beamfuncs-")
        }


def build_machine(disk: Path, monkeypatch: pytest.MonkeyPatch) -> Machine:
    """A machine on which everything is in order, and nothing of beamfuncs is in Excel yet."""
    one = Machine(disk)
    (one.profile / "AppData" / "Roaming").mkdir(parents=True)
    (one.profile / "AppData" / "Local").mkdir()
    one.put(one.excel, program(EXCEL_64))
    one.registry[windows.MACHINE, windows.APP_PATH, ""] = str(one.excel)
    one.registry[windows.MACHINE, windows.CURRENT_EXCEL, ""] = "Excel.Application.16"
    one.registry[windows.MACHINE, windows.CLICK_TO_RUN, "VersionToReport"] = "16.0.9.1"
    for bits in (32, 64):
        one.put(one.library(bits))
    one.put(one.scripts / "python.exe")
    one.program(one.scripts / "pythonw.exe", ANSWERS)
    for name, value in one.environment.items():
        monkeypatch.setenv(name, value)
    for name in [name for name in os.environ if name.upper().startswith("ONEDRIVE")]:
        monkeypatch.delenv(name)
    monkeypatch.setattr(sys, "executable", str(one.scripts / "python.exe"))
    monkeypatch.setattr(sys, "base_prefix", sys.base_prefix)
    monkeypatch.setattr(windows, "here", lambda: True)
    monkeypatch.setattr(windows, "registry", lambda root, key, name="": one.registry.get((root, key, name)))
    monkeypatch.setattr(windows, "has_module", lambda name: name in one.importable)
    return one


@pytest.fixture
def pc(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Machine:
    """A machine in order."""
    return build_machine(tmp_path, monkeypatch)


def run(*words: str | Path) -> tuple[int, str, str]:
    """Status, standard output and standard error of `beamfuncs excel`."""
    result = CliRunner().invoke(app, ["excel", *map(str, words)])
    if result.exception and not isinstance(result.exception, SystemExit):
        raise result.exception
    return result.exit_code, result.stdout, result.stderr


def done(*words: str | Path) -> str:
    """What a command prints that does its work."""
    status, out, err = run(*words)
    assert (status, err) == (0, "")
    return out


def refused(*words: str | Path) -> str:
    """The one line with which a command gives up."""
    status, out, err = run(*words)
    assert (status, out, err.count("\n")) == (2, "", 1)
    return err.removeprefix("beamfuncs: ").removesuffix("\n")


def complete(
    path: Path, source: str | None = None, xlwings: str = PIN, project: str = places.PROJECT, **more: str
) -> Path:
    """The template after the module with the functions was imported into it."""
    changed = EMPTY["xlwings"].replace(
        f'XLWINGS_VERSION As String = "{PIN}"', f'XLWINGS_VERSION As String = "{xlwings}"'
    )
    changed = changed.replace(f'PROJECT_NAME As String = "{places.PROJECT}"', f'PROJECT_NAME As String = "{project}"')
    held = {**EMPTY, "xlwings": changed, MODULE: module_text() if source is None else source, **more}
    return build_addin(path, {name: text for name, text in held.items() if text})


# --- what is read ---------------------------------------------------------------------------------


@pytest.mark.parametrize("name", ["quickstart_addin.xlam", "quickstart.xlsm", "addin/xlwings.xlam"])
def test_vba_is_read_as_another_reader_reads_it(name: str) -> None:
    """The modules of real workbooks, and their source to the last character, are those that oletools finds."""
    file = template(name)
    theirs = {stream.rpartition("/")[2]: code for _, stream, _, code in VBA_Parser(str(file)).extract_macros()}
    ours = modules(file)
    assert ours.keys() == theirs.keys()
    for module, source in ours.items():
        assert source.replace("\r\n", "\n") == theirs[module].replace("\r\n", "\n")


def test_what_is_assumed_of_the_template() -> None:
    """The template's VBA is of the pinned version, and names the settings and the libraries as they are named here."""
    _, _, _, source = next(one for one in VBA_Parser(str(TEMPLATE)).extract_macros() if one[1] == "VBA/xlwings")
    assert f'XLWINGS_VERSION As String = "{PIN}"' in source
    assert f'PROJECT_NAME As String = "{places.PROJECT}"' in source
    assert 'Environ("USERPROFILE") & "\\." & PROJECT_NAME & "\\" & PROJECT_NAME & ".conf"' in source
    for bits in (32, 64):
        assert f'XLPyDLLName As String = "{machine.library(bits)}"' in source
    for key in conf.wanted(Path()):
        assert f'"{key}"' in source
    assert 'ParentFolder(PYTHON_WIN) + "\\" + XLPyDLLName' in source
    assert 'ParentFolder(ParentFolder(PYTHON_WIN)) + "\\" + XLPyDLLName' in source
    found = read_addin(TEMPLATE)
    assert (found.xlwings, found.project, found.complete, found.functions) == (PIN, places.PROJECT, False, {})


def test_the_project_has_the_name_that_the_steps_name() -> None:
    """The VBA editor lists the add-in under the name that `install` tells."""
    with ZipFile(TEMPLATE) as archive:
        assert b'Name="MyAddin"' in archive.read("xl/vbaProject.bin")


@pytest.mark.parametrize(
    ("content", "reason"),
    [
        (b"", "is not a workbook with macros"),
        (b"PK\3\4", "is not a workbook with macros"),
        ({"xl/workbook.xml": b""}, "holds no VBA project"),
        ({"xl/vbaProject.bin": b"nothing"}, "its VBA project is damaged"),
        ({"xl/vbaProject.bin": bytes.fromhex("d0cf11e0a1b11ae1") + bytes(600)}, "its VBA project is damaged"),
        ({"xl/vbaProject.bin": bytes(33 << 20)}, "its VBA project is larger than 32 MB"),
    ],
)
def test_an_add_in_that_is_none(pc: Machine, content: bytes | dict[str, bytes], reason: str) -> None:
    """A file that is no add-in is refused with its fault, and nothing is installed."""
    file = pc.disk / "given.xlam"
    if isinstance(content, bytes):
        file.write_bytes(content)
    else:
        with ZipFile(file, "w") as archive:
            for name, data in content.items():
                archive.writestr(name, data)
    before = pc.tree()
    assert refused("install", "--addin", file).startswith(f"{file}: {reason}")
    assert pc.tree() == before


@given(st.data())
@settings(max_examples=60, deadline=None)
def test_a_damaged_project_ends_in_a_reason(data: st.DataObject) -> None:
    """Whatever bytes of an add-in's project are changed or cut off: it is read, or refused with a reason."""
    with ZipFile(TEMPLATE) as archive:
        project = bytearray(archive.read("xl/vbaProject.bin"))
    for _ in range(data.draw(st.integers(1, 8))):
        near_the_head = st.integers(0, 1535) | st.integers(0, len(project) - 1)
        project[data.draw(near_the_head)] = data.draw(st.integers(0, 255))
    with TemporaryDirectory() as folder:
        file = Path(folder) / "damaged.xlam"
        with ZipFile(file, "w") as archive:
            archive.writestr("xl/vbaProject.bin", bytes(project[: data.draw(st.integers(0, len(project)))]))
        with suppress(NotRead):
            read_addin(file)


@pytest.mark.parametrize(("processor", "bits"), [(EXCEL_32, 32), (EXCEL_64, 64)])
def test_the_bits_of_a_program(tmp_path: Path, processor: int, bits: int) -> None:
    """The head of a program tells for how many bits it is made."""
    file = tmp_path / "EXCEL.EXE"
    file.write_bytes(program(processor))
    assert windows.bitness(file) == bits


@pytest.mark.parametrize(
    ("content", "reason"),
    [
        (b"", "is not a program"),
        (b"MZ", "is not a program"),
        (b"#!/bin/sh" * 20, "is not a program"),
        (program(EXCEL_64)[:-2], "is not a program"),
        (program(EXCEL_64).replace(b"PE", b"NE"), "is not a program"),
        (program(0xAA64), "a processor that xlwings does not serve (0xAA64)"),
    ],
)
def test_a_program_that_does_not_tell_its_bits(pc: Machine, content: bytes, reason: str) -> None:
    """Where EXCEL.EXE cannot be understood nothing is installed."""
    pc.put(pc.excel, content)
    assert reason in refused("install")
    assert "repair Office" in refused("install")


def test_the_registry_is_read_through_winreg(monkeypatch: pytest.MonkeyPatch) -> None:
    """Values of text and whole numbers come back as they are, all else and what is not there as None."""
    held = {("HKLM", "key", "text"): "a", ("HKLM", "key", "number"): 4, ("HKLM", "key", "bytes"): b"a"}

    class Key(tuple[Any, ...]):
        def __enter__(self) -> Key:
            return self

        def __exit__(self, *_: object) -> None: ...

    def query(key: Key, name: str) -> tuple[object, int]:
        if (*key, name) not in held:
            raise FileNotFoundError(2, "no such value")
        return held[(*key, name)], 1

    fake = SimpleNamespace(OpenKey=lambda *key: Key(key), QueryValueEx=query, HKEY_LOCAL_MACHINE="HKLM")
    monkeypatch.setitem(sys.modules, "winreg", fake)  # type: ignore[arg-type]
    monkeypatch.setattr(sys, "platform", "win32")
    names = "text", "number", "bytes", "none"
    assert [windows.registry(windows.MACHINE, "key", name) for name in names] == ["a", 4, None, None]


def test_the_code_page_is_that_of_the_machine(monkeypatch: pytest.MonkeyPatch) -> None:
    """On Windows text is written and read in its ANSI code page, here in that of Greek; a lack is an error."""

    def greek(name: str) -> codecs.CodecInfo | None:
        return codecs.lookup("cp1253") if name == "mbcs" else None

    codecs.register(greek)
    try:
        monkeypatch.setattr(sys, "platform", "win32")
        assert windows.ansi("γ") == b"\xe3"
        assert windows.from_ansi(b"\xe3") == "γ"
        with pytest.raises(UnicodeEncodeError):
            windows.ansi("ж")
    finally:
        codecs.unregister(greek)


def test_modules_that_can_be_imported() -> None:
    """A module is there if it can be imported."""
    assert windows.has_module("json")
    assert not windows.has_module("no_such_module_here")
    assert windows.own_bitness() in (32, 64)


def test_places_follow_the_environment(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    """Windows' variables are followed where they are set; without them the usual folders are meant."""
    monkeypatch.setattr(Path, "home", lambda: tmp_path)
    monkeypatch.setattr(sys, "platform", "win32")
    given = places.places({"USERPROFILE": "p", "APPDATA": "r", "LOCALAPPDATA": "l"})
    assert given.addin == Path("r/Microsoft/Excel/XLSTART/beamfuncs.xlam")
    assert given.settings == Path("p/.myaddin/myaddin.conf")
    assert given.log == Path("l/beamfuncs/excel.log")
    bare = places.places({"APPDATA": ""})
    assert (bare.roaming, bare.local) == (tmp_path / "AppData" / "Roaming", tmp_path / "AppData" / "Local")
    monkeypatch.setattr(sys, "platform", "linux")
    elsewhere = places.places({"XDG_STATE_HOME": "s"})
    assert (elsewhere.roaming, elsewhere.local) == (tmp_path / ".config", Path("s"))


# --- settings -------------------------------------------------------------------------------------

OURS = conf.block(conf.wanted(Path(r"C:\venv\Scripts\pythonw.exe")))


@pytest.mark.parametrize(
    ("text", "read"),
    [
        ('"A","1"\r\n"B","2"\r\n', {"A": "1", "B": "2"}),
        ('"A","1"\n"a","2"\n', {"A": "1"}),
        ('"A","1, ""\n', {"A": "1, "}),
        ("a, 1 \r\nb,#TRUE#", {"A": "1", "B": "#TRUE#"}),
        ('"A"\r\n"B"\r\n', {"A": "B"}),
        ('\r\n"A","1"\r\n', {"": "A"}),
        ("", {}),
    ],
)
def test_settings_are_read_as_vba_reads_them(text: str, read: dict[str, str]) -> None:
    """Fields are taken two by two across lines, as VBA's `Input #` does; the first of equal keys counts."""
    assert conf.read(text) == read


def test_a_key_without_a_value_is_seen() -> None:
    """A blank line shifts all that follows, and leaves a key without a value at the end."""
    assert conf.paired('"A","1"\r\n')
    assert not conf.paired('"A","1"\r\n\r\n')


@given(st.binary() | st.text().map(str.encode) | st.sampled_from([OURS, OURS[:-1], OURS + OURS, conf.MARK.encode()]))
def test_our_lines_come_and_go_without_a_trace(content: bytes) -> None:
    """Whatever a settings file holds: with our lines it says what we want, and without them it is as it was."""
    assert conf.without(OURS + content, OURS) == (content, [])
    read = conf.read(windows.from_ansi(OURS + content))
    assert read.items() >= conf.wanted(Path(r"C:\venv\Scripts\pythonw.exe")).items()


@given(st.integers(0, 3), st.binary(max_size=40), st.binary(max_size=40))
def test_lines_of_others_among_ours_stay(position: int, inside: bytes, behind: bytes) -> None:
    """What was written between our lines since, and behind them, is kept when they are taken out."""
    inside = inside.replace(b"\r", b"").replace(b"\n", b"") + b"x\r\n"
    lines = OURS.splitlines(keepends=True)
    content = b"".join([*lines[: position + 1], inside, *lines[position + 1 :], behind])
    assert conf.without(content, OURS)[0] == inside + behind


def test_a_changed_line_is_left() -> None:
    """A line of ours that somebody changed is theirs, and told; so is one like ours where ours never were."""
    changed = OURS.replace(b"pythonw", b"python")
    assert conf.without(changed, OURS) == (
        b'"INTERPRETER_WIN","C:\\venv\\Scripts\\python.exe"\r\n',
        ["INTERPRETER_WIN"],
    )
    lines = OURS.splitlines(keepends=True)
    assert conf.without(b"".join([lines[0], *lines[2:]]), OURS) == (b"", [])
    assert conf.without(lines[2], OURS) == (lines[2], [])


# --- install and uninstall ------------------------------------------------------------------------


def test_a_first_installation(pc: Machine) -> None:
    """The template is the add-in, the settings name this Python, and the steps that are left are told."""
    out = done("install")
    where = pc.places
    assert where.addin.read_bytes() == TEMPLATE.read_bytes()
    assert where.settings.read_bytes() == (
        conf.MARK.encode()
        + f'"INTERPRETER_WIN","{pc.scripts / "pythonw.exe"}"\r\n'.encode()
        + f'"UDF MODULES","{SERVED}"\r\n'.encode()
        + b'"ADD_WORKBOOK_TO_PYTHONPATH","False"\r\n'
    )
    assert where.module.read_bytes() == module_text().encode("ascii")
    for told in (where.addin, where.settings, where.module, "MyAddin (beamfuncs.xlam)", "Alt+F11", "Remove BeamFuncs"):
        assert str(told) in out
    assert list(where.startup.iterdir()) == [where.addin]


def test_without_a_windowless_python_the_other_is_named(pc: Machine) -> None:
    """Where there is no `pythonw.exe` the settings name `python.exe`."""
    (pc.scripts / "pythonw.exe").unlink()
    done("install")
    assert f'"INTERPRETER_WIN","{pc.scripts / "python.exe"}"' in pc.places.settings.read_text()


def test_nothing_is_left_behind(pc: Machine) -> None:
    """After installing and uninstalling the profile holds the same files and folders as before."""
    before = pc.tree()
    done("install")
    assert pc.tree() != before
    out = done("uninstall")
    assert pc.tree() == before
    assert f"removed: {pc.places.addin}" in out
    assert f"removed: {pc.places.settings}" in out


def test_what_was_there_comes_back(pc: Machine) -> None:
    """An add-in of that name and settings that were there before are as they were, to the last byte."""
    pc.put(pc.places.addin, FOREIGN)
    pc.put(pc.places.startup / "other.xlam", b"stays")
    pc.put(pc.places.settings, b'"INTERPRETER_WIN","D:\\python.exe"\n"COLOUR","blue"')
    before = pc.tree()
    out = done("install")
    assert "kept" in out
    assert pc.places.addin.read_bytes() == TEMPLATE.read_bytes()
    read = conf.read(pc.places.settings.read_text())
    assert (read["INTERPRETER_WIN"], read["COLOUR"]) == (str(pc.scripts / "pythonw.exe"), "blue")
    assert f"as it was before: {pc.places.addin}" in done("uninstall")
    assert pc.tree() == before


@given(st.binary() | st.text().map(str.encode))
@settings(max_examples=25, deadline=None)
def test_any_settings_file_comes_back(content: bytes) -> None:
    """Whatever bytes a settings file held, installing twice and uninstalling gives them back."""
    with TemporaryDirectory() as folder, pytest.MonkeyPatch.context() as monkeypatch:
        pc = build_machine(Path(folder), monkeypatch)
        pc.put(pc.places.settings, content)
        before = pc.tree()
        installing.install(pc.places)
        assert pc.places.settings.read_bytes().endswith(content)
        installing.install(pc.places)
        installing.uninstall(pc.places)
        assert pc.tree() == before


def test_twice_is_as_once(pc: Machine) -> None:
    """A second installation changes nothing, nor does a second removal, which says that there is nothing."""
    pc.put(pc.places.settings, b'"COLOUR","blue"')
    before = pc.tree()
    done("install")
    once = pc.tree()
    done("install")
    assert pc.tree() == once
    done("uninstall")
    assert pc.tree() == before
    assert done("uninstall") == "nothing is installed\n"
    assert pc.tree() == before


def test_an_imported_module_is_not_overwritten(pc: Machine) -> None:
    """An add-in with its functions stays when the same version is installed again, and goes when it is removed."""
    before = pc.tree()
    done("install")
    complete(pc.places.addin)
    saved = pc.places.addin.read_bytes()
    out = done("install")
    assert pc.places.addin.read_bytes() == saved
    assert "Alt+F11" not in out
    assert "gives 60" in out
    done("uninstall")
    assert pc.tree() == before


def test_a_module_of_another_version_is_to_be_imported_anew(pc: Machine) -> None:
    """Where the functions in the add-in are declared otherwise than now, the steps by hand are told again."""
    done("install")
    complete(pc.places.addin, module_text().replace("moment_at(beam As Variant, ", "moment_at("))
    saved = pc.places.addin.read_bytes()
    assert "Remove BeamFuncs" in done("install")
    assert pc.places.addin.read_bytes() == saved
    complete(pc.places.addin)
    assert "Remove BeamFuncs" not in done("install")


def test_an_empty_add_in_gives_way_without_a_trace(pc: Machine, monkeypatch: pytest.MonkeyPatch) -> None:
    """The template of another time, with nothing imported into it, is replaced and not kept."""
    before = pc.tree()
    other = build_addin(pc.disk / "other.xlam", EMPTY)
    templates = iter([other, TEMPLATE])
    monkeypatch.setattr(installing, "template", lambda _: next(templates))
    done("install")
    assert pc.places.addin.read_bytes() == other.read_bytes()
    assert "kept" not in done("install")
    assert pc.places.addin.read_bytes() == TEMPLATE.read_bytes()
    done("uninstall")
    assert pc.tree() == before


@pytest.mark.parametrize("rounds", [1, 2])
def test_another_version_of_xlwings_needs_a_new_import(pc: Machine, rounds: int) -> None:
    """An add-in with the VBA of another version gives way to the template; it is kept, out of Excel's reach."""
    before = pc.tree()
    done("install")
    for number in range(rounds):
        complete(pc.places.addin, xlwings=f"{OLDER}{number}")
        saved = pc.places.addin.read_bytes()
        out = done("install")
        kept = pc.places.own / f"beamfuncs.{number + 1}.xlam"
        assert kept.read_bytes() == saved
        assert f"kept: {kept}" in out
        assert "Import File" in out
        assert pc.places.addin.read_bytes() == TEMPLATE.read_bytes()
        assert list(pc.places.startup.iterdir()) == [pc.places.addin]
    done("uninstall")
    assert pc.tree() == before


def test_an_add_in_from_a_colleague(pc: Machine) -> None:
    """A given add-in with the functions is put in place as it is, and nothing is left to do by hand."""
    given = complete(pc.disk / "from a colleague.xlam")
    before = pc.tree()
    out = done("install", "--addin", given)
    assert pc.places.addin.read_bytes() == given.read_bytes()
    assert "Import File" not in out
    done("install")
    assert pc.places.addin.read_bytes() == given.read_bytes()
    done("uninstall")
    assert pc.tree() == before


def test_a_given_add_in_replaces_what_was_imported(pc: Machine) -> None:
    """Who asks for another add-in gets it, and the one that stood there is kept until all is removed."""
    before = pc.tree()
    done("install")
    complete(pc.places.addin)
    saved = pc.places.addin.read_bytes()
    given = complete(pc.disk / "given.xlam", module_text() + "' newer\r\n")
    done("install", "--addin", given)
    assert pc.places.addin.read_bytes() == given.read_bytes()
    assert (pc.places.own / "beamfuncs.1.xlam").read_bytes() == saved
    done("uninstall")
    assert pc.tree() == before


def test_a_complete_add_in_that_was_there_is_taken_as_it_is(pc: Machine) -> None:
    """An add-in put there by hand serves as well as ours; it is nothing of ours, so it stays at the end."""
    complete(pc.places.addin)
    before = pc.tree()
    assert "Import File" not in done("install")
    assert f"left, since it was there before: {pc.places.addin}" in done("uninstall")
    assert pc.tree() == before


@pytest.mark.parametrize(
    ("changes", "reason"),
    [
        ({"xlwings": OLDER}, f"was made with xlwings {OLDER}, and this Python has {PIN}"),
        ({"project": "other"}, "is an add-in for other, not for beamfuncs"),
    ],
)
def test_a_given_add_in_that_would_not_work(pc: Machine, changes: dict[str, str], reason: str) -> None:
    """An add-in of another xlwings, or for another program, is refused before anything is changed."""
    given = complete(pc.disk / "given.xlam", **changes)
    before = pc.tree()
    assert reason in refused("install", "--addin", given)
    assert pc.tree() == before


def test_a_given_add_in_without_xlwings_or_without_a_file(pc: Machine) -> None:
    """An add-in without the VBA of xlwings is refused, and so is a file that is not there."""
    given = build_addin(pc.disk / "given.xlam", {"Module1": 'Attribute VB_Name = "Module1"\r\n'})
    assert refused("install", "--addin", given) == f"{given}: does not hold the VBA of xlwings"
    assert refused("install", "--addin", pc.disk / "no.xlam") == f"{pc.disk / 'no.xlam'}: there is no such file"


def test_later_edits_of_others_are_left(pc: Machine) -> None:
    """Modules that somebody added to the add-in, lines and files of others are left, and it is said why."""
    done("install")
    where = pc.places
    complete(where.addin, Mine='Attribute VB_Name = "Mine"\r\n')
    mine = where.addin.read_bytes()
    changed = where.settings.read_bytes().replace(b"pythonw.exe", b"python.exe") + b'"COLOUR","blue"\r\n'
    where.settings.write_bytes(changed)
    pc.put(where.own / "notes.txt", b"mine")
    out = done("uninstall")
    assert f"left, since modules were added to it: {where.addin}" in out
    assert f"left, since it is not as it was installed: INTERPRETER_WIN in {where.settings}" in out
    assert {path: path.read_bytes() for path in where.profile.rglob("*") if path.is_file()} == {
        where.addin: mine,
        where.settings: f'"INTERPRETER_WIN","{pc.scripts / "python.exe"}"\r\n"COLOUR","blue"\r\n'.encode(),
        where.own / "notes.txt": b"mine",
    }
    assert done("uninstall") == "nothing is installed\n"


def test_older_add_ins_with_other_modules_are_left(pc: Machine) -> None:
    """Of add-ins that were kept at an update, one to which somebody added modules stays, and is named."""
    done("install")
    complete(pc.places.addin, xlwings=OLDER, Mine='Attribute VB_Name = "Mine"\r\n')
    done("install")
    kept = pc.places.own / "beamfuncs.1.xlam"
    assert f"left, since modules were added to it: {kept}" in done("uninstall")
    assert read_addin(kept).xlwings == OLDER
    assert not pc.places.addin.exists()


def test_a_place_that_is_taken_keeps_what_was_before(pc: Machine) -> None:
    """Where the add-in cannot be put back, for somebody's own stands there, both are kept and named."""
    pc.put(pc.places.addin, FOREIGN)
    done("install")
    complete(pc.places.addin, Mine='Attribute VB_Name = "Mine"\r\n')
    out = done("uninstall")
    kept = pc.places.own / "beamfuncs.1.xlam"
    assert f"left, since its place is taken: {kept}" in out
    assert kept.read_bytes() == FOREIGN
    assert read_addin(pc.places.addin).complete


def test_what_somebody_removed_is_no_matter(pc: Machine) -> None:
    """Where our files are gone already, the rest is removed without a word of them."""
    before = pc.tree()
    done("install")
    pc.places.addin.unlink()
    pc.places.settings.unlink()
    pc.places.module.unlink()
    done("uninstall")
    assert pc.tree() == before


def test_a_former_add_in_comes_back_where_ours_was_removed(pc: Machine) -> None:
    """The add-in from before is put back also where somebody deleted ours."""
    pc.put(pc.places.addin, FOREIGN)
    before = pc.tree()
    done("install")
    pc.places.addin.unlink()
    done("uninstall")
    assert pc.tree() == before


def test_an_environment_that_moved(pc: Machine) -> None:
    """Installed again from another environment, the settings name that one alone, and go at the end."""
    pc.put(pc.places.settings, b'"COLOUR","blue"')
    before = pc.tree()
    done("install")
    moved = pc.disk / "moved"
    pc.scripts.parent.rename(moved)
    sys.executable = str(moved / "Scripts" / "python.exe")
    done("install")
    text = pc.places.settings.read_text()
    assert text.count("INTERPRETER_WIN") == 1
    assert str(moved / "Scripts" / "pythonw.exe") in text
    done("uninstall")
    assert pc.tree() == before


class Killed(BaseException):
    """The run ends here."""


STEPS = "replace", "unlink", "mkdir", "rmdir"


@pytest.fixture
def stop_at(monkeypatch: pytest.MonkeyPatch) -> Callable[[int | None], None]:
    """A function that lets the run end before its n-th change of the disk, or, given None, lets it pass."""
    left: list[int | None] = [None]

    def stopping(change: Callable[..., object]) -> Callable[..., object]:
        def stopped(*arguments: Any, **options: Any) -> object:
            if left[0] is not None:
                if left[0] == 0:
                    raise Killed
                left[0] -= 1
            return change(*arguments, **options)

        return stopped

    for step in STEPS:
        monkeypatch.setattr(Path, step, stopping(getattr(Path, step)))

    def set_left(number: int | None) -> None:
        left[0] = number

    return set_left


def killed_at_each_step(work: Callable[[], object], stop: Callable[[int | None], None]) -> Iterator[bool]:
    """Do the work again and again, ended one step later each time; tell whether it was ended."""
    for number in range(200):
        stop(number)
        ended = False
        try:
            work()
        except Killed:
            ended = True
        finally:
            stop(None)
        yield ended
        if not ended:
            return
    raise AssertionError("the work has no end")


def before_of_every_kind(pc: Machine, kind: str) -> None:
    """What may stand in the profile before: nothing, things of others, or an older installation of ours."""
    if kind == "others":
        pc.put(pc.places.addin, FOREIGN)
        pc.put(pc.places.settings, b'"COLOUR","blue"')


@pytest.mark.parametrize("kind", ["nothing", "others"])
def test_an_interrupted_installation_can_be_undone(
    pc: Machine, kind: str, stop_at: Callable[[int | None], None]
) -> None:
    """Wherever an installation was ended, uninstalling brings everything back."""
    before_of_every_kind(pc, kind)
    before = pc.tree()
    ends = 0
    for ended in killed_at_each_step(lambda: installing.install(pc.places), stop_at):
        assert not pc.places.startup.exists() or set(pc.places.startup.iterdir()) <= {pc.places.addin}
        assert "modules were added" not in "".join(installing.uninstall(pc.places))
        assert pc.tree() == before
        ends += ended
    assert ends > 8


@pytest.mark.parametrize("kind", ["nothing", "others"])
@pytest.mark.parametrize("older", [False, True])
def test_an_interrupted_installation_can_be_repeated(
    pc: Machine, kind: str, older: bool, stop_at: Callable[[int | None], None]
) -> None:
    """Wherever an installation was ended, another one ends as if it had not been, and can be undone."""
    before_of_every_kind(pc, kind)
    before = pc.tree()
    for _ in killed_at_each_step(lambda: installing.install(pc.places), stop_at):
        if older:
            installing.install(pc.places)
            complete(pc.places.addin, xlwings=OLDER)
            stop_at(3)
            with suppress(Killed):
                installing.install(pc.places)
            stop_at(None)
        installing.install(pc.places)
        assert pc.places.addin.read_bytes() == TEMPLATE.read_bytes()
        assert pc.places.settings.read_bytes().count(b"INTERPRETER_WIN") == 1
        installing.uninstall(pc.places)
        assert pc.tree() == before


@pytest.mark.parametrize("kind", ["nothing", "others"])
def test_an_interrupted_removal_can_be_repeated(pc: Machine, kind: str, stop_at: Callable[[int | None], None]) -> None:
    """Wherever a removal was ended, another one ends as if it had not been."""
    before_of_every_kind(pc, kind)
    before = pc.tree()
    installing.install(pc.places)
    for _ in killed_at_each_step(lambda: installing.uninstall(pc.places), stop_at):
        installing.uninstall(pc.places)
        assert pc.tree() == before
        installing.install(pc.places)


def test_an_interrupted_change_of_environment(pc: Machine, stop_at: Callable[[int | None], None]) -> None:
    """Wherever an installation from another environment was ended, its lines and the old ones go at the end."""
    pc.put(pc.places.settings, b'"COLOUR","blue"')
    before = pc.tree()
    other = pc.disk / "other"
    for _ in range(2):
        installing.install(pc.places)
    pc.program(other / "Scripts" / "pythonw.exe", ANSWERS)
    pc.put(other / f"xlwings64-{PIN}.dll")
    first = sys.executable

    def move() -> None:
        sys.executable = str(other / "Scripts" / "python.exe")
        installing.install(pc.places)

    for _ in killed_at_each_step(move, stop_at):
        installing.uninstall(pc.places)
        assert pc.tree() == before
        sys.executable = first
        installing.install(pc.places)


def test_a_file_that_excel_holds(pc: Machine, monkeypatch: pytest.MonkeyPatch) -> None:
    """Where Excel has the add-in open, one line says to close it, and nothing of it is changed."""
    done("install")
    complete(pc.places.addin, xlwings=OLDER)
    before = pc.places.addin.read_bytes()
    rename, remove = Path.replace, Path.unlink

    def locked_rename(path: Path, target: Path) -> Path:
        if target == pc.places.addin:
            raise PermissionError(13, "Access is denied", str(path), 5, str(target))
        return rename(path, target)

    def locked_removal(path: Path, missing_ok: bool = False) -> None:
        if path == pc.places.addin:
            raise PermissionError(13, "Access is denied", str(path))
        remove(path, missing_ok=missing_ok)

    monkeypatch.setattr(Path, "replace", locked_rename)
    monkeypatch.setattr(Path, "unlink", locked_removal)
    line = f"{pc.places.addin}: in use, or must not be written to; close Excel and try again"
    assert refused("install") == line
    assert refused("uninstall") == line
    assert pc.places.addin.read_bytes() == before
    assert not pc.places.staged.exists()


def test_a_damaged_receipt(pc: Machine) -> None:
    """A receipt that cannot be read is left as it is, and so is everything else."""
    done("install")
    for damage in (b"{", b"[]", b'{"unknown": 1}', b"\xff"):
        pc.places.receipt.write_bytes(damage)
        before = pc.tree()
        for command in ("install", "uninstall"):
            assert refused(command).startswith(f"{pc.places.receipt}: is damaged")
        assert pc.tree() == before


def test_the_receipt_tells_what_was_there(pc: Machine) -> None:
    """The receipt names the folders that were made, and where what stood there is kept."""
    pc.put(pc.places.addin, FOREIGN)
    done("install")
    receipt = read_receipt(pc.places.receipt)
    assert receipt is not None
    assert (pc.places.own / receipt.former).read_bytes() == FOREIGN
    assert [str(pc.places.settings.parent)] == list(receipt.folders)


# --- what is needed -------------------------------------------------------------------------------


def no_excel(pc: Machine) -> None:
    del pc.registry[windows.MACHINE, windows.APP_PATH, ""]


def lost_excel(pc: Machine) -> None:
    pc.excel.unlink()


def no_library(pc: Machine) -> None:
    pc.library(64).unlink()


def library_of_other_bits(pc: Machine) -> None:
    pc.put(pc.excel, program(EXCEL_32))
    pc.library(32).unlink()


def no_pywin32(pc: Machine) -> None:
    pc.importable.remove("pythoncom")


def at(pc: Machine, folder: str) -> None:
    """Move the environment into a folder."""
    pc.scripts.parent.rename(pc.disk / folder)
    sys.executable = str(pc.disk / folder / "Scripts" / "python.exe")


def letters_that_the_code_page_lacks(pc: Machine) -> None:
    at(pc, "жук")


def percent_in_the_path(pc: Machine) -> None:
    at(pc, "100%")


def python_of_the_store(pc: Machine) -> None:
    sys.base_prefix = r"C:\Program Files\WindowsApps\PythonSoftwareFoundation.Python.3.11"


NEEDS: list[tuple[Callable[[Machine], None], str, str, str]] = [
    (no_excel, "Excel", "not found in the registry", "install Excel; `beamfuncs fill` needs none"),
    (lost_excel, "Excel", "EXCEL.EXE", "repair Office"),
    (no_library, "library for Excel of 64 bits", f"xlwings64-{PIN}.dll is missing", "pip install --force-reinstall"),
    (library_of_other_bits, "library for Excel of 32 bits", f"xlwings32-{PIN}.dll is missing", "--force-reinstall"),
    (no_pywin32, "pywin32", "cannot import pythoncom", "pip install --force-reinstall pywin32"),
    (
        letters_that_the_code_page_lacks,
        "Python",
        "the code page of Windows lacks 'ж'",
        r"%LOCALAPPDATA%\beamfuncs\venv",
    ),
    (percent_in_the_path, "Python", "takes a % in a path for the name of a variable", r"%LOCALAPPDATA%\beamfuncs"),
    (python_of_the_store, "Python", "from the Microsoft Store", "python.org"),
]


@pytest.mark.parametrize(("damage", "what", "told", "mend"), NEEDS)
def test_what_is_lacking_is_told_before_anything_is_changed(
    pc: Machine, damage: Callable[[Machine], None], what: str, told: str, mend: str
) -> None:
    """Without one of the things that the functions need, `install` says which and what to do, and does nothing."""
    damage(pc)
    before = pc.tree()
    line = refused("install")
    assert what in line
    assert told in line
    assert mend in line
    assert pc.tree() == before


@pytest.mark.parametrize(("found", "told"), [(OLDER, OLDER), (None, "not installed")])
def test_another_xlwings_than_the_pinned_one(
    pc: Machine, found: str | None, told: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Only the version of xlwings that the package pins will do."""
    monkeypatch.setattr(machine, "installed", lambda name: found if name == "xlwings" else "1")
    assert refused("install") == f'xlwings: {told}; beamfuncs works with {PIN} alone: pip install "xlwings=={PIN}"'


def test_a_python_of_32_bits_gets_no_library(pc: Machine, monkeypatch: pytest.MonkeyPatch) -> None:
    """Where the library is missing beside a Python of 32 bits, the bitness is named as the reason."""
    monkeypatch.setattr(windows, "own_bitness", lambda: 32)
    no_library(pc)
    assert "bitness: xlwings brings it to a Python of 64 bits only" in refused("install")


@pytest.mark.parametrize(("processor", "bits"), [(EXCEL_32, 32), (EXCEL_64, 64)])
@pytest.mark.parametrize("beside", [True, False])
def test_the_library_is_that_of_excel(pc: Machine, processor: int, bits: int, beside: bool) -> None:
    """An Excel of 32 bits works with a Python of 64: its own library is needed, beside Python or one folder up."""
    pc.put(pc.excel, program(processor))
    pc.library(96 - bits).unlink()
    if beside:
        pc.library(bits).rename(pc.scripts / pc.library(bits).name)
    done("install")


def test_the_pin_is_that_of_the_package(monkeypatch: pytest.MonkeyPatch) -> None:
    """The pinned version is read from what the package itself requires, wherever it stands there."""
    monkeypatch.setattr(machine, "requires", lambda _: ["numpy>=1", 'xlwings == 9.8.7; sys_platform == "win32"'])
    assert machine.pinned() == "9.8.7"
    monkeypatch.setattr(machine, "requires", lambda _: ["xlwings>=9"])
    with pytest.raises(LookupError):
        machine.pinned()


@pytest.mark.parametrize("value", ['"{}"', " {} "])
@pytest.mark.parametrize("root", [windows.USER, windows.MACHINE])
def test_excel_is_found_for_the_user_or_the_machine(pc: Machine, root: str, value: str) -> None:
    """The registry names Excel for one user or for all, sometimes between quotation marks."""
    no_excel(pc)
    pc.registry[root, windows.APP_PATH, ""] = value.format(pc.excel)
    assert windows.excel() == pc.excel


# --- the diagnosis --------------------------------------------------------------------------------


@pytest.fixture
def ready(pc: Machine) -> Machine:
    """A machine on which the functions are installed and imported."""
    done("install")
    complete(pc.places.addin)
    return pc


def diagnosis() -> tuple[int, dict[str, tuple[str, str]]]:
    """The status of `check`, and its lines by what they are about, each with its remedy."""
    status, out, err = run("check", "--json")
    assert err == ""
    found = json.loads(out)
    return status, {one["what"]: (one["told"], one["mend"]) for one in found}


def test_all_is_well(ready: Machine, monkeypatch: pytest.MonkeyPatch) -> None:
    """On a machine in order the diagnosis tells versions, bitness and places, and ends with 0."""
    monkeypatch.setenv("ONEDRIVE", "")
    status, out, err = run("check")
    assert (status, err) == (0, "")
    assert "\nall is well\n" in out
    assert "BeamFuncsFailure" in out
    assert "Public Sub BeamFuncsFailure()" in module_text()
    assert not [line for line in out.splitlines() if line.startswith(("!", "    >"))]
    where = ready.places
    told = ["16.0.9.1, 64 bits", ready.excel, ready.scripts / "pythonw.exe", ready.library(64), where.addin, where.log]
    told += [where.settings, where.startup, PIN, f"{len(catalogue())} in the add-in", "called without COM"]
    told += ["synchronised folders: none "]
    for one in told:
        assert str(one) in out


def test_no_secret_is_told(ready: Machine) -> None:
    """The diagnosis is made to be sent: settings of others, which may be keys to something, are not in it."""
    setting('"LICENSE_KEY","0xSECRET"\r\n"PYTHONPATH","D:\\own"\r\n')(ready)
    for words in (["check"], ["check", "--json"]):
        _, out, _ = run(*words)
        assert "SECRET" not in out
        assert "PYTHONPATH = D:" in out


def test_the_diagnosis_changes_nothing(ready: Machine) -> None:
    """Looking leaves every file as it was."""
    before = ready.tree()
    run("check")
    assert ready.tree() == before


def test_nothing_is_installed_yet(pc: Machine) -> None:
    """Before an installation, the diagnosis says to install, and ends with 1."""
    status, found = diagnosis()
    assert status == 1
    for what in ("settings", "startup folder", "add-in"):
        told, mend = found[what]
        assert "is not there" in told
        assert "`beamfuncs excel install`" in mend
    assert "server" not in found


@pytest.mark.parametrize(("damage", "what", "told", "mend"), NEEDS)
def test_what_is_lacking_later_is_diagnosed(
    ready: Machine, damage: Callable[[Machine], None], what: str, told: str, mend: str
) -> None:
    """What an installation needs is looked at again, for the Python that the settings name."""
    if damage in (letters_that_the_code_page_lacks, percent_in_the_path):
        ready.places.settings.unlink()
    damage(ready)
    status, found = diagnosis()
    assert status == 1
    got = next(one for name, one in found.items() if what in name and one[1])
    assert told in got[0]
    assert mend in got[1]


Damage = Callable[[Machine], object]
NAME, ALL_VALUE = "#NAME? in every cell", "#VALUE! in every cell"


def setting(line: str) -> Damage:
    """Settings with a line before ours."""

    def write(pc: Machine) -> None:
        pc.places.settings.write_bytes(line.encode() + pc.places.settings.read_bytes())

    return write


def policy(root: str, key: str, name: str, value: int = 1) -> Damage:
    """A value in the registry."""
    return lambda pc: pc.registry.__setitem__((root, key, name), value)


def addin(**changes: Any) -> Damage:
    """Another add-in in the place of ours."""
    return lambda pc: complete(pc.places.addin, **changes)


def without_functions(*names: str) -> str:
    """The VBA module without some functions."""
    text = module_text()
    for name in names:
        text = text.replace(f"Public Function {name}(", f"Private Function {name}_(")
    return text


def synchronised(pc: Machine) -> None:
    os.environ["ONEDRIVECOMMERCIAL"] = str(pc.scripts.parent.parent)


SECURITY, LOCATIONS = rf"{OFFICE}\Excel\Security", rf"{OFFICE}\Excel\Security\Trusted Locations"
FAULTS: dict[str, tuple[Damage, str, str, str]] = {
    "no settings": (lambda pc: pc.places.settings.unlink(), "settings", ALL_VALUE, "excel install"),
    "no interpreter": (lambda pc: pc.places.settings.write_text('"A","1"'), "settings", "myaddin.conf", "which Python"),
    "a blank line": (
        lambda pc: pc.places.settings.write_bytes(pc.places.settings.read_bytes() + b"\r\n"),
        "settings",
        "INTERPRETER_WIN",
        "leave no line in it blank",
    ),
    "no such Python": (setting('"interpreter_win","Z:\\no.exe"\r\n'), "settings", "Z:\\no.exe", "is not there"),
    "another Python": (setting(f'"INTERPRETER_WIN","{__file__}"\r\n'), "settings", __file__, "another environment"),
    "debugging": (setting('"debug udfs","true"\r\n'), "settings", "DEBUG UDFS = true", "take out the line DEBUG UDFS"),
    "modules beside workbooks": (
        setting('"ADD_WORKBOOK_TO_PYTHONPATH","True"\r\n'),
        "settings",
        "ADD_WORKBOOK_TO_PYTHONPATH = True",
        "in a synchronised folder",
    ),
    "no word of modules beside workbooks": (
        lambda pc: pc.places.settings.write_text(f'"INTERPRETER_WIN","{pc.scripts / "pythonw.exe"}"'),
        "settings",
        "INTERPRETER_WIN",
        "go before those installed",
    ),
    "no add-in": (lambda pc: pc.places.addin.unlink(), "add-in", NAME, "excel install"),
    "a broken add-in": (lambda pc: pc.places.addin.write_bytes(b"x"), "add-in", NAME, "excel install"),
    "an add-in of another version": (addin(xlwings=OLDER), "add-in", OLDER, "then import anew"),
    "another add-in": (addin(project="other"), "add-in", PIN, "reads the settings of other"),
    "no module": (addin(source=""), "functions", NAME, "import "),
    "an older module": (
        addin(source=without_functions("fault", "reaction")),
        "functions",
        "not in the add-in (#NAME?): reaction, fault",
        "remove BeamFuncs from the add-in",
    ),
    "other arguments": (
        addin(source=module_text().replace("moment_at(beam As Variant, ", "moment_at(")),
        "functions",
        "with other arguments (#VALUE! or a wrong number): moment_at",
        "of another version",
    ),
    "downloaded": (
        lambda pc: Path(f"{pc.places.addin}:Zone.Identifier").write_text("[ZoneTransfer]\nZoneId=3\n"),
        "download mark",
        "ZoneId=3",
        "Unblock",
    ),
    "no VBA": (policy(windows.MACHINE, rf"{POLICY}\Common", "VBAOff"), "macros", "VBA is switched off", "policy"),
    "no add-ins": (
        policy(windows.USER, SECURITY, "DisableAllAddins"),
        "macros",
        "add-ins are switched off",
        "> Add-ins",
    ),
    "signatures": (
        policy(windows.USER, rf"{POLICY}\Excel\Security", "RequireAddinSig"),
        "macros",
        "without a signature",
        "a policy of your organisation",
    ),
    "no trusted locations": (
        policy(windows.USER, LOCATIONS, "AllLocationsDisabled"),
        "macros",
        "trusted locations are off (AllLocationsDisabled; #NAME? in every cell), and Excel asks before it runs macros",
        "change it under File > Options > Trust Center > Trust Center Settings > Trusted Locations",
    ),
    "a synchronised environment": (synchronised, "synchronised folders", "may lie there", r"%LOCALAPPDATA%\beamfuncs"),
    "no answer": (
        lambda pc: pc.program(pc.scripts / "pythonw.exe", SILENT),
        "server",
        f"ImportError: no such thing ({ALL_VALUE})",
        "pip install --force-reinstall .",
    ),
    "a wrong answer": (
        lambda pc: pc.program(pc.scripts / "pythonw.exe", ANSWERS.replace("60.0", "2015")),
        "server",
        "answers 2015 for 60.0",
        "pip install",
    ),
    "no word": (
        lambda pc: pc.program(pc.scripts / "pythonw.exe", "#!/bin/sh\n"),
        "server",
        "ended without a word",
        "pip install",
    ),
    "no program": (
        lambda pc: (pc.scripts / "pythonw.exe").chmod(0o644),
        "server",
        "cannot be started: permission denied",
        "pip install",
    ),
}


@pytest.mark.parametrize("fault", FAULTS)
def test_each_fault_has_its_line_and_its_remedy(ready: Machine, fault: str, monkeypatch: pytest.MonkeyPatch) -> None:
    """Of each thing that can go wrong the diagnosis tells in one line what it is and what to do, and ends with 1."""
    monkeypatch.setenv("ONEDRIVECOMMERCIAL", "")
    damage, what, told, mend = FAULTS[fault]
    damage(ready)
    status, found = diagnosis()
    assert status == 1
    assert told in found[what][0]
    assert mend in found[what][1]
    assert "\n" not in "".join(found[what])
    _, out, _ = run("check")
    assert f"! {what}: {found[what][0]}\n    > {found[what][1]}\n" in out


@pytest.mark.parametrize(
    ("damage", "what", "told"),
    [
        (
            policy(windows.USER, SECURITY, "VBAWarnings", 4),
            "macros",
            "macros are blocked; the startup folder is trusted",
        ),
        (policy(windows.USER, SECURITY, "VBAWarnings", 3), "macros", "without a trusted signature are blocked"),
        (policy(windows.USER, SECURITY, "RequireAddinSig", 0), "macros", "Excel asks before it runs macros"),
        (
            lambda pc: [
                policy(windows.USER, LOCATIONS, "AllLocationsDisabled")(pc),
                policy(windows.USER, SECURITY, "VBAWarnings", 1)(pc),
            ],
            "macros",
            "all macros run",
        ),
        (lambda pc: pc.put(pc.places.log, b"x"), "log of cells in error", "excel.log"),
    ],
)
def test_what_is_no_fault(ready: Machine, damage: Damage, what: str, told: str) -> None:
    """What does not keep the functions from working is told, and the diagnosis ends with 0."""
    damage(ready)
    status, found = diagnosis()
    assert status == 0
    assert told in found[what][0]


def test_a_policy_goes_before_what_the_user_chose(ready: Machine) -> None:
    """Where a policy and the user differ, the policy counts."""
    policy(windows.USER, SECURITY, "RequireAddinSig", 1)(ready)
    policy(windows.MACHINE, rf"{POLICY}\Excel\Security", "RequireAddinSig", 0)(ready)
    assert diagnosis()[0] == 0


def test_an_older_office_has_its_own_keys(ready: Machine) -> None:
    """Settings of Office are looked up under the number of the Excel that is installed."""
    ready.registry[windows.MACHINE, windows.CURRENT_EXCEL, ""] = "Excel.Application.15"
    del ready.registry[windows.MACHINE, windows.CLICK_TO_RUN, "VersionToReport"]
    policy(windows.USER, SECURITY.replace("16.0", "15.0"), "DisableAllAddins")(ready)
    _, found = diagnosis()
    assert found["macros"][1]
    assert found["Excel"][0].startswith("15.0, ")


def test_an_add_in_that_excel_holds_is_told(ready: Machine, monkeypatch: pytest.MonkeyPatch) -> None:
    """That Excel has the add-in open is said, with what it means for installing, and is no fault."""
    opened = Path.open

    def held(path: Path, mode: str = "r", *rest: Any, **options: Any) -> Any:
        if path == ready.places.addin and mode == "r+b":
            raise PermissionError(13, "in use", str(path))
        return opened(path, mode, *rest, **options)

    monkeypatch.setattr(Path, "open", held)
    status, found = diagnosis()
    assert status == 0
    assert "in use: close Excel before you install or uninstall" in found["add-in"][0]


def test_a_startup_folder_that_must_not_be_written_to(ready: Machine, monkeypatch: pytest.MonkeyPatch) -> None:
    """A startup folder without the right to write is told, with the reason."""

    def refuse(**_: object) -> None:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(checking, "TemporaryFile", refuse)
    _, found = diagnosis()
    assert "cannot be written to (permission denied)" in found["startup folder"][0]
    assert "administrator" in found["startup folder"][1]


def test_a_server_that_never_ends(ready: Machine, monkeypatch: pytest.MonkeyPatch) -> None:
    """A Python that gives no answer is not waited for without end."""

    def patient(command: list[str], timeout: float, **_: object) -> None:
        raise subprocess.TimeoutExpired(command, timeout)

    monkeypatch.setattr(server.subprocess, "run", patient)
    assert "no answer in 60 seconds" in diagnosis()[1]["server"][0]


def test_the_program_goes_through_the_real_server(ready: Machine) -> None:
    """What is started asks xlwings' own server for a function, and the answer is right; only COM is stood in for."""
    script = ready.put(
        ready.disk / "with_stand_ins.py",
        b"import sys, com\ncom.install()\nflag, command, program, *rest = sys.argv[1:]\n"
        b"assert (flag, command) == ('-B', '-c')\nsys.argv = [command, *rest]\nexec(program)\n",
    )
    here = Path(__file__).parent
    start = f'#!/bin/sh\nPYTHONPATH="{here}" exec "{PYTHON}" "{script}" "$@"\n'
    ready.program(ready.scripts / "pythonw.exe", start)
    status, found = diagnosis()
    assert found["server"] == (
        "answers a function (called without COM, over which Excel calls it: that is not tried)",
        "",
    )
    assert status == 0


# --- elsewhere ------------------------------------------------------------------------------------


@pytest.mark.parametrize("command", ["install", "uninstall", "check"])
def test_excel_needs_windows(command: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """On another system one line says so and where the functions are to be had; nothing is done."""
    monkeypatch.setenv("HOME", str(tmp_path))
    line = refused(command)
    assert line.startswith("Excel functions need Windows")
    assert "LibreOffice Calc" in line
    assert "`beamfuncs fill`" in line
    assert list(tmp_path.iterdir()) == []


def test_the_module_is_written_anywhere(tmp_path: Path) -> None:
    """`module` writes the VBA module on every system, over an older one, and tells how to import it."""
    file = tmp_path / "own.bas"
    file.write_text("older")
    out = done("module", "-o", file)
    assert file.read_bytes() == module_text().encode("ascii")
    assert file.read_bytes().count(b"\n") == file.read_bytes().count(b"\r\n")
    for told in (str(file), "Alt+F11", "Remove BeamFuncs", "Import File"):
        assert told in out
    assert list(tmp_path.iterdir()) == [file]


def test_the_module_cannot_be_written(tmp_path: Path) -> None:
    """A folder that is not there is told in one line."""
    file = tmp_path / "no" / "own.bas"
    assert refused("module", "-o", file) == f"{file}: no such file or directory"


def test_the_module_has_a_name_of_its_own(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Without `-o` the module is `beamfuncs.bas` in the current folder."""
    monkeypatch.chdir(tmp_path)
    done("module")
    assert [path.name for path in tmp_path.iterdir()] == ["beamfuncs.bas"]
