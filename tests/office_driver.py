"""A script for the Python that knows the office: starts one without a window and does what lines of JSON ask of it.

python office_driver.py SOFFICE PROFILE FOLDER_OF_REMOTE
"""

from __future__ import annotations

import json
import sys
import time
from pathlib import Path
from typing import Any

NUMBER, TEXT, ERROR = 1, 2, 4
"""What a formula gives, in the office's numbers."""


class Driver:
    """The office with its open workbooks, by number."""

    def __init__(self, soffice: str, profile: str) -> None:
        from remote import Remote

        self.office = Remote(Path(soffice), Path(profile))
        self.books: dict[int, Any] = {}

    def new(self) -> int:
        """Open an empty workbook."""
        return self._keep(self._load("private:factory/scalc"))

    def open(self, path: str) -> int:
        """Open a workbook."""
        book = self._load(Path(path).as_uri())
        assert book is not None, f"{path} is not opened"
        return self._keep(book)

    def close(self, book: int) -> None:
        """Close a workbook."""
        self.books.pop(book).close(True)

    def sheets(self, book: int) -> list[str]:
        """The names of the sheets."""
        return list(self.books[book].Sheets.ElementNames)

    def add_sheet(self, book: int, name: str) -> None:
        """Put a sheet behind the others."""
        self.books[book].Sheets.insertNewByName(name, self.books[book].Sheets.Count)

    def enter(self, book: int, cells: dict[str, Any], sheet: str | int = 0) -> None:
        """Enter formulas, texts and numbers by the names of their cells, None empties one."""
        for place, content in cells.items():
            cell = self._range(book, sheet, place)
            if isinstance(content, (int, float)):
                cell.setValue(content)
            elif content is None or content.startswith("="):
                cell.setFormula(content or "")
            else:
                cell.setString(content)

    def enter_array(self, book: int, place: str, formula: str, sheet: str | int = 0) -> None:
        """Enter an array formula into a range."""
        self._range(book, sheet, place).setArrayFormula(formula)

    def enter_block(self, book: int, place: str, formulas: list[list[str]], sheet: str | int = 0) -> None:
        """Enter formulas into a range at once."""
        self._range(book, sheet, place).setFormulaArray(tuple(map(tuple, formulas)))

    def read(self, book: int, place: str, sheet: str | int = 0) -> list[list[Any]]:
        """What the cells of a range show: numbers, texts, null for blank, `[code, shown]` for an error."""
        cells = self._range(book, sheet, place)
        return [
            [data or self._shown(cells.getCellByPosition(j, i)) for j, data in enumerate(row)]
            for i, row in enumerate(cells.getDataArray())
        ]

    def data(self, book: int, place: str, sheet: str | int = 0) -> list[list[Any]]:
        """The numbers and texts of a range, fast; an error is null."""
        return [list(row) for row in self._range(book, sheet, place).getDataArray()]

    def formulas(self, book: int, place: str, sheet: str | int = 0) -> list[list[str]]:
        """The formulas of a range."""
        return [list(row) for row in self._range(book, sheet, place).getFormulaArray()]

    def property(self, book: int, place: str, name: str) -> str:
        """A property of a range."""
        value = self._range(book, 0, place).getPropertyValue(name)
        return str(getattr(value, "value", value))

    def format(self, book: int, place: str) -> str:
        """The number format of a range."""
        key = int(self.property(book, place, "NumberFormat"))
        return str(self.books[book].getNumberFormats().getByKey(key).FormatString)

    def paint(self, book: int, place: str, colour: int, sheet: str | int = 0) -> None:
        """Give the cells of a range a ground."""
        self._range(book, sheet, place).CellBackColor = colour

    def note(self, book: int, place: str) -> str:
        """The note on a cell."""
        return str(self._range(book, 0, place).getAnnotation().getString())

    def is_protected(self, book: int) -> bool:
        """Whether the first sheet is protected."""
        return bool(self._sheet(book, 0).isProtected())

    def calculate(self, book: int) -> None:
        """Compute the formulas whose cells have changed."""
        self.books[book].calculate()

    def recalculate(self, book: int) -> float:
        """Compute every formula; return the seconds that it took."""
        began = time.perf_counter()
        self.books[book].calculateAll()
        return time.perf_counter() - began

    def save_as(self, book: int, path: str, kind: str) -> list[list[str]]:
        """Save a workbook under a name; return the answers that the office would take to each question it asks."""
        return self._asked("storeAsURL", book, path, kind)

    def export(self, book: int, path: str, kind: str) -> list[list[str]]:
        """Save a copy of a workbook."""
        return self._asked("storeToURL", book, path, kind)

    def save(self, book: int) -> list[list[str]]:
        """Save a workbook where it is; return the answers that the office would take to each question it asks."""
        asked, handler = self._handler()
        self.books[book].storeSelf(self._values(InteractionHandler=handler))
        return asked

    def is_modified(self, book: int) -> bool:
        """Whether the workbook counts as changed."""
        return bool(self.books[book].isModified())

    def undone(self, book: int) -> list[str]:
        """What can be undone."""
        return list(self.books[book].getUndoManager().getAllUndoActionTitles())

    def named(self, book: int) -> list[str]:
        """The names that are defined."""
        return list(self.books[book].NamedRanges.ElementNames)

    def name(self, book: int, name: str, content: str) -> None:
        """Give a formula a name."""
        from com.sun.star.table import CellAddress

        self.books[book].NamedRanges.addNewByName(name, content, CellAddress(0, 0, 0), 0)

    def calculates_itself(self, book: int, itself: bool | None = None) -> bool:
        """Whether the workbook computes by itself, after it has been told so."""
        if itself is not None:
            self.books[book].enableAutomaticCalculation(itself)
        return bool(self.books[book].isAutomaticCalculationEnabled())

    def texts(self, names: list[str]) -> dict[str, Any]:
        """What the office's function wizard shows of functions, by name: their help, and that of their arguments."""
        described = self.office.service("com.sun.star.sheet.FunctionDescriptions")
        found = {}
        for name in names:
            known = {one.Name: one.Value for one in described.getByName(name)}
            found[name] = known["Description"], [(a.Name, a.Description) for a in known["Arguments"] or ()]
        return found

    def names(self) -> list[str]:
        """The names of all functions that the office has."""
        described = self.office.service("com.sun.star.sheet.FunctionDescriptions")
        shown = ({one.Name: one.Value for one in described.getByIndex(n)} for n in range(described.Count))
        return [known["Name"].upper() for known in shown]

    def process(self) -> int:
        """The office's process."""
        return self.office.process.pid

    def _keep(self, document: Any) -> int:
        number = max(self.books, default=0) + 1
        self.books[number] = document
        return number

    def _load(self, url: str) -> Any:
        return self.office.desktop.loadComponentFromURL(url, "_blank", 0, self._values(Hidden=True))

    def _asked(self, how: str, book: int, path: str, kind: str) -> list[list[str]]:
        asked, handler = self._handler()
        values = self._values(FilterName=kind, InteractionHandler=handler, Overwrite=True)
        getattr(self.books[book], how)(Path(path).as_uri(), values)
        return asked

    def _values(self, **values: Any) -> tuple[Any, ...]:
        from com.sun.star.beans import PropertyValue

        return tuple(PropertyValue(name, 0, value, 0) for name, value in values.items())

    def _handler(self) -> tuple[list[list[str]], Any]:
        """What writes down the office's questions and agrees."""
        import uno
        import unohelper
        from com.sun.star.task import XInteractionHandler2

        asked: list[list[str]] = []
        approval = uno.getTypeByName("com.sun.star.task.XInteractionApprove")

        class Handler(unohelper.Base, XInteractionHandler2):
            def handle(self, request: Any) -> None:
                self.handleInteractionRequest(request)

            def handleInteractionRequest(self, request: Any) -> bool:
                asked.append([type(one).__name__ for one in request.getContinuations()])
                for continuation in request.getContinuations():
                    if continuation.queryInterface(approval) is not None:
                        continuation.select()
                        return True
                return False

        return asked, Handler()

    def _sheet(self, book: int, sheet: str | int) -> Any:
        sheets = self.books[book].Sheets
        return sheets.getByIndex(sheet) if isinstance(sheet, int) else sheets.getByName(sheet)

    def _range(self, book: int, sheet: str | int, place: str) -> Any:
        return self._sheet(book, sheet).getCellRangeByName(place)

    def _shown(self, cell: Any) -> Any:
        kind = cell.Type.value
        if kind == "EMPTY":
            return None
        if kind == "TEXT":
            return cell.getString()
        if kind == "FORMULA":
            if cell.getError():
                return [cell.getError(), cell.getString()]
            if cell.FormulaResultType2 == TEXT:
                return cell.getString()
        return cell.getValue()


def main(soffice: str, profile: str, folder: str) -> None:
    """Answer requests, one a line, until there are no more."""
    sys.path.insert(0, folder)
    driver = Driver(soffice, profile)
    try:
        print(json.dumps({"answer": "ready"}), flush=True)
        for line in sys.stdin:
            name, arguments, named = json.loads(line)
            try:
                told = {"answer": getattr(driver, name)(*arguments, **named)}
            except Exception as error:
                told = {"error": f"{type(error).__name__}: {error}"}
            print(json.dumps(told), flush=True)
    finally:
        for book in list(driver.books):
            driver.close(book)
        driver.office.end()


if __name__ == "__main__":
    main(*sys.argv[1:])
