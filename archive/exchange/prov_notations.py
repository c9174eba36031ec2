"""PROV-JSON and PROV-N of a provenance document.

References
----------
.. [1] T. D. Huynh et al., The PROV-JSON Serialization, W3C Member Submission, 24 April 2013.
.. [2] L. Moreau and P. Missier (eds.), PROV-N: The Provenance Notation, W3C Recommendation, 30 April 2013.
"""

from __future__ import annotations

import json
from datetime import UTC, datetime
from typing import Any

from archive.exchange.prov_model import RELATIONS, Attribute, Element, ProvDocument, Qualified, Relation
from schemas.visible_text import visible

__all__ = ["prov_json", "prov_n"]

# Relations that PROV-N writes without an identifier and without attributes [2], sections 3.5 and 3.6.
_BARE = ("specializationOf", "hadMember")


def prov_json(document: ProvDocument) -> str:
    """Return a document as PROV-JSON, with a line end.

    Notes
    -----
    Relations without a name of their own are numbered in the order of the document, as blank nodes.
    ASCII alone: readable in any code page of a pipe, and nothing in it can steer a terminal.
    """
    content: dict[str, Any] = {"prefix": dict(document.prefixes)}
    for kind in ("entity", "activity", "agent"):
        found = {each.identifier: _element(each) for each in document.elements.values() if each.kind == kind}
        if found:
            content[kind] = found
    for number, relation in enumerate(document.relations, 1):
        name = relation.identifier or f"_:n{number}"
        content.setdefault(relation.kind, {})[name] = _relation(relation)
    return json.dumps(content, indent=1, ensure_ascii=True, allow_nan=False) + "\n"


def _element(element: Element) -> dict[str, Any]:
    times = {"prov:startTime": element.begin, "prov:endTime": element.end}
    written = {name: _time(moment) for name, moment in times.items() if moment is not None}
    return written | _attributes(element.attributes)


def _relation(relation: Relation) -> dict[str, Any]:
    written = {
        f"prov:{name}": _time(part) if isinstance(part, datetime) else part
        for name, part in zip(RELATIONS[relation.kind], relation.parts, strict=True)
        if part is not None
    }
    return written | _attributes(relation.attributes)


def _attributes(attributes: tuple[tuple[str, Attribute], ...]) -> dict[str, Any]:
    found: dict[str, list[Any]] = {}
    for name, value in attributes:
        found.setdefault(name, []).append(_json_value(value))
    return {name: values if len(values) > 1 else values[0] for name, values in found.items()}


def _json_value(value: Attribute) -> Any:
    if isinstance(value, Qualified):
        return {"$": str(value), "type": "prov:QUALIFIED_NAME"}
    if isinstance(value, str):
        return value
    text, kind = _typed(value)
    return {"$": text, "type": kind}


def _typed(value: Attribute) -> tuple[str, str]:
    if isinstance(value, bool):
        return ("true" if value else "false"), "xsd:boolean"
    if isinstance(value, datetime):
        return _time(value), "xsd:dateTime"
    return str(value), "xsd:long" if isinstance(value, int) else "xsd:double"


def _time(moment: datetime) -> str:
    return moment.astimezone(UTC).isoformat().replace("+00:00", "Z")


def prov_n(document: ProvDocument) -> str:
    """Return a document in PROV-N, with a line end."""
    lines = ["document"]
    lines += [f"  prefix {prefix} <{namespace}>" for prefix, namespace in document.prefixes.items()]
    lines.append("")
    lines += [f"  {_statement(each)}" for each in document.elements.values()]
    lines += [f"  {_related(each)}" for each in document.relations]
    # PROV-N has no escape for a control character.
    return visible("\n".join([*lines, "endDocument", ""]))


def _statement(element: Element) -> str:
    parts = [element.identifier]
    if element.kind == "activity":
        parts += [_moment(element.begin), _moment(element.end)]
    return f"{element.kind}({', '.join(parts)}{_bracket(element.attributes)})"


def _related(relation: Relation) -> str:
    parts = [_moment(part) if not isinstance(part, str) else part for part in relation.parts]
    if relation.kind in _BARE:
        return f"{relation.kind}({', '.join(parts)})"
    name = f"{relation.identifier}; " if relation.identifier else ""
    return f"{relation.kind}({name}{', '.join(parts)}{_bracket(relation.attributes)})"


def _moment(moment: datetime | None) -> str:
    return "-" if moment is None else _time(moment)


def _bracket(attributes: tuple[tuple[str, Attribute], ...]) -> str:
    if not attributes:
        return ""
    return f", [{', '.join(f'{name}={_literal(value)}' for name, value in attributes)}]"


def _literal(value: Attribute) -> str:
    if isinstance(value, Qualified):
        return f"'{value}'"
    if isinstance(value, str):
        return _quoted(value)
    text, kind = _typed(value)
    return f"{_quoted(text)} %% {kind}"


def _quoted(text: str) -> str:
    for sign, escape in (("\\", "\\\\"), ('"', '\\"'), ("\n", "\\n"), ("\r", "\\r"), ("\t", "\\t")):
        text = text.replace(sign, escape)
    return f'"{text}"'
