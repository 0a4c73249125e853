"""Excel's end of the wire: xlwings' own COM server, served by pywin32 modules that are only as deep as it needs.

`installed()` lets the real `xlwings.udfs`, `xlwings.com_server` and `xlwings._xlwindows` run on any system, imported
anew together with `beamfuncs.hosts.excel`, and puts everything back. `call` asks as the add-in's VBA asks. A process
that is to end with Excel there takes `install()` alone.
"""

from __future__ import annotations

import atexit
import ctypes
import importlib
import logging
import sys
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager, suppress
from dataclasses import dataclass, field
from datetime import UTC, datetime, timedelta, tzinfo
from decimal import Decimal
from types import ModuleType, SimpleNamespace
from typing import Any, TypeAlias
from unittest import mock

SERVED = "beamfuncs.hosts.excel"
MISSING = -2147352572
"""What COM hands over for an argument that is left out (DISP_E_PARAMNOTFOUND)."""
ERRORS = {
    "#NULL!": 2000,
    "#DIV/0!": 2007,
    "#VALUE!": 2015,
    "#REF!": 2023,
    "#NAME?": 2029,
    "#NUM!": 2036,
    "#N/A": 2042,
    "#GETTING_DATA": 2043,
    "#SPILL!": 2045,
    "#CONNECT!": 2046,
    "#BLOCKED!": 2047,
    "#UNKNOWN!": 2048,
    "#FIELD!": 2049,
    "#CALC!": 2050,
}
"""The numbers of Excel's error values, as its documentation of XlCVError lists them."""
SHEET_ROWS, SHEET_COLUMNS = 1_048_576, 16_384
MOST_READ = 200_000
"""Reading more cells than this at once is refused: a whole column must be cut first."""


def error(value: str | int) -> int:
    """An error value as COM hands it over: an SCODE, a negative int."""
    code = value if isinstance(value, int) else ERRORS[value]
    return 0x800A0000 + code - (1 << 32)


# --- what stands in cells -------------------------------------------------------------------------


@dataclass(frozen=True)
class Money:
    """A number in a cell with a currency format: `Value` gives it as an amount cut to four decimals."""

    amount: float


@dataclass(frozen=True)
class Date:
    """A number in a cell with a date format: `Value` gives it as a moment with a time zone."""

    serial: float


Content: TypeAlias = "float | str | bool | Money | Date | None"
"""What a cell holds; an int is an error value as `error` makes it."""


class Moment(datetime):
    """The type that pywin32 gives dates."""


def _value(content: Content) -> object:
    if isinstance(content, Money):
        return Decimal(round(content.amount * 10_000)) / 10_000
    if isinstance(content, Date):
        day = datetime(1899, 12, 30) + timedelta(days=content.serial)
        return Moment(*day.timetuple()[:6], tzinfo=UTC)
    return content


def _value2(content: Content) -> object:
    if isinstance(content, Money):
        return content.amount
    return content.serial if isinstance(content, Date) else content


# --- Excel's objects ------------------------------------------------------------------------------


@dataclass
class Sheet:
    """A worksheet: what stands in its cells, by row and column."""

    contents: dict[tuple[int, int], Content] = field(default_factory=dict)
    Name: str = "Plan"

    @property
    def Parent(self) -> Any:
        """The workbook."""
        application = SimpleNamespace(Hwnd=1, Version="16.0")
        return SimpleNamespace(Name="Kestrel Quay.xlsx", Application=application)

    @property
    def Cells(self) -> Range:
        """All cells."""
        return Range(self, 1, 1, SHEET_ROWS, SHEET_COLUMNS)

    @property
    def UsedRange(self) -> Range:
        """The smallest rectangle that holds all that stands in the sheet."""
        rows, columns = zip(*(self.contents or {(1, 1): None}), strict=True)
        return Range(self, min(rows), min(columns), max(rows) - min(rows) + 1, max(columns) - min(columns) + 1)

    def Range(self, first: Range, last: Range) -> Range:
        """The rectangle between two cells."""
        return Range(self, first.Row, first.Column, last.Row - first.Row + 1, last.Column - first.Column + 1)


class Range:
    """A reference to cells, as pywin32 shows it.

    `Resize` and `Offset` are properties whose arguments may all be left out: pywin32 reads such a property without
    them, so that `Resize(2, 1)` is the cell in row 2 of the range as it was; the sizes go to `GetResize`.
    """

    def __init__(self, sheet: Sheet, row: int, column: int, rows: int, columns: int, areas: int = 1) -> None:
        self.Worksheet = self.Parent = sheet
        self.Row, self.Column = row, column
        self.Rows, self.Columns = SimpleNamespace(Count=rows), SimpleNamespace(Count=columns)
        self.Areas = SimpleNamespace(Count=areas)
        self._oleobj_ = Dispatched(self)

    @property
    def Application(self) -> Any:
        """Excel."""
        return self.Worksheet.Parent.Application

    @property
    def Count(self) -> int:
        """The number of cells."""
        return int(self.Rows.Count * self.Columns.Count)

    CountLarge = Count

    @property
    def Resize(self) -> Range:
        """The range itself, for want of arguments."""
        return self

    Cells = Offset = Resize

    def GetResize(self, rows: int, columns: int) -> Range:
        """The range with the same first cell and another size."""
        return Range(self.Worksheet, self.Row, self.Column, rows, columns)

    def __call__(self, row: int, column: int = 1) -> Range:
        """One cell, counted from the first of the range."""
        return Range(self.Worksheet, self.Row + row - 1, self.Column + column - 1, 1, 1)

    @property
    def Value(self) -> object:
        """What stands in the cells, money and dates as such."""
        return self._read(_value)

    @property
    def Value2(self) -> object:
        """What stands in the cells, money and dates as plain numbers."""
        return self._read(_value2)

    def _read(self, plain: Callable[[Content], object]) -> object:
        assert self.Count <= MOST_READ, f"{self.Count} cells are read at once"
        held = self.Worksheet.contents
        rows = tuple(
            tuple(plain(held.get((i, j))) for j in range(self.Column, self.Column + self.Columns.Count))
            for i in range(self.Row, self.Row + self.Rows.Count)
        )
        return rows if self.Count > 1 else rows[0][0]


def cells(rows: Sequence[Sequence[Content]], row: int = 1, column: int = 1, areas: int = 1) -> Range:
    """A reference to cells that hold these rows, on a sheet of their own."""
    contents = {(row + i, column + j): cell for i, line in enumerate(rows) for j, cell in enumerate(line)}
    return Range(Sheet(contents), row, column, len(rows), len(rows[0]), areas)


def cell(content: Content) -> Range:
    """A reference to one cell."""
    return cells([[content]])


@dataclass(frozen=True)
class Dispatched:
    """The bare pointer to an object of Excel's that comes over the wire, before pywin32 wraps it."""

    pointed_at: Range

    def GetTypeInfo(self) -> Any:
        """What the object says of itself."""
        attributes = SimpleNamespace(iid="{00020846-0000-0000-C000-000000000046}")
        return SimpleNamespace(GetDocumentation=lambda _: ("Range",), GetTypeAttr=lambda: attributes)


# --- pywin32 --------------------------------------------------------------------------------------


class ComError(Exception):
    """A call that COM refuses."""

    hresult = 0


class _Zone(tzinfo):
    """`TimeZoneInfo`, of which only the zone of all cells is asked for."""

    utc = staticmethod(lambda: UTC)


def _unwrapped(_: object) -> object:
    raise ComError("no object of this process")


def _pywin32() -> dict[str, ModuleType]:
    """New modules, each with what xlwings takes from it."""
    held: dict[str, dict[str, object]] = {
        "pywintypes": {"com_error": ComError, "error": ComError, "IID": str, "TimeType": Moment},
        "pythoncom": {
            "com_error": ComError,
            "ole_error": ComError,
            "CoInitialize": lambda: None,
            "IID_IDispatch": "{00020400-0000-0000-C000-000000000046}",
            "IID_IEnumVARIANT": "{00020404-0000-0000-C000-000000000046}",
            "TypeIIDs": {"{00020400-0000-0000-C000-000000000046}": Dispatched},
            "__file__": "pythoncom311.dll",
        },
        "win32api": {},
        "win32con": {},
        "win32event": {},
        "win32gui": {},
        "win32process": {"GetWindowThreadProcessId": lambda window: (1, 4711)},
        "win32timezone": {"TimeZoneInfo": _Zone},
        "win32com": {"__path__": []},
        "win32com.client": {
            "CDispatch": type("CDispatch", (), {}),
            "CoClassBaseClass": type("CoClassBaseClass", (), {}),
            "DispatchBaseClass": type("DispatchBaseClass", (), {}),
            "Dispatch": lambda pointer, userName=None: pointer.pointed_at,
            "DispatchEx": _unwrapped,
        },
        "win32com.server": {"__path__": []},
        "win32com.server.dispatcher": {},
        "win32com.server.exception": {"COMException": ComError},
        "win32com.server.policy": {},
        "win32com.server.util": {"wrap": lambda held, iid=None: held, "unwrap": _unwrapped},
    }
    modules = {}
    for name, attributes in held.items():
        modules[name] = module = ModuleType(name)
        vars(module).update(attributes)
        above, _, last = name.rpartition(".")
        if above:
            setattr(modules[above], last, module)
    return modules


def install() -> ModuleType:
    """Import xlwings as on Windows, and the module that it serves, anew; return that module."""
    import xlwings  # noqa: F401  # what xlwings imports is to see the true platform

    with suppress(ImportError):
        import PIL.ImageGrab  # noqa: F401
    _forget()
    sys.modules.update(_pywin32())
    ctypes.windll, ctypes.oledll = mock.MagicMock(), mock.MagicMock()  # type: ignore[attr-defined]
    with mock.patch.object(sys, "platform", "win32"), mock.patch.object(ctypes, "PyDLL"):
        windows = importlib.import_module("xlwings._xlwindows")
    atexit.unregister(windows.cleanup)  # it would look for Excel processes
    return importlib.import_module(SERVED)


@contextmanager
def installed() -> Iterator[ModuleType]:
    """Install for a while; afterwards the modules, `ctypes` and the log are as they were before."""
    package = importlib.import_module(SERVED.rpartition(".")[0])
    before = {name: module for name, module in sys.modules.items() if _ours(name)}
    attributes = [(ctypes, "windll"), (ctypes, "oledll"), (package, SERVED.rpartition(".")[2])]
    held = [(where, name, vars(where).get(name)) for where, name in attributes]
    try:
        yield install()
    finally:
        close_log()
        server = sys.modules.get("xlwings.com_server")
        if server is not None:
            server.loop.close()
        _forget()
        sys.modules.update(before)
        for where, name, value in held:
            if value is not None:
                setattr(where, name, value)
            elif name in vars(where):
                delattr(where, name)


def close_log() -> None:
    """Close the log that the served module writes, so that it opens one anew."""
    log = logging.getLogger(SERVED)
    for handler in list(log.handlers):
        log.removeHandler(handler)
        with suppress(OSError):
            handler.close()
    log.propagate = True


def _forget() -> None:
    for name in [name for name in sys.modules if _ours(name)]:
        del sys.modules[name]


def _ours(name: str) -> bool:
    return name == SERVED or name.partition(".")[0] in {"xlwings", *_pywin32()}


# --- calls ----------------------------------------------------------------------------------------


def call(function: str, *arguments: object) -> Any:
    """What the add-in gets for a call: a value, a list for one row, or a list of rows."""
    server = sys.modules["xlwings.com_server"]
    wire = tuple(a._oleobj_ if isinstance(a, Range) else a for a in arguments)
    return server.XLPython().CallUDF(SERVED, function, wire)


def rows_of(result: object) -> list[list[object]]:
    """A result as the rows of cells that the add-in fills with it, error codes still being ints."""
    if not isinstance(result, (list, tuple)):
        return [[result]]
    return [list(row) for row in result] if isinstance(result[0], (list, tuple)) else [list(result)]
