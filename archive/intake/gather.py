"""Rows of one sweep as they stream by: statistics of all, values of some, all of them to the sealed file."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from archive.intake.beside import Beside
from archive.intake.dialect import Block
from archive.intake.reading import LISTED, ChannelFacts, SweepTable
from archive.store.interface import Column, TableWriter
from schemas.sweep import Channel, Sweep
from schemas.units import ucum

__all__ = ["Gatherer", "stored_columns"]

KEPT_ROWS = 262_144
"""Rows of one sweep kept in memory for the checks; beyond that every second, fourth, ... row is kept."""


class Gatherer:
    """Rows of one sweep as they stream by: statistics of all, values of some, all of them to the sealed file."""

    def __init__(
        self,
        channels: dict[str, Channel],
        factors: dict[str, float],
        table: TableWriter | None,
        beside: Beside,
    ) -> None:
        self.channels = channels
        self.factors = factors
        self.table = table
        self.facts = {name: ChannelFacts() for name in channels}
        self.digests = {name: beside.digest() for name in channels}
        self.kept: dict[str, list[NDArray[np.float64]]] = {name: [] for name in channels}
        self.lines: list[NDArray[np.int64]] = []
        self.file_numbers: list[NDArray[np.int64]] = []
        self.rows = 0
        self.stride = 1
        self._last_time: dict[str, float] = {}

    def add(self, block: Block, file_number: int) -> None:
        """Take one block of rows."""
        count = len(block.lines)
        if count == 0:
            return
        numbers = np.full(count, file_number, dtype=np.int64)
        chosen = slice((-self.rows) % self.stride, None, self.stride)
        for name in self.channels:
            values = np.ascontiguousarray(block.columns[name], dtype=np.float64)
            self._count(name, values, block, file_number)
            self.digests[name].update(values.data)
            self.kept[name].append(values[chosen] * self.factors[name])
        self.lines.append(block.lines[chosen])
        self.file_numbers.append(numbers[chosen])
        if self.table is not None:
            columns = {name: block.columns[name] for name in self.channels}
            self.table.append({**columns, "source_line": block.lines, "source_file": numbers})
        self.rows += count
        while sum(map(len, self.lines)) > KEPT_ROWS:
            self._thin()

    def _thin(self) -> None:
        self.stride *= 2
        self.lines = [np.concatenate(self.lines)[::2]]
        self.file_numbers = [np.concatenate(self.file_numbers)[::2]]
        self.kept = {name: [np.concatenate(parts)[::2]] for name, parts in self.kept.items()}

    def _count(self, name: str, values: NDArray[np.float64], block: Block, file_number: int) -> None:
        facts = self.facts[name]
        present = values[np.isfinite(values)]
        facts.missing += len(values) - len(present)
        facts.sentinels += int(np.count_nonzero(block.sentinel.get(name, np.zeros(0, dtype=bool))))
        if len(present):
            facts.low = float(np.fmin(facts.low, present.min()))
            facts.high = float(np.fmax(facts.high, present.max()))
        if self.channels[name].quantity == "instant" and len(present):
            lines = block.lines[np.isfinite(values)]
            before = self._last_time.get(name, -math.inf)
            step = np.diff(np.concatenate(([before], present)))
            for places, odd in ((facts.reversed_at, step < 0), (facts.repeated_at, step == 0)):
                places.extend((file_number, int(line)) for line in lines[odd][: LISTED - len(places)])
            self._last_time[name] = float(present[-1])

    def finished(self, number: int, sweep: Sweep) -> SweepTable:
        """Table of the checks."""
        for name, facts in self.facts.items():
            facts.digest = self.digests[name].hexdigest()
        return SweepTable(
            sweep=sweep,
            number=number,
            channels=self.channels,
            columns={
                name: np.concatenate(parts) if parts else np.zeros(0) for name, parts in self.kept.items()
            },
            lines=np.concatenate(self.lines) if self.lines else np.zeros(0, dtype=np.int64),
            file_numbers=np.concatenate(self.file_numbers)
            if self.file_numbers
            else np.zeros(0, dtype=np.int64),
            rows=self.rows,
            stride=self.stride,
            facts=self.facts,
        )


def stored_columns(channels: dict[str, Channel]) -> list[Column]:
    """Columns of a sealed table: the channels in the unit of the file, and where each row stands."""
    columns = [
        Column(
            name=name,
            dtype="float64",
            unit="s" if channel.quantity == "instant" else (channel.unit or "1"),
            ucum="s" if channel.quantity == "instant" else ucum(channel.unit or "1"),
            quantity=channel.quantity,
            description=_description(name, channel),
        )
        for name, channel in channels.items()
    ]
    line = Column(
        "source_line", "int64", "1", "1", "count", "Line of the raw file that this row stands in, from 1."
    )
    file = Column("source_file", "int64", "1", "1", "count", "Which of the sweep's files, from 0.")
    return [*columns, line, file]


def _description(name: str, channel: Channel) -> str:
    parts = [channel.description or name.replace("_", " ")]
    if channel.quantity == "instant":
        parts.append("POSIX seconds since 1970-01-01T00:00:00Z")
    for label, value in (
        ("scale", channel.scale),
        ("convention", channel.convention),
        ("instrument", channel.instrument),
        ("thermometer", channel.thermometer),
    ):
        if value:
            parts.append(f"{label}: {value}")
    if not channel.use:
        parts.append(f"not to be used: {channel.why_not}")
    return "; ".join(parts)
