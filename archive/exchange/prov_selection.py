"""The part of a provenance document that lies behind one thing."""

from __future__ import annotations

from collections import defaultdict

from archive.exchange.prov_model import ProvDocument, Qualified, Relation

__all__ = ["lying_behind"]


def lying_behind(document: ProvDocument, identifier: str) -> ProvDocument:
    """Return what a thing came from: elements, and the relations among them.

    Parameters
    ----------
    document : ProvDocument
    identifier : str
        Qualified name of an entity in it; its members belong to it.

    Notes
    -----
    What an activity used counts where nothing more exact is said: a channel stems from its own raw files, not from all
    that were taken in together.
    """
    starting: dict[str, list[Relation]] = defaultdict(list)
    for relation in document.relations:
        starting[str(relation.parts[0])].append(relation)
    kept = {identifier}
    waiting = [identifier, *_members(starting[identifier])]
    while waiting:
        name = waiting.pop()
        kept.add(name)
        waiting += [each for each in _next(document, starting, name) if each not in kept]
    relations = [
        relation
        for relation in document.relations
        if all(name in kept for name in relation.names() if name in document.elements)
    ]
    return ProvDocument(
        prefixes=dict(document.prefixes),
        elements={name: element for name, element in document.elements.items() if name in kept},
        relations=relations,
    )


def _members(relations: list[Relation]) -> list[str]:
    return [str(each.part("entity")) for each in relations if each.kind == "hadMember"]


def _next(document: ProvDocument, starting: dict[str, list[Relation]], name: str) -> list[str]:
    """Return what lies one step behind an element."""
    found: list[str] = []
    derived = any(each.kind == "wasDerivedFrom" and each.part("activity") for each in starting[name])
    for relation in starting[name]:
        if relation.kind in ("hadMember", "used"):
            continue
        found += [each for each in relation.names() if each in document.elements]
        if relation.kind == "wasGeneratedBy" and not derived:
            maker = starting[str(relation.part("activity"))]
            found += [str(each.part("entity")) for each in maker if each.kind == "used"]
    element = document.elements.get(name)
    for _, value in element.attributes if element is not None else ():
        if isinstance(value, Qualified) and value in document.elements:
            found.append(str(value))
    return found
