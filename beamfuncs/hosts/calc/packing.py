"""The extension, packed: the same catalogue gives the same bytes."""

from __future__ import annotations

import io
import zipfile
from pathlib import Path

from beamfuncs.hosts.calc import texts, typelibrary, xcu
from beamfuncs.hosts.calc.component import table

COMPONENT = Path(__file__).parent / "component"
PACKAGE = "pythonpath/beamfuncs_component"
"""The component as a package, in a folder of that name where the office's Python finds it."""
TABLE = f"{PACKAGE}/{table.FILE}"

_KIND = "application/vnd.sun.star."
REGISTERED = {
    "functions.rdb": f"{_KIND}uno-typelibrary;type=RDB",
    "uno_functions.py": f"{_KIND}uno-component;type=Python",
    "uno_jobs.py": f"{_KIND}uno-component;type=Python",
    "CalcAddIns.xcu": f"{_KIND}configuration-data",
    "Jobs.xcu": f"{_KIND}configuration-data",
}
"""What the office registers, and as what."""

_FIRST_DAY = 1980, 1, 1, 0, 0, 0


def contents() -> dict[str, bytes]:
    """Return the files of the extension."""
    written = {
        "META-INF/manifest.xml": texts.manifest(REGISTERED),
        "description.xml": texts.description(),
        "about.txt": texts.ABOUT,
        "CalcAddIns.xcu": xcu.functions(),
        "Jobs.xcu": xcu.jobs(),
        TABLE: texts.table(),
    }
    registered: list[Path] = []
    modules: list[Path] = []
    for path in sorted(COMPONENT.rglob("*.py")):
        (registered if path.name in REGISTERED else modules).append(path)
    return {
        **{name: text.encode() for name, text in written.items()},
        "functions.rdb": typelibrary.shipped(),
        **{path.name: path.read_bytes() for path in registered},
        **{f"{PACKAGE}/{path.relative_to(COMPONENT).as_posix()}": path.read_bytes() for path in modules},
    }


def packed() -> bytes:
    """Return the extension as the bytes of a file."""
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in contents().items():
            member = zipfile.ZipInfo(name, _FIRST_DAY)
            member.compress_type = zipfile.ZIP_DEFLATED
            member.create_system, member.external_attr = 3, 0o644 << 16
            archive.writestr(member, content)
    return stream.getvalue()
