"""Text of people as a page, a file or a terminal may show it: nothing in it steers what shows it.

Rules: the words stay as they were written; only control characters other than tab and line ends, and the marks that turn
the direction of writing, are taken out of what is shown, or escaped in JSON. What is kept in the archive is not touched.

References
----------
.. [1] The Unicode Standard, version 16, section 23.1 (control codes).
.. [2] Unicode Standard Annex 9, Unicode Bidirectional Algorithm, section 2 (directional formatting characters).
"""

from __future__ import annotations

from typing import Final

__all__ = ["json_escaped", "visible"]

_CONTROLS: Final = (*(code for code in range(0x20) if code not in (0x09, 0x0A, 0x0D)), *range(0x7F, 0xA0))
_DIRECTIONS: Final = (0x061C, 0x200E, 0x200F, *range(0x202A, 0x202F), *range(0x2066, 0x206A))
_TAKEN_OUT: Final = dict.fromkeys((*_CONTROLS, *_DIRECTIONS))
_ESCAPED: Final = {code: f"\\u{code:04x}" for code in _TAKEN_OUT}


def visible(text: str) -> str:
    r"""Text without what could steer the program that shows it.

    Examples
    --------
    >>> visible("film\x1b[31m \u202eon TO-4")
    'film[31m on TO-4'
    """
    return text.translate(_TAKEN_OUT)


def json_escaped(text: str) -> str:
    r"""JSON text in which such characters stand as escapes; it says the same.

    Parameters
    ----------
    text : str
        As `json.dumps` gives it, so that such characters occur inside strings alone.

    Examples
    --------
    >>> json_escaped('"film \u202eon TO-4"')
    '"film \\u202eon TO-4"'
    """
    return text.translate(_ESCAPED)
