"""The cells of an .ods that call our functions, without their formulas: an office that lacks these shows errors."""

from __future__ import annotations

import re
from html import escape, unescape

from beamfuncs.catalogue import catalogue
from beamfuncs.hosts.calc.component.errors import CODES
from beamfuncs.hosts.calc.component.formulas import calls_to, shortened
from beamfuncs.hosts.calc.naming import long_name

_CELL = re.compile(r'<table:table-cell\b[^<>]*\btable:formula="(?P<formula>[^"]*)"[^<>]*>')
_NO_LONGER = re.compile(r'\s(?:table:formula|table:number-matrix-(?:columns|rows)-spanned)="[^"]*"')
_ERROR = 'calcext:value-type="error"'
_SHOWN = re.compile(r"\s*<text:p>([^<]*)</text:p>")
_NOTED = re.compile(r"\s*<office:annotation\b")
_PREFIX = re.compile(r"^[\w-]+:(?==)")


def frozen(content: bytes) -> tuple[bytes, int]:
    """Return a workbook's content in which the cells that call a function hold their value alone, and how many did.

    The formula is kept in a note, but for a cell that has a note of its own. An error stays an error.
    """
    names = {long_name(name): name for name in catalogue()}
    calls, long_calls, short = calls_to(catalogue()), calls_to(names), shortened(names)
    text, count = content.decode(), 0

    def value_alone(found: re.Match[str]) -> str:
        nonlocal count
        formula = unescape(found["formula"])
        if not (calls(formula) or long_calls(formula)):
            return found[0]
        count += 1
        tag = _NO_LONGER.sub("", found[0])
        if _ERROR in tag:
            shown = _SHOWN.match(text, found.end())
            error = shown[1] if shown and shown[1] in CODES else "#VALUE!"
            tag = tag.replace("<table:table-cell", f'<table:table-cell table:formula="of:={error}"', 1)
        return tag if _NOTED.match(text, found.end()) else _with_note(tag, short(_PREFIX.sub("", formula)))

    return _CELL.sub(value_alone, text).encode(), count


def _with_note(tag: str, formula: str) -> str:
    words = f"beamfuncs computed this value from {formula}"
    note = f"<office:annotation><text:p>{escape(words, quote=False)}</text:p></office:annotation>"
    return f"{tag[:-2]}>{note}</table:table-cell>" if tag.endswith("/>") else tag + note
