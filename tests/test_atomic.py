"""A filled workbook appears whole or not at all: killed, on a full disk, in a folder that must not be written to."""

from __future__ import annotations

import os
import random
import shutil
import signal
import stat
import subprocess
import tempfile
import time
from collections.abc import Callable, Iterator, Mapping
from datetime import datetime
from pathlib import Path

import pytest
from books import build, values
from typer.testing import CliRunner

from beamfuncs import cli
from beamfuncs.hosts.headless import writing
from beamfuncs.hosts.headless.archive import Archive
from beamfuncs.hosts.headless.checking import workbooks
from beamfuncs.hosts.headless.filling import NotFilled, fill
from beamfuncs.hosts.headless.writing import LEFT_OVER, is_no_input

resource = pytest.importorskip("resource", reason="NOT RUN: this system bounds no process")

KILLS = 50
FUNCTIONS: dict[str, Callable[..., object]] = {"twice": lambda number: 2 * number}
NOBODY = 65534

pytestmark = pytest.mark.skipif(not hasattr(os, "fork"), reason="NOT RUN: processes are forked here to be killed")


@pytest.fixture
def folder() -> Iterator[Path]:
    """A folder that another user reaches as well."""
    path = Path(tempfile.mkdtemp(prefix="books"))
    path.chmod(0o755)
    yield path
    path.chmod(0o755)
    shutil.rmtree(path)


def book(path: Path, rows: int = 3) -> Path:
    """A workbook with formulas of ours, that have no values yet."""
    return build(path, {f"A{row}": f"=twice({row})" for row in range(1, rows + 1)})


def in_child(work: Callable[[], object], kill_after: float | None = None) -> int:
    """Do work in a process of its own, killed after so many seconds: 0 done, 2 refused, 9 killed."""
    child = os.fork()
    if child == 0:  # pragma: no cover
        status = 99
        try:
            work()
            status = 0
        except NotFilled as refusal:
            os.write(2, f"{refusal}\n".encode())
            status = 2
        finally:
            os._exit(status)
    if kill_after is not None:
        time.sleep(kill_after)
        os.kill(child, signal.SIGKILL)
    _, ended = os.waitpid(child, 0)
    return os.waitstatus_to_exitcode(ended)


def slowly(
    self: Archive, contents: Mapping[str, bytes | None], whole: Callable[..., Iterator[bytes]]
) -> Iterator[bytes]:
    """The pieces of the file in crumbs, so that writing takes most of the time."""
    for piece in whole(self, contents):
        for start in range(0, len(piece), 256):
            time.sleep(2e-3)
            yield piece[start : start + 256]


@pytest.mark.parametrize("in_place", [False, True])
@pytest.mark.parametrize("slow", [False, True])
def test_killed_at_any_moment_all_files_are_whole(
    folder: Path, monkeypatch: pytest.MonkeyPatch, in_place: bool, slow: bool
) -> None:
    """After a kill the workbook and the target are what they were or complete, and so is a dated copy."""
    source, target = book(folder / "plan.xlsx", 300), folder / "out.xlsx"
    old = source.read_bytes()
    new = fill(source, target, FUNCTIONS).target.read_bytes()
    assert old != new
    if slow:
        whole = Archive.with_contents
        monkeypatch.setattr(Archive, "with_contents", lambda self, contents: slowly(self, contents, whole))

    def work() -> None:
        fill(source, None if in_place else target, FUNCTIONS, in_place=in_place)

    began = time.perf_counter()
    assert in_child(work) == 0
    lasts = time.perf_counter() - began
    moments = random.Random(f"{slow} {in_place}")
    seen: set[str] = set()
    for _ in range(-(-KILLS // 4)):
        for path in folder.iterdir():
            path.unlink()
        source.write_bytes(old)
        target.write_bytes(b"what stood there")
        in_child(work, kill_after=moments.uniform(0.0, 1.1 * lasts))
        found = {path.name: path.read_bytes() for path in folder.iterdir()}
        left = {name for name in found if LEFT_OVER.fullmatch(name)}
        dated = {name for name in found if writing.DATED.fullmatch(name)}
        assert set(found) == {"plan.xlsx", "out.xlsx"} | left | dated
        assert all(is_no_input(folder / name) for name in left | dated)
        assert all(found[name] == old for name in dated)
        if in_place:
            assert found["out.xlsx"] == b"what stood there"
            assert found["plan.xlsx"] == old or (found["plan.xlsx"] == new and dated)
            seen.add("new" if found["plan.xlsx"] == new else "old")
        else:
            assert found["plan.xlsx"] == old
            assert found["out.xlsx"] in (b"what stood there", new)
            assert not dated
            seen.add("new" if found["out.xlsx"] == new else "old")
        seen |= {"left over"} if left else set()
    assert "old" in seen
    assert not slow or "left over" in seen


def test_what_a_killed_run_left_is_taken_away_by_a_later_one(tmp_path: Path) -> None:
    """Leftovers an hour old go with the next run in the folder; younger ones, and other hidden files, stay."""
    old, young, other = (tmp_path / name for name in (".beamfuncs-0123abcd.part", ".beamfuncs-ffffffff.part", ".part"))
    for path in (old, young, other):
        path.write_bytes(b"half")
    for path in (old, other):
        os.utime(path, (time.time() - 4000,) * 2)
    fill(book(tmp_path / "plan.xlsx"), functions=FUNCTIONS)
    assert {path.name for path in tmp_path.iterdir()} == {"plan.xlsx", "plan.filled.xlsx", young.name, other.name}


def test_a_file_is_on_the_disk_before_it_has_its_name(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The whole new file is brought to the disk under its other name, then its folder under its own."""
    source, target = book(tmp_path / "plan.xlsx"), tmp_path / "out.xlsx"
    size = fill(source, tmp_path / "first.xlsx", FUNCTIONS).target.stat().st_size
    synced: list[tuple[bool, int, bool]] = []

    def note(handle: int) -> None:
        status = os.fstat(handle)
        a_folder = stat.S_ISDIR(status.st_mode)
        synced.append((a_folder, 0 if a_folder else status.st_size, target.exists()))

    monkeypatch.setattr(writing.os, "fsync", note)
    fill(source, target, FUNCTIONS)
    assert synced == [(False, size, False), (True, 0, True)]


# --- places that cannot be written to -------------------------------------------------------------


def test_a_file_that_grows_beyond_the_room_is_not_left_half(folder: Path, capfd: pytest.CaptureFixture[str]) -> None:
    """When writing fails in the middle one line names the target, which keeps what it held."""
    source, target = book(folder / "plan.xlsx", 300), folder / "out.xlsx"
    target.write_bytes(b"what stood there")
    before = {path: path.read_bytes() for path in folder.iterdir()}

    def work() -> None:
        signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
        resource.setrlimit(resource.RLIMIT_FSIZE, (3000, 3000))
        fill(source, target, FUNCTIONS)

    def in_place() -> None:
        signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
        resource.setrlimit(resource.RLIMIT_FSIZE, (3000, 3000))
        fill(source, functions=FUNCTIONS, in_place=True)

    for one, named in ((work, target), (in_place, source)):
        assert in_child(one) == 2
        assert {path: path.read_bytes() for path in folder.iterdir()} == before
        assert capfd.readouterr().err == f"{named}: file too large\n"


def test_a_full_disk(folder: Path, capfd: pytest.CaptureFixture[str]) -> None:
    """On a disk with no room left one line says so, and nothing of the target is there."""
    disk = folder / "disk"
    disk.mkdir()
    mounted = subprocess.run(
        ["mount", "-t", "tmpfs", "-o", "size=16k", "tmpfs", disk], capture_output=True, check=False
    )
    if mounted.returncode:
        pytest.skip("NOT RUN: a small disk can be mounted by an administrator only")
    try:
        source = book(folder / "plan.xlsx", 2000)
        assert in_child(lambda: fill(source, disk / "out.xlsx", FUNCTIONS)) == 2
        assert list(disk.iterdir()) == []
        assert capfd.readouterr().err == f"{disk / 'out.xlsx'}: no space left on device\n"
    finally:
        subprocess.run(["umount", disk], check=True)


def as_nobody(work: Callable[[], object]) -> Callable[[], object]:
    """Work done by a user who has no rights of an administrator."""

    def done() -> None:
        if os.geteuid() == 0:
            os.setgroups([])
            os.setgid(NOBODY)
            os.setuid(NOBODY)
        work()

    return done


def test_a_folder_that_must_not_be_written_to(folder: Path, capfd: pytest.CaptureFixture[str]) -> None:
    """In a read-only folder nothing is done, neither for a copy nor in place, and one line says which."""
    source = book(folder / "plan.xlsx")
    source.chmod(0o666)
    before = source.read_bytes()
    fill(source, folder / "first.xlsx", FUNCTIONS).target.unlink()
    folder.chmod(0o555)
    assert in_child(as_nobody(lambda: fill(source, functions=FUNCTIONS))) == 2
    assert in_child(as_nobody(lambda: fill(source, functions=FUNCTIONS, in_place=True))) == 2
    assert capfd.readouterr().err == (
        f"{folder / 'plan.filled.xlsx'}: permission denied\n{folder / 'plan.xlsx'}: permission denied\n"
    )
    assert [(path, path.read_bytes()) for path in folder.iterdir()] == [(source, before)]


def test_a_file_that_must_not_be_written_to(folder: Path, capfd: pytest.CaptureFixture[str]) -> None:
    """A read-only workbook is not replaced, although its folder would allow it."""
    source = book(folder / "plan.xlsx")
    target = folder / "out.xlsx"
    target.write_bytes(b"approved")
    fill(source, folder / "first.xlsx", FUNCTIONS).target.unlink()
    folder.chmod(0o777)
    target.chmod(0o444)
    assert in_child(as_nobody(lambda: fill(source, target, FUNCTIONS))) == 2
    assert capfd.readouterr().err == f"{target}: must not be written to\n"
    assert target.read_bytes() == b"approved"


def test_a_target_that_is_open_elsewhere(tmp_path: Path) -> None:
    """Who has the target open reads on in what it was; who opens it then gets the new one."""
    source, target = book(tmp_path / "plan.xlsx"), tmp_path / "out.xlsx"
    target.write_bytes(b"what stood there" * 1000)
    with target.open("rb") as reader:
        assert reader.read(4) == b"what"
        fill(source, target, FUNCTIONS)
        assert reader.read() == (b"what stood there" * 1000)[4:]
    assert values(target)["A3"] == 6


@pytest.mark.parametrize("lock", [".~lock.plan.xlsx#", "~$plan.xlsx"])
def test_a_workbook_that_is_open_in_a_spreadsheet_program(tmp_path: Path, lock: str) -> None:
    """Where a program has its lock beside the workbook it is not filled in place, nor written over."""
    source = book(tmp_path / "plan.xlsx")
    before = source.read_bytes()
    (tmp_path / lock).write_bytes(b"user")
    with pytest.raises(NotFilled, match=r"plan.xlsx: is open in a spreadsheet program") as refusal:
        fill(source, functions=FUNCTIONS, in_place=True)
    assert lock in str(refusal.value)
    with pytest.raises(NotFilled, match="is open in a spreadsheet program"):
        fill(book(tmp_path / "other.xlsx"), source, FUNCTIONS)
    assert source.read_bytes() == before
    assert fill(source, functions=FUNCTIONS).target.exists()


# --- what the target keeps ------------------------------------------------------------------------


def test_permissions_are_kept(folder: Path) -> None:
    """A target that is replaced keeps its permissions and, where allowed, its owner; so does a dated copy."""
    source, target = book(folder / "plan.xlsx"), folder / "out.xlsx"
    target.write_bytes(b"")
    target.chmod(0o640)
    source.chmod(0o604)
    if os.geteuid() == 0:
        os.chown(target, NOBODY, NOBODY)
    owner = target.stat().st_uid
    fill(source, target, FUNCTIONS)
    assert stat.S_IMODE(target.stat().st_mode) == 0o640
    assert target.stat().st_uid == owner
    original = fill(source, functions=FUNCTIONS, in_place=True).original
    assert original is not None
    assert [stat.S_IMODE(path.stat().st_mode) for path in (source, original)] == [0o604, 0o604]


def test_a_link_stays_a_link(tmp_path: Path) -> None:
    """A target that is a link to a file elsewhere is written there; so is a workbook filled in place."""
    (tmp_path / "there").mkdir()
    there, link = book(tmp_path / "there" / "plan.xlsx"), tmp_path / "link.xlsx"
    link.symlink_to(there)
    fill(book(tmp_path / "other.xlsx", 2), link, FUNCTIONS)
    assert link.is_symlink()
    assert values(there) == {"A1": 2, "A2": 4}
    book(there)
    original = fill(link, functions=FUNCTIONS, in_place=True).original
    assert link.is_symlink()
    assert values(there)["A3"] == 6
    assert original is not None
    assert original.parent == there.parent


# --- in place -------------------------------------------------------------------------------------


class StoppedClock(datetime):
    """A clock that stands still."""

    @classmethod
    def now(cls, tz: object = None) -> StoppedClock:  # type: ignore[override]
        """Return always the same moment."""
        return cls(2026, 12, 1, 13, 45, 10)


def test_in_place_keeps_a_dated_copy(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The copy bears the date and time and overwrites nothing; filled again, nothing is written at all."""
    monkeypatch.setattr(writing, "datetime", StoppedClock)
    source = book(tmp_path / "plan.xlsx")
    old = source.read_bytes()
    (tmp_path / "plan.2026-12-01T13-45-10.xlsx").write_bytes(b"of another run")
    report = fill(source, functions=FUNCTIONS, in_place=True)
    assert report.target == source
    assert report.original == tmp_path / "plan.2026-12-01T13-45-10-2.xlsx"
    assert report.original.read_bytes() == old
    assert (tmp_path / "plan.2026-12-01T13-45-10.xlsx").read_bytes() == b"of another run"
    assert values(source) == {"A1": 2, "A2": 4, "A3": 6}
    before = {path: (path.read_bytes(), path.stat().st_mtime_ns) for path in tmp_path.iterdir()}
    assert fill(source, functions=FUNCTIONS, in_place=True).original is None
    assert {path: (path.read_bytes(), path.stat().st_mtime_ns) for path in tmp_path.iterdir()} == before


def test_where_links_are_not_known_the_dated_copy_is_renamed(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """On a file system without hard links the copy is kept all the same, and overwrites nothing."""

    def unknown(*_: object) -> None:
        raise OSError(95, "operation not supported")

    monkeypatch.setattr(writing, "datetime", StoppedClock)
    monkeypatch.setattr(writing.os, "link", unknown)
    source = book(tmp_path / "plan.xlsx")
    (tmp_path / "plan.2026-12-01T13-45-10.xlsx").write_bytes(b"of another run")
    original = fill(source, functions=FUNCTIONS, in_place=True).original
    assert original == tmp_path / "plan.2026-12-01T13-45-10-2.xlsx"
    assert len(list(tmp_path.iterdir())) == 3


def test_a_workbook_that_is_saved_meanwhile_is_not_replaced(tmp_path: Path) -> None:
    """What another program saved while the workbook was being filled stays."""
    source = book(tmp_path / "plan.xlsx")

    def save(number: float) -> float:
        source.write_bytes(b"saved meanwhile")
        return number

    with pytest.raises(NotFilled, match="changed by another program") as refusal:
        fill(source, functions={"twice": save}, in_place=True)
    assert "\n" not in str(refusal.value)
    assert [(path.name, path.read_bytes()) for path in tmp_path.iterdir()] == [("plan.xlsx", b"saved meanwhile")]


def test_in_place_from_the_command_line(tmp_path: Path) -> None:
    """The copy is named; with `--out` as well nothing is done."""
    path = build(tmp_path / "plan.xlsx", {"A1": '=reaction("fixed 8 pinned", "udl 12", 1)'})
    refused = CliRunner().invoke(cli.app, ["fill", str(path), "--in-place", "-o", str(tmp_path / "out.xlsx")])
    assert refused.exit_code == 2
    done = CliRunner().invoke(cli.app, ["fill", str(path), "--in-place"])
    assert done.exit_code == 0
    (dated,) = [one for one in tmp_path.iterdir() if one != path]
    assert str(dated) in done.stdout
    assert values(path)["A1"] == 60
    assert "A1" not in values(dated)


def test_what_is_no_input() -> None:
    """Hidden files, locks and dated copies are none; names that only look a little like them are."""
    none = [".beamfuncs-0123abcd.part", "~$plan.xlsx", ".~lock.plan.xlsx#", "p.2026-12-01T13-45-10.xlsx"]
    none += ["p.2026-12-01T13-45-10-2.XLSM"]
    some = ["plan.xlsx", "2026-12-01.xlsx", "plan.2026-12-01.xlsx", "p.2026-12-01T13-45-10.filled.xlsx"]
    assert [name for name in none + some if not is_no_input(Path(name))] == some


def test_a_folder_is_checked_without_what_is_no_input(tmp_path: Path) -> None:
    """What a killed run left, a lock and the dated copies are not taken for workbooks of the folder."""
    path = fill(book(tmp_path / "plan.xlsx"), functions=FUNCTIONS, in_place=True).target
    assert len(list(tmp_path.iterdir())) == 2
    for name in (".beamfuncs-0123abcd.part", ".beamfuncs-0123abcd.xlsx", "~$plan.xlsx"):
        (tmp_path / name).write_bytes(b"half")
    assert list(workbooks([tmp_path])) == [path]
