"""`stillroom completion`: the script that lets a shell complete commands, options, addresses and names."""

from __future__ import annotations

import os
from typing import TYPE_CHECKING, Any, Final

import click
from click.shell_completion import BashComplete, add_completion_class, get_completion_class, split_arg_string
from typing_extensions import override

from archive.commands.offered import VARIABLE

if TYPE_CHECKING:
    from click.shell_completion import CompletionItem

__all__ = ["completion", "prepare"]

_SHELLS: Final = ("bash", "zsh", "fish")
# Where bash breaks words beside blanks (Bash Reference Manual, COMP_WORDBREAKS); addresses hold both signs.
_BREAKS: Final = "@:"


class _Bash(BashComplete):
    """Completion for bash that sees an address as one word.

    bash hands over words that it broke at `@` and `:`, and puts in only what stands behind the last of them.
    """

    source_template = BashComplete.source_template.replace(
        "$(env ", '$(env COMP_LINE="$COMP_LINE" COMP_POINT="$COMP_POINT" '
    )
    _begun = ""

    @override
    def get_completion_args(self) -> tuple[list[str], str]:
        line = os.environ.get("COMP_LINE")
        if line is None:
            return super().get_completion_args()
        typed = line.encode()[: int(os.environ.get("COMP_POINT", len(line)))].decode(errors="ignore")
        words = split_arg_string(typed)
        self._begun = "" if typed[-1:].isspace() or len(words) < 2 else words.pop()
        return words[1:], self._begun

    @override
    def format_completion(self, item: CompletionItem[Any]) -> str:
        kept = max(self._begun.rfind(sign) for sign in _BREAKS) + 1
        return f"{item.type},{str(item.value)[kept:] if item.type == 'plain' else item.value}"


def prepare() -> None:
    """Make the shells known to click; only needed where a shell asks, or its script is written."""
    add_completion_class(_Bash, "bash")


@click.command(short_help="Write the completion script of a shell.")
@click.argument("shell", type=click.Choice(_SHELLS), metavar="bash|zsh|fish")
def completion(*, shell: str) -> None:
    """Write the script that lets SHELL complete commands, options, addresses, cooldowns and plans with the Tab key.

    Words come from the archive that a command would use: --archive, STILLROOM_ARCHIVE, or the folder you are in.

    \b
    Examples:
      eval "$(stillroom completion bash)"        in ~/.bashrc
      eval "$(stillroom completion zsh)"         in ~/.zshrc, after compinit
      stillroom completion fish > ~/.config/fish/completions/stillroom.fish
    """
    from click.shell_completion import ShellComplete

    prepare()
    root = click.get_current_context().find_root()
    kind = get_completion_class(shell)
    assert kind is not None  # noqa: S101 - the three are known to click
    # Asked of the class, not of `BashComplete.source`, which would start a shell to see how old it is.
    click.echo(ShellComplete.source(kind(root.command, {}, "stillroom", VARIABLE)), nl=False)
