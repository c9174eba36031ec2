"""Finding what a plan's inputs stand for: channels, sheet values, calibrations, outputs of other reductions."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from archive.errors import BadRequest
from archive.reduction.channels import CONVERTED, channel_estimate, channel_meant
from archive.reduction.digest import value_digest
from archive.reduction.estimate import Estimate
from archive.reduction.facts import SweepFacts
from archive.reduction.preparation import Preliminary, preliminary_steps
from archive.reduction.sheet_values import sheet_value
from archive.reduction.source import Source
from archive.reduction.step import Given
from schemas.lineage import ReductionDocument, SourceEntry

__all__ = ["Missing", "Resolver"]


@dataclass(frozen=True)
class Missing:
    """Why an input does not exist, and what to do about it."""

    what: str
    remedy: str | None


class Resolver:
    """Inputs of one sweep by the texts that plans use, and the uncertainty sources met on the way.

    Parameters
    ----------
    source : Source
    facts : SweepFacts
    needs : mapping of str to ReductionDocument
        By the plan's names for them.
    many : mapping of str to tuple of ReductionDocument
        Those that are taken together.
    """

    def __init__(
        self,
        source: Source,
        facts: SweepFacts,
        needs: Mapping[str, ReductionDocument],
        many: Mapping[str, tuple[ReductionDocument, ...]] | None = None,
    ) -> None:
        self.source, self.facts, self.needs = source, facts, needs
        self.many = many or {}
        self.sources: dict[str, SourceEntry] = {}

    def add_sources(self, entries: Iterable[SourceEntry]) -> None:
        """Remember sources; the first description of a name stays."""
        for entry in entries:
            self.sources.setdefault(entry.name, entry)

    def channel(self, name: str) -> str | None:
        """Return the channel that a plan means."""
        return channel_meant(self.facts, name)

    def is_inverse(self, channel: str, wanted: str) -> bool:
        """Return whether a channel holds the inverse of the kind that is wanted."""
        return CONVERTED.get(wanted) == self.facts.channels[channel].quantity

    def raw_channel(self, name: str) -> Given:
        """Return a channel in SI units, as stored."""
        estimate, sources = channel_estimate(self.source, self.facts, name)
        self.add_sources(sources)
        return Given(f"{self.facts.address}#{name}", estimate, digest=self.facts.stored(name).digest)

    def preliminary(self, name: str) -> list[Preliminary]:
        """Return what is done to a channel before the plan's own steps."""
        steps = preliminary_steps(self.source, self.facts, name)
        for each in steps:
            self.add_sources(each.sources)
        return steps

    def resolved(self, kind: str, name: str) -> Given | None:
        """Return what ``KIND:NAME`` stands for; None if it does not exist.

        Raises
        ------
        BadRequest
            A reading without calibration, or a kind of input that there is not.
        """
        match kind:
            case "sheet":
                return self._sheet(name)
            case "need":
                return self._need(name)
            case "calibration":
                return self._calibration(name)
            case "thermometer":
                return self._thermometer(name)
        raise BadRequest(
            f"a plan takes {kind}:{name}", expected="channel:, sheet:, need:, calibration: or thermometer:"
        )

    def _sheet(self, name: str) -> Given | None:
        value, sources, address = sheet_value(self.facts, name)
        if value is None:
            return None
        self.add_sources(sources)
        if isinstance(value, Estimate):
            return Given(address, value)
        digest = self.source.digest(address) if ".r" in address else value_digest(value)
        return Given(address, record=value, digest=digest)

    def _need(self, name: str) -> Given | None:
        need, _, output = name.partition("#")
        document = self.needs.get(need)
        return None if document is None else self._output_of(document, output)

    def gathered(self, name: str) -> list[Given | None] | None:
        """Return what ``need:NAME#OUTPUT`` stands for in each reduction of a need of many.

        Returns
        -------
        list or None
            None in the place of a reduction without the output; None in place of all if this is no need of many, or none
            of its reductions has the output.
        """
        need, _, output = name.partition("#")
        found = [self._output_of(document, output) for document in self.many.get(need, ())]
        return found if any(each is not None for each in found) else None

    def _output_of(self, document: ReductionDocument, output: str) -> Given | None:
        entry = next((each for each in document.outputs if each.name == output), None)
        if entry is None:
            return None
        self.add_sources(document.sources)
        return Given(
            f"{document.address}#{output}", self.source.output(document.address, output), digest=entry.digest
        )

    def _calibration(self, name: str) -> Given | None:
        channel = self.channel(name)
        if channel is None:
            return None
        stored = self.facts.stored(channel)
        if stored.calibration is None:
            if self.facts.channels[channel].quantity == "temperature":
                return None
            raise BadRequest(
                f"channel {self.facts.address}#{channel} is a {stored.quantity}, and no calibration that turns it into a temperature is named",
                field=f"channels.{channel}.calibration",
                expected="a calibration record, e.g. RX-2.r3",
                remedy="name the calibration in the sheet and supplement the cooldown",
            )
        return Given(
            stored.calibration,
            record=self.source.record(stored.calibration),
            digest=self.source.digest(stored.calibration),
        )

    def _thermometer(self, name: str) -> Given | None:
        """Return the record of the thermometer that a channel reads, if it states the field that is asked for."""
        asked, _, field = name.partition(".")
        channel = self.channel(asked)
        address = None if channel is None else self.facts.stored(channel).thermometer
        if address is None:
            return None
        record = self.source.record(address)
        if field and getattr(record, field, None) is None:
            return None
        return Given(address, record=record, digest=self.source.digest(address))

    def why_missing(self, text: str | None, port: str, left_out: Mapping[str, str]) -> Missing:
        """Return why none of an input's alternatives exists."""
        if text is None:
            return Missing(f"the plan names nothing for {port}", "name it in the plan's step under `take`")
        reasons = [self._why(one, left_out) for one in text.split(" | ")]
        return Missing("; and ".join(each.what for each in reasons), reasons[0].remedy)

    def _why(self, text: str, left_out: Mapping[str, str]) -> Missing:
        kind, colon, name = text.partition(":")
        if not colon:
            return Missing(left_out.get(text, f"{text} was not given by an earlier step"), None)
        sheet = f"add it to the sheet and supplement the cooldown {self.facts.cooldown}"
        if kind == "channel":
            what = (
                "no thermometer channel"
                if name == "@thermometer"
                else "no channel under calibration"
                if name == "@calibrates"
                else f"no channel {name.replace('@', 'of kind ')}"
            )
            return Missing(
                f"sweep {self.facts.address} has {what}",
                f"describe the column, its quantity and its unit: {sheet}",
            )
        if kind == "need":
            return self._why_no_need(name)
        head, _, field = name.partition(".")
        if kind == "thermometer":
            return Missing(
                f"the thermometer of {self.facts.address} states no {field or 'record'}",
                f"write a new revision of the thermometer that states it, and {sheet}",
            )
        if field and head in ("cell", "substrate", "sample"):
            address = getattr(self.facts.entry, head)
            where = "is named for the sweep" if address is None else f"states {field} ({address})"
            return Missing(
                f"no {head} {where}", f"write a new revision of the record that states it, and {sheet}"
            )
        return Missing(f"the sheet states no {name}", sheet)

    def _why_no_need(self, name: str) -> Missing:
        need, _, output = name.partition("#")
        if need in self.many:
            return Missing(
                f"none of the {len(self.many[need])} reductions that serve as {need} has an output {output}",
                "reduce their sweeps again, and see why that output is missing",
            )
        document = self.needs.get(need)
        if document is None:
            return Missing(f"no reduction serves as {need}", f"reduce the sweep that gives {output} first")
        return Missing(
            f"{document.address} has no output {output}",
            f"reduce {document.sweep} again with a plan that gives {output}",
        )
