"""The names by which the office knows the extension, its types and its functions."""

from __future__ import annotations

EXTENSION = "beamfuncs.calc"
"""The identifier of the extension, and the module of its types."""
SERVICE = f"{EXTENSION}.Functions"
INTERFACE = f"{EXTENSION}.XFunctions"
LOADED, SAVED = f"{EXTENSION}.Loaded", f"{EXTENSION}.Saved"
"""The jobs for a workbook that was loaded, and for one that was saved."""
FILE_NAME = "beamfuncs.oxt"


def method(function: str) -> str:
    """Return the name of a function's method, the language of the types having no underscores.

    >>> method("moment_at")
    'momentAt'
    """
    first, *rest = function.split("_")
    return first + "".join(word.capitalize() for word in rest)


def long_name(function: str) -> str:
    """Return the name that the office writes into files in place of a function's own.

    >>> long_name("moment_at")
    'BEAMFUNCS.CALC.FUNCTIONS.MOMENTAT'
    """
    return f"{SERVICE}.{method(function)}".upper()
