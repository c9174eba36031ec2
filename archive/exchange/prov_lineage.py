"""The provenance of sealed files in the terms of PROV: from raw files to results, with who, by what plan, and when.

| in the archive | in PROV |
|---|---|
| raw file, accession, sweep, channel, record, output, reduction | entity |
| cooldown, ingest, reduction, step, act of amending or withdrawing | activity |
| role of an operator | agent, a person known by role |
| Stillroom with its libraries | software agent |
| plan | entity that is a plan, in the association of each step |
| supplement, later revision, superseding reduction | derivation that is a revision |
| withdrawal | invalidation |

Times are those of the documents; nothing is added from a clock.
"""

from __future__ import annotations

import hashlib
import itertools
import json
from collections.abc import Sequence
from datetime import datetime

from archive.exchange.prov_model import Attribute, ProvDocument, Qualified
from archive.exchange.prov_names import (
    CONTENT_PREFIX,
    TERMS_PREFIX,
    cooldown_namespace,
    escaped,
    fixed_namespaces,
)
from archive.exchange.sealed_document import SealedDocument
from schemas.acts import AmendmentDocument, RevisionDocument, WithdrawalDocument
from schemas.address import parse_address
from schemas.lineage import (
    AccessionDocument,
    InputEntry,
    OutputEntry,
    ReductionDocument,
    Software,
    StepRecord,
    SweepEntry,
)

__all__ = ["Lineage"]

_REVISION = (("prov:type", Qualified("prov:Revision")),)


def _term(name: str) -> str:
    return f"{TERMS_PREFIX}:{name}"


class Lineage:
    """The provenance of some sealed files.

    Parameters
    ----------
    sealed : sequence of SealedDocument
        In the order of recording; with all that they rest on, or what is missing is named without being described.

    Attributes
    ----------
    document : ProvDocument
    """

    def __init__(self, sealed: Sequence[SealedDocument]) -> None:
        self.document = ProvDocument(prefixes=fixed_namespaces())
        self._names: dict[str, str] = {}
        self._channels: dict[tuple[str, str], str] = {}
        self._revisions: dict[str, dict[int, str]] = {}
        self._sheets: dict[str, str] = {}
        self._ended: list[tuple[str, str, str, datetime]] = []
        for each in sealed:
            content = each.document
            if isinstance(content, AccessionDocument):
                self._accession(content, each)
            elif isinstance(content, RevisionDocument):
                self._revision(content, each)
            elif isinstance(content, AmendmentDocument):
                self._amendment(content, each)
            elif isinstance(content, WithdrawalDocument):
                self._withdrawal(content, each)
            elif isinstance(content, ReductionDocument):
                self._reduction(content, each)
        self._invalidations()
        for numbers in self._revisions.values():
            ordered = sorted(numbers)
            for earlier, later in itertools.pairwise(ordered):
                self.document.relate("wasDerivedFrom", numbers[later], numbers[earlier], attributes=_REVISION)

    def identifier(self, address: str) -> str | None:
        """Return the qualified name of what an address names; None if the document does not speak of it."""
        return self._names.get(address)

    # Accessions ---------------------------------------------------------------------------------------------------

    def _cooldown(self, name: str, first_accession: str = "") -> str:
        prefix = f"cooldown-{name}"
        self.document.prefixes.setdefault(prefix, cooldown_namespace(first_accession or name))
        return prefix

    def _accession(self, content: AccessionDocument, sealed: SealedDocument) -> None:
        add, relate = self.document.add, self.document.relate
        home = self._cooldown(content.cooldown, sealed.sha256)
        run = self._run(content, home)
        act = add(
            "activity",
            f"{home}:ingest.{content.number}",
            {"prov:label": f"Taking {content.address} into the archive"},
            types=(_term("Ingest"),),
            begin=content.accessioned,
            end=content.accessioned,
        )
        relate("wasAssociatedWith", act, self._software(content.software))
        accession = self._entity(
            content.address,
            f"{home}:accession.{content.number}",
            "Accession",
            {"sha256": sealed.sha256, "size": sealed.size},
        )
        made = relate(
            "wasGeneratedBy",
            accession,
            act,
            content.accessioned,
            identifier=f"{home}:made.accession.{content.number}",
        )
        raws: dict[str, tuple[str, str | None]] = {}
        for raw in content.raw_files:
            local = f"{content.number}.{escaped(raw.name)}"
            name = self._entity(
                f"{content.address}:{raw.name}", f"{home}:raw.{local}", "RawFile",
                {"name": raw.name, "sha256": raw.sha256, "size": raw.size, "role": raw.role},
            )  # fmt: skip
            if raw.role == "sweep":
                relate("wasGeneratedBy", name, run)
            for role in content.sheet.operators if raw.role == "sheet" else ():
                relate("wasAttributedTo", name, self._operator(home, role))
            if raw.name == content.sheet_file:
                self._sheets[content.address] = name
                self._names |= {f"{content.cooldown}/{dose.name}": name for dose in content.doses}
            use = relate("used", act, name, content.accessioned, identifier=f"{home}:use.raw.{local}")
            relate("wasDerivedFrom", accession, name, act, made, use)
            raws[raw.name] = name, use
        for record in content.records:
            name = self._record(record.address, record.kind, record.digest)
            relate(
                "used", run, name, identifier=f"{home}:use.record.{content.number}.{escaped(record.address)}"
            )
        for entry in content.sweeps:
            self._sweep(content, entry, home, act, raws)
        if content.supplements is not None and content.supplements in self._names:
            relate("wasDerivedFrom", accession, self._names[content.supplements], attributes=_REVISION)

    def _run(self, content: AccessionDocument, home: str) -> str:
        sheet = content.sheet
        run = f"{home}:run"
        if run not in self.document.elements:
            self.document.add(
                "activity", run, {"prov:label": f"Cooldown {content.cooldown}", _term("purpose"): sheet.purpose},
                types=(_term("Cooldown"),), begin=sheet.begin, end=sheet.end,
            )  # fmt: skip
            for role in sheet.operators:
                self.document.relate("wasAssociatedWith", run, self._operator(home, role))
        return run

    def _operator(self, home: str, role: str) -> str:
        return self.document.add(
            "agent",
            f"{home}:role.{escaped(role)}",
            {"prov:label": role, _term("role"): role},
            types=("prov:Person",),
        )

    def _software(self, software: Software) -> str:
        packages = json.dumps(software.packages, sort_keys=True)
        digest = hashlib.sha256(software.model_dump_json().encode()).hexdigest()
        return self.document.add(
            "agent",
            f"{CONTENT_PREFIX}:software.stillroom.{escaped(software.stillroom)}.{digest[:12]}",
            {
                "prov:label": f"Stillroom {software.stillroom}", _term("version"): software.stillroom,
                _term("python"): software.python, _term("platform"): software.platform, _term("packages"): packages,
            },
            types=("prov:SoftwareAgent",),
        )  # fmt: skip

    def _entity(
        self, address: str, identifier: str, kind: str, facts: dict[str, Attribute | None], *types: str
    ) -> str:
        self._names[address] = identifier
        told = {_term(name): value for name, value in facts.items()}
        return self.document.add(
            "entity", identifier, {"prov:label": address, **told}, types=(_term(kind), *types)
        )

    def _record(self, address: str, kind: str, digest: str) -> str:
        parsed = parse_address(address)
        name = f"{CONTENT_PREFIX}:{kind}.{escaped(address)}.{digest[:12]}"
        types = ("prov:Plan",) if kind == "plan" else ()
        self._entity(address, name, kind.title(), {"sha256": digest}, *types)
        self._revisions.setdefault(f"{kind} {parsed.head}", {})[parsed.number or 0] = name
        return name

    def _sweep(
        self,
        content: AccessionDocument,
        entry: SweepEntry,
        home: str,
        act: str,
        raws: dict[str, tuple[str, str | None]],
    ) -> None:
        address, local = f"{content.cooldown}/{entry.name}", f"{content.number}.{entry.name}"
        relate, moment = self.document.relate, content.accessioned
        sweep = self._entity(
            address, f"{home}:sweep.{local}", "Sweep",
            {"kind": entry.kind, "rows": entry.rows, "begin": entry.begin, "end": entry.end}, "prov:Collection",
        )  # fmt: skip
        relate("wasGeneratedBy", sweep, act, moment, identifier=f"{home}:made.sweep.{local}")
        for channel in entry.channels:
            place = f"{local}.{channel.name}"
            name = self._entity(
                f"{address}#{channel.name}", f"{home}:channel.{place}", "Channel",
                {"quantity": channel.quantity, "unit": channel.unit, "sha256": channel.digest},
            )  # fmt: skip
            self._channels[f"{address}#{channel.name}", channel.digest] = name
            made = relate("wasGeneratedBy", name, act, moment, identifier=f"{home}:made.channel.{place}")
            relate("hadMember", sweep, name)
            for file in entry.files:
                if file in raws:
                    raw, use = raws[file]
                    relate("wasDerivedFrom", name, raw, act, made, use)

    # Acts after the fact ------------------------------------------------------------------------------------------

    def _act(self, prefix: str, local: str, label: str, by: str, moment: datetime, software: Software) -> str:
        act = self.document.add(
            "activity",
            f"{prefix}:act.{local}",
            {"prov:label": label},
            types=(_term("Act"),),
            begin=moment,
            end=moment,
        )
        self.document.relate("wasAssociatedWith", act, self._operator(prefix, by))
        self.document.relate("wasAssociatedWith", act, self._software(software))
        return act

    def _revision(self, content: RevisionDocument, sealed: SealedDocument) -> None:
        name = self._record(content.address, content.kind, content.digest)
        local = f"{escaped(content.address)}.{sealed.sha256[:12]}"
        label = f"Revising {content.address}: {content.because}"
        act = self._act(CONTENT_PREFIX, local, label, content.by, content.made, content.software)
        self.document.relate("wasGeneratedBy", name, act, content.made)

    def _amendment(self, content: AmendmentDocument, sealed: SealedDocument) -> None:
        home = self._cooldown(content.cooldown)
        local = f"amendment.{content.number}"
        act = self._act(
            home,
            local,
            f"Amending {content.cooldown}: {content.because}",
            content.by,
            content.made,
            content.software,
        )
        name = self._entity(
            content.address,
            f"{home}:{local}",
            "Amendment",
            {"sha256": sealed.sha256, "because": content.because},
        )
        made = self.document.relate(
            "wasGeneratedBy", name, act, content.made, identifier=f"{home}:made.{local}"
        )
        for number, address in enumerate(
            (content.rests_on, *(each.use for each in content.calibration + content.use))
        ):
            if (source := self._names.get(address)) is not None:
                use = self.document.relate(
                    "used", act, source, content.made, identifier=f"{home}:use.{local}.{number}"
                )
                self.document.relate("wasDerivedFrom", name, source, act, made, use)

    def _withdrawal(self, content: WithdrawalDocument, sealed: SealedDocument) -> None:
        home = CONTENT_PREFIX if content.cooldown is None else self._cooldown(content.cooldown)
        local = f"withdrawal.{escaped(content.target)}.{sealed.sha256[:12]}"
        act = self._act(
            home,
            local,
            f"Withdrawing {content.target}: {content.why}",
            content.by,
            content.made,
            content.software,
        )
        name = self._entity(
            content.address, f"{home}:{local}", "Withdrawal", {"sha256": sealed.sha256, "why": content.why}
        )
        self.document.relate("wasGeneratedBy", name, act, content.made)
        self._ended.append((content.address, content.target, act, content.made))

    def _invalidations(self) -> None:
        """Tell what is withdrawn, now that everything has its name; a withdrawal that was taken back ends nothing."""
        taken_back = {target for _, target, _, _ in self._ended}
        for address, target, act, moment in self._ended:
            if address not in taken_back and (name := self._names.get(target)) is not None:
                self.document.relate("wasInvalidatedBy", name, act, moment)

    # Reductions ---------------------------------------------------------------------------------------------------

    def _reduction(self, content: ReductionDocument, sealed: SealedDocument) -> None:
        add, relate = self.document.add, self.document.relate
        home = self._cooldown(content.cooldown)
        local = ".".join((content.sweep.partition("/")[2], content.plan.name, str(content.number)))
        agent = self._software(content.software)
        plan = self._record(content.plan.address, "plan", content.plan_digest)
        whole = add(
            "activity", f"{home}:reducing.{local}",
            {"prov:label": f"{content.plan.title}, {content.sweep} by plan {content.plan.address}"},
            types=(_term("Reducing"),), begin=content.begin, end=content.end,
        )  # fmt: skip
        relate("wasAssociatedWith", whole, agent, plan)
        reduction = self._entity(
            content.address, f"{home}:reduction.{local}", "Reduction", {"sha256": sealed.sha256, "size": sealed.size},
            "prov:Collection",
        )  # fmt: skip
        made = relate(
            "wasGeneratedBy", reduction, whole, content.end, identifier=f"{home}:made.reduction.{local}"
        )
        if (sweep := self._names.get(content.sweep)) is not None:
            use = relate("used", whole, sweep, content.begin, identifier=f"{home}:use.reduction.{local}")
            relate("wasDerivedFrom", reduction, sweep, whole, made, use)
        outputs = {entry.name: entry for entry in content.outputs}
        for step in content.steps:
            self._step(content, step, outputs, (home, local, agent, plan, whole))
        for entry in content.outputs:
            relate("hadMember", reduction, f"{home}:output.{local}.{entry.name}")
        if content.supersedes is not None and content.supersedes in self._names:
            relate("wasDerivedFrom", reduction, self._names[content.supersedes], attributes=_REVISION)

    def _step(
        self,
        content: ReductionDocument,
        step: StepRecord,
        outputs: dict[str, OutputEntry],
        within: tuple[str, str, str, str, str],
    ) -> None:
        home, local, agent, plan, whole = within
        relate, place = self.document.relate, f"{local}.{step.number}"
        act = self.document.add(
            "activity", f"{home}:step.{place}",
            {
                "prov:label": step.sentence, _term("step"): f"{step.name}.{step.version}",
                _term("parameters"): json.dumps(step.parameters, sort_keys=True, ensure_ascii=False),
                _term("part_of"): Qualified(whole),
            },
            types=(_term("Step"),), begin=step.begin, end=step.end,
        )  # fmt: skip
        relate("wasAssociatedWith", act, agent, plan)
        used: list[tuple[str, str | None]] = []
        for port, entry in step.inputs.items():
            name = self._input(entry, home)
            role = (("prov:role", f"{port}: {entry.role}"),)
            use = f"{home}:use.{place}.{escaped(port)}"
            used.append((name, relate("used", act, name, step.begin, identifier=use, attributes=role)))
        for output in step.outputs:
            if output in outputs:
                name = self._output(content, outputs[output], f"{home}:output.{local}.{output}")
                made = relate(
                    "wasGeneratedBy", name, act, step.end, identifier=f"{home}:made.{local}.{output}"
                )
                for source, use_of in dict(used).items():
                    relate("wasDerivedFrom", name, source, act, made, use_of)

    def _output(self, content: ReductionDocument, entry: OutputEntry, identifier: str) -> str:
        facts: dict[str, Attribute | None] = {
            "quantity": entry.quantity, "unit": entry.unit, "scale": entry.scale, "rows": entry.rows,
            "value": entry.value, "uncertainty": entry.uncertainty, "verdict": entry.verdict, "sha256": entry.digest,
        }  # fmt: skip
        return self._entity(
            f"{content.address}#{entry.name}",
            identifier,
            "Array" if entry.rows is not None else "Result",
            facts,
        )

    def _input(self, entry: InputEntry, home: str) -> str:
        """Return the entity that a step took: in the version whose digest the step wrote down, else the newest."""
        if entry.address in self._sheets:  # what a step takes from an accession is the sheet in it
            return self._sheets[entry.address]
        if entry.digest is not None and (entry.address, entry.digest) in self._channels:
            return self._channels[entry.address, entry.digest]
        if entry.address in self._names:
            return self._names[entry.address]
        value = None if entry.value is None else entry.value
        return self._entity(
            entry.address, f"{home}:stated.{escaped(entry.address)}", "StatedValue",
            {"value": None if value is None else value.value, "unit": None if value is None else value.unit,
             "sha256": entry.digest},
        )  # fmt: skip
