"""Where host and server find each other: the user's own folder, what stands in it, and the locks on it.

Nobody else may enter the folder: it belongs to the user, has mode 0700, and is no symbolic link; else it is not used.
With `BEAMFUNCS_FOLDER` in the environment everything stands in that folder.
"""

from __future__ import annotations

import contextlib
import json
import os
import stat
import sys
import tempfile
import time
from pathlib import Path
from typing import Any, NamedTuple

OWN_FOLDER = "BEAMFUNCS_FOLDER"
POLLED = 0.02
"""Seconds between two looks at what another process holds."""
REPLACING = 5.0
"""Seconds in which a file that others look at can be replaced."""


class UnusableError(Exception):
    """Something of the user's is not there or not safe to use; the text says what, and what to do."""


class Running(NamedTuple):
    """What the running server tells of itself: where it listens, the key, its process, its version."""

    address: str
    key: bytes
    pid: int
    version: str


# --- folders --------------------------------------------------------------------------------------------


def folder() -> Path:
    """Return the folder of what lives as long as the server; made where it is not there."""
    path = _folder()
    try:
        path.mkdir(mode=0o700)
    except FileExistsError:
        pass
    except OSError as error:
        raise UnusableError(f"the folder {path} cannot be made: {error.strerror}") from None
    return _private(path)


def _folder() -> Path:
    given = os.environ.get(OWN_FOLDER)
    if given:
        return Path(given).absolute()
    if sys.platform == "win32":
        return _windows("LOCALAPPDATA") / "beamfuncs"
    runtime = os.environ.get("XDG_RUNTIME_DIR", "")
    if os.path.isabs(runtime) and _is_ours(Path(runtime)):
        return Path(runtime) / "beamfuncs"
    return Path(tempfile.gettempdir()) / f"beamfuncs-{os.geteuid()}"


def settings() -> Path:
    """Return the file that says how the server is started."""
    return _lasting("XDG_CONFIG_HOME", ".config", "APPDATA") / "calc.json"


def log() -> Path:
    """Return the file in which the server tells of every failure."""
    return _lasting("XDG_STATE_HOME", ".local/state", "LOCALAPPDATA") / "server.log"


def _lasting(variable: str, usual: str, windows: str) -> Path:
    """Return the folder of what outlives the server: the given one, or where the system keeps such files."""
    given = os.environ.get(OWN_FOLDER)
    if given:
        return Path(given).absolute()
    if sys.platform == "win32":
        return _windows(windows) / "beamfuncs"
    if sys.platform == "darwin":
        return Path.home() / "Library" / "Application Support" / "beamfuncs"
    set_by_user = os.environ.get(variable, "")
    return (Path(set_by_user) if os.path.isabs(set_by_user) else Path.home() / usual) / "beamfuncs"


def _windows(variable: str) -> Path:
    return Path(os.environ.get(variable) or Path.home())


def _private(path: Path) -> Path:
    """Return a folder that only the user can enter; raise where it is not such a one."""
    found = path.lstat()
    if not stat.S_ISDIR(found.st_mode):
        raise UnusableError(f"{path} is a link or a file where a folder is due: remove it")
    if sys.platform != "win32" and (found.st_uid != os.geteuid() or found.st_mode & 0o077):
        raise UnusableError(f"the folder {path} is open to other users: remove it, or give it mode 0700")
    return path


def _is_ours(path: Path) -> bool:
    try:
        return sys.platform == "win32" or path.stat().st_uid == os.geteuid()
    except OSError:
        return False


# --- files ----------------------------------------------------------------------------------------------


def running() -> Running | None:
    """Return what the server wrote of itself, or None; it may have died since."""
    path = _folder()
    if not path.is_dir():
        return None
    found = _read(_private(path) / "server.json")
    try:
        return Running(str(found["address"]), bytes.fromhex(found["key"]), int(found["pid"]), str(found["version"]))
    except (TypeError, KeyError, ValueError):
        return None


def tell(server: Running) -> None:
    """Write where the server is found."""
    _write(folder() / "server.json", server._replace(key=server.key.hex())._asdict())  # type: ignore[arg-type]


def forget() -> None:
    """Take away what the server wrote; it is no longer found."""
    with contextlib.suppress(FileNotFoundError):
        (_folder() / "server.json").unlink()


def command() -> list[str]:
    """Return the command that starts the server, as `beamfuncs calc install` wrote it."""
    found = _read(settings())
    words = found.get("server") if isinstance(found, dict) else None
    if not isinstance(words, list) or not words:
        raise UnusableError(f"{settings()} does not say how to start the server: run `beamfuncs calc install`")
    return [str(word) for word in words]


def profiles() -> list[str]:
    """Return the profiles of the office that `beamfuncs calc install` put the extension into."""
    found = _read(settings())
    folders = found.get("profiles") if isinstance(found, dict) else None
    return [str(folder) for folder in folders] if isinstance(folders, list) else []


def keep_command(words: list[str], profiles: list[str] | None = None) -> None:
    """Write the command that starts the server, for the hosts of this user, and the office's profiles that need it."""
    settings().parent.mkdir(mode=0o700, parents=True, exist_ok=True)
    _write(settings(), {"server": words, "profiles": profiles or []})


def forget_command() -> None:
    """Take away the command that starts the server."""
    with contextlib.suppress(FileNotFoundError):
        settings().unlink()


def _write(path: Path, content: Any) -> None:
    """Write a file that appears whole or not at all, and that nobody else can read."""
    handle, name = tempfile.mkstemp(dir=str(path.parent), prefix=path.name)  # mode 0600, and never through a link
    try:
        with os.fdopen(handle, "w", encoding="utf-8") as file:
            json.dump(content, file)
        _replace(name, path)
    except BaseException:
        os.unlink(name)
        raise


def _replace(name: str, path: Path) -> None:
    """Put a file in the place of another, on Windows when nobody reads that one."""
    until = time.monotonic() + (REPLACING if sys.platform == "win32" else 0.0)
    while True:
        try:
            return os.replace(name, str(path))
        except PermissionError:
            if time.monotonic() >= until:
                raise
        time.sleep(POLLED)


def _read(path: Path) -> Any:
    """Return what a file of ours says, None where there is none; no link is followed, and no file of others read."""
    try:
        handle = os.open(str(path), os.O_RDONLY | getattr(os, "O_NOFOLLOW", 0))
    except (FileNotFoundError, PermissionError):  # the latter on Windows, while the file is being replaced
        return None
    with os.fdopen(handle, encoding="utf-8") as file:
        found = os.fstat(handle)
        if sys.platform != "win32" and (found.st_uid != os.geteuid() or found.st_mode & 0o022):
            raise UnusableError(f"{path} can be written by other users: remove it")
        try:
            return json.load(file)
        except ValueError:
            return None


# --- locks ----------------------------------------------------------------------------------------------


class Lock:
    """A lock among the processes of the user, freed by the system where its holder dies.

    `SERVING` is held by the one server all its life, `STARTING` by the host that starts or ends one.
    """

    SERVING = "serving"
    STARTING = "starting"

    def __init__(self, name: str) -> None:
        self._path = folder() / f"{name}.lock"
        self._handle: int | None = None

    def take(self, patience: float = 0.0) -> bool:
        """Take the lock, waiting so many seconds for it; tell whether it is ours."""
        flags = os.O_RDWR | os.O_CREAT | getattr(os, "O_NOFOLLOW", 0)
        handle = os.open(str(self._path), flags, 0o600)  # not inherited by the processes that we start
        until = time.monotonic() + patience
        while not _locked(handle):
            if time.monotonic() >= until:
                os.close(handle)
                return False
            time.sleep(POLLED)
        self._handle = handle
        return True

    def free(self) -> None:
        """Give the lock up."""
        if self._handle is not None:
            os.close(self._handle)
            self._handle = None


def _locked(handle: int) -> bool:
    """Lock an open file if nobody holds it."""
    try:
        if sys.platform == "win32":
            import msvcrt

            msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)
        else:
            import fcntl

            fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError:
        return False
    return True
