"""The cells of an .ods that call our functions, without their formulas: an office that lacks these shows errors."""

from __future__ import annotations

import re
from collections.abc import Callable
from html import escape, unescape

from beamfuncs.catalogue import catalogue
from beamfuncs.hosts.calc.component.errors import CODES
from beamfuncs.hosts.calc.component.formulas import calls_to, shortened, uses_of
from beamfuncs.hosts.calc.naming import long_name

_TAG = re.compile(r"<table:(?P<kind>table|table-row|table-cell|covered-table-cell)(?![\w-])[^<>]*>")
_NAMED = re.compile(r"<table:named-expression\b[^<>]*>")
_NO_LONGER = re.compile(r'\s(?:table:formula|table:number-matrix-(?:columns|rows)-spanned)="[^"]*"')
_ERROR = 'calcext:value-type="error"'
_SHOWN = re.compile(r"(?:\s*<office:annotation\b.*?</office:annotation>)?\s*<text:p>([^<]*)</text:p>", re.DOTALL)
_NOTED = re.compile(r"\s*<office:annotation\b")
_PREFIX = re.compile(r"^[\w-]+:(?==)")


def frozen(content: bytes) -> tuple[bytes, int]:
    """Return a workbook's content in which the cells that call a function hold their value alone, and how many did.

    The formula is kept in a note, but for a cell that has a note of its own. An error stays an error, each of an array.
    """
    text, count = content.decode(), 0
    calls, short = _calls(text), shortened({long_name(name): name for name in catalogue()})
    row = column = height = 0
    arrays: set[tuple[int, int]] = set()  # the places of the sheet whose array formula gives way

    def value_alone(found: re.Match[str]) -> str:
        nonlocal count, row, column, height
        tag = found[0]
        if found["kind"] == "table":
            row = height = 0
            arrays.clear()
        elif found["kind"] == "table-row":
            row, column, height = row + height, 0, _number(tag, "number-rows-repeated")
        else:
            place = row, column
            column += _number(tag, "number-columns-repeated")
            formula = _attribute(tag, "formula")
            if formula and calls(formula):
                count += 1
                rows, columns = (_number(tag, f"number-matrix-{way}-spanned") for way in ("rows", "columns"))
                arrays.update((row + i, place[1] + j) for i in range(rows) for j in range(columns))
                tag = _with_error(_NO_LONGER.sub("", tag), text, found.end())
                return tag if _NOTED.match(text, found.end()) else _with_note(tag, short(_PREFIX.sub("", formula)))
            if not formula and place in arrays:
                return _with_error(tag, text, found.end())
        return tag

    return _TAG.sub(value_alone, text).encode(), count


def _calls(text: str) -> Callable[[str], bool]:
    """Return a test of whether a formula calls a function, itself or by way of formulas that have a name."""
    plain, long = calls_to(catalogue()), calls_to(map(long_name, catalogue()))
    named = {_attribute(tag, "name"): _attribute(tag, "expression") for tag in _NAMED.findall(text)}
    ours: set[str] = set()

    def calls(formula: str) -> bool:
        return plain(formula) or long(formula) or uses_of(ours)(formula)

    while found := {name for name in named.keys() - ours if calls(named[name])}:
        ours |= found
    return calls


def _attribute(tag: str, name: str) -> str:
    found = re.search(rf'\stable:{name}="([^"]*)"', tag)
    return unescape(found[1]) if found else ""


def _number(tag: str, name: str) -> int:
    return int(_attribute(tag, name) or 1)


def _with_error(tag: str, text: str, end: int) -> str:
    """Return the tag of a cell with the error that it shows as its formula, where it shows one."""
    if _ERROR not in tag:
        return tag
    shown = _SHOWN.match(text, end)
    error = shown[1] if shown and shown[1] in CODES else "#VALUE!"
    return tag.replace("<table:table-cell", f'<table:table-cell table:formula="of:={error}"', 1)


def _with_note(tag: str, formula: str) -> str:
    words = f"beamfuncs computed this value from {formula}"
    note = f"<office:annotation><text:p>{escape(words, quote=False)}</text:p></office:annotation>"
    return f"{tag[:-2]}>{note}</table:table-cell>" if tag.endswith("/>") else tag + note
