"""The extension's own description, its list of contents, and the table of functions that its component reads."""

from __future__ import annotations

import json
from collections.abc import Mapping
from importlib.metadata import version
from xml.sax.saxutils import escape, quoteattr

from beamfuncs.catalogue import catalogue
from beamfuncs.hosts.calc.idl import gives_rows
from beamfuncs.hosts.calc.naming import EXTENSION, INTERFACE, LOADED, SAVED, SERVICE, method
from beamfuncs.hosts.excel_addin.places import ADDIN

OLDEST_OFFICE = "7.2"
TITLE = "beamfuncs: worksheet functions for beams"
ABOUT = (
    "Worksheet functions that solve any line beam exactly, from the cells where its spans, supports and loads stand.\n"
    "The numbers come from the Python package beamfuncs, which must be installed for the same user.\n"
    "Verify results by independent means.\n"
)


def description() -> str:
    """Return the description by which the office lists the extension, and refuses it where the office is too old."""
    return f"""<?xml version="1.0" encoding="UTF-8"?>
<description xmlns="http://openoffice.org/extensions/description/2006"
    xmlns:d="http://openoffice.org/extensions/description/2006"
    xmlns:l="http://libreoffice.org/extensions/description/2011"
    xmlns:xlink="http://www.w3.org/1999/xlink">
<identifier value="{EXTENSION}"/>
<version value="{version("beamfuncs")}"/>
<dependencies>
<l:LibreOffice-minimal-version d:name="LibreOffice {OLDEST_OFFICE}" value="{OLDEST_OFFICE}"/>
</dependencies>
<display-name><name lang="en">{escape(TITLE)}</name></display-name>
<extension-description><src xlink:href="about.txt" lang="en"/></extension-description>
</description>
"""


def manifest(kinds: Mapping[str, str]) -> str:
    """Return the list of what the office registers, in this order: the types come before what uses them."""
    entries = "".join(
        f"<manifest:file-entry manifest:full-path={quoteattr(name)} manifest:media-type={quoteattr(kind)}/>\n"
        for name, kind in kinds.items()
    )
    space = "http://openoffice.org/2001/manifest"
    head = '<?xml version="1.0" encoding="UTF-8"?>\n'
    return f'{head}<manifest:manifest xmlns:manifest="{space}">\n{entries}</manifest:manifest>\n'


def table() -> str:
    """Return what the component knows of the functions, as JSON."""
    functions = {
        method(entry.name): {
            "name": entry.name,
            "summary": entry.summary,
            "category": entry.category,
            "rows": gives_rows(entry),
            "arguments": [[a.name, a.help] for a in entry.arguments],
            "repeats": any(a.repeats for a in entry.arguments),
        }
        for entry in catalogue().values()
    }
    names = {"service": SERVICE, "interface": INTERFACE, "loaded": LOADED, "saved": SAVED, "addin": ADDIN}
    known = {"version": version("beamfuncs"), **names, "functions": functions}
    return json.dumps(known, indent=1, ensure_ascii=False) + "\n"
