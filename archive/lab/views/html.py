"""Small pieces of HTML for notebooks.

Rules: every text is escaped here; no script, no address from outside; a piece takes the colours of the page around it.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from html import escape
from unicodedata import category

__all__ = ["described", "fragment", "grid"]

_CELL = "padding:0.1em 0.8em 0.1em 0;text-align:left;vertical-align:top"


def _text(text: object) -> str:
    # Control codes and lone surrogates have no place in HTML (HTML Living Standard, 13.2.3.5).
    # Thin and unbroken spaces stand between digits and units; Python does not count them as printable.
    plain = "".join(
        sign
        if sign.isprintable() or sign in "\t\n" or category(sign) == "Zs"
        else "\N{REPLACEMENT CHARACTER}"
        for sign in str(text)
    )
    return escape(plain)


def fragment(title: str, *parts: str, marks: Sequence[str] = ()) -> str:
    """Piece of a page: title, what is to be known first, and parts that are HTML already.

    Examples
    --------
    >>> fragment("a < b")
    '<div class="stillroom"><div><strong>a &lt; b</strong></div></div>'
    """
    told = "".join(f'<div role="note"><em>{_text(mark)}</em></div>' for mark in marks)
    return f'<div class="stillroom"><div><strong>{_text(title)}</strong></div>{told}{"".join(parts)}</div>'


def grid(heads: Sequence[str], rows: Iterable[Sequence[object]], *, more: int = 0) -> str:
    """Table as HTML; `more` counts rows that are not shown."""
    top = "".join(f'<th scope="col" style="{_CELL}">{_text(head)}</th>' for head in heads)
    body = "".join(
        "<tr>" + "".join(_cell(cell, whole=place == 0) for place, cell in enumerate(row)) + "</tr>"
        for row in rows
    )
    left = f"<div>and {more} more</div>" if more > 0 else ""
    return f"<table><thead><tr>{top}</tr></thead><tbody>{body}</tbody></table>{left}"


def _cell(content: object, *, whole: bool) -> str:
    """Cell; what stands first is an address or a name, and is not broken."""
    return f'<td style="{_CELL}{";white-space:nowrap" if whole else ""}">{_text(content)}</td>'


def described(content: Mapping[str, object]) -> str:
    """Names and what they stand for, as a table; empty ones are left out."""
    rows = "".join(
        f'<tr><th scope="row" style="{_CELL}">{_text(name)}</th><td style="{_CELL}">{_text(value)}</td></tr>'
        for name, value in content.items()
        if value not in ("", None)
    )
    return f"<table><tbody>{rows}</tbody></table>"
