"""The command line: `beamfuncs fill` a workbook, `beamfuncs list` the functions, `beamfuncs excel` for those in Excel.

Exit status: 0 done; 1 done, but some cell has an error; 2 nothing done. What only one command needs
is imported by that command, so that `--help` answers at once.
"""

from __future__ import annotations

import gc
import json
import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import asdict
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, NoReturn

import typer

from beamfuncs.hosts.calc.commands import app as calc
from beamfuncs.hosts.excel_addin.commands import app as excel
from beamfuncs.hosts.server.commands import serve
from beamfuncs.status import DONE, DONE_WITH_ERRORS, NOTHING_DONE, give_up
from beamfuncs.trust import Trust

if TYPE_CHECKING:
    from rich.console import Console

    from beamfuncs.catalogue import Entry
    from beamfuncs.hosts.headless.checking import Checked
    from beamfuncs.hosts.headless.filling import CellFault, Report
    from beamfuncs.hosts.headless.stored import Difference
    from beamfuncs.hosts.headless.view import View

LISTED = 50
"""How many errors are printed; `--json` gives them all."""
PATIENCE = 1.0
"""Seconds before a progress bar appears."""
PIPE_WIDTH = 140
LONG_WORDS = 20
"""A row of one text longer than this is a note, and is printed below the table."""

COLLECTED = 50_000, 50, 100
"""How rarely Python looks for objects in circles: a tall workbook makes very many, and all live to the end."""

app = typer.Typer(
    name="beamfuncs",
    help="Worksheet functions that solve any line beam exactly: fill workbooks, list the functions.",
    no_args_is_help=True,
    add_completion=False,
)

Trusted = Annotated[
    Trust,
    typer.Option("--trust", help="Whose value counts where an ordinary cell stores another than is computed here."),
]
Json = Annotated[bool, typer.Option("--json", help="Print JSON for a script.")]


def main() -> None:
    """Run the command line."""
    gc.set_threshold(*COLLECTED)
    app()


def _print_version(wanted: bool) -> None:
    if wanted:
        from importlib.metadata import version

        print(f"beamfuncs {version('beamfuncs')}")
        raise typer.Exit(DONE)


@app.callback()
def _options(
    version: Annotated[
        bool,
        typer.Option("--version", help="Print the version.", callback=_print_version, is_eager=True),
    ] = False,
) -> None:
    pass


@app.command()
def fill(
    book: Annotated[Path, typer.Argument(metavar="BOOK.xlsx", help="The workbook, only read but for --in-place.")],
    out: Annotated[
        Path | None,
        typer.Option("-o", "--out", metavar="OUT.xlsx", help="Default: BOOK.filled.xlsx beside the workbook."),
    ] = None,
    show: Annotated[
        str | None,
        typer.Option("--show", metavar="PART", help="Print filled values: a sheet, a defined name, or SHEET!A1:F9."),
    ] = None,
    in_place: Annotated[
        bool,
        typer.Option("--in-place", help="Fill the workbook itself; a dated copy of it is kept beside it."),
    ] = False,
    listing: Annotated[
        Path | None,
        typer.Option("--report", metavar="FILE", help="Tell of every beam cell in a .csv, .json or .html (drawings)."),
    ] = None,
    trust: Trusted = Trust.STORED,
    as_json: Json = False,
) -> None:
    """Compute a workbook's formulas and store the values beside them in a copy.

    Exit status: 0 done; 1 done, but some cell has an error; 2 nothing done.
    """
    from beamfuncs.hosts.headless import filling

    if in_place and out:
        give_up("--in-place and --out exclude each other: the workbook is filled itself, or a copy of it")
    with _giving_up(), _progress_bar() as progress:
        view = filling.view_of(book, show) if show else None
        report = filling.fill(book, out, progress=progress, in_place=in_place, listing=listing, trust=trust)
    if view and not as_json:
        _print_view(report.target, view)
    _finish(report, as_json)


@app.command()
def freeze(
    book: Annotated[Path, typer.Argument(metavar="BOOK.xlsx", help="The workbook; it is only read.")],
    out: Annotated[
        Path | None,
        typer.Option("-o", "--out", metavar="OUT.xlsx", help="Default: BOOK.frozen.xlsx beside the workbook."),
    ] = None,
    trust: Trusted = Trust.STORED,
    as_json: Json = False,
) -> None:
    """Replace beam formulas by their values in a copy, for a reader without the functions.

    Each formula is kept in a note on its cell; all other formulas stay live.
    Exit status: 0 done; 1 done, but some cell has an error; 2 nothing done.
    """
    from beamfuncs.hosts.headless import filling

    with _giving_up(), _progress_bar() as progress:
        report = filling.fill(book, out, progress=progress, trust=trust, freeze=True)
    _finish(report, as_json, action="frozen")


@app.command()
def check(
    books: Annotated[list[Path], typer.Argument(metavar="BOOK.xlsx|FOLDER...", help="Workbooks, or folders of them.")],
    jobs: Annotated[
        int,
        typer.Option("--jobs", metavar="N", min=1, help="So many workbooks at a time, up to the number of processors."),
    ] = 1,
    trust: Trusted = Trust.STORED,
    as_json: Json = False,
) -> None:
    """Compute workbooks without writing, and tell whether the values that they store are up to date.

    Exit status: 0 all are; 1 a beam cell or one that builds on it is stale or stores nothing, or a cell has an
    error; 2 a file cannot be read.
    """
    from beamfuncs.hosts.headless.checking import check_all, workbooks

    found: list[Checked] = []
    try:
        for one in check_all(workbooks(books), trust, jobs):
            found.append(one)
            if not as_json:
                _print_checked(one)
    except KeyboardInterrupt:
        give_up(f"interrupted after {_count(len(found), 'workbook')}")
    if as_json:
        print(json.dumps([asdict(one) for one in found], indent=2, ensure_ascii=False, default=str))
    if any(one.unread for one in found):
        raise typer.Exit(NOTHING_DONE)
    raise typer.Exit(DONE if all(one.passes for one in found) else DONE_WITH_ERRORS)


@app.command(name="list")
def list_functions(
    name: Annotated[str | None, typer.Argument(metavar="[NAME]", help="Print all about this function.")] = None,
    as_json: Json = False,
) -> None:
    """Print the functions in a table, or all about one of them."""
    from beamfuncs.catalogue import catalogue

    entries = catalogue()
    if name is None:
        if as_json:
            print(json.dumps([_as_data(entry) for entry in entries.values()], indent=2, ensure_ascii=False))
        else:
            _print_table(list(entries.values()))
        return
    entry = entries.get(name.casefold())
    if entry is None:
        give_up(f"no function is called {name}{_near_matches(name.casefold(), list(entries))}")
    elif as_json:
        print(json.dumps(_as_data(entry), indent=2, ensure_ascii=False))
    else:
        print(f"{entry.call}\n\n{entry.documentation}")


app.command()(serve)
app.add_typer(calc, name="calc")
app.add_typer(excel, name="excel")


@contextmanager
def _giving_up() -> Iterator[None]:
    """End with one line and the status for nothing done where a workbook cannot be filled, or at an interruption."""
    from beamfuncs.hosts.headless.filling import NotFilled

    try:
        yield
    except NotFilled as error:
        give_up(str(error))
    except KeyboardInterrupt:
        give_up("interrupted: nothing was written")


def _finish(report: Report, as_json: bool, action: str = "filled") -> NoReturn:
    """Print what was done, and end with the status that says whether some cell is in error."""
    if as_json:
        print(json.dumps(asdict(report), indent=2, ensure_ascii=False, default=str))
    else:
        _summarise(report, action=action)
    raise typer.Exit(DONE_WITH_ERRORS if report.errors else DONE)


def _print_view(book: Path, view: View) -> None:
    from rich.box import SIMPLE_HEAD
    from rich.console import Console
    from rich.table import Table
    from rich.text import Text

    from beamfuncs.hosts.headless.view import rows

    head, *body = rows(book, view)
    table = Table(box=SIMPLE_HEAD)
    for title in head:
        table.add_column(Text(title))
    notes = [row for row in body if len([word for word in row[1:] if word]) == 1 and len("".join(row[1:])) > LONG_WORDS]
    for row in body:
        if row not in notes:
            table.add_row(*map(Text, row))
    console = Console(highlight=False, width=None if sys.stdout.isatty() else PIPE_WIDTH)
    console.print(table)
    for number, *words in notes:
        console.print(Text(f"  {number}  {''.join(words)}"))


def _summarise(report: Report, action: str = "filled") -> None:
    from rich.console import Console
    from rich.text import Text

    console = Console(highlight=False, soft_wrap=True)
    done = f"{_count(report.beam_cells, 'beam cell')} {action}, {_count(report.recomputed, 'other cell')} recomputed"
    errors = (f"{_count(len(report.errors), 'cell')} in error", "red") if report.errors else ("no errors", "green")
    differ = f", {len(report.differences)} stored otherwise than computed" if report.differences else ""
    console.print(Text.assemble((str(report.target), "bold"), f": {done}, ", errors, differ))
    if report.original:
        console.print(Text(f"  as it was: {report.original}"))
    _print_faults(console, report.errors)
    _print_differences(console, report.differences)


def _print_checked(checked: Checked) -> None:
    from rich.console import Console
    from rich.text import Text

    from beamfuncs.hosts.headless import telling

    console = Console(highlight=False, soft_wrap=True)
    told = telling.summary(checked), "green" if checked.passes else "red"
    console.print(Text.assemble((str(checked.book), "bold"), ": ", told))
    for one in checked.stale[:LISTED]:
        console.print(Text(f"  {one.sheet}!{one.cell}  {telling.stale(one)}"))
    _print_rest(console, len(checked.stale))
    _print_faults(console, checked.errors)
    _print_differences(console, checked.differences)


def _print_faults(console: Console, faults: list[CellFault]) -> None:
    from rich.text import Text

    for fault in faults[:LISTED]:
        console.print(Text.assemble(f"  {fault.sheet}!{fault.cell}  ", (fault.value, "red"), f"  {fault.reason}"))
    _print_rest(console, len(faults))


def _print_differences(console: Console, differences: list[Difference]) -> None:
    """Print whose stored value is not the computed one, those that depend on volatile functions apart."""
    from rich.text import Text

    from beamfuncs.hosts.headless import telling

    for volatile in (False, True):
        listed = [one for one in differences if one.volatile is volatile]
        if listed and volatile:
            console.print("  depending on volatile functions:")
        for one in listed[:LISTED]:
            console.print(Text(f"  {one.sheet}!{one.cell}  {telling.difference(one)}"))
        _print_rest(console, len(listed))


def _print_rest(console: Console, count: int) -> None:
    if count > LISTED:
        console.print(f"  and {count - LISTED} more, which --json lists")


def _count(number: int, what: str) -> str:
    return f"{number} {what}" if number == 1 else f"{number} {what}s"


def _print_table(entries: list[Entry]) -> None:
    from rich.box import SIMPLE_HEAD
    from rich.console import Console
    from rich.table import Table
    from rich.text import Text

    table = Table("function", "arguments", "returns", box=SIMPLE_HEAD)
    for entry in entries:
        arguments = entry.call.partition("(")[2].removesuffix(")")
        table.add_row(entry.name, Text(arguments), Text(entry.summary.removeprefix("Return ")))
    width = None if sys.stdout.isatty() else PIPE_WIDTH
    Console(highlight=False, width=width).print(table)


def _as_data(entry: Entry) -> dict[str, object]:
    return {
        "name": entry.name,
        "call": entry.call,
        "arguments": [asdict(argument) for argument in entry.arguments],
        "returns": entry.returns,
        "summary": entry.summary,
        "documentation": entry.documentation,
    }


def _near_matches(name: str, names: list[str]) -> str:
    from difflib import get_close_matches

    near = get_close_matches(name, names)
    return f"; near it: {', '.join(near)}" if near else "; `beamfuncs list` prints them all"


@contextmanager
def _progress_bar() -> Iterator[Callable[[int, int], None]]:
    """Give a function to report progress to; it shows a bar on a terminal, once the work takes long."""
    if not sys.stderr.isatty():
        yield lambda done, of: None
        return
    from rich.console import Console
    from rich.progress import BarColumn, MofNCompleteColumn, Progress, TimeRemainingColumn

    columns = "beam cells", BarColumn(), MofNCompleteColumn(), TimeRemainingColumn()
    bar = Progress(*columns, console=Console(stderr=True), transient=True)
    task = bar.add_task("beam cells")
    began = time.monotonic()

    def progress(done: int, of: int) -> None:
        bar.update(task, completed=done, total=of)
        if not bar.live.is_started and time.monotonic() - began > PATIENCE:
            bar.start()

    try:
        yield progress
    finally:
        bar.stop()


if __name__ == "__main__":
    main()
