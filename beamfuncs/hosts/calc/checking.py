"""Whether beam functions can work in the user's Calc: finding by finding, each with what to do where it fails."""

from __future__ import annotations

import platform
from collections.abc import Iterator
from dataclasses import dataclass
from importlib.metadata import version
from pathlib import Path

from beamfuncs.hosts.calc import installing, offices
from beamfuncs.hosts.calc.component.beamfuncs_client import places
from beamfuncs.hosts.calc.component.beamfuncs_client.client import Functions
from beamfuncs.hosts.calc.component.beamfuncs_client.messages import Failed

QUESTION = ("reaction", ["fixed 8 pinned", "udl 12", 1.0])
"""What the server is asked; by statics and Bernoulli's beam 5/8 of the load, 60."""

INSTALL = "beamfuncs calc install"


@dataclass(frozen=True)
class Finding:
    """What was looked at, what was found, and, where that will not do, what to do."""

    what: str
    told: str
    remedy: str = ""

    @property
    def is_well(self) -> bool:
        """Whether nothing needs to be done."""
        return not self.remedy


def findings(office: offices.Office | None, profile: Path) -> Iterator[Finding]:
    """Look at one thing after the other."""
    yield Finding("beamfuncs", f"{version('beamfuncs')}, Python {platform.python_version()}, {platform.platform()}")
    yield from _of_office(office)
    own = profile.absolute() == offices.profile().absolute()
    install = INSTALL if own else f"{INSTALL} --profile {_quoted(profile)}"
    yield _of_extension(profile, install)
    yield _of_server(install)
    yield Finding("logs", f"{places.log()}, {places.log().with_name('office.log')}")


def _of_office(office: offices.Office | None) -> Iterator[Finding]:
    if office is None:
        remedy = "install LibreOffice (no Flatpak or Snap: they are shut in), or say where it is: --office FOLDER"
        yield Finding("office", "LibreOffice is not found", remedy)
        return
    yield Finding("office", f"{office.version}, in {office.program}")
    if office.python is None:
        remedy = "install it (Debian, Ubuntu: python3-uno and libreoffice-script-provider-python)"
        yield Finding("its Python", "the office's support of Python is not found", remedy)
    else:
        yield Finding("its Python", str(office.python))


def _of_extension(profile: Path, install: str) -> Finding:
    found, wanted = installing.installed(profile), version("beamfuncs")
    if found is None:
        return Finding("extension", f"not installed in {profile}", f"run `{install}`")
    if found != wanted:
        remedy = f"run `{install}`, then restart LibreOffice"
        return Finding("extension", f"{found}, but the package is {wanted}, in {profile}", remedy)
    return Finding("extension", f"{found}, in {profile}")


def _of_server(install: str) -> Finding:
    functions = Functions(version("beamfuncs"))
    try:
        answer = functions.call(*QUESTION)
    except Failed as failed:
        reason = failed.reason.replace(f"`{INSTALL}`", f"`{install}`")  # which does not know of profiles
        return Finding("function server", reason, f"run `{install}`; the logs may tell more")
    finally:
        functions.close()
    return Finding("function server", f"answers {answer:g} to reaction of {QUESTION[1]}; the right answer is 60")


def _quoted(path: Path) -> str:
    return f'"{path}"' if " " in str(path) else str(path)
