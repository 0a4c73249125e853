"""`beamfuncs excel ...`: install, check and remove the functions in Excel, or write their VBA module."""

from __future__ import annotations

import json
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import asdict
from pathlib import Path
from typing import Annotated

import typer

from beamfuncs.hosts.excel_addin import windows
from beamfuncs.hosts.excel_addin.places import ADDIN, places
from beamfuncs.status import DONE, DONE_WITH_ERRORS, give_up

TRY = '=reaction("fixed 8 pinned", "udl 12", 1) gives 60'
BY_HAND = """\
To do by hand, once:
  1. Start Excel and press Alt+F11.
  2. In the list on the left (Ctrl+R) click {project}.
  3. If a module BeamFuncs is there from before, right-click it > Remove BeamFuncs, and answer No.
  4. File > Import File: {module}
  5. Ctrl+S, close Excel and start it again: {trial}."""

STILL = """\
Where every cell shows #NAME? all the same: File > Options > Add-ins > Manage: Disabled Items. Where every cell shows
#VALUE!: Alt+F8, BeamFuncsFailure, which says why Python did not answer."""

app = typer.Typer(help="The functions in Excel (Windows): install, check, uninstall.", no_args_is_help=True)


@app.command()
def module(
    out: Annotated[Path, typer.Option("-o", "--out", metavar="FILE.bas", help="An older one is replaced.")] = Path(
        "beamfuncs.bas"
    ),
) -> None:
    """Write the VBA module with the functions, to import into an add-in by hand."""
    from beamfuncs.hosts.excel_addin.installing import write_module

    with _giving_up():
        write_module(out)
    print(out)
    print(BY_HAND.format(project=f"the project of the add-in, such as MyAddin ({ADDIN})", module=out, trial=TRY))


@app.command()
def install(
    addin: Annotated[
        Path | None,
        typer.Option("--addin", metavar="FILE.xlam", help="An add-in that has the functions already, of a colleague."),
    ] = None,
) -> None:
    """Put the add-in into Excel's startup folder and write its settings (Windows).

    Exit status: 0 done; 2 not done.
    """
    from beamfuncs.hosts.excel_addin import installing

    _need_windows()
    where = places()
    with _giving_up():
        done = installing.install(where, addin)
    print("\n".join(done.lines))
    if done.to_import:
        print(BY_HAND.format(project=f"MyAddin ({ADDIN})", module=where.module, trial=TRY))
    else:
        print(f"The add-in has its functions: start Excel, and {TRY}.")


@app.command()
def uninstall() -> None:
    """Undo what `install` did, and nothing else (Windows).

    Exit status: 0 done; 2 not done.
    """
    from beamfuncs.hosts.excel_addin import installing

    _need_windows()
    with _giving_up():
        print("\n".join(installing.uninstall(places())))


@app.command()
def check(as_json: Annotated[bool, typer.Option("--json", help="Print JSON for a script.")] = False) -> None:
    """Print a diagnosis to read or to send: what is there, and what to do where something is wrong (Windows).

    Exit status: 0 all is well; 1 something is to be mended; 2 not Windows.
    """
    from beamfuncs.hosts.excel_addin.checking import findings

    _need_windows()
    found = findings(places())
    faults = [one for one in found if one.mend]
    if as_json:
        print(json.dumps([asdict(one) for one in found], indent=2, ensure_ascii=False))
    else:
        for one in found:
            print(f"{'!' if one.mend else ' '} {one.what}: {one.told}")
            if one.mend:
                print(f"    > {one.mend}")
        print(f"{len(faults)} to mend" if faults else f"all is well\n{STILL}")
    raise typer.Exit(DONE_WITH_ERRORS if faults else DONE)


def _need_windows() -> None:
    if not windows.here():
        give_up(
            "Excel functions need Windows; elsewhere use them in LibreOffice Calc, or fill workbooks with "
            "`beamfuncs fill`"
        )


@contextmanager
def _giving_up() -> Iterator[None]:
    """End with one line and the status for nothing done where a file cannot be written, or something is lacking."""
    from beamfuncs.hosts.excel_addin.installing import NotInstalled
    from beamfuncs.hosts.excel_addin.receipt import Damaged
    from beamfuncs.hosts.headless.writing import NotWritten

    try:
        yield
    except (NotInstalled, NotWritten, Damaged) as error:
        give_up(str(error))
    except PermissionError as error:
        give_up(f"{error.filename2 or error.filename}: in use, or must not be written to; close Excel and try again")
    except OSError as error:
        give_up(f"{error.filename2 or error.filename}: {(error.strerror or str(error)).lower()}")
