"""The budget of a result, and what a Monte Carlo run found, as tables of a terminal."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from archive.commands.terminal import say, table, wide_output

__all__ = ["say_budget", "say_monte_carlo"]

_LEVELS = {"point": "this point", "run": "this run", "cell": "this cell", "laboratory": "all"}


def say_budget(content: Mapping[str, Any]) -> None:
    """Write the budget of a result.

    Parameters
    ----------
    content : mapping
        The result as `Archive.show` gives it.
    """
    from archive.commands.numbers import readable
    from schemas.interval_text import contribution_text, preferred_unit

    rows = content.get("budget") or []
    if not rows:
        return
    unit, factor = preferred_unit(content["uncertainty"], content["unit"], content["quantity"])
    lines = []
    for row in rows:
        stated = row["stated"]
        text = ""
        if stated is not None:
            value, u = stated.get("value"), stated["uncertainty"]
            text = (
                f"u = {contribution_text(u, unit=stated['unit'])}"
                if value is None
                else readable(value, u, stated["unit"])
            )
        sensitivity = "" if row["sensitivity"] is None else f"{row['sensitivity']:.3g}"
        part = contribution_text(row["contribution"], unit=unit, factor=factor)
        lines.append((row["source"], text, _LEVELS[row["level"]], sensitivity, part, _percent(row["share"])))
    total = contribution_text(content["uncertainty"], unit=unit, factor=factor)
    lines.append(
        ("combined standard uncertainty", "", "", "", total, _percent(sum(row["share"] for row in rows)))
    )
    say("  budget:")
    columns = ("source", "stated", "common to", "sensitivity (SI)", "contribution", "share")
    keep = [
        k
        for k, name in enumerate(columns)
        if any(line[k] for line in lines) and (wide_output() or name not in {"stated", "sensitivity (SI)"})
    ]
    table(
        [columns[k] for k in keep],
        [[line[k] for k in keep] for line in lines],
        right=("sensitivity (SI)", "contribution", "share"),
    )


def _percent(share: float) -> str:
    if share >= 0.995:
        return f"{100 * share:.0f} %"
    return f"{100 * share:.2g} %" if share >= 1e-6 else "0 %"


def say_monte_carlo(run: Mapping[str, Any], outputs: Mapping[str, Mapping[str, Any]]) -> None:
    """Write what a Monte Carlo run found, beside first order.

    Parameters
    ----------
    run : mapping
        As JSON holds it.
    outputs : mapping
        Results by name, with value, uncertainty, unit and quantity.
    """
    from schemas.interval_text import contribution_text, interval_text, preferred_unit

    trials, p = run["trials"], f"{100 * run['probability']:g} %"
    how = ", as many as the adaptive procedure needed" if run.get("adaptive") else ""
    digits = f"{run['digits']} digit{'s' * (run['digits'] != 1)}"
    say(
        f"Monte Carlo (JCGM 101:2008): {trials} trials{how}, seed {run['seed']}; {p} intervals; first order held to {digits} of the uncertainty"
    )
    lines = []
    for each in run["results"]:
        output = outputs[each["name"]]
        unit, factor = preferred_unit(
            output["value"], output["unit"], output["quantity"], output.get("uncertainty")
        )
        u = output.get("uncertainty")

        def interval(
            name: str, each: Any = each, u: Any = u, unit: str = unit, factor: float = factor
        ) -> str:
            return interval_text(each.get(name), uncertainty=u, unit=unit, factor=factor)

        spread = each.get("uncertainty")
        unit_u, factor_u = preferred_unit(u or spread or 0.0, output["unit"], output["quantity"])
        lines.append(
            (
                each["name"],
                contribution_text(u, unit=unit_u, factor=factor_u) if u else "-",
                "-" if spread is None else contribution_text(spread, unit=unit_u, factor=factor_u),
                interval("first_order"),
                interval("symmetric"),
                interval("shortest"),
                str(trials - each["values"]) if each["values"] < trials else "",
                _verdict(each),
            )
        )
    columns = (
        "result",
        "u first order",
        "u drawn",
        "first order",
        "drawn",
        "shortest",
        "lost",
        "verdict",
    )
    left_out = set() if any(line[6] for line in lines) else {"lost"}
    left_out |= set() if wide_output() else {"shortest"}
    keep = [k for k in range(len(columns)) if columns[k] not in left_out]
    table([columns[k] for k in keep], [[line[k] for k in keep] for line in lines])
    _say_remarks(run)


def _verdict(each: Mapping[str, Any]) -> str:
    if each["values"] == 0:
        return "not drawn"
    return each.get("agreement") or ("none stated" if each.get("symmetric") else "too few values")


def _say_remarks(run: Mapping[str, Any]) -> None:
    trials = run["trials"]
    if run["failed"]:
        say(
            f"In {run['failed']} of {trials} trials a step gave no result; they are left out of what rests on it:"
        )
        for step, count in run["failures"].items():
            say(f"  {step}: {count}, first with: {run['reasons'].get(step, '')}")
    for step, share in (run.get("beyond_noise") or {}).items():
        say(
            f"{step}: {_percent(share)} of its own variance is more than the stated noise makes, and was drawn besides"
        )
    if any(each.get("agreement") == "undecided" for each in run["results"]):
        say(
            "undecided: the ends of the interval are not known well enough to tell; ask for more trials, or --monte-carlo adaptive"
        )
    if any(each.get("agreement") == "differs" for each in run["results"]):
        say(
            "differs: quote the drawn interval for these results, not value and uncertainty (JCGM 101:2008, 8); but a result that measures scatter itself, such as chi-squared or an Allan deviation, only grows with noise drawn on top of that of the data"
        )
