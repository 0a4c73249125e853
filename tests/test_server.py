"""The function server and its client: real processes, in a folder of their own."""

from __future__ import annotations

import ast
import json
import os
import shutil
import signal
import socket
import stat
import struct
import subprocess
import sys
import tempfile
import threading
import time
from collections.abc import Callable, Iterator, Sequence
from contextlib import suppress
from importlib.metadata import version
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from beamfuncs.catalogue import catalogue
from beamfuncs.errors import BeamError
from beamfuncs.hosts.calc.component.beamfuncs_client import client, connecting, messages, places
from beamfuncs.hosts.calc.component.beamfuncs_client.client import Functions
from beamfuncs.hosts.calc.component.beamfuncs_client.connecting import Line, LostError
from beamfuncs.hosts.calc.component.beamfuncs_client.messages import CellError, Failed
from beamfuncs.hosts.server import control, starting_command

VERSION = version("beamfuncs")
PATIENCE = 60.0
"""Seconds in which a process must have come to what is waited for."""
CLIENT = Path(client.__file__).parent
ODD_SERVER = Path(__file__).parent / "odd_server.py"
BEAM = ["fixed 8 pinned", "udl 12"]
NOBODY = 65534

pytestmark = pytest.mark.skipif(sys.platform == "win32", reason="NOT RUN: these tests are written for Unix")


def until(condition: Callable[[], Any], what: str = "") -> Any:
    """Wait until something holds, and return it."""
    end = time.monotonic() + PATIENCE
    while not (held := condition()):
        assert time.monotonic() < end, f"waited in vain: {what}"
        time.sleep(0.01)
    return held


def is_alive(pid: int) -> bool:
    """Tell whether a process runs; one that has ended may wait for its parent to ask after it."""
    for child in connecting._children:
        child.poll()
    try:
        os.kill(pid, 0)
    except ProcessLookupError:
        return False
    return True


def pid() -> int:
    """The process of the server that runs."""
    server = places.running()
    assert server is not None
    return server.pid


def logged() -> str:
    """What the log says."""
    return places.log().read_text() if places.log().exists() else ""


def python(code: str, *words: str, site: bool = False) -> subprocess.Popen[str]:
    """A host's own Python, which has neither this package nor any other, with the client of the extension."""
    command = [
        sys.executable,
        *([] if site else ["-S"]),
        "-c",
        f"import sys; sys.path[:0] = [{str(CLIENT.parent)!r}]\n{code}",
    ]
    return subprocess.Popen([*command, *words], stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)


def odd(constants: dict[str, Any] | None = None, *words: str) -> None:
    """Let the server that will be started be the odd one."""
    places.keep_command([sys.executable, str(ODD_SERVER), json.dumps(constants or {}), *words])


def run(*words: str) -> subprocess.CompletedProcess[str]:
    """Run a command of the command line."""
    return subprocess.run([sys.executable, "-m", "beamfuncs.cli", *words], capture_output=True, text=True, check=False)


@pytest.fixture(autouse=True)
def folder(monkeypatch: pytest.MonkeyPatch) -> Iterator[Path]:
    """A folder with a short name for everything of the server, which is ended at the end."""
    path = Path(tempfile.mkdtemp(prefix="bf"))
    monkeypatch.setenv(places.OWN_FOLDER, str(path))
    monkeypatch.setattr(connecting, "_newest", set())
    places.keep_command(starting_command())
    yield path
    if path.is_symlink() or not path.is_dir():
        path.unlink()
        return
    os.chown(path, os.geteuid(), -1)
    path.chmod(0o700)
    connecting.end(places.running())
    shutil.rmtree(path)


@pytest.fixture
def host() -> Iterator[Functions]:
    """One host."""
    one = Functions(VERSION)
    yield one
    one.close()


def failure(host: Functions, name: str, *arguments: Any) -> Failed:
    """The failure of a call."""
    with pytest.raises(Failed) as failed:
        host.call(name, arguments)
    return failed.value


# --- answers --------------------------------------------------------------------------------------------

CALLS: list[tuple[str, list[Any]]] = [
    ("reaction", [*BEAM, 1.0]),
    ("reaction", [*BEAM, 3.0]),
    ("reaction", ["fixed 6,5 pinned", "udl 12", 1.0]),
    ("reaction", ["free 3 free", "udl 12", 1.0]),
    ("reaction", [[["fixed", None], [8.0, "pinned"]], [["udl 1"], ["point 2 at 0.1"]], 2.0, None, None]),
    ("reactions", ["fixed 3 pinned 0.7 roller", "udl 0.1"]),
    ("moment_at", [*BEAM, [[0.1, 0.2], [9.0, "1,5"]]]),
    ("moment_at", [*BEAM, [[CellError("#REF!"), 0.3]]]),
    ("moment_max", [CellError("#DIV/0!"), "udl 12"]),
    ("moment_max", ["pinned 6 roller", "G: udl 5; Q: point 40 at 2", 0.0, 0.0, "1.35 G + 1.5 Q"]),
    ("diagram", [*BEAM, 5.0]),
    ("deflection_at", [*BEAM, 2.0, float("nan")]),
    ("beam_line", ["fixed", 0.1, "pinned"]),
    ("beam_reads", ["fixed 8 pinned"]),
    ("fault", ["free 3 free", "udl 12"]),
    ("unit_factor", ["kNm²", "kN cm²"]),
]


def directly(name: str, arguments: Sequence[Any]) -> Any:
    """What the function answers in this process, errors as they come out of the client."""
    as_argument = messages.decoded(messages.encoded(arguments), error=lambda value, _: functions_error(value))
    try:
        return catalogue()[name].function(*as_argument)
    except BeamError as error:
        return error


def functions_error(value: str) -> Any:
    """An error value as a cell holds it."""
    from beamfuncs.errors import ErrorValue

    return ErrorValue(value)


def comparable(answer: Any) -> Any:
    """An answer as something that is equal when it is the same to the last bit."""
    if isinstance(answer, (BeamError, Failed)):
        return answer.value, answer.reason
    if isinstance(answer, list):
        return [comparable(one) for one in answer]
    return bits(answer) if isinstance(answer, float) else answer


def bits(number: float) -> bytes:
    """The eight bytes of a double."""
    return struct.pack("<d", number)


def test_answers_are_those_of_the_functions(host: Functions) -> None:
    """Numbers to the last bit, texts, arrays, and errors with their reasons; one by one, and asked at once."""
    expected = [comparable(directly(name, arguments)) for name, arguments in CALLS]
    assert sum(isinstance(one, tuple) for one in expected) >= 5  # some are errors
    assert [comparable(one) for one in host.calls(CALLS)] == expected
    for (name, arguments), answer in zip(CALLS, expected, strict=True):
        try:
            alone = host.call(name, arguments)
        except Failed as failed:
            alone = failed
        assert comparable(alone) == answer


def test_every_function_of_the_catalogue_is_served(host: Functions) -> None:
    """The server answers for each function that is there: none is unknown to it."""
    answers = host.calls([(name, [None] * len(entry.arguments)) for name, entry in catalogue().items()])
    assert len(answers) == len(catalogue()) > 20
    assert all(not isinstance(one, Failed) or one.value != "#NAME?" for one in answers)


def test_numbers_and_texts_survive(host: Functions) -> None:
    """Every double, also one that is not finite, and every text comes back as it went, in cells and in ranges."""
    odd()
    cell = st.floats() | st.text(st.characters()) | st.none()

    @settings(max_examples=200, deadline=None, suppress_health_check=list(HealthCheck))
    @given(cell | st.lists(st.lists(cell, min_size=1), min_size=1))
    def survives(value: Any) -> None:
        assert same(host.call("echo", [value]), value)

    survives()


def same(one: Any, other: Any) -> bool:
    """Tell whether two values are the same to the last bit; a number that is no number has no bits to compare."""
    if isinstance(one, list) and isinstance(other, list):
        return len(one) == len(other) and all(map(same, one, other))
    if isinstance(one, float) and isinstance(other, float):
        return bits(one) == bits(other) or (one != one and other != other)
    return type(one) is type(other) and bool(one == other)


@given(st.floats())
@settings(deadline=None)
def test_no_number_on_the_wire_is_infinite_or_none(number: float) -> None:
    """A message is JSON in the strict sense: NaN and infinity never stand as numbers in it, nor are they read."""

    def refuse(constant: str) -> None:
        raise AssertionError(constant)

    wire = messages.encoded([[number, "NaN"]])
    json.loads(wire, parse_constant=refuse)
    assert same(messages.decoded(wire), [[number, "NaN"]])
    for constant in (b"[NaN]", b"[-Infinity]", b"{", b"\xff", b"[" * 100_000):
        with pytest.raises(messages.NotUnderstoodError):
            messages.decoded(constant)


def test_only_cells_are_sent(host: Functions) -> None:
    """An argument that no cell can hold is a mistake of the host, and said to be one."""
    with pytest.raises(TypeError, match="object"):
        host.call("reaction", [object()])


def test_wrong_calls(host: Functions) -> None:
    """A name that is unknown and a wrong number of arguments are errors that say so."""
    unknown = failure(host, "reation", *BEAM)
    assert (unknown.value, "'reation'" in unknown.reason) == ("#NAME?", True)
    for arguments in ([], BEAM, [*BEAM, 1, None, None, None]):
        wrong = failure(host, "reaction", *arguments)
        assert wrong.value == "#VALUE!"
        assert f"given {len(arguments)} arguments" in wrong.reason
        assert catalogue()["reaction"].call in wrong.reason
    assert host.call("beam_line", ["fixed", 1, "step", 2, "pin", 3, "free"]) == "fixed 1 step 2 pinned 3 free"


def test_a_mistake_in_the_program(host: Functions) -> None:
    """An exception that nobody thought of is an error in its cell; the log has all of it, and the server goes on."""
    odd()
    failed = failure(host, "mistake", "fixed 8 pinned")
    assert failed.value == "#VALUE!"
    assert "ZeroDivisionError: cannot happen to fixed 8 pinned" in failed.reason
    assert "Traceback" in logged()
    assert host.call("reaction", [*BEAM, 1]) == 60.0
    assert logged().count("serves:") == 1


def test_failures_are_logged(host: Functions) -> None:
    """The log tells the reason of every failure, of an array that of the first entry; others may not read it."""
    failed = failure(host, "reaction", *BEAM, 3)
    rows = host.call("moment_at", [*BEAM, [[9.0, 1.0, 10.0]]])
    assert f"reaction: #N/A {failed.reason}" in logged()
    assert f"moment_at: 2 entries in error, the first #N/A {rows[0][0].reason}" in logged()
    assert stat.S_IMODE(places.log().stat().st_mode) == 0o600


def test_the_log_is_bounded(host: Functions, folder: Path) -> None:
    """Old parts of the log give way to new ones."""
    odd({"logs.BYTES": 4096})
    host.calls([("reaction", [*BEAM, float(n)]) for n in range(3, 1003)])
    files = sorted(folder.glob("server.log*"))
    assert [file.name for file in files] == ["server.log", "server.log.1", "server.log.2", "server.log.3"]
    assert all(file.stat().st_size <= 4096 for file in files)
    assert "support 1002" in logged()


def test_many_hosts_at_once() -> None:
    """Hosts that ask at the same moment for what has not been computed yet all get the right answers."""
    lengths = [2 + n / 7 for n in range(40)]
    calls = [("reaction", [f"fixed {x} hinge 1 pinned 2 fixed", f"udl {x}", 1.0]) for x in lengths]
    calls += [("unit_factor", [unit, "lbf in"]) for unit in ("kNm", "kip ft", "N mm", "lbft")]
    expected = [comparable(directly(name, arguments)) for name, arguments in calls]
    answers: dict[int, Any] = {}
    together = threading.Barrier(6)

    def ask(n: int) -> None:
        host = Functions(VERSION)
        host.call("reaction", [*BEAM, 1])
        together.wait(PATIENCE)
        answers[n] = [comparable(host.call(*call)) for call in calls]
        host.close()

    threads = [threading.Thread(target=ask, args=(n,)) for n in range(6)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join(PATIENCE)
    assert answers == dict.fromkeys(range(6), expected)
    assert logged().count("serves:") == 1


# --- sizes ----------------------------------------------------------------------------------------------


def test_messages_that_are_too_large(host: Functions, tmp_path: Path) -> None:
    """Arguments and answers beyond the largest message are errors of their own cell, in a row of calls too."""
    odd()
    large = "x" * messages.LARGEST
    just = "x" * (messages.LARGEST - 100)
    answers = host.calls([("echo", [large]), ("echo", ["b"]), ("echo", [just]), ("echo", [just + "€" * 90])])
    assert [type(one) for one in answers] == [Failed, str, str, Failed]
    assert (answers[1], answers[2]) == ("b", just)
    assert "arguments take more" in str(answers[0])
    host.call("echo", [1.0])
    assert logged().count("serves:") == 1
    failed = failure(host, "echo", ["€" * 6_000_000])
    assert "arguments take more" in failed.reason


def test_an_answer_that_is_too_large(host: Functions) -> None:
    """An answer beyond the largest message is an error that says so, and the connection goes on."""
    odd({"answering.LARGEST": 1000})
    assert "the answer takes more" in failure(host, "echo", "x" * 1000).reason
    assert host.call("echo", ["x" * 900]) == "x" * 900


def test_calls_of_any_number(host: Functions) -> None:
    """Many calls and large answers go in several messages, in order; no call at all has no answer."""
    odd()
    texts = [f"{n} " + "x" * (n % 7) * 50_000 for n in range(200)]
    assert host.calls([("echo", [text]) for text in texts]) == texts
    assert host.calls([]) == []


# --- the ends of servers --------------------------------------------------------------------------------


def asked_apart(host: Functions, *call: Any) -> tuple[threading.Thread, list[Any]]:
    """Ask in a thread of its own; the list will hold the answer."""
    answers: list[Any] = []
    thread = threading.Thread(target=lambda: answers.append(host.call(call[0], call[1:])))
    thread.start()
    return thread, answers


def test_a_server_killed_in_mid_call(host: Functions, tmp_path: Path) -> None:
    """A server that is killed over a call is started again, and the call is answered by the new one."""
    odd()
    thread, answers = asked_apart(host, "pause", 1.0, str(tmp_path / "begun"))
    until((tmp_path / "begun").exists)
    first = pid()
    os.kill(first, signal.SIGKILL)
    thread.join(PATIENCE)
    assert answers == [pid()]
    assert pid() != first
    assert (tmp_path / "begun").read_text() == "begun\n" * 2


def test_a_server_killed_between_calls(host: Functions) -> None:
    """A server that is gone before the next call is started again."""
    assert host.call("reaction", [*BEAM, 1]) == 60.0
    first = pid()
    os.kill(first, signal.SIGKILL)
    assert host.call("reaction", [*BEAM, 1]) == 60.0
    assert pid() != first


@pytest.mark.parametrize(("times", "answered"), [(1, True), (2, False)])
def test_a_call_that_ends_the_server(host: Functions, tmp_path: Path, times: int, answered: bool) -> None:
    """A call over which the server ends once is answered; twice, it is an error with its reason; others go on."""
    odd()
    calls = [("echo", [float(n)]) for n in range(20)]
    calls[7] = ("crash", [float(times), str(tmp_path / "ended")])
    answers = host.calls(calls)
    assert answers[:7] + answers[8:] == [float(n) for n in range(20) if n != 7]
    # Asked at once with others the call counts as asked once, then it is asked alone, twice at the most.
    assert isinstance(answers[7], float)
    file = str(tmp_path / "alone")
    if answered:
        assert host.call("crash", [times, file]) == pid()
    else:
        failed = failure(host, "crash", times, file)
        assert failed.value == "#VALUE!"
        assert "ended twice" in failed.reason
        assert len(Path(file).read_text().splitlines()) == 2
    assert host.call("echo", [1.0]) == 1.0


def test_a_call_that_always_ends_the_server(host: Functions, tmp_path: Path) -> None:
    """Among other calls, only the one that ends the server has no answer."""
    odd()
    calls = [("echo", [1.0]), ("crash", [9.0, str(tmp_path / "ended")]), ("echo", [2.0])]
    one, failed, two = host.calls(calls)
    assert (one, two) == (1.0, 2.0)
    assert isinstance(failed, Failed)
    assert "ended twice" in failed.reason


def test_a_call_that_hangs(host: Functions, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A call without an answer in time is an error; the server that hangs over it is ended, and others are answered."""
    odd()
    host.call("echo", [1.0])
    monkeypatch.setattr(connecting, "PATIENCE", 0.5)
    host.close()
    host.call("echo", [1.0])
    first = pid()
    failed = failure(host, "pause", 600.0, str(tmp_path / "begun"))
    assert failed.value == "#VALUE!"
    assert "said nothing for 0.5 seconds" in failed.reason
    until(lambda: not is_alive(first))
    monkeypatch.setattr(connecting, "PATIENCE", PATIENCE)
    assert host.call("echo", [1.0]) == 1.0


def test_an_answer_that_is_no_longer_awaited(host: Functions, monkeypatch: pytest.MonkeyPatch) -> None:
    """Where a host is interrupted while it waits, the answer is not taken for that of its next call."""

    def interrupted(_: object) -> None:
        raise KeyboardInterrupt

    host.call("reaction", [*BEAM, 1])
    with monkeypatch.context() as patch:
        patch.setattr(connecting.Line, "receive", interrupted)
        with pytest.raises(KeyboardInterrupt):
            host.call("reaction", [*BEAM, 2])
    assert host.call("reaction", [*BEAM, 1]) == 60.0


def test_patience_is_with_silence(host: Functions, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Many calls may take longer together than one may be silent: answers come while others are computed."""
    odd({"serving.SILENT": 0.1})
    monkeypatch.setattr(connecting, "PATIENCE", 2.0)
    calls = [("pause", [0.5, str(tmp_path / "begun")]) for _ in range(6)]
    assert host.calls(calls) == [pid()] * 6
    assert (tmp_path / "begun").read_text() == "begun\n" * 6


def test_a_server_that_does_not_greet(host: Functions, monkeypatch: pytest.MonkeyPatch) -> None:
    """A server that is there and says nothing is ended, and another started."""
    host.call("reaction", [*BEAM, 1])
    first = pid()
    os.kill(first, signal.SIGSTOP)
    monkeypatch.setattr(connecting, "GREETING", 0.5)
    monkeypatch.setattr(connecting, "ENDING", 0.5)
    another = Functions(VERSION)
    monkeypatch.setattr(places, "running", _greeting_again(places.running, monkeypatch))
    assert another.call("reaction", [*BEAM, 1]) == 60.0
    assert pid() != first
    until(lambda: not is_alive(first))
    another.close()


def _greeting_again(running: Callable[[], Any], monkeypatch: pytest.MonkeyPatch) -> Callable[[], Any]:
    """Be patient again with a server that has been started anew."""
    first = running()

    def looked() -> Any:
        server = running()
        if server != first:
            monkeypatch.setattr(connecting, "GREETING", PATIENCE)
        return server

    return looked


def test_what_a_dead_server_left(host: Functions, folder: Path) -> None:
    """What a killed server left is no obstacle, nor is the process that has its number now."""
    host.call("reaction", [*BEAM, 1])
    host.close()
    left = places.running()
    assert left is not None
    os.kill(left.pid, signal.SIGKILL)
    until(lambda: not is_alive(left.pid))
    with subprocess.Popen(["sleep", "600"]) as other:
        places.tell(left._replace(pid=other.pid))
        assert host.call("reaction", [*BEAM, 1]) == 60.0
        assert other.poll() is None
        other.kill()
    assert len(list(folder.glob("socket-*"))) == 1
    (folder / "server.json").write_text("{")
    host.close()
    connecting.end(places.running())


def test_eight_hosts_start_one_server(folder: Path) -> None:
    """Hosts that start at the same moment, in a Python without any package, share one server."""
    count = folder / "count"
    serve = f"open({str(count)!r}, 'a').write('x'); from beamfuncs.hosts.server.serving import serve; serve()"
    places.keep_command([sys.executable, "-c", serve])
    code = f"""
import os, time
from beamfuncs_client import client, places
while not os.path.exists(sys.argv[1]): time.sleep(0.001)
print(client.Functions({VERSION!r}).call("reaction", ["fixed 8 pinned", "udl 12", 1]), places.running().pid)
"""
    hosts = [python(code, str(folder / "now")) for _ in range(8)]
    time.sleep(0.3)
    (folder / "now").touch()
    told = [host.communicate(timeout=PATIENCE) for host in hosts]
    assert told == [(f"60.0 {pid()}\n", "")] * 8
    assert count.read_text() == "x"
    assert logged().count("serves:") == 1


def test_an_idle_server_ends(host: Functions, folder: Path, tmp_path: Path) -> None:
    """A server that nobody asks ends, though a host is connected; a call under way keeps it; a call starts another."""
    odd({}, "0.5")
    assert host.call("pause", [1.5, str(tmp_path / "begun")]) == pid()
    first = pid()
    until(lambda: not is_alive(first))
    assert not list(folder.glob("socket-*"))
    assert not (folder / "server.json").exists()
    assert "ends: no message for 0.5 s" in logged()
    assert host.call("echo", [1.0]) == 1.0
    assert pid() != first


def test_a_rested_host_sees_that_the_server_has_ended(
    host: Functions, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Where the server has ended for want of work, the next call does not count that as a crash."""
    odd()
    host.call("echo", [1.0])
    assert control.stop()
    monkeypatch.setattr(client, "RESTED", 0.0)
    assert host.call("crash", [1.0, str(tmp_path / "ended")]) == pid()


def test_a_server_that_is_no_longer_found_ends(host: Functions, folder: Path) -> None:
    """A server whose files have been taken away ends, for nobody can find it; it takes no file of another with it."""
    host.call("reaction", [*BEAM, 1])
    first = pid()
    (folder / "server.json").unlink()
    until(lambda: not is_alive(first))
    assert "its own files have been taken away" in logged()
    host.call("reaction", [*BEAM, 1])
    second = places.running()
    assert second is not None
    places.tell(second._replace(key=b"another"))
    until(lambda: not is_alive(second.pid))
    assert (folder / "server.json").exists()


# --- the command line -----------------------------------------------------------------------------------


def test_status_and_stop(host: Functions, folder: Path) -> None:
    """`--status` tells of the server that runs, `--stop` stops it; both say where none runs."""
    none = run("serve", "--status")
    assert (none.returncode, none.stdout) == (1, "no function server runs\n")
    host.calls([("reaction", [*BEAM, 1])] * 3)
    server = pid()
    told = run("serve", "--status")
    assert told.returncode == 0
    for part in (f"beamfuncs {VERSION}", f"process {server}", "connected 1", "calls 3", str(places.log())):
        assert part in told.stdout
    stopped = run("serve", "--stop")
    assert (stopped.returncode, stopped.stdout) == (0, "the function server has been stopped\n")
    until(lambda: not is_alive(server))
    assert run("serve", "--stop").stdout == "no function server runs\n"
    assert "ends: it has been stopped" in logged()
    assert not list(folder.glob("socket-*"))


def test_stop_a_server_that_hangs(host: Functions, monkeypatch: pytest.MonkeyPatch) -> None:
    """A server that does not listen is stopped by force."""
    host.call("reaction", [*BEAM, 1])
    server = pid()
    os.kill(server, signal.SIGSTOP)
    monkeypatch.setattr(connecting, "GREETING", 0.3)
    monkeypatch.setattr(connecting, "ENDING", 0.3)
    monkeypatch.setattr(control, "ENDING", 0.3)
    assert control.stop()
    until(lambda: not is_alive(server))


def test_serve_by_hand(host: Functions) -> None:
    """`beamfuncs serve` serves until it is idle; a second one finds the first, and does nothing."""
    command = [sys.executable, "-m", "beamfuncs.cli", "serve", "--idle"]
    with subprocess.Popen([*command, "600"], stderr=subprocess.PIPE, text=True) as server:
        until(places.running)
        assert pid() == server.pid
        assert host.call("reaction", [*BEAM, 1]) == 60.0
        second = run("serve")
        assert second.returncode == 2
        assert f"runs already, process {server.pid}" in second.stderr
        server.send_signal(signal.SIGINT)
        assert server.wait(PATIENCE) == 0
    assert subprocess.run([*command, "0.2"], capture_output=True, check=False, timeout=PATIENCE).returncode == 0


# --- versions -------------------------------------------------------------------------------------------


def test_an_extension_that_is_older_than_the_package() -> None:
    """The cell's reason says which is older, and what to do."""
    failed = failure(Functions("0.0.9"), "reaction", *BEAM, 1)
    assert failed.value == "#VALUE!"
    assert f"the extension in the office (0.0.9) is older than the package beamfuncs ({VERSION})" in failed.reason
    assert "beamfuncs calc install" in failed.reason
    assert "(0.0.9) is older" in logged()


def test_a_package_that_is_older_than_the_extension() -> None:
    """The cell's reason says so; a server is started once to see whether the package has been updated since."""
    host = Functions("999.10")
    failed = failure(host, "reaction", *BEAM, 1)
    assert f"the package beamfuncs ({VERSION}) is older than the extension in the office (999.10)" in failed.reason
    assert "pip" in failed.reason
    first = pid()
    assert failure(Functions("999.10"), "reaction", *BEAM, 1).reason == failed.reason
    assert pid() == first


def test_a_server_that_outlived_an_update() -> None:
    """A server that was started before the package was updated gives way to a new one."""
    script = places.folder() / "old_server.py"
    script.write_text(
        "from beamfuncs.hosts.server import serving\nserving.version = lambda name: '0.0.9'\nserving.serve()\n"
    )
    places.keep_command([sys.executable, str(script)])
    old = Functions("0.0.9")
    assert old.call("reaction", [*BEAM, 1]) == 60.0
    first = pid()
    places.keep_command(starting_command())
    assert Functions(VERSION).call("reaction", [*BEAM, 1]) == 60.0
    until(lambda: not is_alive(first))
    assert "is older than the package" in failure(old, "reaction", *BEAM, 1).reason


def test_another_protocol(host: Functions) -> None:
    """A host that speaks another protocol is greeted, so that it can say what is wrong, and then hung up on."""
    host.call("reaction", [*BEAM, 1])
    server = places.running()
    assert server is not None
    line = Line(server, VERSION)
    line.close()
    original = messages.hello
    try:
        messages.hello = lambda version: {"protocol": 99, "version": version}
        line = Line(server, "9.9")
    finally:
        messages.hello = original
    assert line.version == VERSION
    with pytest.raises(LostError):
        line.ask([["reaction", [*BEAM, 1]]])
    line.close()
    until(lambda: "it speaks protocol 99, not 1" in logged())


# --- a server that cannot be started --------------------------------------------------------------------


def test_nothing_says_how_to_start_the_server(host: Functions) -> None:
    """Without the file that the installation writes, the reason says what to run."""
    places.forget_command()
    failed = failure(host, "reaction", *BEAM, 1)
    assert failed.value == "#VALUE!"
    assert str(places.settings()) in failed.reason
    assert "run `beamfuncs calc install`" in failed.reason


@pytest.mark.parametrize(
    ("command", "reason"),
    [
        (["/nowhere/python"], "/nowhere/python: No such file"),
        ([sys.executable, "-S", "-m", "beamfuncs.hosts.server"], "No module named"),
        ([sys.executable, "-c", "print('one'); raise SystemExit('cannot, because')"], "cannot, because"),
    ],
)
def test_a_server_that_does_not_start(host: Functions, command: list[str], reason: str) -> None:
    """The reason why the process does not start is the reason of the cell."""
    places.keep_command(command)
    failed = failure(host, "reaction", *BEAM, 1)
    assert failed.value == "#VALUE!"
    assert reason in failed.reason
    assert "calc" in failed.reason
    assert len(failed.reason) < 255


def test_a_server_that_does_not_start_is_not_tried_for_each_cell(
    host: Functions, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Thousands of cells do not start thousands of processes; after a while it is tried again."""
    count = tmp_path / "count"
    places.keep_command([sys.executable, "-c", f"open({str(count)!r}, 'a').write('x'); raise SystemExit('no')"])
    answers = host.calls([("reaction", [*BEAM, 1])] * 1000)
    assert len({one.reason for one in answers}) == 1
    assert "reaction: the function server does not start (no)" in failure(host, "reaction", *BEAM, 1).reason
    assert count.read_text() == "x"
    places.keep_command(starting_command())
    monkeypatch.setattr(host, "_refused_until", 0.0)
    assert host.call("reaction", [*BEAM, 1]) == 60.0


def test_the_host_s_own_python_settings_are_not_handed_on(host: Functions, monkeypatch: pytest.MonkeyPatch) -> None:
    """What an office sets for its own Python does not reach the Python of the server."""
    monkeypatch.setenv("PYTHONHOME", "/nowhere")
    monkeypatch.setenv("PYTHONPATH", "/nowhere")
    assert host.call("reaction", [*BEAM, 1]) == 60.0


def test_the_host_s_own_time_limit_for_sockets(host: Functions, tmp_path: Path) -> None:
    """A limit that other parts of an office set for all its sockets does not count here."""
    odd()
    socket.setdefaulttimeout(0.01)
    try:
        assert host.call("pause", [0.3, str(tmp_path / "begun")]) == pid()
    finally:
        socket.setdefaulttimeout(None)
    assert (tmp_path / "begun").read_text() == "begun\n"


def test_nothing_is_imported_from_where_the_host_stands(
    host: Functions, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A folder with workbooks in it is no place to take modules from."""
    (tmp_path / "numpy.py").write_text("raise SystemExit('taken from the wrong place')\n")
    (tmp_path / "beamfuncs").mkdir()
    monkeypatch.chdir(tmp_path)
    assert host.call("reaction", [*BEAM, 1]) == 60.0


# --- who may connect ------------------------------------------------------------------------------------


def test_nobody_else_may_enter(host: Functions, folder: Path) -> None:
    """The folder, the file with the key, and the socket are the user's alone."""
    shutil.rmtree(folder)
    places.folder()
    places.keep_command(starting_command())
    host.call("reaction", [*BEAM, 1])
    modes = {path.name.partition("-")[0]: stat.S_IMODE(path.lstat().st_mode) for path in (folder, *folder.iterdir())}
    for name in (folder.name, "server.json", "socket", "server.log", "calc.json", "starting.lock"):
        assert modes[name] & 0o077 == 0, name


@pytest.mark.parametrize("spoil", ["open", "link", "file", "another's"])
def test_a_folder_that_is_not_safe(host: Functions, folder: Path, spoil: str, tmp_path: Path) -> None:
    """A folder that others may enter, a link, a file, another's folder: none is used, and the reason says why."""
    if spoil == "open":
        folder.chmod(0o750)
    elif spoil == "another's":
        if os.geteuid() != 0:
            pytest.skip("NOT RUN: only root can make a folder of another user")
        os.chown(folder, NOBODY, NOBODY)
    else:
        shutil.rmtree(folder)
        (tmp_path / "elsewhere").mkdir(mode=0o700)
        if spoil == "link":
            folder.symlink_to(tmp_path / "elsewhere")
        else:
            folder.touch()
    failed = failure(host, "reaction", *BEAM, 1)
    assert str(folder) in failed.reason
    assert "remove it" in failed.reason
    assert not list((tmp_path / "elsewhere").glob("*"))


def test_a_file_with_the_key_that_others_can_write(host: Functions, folder: Path) -> None:
    """What another user may have written is not believed."""
    host.call("reaction", [*BEAM, 1])
    (folder / "server.json").chmod(0o666)
    assert "can be written by other users" in failure(Functions(VERSION), "reaction", *BEAM, 1).reason
    (folder / "server.json").rename(folder / "elsewhere")
    (folder / "server.json").symlink_to(folder / "elsewhere")
    assert "symbolic link" in failure(Functions(VERSION), "reaction", *BEAM, 1).reason
    (folder / "server.json").unlink()


def test_the_runtime_folder_of_the_system(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    """Without a folder given, it stands in the runtime folder of the user; another user's is not taken for it."""
    monkeypatch.delenv(places.OWN_FOLDER)
    monkeypatch.setenv("XDG_RUNTIME_DIR", str(tmp_path))
    assert places.folder() == tmp_path / "beamfuncs"
    monkeypatch.setattr(tempfile, "tempdir", str(tmp_path))
    monkeypatch.setenv("XDG_RUNTIME_DIR", "relative")
    assert places.folder() == tmp_path / f"beamfuncs-{os.geteuid()}"
    if os.geteuid() == 0:
        others = tmp_path / "others"
        others.mkdir()
        os.chown(others, NOBODY, NOBODY)
        monkeypatch.setenv("XDG_RUNTIME_DIR", str(others))
        assert places.folder() == tmp_path / f"beamfuncs-{os.geteuid()}"
    if sys.platform == "linux":
        monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path / "config"))
        monkeypatch.setenv("XDG_STATE_HOME", "")
        monkeypatch.setenv("HOME", str(tmp_path))
        assert places.settings() == tmp_path / "config" / "beamfuncs" / "calc.json"
        assert places.log() == tmp_path / ".local" / "state" / "beamfuncs" / "server.log"


def test_another_user_is_refused(host: Functions, folder: Path) -> None:
    """Another user cannot connect; not even with the key, were the folder and the socket open to all."""
    if os.geteuid() != 0:
        pytest.skip("NOT RUN: only root can be another user for a while")
    host.call("reaction", [*BEAM, 1])
    server = places.running()
    assert server is not None
    code = f"""
import hmac, os
from beamfuncs_client import connecting, places, wire
server = places.Running({server.address!r}, {server.key!r}, {server.pid}, {server.version!r})
wire.of_this_user = lambda connection: True
os.setgroups([]); os.setgid({NOBODY}); os.setuid({NOBODY})
try:
    connecting.Line(server, {VERSION!r}).ask([["reaction", ["fixed 8 pinned", "udl 12", 1]]])
    print("answered")
except connecting.LostError as error:
    print(error)
try:
    print(places.running())
except places.UnusableError as error:
    print(error)
"""
    out, err = python(code).communicate(timeout=PATIENCE)
    assert (out.splitlines()[0], err) == ("[Errno 13] Permission denied", "")
    folder.chmod(0o711)
    Path(server.address).chmod(0o666)
    out, err = python(code).communicate(timeout=PATIENCE)
    assert err == ""
    assert "it hung up" in out.splitlines()[0] or "reset" in out.splitlines()[0]
    assert "open to other users" in out.splitlines()[1]
    assert err == ""
    folder.chmod(0o700)
    until(lambda: "it is another user's" in logged())
    assert host.call("reaction", [*BEAM, 1]) == 60.0


def test_a_wrong_key(host: Functions) -> None:
    """Who does not know the key is hung up on."""
    host.call("reaction", [*BEAM, 1])
    server = places.running()
    assert server is not None
    with pytest.raises(LostError):
        Line(server._replace(key=b"guessed"), VERSION)
    until(lambda: "did not know the key" in logged())
    assert host.call("reaction", [*BEAM, 1]) == 60.0


def test_a_server_that_does_not_know_the_key(host: Functions) -> None:
    """A host does not talk to a process that cannot prove that it is the user's server."""
    host.call("reaction", [*BEAM, 1])
    server = places.running()
    assert server is not None
    places.tell(server._replace(key=b"another"))
    until(lambda: not is_alive(server.pid))
    assert host.call("reaction", [*BEAM, 1]) == 60.0


# --- whoever else connects ------------------------------------------------------------------------------


def connection() -> socket.socket:
    """A connection to the server without any manners."""
    server = places.running()
    assert server is not None
    one = socket.socket(socket.AF_UNIX)
    one.settimeout(PATIENCE)
    one.connect(server.address)
    return one


def is_shut(one: socket.socket) -> bool:
    """Wait until the server hangs up."""
    with suppress(ConnectionResetError):
        while one.recv(1 << 16):
            pass
    return True


def test_who_says_nothing_is_shut_out(host: Functions) -> None:
    """Connections that say nothing, or a byte now and then, hold nobody up, and are shut after a while."""
    odd({"serving.GREETING": 0.5})
    host.call("echo", [1.0])
    silent = [connection() for _ in range(30)]
    slow = connection()
    dripping = threading.Thread(target=_drip, args=(slow,))
    dripping.start()
    assert Functions(VERSION).call("echo", [2.0]) == 2.0
    assert all(is_shut(one) for one in silent)
    dripping.join(PATIENCE)
    assert not dripping.is_alive()
    assert logged().count("said nothing for 0.5 s") == 30
    assert logged().count("got end of file during message") == 1
    assert host.call("echo", [3.0]) == 3.0
    assert logged().count("serves:") == 1


def test_more_connections_than_the_system_allows(host: Functions) -> None:
    """Where a stranger takes every connection there may be, hosts go on, and new ones come in when it is shut out."""
    odd({"serving.GREETING": 1.0})
    places.keep_command(["sh", "-c", 'ulimit -n 40 && exec "$0" "$@"', *places.command()])
    host.call("echo", [1.0])
    strangers = [connection() for _ in range(60)]
    until(lambda: "is not accepted" in logged())
    assert host.call("echo", [2.0]) == 2.0
    assert Functions(VERSION).call("echo", [3.0]) == 3.0
    assert all(is_shut(one) for one in strangers)
    assert logged().count("serves:") == 1


def _drip(one: socket.socket) -> None:
    """Send a message of 200 bytes, a byte at a time."""
    with suppress(OSError):
        for number in struct.pack("!i200x", 200):
            one.sendall(bytes([number]))
            time.sleep(0.05)


@pytest.mark.parametrize(
    "garbage",
    [
        b"GET / HTTP/1.1\r\n\r\n" * 100,
        bytes(range(256)) * 1000,
        struct.pack("!i", 0x7FFFFFFF) + b"x" * 1000,
        struct.pack("!iQ", -1, 1 << 62) + b"x" * 1000,
        struct.pack("!i", -2),
        struct.pack("!i", 20) + b"#CHALLENGE#" + b"x" * 9,
        b"",
    ],
)
def test_garbage_hurts_nobody(host: Functions, garbage: bytes) -> None:
    """Whatever a stranger sends ends its own connection and no other."""
    host.call("reaction", [*BEAM, 1])
    first = pid()
    with connection() as stranger:
        with suppress(OSError):
            stranger.sendall(garbage)
            stranger.shutdown(socket.SHUT_WR)
        assert is_shut(stranger)
    assert host.call("reaction", [*BEAM, 1]) == 60.0
    assert pid() == first


@pytest.mark.parametrize(
    "message",
    [
        b"not json",
        b"\xff\xfe",
        b"[NaN]",
        b"[" * 1_000_000,
        b"null",
        b'[["reaction"]]',
        b'[["reaction", {}]]',
        b'[[["reaction"], []]]',
        b"[1]",
        b'{"do": "evil"}',
        b'{"do": ["status"]}',
        b'{"error": "#N/A"}',
    ],
)
def test_messages_that_make_no_sense(host: Functions, message: bytes) -> None:
    """A host that sends nonsense is hung up on; the log says why, and the others go on."""
    host.call("reaction", [*BEAM, 1])
    server = places.running()
    assert server is not None
    line = Line(server, VERSION)
    line.send(message)
    with pytest.raises(LostError):
        line.receive()
    line.close()
    until(lambda: "a host is hung up on" in logged())
    assert "Traceback" not in logged()
    assert host.call("reaction", [*BEAM, 1]) == 60.0
    assert pid() == server.pid


def test_a_message_beyond_the_largest(host: Functions) -> None:
    """A message that says it is larger than any may be is not read."""
    host.call("reaction", [*BEAM, 1])
    server = places.running()
    assert server is not None
    line = Line(server, VERSION)
    with suppress(LostError):
        line.send(b" " * (messages.LARGEST + 1))
    with pytest.raises(LostError):
        line.receive()
    line.close()
    until(lambda: "bad message length" in logged())
    assert host.call("reaction", [*BEAM, 1]) == 60.0


def test_a_host_that_does_not_read(host: Functions) -> None:
    """A host that leaves its answers unread is hung up on, and does not keep the server from ending when idle."""
    odd({"serving.WRITING": 0.5}, "2")
    host.call("echo", [1.0])
    server = places.running()
    assert server is not None
    line = Line(server, VERSION)
    line.send(messages.encoded([["echo", ["x" * 10_000_000]]]))
    until(lambda: "did not read its answers" in logged())
    until(lambda: not is_alive(server.pid))
    line.close()


# --- what the extension takes along ---------------------------------------------------------------------


@pytest.mark.parametrize("path", sorted(CLIENT.glob("*.py")), ids=lambda path: path.name)
def test_the_client_needs_nothing_but_an_old_python(path: Path) -> None:
    """The client is read by Python 3.8, and imports only the standard library and itself."""
    tree = ast.parse(path.read_text(), feature_version=(3, 8))
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            assert {alias.name.partition(".")[0] for alias in node.names} <= sys.stdlib_module_names
        elif isinstance(node, ast.ImportFrom) and node.level == 0:
            assert (node.module or "").partition(".")[0] in sys.stdlib_module_names
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 1


def _versions() -> list[str]:
    """Other Pythons on the machine."""
    found = [shutil.which(f"python3.{minor}") for minor in range(8, 15)]
    return [path for path in found if path and subprocess.run([path, "-c", ""], check=False).returncode == 0]


@pytest.mark.parametrize("program", _versions() or [None])
def test_other_pythons_as_hosts(program: str | None) -> None:
    """A host may run another version of Python than the server."""
    if program is None:
        pytest.skip("NOT RUN: there is no other Python")
    code = (
        f"import sys; sys.path[:0] = [{str(CLIENT.parent)!r}]\n"
        "from beamfuncs_client.client import Functions, Failed\n"
        f"host = Functions({VERSION!r})\n"
        "print(host.call('reaction', ['fixed 8 pinned', 'udl 12', 1]))\n"
        "print(host.calls([('reaction', ['', '', 1])])[0].value)"
    )
    told = subprocess.run([program, "-S", "-c", code], capture_output=True, text=True, check=False, timeout=PATIENCE)
    assert (told.stdout, told.stderr) == ("60.0\n#VALUE!\n", "")
