"""The commands `beamfuncs calc ...`. What only one needs is imported by that command."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from beamfuncs.status import DONE, DONE_WITH_ERRORS, give_up

if TYPE_CHECKING:
    from beamfuncs.hosts.calc.offices import Office

app = typer.Typer(help="The functions in LibreOffice Calc: install, check, hand workbooks over.", no_args_is_help=True)

Programs = Annotated[
    Path | None, typer.Option("--office", metavar="FOLDER", help="The office's folder of programs, if not found.")
]
Profile = Annotated[
    Path | None, typer.Option("--profile", metavar="FOLDER", help="A profile of the office other than the user's own.")
]
Out = Annotated[Path | None, typer.Option("-o", "--out", metavar="FILE", help="Where to write.")]


@app.command()
def install(office: Programs = None, profile: Profile = None) -> None:
    """Put the functions into the user's LibreOffice.

    Close LibreOffice first. Exit status: 0 done; 2 nothing done.
    """
    from beamfuncs.hosts.calc import installing, offices

    folder = profile or offices.profile()
    try:
        installing.install(_office(office), folder)
    except installing.NotInstalled as error:
        give_up(str(error))
    print(f"installed in {folder}; the functions are there when LibreOffice is started again")


@app.command()
def uninstall(office: Programs = None, profile: Profile = None) -> None:
    """Take the functions out of the user's LibreOffice, and stop the function server.

    Close LibreOffice first. Exit status: 0 done; 2 nothing done.
    """
    from beamfuncs.hosts.calc import installing, offices

    folder = profile or offices.profile()
    try:
        there = installing.uninstall(_office(office), folder)
    except installing.NotInstalled as error:
        give_up(str(error))
    print(f"taken out of {folder}" if there else f"there was nothing in {folder}")


@app.command()
def check(office: Programs = None, profile: Profile = None) -> None:
    """Tell whether the functions can work in the user's LibreOffice, and what to do where they cannot.

    Exit status: 0 all is well; 1 something is amiss.
    """
    from beamfuncs.hosts.calc import checking, offices

    well = True
    for finding in checking.findings(_found(office), profile or offices.profile()):
        well = well and finding.is_well
        print(f"{'ok ' if finding.is_well else 'BAD'}  {finding.what}: {finding.told}")
        if not finding.is_well:
            print(f"     {finding.remedy}")
    raise typer.Exit(DONE if well else DONE_WITH_ERRORS)


@app.command()
def plain(
    books: Annotated[list[Path], typer.Argument(metavar="BOOK.xlsx...", help="Workbooks that Calc saved.")],
) -> None:
    """Give workbooks that Calc wrote plain function names, for Excel and for `beamfuncs fill`.

    A workbook that is saved in Calc has them already; a copy or a conversion has not.
    Exit status: 0 done; 2 a workbook could not be rewritten.
    """
    from beamfuncs.hosts.calc.rewriting import NotRewritten
    from beamfuncs.hosts.calc.rewriting import plain as make_plain

    for book in books:
        try:
            print(f"{book}: {'plain names' if make_plain(book) else 'nothing to do'}")
        except NotRewritten as error:
            give_up(str(error))


@app.command()
def freeze(
    book: Annotated[Path, typer.Argument(metavar="BOOK.ods", help="The workbook; it is only read.")], out: Out = None
) -> None:
    """Replace beam formulas by their stored values in a copy of an .ods, for a reader without the functions.

    Each formula is kept in a note on its cell; all other formulas stay live. Exit status: 0 done; 2 nothing done.
    """
    from beamfuncs.hosts.calc import rewriting

    try:
        target, count = rewriting.freeze(book, out)
    except rewriting.NotRewritten as error:
        give_up(str(error))
    print(f"{target}: {count} beam formula{'s' * (count != 1)} frozen")


@app.command()
def build(
    out: Annotated[Path, typer.Option("-o", "--out", metavar="FILE.oxt", help="Where to write.")] = Path(
        "beamfuncs.oxt"
    ),
    types: Annotated[
        bool, typer.Option("--types", help="Build the type library anew first, after the functions have changed.")
    ] = False,
    office: Programs = None,
) -> None:
    """Write the extension to a file, for LibreOffice's own extension manager.

    Exit status: 0 done; 2 nothing done.
    """
    from beamfuncs.hosts.calc import offices, packing, typelibrary

    try:
        if types:
            typelibrary.rebuild([office] if office else [one.program for one in offices.offices()])
        out.write_bytes(packing.packed())
    except (typelibrary.NotBuilt, OSError) as error:
        give_up(str(error))
    print(f"{out}: written")


def _office(programs: Path | None) -> Office:
    office = _found(programs)
    if office is None:
        give_up("LibreOffice is not found; say where its programs are: --office FOLDER")
    return office


def _found(programs: Path | None) -> Office | None:
    from beamfuncs.hosts.calc import offices

    if programs is None:
        return next(offices.offices(), None)
    office = offices.Office(programs)
    return office if office.soffice.is_file() else None
