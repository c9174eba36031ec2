"""The crate around a package, read and judged by others; the records for catalogues, against their schemas."""

from __future__ import annotations

import json
import shutil
import subprocess
import sys
from datetime import date
from io import BytesIO
from pathlib import Path
from typing import Any

import pytest

from archive import Archive
from archive.exchange.about import About
from archive.exchange.citation import citation_cff, datacite_json
from archive.exchange.crate import crate
from schemas.deposit import Author, Deposit
from tests.outside import missing

CONTEXT = Path(__file__).parents[2] / "published" / "ro-crate" / "context-1.1.jsonld"

DEPOSIT = Deposit(
    author=(
        Author(
            family="O'Neil: the \"second\"", given="Ana María", orcid="0000-0002-1825-0097", affiliation="Invented university",
            affiliation_ror="https://ror.org/02mhbdp94",
        ),
        Author(name="Film group"),
        Author(family="Ångström"),
    ),
    publisher="Invented laboratory", publisher_ror="https://ror.org/05dxps055", licence="CC-BY-4.0",
    keywords=("helium films", "helium films", "µK: 5 %"), supplement_to=("10.1103/PhysRevLett.40.1727",),
    funder="Invented fund", award="LT-1",
)  # fmt: skip


def stated(**changes: Any) -> About:
    """Give what a package may be about, with everything stated."""
    return About(**{
        "title": 'Cooldown 2026-04, "the second"', "description": "A film: warmed, - slowly.\nTwice.", "issued": date(2026, 12, 1),
        "collected": (date(2026, 3, 2), date(2026, 3, 20)), "authors": DEPOSIT.author, "publisher": DEPOSIT.publisher,
        "publisher_ror": DEPOSIT.publisher_ror, "licences": ("CC-BY-4.0",), "keywords": DEPOSIT.keywords,
        "supplement_to": DEPOSIT.supplement_to, "funder": DEPOSIT.funder, "award": DEPOSIT.award, "missing": (), "size": 1234,
        **changes,
    })  # fmt: skip


@pytest.fixture(scope="module")
def named(origin: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give a package of an archive that states its authors, with reports."""
    folder = tmp_path_factory.mktemp("named")
    root = Path(shutil.copytree(origin, folder / "lab"))
    with (root / "stillroom.toml").open("a", encoding="utf-8") as stream:
        stream.write("[exchange]\n" + _toml(DEPOSIT))
    with Archive.open(root) as lab:
        assert lab.settings.exchange == DEPOSIT
        lab.export(["2026-04"], folder / "package")
    return folder / "package" / "data"


def _toml(deposit: Deposit) -> str:
    content = deposit.model_dump(mode="json", exclude_none=True)
    authors = content.pop("author")
    lines = [f"{name} = {json.dumps(value, ensure_ascii=False)}" for name, value in content.items()]
    for author in authors:
        lines += [
            "[[exchange.author]]",
            *(f"{name} = {json.dumps(value, ensure_ascii=False)}" for name, value in author.items()),
        ]
    return "\n".join(lines) + "\n"


def graph(folder: Path) -> dict[str, dict[str, Any]]:
    """Give the entities of a crate by identifier."""
    content = json.loads((folder / "ro-crate-metadata.json").read_text(encoding="utf-8"))
    found = {entity["@id"]: entity for entity in content["@graph"]}
    assert len(found) == len(content["@graph"])
    return found


def test_every_file_is_described_and_every_name_leads_somewhere(named: Path) -> None:
    entities = graph(named)
    files = {path.relative_to(named).as_posix() for path in named.rglob("*") if path.is_file()} - {
        "ro-crate-metadata.json"
    }
    assert files == {name for name, each in entities.items() if each["@type"] == "File"}
    assert {each["@id"] for each in entities["./"]["hasPart"]} == files
    outside = {"https://w3id.org/ro/crate/1.1"}
    for entity in entities.values():
        for value in entity.values():
            for each in value if isinstance(value, list) else [value]:
                if isinstance(each, dict):
                    assert each["@id"] in entities.keys() | outside


def test_a_reduction_is_an_action_with_what_it_took_and_gave(named: Path) -> None:
    entities = graph(named)
    actions = [each for each in entities.values() if each["@type"] == "CreateAction"]
    (drop,) = [each for each in actions if each["result"]["@id"] == "sealed/2026-04/s002@drop.1.h5"]
    taken = {each["@id"] for each in drop["object"]}
    assert {"sealed/2026-04/2026-04.a1.h5", "sealed/2026-03/s001@empty-cell.1.h5"} < taken
    assert any(each.startswith("plans/drop.r1.") for each in taken)
    assert entities[drop["instrument"]["@id"]]["softwareVersion"] == "0.1.0"
    assert {each["@id"] for each in entities["./"]["mentions"]} == {each["@id"] for each in actions}


def test_people_and_rights_are_those_that_the_archive_states(named: Path) -> None:
    entities = graph(named)
    root = entities["./"]
    people = [entities[each["@id"]] for each in root["author"]]
    assert [each["name"] for each in people] == ['Ana María O\'Neil: the "second"', "Film group", "Ångström"]
    assert people[0]["@id"] == "https://orcid.org/0000-0002-1825-0097"
    assert people[0]["affiliation"] == {"@id": "https://ror.org/02mhbdp94"}
    assert root["license"] == {"@id": "https://spdx.org/licenses/CC-BY-4.0.html"}
    assert (named / "reports" / "run-sheet-2026-04.html").is_file()
    assert not (named / "reports" / "run-sheet-2026-03.html").exists(), "nobody asked for that cooldown"


def test_nothing_is_invented_where_nothing_is_stated(lab: Archive, package: Path, tmp_path: Path) -> None:
    outcome = lab.export(["2026-04"], tmp_path / "p", reports=False)
    assert [each.partition(":")[0] for each in outcome.missing] == [
        "authors",
        "publisher",
        "licence of 2026-03, 2026-04",
    ]
    data = package / "data"
    assert not (data / "CITATION.cff").exists()
    assert not (data / "datacite.json").exists()
    root = graph(data)["./"]
    assert "author" not in root
    assert "publisher" not in root
    assert root["license"] == {"@id": "#no-licence-stated"}
    text = (data / "README.txt").read_text(encoding="utf-8")
    assert "No licence is stated" in text
    assert "Not stated: authors" in text


def test_terms_in_words_are_no_address() -> None:
    content = json.loads(crate(stated(licences=("ask us", "CC0-1.0")), [], {}))
    root = next(each for each in content["@graph"] if each["@id"] == "./")
    assert root["license"] == [{"@id": "#licence-1"}, {"@id": "https://spdx.org/licenses/CC0-1.0.html"}]


def test_another_program_reads_the_crate(named: Path) -> None:
    """Against the package rocrate 0.16, the reader and writer of the RO-Crate community."""
    try:
        from rocrate.rocrate import ROCrate
    except ImportError:
        missing("the package rocrate is not installed")
    other = ROCrate(str(named))
    assert other.root_dataset["name"] == "Cooldown 2026-04"
    assert other.version == "1.1"
    assert len([each for each in other.get_entities() if each.type == "File"]) == len(
        graph(named)["./"]["hasPart"]
    )


# What the profile recommends and is not known: this program has no page on the web, who let it run is not recorded, and
# the second and third author here state no institution.
NOT_KNOWN = {
    "The Application SHOULD have a url",
    "The SoftwareApplication id SHOULD be an absolute URI",
    "The Action SHOULD have an agent that is a Person or Organization",
    "The author SHOULD have an organizational affiliation.",
    "The author SHOULD have a Contextual Entity which specifies the organizational `affiliation`.",
    "The organization SHOULD have a URL.",
}


@pytest.mark.slow
def test_the_validator_of_the_community_finds_the_crate_valid(named: Path, tmp_path: Path) -> None:
    """Against roc-validator, profiles RO-Crate 1.1 and Process Run Crate 0.5, without a network."""
    cache = _seeded(tmp_path / "cache")
    report = tmp_path / "report.json"
    program = (
        "import sys; from rocrate_validator.cli import cli; sys.exit(cli(sys.argv[1:], standalone_mode=True))"
    )
    arguments = [
        "-y",
        "validate",
        str(named),
        "-p",
        "process-run-crate-0.5",
        "-l",
        "recommended",
        "--offline",
    ]
    arguments += ["--cache-path", str(cache), "-f", "json", "-o", str(report)]
    ended = subprocess.run(
        [sys.executable, "-c", program, *arguments], capture_output=True, text=True, check=False, timeout=120
    )
    assert ended.returncode in (0, 1), ended.stdout + ended.stderr  # 2: it could not be checked
    issues = json.loads(report.read_text(encoding="utf-8"))["issues"]
    assert {each["message"] for each in issues if each["severity"] == "REQUIRED"} == set()
    assert {each["message"] for each in issues} <= NOT_KNOWN


def _seeded(cache: Path) -> Path:
    """Make a cache that answers for the address of the context, so that nothing is fetched."""
    try:
        import requests_cache
        import rocrate_validator  # noqa: F401 - whether it is there
        from requests.adapters import HTTPAdapter
        from urllib3.response import HTTPResponse
    except ImportError:
        missing("the package roc-validator is not installed")
    content = CONTEXT.read_bytes()

    class Shelf(HTTPAdapter):
        def send(self, request: Any, **_: Any) -> Any:
            headers = {"Content-Type": "application/ld+json", "Content-Length": str(len(content))}
            answer = HTTPResponse(body=BytesIO(content), headers=headers, status=200, preload_content=False)
            return self.build_response(request, answer)

    with requests_cache.CachedSession(str(cache), expire_after=-1) as session:
        session.mount("https://w3id.org/", Shelf())
        session.get("https://w3id.org/ro/crate/1.1/context")
    return cache


def test_the_record_for_catalogues_is_valid_by_its_schema() -> None:
    """Against DataCite's JSON Schema 4.5, as the package datacite carries it; dates and identifiers are ours to check."""
    try:
        from datacite import schema45
    except ImportError:
        missing("the package datacite is not installed")
    for about in (stated(), stated(collected=None, licences=(), keywords=(), supplement_to=(), funder=None, publisher_ror=None),
                  stated(licences=("ask us", "LicenseRef-ours", "CC0-1.0"), award=None)):  # fmt: skip
        record = json.loads(datacite_json(about, ["2026-04.a1"]))
        schema45.validator.validate(record)
        assert record["publicationYear"] == record["dates"][0]["date"][:4]
    assert record["rightsList"] == [
        {"rights": "ask us"},
        {"rights": "LicenseRef-ours"},
        {
            "rights": "CC0-1.0", "rightsUri": "https://spdx.org/licenses/CC0-1.0.html", "rightsIdentifier": "CC0-1.0",
            "rightsIdentifierScheme": "SPDX", "schemeUri": "https://spdx.org/licenses/",
        },
    ]  # fmt: skip
    full = json.loads(datacite_json(stated(), []))
    assert (
        full["creators"][0]["nameIdentifiers"][0]["nameIdentifier"] == "https://orcid.org/0000-0002-1825-0097"
    )
    assert full["dates"][1] == {"date": "2026-03-02/2026-03-20", "dateType": "Collected"}


@pytest.mark.parametrize("licences", [("CC-BY-4.0",), ("CC0-1.0", "CC-BY-4.0"), ("LicenseRef-ours",), ()])
def test_the_citation_is_valid_by_its_schema(tmp_path: Path, licences: tuple[str, ...]) -> None:
    """Against the schema of the Citation File Format 1.2.0 in the package check-jsonschema; and read by a YAML reader."""
    try:
        from check_jsonschema import main
        from ruamel.yaml import YAML
    except ImportError:
        missing("the package check-jsonschema is not installed")
    about = stated(licences=licences)
    path = tmp_path / "CITATION.cff"
    path.write_text(citation_cff(about), encoding="utf-8")
    with pytest.raises(SystemExit) as ended:
        main(["--builtin-schema", "vendor.citation-file-format", str(path)])
    assert ended.value.code == 0
    read = YAML(typ="safe").load(path)
    assert read["title"] == about.title
    assert read["abstract"] == about.description
    assert [each.get("family-names") or each.get("name") for each in read["authors"]] == [
        'O\'Neil: the "second"',
        "Film group",
        "Ångström",
    ]
    assert read.get("license") == (licences[0] if licences == ("CC-BY-4.0",) else None)


@pytest.mark.parametrize("changes", [{"authors": ()}, {"publisher": None}], ids=["authors", "publisher"])
def test_no_record_without_authors_and_publisher(changes: dict[str, Any]) -> None:
    about = stated(**changes)
    with pytest.raises(ValueError, match="must be stated"):
        datacite_json(about, [])
    with pytest.raises(ValueError, match="must be stated"):
        citation_cff(about)
