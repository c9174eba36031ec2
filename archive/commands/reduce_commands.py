"""Commands on plans and reductions."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from archive.commands import opening
from archive.commands.failures import EXIT_WARNINGS
from archive.commands.machine import quantity, write_json
from archive.commands.monte_carlo_options import monte_carlo_options, requested
from archive.commands.numbers import readable
from archive.commands.opening import archive_option, jobs_option, json_option, strict_option
from archive.commands.terminal import Progress, note, say, table
from archive.commands.uncertainty_tables import say_monte_carlo
from archive.errors import BadRequest, UnknownAddress

if TYPE_CHECKING:
    from archive.lab import ReduceOutcome
    from schemas.lineage import OutputEntry
    from schemas.plan import Plan

__all__ = ["headline", "plans", "reduce", "say_outcomes"]


@click.command(short_help="List the plans, or show one.")
@click.argument("name", required=False)
@click.option(
    "--toml", "as_toml", is_flag=True, help="Print the TOML of a shipped plan, to copy and change it."
)
@archive_option
@json_option
def plans(*, name: str | None, as_toml: bool, archive_dir: Path | None, as_json: bool) -> None:
    """List the plans that Stillroom ships and those that this archive's reductions used, or show one with its steps.

    \b
    Examples:
      stillroom plans
      stillroom plans film-transition
      stillroom plans film-transition --toml > our-film.toml
    """
    from archive.reduction.added_plans import added_plans
    from archive.reduction.planning import shipped_plans

    lab = opening.archive_or_none(archive_dir)
    if lab is None:
        known = [*shipped_plans(), *added_plans()]
    else:
        with lab:
            known = lab.plans()
    if name is None:
        _list_plans(known, as_json=as_json)
        return
    chosen = [plan for plan in known if name in (plan.name, plan.address)]
    if not chosen:
        raise UnknownAddress(
            f"there is no plan {name}", expected=f"one of: {', '.join(sorted({plan.name for plan in known}))}"
        )
    plan = max(chosen, key=lambda each: each.revision)
    if as_toml:
        click.echo(_shipped_text(plan), nl=False)
    elif as_json:
        write_json(
            {"address": plan.address, "what": "plan", **plan.model_dump(mode="json", exclude_none=True)}
        )
    else:
        _show_plan(plan)


def _list_plans(known: list[Plan], *, as_json: bool) -> None:
    if as_json:
        write_json(
            [
                {"address": plan.address, "title": plan.title, "sweep_kinds": plan.applies.sweep_kinds}
                for plan in known
            ]
        )
        return
    rows = [(plan.address, ", ".join(plan.applies.sweep_kinds), plan.title) for plan in known]
    table(("plan", "for sweeps of kind", "what it does"), rows)


def _shipped_text(plan: Plan) -> str:
    from importlib import resources

    file = resources.files("archive.reduction") / "plans" / f"{plan.name}.toml"
    if not file.is_file():
        raise UnknownAddress(f"{plan.address} is not a shipped plan", remedy="show it with --json")
    return file.read_text(encoding="utf-8")


def _show_plan(plan: Plan) -> None:
    say(f"{plan.address}: {plan.title}")
    if plan.description:
        say(plan.description)
    say(f"For sweeps of kind {', '.join(plan.applies.sweep_kinds)}.")
    for name, need in plan.needs.items():
        word = "uses, where there is one," if need.optional else "needs"
        which = "the newest reduction of every sweep" if need.many else "a reduction"
        say(f"It {word} {which} by {need.plan} ({need.relation.replace('-', ' ')}), as {name}.")
    if plan.headline:
        say(f"Results shown first: {', '.join(plan.headline)}")
    say()
    for number, step in enumerate(plan.step, 1):
        version = "" if step.version is None else f", version {step.version}"
        left_out = " (left out where an input does not exist)" if step.optional else ""
        say(f"{number:>3} {step.use}{version}{left_out}")
        for port, source in step.take.items():
            say(f"      takes {port} from {source}")
        for key, value in step.set.items():
            say(f"      with {key} = {value}")
        say(f"      gives {', '.join(step.give.values())}")


@click.command(short_help="Carry out plans on a cooldown.")
@click.argument("cooldown", required=False)
@click.option(
    "--stale",
    "stale_only",
    is_flag=True,
    help="Make anew what `stillroom stale` lists, with the newest revisions that hold; of COOLDOWN, or of all.",
)
@click.option(
    "--plan", metavar="PLAN", help="Name of a plan, or a plan file (.toml); else every plan that applies."
)
@click.option("--sweep", metavar="SWEEP", help="Name of one sweep; else all.")
@monte_carlo_options
@jobs_option
@archive_option
@json_option
@strict_option
def reduce(
    *,
    cooldown: str | None,
    stale_only: bool,
    plan: str | None,
    sweep: str | None,
    trials: str | None,
    seed: int,
    digits: int,
    workers: int,
    jobs: int,
    executor: str | None,
    archive_dir: Path | None,
    as_json: bool,
    strict: bool,
) -> None:
    """Carry out plans on the sweeps of COOLDOWN, in an order in which each finds what it rests on.

    Each reduction is sealed with its results, their uncertainties and one record per step; earlier reductions stay.
    COOLDOWN may be the address of one sweep.

    \b
    Examples:
      stillroom reduce 2026-03
      stillroom reduce 2026-03/s017 --plan film-transition
      stillroom reduce 2026-03 --plan our-film.toml
      stillroom reduce --stale --jobs 4
      stillroom reduce 2026-03/s017 --plan film-transition --monte-carlo 20000 --workers 4

    A reduction by Monte Carlo is a new one unless the newest has the same trials, seed and digits already. Anybody may read
    and write the archive while trials run.

    Exit codes: 1 findings of warning level, with --strict; 2 if a plan could not be carried out (the others were).
    """
    _require_target(cooldown, stale_only=stale_only, plan=plan)
    name, _, part = (cooldown or "").partition("/")
    chosen: str | Path | None = Path(plan) if plan is not None and plan.endswith(".toml") else plan
    if (jobs > 1 or executor is not None) and workers > 1:
        raise BadRequest(
            "--jobs or --executor and --workers exclude each other",
            remedy="--jobs or a cluster for many reductions at once, --workers for the trials of one",
        )
    request = requested(trials, seed=seed, digits=digits, workers=workers)
    with opening.open_archive(archive_dir) as lab, Progress("reducing") as progress:
        if stale_only:
            whose = "/".join(each for each in (name, sweep or part) if each) or None
            outcomes = lab.reduce_stale(
                whose, monte_carlo=request, jobs=jobs, executor=executor, progress=progress.sentence
            )
        else:
            outcomes = lab.reduce(
                name,
                plan=chosen,
                sweep=sweep or part or None,
                monte_carlo=request,
                jobs=jobs,
                executor=executor,
                progress=progress.sentence,
            )
    if as_json:
        write_json([_content(outcome) for outcome in outcomes])
    elif stale_only and not outcomes:
        say("No reduction is stale.")
    else:
        say_outcomes(outcomes)
    problems = [outcome.problem for outcome in outcomes if outcome.problem is not None]
    warned = any(
        finding.severity == "warning" and finding.waived is None
        for outcome in outcomes
        if outcome.document is not None
        for finding in outcome.document.findings
    )
    context = click.get_current_context()
    if problems:
        context.exit(max(problem.exit_code for problem in problems))
    if warned and strict:
        context.exit(EXIT_WARNINGS)


def _require_target(cooldown: str | None, *, stale_only: bool, plan: str | None) -> None:
    if cooldown is None and not stale_only:
        raise BadRequest(
            "name the cooldown, or its sweep", field="COOLDOWN", remedy="or give --stale for all that is"
        )
    if stale_only and plan is not None:
        raise BadRequest(
            "--plan means nothing with --stale",
            remedy="what is stale is made anew by its own plan; leave --plan out",
        )


def say_outcomes(outcomes: list[ReduceOutcome]) -> None:
    """Write what was reduced, and why something was not."""
    made = [outcome for outcome in outcomes if outcome.document is not None]
    if not outcomes:
        say("No plan applies to these sweeps; see: stillroom plans")
    if made:
        rows = [
            (outcome.address or "", tuple(_shown(entry) for entry in headline(outcome))) for outcome in made
        ]
        table(("reduction", "results"), rows)
    for outcome in made:
        if outcome.document is not None and outcome.document.monte_carlo is not None:
            say()
            say(f"{outcome.address}")
            say_monte_carlo(
                outcome.document.monte_carlo.model_dump(mode="json"),
                {entry.name: entry.model_dump(mode="json") for entry in outcome.document.outputs},
            )
    for outcome in outcomes:
        if outcome.problem is not None:
            note(f"not reduced: {outcome.sweep} by {outcome.plan}: {outcome.problem}")
        for finding in outcome.document.findings if outcome.document is not None else ():
            if finding.severity != "note" and finding.waived is None:
                note(f"{finding.severity}: {outcome.address}: {finding.sentence()}")


def headline(outcome: ReduceOutcome) -> list[OutputEntry]:
    """Scalar results of a reduction that its plan wants shown first."""
    if outcome.document is None:
        return []
    scalars = {entry.name: entry for entry in outcome.document.outputs if entry.rows is None}
    return [scalars[name] for name in outcome.document.plan.headline if name in scalars]


def _shown(entry: OutputEntry) -> str:
    return f"{entry.name} = {entry.verdict or readable(entry.value, entry.uncertainty, entry.unit)}"


def _content(outcome: ReduceOutcome) -> dict[str, Any]:
    content: dict[str, Any] = {"address": outcome.address, "sweep": outcome.sweep, "plan": outcome.plan}
    if outcome.document is not None:
        content["plan"] = outcome.document.plan.address
        content["results"] = {
            entry.name: {
                "address": f"{outcome.address}#{entry.name}",
                "quantity": entry.quantity,
                **(
                    quantity(entry.value, entry.uncertainty, entry.unit, scale=entry.scale) or {"value": None}
                ),
                **({"verdict": entry.verdict} if entry.verdict else {}),
            }
            for entry in outcome.document.outputs
            if entry.rows is None
        }
        content["findings"] = outcome.document.findings
        if outcome.document.monte_carlo is not None:
            content["monte_carlo"] = outcome.document.monte_carlo
    if outcome.problem is not None:
        content["problem"] = {"code": outcome.problem.code, "what": str(outcome.problem)}
    return content
