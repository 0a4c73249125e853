"""Whom to believe where a workbook stores another value than is computed for it."""

from __future__ import annotations

from enum import StrEnum


class Trust(StrEnum):
    """Whose value is taken where the stored one of an ordinary cell and the formula engine's differ."""

    STORED = "stored"
    ENGINE = "engine"
