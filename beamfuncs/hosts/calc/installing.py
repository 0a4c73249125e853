"""The extension put into a user's profile of the office, and taken out of it."""

from __future__ import annotations

import os
import re
import subprocess
import tempfile
from importlib.metadata import version
from pathlib import Path

from beamfuncs.hosts.calc import offices, packing, remote, typelibrary
from beamfuncs.hosts.calc.component.beamfuncs_client import places
from beamfuncs.hosts.calc.naming import EXTENSION, FILE_NAME
from beamfuncs.hosts.calc.offices import Office
from beamfuncs.hosts.server import starting_command

PATIENCE = 300
"""Seconds that the office may take."""
_BROKEN_OFF = "DeploymentException"
"""How the office names a change of its extensions that it broke off."""
_VERSION = re.compile(r'<version value="([^"]*)"')


class NotInstalled(Exception):
    """Nothing was done; the message says why in one line."""


def install(office: Office, profile: Path) -> None:
    """Put the extension into a profile in the place of an older one, and write how the function server is started."""
    with tempfile.TemporaryDirectory() as folder:
        file = Path(folder) / FILE_NAME
        try:
            file.write_bytes(packing.packed())
        except typelibrary.NotBuilt as error:
            raise NotInstalled(str(error)) from None
        _change(office, profile, "add", str(file))
    if installed(profile) != version("beamfuncs"):
        raise NotInstalled(f"the office took the extension, but it is not in {profile}")
    places.keep_command(starting_command(), [str(profile.absolute()), *_others(profile)])


def uninstall(office: Office, profile: Path) -> bool:
    """Take the extension out of a profile, and stop the function server; tell whether the extension was there."""
    from beamfuncs.hosts.server import control

    there = installed(profile) is not None
    if there:
        _change(office, profile, "remove", EXTENSION)
    if others := _others(profile):
        places.keep_command(places.command(), others)
    else:
        places.forget_command()
    control.stop()
    return there


def installed(profile: Path) -> str | None:
    """Return the version of the extension in a profile, None where it is not there.

    The office lists its extensions in one file, each with the folder that it is in; the folder may outlive it.
    """
    cache = profile / "user" / "uno_packages" / "cache"
    try:
        listed = (cache / "uno_packages.pmap").read_bytes()
    except OSError:
        return None
    for description in cache.glob(f"uno_packages/*/{FILE_NAME}/description.xml"):
        found = _VERSION.search(description.read_text(encoding="utf-8"))
        if found and description.parent.parent.name.rstrip("_").encode() in listed:
            return found[1]
    return None


def _others(profile: Path) -> list[str]:
    """Return the other profiles that have the extension, as far as they are known: the user's own, and those noted."""
    known = {str(offices.profile().absolute()), *places.profiles()} - {str(profile.absolute())}
    return sorted(other for other in known if installed(Path(other)) is not None)


def _change(office: Office, profile: Path, action: str, extension: str) -> None:
    if offices.lock(profile).exists():
        raise NotInstalled(f"LibreOffice is open: close it first (or, if it crashed, delete {offices.lock(profile)})")
    profile = profile.absolute()
    if _is_root():
        if office.python is None:
            raise NotInstalled("there is no Python that knows the office (Debian: python3-uno)")
        command = [str(office.python), remote.__file__, str(office.soffice), str(profile), action, extension]
    else:
        options = ["--suppress-license", "--force"] if action == "add" else []
        where = f"-env:UserInstallation={profile.as_uri()}"
        command = [str(office.unopkg), action, *options, where, extension]
    failure = _failure(command)
    if _BROKEN_OFF in failure:  # which may be for that once
        failure = _failure(command)
    if _BROKEN_OFF in failure:
        raise NotInstalled(f"not {'installed' if action == 'add' else 'taken out'}: run it again")
    if failure:
        raise NotInstalled(f"{command[0]}: {failure.splitlines()[-1].strip()}")


def _failure(command: list[str]) -> str:
    """Run a program; return what it said where it failed, a blank text where it did not."""
    try:
        done = subprocess.run(command, capture_output=True, text=True, check=False, timeout=PATIENCE)
    except (OSError, subprocess.TimeoutExpired) as error:
        return str(error)
    return (done.stderr or done.stdout).strip() or f"status {done.returncode}" if done.returncode else ""


def _is_root() -> bool:
    """Tell whether the office's own tool would refuse, which wants root to install for all users."""
    return hasattr(os, "geteuid") and os.geteuid() == 0
