"""The ways one unit is written: for sheets, UCUM, siunitx, LaTeX maths and pages."""

from __future__ import annotations

from schemas.unit_names import NAMES

__all__ = ["Factor", "latex", "siunitx", "spelled", "typographic", "ucum_code"]

Factor = tuple[str, str, int]
"""Prefix, name and exponent of one part of a unit."""

_RAISED = str.maketrans("0123456789-", "⁰¹²³⁴⁵⁶⁷⁸⁹⁻")


def _sides(factors: list[Factor]) -> tuple[list[Factor], list[Factor]]:
    return (
        [factor for factor in factors if factor[2] > 0],
        [(prefix, name, -power) for prefix, name, power in factors if power < 0],
    )


def _fraction(above: list[str], below: list[str], times: str) -> str:
    text = times.join(above) or "1"
    if not below:
        return text
    return f"{text}/{below[0]}" if len(below) == 1 else f"{text}/({times.join(below)})"


def spelled(factors: list[Factor]) -> str:
    """Return the one spelling used in sheets and columns, e.g. ``umol/m^2``."""
    above, below = _sides(factors)

    def one(factor: Factor) -> str:
        prefix, name, power = factor
        return prefix + name + (f"^{power}" if power != 1 else "")

    return _fraction([one(factor) for factor in above], [one(factor) for factor in below], " ")


def ucum_code(factors: list[Factor]) -> str:
    """Return the case-sensitive UCUM code, "" where UCUM has none, e.g. ``umol/m2``."""
    if any(not NAMES[name].ucum for _, name, _ in factors):
        return ""
    above, below = _sides(factors)

    def one(factor: Factor) -> str:
        prefix, name, power = factor
        return prefix + NAMES[name].ucum + (str(power) if power != 1 else "")

    return _fraction([one(factor) for factor in above], [one(factor) for factor in below], ".")


def _tex_name(prefix: str, name: str) -> str:
    return (r"\mbox{\textmu}" if prefix == "u" else prefix) + (NAMES[name].tex or name)


def latex(factors: list[Factor]) -> str:
    """Return the unit for LaTeX maths, to stand in an upright group."""
    if factors == [("", "1", 1)]:
        return ""
    return r"\,".join(
        _tex_name(prefix, name) + (f"^{{{power}}}" if power != 1 else "") for prefix, name, power in factors
    )


def siunitx(factors: list[Factor]) -> str:
    """Return the literal unit for siunitx, e.g. ``mol.m^{-2}``."""
    # A literal siunitx unit: "." separates, nothing is looked up, so no \DeclareSIUnit is needed.
    if factors == [("", "1", 1)]:
        return ""
    parts = []
    for prefix, name, power in factors:
        parts.append(_tex_name(prefix, name) + (f"^{{{power}}}" if power != 1 else ""))
    return ".".join(parts)


def typographic(factors: list[Factor]) -> str:
    """Return the unit for pages, with superscripts and middle dots; it needs no HTML escaping."""
    parts = []
    for prefix, name, power in factors:
        shown = NAMES[name].shown or name
        raised = "" if power == 1 else str(power).translate(_RAISED)
        parts.append(("µ" if prefix == "u" else prefix) + shown + raised)
    return "·".join(parts)
