"""Checks that every cooldown passes through before it is archived."""

from archive.intake.checks.check import Check, History
from archive.intake.checks.registry import CHECKS, all_checks, run_checks

__all__ = ["CHECKS", "Check", "History", "all_checks", "run_checks"]
