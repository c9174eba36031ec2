"""Contradictions in a provenance document are found, and a sound one has none.

The rules are those of the W3C Recommendation "Constraints of the PROV Data Model" (2013); each case breaks one.
"""

from __future__ import annotations

from collections.abc import Callable
from datetime import UTC, datetime

import pytest

from archive.exchange.prov_checks import violations
from archive.exchange.prov_model import ProvDocument, Qualified


def at(hour: int) -> datetime:
    """Give a moment of one day."""
    return datetime(2026, 3, 2, hour, tzinfo=UTC)


def sound() -> ProvDocument:
    """Give two steps: raw -> a -> b."""
    made = ProvDocument(prefixes={"x": "urn:example:x#"})
    for name in ("raw", "a", "b", "plan"):
        made.add("entity", f"x:{name}", types=("prov:Plan",) if name == "plan" else ())
    made.add("agent", "x:program", types=("prov:SoftwareAgent",))
    for name, source, result, begin in (("first", "raw", "a", 1), ("second", "a", "b", 3)):
        act = made.add("activity", f"x:{name}", begin=at(begin), end=at(begin + 1))
        made.relate("wasAssociatedWith", act, "x:program", "x:plan")
        use = made.relate("used", act, f"x:{source}", at(begin), identifier=f"x:use.{name}")
        gen = made.relate("wasGeneratedBy", f"x:{result}", act, at(begin + 1), identifier=f"x:made.{name}")
        made.relate("wasDerivedFrom", f"x:{result}", f"x:{source}", act, gen, use)
    return made


def test_a_sound_document_contradicts_nothing() -> None:
    assert violations(sound()) == []


def _activity(name: str, begin: int, end: int) -> Callable[[ProvDocument], None]:
    return lambda made: made.add("activity", f"x:{name}", begin=at(begin), end=at(end)) and None


CASES = [
    pytest.param(_activity("odd", 5, 4), "constraint 30", id="ends before it begins"),
    pytest.param(lambda d: d.relate("used", "x:first", "x:raw", at(9)), "constraint 33", id="used outside the activity"),
    pytest.param(lambda d: d.relate("wasGeneratedBy", "x:raw", "x:first", at(9)), "constraint 34", id="made outside the activity"),
    pytest.param(lambda d: d.relate("wasGeneratedBy", "x:a", "x:first", at(2)), "constraint 24", id="made twice by one"),
    pytest.param(lambda d: d.relate("wasGeneratedBy", "x:a", "x:second", at(4)), "constraint 39", id="made by two"),
    pytest.param(lambda d: d.relate("used", "x:first", "x:b", at(1)), "constraint 37", id="used before it is made"),
    pytest.param(lambda d: d.relate("wasInvalidatedBy", "x:a", "x:first", at(2)), "constraint 38", id="used after it is withdrawn"),
    pytest.param(lambda d: d.relate("wasInvalidatedBy", "x:b", "x:first", at(2)), "constraint 36", id="withdrawn before it is made"),
    pytest.param(lambda d: d.relate("wasDerivedFrom", "x:a", "x:b"), "constraint 42", id="derived from what is later"),
    pytest.param(lambda d: d.relate("wasDerivedFrom", "x:a", "x:b"), "derived from itself", id="circle"),
    pytest.param(lambda d: d.relate("wasDerivedFrom", "x:raw", "x:raw"), "derived from itself", id="smallest circle"),
    pytest.param(
        lambda d: d.relate("wasDerivedFrom", "x:b", "x:raw", "x:second", "x:made.second", "x:use.second"),
        "constraint 51", id="derivation by the use of something else",
    ),
    pytest.param(
        lambda d: d.relate("wasDerivedFrom", "x:a", "x:a", "x:second", "x:made.first", "x:use.second"),
        "constraint 41", id="made before its source is used",
    ),
    pytest.param(lambda d: d.relate("used", "x:a", "x:raw"), "constraint 50", id="entity that acts"),
    pytest.param(lambda d: d.relate("wasAttributedTo", "x:a", "x:plan"), "constraint 50", id="entity that is answerable"),
    pytest.param(lambda d: d.relate("used", "x:first", "x:raw", identifier="x:a"), "names two things", id="one name for two"),
    pytest.param(lambda d: d.relate("wasDerivedFrom", "x:b", "x:raw", None, "x:use.first"), "and is none", id="use as generation"),
    pytest.param(lambda d: d.relate("used", "x:first", "x:nothing"), "does not describe", id="dangling"),
    pytest.param(lambda d: d.add("entity", "y:z"), "no namespace", id="unknown prefix of a name"),
    pytest.param(lambda d: d.add("entity", "x:z", {"y:term": 1}), "no namespace", id="unknown prefix of a term"),
    pytest.param(lambda d: d.add("entity", "x:z", {"prov:type": Qualified("y:T")}), "no namespace", id="unknown prefix of a type"),
]  # fmt: skip


@pytest.mark.parametrize(("spoil", "says"), CASES)
def test_a_contradiction_is_told(spoil: Callable[[ProvDocument], object], says: str) -> None:
    document = sound()
    spoil(document)
    found = violations(document)
    assert any(says in sentence for sentence in found), found


def test_nothing_is_said_of_times_that_are_not_known() -> None:
    document = ProvDocument(prefixes={"x": "urn:example:x#"})
    document.add("entity", "x:a")
    document.add("activity", "x:act")
    document.relate("used", "x:act", "x:a")
    document.relate("wasGeneratedBy", "x:a", "x:act")
    assert violations(document) == []
