"""Provenance of an archive, read back by others and held against the documents it was made from."""

from __future__ import annotations

import json
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import pytest

from archive import Archive
from archive.errors import BadRequest, MissingFile, UnknownAddress
from archive.exchange.closure import Holdings, closure, needs_of
from archive.exchange.prov_lineage import Lineage
from archive.exchange.prov_model import ProvDocument, Qualified
from archive.exchange.prov_names import cooldown_namespace, escaped
from archive.exchange.prov_notations import prov_json, prov_n
from archive.exchange.sealed_document import SealedDocument
from schemas.acts import AmendmentDocument, WithdrawalDocument
from schemas.base import Record
from schemas.lineage import ReductionDocument, Software
from tests.outside import missing

DROP = "2026-04/s002@drop.1"


def read(text: str, kind: str) -> Any:
    """Give a document as the `prov` package reads it."""
    try:
        from prov.model import ProvDocument as Other
    except ImportError:
        missing("the package prov is not installed")
    return Other.deserialize(content=text, format=kind)


@pytest.fixture
def told(lab: Archive) -> dict[str, Any]:
    """Give the provenance of the later cooldown, by kinds of PROV-JSON."""
    found = lab.provenance("2026-04")
    assert found.contradictions == ()
    content: dict[str, Any] = json.loads(found.text)
    return content


def test_both_notations_say_the_same_to_another_program(lab: Archive) -> None:
    """Against the package prov 3: read, merged without conflict, and equal."""
    one = read(lab.provenance("2026-04").text, "json")
    other = read(lab.provenance("2026-04", notation="provn").text, "provn")
    assert one == other
    assert len(list(one.unified().get_records())) == len(list(one.get_records())) > 100


def test_the_notation_is_valid_by_its_schema(lab: Archive) -> None:
    """Against the JSON Schema of the PROV-JSON submission, as the package prov carries it."""
    try:
        import jsonschema
        import prov
    except ImportError:
        missing("the packages prov and jsonschema are not installed")
    path = Path(prov.__file__).parent / "tests" / "schemas" / "prov-json.schema.json"
    if not path.is_file():
        missing("the package prov holds no schema of PROV-JSON")
    jsonschema.validate(
        json.loads(lab.provenance("2026-04").text), json.loads(path.read_text(encoding="utf-8"))
    )


def test_every_sign_survives_both_notations() -> None:
    document = ProvDocument(prefixes={"x": "urn:example:x#"})
    text = 'a "quoted" \\ line\nwith\ttabs, µ and %% \r'
    document.add(
        "entity",
        "x:e",
        {"x:text": text, "x:n": 3, "x:f": 0.1, "x:yes": True, "x:at": datetime(2026, 3, 2, tzinfo=UTC)},
    )
    document.add("entity", "x:e2", {"prov:type": Qualified("x:Kind")}, types=("x:Other",))
    one, other = read(prov_json(document), "json"), read(prov_n(document), "provn")
    assert one == other
    (record,) = one.get_record("x:e")
    values = {str(name): value for name, value in record.attributes}
    assert values["x:text"] == text
    assert values["x:f"] == 0.1


def test_a_result_is_told_down_to_raw_files_and_programs(lab: Archive) -> None:
    found = json.loads(lab.provenance(f"{DROP}#period_drop").text)
    home, earlier = "cooldown-2026-04", "cooldown-2026-03"
    assert f"{home}:raw.1.film.csv" in found["entity"]
    assert f"{earlier}:raw.1.empty.csv" in found["entity"], (
        "the background comes from the empty cell of another cooldown"
    )
    assert f"{home}:raw.1.cooldown.toml" not in found["entity"], "the channels come from the table alone"
    assert f"{home}:output.s002.drop.1.shift" not in found["entity"], (
        "another output of the same step is not behind it"
    )
    assert any(name.startswith("content:plan.drop.r1.") for name in found["entity"])
    assert any(name.startswith("content:cell.bob.r1.") for name in found["entity"])
    assert {agent["prov:type"]["$"] for agent in found["agent"].values()} == {
        "prov:Person",
        "prov:SoftwareAgent",
    }
    assert "content" in found["prefix"]


@pytest.mark.parametrize(
    "address",
    [
        "2026-04",
        "2026-04.a1",
        "2026-04/s002",
        "2026-04/s002#period",
        "2026-04/d02",
        "2026-04.a1:film.csv",
        DROP,
        f"{DROP}#shift",
    ],
)
def test_what_lies_behind_a_thing_is_whole(lab: Archive, address: str) -> None:
    found = lab.provenance(address)
    assert found.contradictions == ()
    assert read(found.text, "json").get_records()


@pytest.mark.parametrize(
    ("address", "error"),
    [
        ("2026-07", UnknownAddress),
        ("2026-04/s009", UnknownAddress),
        ("2026-04/s002#nothing", UnknownAddress),
        ("bob.r1", BadRequest),
        ("no address", BadRequest),
        ("2026-04/s002@drop.7", UnknownAddress),
    ],
)
def test_what_is_not_there_is_named(lab: Archive, address: str, error: type[Exception]) -> None:
    with pytest.raises(error):
        lab.provenance(address)


def test_another_notation_is_refused(lab: Archive) -> None:
    with pytest.raises(BadRequest, match="json or provn"):
        lab.provenance("2026-04", notation="xml")


def test_every_step_has_its_plan_its_times_and_its_inputs(lab: Archive, told: dict[str, Any]) -> None:
    document = lab._source.reduction(DROP)
    for step in document.steps:
        name = f"cooldown-2026-04:step.s002.drop.1.{step.number}"
        act = told["activity"][name]
        assert datetime.fromisoformat(act["prov:startTime"]) == step.begin
        plans = [
            each["prov:plan"] for each in told["wasAssociatedWith"].values() if each["prov:activity"] == name
        ]
        assert len(plans) == 1
        assert told["entity"][plans[0]]["stillroom:sha256"] == document.plan_digest
        used = [each for each in told["used"].values() if each["prov:activity"] == name]
        assert len(used) == len(step.inputs)


def test_every_output_is_made_once_and_derived_from_what_its_step_took(told: dict[str, Any]) -> None:
    made = [each["prov:entity"] for each in told["wasGeneratedBy"].values()]
    assert len(made) == len(set(made))
    output = "cooldown-2026-04:output.s002.drop.1.period_drop"
    behind = {
        each["prov:usedEntity"]
        for each in told["wasDerivedFrom"].values()
        if each["prov:generatedEntity"] == output
    }
    assert "cooldown-2026-04:channel.1.s002.period" in behind
    assert "cooldown-2026-03:output.s001.empty-cell.1.period_background" in behind
    assert all(
        "prov:usage" in each
        for each in told["wasDerivedFrom"].values()
        if each["prov:generatedEntity"] == output
    )


def test_the_digests_are_those_of_the_archive(lab: Archive, told: dict[str, Any]) -> None:
    sealed = lab._index.sealed_files()
    assert (
        told["entity"]["cooldown-2026-04:accession.1"]["stillroom:sha256"] == sealed["2026-04/2026-04.a1"][0]
    )
    assert told["entity"]["cooldown-2026-04:reduction.s002.drop.1"]["stillroom:sha256"] == sealed[DROP][0]
    raw = {each.name: each.sha256 for each in lab._source.accession("2026-04.a1").raw_files}
    assert told["entity"]["cooldown-2026-04:raw.1.film.csv"]["stillroom:sha256"] == raw["film.csv"]


def test_two_laboratories_do_not_speak_of_the_same_cooldown() -> None:
    assert cooldown_namespace("a" * 64) != cooldown_namespace("b" * 64)


def test_different_names_stay_different_when_they_are_spelled_for_a_notation() -> None:
    texts = ["a b", "a_b", "a_20_b", "a/b", "a%b", "ä", "a.b"]
    assert len({escaped(text) for text in texts}) == len(texts)


def sealed_documents(lab: Archive, *addresses: str) -> list[SealedDocument]:
    """Give the files behind addresses."""
    files = lab._index.sealed_files()
    holdings = Holdings(files.keys(), lab._source.document)
    return [
        SealedDocument(key, *files[key], lab._source.document, because)
        for key, because in closure(addresses, holdings).items()
    ]


def test_a_clock_that_went_back_is_told_and_stops_nothing(lab: Archive) -> None:
    from archive.exchange.prov_checks import violations

    def read_late(key: str) -> Any:
        document = lab._source.document(key)
        if not isinstance(document, ReductionDocument) or "empty-cell" not in key:
            return document
        late = datetime(2999, 1, 1, tzinfo=UTC)
        steps = tuple(step.model_copy(update={"begin": late, "end": late}) for step in document.steps)
        return document.model_copy(update={"steps": steps, "begin": late, "end": late})

    sealed = [
        SealedDocument(each.key, each.sha256, each.size, read_late)
        for each in sealed_documents(lab, "2026-04")
    ]
    found = violations(Lineage(sealed).document)
    assert any("used before it is generated" in sentence for sentence in found)


SOFTWARE = Software(stillroom="0.1.0", python="3.11", platform="test", packages={})
LATER = datetime(2999, 1, 1, tzinfo=UTC)


def test_what_is_amended_or_withdrawn_afterwards_is_told(lab: Archive) -> None:
    amended = AmendmentDocument(
        format="stillroom-amendment/1", address="2026-04.m1", cooldown="2026-04", number=1, sequence=1,
        rests_on="2026-04.a1", because="the gauge was read wrongly", by="data steward", made=LATER,
        sheet_file="amendment.toml", software=SOFTWARE,
    )  # fmt: skip
    withdrawn = WithdrawalDocument(
        format="stillroom-withdrawal/1", address="2026-04.w1", target=DROP, cooldown="2026-04", number=1, sequence=2,
        why="made with the wrong plan", by="data steward", made=LATER, software=SOFTWARE,
    )  # fmt: skip
    acts = [
        SealedDocument(f"2026-04/{each.address}", "c" * 64, 10, lambda key, each=each: each)
        for each in (amended, withdrawn)
    ]
    found = sealed_documents(lab, "2026-04")
    sealed = [*found[:2], *acts, *found[2:]]
    lineage = Lineage(sealed)
    told = json.loads(prov_json(lineage.document))
    (ended,) = told["wasInvalidatedBy"].values()
    assert ended["prov:entity"] == lineage.identifier(DROP)
    back = withdrawn.model_copy(update={"address": "2026-04.w2", "target": "2026-04.w1", "number": 2})
    restored = Lineage([*sealed, SealedDocument("2026-04/2026-04.w2", "d" * 64, 10, lambda key: back)])
    (ended,) = json.loads(prov_json(restored.document))["wasInvalidatedBy"].values()
    assert ended["prov:entity"] == restored.identifier("2026-04.w1"), (
        "taken back, so the reduction stands again"
    )
    assert (
        told["entity"][lineage.identifier("2026-04.m1")]["stillroom:because"] == "the gauge was read wrongly"
    )
    assert any(
        each["stillroom:role"] == "data steward"
        for each in told["agent"].values()
        if "stillroom:role" in each
    )
    assert read(prov_n(lineage.document), "provn") == read(prov_json(lineage.document), "json")


def test_what_a_document_rests_on(lab: Archive) -> None:
    document = lab._source.reduction(DROP)
    needs = needs_of(document)
    assert "2026-03/s001@empty-cell.1#period_background" in needs
    assert "2026-04/s002#period" in needs
    assert not any(each.startswith(DROP) for each in needs)
    accession = lab._source.accession("2026-04.a1")
    assert needs_of(accession) == ()
    assert needs_of(accession.model_copy(update={"supplements": "2026-04.a7"})) == ("2026-04.a7",)


def test_a_package_takes_along_what_things_rest_on_in_an_order_of_recording(lab: Archive) -> None:
    holdings = Holdings(lab._index.sealed_files().keys(), lab._source.document)
    assert closure([DROP], holdings) == {
        "2026-03/2026-03.a1": "belongs to cooldown 2026-03",
        "2026-04/2026-04.a1": "belongs to cooldown 2026-04",
        "2026-03/s001@empty-cell.1": f"{DROP} rests on it",
        DROP: "asked for",
    }
    assert list(closure(["2026-03/s001"], holdings)) == ["2026-03/2026-03.a1", "2026-03/s001@empty-cell.1"]


def test_what_is_missing_is_named(lab: Archive) -> None:
    keys = [key for key in lab._index.sealed_files() if "empty-cell" not in key]
    with pytest.raises(MissingFile, match=r"rests on 2026-03/s001@empty-cell\.1"):
        closure([DROP], Holdings(keys, lab._source.document))


def test_a_document_of_a_later_kind_is_searched_for_addresses(lab: Archive) -> None:
    class Later(Record):
        address: str
        cooldown: str
        says: tuple[str, ...]

    later = Later(address="2026-04.x1", cooldown="2026-04", says=(f"see {DROP}", DROP, "2026-99/s001"))
    assert needs_of(later) == ("2026-04", DROP, "2026-99/s001")
    files = lab._index.sealed_files()

    def read_any(key: str) -> Any:
        return later if key == "2026-04/2026-04.x1" else lab._source.document(key)

    found = closure(["2026-04"], Holdings([*files, "2026-04/2026-04.x1"], read_any))
    assert "2026-04/2026-04.x1" in found
