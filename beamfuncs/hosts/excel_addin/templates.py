"""The workbooks that xlwings brings with it as templates, found without importing it."""

from __future__ import annotations

from importlib.util import find_spec
from pathlib import Path


def template(name: str) -> Path:
    """Return the file of a template, such as `quickstart.xlsm`."""
    spec = find_spec("xlwings")
    if spec is None or spec.origin is None:
        raise FileNotFoundError("xlwings is not installed: pip install beamfuncs brings it")
    path = Path(spec.origin).parent / name
    if not path.is_file():
        raise FileNotFoundError(f"this version of xlwings has no template {name}")
    return path
