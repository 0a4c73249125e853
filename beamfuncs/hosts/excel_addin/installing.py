"""The add-in put into a user's profile, and taken out again.

Each step can be done again without harm, and the receipt tells of a change before it is made: an installation that
was interrupted can be repeated or removed, and so can a removal.
"""

from __future__ import annotations

from contextlib import suppress
from dataclasses import dataclass, replace
from hashlib import sha256
from itertools import count
from pathlib import Path

from beamfuncs.hosts.excel_addin import machine, settings
from beamfuncs.hosts.excel_addin.addin import Addin, read_addin
from beamfuncs.hosts.excel_addin.places import PROJECT, Places
from beamfuncs.hosts.excel_addin.receipt import Receipt, read_receipt
from beamfuncs.hosts.excel_addin.templates import template
from beamfuncs.hosts.excel_addin.vba import module_text
from beamfuncs.hosts.excel_addin.vbaproject import NotRead, declarations
from beamfuncs.hosts.headless import writing

TEMPLATE = "quickstart_addin.xlam"


class NotInstalled(ValueError):
    """Why nothing could be done, in one line."""


@dataclass(frozen=True)
class Installed:
    """What was done, a line each, and whether the module with the functions is to be imported by hand."""

    lines: tuple[str, ...]
    to_import: bool


def install(places: Places, given: Path | None = None) -> Installed:
    """Put the add-in into Excel's startup folder, the empty template or a given one, and write its settings."""
    python = machine.interpreter()
    for one in machine.findings(python):
        if one.mend:
            raise NotInstalled(one.line)
    source = given or template(TEMPLATE)
    new = _usable(source)
    receipt = read_receipt(places.receipt) or Receipt(settings_made=not places.settings.exists())
    missing = _missing(places.startup, places.settings.parent)
    receipt = replace(receipt, folders=(*receipt.folders, *map(str, missing)))
    places.own.mkdir(parents=True, exist_ok=True)
    receipt, kept = _put_addin(places, receipt, source, new, replaces=given is not None)
    _put_settings(places, receipt, python)
    write_module(places.module)
    to_import = read_addin(places.addin).functions != declarations(module_text())
    return Installed((f"add-in: {places.addin}", *kept, f"settings: {places.settings}"), to_import)


def uninstall(places: Places) -> tuple[str, ...]:
    """Undo what was installed, and return a line for each thing that was done, or left and why."""
    receipt = read_receipt(places.receipt)
    lines: tuple[str, ...] = ("nothing is installed",)
    if receipt:
        lines = *_take_addin(places, receipt), *_take_settings(places, receipt)
        places.module.unlink(missing_ok=True)
        _remove_empty(*map(Path, receipt.folders))
        places.receipt.unlink()
    _remove_empty(places.own)
    return lines


def write_module(path: Path) -> None:
    """Write the VBA module with the functions."""
    writing.replace(path, [module_text().encode("ascii")])


def _usable(source: Path) -> Addin:
    """Return what an add-in file holds; raises `NotInstalled` where it would not work with this environment."""
    try:
        new = read_addin(source)
    except FileNotFoundError:
        raise NotInstalled(f"{source}: there is no such file") from None
    except NotRead as error:
        raise NotInstalled(str(error)) from None
    if new.xlwings != machine.pinned():
        raise NotInstalled(
            f"{source}: was made with xlwings {new.xlwings}, and this Python has {machine.pinned()}; take an add-in "
            "made with the same version of beamfuncs, or install without --addin"
        )
    if new.project != PROJECT:
        raise NotInstalled(f"{source}: is an add-in for {new.project}, not for beamfuncs")
    return new


# --- the add-in -----------------------------------------------------------------------------------


def _put_addin(
    places: Places, receipt: Receipt, source: Path, new: Addin, replaces: bool
) -> tuple[Receipt, tuple[str, ...]]:
    """Put an add-in in place, keeping what stood there; one that has its functions and fits gives way to none."""
    content, standing = source.read_bytes(), _content(places.addin)
    if standing == content or (not replaces and _serves(places.addin)):
        receipt.write(places.receipt)
        return receipt, ()
    told: tuple[str, ...] = ()
    kept = None
    if standing is not None and _digest(standing) != receipt.digest:
        kept = _place_to_keep(places, receipt, standing)
        told = (f"the add-in that was there is kept: {kept}",)
        if not receipt.digest:
            receipt = replace(receipt, former=kept.name)
        elif kept.name not in (receipt.former, *receipt.older):
            receipt = replace(receipt, older=(*receipt.older, kept.name))
    receipt = replace(receipt, digest=_digest(content), others=tuple(sorted(new.others)))
    receipt.write(places.receipt)
    if kept and standing is not None:
        writing.replace(kept, [standing])
    _move_in(places, content)
    return receipt, told


def _place_to_keep(places: Places, receipt: Receipt, standing: bytes) -> Path:
    """Return where the add-in that stands is kept: as a receipt says of an interrupted run, or under a new name.

    Not beside the add-in: Excel opens every file of its startup folder.
    """
    known = [places.own / name for name in (receipt.former, *receipt.older) if name]
    new = (places.own / f"{places.addin.stem}.{number}.xlam" for number in count(1))
    begun = [path for path in known if _content(path) in (None, standing)]
    return begun[0] if begun else next(path for path in new if not path.exists())


def _move_in(places: Places, content: bytes) -> None:
    places.startup.mkdir(parents=True, exist_ok=True)
    try:
        writing.replace(places.staged, [content])
        places.staged.replace(places.addin)
    finally:
        places.staged.unlink(missing_ok=True)


def _take_addin(places: Places, receipt: Receipt) -> list[str]:
    places.staged.unlink(missing_ok=True)
    lines = []
    for kept in (places.own / name for name in receipt.older):
        if _is_ours(kept, receipt):
            kept.unlink()
        elif kept.exists():
            lines.append(f"left, since modules were added to it: {kept}")
    standing, former = _content(places.addin), places.own / receipt.former
    before = _content(former) if receipt.former else None
    if not receipt.digest or (receipt.former and before is None):
        return lines if standing is None else [*lines, f"left, since it was there before: {places.addin}"]
    if standing not in (None, before) and not _is_ours(places.addin, receipt):
        lines.append(f"left, since modules were added to it: {places.addin}")
        return lines if before is None else [*lines, f"left, since its place is taken: {former}"]
    if before is None:
        places.addin.unlink(missing_ok=True)
        return [*lines, f"removed: {places.addin}"]
    _move_in(places, before)
    former.unlink()
    return [*lines, f"as it was before: {places.addin}"]


def _is_ours(addin: Path, receipt: Receipt) -> bool:
    """Return whether an add-in is the one that was installed, at most with the functions imported since."""
    if _digest(_content(addin) or b"") == receipt.digest:
        return True
    with suppress(NotRead, OSError):
        return read_addin(addin).others == set(receipt.others)
    return False


def _serves(addin: Path) -> bool:
    """Return whether an add-in has the functions, and the VBA of xlwings that fits this environment."""
    with suppress(NotRead, OSError):
        found = read_addin(addin)
        return found.complete and (found.xlwings, found.project) == (machine.pinned(), PROJECT)
    return False


# --- the settings ---------------------------------------------------------------------------------


def _put_settings(places: Places, receipt: Receipt, python: Path) -> None:
    """Write our lines; those of another time are taken out first, while the receipt still knows them."""
    ours = settings.block(settings.wanted(python))
    content = _content(places.settings) or b""
    rest, _ = settings.without(content, receipt.settings.encode("latin-1"))
    if ours + rest == content:
        return
    if rest != content:
        writing.replace(places.settings, [rest])
    replace(receipt, settings=ours.decode("latin-1")).write(places.receipt)
    places.settings.parent.mkdir(parents=True, exist_ok=True)
    writing.replace(places.settings, [ours + rest])


def _take_settings(places: Places, receipt: Receipt) -> list[str]:
    content = _content(places.settings)
    if content is None:
        return []
    rest, changed = settings.without(content, receipt.settings.encode("latin-1"))
    if receipt.settings_made and not rest:
        places.settings.unlink()
        return [f"removed: {places.settings}"]
    if rest != content:
        writing.replace(places.settings, [rest])
    lines = [f"left, since it is not as it was installed: {key} in {places.settings}" for key in changed]
    return [f"without our lines: {places.settings}", *lines]


# --- files and folders ----------------------------------------------------------------------------


def _content(path: Path) -> bytes | None:
    try:
        return path.read_bytes()
    except FileNotFoundError:
        return None


def _digest(content: bytes) -> str:
    return sha256(content).hexdigest()


def _missing(*folders: Path) -> list[Path]:
    """Return those folders, and those that they lie in, that are not there."""
    wanted = {one for folder in folders for one in (folder, *folder.parents)}
    return sorted(one for one in wanted if not one.exists())


def _remove_empty(*folders: Path) -> None:
    """Remove those folders that are empty, but for what a killed run left half written in them."""
    for folder in sorted(folders, reverse=True):
        with suppress(OSError):  # it is not empty, or somebody removed it
            content = list(folder.iterdir())
            if all(writing.LEFT_OVER.fullmatch(path.name) for path in content):
                for path in content:
                    path.unlink()
                folder.rmdir()
