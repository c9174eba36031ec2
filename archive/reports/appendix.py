"""The methods appendix: the reductions behind one chapter, as LaTeX with tables, figures, references and a companion in JSON.

Rules
-----
* Every sentence comes from a record and is preceded by a comment with its checklist item and that record.
* No item of the checklist vanishes: what has no record becomes a negative sentence, and the count of completeness falls.
* The same records give the same bytes.
"""

from __future__ import annotations

import json
import re
from collections.abc import Sequence
from typing import Any

from archive.errors import BadRequest
from archive.reports.after_the_fact import act_sentences
from archive.reports.appendix_marks import marks_table, with_marks
from archive.reports.appendix_tables import Table, results_table, tables
from archive.reports.bibliography import bibliography_of
from archive.reports.budget import largest_share, monte_carlo_sentence
from archive.reports.checklist import Item, Said, completeness, sentence, told
from archive.reports.figures import Drawn, Undrawn, figures
from archive.reports.items_cell import CELL_ITEMS
from archive.reports.items_gas import GAS_ITEMS
from archive.reports.items_measurement import MEASUREMENT_ITEMS
from archive.reports.items_reduction import REDUCTION_ITEMS
from archive.reports.not_done import data_sentences, effect_sentences, replaced_sentences, waiver_sentences
from archive.reports.numbers import CODES
from archive.reports.prose import breakable, prose
from archive.reports.scope import Scope
from archive.reports.tex import Tex, tex, tex_environment
from archive.reports.view import CooldownView
from schemas.visible_text import json_escaped

__all__ = ["ITEMS", "methods_appendix"]

ITEMS: tuple[Item, ...] = (*CELL_ITEMS, *GAS_ITEMS, *MEASUREMENT_ITEMS, *REDUCTION_ITEMS)

_SUBLEVELS = {"chapter": "section", "section": "subsection", "subsection": "subsubsection"}
_SECTIONS = (
    ("cells", "Cells and substrates", ("cells",)), ("gas", "Gas handling and coverage", ()), ("thermometry", "Thermometry", ("thermometers",)),
    ("measurement", "Measurement", ("runs", "not-used")),
)  # fmt: skip


def methods_appendix(
    views: Sequence[CooldownView],
    addresses: Sequence[str],
    *,
    title: str | None = None,
    level: str = "section",
) -> dict[str, bytes]:
    r"""Return the files of a methods appendix by name.

    Parameters
    ----------
    views : sequence of CooldownView
        Cooldowns of the reductions, and of those they rest on as far as these are to be told.
    addresses : sequence of str
        Reductions.
    title : str, optional
    level : str
        ``chapter``, ``section`` or ``subsection``.

    Returns
    -------
    dict of str to bytes
        ``appendix.tex`` (to be read into the thesis), ``appendix-preamble.tex``, ``appendix-alone.tex`` (compiles alone),
        ``results.tex``, ``methods.bib`` (only what is cited), ``figures/*.pdf``, ``appendix.json`` (every number, as printed).

    Raises
    ------
    UnknownAddress
        No view holds one of the reductions.
    BadRequest
        Another level, no address, or a step cites what the reviewed list does not have.
    """
    if level not in _SUBLEVELS:
        raise BadRequest("an appendix begins at another level", found=level, expected=", ".join(_SUBLEVELS))
    if not addresses:
        raise BadRequest("name the reductions that the appendix is about", expected="at least one address")
    scope = Scope(views, addresses)
    made_figures = list(figures(scope))
    drawn = [each for each in made_figures if isinstance(each, Drawn)]
    undrawn = [each for each in made_figures if isinstance(each, Undrawn)]
    account = _account(scope, drawn, undrawn, title=title or "Methods")
    environment = tex_environment()
    shared = {
        "level": Tex(level),
        "sublevel": Tex(_SUBLEVELS[level]),
        "document_class": Tex("report" if level == "chapter" else "article"),
    }
    results = _for_tex(results_table(scope), account["prefix"])
    made: dict[str, Any] = {
        "appendix.tex": environment.get_template("appendix.tex.j2").render(**_printed(account), **shared),
        "appendix-alone.tex": environment.get_template("appendix-alone.tex.j2").render(**shared),
        "appendix-preamble.tex": environment.get_template("appendix-preamble.tex.j2").render(),
        "results.tex": environment.get_template("results.tex.j2").render(table=results),
        "methods.bib": bibliography_of(_citations(scope)),
        "appendix.json": json_escaped(
            json.dumps(_companion(scope, account), indent=1, ensure_ascii=False, allow_nan=False)
        )
        + "\n",
    }
    return {name: text.encode() for name, text in made.items()} | {each.name: each.content for each in drawn}


def _citations(scope: Scope) -> list[str]:
    # The notation for uncertainty is that of the GUM, on every page.
    drawn = any(
        monte_carlo_sentence(each, output)
        for each in scope.reductions
        for output in each.outputs
        if each.address in scope.asked and output.name in each.plan.headline and largest_share(each, output)
    )
    steps = dict.fromkeys(key for _, step in scope.steps() for key in step.citations)
    return [*steps, "jcgm-100", *(["jcgm-101"] if drawn else [])]


def _account(
    scope: Scope, drawn: Sequence[Drawn], undrawn: Sequence[Undrawn], *, title: str
) -> dict[str, Any]:
    """Return all that the appendix says, section by section, in the order of the sections."""
    said = {item.code: told(item, scope) for item in ITEMS if item.applies(scope.experiments)}
    made = {each.label: each for each in tables(scope)}
    sections = [_section("scope", "Scope", _scope(scope, title, said))]
    for key, name, wanted in _SECTIONS:
        sections.append(_section(key, name, _of(key, said), [made[label] for label in wanted]))
    fits = _of("fits", said) + [
        ("FIG", sentence(f"There is no {each.what} of {each.address}: {each.why}.", each.address))
        for each in undrawn
    ]
    sections.append({**_section("reduction", "Reduction", [], [made["steps"]]), "steps": _steps(scope)})
    sections.append(
        {
            **_section("fits", "Fits and results", fits, [results_table(scope)]),
            "figures": list(drawn),
        }
    )
    sections.append(_section("uncertainty", "Uncertainty", _of("uncertainty", said), [made["budget"]]))
    undone = (
        [("R52", each) for each in effect_sentences(scope)]
        + [("R53", each) for each in waiver_sentences(scope)]
        + [("R55", each) for each in replaced_sentences(scope)]
        + [("R55", each) for each in act_sentences(scope)]
    )
    corrections = [table for label, table in made.items() if label.startswith("effects-")]
    sections.append(
        _section("not-done", "What was not done, warnings waived, results replaced", undone, corrections)
    )
    data = [*_of("data", said), *(("R58", each) for each in data_sentences(scope, len(drawn)))]
    sections.append(_section("data", "Data and code", data))
    sections = with_marks(sections)
    sections[-1]["tables"] = [*sections[-1]["tables"], marks_table(sections)]
    prefix = "stillroom-" + re.sub(r"[^A-Za-z0-9]+", "-", scope.asked[0]).strip("-").lower()
    return {
        "title": title,
        "prefix": prefix,
        "sections": sections,
        "completeness": completeness(ITEMS, said, scope),
    }


def _section(
    key: str, title: str, sentences: list[tuple[str, Said]], tables_: Sequence[Table] = ()
) -> dict[str, Any]:
    return {
        "key": key,
        "title": title,
        "sentences": sentences,
        "tables": list(tables_),
        "figures": [],
        "steps": [],
    }


def _of(section: str, said: dict[str, list[Said]]) -> list[tuple[str, Said]]:
    return [
        (item.code, each)
        for item in ITEMS
        if item.section == section and item.code in said
        for each in said[item.code]
    ]


def _scope(scope: Scope, title: str, said: dict[str, list[Said]]) -> list[tuple[str, Said]]:
    runs = ", ".join(held.sheet.name for held in scope.runs)
    lines = [
        sentence(
            f"{title}: reductions asked for, {len(scope.asked)}; reductions that they rest on, {len(scope.reductions) - len(scope.asked)}; cooldowns, {runs}.",
            "the request",
        ),
        sentence(
            "A number in brackets is the standard uncertainty in the last digits; [u nr] marks a value whose uncertainty was not recorded; every temperature is in kelvin on the scale named with it.",
            "the notation",
        ),
        sentence(
            f"Codes: {'; '.join(f'{code} {meaning}' for code, meaning in CODES.items())}.", "the notation"
        ),
    ]
    lines += [
        sentence(f"Completeness of the checklist, {each}.", "the checklist")
        for each in completeness(ITEMS, said, scope)
    ]
    lines += [sentence(f"{held.sheet.name}: {held.sheet.purpose}", held.sheet.name) for held in scope.runs]
    return [("scope", each) for each in lines]


def _steps(scope: Scope) -> list[dict[str, Any]]:
    blocks = []
    for reduction in scope.reductions:
        lines = []
        for step in reduction.steps:
            record = f"{reduction.address} step {step.number}"
            warned = " ".join(f"Warning raised: {each.what}." for each in step.findings)
            lines.append(("ST", Said(f"{step.sentence} {warned}".strip(), record), step.citations))
        blocks.append(
            {
                "title": f"{reduction.address}: {reduction.plan.title} (plan {reduction.plan.address})",
                "record": reduction.address,
                "lines": lines,
            }
        )
    return blocks


def _comment(text: str) -> Tex:
    """Return a text that can stand in a comment: printable ASCII in one line."""
    return Tex("".join(each if " " <= each <= "~" else "?" for each in text))


def _line(code: str, said: Said, mark: str, cited: Sequence[str] = ()) -> dict[str, Tex]:
    citation = rf"~\cite{{{','.join(cited)}}}" if cited else ""
    latex = prose(said.text).latex
    if citation and latex.endswith("."):
        latex = Tex(latex[:-1] + citation + ".")
    elif citation:
        latex = Tex(latex + citation)
    group = f"{code} {said.record.split()[0]}" if code in ("R52", "R53") else code
    return {
        "group": Tex(group),
        "code": Tex(code),
        "record": _comment(said.record),
        "latex": latex,
        "mark": Tex(mark),
    }


def _cited(said: Said) -> tuple[str, ...]:
    """Return what a sentence rests on that no step cites."""
    if "Monte Carlo (JCGM 101)" in said.text:
        return ("jcgm-101",)
    return ("jcgm-100",) if said.record == "the notation" and "brackets" in said.text else ()


def _printed(account: dict[str, Any]) -> dict[str, Any]:
    prefix = account["prefix"]
    sections = []
    for each in account["sections"]:
        lines = [
            _line(code, said, mark, _cited(said))
            for mark, (code, said) in zip(each["marks"], each["sentences"], strict=True)
        ]
        steps = [
            {
                "title": prose(block["title"]).latex,
                "record": _comment(block["record"]),
                "sentences": [
                    _line(code, said, mark, cited)
                    for mark, (code, said, cited) in zip(block["marks"], block["lines"], strict=True)
                ],
            }
            for block in each["steps"]
        ]
        shown = [
            {
                "name": Tex(drawn.name),
                "caption": prose(drawn.caption).latex,
                "source": tex(breakable(", ".join(drawn.sources))),
                "label": Tex(f"{prefix}-fig-{number}"),
                "mark": Tex(mark),
            }
            for number, (mark, drawn) in enumerate(zip(each["figure_marks"], each["figures"], strict=True), 1)
        ]
        sections.append({
            "key": Tex(each["key"]), "title": each["title"], "sentences": lines, "steps": steps, "tables": [_for_tex(table, prefix) for table in each["tables"]], "figures": shown,
        })  # fmt: skip
    slots = ",".join(each["key"] for each in account["sections"])
    return {
        "title": prose(account["title"]).latex,
        "prefix": Tex(prefix),
        "sections": sections,
        "slots": Tex(slots),
    }


def _for_tex(table: Table, prefix: str) -> dict[str, Any]:
    # Twenty-five thousandths of the line stay for the gaps between columns.
    total = sum(width for _, width in table.heads)
    room = 1 - 0.011 * len(table.heads)
    return {
        "label": Tex(f"{prefix}-tab-{table.label}"), "caption": prose(table.caption).latex, "heads": [text for text, _ in table.heads],
        "widths": [Tex(f"{room * width / total:.4f}") for _, width in table.heads], "rows": [[cell.latex for cell in row] for row in table.rows],
    }  # fmt: skip


def _companion(scope: Scope, account: dict[str, Any]) -> dict[str, Any]:
    """Return everything printed, as plain strings, beside the numbers with full precision."""
    sections = [
        {
            "key": each["key"], "title": each["title"], "sentences": [{"mark": mark, "item": code, "record": said.record, "present": said.present, "text": said.text} for mark, (code, said) in zip(each["marks"], each["sentences"], strict=True)],
            "steps": [{"reduction": block["record"], "title": block["title"], "marks": block["marks"], "sentences": [line[1].text for line in block["lines"]]} for block in each["steps"]],
            "tables": [{"name": table.label, "caption": table.caption, "heads": [str(text) for text, _ in table.heads], "rows": [[cell.plain for cell in row] for row in table.rows]} for table in each["tables"]],
            "figures": [{"mark": mark, "file": drawn.name, "caption": drawn.caption, "reductions": list(drawn.sources)} for mark, drawn in zip(each["figure_marks"], each["figures"], strict=True)],
        }
        for each in account["sections"]
    ]  # fmt: skip
    return {
        "format": "stillroom-appendix/1", "title": account["title"], "asked": list(scope.asked), "completeness": account["completeness"], "sections": sections,
        "outputs": {
            reduction.address: {each.name: each.model_dump(mode="json", exclude={"shared"}) for each in reduction.outputs if each.rows is None} for reduction in scope.reductions
        },
    }  # fmt: skip
