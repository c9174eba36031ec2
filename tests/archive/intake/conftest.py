"""Relative tolerances are relative here."""

from __future__ import annotations

from tests.relative import relative_tolerances

__all__ = ["relative_tolerances"]
