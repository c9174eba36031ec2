"""What sweeps can be searched by: one list for the command and for the page.

Rules: the order is that of the help and of the form; a text is said once, here; nothing heavy is imported, so that the
help of the command is there at once.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, Literal

__all__ = ["SEARCH_FIELDS", "SWEEP_KINDS", "FieldForm", "SearchField"]

FieldForm = Literal["words", "range", "result", "name", "choice", "either", "moment", "flag"]
"""Free words; a range with its unit; a result with a range; a name or address; one of some; one of two or neither; a date; yes."""

SWEEP_KINDS: Final = (
    "temperature-sweep",
    "dose-run",
    "drive-sweep",
    "frequency-sweep",
    "ringdown",
    "pulse-response",
    "drive-pulse",
    "isotherm",
    "heat-capacity",
    "persistent-current",
    "calibration",
    "log",
)
"""The kinds of `schemas.sweep`, written out here so that the help needs no schemas."""


@dataclass(frozen=True)
class SearchField:
    """One thing to search by.

    Attributes
    ----------
    name : str
        Option (`--empty-cell`), field of the page and key of the query.
    form : str
        What is written into it.
    help : str
        What it asks for, with an example.
    choices : tuple of str
        Of a choice, what it may be; of `either`, the words for yes and for no.
    example : str
        What an empty field shows.
    several : bool
        Whether it may be given more than once; all must hold.
    default : str
        What holds where nothing is chosen.
    """

    name: str
    form: FieldForm
    help: str
    choices: tuple[str, ...] = ()
    example: str = ""
    several: bool = False
    default: str = ""


SEARCH_FIELDS: Final[tuple[SearchField, ...]] = (
    SearchField("words", "words", "Words that all occur in names, notes and descriptions.", example="polyimide"),
    SearchField("coverage", "range", 'Coverage during the sweep, such as "20:35 umol/m^2"; any coverage unit.', example="20:35 umol/m^2"),
    SearchField("temperature", "range", 'Temperatures that the sweep reaches into, such as "0.4:0.8 K".', example="0.4:0.8 K"),
    SearchField("result", "result", 'A result of the newest reductions, such as "T_KT=0.4:0.6 K"; the name alone: it is there. Repeatable.', example="T_KT=0.4:0.6 K", several=True),
    SearchField("cell", "name", "Cell, by name (all revisions) or address (TO-4.r2).", example="TO-4"),
    SearchField("substrate", "name", "Substrate, by name or address; also what layers are counted on.", example="PI-2200"),
    SearchField("sample", "name", "Gas, by name or address."),
    SearchField("thermometer", "name", "Thermometer, by name or address.", example="RX-2"),
    SearchField("scale", "name", "Temperature scale, such as PLTS-2000.", example="PLTS-2000"),
    SearchField("kind", "choice", f"Kind of sweep: {', '.join(SWEEP_KINDS)}.", SWEEP_KINDS),
    SearchField("plan", "name", "Plan that a reduction of the sweep followed.", example="film-transition"),
    SearchField("cooldown", "name", "Only this cooldown.", example="2026-03"),
    SearchField("empty_cell", "either", "Only runs of the empty cell, or only others.", ("empty-cell", "with-gas")),
    SearchField("since", "moment", "Sweeps that end at or after a date (from midnight UTC) or RFC 3339 time.", example="2026-01-01"),
    SearchField("until", "moment", "Sweeps that begin at or before it; a date alone counts to its end.", example="2026-12-31"),
    SearchField("sort", "choice", "Order of the list.", ("date", "coverage", "temperature", "cell", "name"), default="date"),
    SearchField("descending", "flag", "Largest, or latest, first."),
    SearchField("withdrawn", "flag", "Withdrawn sweeps too, marked."),
)  # fmt: skip
"""Every field of a search."""
