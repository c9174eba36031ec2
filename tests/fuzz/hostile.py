"""A cooldown whose every text tries something: markup, formulas, TeX, templates, SQL, control codes, bidirectional overrides."""

from __future__ import annotations

import json
import tomllib
from datetime import datetime
from pathlib import Path
from typing import Any

from pydantic import BaseModel

from schemas.cooldown import EFFECTS, CooldownSheet
from tests.small_cooldown import SHEET, write_folder

__all__ = ["CONTROLS", "EVIL", "FILE", "hostile_folder"]

CONTROLS = "\x1b]0;owned\x07\x1b[2J\x9b31m\u202e\u2066\u200f\x08"
EVIL = (
    '=HYPERLINK("http://x.invalid")<script>alert(1)</script><img src=x onerror=alert(2)>\' onload="alert(3)\\input{/etc/passwd}'
    "\\immediate\\write18{touch owned}\\catcode`\\@=11^^5cinput{/etc/passwd}$$\\def\\x{\\x}\\x$$%{#}&~_^`|\\end{document}"
    "{{7*7}}{% raw %}((( 7*7 )))((* raw *))'; DROP TABLE sweep; --\r\n\\input{/etc/passwd}\n\n\\end{document}\n" + CONTROLS
)  # fmt: skip
FILE = "=cmd '$(touch owned)' <b>input%n..\u202e.txt"

# Words that say something by being there: whether a dose counts, when the cooldown was.
_MEANT = frozenset({"crossed_out", "undated", "layer_definition", "why_not"})


def _spoilt(record: BaseModel) -> dict[str, Any]:
    """Give a record's content with every free text replaced."""
    content: dict[str, Any] = {}
    for name, field in type(record).model_fields.items():
        value = getattr(record, name)
        is_text = "20000" in f"{field.annotation!r} {field.metadata!r}"
        if is_text and not isinstance(value, tuple) and name not in _MEANT:
            content[name] = f"{EVIL} [{name}]"
        elif value is not None:
            content[name] = _inside(value)
    return content


def _inside(value: Any) -> Any:
    if isinstance(value, CooldownSheet | BaseModel) and "value" not in type(value).model_fields:
        return _spoilt(value)
    if isinstance(value, tuple):
        return [_inside(each) for each in value]
    if isinstance(value, dict):
        return {key: _inside(each) for key, each in value.items()}
    return json.loads(json.dumps(value, default=_plain)) if not isinstance(value, datetime) else value


def _plain(value: Any) -> Any:
    return value.model_dump(mode="json") if isinstance(value, BaseModel) else str(value)


def _toml(value: Any) -> str:
    """Write a value as TOML, tables in line."""
    if isinstance(value, datetime):
        return value.isoformat()
    if isinstance(value, dict):
        return "{ " + ", ".join(f"{json.dumps(key)} = {_toml(each)}" for key, each in value.items()) + " }"
    if isinstance(value, list):
        return "[" + ", ".join(_toml(each) for each in value) + "]"
    # A JSON string is a TOML basic string, but for DEL; ASCII alone, so that nothing steers an editor.
    return json.dumps(value)


def hostile_folder(folder: Path) -> Path:
    """Write the folder and return it."""
    write_folder(folder)
    plain = tomllib.loads(SHEET.replace("NAME", "2026-03"))
    sheet = CooldownSheet.model_validate_json(json.dumps(plain, default=lambda moment: moment.isoformat()))
    content = _spoilt(sheet)
    content["operators"] = [EVIL, "=1+1"]
    content["licence"] = EVIL
    content["other_files"] = [FILE]
    content["effect"] = [
        {"effect": effect, "state": "bounded", "bound": EVIL, "reason": EVIL} for effect in EFFECTS
    ]
    content["note"] = [{"role": EVIL, "text": EVIL}]
    content["event"] = [{"at": sheet.begin, "what": "leak", "text": EVIL, "sweeps": ["s002"]}]
    content["waiver"] = [
        {
            "check": "quantity-far-from-usual",
            "place": EVIL,
            "reason": EVIL,
            "role": EVIL,
            "date": "2026-04-01",
        }
    ]
    text = "\n".join(f"{key} = {_toml(value)}" for key, value in content.items()) + "\n"
    (folder / "cooldown.toml").write_text(text, encoding="utf-8")
    (folder / FILE).write_text(EVIL, encoding="utf-8")
    return folder
