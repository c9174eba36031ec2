"""What contradicts itself in a provenance document: the constraints of PROV that a record of work can break.

No validator could be had that looks at the order of events; these are the rules that matter here, each with the number
that it has in the Recommendation, and three of our own: nothing dangles, derivation has no cycle, every prefix is known.

References
----------
.. [1] J. Cheney, P. Missier and L. Moreau (eds.), Constraints of the PROV Data Model, W3C Recommendation, 30 April 2013.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator
from datetime import datetime

from archive.exchange.prov_model import RELATIONS, ProvDocument, Qualified, Relation

__all__ = ["violations"]

# What stands in each place of a relation has to be of this kind ([1], constraint 50).
_KINDS = {
    "entity": "entity", "activity": "activity", "agent": "agent", "generatedEntity": "entity", "usedEntity": "entity",
    "plan": "entity", "informed": "activity", "informant": "activity", "delegate": "agent", "responsible": "agent",
    "specificEntity": "entity", "generalEntity": "entity", "collection": "entity",
}  # fmt: skip
_BUILT_IN = ("prov", "xsd")


def violations(document: ProvDocument) -> list[str]:
    """Return a sentence about everything that contradicts itself, sorted; empty if nothing does."""
    return sorted({
        *_dangling(document), *_prefixes(document), *_kinds(document), *_activities(document), *_generations(document),
        *_usages(document), *_derivations(document), *_cycles(document),
    })  # fmt: skip


def _events(document: ProvDocument, kind: str) -> Iterator[tuple[Relation, str, str | None, datetime | None]]:
    """Yield the relation, the entity, the activity and the time of every event of a kind."""
    for relation in document.relations:
        if relation.kind == kind:
            activity, moment = relation.part("activity"), relation.part("time")
            yield (
                relation,
                str(relation.part("entity")),
                None if activity is None else str(activity),
                moment if isinstance(moment, datetime) else None,
            )


def _dangling(document: ProvDocument) -> Iterator[str]:
    known = {*document.elements, *(each.identifier for each in document.relations if each.identifier)}
    for relation in document.relations:
        for name in relation.names():
            if name not in known:
                yield f"{relation.kind} speaks of {name}, which the document does not describe"


def _prefixes(document: ProvDocument) -> Iterator[str]:
    attributes = [
        *(pair for element in document.elements.values() for pair in element.attributes),
        *(pair for relation in document.relations for pair in relation.attributes),
    ]
    names = [
        *document.elements,
        *(each.identifier for each in document.relations if each.identifier),
        *(name for name, _ in attributes),
        *(value for _, value in attributes if isinstance(value, Qualified)),
    ]
    for name in names:
        prefix = name.partition(":")[0]
        if prefix not in document.prefixes and prefix not in _BUILT_IN:
            yield f"the prefix of {name} has no namespace"


def _kinds(document: ProvDocument) -> Iterator[str]:
    from_relation = {each.identifier: each.kind for each in document.relations if each.identifier}
    seen: set[str] = set()
    for relation in document.relations:
        if relation.identifier is None:
            continue
        if relation.identifier in seen or relation.identifier in document.elements:
            yield f"{relation.identifier} names two things (constraints 22, 23 and 54)"
        seen.add(relation.identifier)
    for relation in document.relations:
        for place in RELATIONS[relation.kind]:
            if place not in _KINDS:
                continue
            name = relation.part(place)
            element = document.elements.get(str(name))
            if element is not None and element.kind != _KINDS[place]:
                yield f"{name} is an {element.kind} and stands in {relation.kind} as an {_KINDS[place]} (constraint 50)"
        for place, kind in (("generation", "wasGeneratedBy"), ("usage", "used")):
            if place not in RELATIONS[relation.kind] or (name := relation.part(place)) is None:
                continue
            if from_relation.get(str(name), kind) != kind:
                yield f"{name} stands in {relation.kind} as a {place} and is none"


def _activities(document: ProvDocument) -> Iterator[str]:
    for element in document.elements.values():
        if element.begin is not None and element.end is not None and element.end < element.begin:
            yield f"{element.identifier} ends before it begins (constraint 30)"
    for kind, number in (("used", 33), ("wasGeneratedBy", 34)):
        for _, entity, activity, moment in _events(document, kind):
            acting = document.elements.get(activity or "")
            if acting is None or moment is None:
                continue
            if (acting.begin is not None and moment < acting.begin) or (
                acting.end is not None and acting.end < moment
            ):
                yield f"{entity} in {kind} lies outside the time of {activity} (constraint {number})"


def _generations(document: ProvDocument) -> Iterator[str]:
    makers: dict[str, list[tuple[str | None, datetime | None]]] = defaultdict(list)
    for _, entity, activity, moment in _events(document, "wasGeneratedBy"):
        makers[entity].append((activity, moment))
    for entity, found in makers.items():
        if len({activity for activity, _ in found}) < len(found):
            yield f"{entity} is generated twice by one activity (constraint 24)"
        if len(found) > 1:
            yield f"{entity} is generated by {len(found)} activities, which would have to be simultaneous (constraint 39)"


def _stated(document: ProvDocument, kind: str) -> dict[str, list[datetime]]:
    found: dict[str, list[datetime]] = defaultdict(list)
    for _, entity, _, moment in _events(document, kind):
        if moment is not None:
            found[entity].append(moment)
    return found


def _usages(document: ProvDocument) -> Iterator[str]:
    made, used, ended = (_stated(document, kind) for kind in ("wasGeneratedBy", "used", "wasInvalidatedBy"))
    for entity, moments in used.items():
        if entity in made and min(moments) < min(made[entity]):
            yield f"{entity} is used before it is generated (constraint 37)"
        if entity in ended and max(moments) > max(ended[entity]):
            yield f"{entity} is used after it is invalidated (constraint 38)"
    for entity, moments in ended.items():
        if entity in made and min(moments) < min(made[entity]):
            yield f"{entity} is invalidated before it is generated (constraint 36)"


def _derivations(document: ProvDocument) -> Iterator[str]:
    made = _stated(document, "wasGeneratedBy")
    by_name = {each.identifier: each for each in document.relations if each.identifier}
    for relation in document.relations:
        if relation.kind != "wasDerivedFrom":
            continue
        later, earlier = str(relation.part("generatedEntity")), str(relation.part("usedEntity"))
        if later in made and earlier in made and min(made[later]) < min(made[earlier]):
            yield f"{later} is generated before {earlier}, from which it is derived (constraint 42)"
        generation, usage = (by_name.get(str(relation.part(place))) for place in ("generation", "usage"))
        for event, entity in ((generation, later), (usage, earlier)):
            if event is None or event.kind not in ("wasGeneratedBy", "used"):
                continue
            if event.part("entity") != entity or event.part("activity") != relation.part("activity"):
                yield f"the derivation of {later} from {earlier} names an event of something else (constraint 51)"
        after, before = (None if each is None else each.part("time") for each in (generation, usage))
        if isinstance(after, datetime) and isinstance(before, datetime) and after < before:
            yield f"{later} is generated before {earlier} is used for it (constraint 41)"


def _cycles(document: ProvDocument) -> Iterator[str]:
    behind: dict[str, list[str]] = defaultdict(list)
    for relation in document.relations:
        if relation.kind in ("wasDerivedFrom", "specializationOf"):
            behind[str(relation.parts[0])].append(str(relation.parts[1]))
    done: set[str] = set()
    for start in list(behind):
        path: list[str] = []
        waiting: list[tuple[str, bool]] = [(start, False)]
        while waiting:
            name, left = waiting.pop()
            if left:
                path.pop()
                done.add(name)
            elif name in path:
                yield f"{name} is derived from itself: {' from '.join([*path[path.index(name) :], name])}"
            elif name not in done:
                path.append(name)
                waiting.append((name, True))
                waiting += [(each, False) for each in behind[name]]
