"""Commands on one address: show it, trace it, compute it again."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from archive.commands import opening
from archive.commands.describing import describe
from archive.commands.failures import EXIT_WARNINGS
from archive.commands.machine import write_json
from archive.commands.opening import archive_option, json_option, require_address, strict_option
from archive.commands.terminal import Progress, clean, draw, say

if TYPE_CHECKING:
    from rich.tree import Tree

    from archive.reduction.trace import TraceNode

__all__ = ["replay", "show", "trace"]


@click.command(short_help="Show whatever has an address.")
@click.argument("address")
@archive_option
@json_option
def show(*, address: str, archive_dir: Path | None, as_json: bool) -> None:
    """Show everything the archive knows of whatever has ADDRESS.

    \b
    Examples:
      stillroom show 2026-03                              a cooldown
      stillroom show 2026-03/s017                         a sweep, or a dose
      stillroom show 2026-03/s017#period                  a channel
      stillroom show 2026-03/s017@film-transition.2       a reduction
      stillroom show 2026-03/s017@film-transition.2#T_KT  a result
      stillroom show TO-4.r2                              a record, or a plan
      stillroom show 2026-03.a1:raw/ts05.csv              a raw file
    """
    with opening.open_archive(archive_dir) as lab:
        content = lab.show(address)
    if as_json:
        write_json(content)
    else:
        describe(content)


@click.command(short_help="Trace a number down to raw bytes.")
@click.argument("address")
@archive_option
@json_option
def trace(*, address: str, archive_dir: Path | None, as_json: bool) -> None:
    """Trace a result, array, reduction or sweep down to raw files, their digests and lines.

    \b
    Example:
      stillroom trace 2026-03/s017@film-transition.2#T_KT
    """
    require_address(address)
    with opening.open_archive(archive_dir) as lab, Progress("tracing"):
        node = lab.trace(address)
    if as_json:
        write_json(_content(node))
        return
    draw(_tree(node))


def _content(node: TraceNode) -> dict[str, Any]:
    return {
        "address": node.address,
        "kind": node.kind,
        "label": node.label,
        "facts": node.facts,
        "children": [_content(child) for child in node.children],
    }


def _tree(node: TraceNode, above: Tree | None = None) -> Tree:
    from rich.text import Text
    from rich.tree import Tree

    label = Text(clean(node.label))
    tree = Tree(label) if above is None else above.add(label)
    for child in node.children:
        _tree(child, tree)
    return tree


@click.command(short_help="Compute a reduction again and compare.")
@click.argument("address")
@archive_option
@json_option
@strict_option
def replay(*, address: str, archive_dir: Path | None, as_json: bool, strict: bool) -> None:
    """Compute a reduction again from raw bytes and compare every output with what was sealed. Nothing is stored.

    On the platform that made it every bit agrees; elsewhere the largest differences are told.

    \b
    Example:
      stillroom replay 2026-03/s017@film-transition.2

    Exit code: with --strict 1 if any output differs.
    """
    require_address(address)
    with opening.open_archive(archive_dir) as lab, Progress("computing again"):
        report = lab.replay(address)
    if as_json:
        write_json(report)
    else:
        if report.identical:
            say(f"All {report.outputs} outputs of {report.address} are bit for bit what was sealed.")
        else:
            say(f"Of {report.outputs} outputs of {report.address}, these differ from what was sealed:")
        for name in sorted({*report.largest_difference, *report.shifts}):
            say(f"  {name}{_how_far(report.largest_difference.get(name), report.shifts.get(name))}")
    if strict and not report.identical:
        click.get_current_context().exit(EXIT_WARNINGS)


def _how_far(relative: float | None, shift: float | None) -> str:
    told = [] if relative is None else [f"largest relative difference {relative:.2g}"]
    told += [] if shift is None else [f"shifted by {shift:.2g} of its standard uncertainty"]
    return f": {', '.join(told)}" if told else ""
