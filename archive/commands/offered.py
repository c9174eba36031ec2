"""What may stand in the place of a half-typed word: addresses, names of cooldowns and of plans.

Rules: it must be there at once, so only names of files are looked at, neither index nor sealed content; whatever is
wrong, nothing is offered and nothing is said, since a person is in the middle of typing.
"""

from __future__ import annotations

import os
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import click
from typing_extensions import override

if TYPE_CHECKING:
    from click.shell_completion import CompletionItem

__all__ = ["VARIABLE", "Offered", "addresses", "cooldowns", "offer", "plans"]

VARIABLE: Final = "_STILLROOM_COMPLETE"
"""Environment variable by which a shell's script asks for words."""

_SETTINGS: Final = "stillroom.toml"
_SEALED: Final = ".h5"
# Parameters that hold an address, by their names in the commands.
_KINDS: Final = {
    **dict.fromkeys(("address", "addresses", "first", "second", "sweep"), "address"),
    "cooldown": "cooldown",
    "plan": "plan",
}
# `stillroom plans NAME`
_PLANS_COMMAND: Final = ("plans", "name")


def addresses(root: Path, begun: str) -> Iterator[str]:
    """Addresses that go on from what was typed: up to a solidus first, then what lies in that cooldown.

    Notes
    -----
    A sweep is known here by its reductions; one that was never reduced is not offered.
    """
    head, inside, _ = begun.partition("/")
    if not inside:
        for folder in sorted((root / "sealed").iterdir()):
            own = [path.name.removesuffix(_SEALED) for path in folder.iterdir() if "@" not in path.name]
            if "." not in folder.name:
                yield folder.name
                yield f"{folder.name}/"
            yield from sorted(own)
        return
    reductions = sorted(path.name.removesuffix(_SEALED) for path in (root / "sealed" / head).glob("*@*"))
    sweeps = dict.fromkeys(name.partition("@")[0] for name in reductions)
    yield from (f"{head}/{name}" for name in (*sweeps, *reductions))


def cooldowns(root: Path) -> Iterator[str]:
    """Names of cooldowns; no cooldown has a dot in its name."""
    return (folder.name for folder in sorted((root / "sealed").iterdir()) if "." not in folder.name)


def plans() -> Iterator[str]:
    """Names of the plans that Stillroom ships."""
    folder = Path(__file__).parents[1] / "reduction" / "plans"
    return iter(sorted(path.stem for path in folder.glob("*.toml")))


def _root(ctx: click.Context) -> Path:
    """Folder of the archive, by the rules of `archive.lab.place.find_root`, which would load too much here."""
    named = ctx.params.get("archive_dir") or ctx.find_root().params.get("archive_dir")
    named = named or os.environ.get("STILLROOM_ARCHIVE")
    if named:
        return Path(named)
    here = Path.cwd()
    return next(folder for folder in (here, *here.parents) if (folder / _SETTINGS).is_file())


class Offered(click.types.StringParamType):
    """Text for which words are offered while it is typed.

    Parameters
    ----------
    kind : {"address", "cooldown", "plan"}
    """

    def __init__(self, kind: str) -> None:
        self.kind = kind

    @override
    def shell_complete(
        self, ctx: click.Context, param: click.Parameter, incomplete: str
    ) -> list[CompletionItem[Any]]:
        from click.shell_completion import CompletionItem

        try:
            if self.kind == "plan":
                words = list(plans())
            elif self.kind == "cooldown":
                words = list(cooldowns(_root(ctx)))
            else:
                words = list(addresses(_root(ctx), incomplete))
        except Exception:  # noqa: BLE001 - nobody wants a sentence in the middle of typing
            return []
        return [CompletionItem(word) for word in words if word.startswith(incomplete)]


def offer(name: str, command: click.Command) -> None:
    """Let the parameters of a command offer words by their names; how they are read stays the same."""
    for param in command.params:
        kind = "plan" if (name, param.name) == _PLANS_COMMAND else _KINDS.get(param.name or "")
        if kind is not None and isinstance(param.type, click.types.StringParamType):
            param.type = Offered(kind)
