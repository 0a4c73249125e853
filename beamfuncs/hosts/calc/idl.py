"""The types of the functions, in the language from which the office's type library is built."""

from __future__ import annotations

from beamfuncs.catalogue import Argument, Entry, catalogue
from beamfuncs.hosts.calc.naming import EXTENSION, INTERFACE, SERVICE, method

CELL, CELLS, ROWS = "any", "sequence<any>", "sequence< sequence<any> >"
"""One argument (a number, a text, a range, or nothing where it is left out); any number of them; rows of cells."""


def source() -> str:
    """Return the source of the type library: an interface with one method a function."""
    *modules, interface = INTERFACE.split(".")
    methods = "".join(f"    {_declaration(entry)};\n" for entry in catalogue().values())
    opening = " ".join(f"module {name} {{" for name in modules)
    closing = " ".join("};" for _ in modules)
    service = SERVICE.removeprefix(f"{EXTENSION}.")
    return (
        f"{opening}\n"
        f"interface {interface}: com::sun::star::uno::XInterface {{\n{methods}}};\n"
        f"service {service} {{ interface {interface}; }};\n"
        f"{closing}\n"
    )


def _declaration(entry: Entry) -> str:
    arguments = ", ".join(_parameter(argument) for argument in entry.arguments)
    return f"{ROWS if gives_rows(entry) else CELL} {method(entry.name)}({arguments})"


def _parameter(argument: Argument) -> str:
    return f"[in] {CELLS if argument.repeats else CELL} {method(argument.name)}"


def gives_rows(entry: Entry) -> bool:
    """Tell whether the result can be more than one cell: the office takes an array from a method of that type alone."""
    return "array" in entry.returns
