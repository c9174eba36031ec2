"""Carrying out a plan on a sweep: resolve inputs, prepare channels, perform steps, write the document.

The runner computes nothing itself and reads no clock but the one it is given: equal input gives bit-identical arrays.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from datetime import datetime
from typing import Any

from archive.errors import BadRequest, StepFailed
from archive.reduction.digest import record_digest
from archive.reduction.facts import SweepFacts, sweep_facts
from archive.reduction.gathering import GatherParameters, gathering_step
from archive.reduction.needs import NeedAddresses, gathered_reductions, needed_reductions
from archive.reduction.outputs import Found, Stored, output_arrays, output_entry
from archive.reduction.performing import perform, step_parameters
from archive.reduction.planning import applies
from archive.reduction.repeatable import Repeatable, Repeated
from archive.reduction.resolving import Resolver
from archive.reduction.software import software
from archive.reduction.source import Source
from archive.reduction.step import Given, Step
from archive.reduction.steps import step_named
from schemas.base import Record
from schemas.finding import Finding
from schemas.lineage import InputEntry, ReductionDocument, SourceEntry, StepRecord
from schemas.plan import Plan, PlanStep

__all__ = ["ReductionOutcome", "run"]


@dataclass(frozen=True)
class ReductionOutcome:
    """A reduction, not yet sealed.

    Attributes
    ----------
    document : ReductionDocument
    arrays : dict
        Array and attributes by path, as they are to be stored.
    repeated : Repeated
        The reduction as a function of its inputs; no part of what is stored.
    """

    document: ReductionDocument
    arrays: Stored
    repeated: Repeated = field(repr=False, compare=False)


def run(
    plan: Plan,
    sweep_address: str,
    source: Source,
    *,
    number: int,
    clock: Callable[[], datetime],
    supersedes: str | None = None,
    needs: NeedAddresses | None = None,
) -> ReductionOutcome:
    """Return a plan carried out on a sweep.

    Parameters
    ----------
    plan : Plan
    sweep_address : str
        E.g. ``2026-03/s017``.
    source : Source
        What the archive holds.
    number : int
        Of this reduction among those of the plan on the sweep, from 1.
    clock : callable
        Gives aware datetimes.
    supersedes : str, optional
        Address of the reduction that this one replaces.
    needs : mapping, optional
        Reductions to rest on, by the plan's names for them, in place of the newest.

    Raises
    ------
    BadRequest
        The plan is not for the sweep, an input or a needed reduction is missing, a unit is missing or wrong.
    StepFailed
        A step could not give its results.
    UnknownAddress
        There is no such sweep.
    """
    begin = clock()
    facts = sweep_facts(source, sweep_address)
    if not applies(plan, facts.sweep, facts.cell, facts.substrate):
        raise BadRequest(
            f"plan {plan.name} is not for {sweep_address}, a {facts.sweep.kind}"
            + (" of the empty cell" if facts.sweep.empty_cell else ""),
            expected=_terms(plan),
            remedy=f"see which plans serve it with `stillroom show {sweep_address}`",
        )
    address = f"{sweep_address}@{plan.name}.{number}"
    resolver = Resolver(
        source,
        facts,
        needed_reductions(plan, facts, source, needs),
        gathered_reductions(plan, facts, source, needs),
    )
    work = _Work(address, clock, resolver)
    work.findings += _segments(facts)
    for each in plan.step:
        work.take(plan, each)
    return _finished(plan, work, number=number, begin=begin, supersedes=supersedes)


def _segments(facts: SweepFacts) -> list[Finding]:
    """Return a warning for each disturbance after which the record is not referred to what went before."""
    return [
        Finding(
            code="new-segment",
            severity="warning",
            what=f"at {each.at.isoformat()} a new segment began ({each.what}); the rows on both sides were reduced as one record",
            place=facts.sweep.name,
            remedy="leave out the rows of one side, with the reason, and reduce again",
        )
        for each in facts.sweep.disturbances
        if each.new_segment
    ]


def _terms(plan: Plan) -> str:
    terms = plan.applies
    parts = [" or ".join(terms.sweep_kinds)]
    if terms.empty_cell is not None:
        parts.append("of the empty cell" if terms.empty_cell else "with helium admitted")
    if terms.cell_kinds:
        parts.append("in a " + " or ".join(terms.cell_kinds))
    if terms.gas is not None:
        parts.append(f"gas {terms.gas}")
    if terms.doses is not None:
        parts.append("during which doses were admitted" if terms.doses else "without doses during it")
    if terms.has_pores is not None:
        parts.append("with a recorded pore size" if terms.has_pores else "without a recorded pore size")
    if terms.has_substrate is not None:
        parts.append("of a cell with a substrate" if terms.has_substrate else "of a cell without a substrate")
    return ", ".join(parts)


class _Work:
    """What has been done so far."""

    def __init__(self, address: str, clock: Callable[[], datetime], resolver: Resolver) -> None:
        self.address, self.clock, self.resolver = address, clock, resolver
        self.records: list[StepRecord] = []
        self.found: list[Found] = []
        self.inputs: dict[str, InputEntry] = {}
        self.findings: list[Finding] = []
        self.covariances: dict[str, Any] = {}
        self.prepared: dict[tuple[str, str], Given] = {}
        self.missing: dict[str, str] = {}
        self.repeatable = Repeatable(address)

    def take(self, plan: Plan, planned: PlanStep) -> None:
        """Carry out one step of the plan."""
        step = step_named(planned.use, planned.version)
        place = f"plan {plan.name} on {self.resolver.facts.address}"
        parameters = step_parameters(step, planned.set, place=place)
        for port in planned.take:
            if port not in step.takes:
                raise BadRequest(
                    f"{place}: step {step.name} has no input {port!r}",
                    expected=f"one of {', '.join(step.takes)}",
                )
        given: dict[str, Given] = {}
        for port, declared in step.takes.items():
            text = planned.take.get(port)
            found = None if text is None else self._given(text, declared.quantity)
            if found is not None:
                given[port] = found
            elif not declared.optional or (
                step.one_of and port == step.one_of[-1] and given.keys().isdisjoint(step.one_of)
            ):
                why = self.resolver.why_missing(text, port, self.missing)
                if not planned.optional:
                    raise BadRequest(
                        f"{place}: step {step.name} lacks its input {port} ({declared.description}): {why.what}",
                        remedy=why.remedy,
                    )
                self._left_out(planned, f"step {step.name} was left out: {why.what}", severity="note")
                return
        try:
            self._perform(step, parameters, given, planned.give)
        except StepFailed as error:
            if not planned.optional:
                raise
            self._left_out(planned, f"step {step.name} gave no result: {error.what}", severity="warning")

    def _left_out(self, planned: PlanStep, what: str, *, severity: str) -> None:
        code = "step-left-out" if severity == "note" else "step-without-result"
        self.findings.append(
            Finding(
                code=code,
                severity="note" if severity == "note" else "warning",
                what=what,
                place=self.resolver.facts.sweep.name,
            )
        )
        self.missing |= dict.fromkeys(planned.give.values(), what)

    def _given(self, text: str, quantity: str) -> Given | None:
        for one in text.split(" | "):
            found = self._one(one, quantity)
            if found is not None:
                return found
        return None

    def _one(self, text: str, quantity: str) -> Given | None:
        kind, colon, name = text.partition(":")
        if not colon:
            each = next((each for each in self.found if each.name == text), None)
            return None if each is None else self._output(each)
        if kind == "channel":
            return self._channel(name, quantity)
        if kind == "need" and name.partition("#")[0] in self.resolver.many:
            return self._gathered(name)
        given = self.resolver.resolved(kind, name)
        if given is not None:
            self._note_input(given)
        return given

    def _gathered(self, name: str) -> Given | None:
        """Take an output of many reductions together as one column; what two steps take is gathered once."""
        results = self.resolver.gathered(name)
        if results is None:
            return None
        need, _, output = name.partition("#")
        inputs = {f"from_{k}": each for k, each in enumerate(results, 1) if each is not None}
        for each in inputs.values():
            self._note_input(each)
        estimate = next(iter(inputs.values())).estimate
        assert estimate is not None  # noqa: S101 - outputs of reductions are numbers
        step = gathering_step(len(results), output=output, quantity=estimate.quantity)
        documents = self.resolver.many[need]
        parameters = GatherParameters(output=output, reductions=tuple(each.address for each in documents))
        return self._inserted(step, parameters, inputs, "values", f"{need}_{output}")

    def _output(self, each: Found) -> Given:
        return Given(f"{self.address}#{each.name}", each.estimate, digest=output_entry(each).digest)

    def _channel(self, name: str, quantity: str) -> Given | None:
        meant = self.resolver.channel(name)
        if meant is None:
            return None
        wanted = name[1:] if name.startswith("@") and name != "@thermometer" else ""
        if (meant, wanted) in self.prepared:
            return self.prepared[(meant, wanted)]
        given = self.resolver.raw_channel(meant)
        self._note_input(given)
        for each in self.resolver.preliminary(meant):
            inputs = {"values": given}
            if each.correction is not None:
                inputs["correction"] = Given(each.address, each.correction)
            given = self._inserted(
                step_named(each.step), each.parameters, inputs, "values", f"{meant}_{each.suffix}"
            )
        if wanted and self.resolver.is_inverse(meant, wanted):
            name_of = {"period": "period-from-frequency", "dissipation": "dissipation-from-quality-factor"}[
                wanted
            ]
            step = step_named(name_of)
            given = self._inserted(
                step, step.parameters(), {"values": given}, "inverse", f"{meant}_as_{wanted}"
            )
        self.prepared[(meant, wanted)] = given
        return given

    def _inserted(
        self, step: Step, parameters: Record, inputs: dict[str, Given], output: str, called: str
    ) -> Given:
        # A channel that two kinds are made from passes its corrections once.
        known = next((each for each in self.found if each.name == called), None)
        if known is None:
            self._perform(step, parameters, inputs, {output: called})
            known = self.found[-1]
        return self._output(known)

    def _note_input(self, given: Given) -> None:
        value = None
        self.inputs.setdefault(
            given.address,
            InputEntry(address=given.address, role=_role(given), digest=given.digest, value=value),
        )

    def _perform(
        self, step: Step, parameters: Record, given: Mapping[str, Given], give: Mapping[str, str]
    ) -> None:
        done = perform(
            step, parameters, given, give, number=len(self.records) + 1, reduction=self.address,
            fits=sum(name.startswith(f"{self.address} fit ") for name in self.resolver.sources), clock=self.clock,
        )  # fmt: skip
        taken = {each.name for each in self.found}
        for each in done.found:
            if each.name in taken:
                raise BadRequest(
                    f"{self.address}: the name {each.name} is given twice",
                    remedy="name the output otherwise in the plan",
                )
        self.resolver.add_sources(done.sources)
        place = self.resolver.facts.sweep.name
        placed = tuple(f if f.place else f.model_copy(update={"place": place}) for f in done.record.findings)
        self.records.append(done.record.model_copy(update={"findings": placed}))
        self.findings += placed
        self.found += done.found
        self.repeatable.add(done, given, give)
        if done.covariance:
            self.covariances[f"step {len(self.records)}"] = done.covariance


def _role(given: Given) -> str:
    if given.record is not None:
        return type(given.record).__name__.lower()
    return given.estimate.quantity if given.estimate is not None else "input"


def _finished(
    plan: Plan, work: _Work, *, number: int, begin: datetime, supersedes: str | None
) -> ReductionOutcome:
    facts = work.resolver.facts
    used = _used_sources(work)
    document = ReductionDocument(
        format="stillroom-reduction/1",
        address=work.address,
        cooldown=facts.cooldown,
        sweep=facts.address,
        number=number,
        plan=plan,
        plan_digest=record_digest(plan),
        inputs=_with_grounds(work.inputs.values(), work.resolver.source.grounds(facts.address)),
        steps=tuple(work.records),
        outputs=tuple(output_entry(each) for each in work.found),
        sources=tuple(used),
        covariances=work.covariances,
        supersedes=supersedes,
        findings=tuple(sorted(work.findings, key=lambda finding: finding.order)),
        begin=begin,
        end=work.clock(),
        software=software(),
    )
    arrays = output_arrays(work.found, [each.name for each in used])
    return ReductionOutcome(document, arrays, work.repeatable.finished(work.resolver.sources))


def _with_grounds(inputs: Iterable[InputEntry], grounds: Mapping[str, InputEntry]) -> tuple[InputEntry, ...]:
    """Return inputs that say why another record was taken, followed by the accession and the amendments."""
    taken = []
    for each in inputs:
        why = grounds.get(each.address)
        said = {} if why is None else {"instead_of": why.instead_of, "because": why.because}
        taken.append(each.model_copy(update=said))
    return (*taken, *(each for each in grounds.values() if each.role in ("accession", "amendment")))


def _used_sources(work: _Work) -> list[SourceEntry]:
    names = dict.fromkeys(name for each in work.found for name in each.estimate.shared)
    return [work.resolver.sources[name] for name in names]
