"""The methods appendix: the reductions behind one chapter, in LaTeX."""

from __future__ import annotations

import json
from collections.abc import Sequence

from archive.errors import UnknownAddress
from archive.reports.tex import tex
from archive.reports.view import CooldownView
from schemas.lineage import ReductionDocument

__all__ = ["methods_appendix"]


def methods_appendix(
    views: Sequence[CooldownView], addresses: Sequence[str], *, title: str | None = None, level: str = "section"
) -> dict[str, bytes]:
    """Return the files of a methods appendix by name."""
    held: dict[str, ReductionDocument] = {each.address: each for view in views for each in view.reductions}
    missing = [address for address in addresses if address not in held]
    if missing:
        raise UnknownAddress(f"no reduction {missing[0]} is in the views given")
    lines = [rf"\{level}{{{tex(title or 'Methods')}}}", ""]
    for address in addresses:
        lines += [rf"\sub{level}{{{tex(address)}}}", *(str(tex(step.sentence)) for step in held[address].steps), ""]
    told = {address: held[address].model_dump(mode="json") for address in addresses}
    return {
        "appendix.tex": "\n".join(lines).encode(),
        "appendix.json": (json.dumps(told, indent=1, sort_keys=True) + "\n").encode(),
    }
