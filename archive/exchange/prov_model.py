"""A provenance document in the terms of PROV-DM: what there is of it, before it is written in any notation.

Only what archives say is here: elements, ten relations, attributes, qualified names. The order is that of adding, so that
equal documents are written equally.

References
----------
.. [1] L. Moreau and P. Missier (eds.), PROV-DM: The PROV Data Model, W3C Recommendation, 30 April 2013, section 5.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime
from typing import Final, Literal

__all__ = ["RELATIONS", "Attribute", "Element", "ProvDocument", "Qualified", "Relation"]

ElementKind = Literal["entity", "activity", "agent"]

RELATIONS: Final[Mapping[str, tuple[str, ...]]] = {
    "wasGeneratedBy": ("entity", "activity", "time"),
    "used": ("activity", "entity", "time"),
    "wasInformedBy": ("informed", "informant"),
    "wasInvalidatedBy": ("entity", "activity", "time"),
    "wasDerivedFrom": ("generatedEntity", "usedEntity", "activity", "generation", "usage"),
    "wasAttributedTo": ("entity", "agent"),
    "wasAssociatedWith": ("activity", "agent", "plan"),
    "actedOnBehalfOf": ("delegate", "responsible", "activity"),
    "specializationOf": ("specificEntity", "generalEntity"),
    "hadMember": ("collection", "entity"),
}
"""Names of the relations, and of what stands in each in the order of PROV-N; the first two may not be left out."""


class Qualified(str):
    """A qualified name, ``prefix:local``, as the value of an attribute."""

    __slots__ = ()


Attribute = str | int | float | bool | datetime
"""A value; a `Qualified` is a name, other text a string."""


@dataclass(frozen=True)
class Element:
    """An entity, activity or agent.

    Attributes
    ----------
    kind : {"entity", "activity", "agent"}
    identifier : str
        Qualified name.
    begin, end : datetime or None
        Of an activity.
    attributes : tuple of (str, value)
        In order; a name may come more than once.
    """

    kind: ElementKind
    identifier: str
    begin: datetime | None = None
    end: datetime | None = None
    attributes: tuple[tuple[str, Attribute], ...] = ()


@dataclass(frozen=True)
class Relation:
    """One relation.

    Attributes
    ----------
    kind : str
        One of `RELATIONS`.
    parts : tuple of str, datetime or None
        What stands in it, in the order of `RELATIONS`.
    identifier : str or None
        Qualified name, where another relation speaks of this one.
    attributes : tuple of (str, value)
    """

    kind: str
    parts: tuple[str | datetime | None, ...]
    identifier: str | None = None
    attributes: tuple[tuple[str, Attribute], ...] = ()

    def part(self, name: str) -> str | datetime | None:
        """Return what stands in the place of that name."""
        return self.parts[RELATIONS[self.kind].index(name)]

    def names(self) -> tuple[str, ...]:
        """Return the identifiers of all that it relates, other relations too."""
        return tuple(part for part in self.parts if isinstance(part, str))


@dataclass
class ProvDocument:
    """A document; elements are added once, and asking for the same again is no fault.

    Attributes
    ----------
    prefixes : dict of str to str
        Namespace of each prefix in use.
    elements : dict of str to Element
        By identifier.
    relations : list of Relation
    """

    prefixes: dict[str, str] = field(default_factory=dict)
    elements: dict[str, Element] = field(default_factory=dict)
    relations: list[Relation] = field(default_factory=list)

    def add(
        self,
        kind: ElementKind,
        identifier: str,
        attributes: Mapping[str, Attribute | None] | None = None,
        *,
        types: tuple[str, ...] = (),
        begin: datetime | None = None,
        end: datetime | None = None,
    ) -> str:
        """Add an element unless it is there, and return its identifier; attributes without value are left out."""
        if identifier not in self.elements:
            given: list[tuple[str, Attribute]] = [("prov:type", Qualified(each)) for each in types]
            given += [(name, value) for name, value in (attributes or {}).items() if value is not None]
            self.elements[identifier] = Element(kind, identifier, begin, end, tuple(given))
        return identifier

    def relate(
        self,
        kind: str,
        *parts: str | datetime | None,
        identifier: str | None = None,
        attributes: tuple[tuple[str, Attribute], ...] = (),
    ) -> str | None:
        """Add a relation and return its identifier; what is left out at the end is None."""
        filled = (*parts, *(None,) * (len(RELATIONS[kind]) - len(parts)))
        self.relations.append(Relation(kind, filled, identifier, attributes))
        return identifier
