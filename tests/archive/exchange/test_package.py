"""A package goes from one archive into another byte for byte, whole or not at all."""

from __future__ import annotations

import hashlib
import json
import shutil
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

import pytest

from archive import Archive
from archive.errors import ArchiveBusy, BadRequest, DamagedFile, NotAnArchive, UnknownAddress
from archive.exchange.bag_reading import read_bag
from archive.exchange.meanings import content_faults
from archive.store import Damage, SealedFile, archive_lock, examine, open_store
from tests.archive.exchange.conftest import PLAN
from tests.archive.exchange.forging import account, contents, refused, resealed, rewrite, swap, without
from tests.small_cooldown import write_folder

DROP = "2026-04/s002@drop.1"
ALL = {"2026-03.a1", "2026-03/s001@empty-cell.1", "2026-04.a1", DROP}
Make = Callable[..., Archive]


@pytest.fixture(autouse=True)
def in_this_process(monkeypatch: pytest.MonkeyPatch) -> None:
    """Let files be read in this process: a child costs half a second, and `test_package_damage` has one each time."""

    def read(files: Sequence[tuple[Path, SealedFile]]) -> list[Damage]:
        return [damage for path, sealed in files for damage in examine._inside(path, sealed.key)]

    monkeypatch.setattr("archive.store.adopting.examined_apart", read)


# From one archive into another ------------------------------------------------------------------------------------


def test_what_is_taken_in_is_what_left(lab: Archive, package: Path, other: Make) -> None:
    there = other()
    outcome = there.import_package(package)
    assert outcome.state == "imported"
    assert set(outcome.taken) == ALL
    assert there._index.rows() == lab._index.rows()
    sealed = {path: digest for path, digest in contents(lab.root).items() if path.startswith("sealed/")}
    assert {
        path: digest for path, digest in contents(there.root).items() if path.startswith("sealed/")
    } == sealed
    assert there.fixity() == []
    assert there.replay(DROP).identical
    assert there.trace(f"{DROP}#period_drop") == lab.trace(f"{DROP}#period_drop")
    assert there.provenance("2026-04") == lab.provenance("2026-04")
    acts = [entry.act for entry in there.journal()][-4:]
    assert [(act.act, act.by) for act in acts] == [("import", "role not stated")] * 4
    assert not list((there.root / "staging").iterdir())


def test_the_same_again_changes_nothing(package: Path, other: Make) -> None:
    there = other()
    there.import_package(package)
    before = contents(there.root)
    outcome = there.import_package(package)
    assert outcome.state == "already"
    assert set(outcome.held) == ALL
    assert contents(there.root) == before


def test_a_package_made_again_from_its_import_is_the_same(package: Path, other: Make, tmp_path: Path) -> None:
    there = other("elsewhere")
    there.import_package(package)
    there.export(["2026-04"], tmp_path / "again", reports=False)
    for name in ("manifest-sha256.txt", "manifest-sha512.txt"):
        assert (tmp_path / "again" / name).read_bytes() == (package / name).read_bytes()


def test_a_whole_archive_moves(lab: Archive, other: Make, tmp_path: Path) -> None:
    outcome = lab.export([], tmp_path / "everything", reports=False)
    assert set(outcome.files) == ALL
    assert outcome.also == {}
    there = other()
    assert there.import_package(tmp_path / "everything").state == "imported"
    assert there._index.rows() == lab._index.rows()


def test_what_comes_along_is_told_by_name(lab: Archive, tmp_path: Path) -> None:
    outcome = lab.export([DROP], tmp_path / "p", reports=False)
    assert outcome.also == {
        "2026-03.a1": "belongs to cooldown 2026-03",
        "2026-04.a1": "belongs to cooldown 2026-04",
        "2026-03/s001@empty-cell.1": f"{DROP} rests on it",
    }
    assert (outcome.size, outcome.number) == tuple(
        map(int, dict(read_bag(tmp_path / "p").info)["Payload-Oxum"].split("."))
    )


def test_what_is_here_already_is_left_and_the_rest_is_taken(
    lab: Archive, package: Path, other: Make, tmp_path: Path
) -> None:
    lab.export(["2026-03"], tmp_path / "earlier", reports=False)
    there = other()
    assert there.import_package(tmp_path / "earlier").state == "imported"
    outcome = there.import_package(package)
    assert outcome.state == "imported"
    assert set(outcome.taken) == {"2026-04.a1", DROP}
    assert set(outcome.held) == {"2026-03.a1", "2026-03/s001@empty-cell.1"}
    assert there._index.rows() == lab._index.rows()


def test_a_dry_run_finds_out_everything_and_writes_nothing(package: Path, other: Make) -> None:
    there = other()
    before = contents(there.root)
    outcome = there.import_package(package, dry_run=True)
    assert outcome.state == "would-import"
    assert set(outcome.taken) == ALL
    assert contents(there.root) == before
    assert there.cooldowns() == []


def test_the_readable_files_are_what_is_sealed(lab: Archive, package: Path) -> None:
    data = package / "data"
    assert json.loads((data / "documents" / "2026-04" / "2026-04.a1.json").read_text()) == json.loads(
        lab._store.document("2026-04/2026-04.a1")
    )
    raw = {each.name: each.sha256 for each in lab._source.accession("2026-04.a1").raw_files}
    assert (
        hashlib.sha256((data / "sheets" / "2026-04.a1.toml").read_bytes()).hexdigest() == raw["cooldown.toml"]
    )
    plan = json.loads(next((data / "plans").glob("drop.r1.*.json")).read_text())
    assert plan["needs"]["empty"]["plan"] == "empty-cell"
    lines = (data / "results.csv").read_text(encoding="utf-8").splitlines()
    (result,) = [row for row in lab.results() if row.name == "period_low"]
    (line,) = [line for line in lines if line.startswith(f"{result.reduction}#period_low,")]
    assert float(line.split(",")[2]) == pytest.approx(result.value, rel=0, abs=0)


@pytest.mark.parametrize(
    ("asked", "about"),
    [((DROP,), (DROP,)), ((), ["2026-03", "2026-04"])],
    ids=["a reduction", "everything"],
)
def test_the_appendix_of_what_is_asked_for_lies_beside(
    lab: Archive,
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    asked: tuple[str, ...],
    about: Sequence[str],
) -> None:
    seen: list[Sequence[str]] = []

    def appendix(source: object, name: str, addresses: Sequence[str], **_: object) -> dict[str, bytes]:
        seen.append(addresses)
        return {"appendix.tex": b"tex", "figures/a.pdf": b"pdf"}

    monkeypatch.setattr("archive.lab.reporting.appendix", appendix)
    lab.export(asked, tmp_path / "p", reports=False, appendix=True)
    assert seen == [about]
    assert (tmp_path / "p" / "data" / "reports" / "appendix" / "figures" / "a.pdf").read_bytes() == b"pdf"


# What is refused ---------------------------------------------------------------------------------------------------


def test_a_name_taken_by_other_bytes_is_refused(package: Path, other: Make, tmp_path: Path) -> None:
    there = other()
    there.ingest(write_folder(tmp_path / "mine", name="2026-03"))
    assert refused(there, package) == {"package-conflict"}


def test_a_name_that_differs_in_capitals_only_is_refused(other: Make, tmp_path: Path) -> None:
    with Archive.create(tmp_path / "a") as first:
        first.ingest(write_folder(tmp_path / "run-A", name="run-A"))
        first.export(["run-A"], tmp_path / "p", reports=False)
    there = other()
    there.ingest(write_folder(tmp_path / "run-a-folder", name="run-a"))
    assert refused(there, tmp_path / "p") == {"package-conflict"}


def test_a_record_that_means_something_else_here_is_refused(
    package: Path, other: Make, tmp_path: Path
) -> None:
    there = other()
    folder = write_folder(tmp_path / "2026-01", name="2026-01")
    sheet = folder / "cooldown.toml"
    sheet.write_text(sheet.read_text().replace("7.5(1) mm", "7.6(1) mm"))
    there.ingest(folder)
    assert refused(there, package) == {"package-record"}


def test_a_plan_that_is_another_one_here_is_refused(package: Path, other: Make, tmp_path: Path) -> None:
    there = other()
    mine = tmp_path / "drop.toml"
    mine.write_text(PLAN.replace("Period drop of a film", "Another drop"), encoding="utf-8")
    assert there.revise(mine, by="data steward").state == "sealed"
    before = there._index.rows()
    assert refused(there, package) == {"package-plan"}
    (finding,) = there.import_package(package).findings
    assert "plan drop.r1 is another one in the archive" in finding.what
    assert finding.found == "they differ in title"
    assert there._index.rows() == before
    assert there.fixity() == []


def test_records_and_plans_must_be_what_their_entries_say(lab: Archive) -> None:
    document = lab._source.accession("2026-04.a1")
    first = document.records[0]
    for update, said in (
        ({"content": {}}, "Field required"),
        ({"address": "other.r1"}, f"the content is that of {first.address}"),
        ({"digest": "0" * 64}, f"the content has sha256 {first.digest}"),
    ):
        spoilt = (first.model_copy(update=update), *document.records[1:])
        (finding,) = content_faults({"2026-04/2026-04.a1": document.model_copy(update={"records": spoilt})})
        assert said in (finding.found or ""), finding
    assert content_faults({"2026-04/2026-04.a1": document}) == []


def test_what_something_rests_on_must_be_there(copy: Path, lab: Archive, other: Make, tmp_path: Path) -> None:
    without(copy, "2026-03/2026-03.a1", "2026-03/s001@empty-cell.1")
    there = other()
    assert refused(there, copy) == {"package-incomplete"}
    (finding,) = there.import_package(copy).findings
    assert "2026-03/s001@empty-cell.1" in (finding.found or "")
    assert DROP in finding.what
    lab.export(["2026-03"], tmp_path / "earlier", reports=False)
    there.import_package(tmp_path / "earlier")
    assert there.import_package(copy).state == "imported"


def test_a_cooldown_without_the_sweep_is_not_enough(copy: Path, other: Make, tmp_path: Path) -> None:
    """An archive with a cooldown of the same name that never had the sweep does not serve."""
    without(copy, "2026-04/2026-04.a1")
    folder = write_folder(tmp_path / "2026-04", name="2026-04")
    sheet = folder / "cooldown.toml"
    sheet.write_text(sheet.read_text().replace("s002", "s005"))
    there = other()
    there.ingest(folder)
    assert refused(there, copy) == {"package-incomplete"}


def forged(folder: Path, key: str, document: dict[str, Any]) -> bytes:
    """Give a sound sealed file with a document and nothing else."""
    folder.mkdir()
    store = open_store(folder)
    with store.writer(key) as writer:
        writer.document(json.dumps(document))
        writer.seal()
    return store.path(key).read_bytes()


def test_a_document_that_promises_what_the_file_does_not_hold_is_refused(
    copy: Path, lab: Archive, other: Make, tmp_path: Path
) -> None:
    key = "2026-04/2026-04.a1"
    swap(copy, key, forged(tmp_path / "forged", key, json.loads(lab._store.document(key))))
    assert refused(other(), copy) == {"package-document"}


@pytest.mark.parametrize(
    "changes",
    [
        pytest.param({"address": "2026-04/s002@drop.2"}, id="another address"),
        pytest.param({"cooldown": "2026-03"}, id="another cooldown"),
        pytest.param({"format": "stillroom-reduction/99"}, id="a later format"),
        pytest.param({"unheard": 1}, id="unknown field"),
    ],
)
def test_a_document_that_is_another_or_unknown_is_refused(
    copy: Path, lab: Archive, other: Make, tmp_path: Path, changes: dict[str, Any]
) -> None:
    document = {**json.loads(lab._store.document(DROP)), "outputs": [], **changes}
    swap(copy, DROP, forged(tmp_path / "forged", DROP, document))
    assert "package-document" in refused(other(), copy)


def test_what_the_index_would_not_take_is_refused_before_anything_is_sealed(
    copy: Path, lab: Archive, other: Make, tmp_path: Path
) -> None:
    document = json.loads(lab._store.document(DROP))
    scalar = next(each for each in document["outputs"] if each["rows"] is None)
    document["outputs"] = [scalar, scalar]
    swap(copy, DROP, forged(tmp_path / "forged", DROP, document))
    assert refused(other(), copy) == {"package-document"}


def _files(change: Callable[[list[dict[str, Any]]], None]) -> Callable[[Path], None]:
    def spoil(package: Path) -> None:
        told = account(package)
        change(told["files"])
        rewrite(package, told)

    return spoil


def _no_account(package: Path) -> None:
    (package / "data" / "stillroom-package.json").unlink()
    resealed(package)


def _hidden(package: Path) -> None:
    shutil.copy(
        package / "data" / "sealed" / f"{DROP}.h5", package / "data" / "sealed" / "2026-04" / "s003@drop.1.h5"
    )
    resealed(package)


ACCOUNTS = [
    pytest.param(_no_account, id="no account"),
    pytest.param(_hidden, id="a sealed file that is not accounted for"),
    pytest.param(_files(lambda files: files.append(dict(files[0]))), id="a file twice"),
    pytest.param(
        _files(lambda files: files[0].update(key="../../escape", path="sealed/../../escape.h5")),
        id="climbing key",
    ),
    pytest.param(_files(lambda files: files[0].update(path=files[1]["path"])), id="another path"),
    pytest.param(_files(lambda files: files[0].update(address="2026-03.a2")), id="another address"),
    pytest.param(_files(lambda files: files[0].update(sha256="0" * 64)), id="another digest"),
    pytest.param(_files(lambda files: files[0].update(size=1)), id="another size"),
    pytest.param(_files(lambda files: files[0].update(size=-1)), id="no size"),
    pytest.param(_files(lambda files: files.clear()), id="nothing"),
    pytest.param(lambda package: rewrite(package, {"format": "stillroom-package/2"}), id="a later format"),
]


@pytest.mark.parametrize("spoil", ACCOUNTS)
def test_an_account_that_is_not_that_of_the_bag_is_refused(
    copy: Path, other: Make, spoil: Callable[[Path], None]
) -> None:
    spoil(copy)
    assert "package-account" in refused(other(), copy)


def test_a_bag_that_is_damaged_is_told_as_damage(copy: Path, other: Make) -> None:
    with (copy / "data" / "README.txt").open("r+b") as stream:
        stream.write(b"X")
    outcome = other().import_package(copy)
    assert (outcome.state, outcome.damaged) == ("refused", True)
    assert {finding.file for finding in outcome.findings} == {"data/README.txt"}


def test_a_bag_that_is_none_is_not_told_as_damage(tmp_path: Path, other: Make) -> None:
    (tmp_path / "folder").mkdir()
    outcome = other().import_package(tmp_path / "folder")
    assert (outcome.state, outcome.damaged) == ("refused", False)
    with pytest.raises(NotAnArchive):
        other("third").import_package(tmp_path / "nothing")


def test_an_import_waits_for_no_other_writer(
    package: Path, other: Make, monkeypatch: pytest.MonkeyPatch
) -> None:
    there = other()
    with archive_lock(there.root):
        monkeypatch.setattr("archive.lab.opened.archive_lock", lambda root: archive_lock(root, wait_s=0.0))
        with pytest.raises(ArchiveBusy):
            there.import_package(package)


# What cannot leave -------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("address", "error"),
    [
        ("2026-09", UnknownAddress),
        ("2026-04/s009", UnknownAddress),
        ("2026-04/s002#nothing", UnknownAddress),
        ("2026-04.a1:nothing.csv", UnknownAddress),
        ("2026-04/s002@drop.1#nothing", UnknownAddress),
        ("bob.r1", BadRequest),
        ("2026-04/s002@drop.2", UnknownAddress),
    ],
)
def test_what_is_not_there_cannot_be_exported(
    lab: Archive, tmp_path: Path, address: str, error: type[Exception]
) -> None:
    with pytest.raises(error):
        lab.export([address], tmp_path / "p")
    assert list(tmp_path.iterdir()) == []


def test_a_package_is_not_written_into_the_archive(lab: Archive) -> None:
    for place in (lab.root, lab.root / "sealed" / "x"):
        with pytest.raises(BadRequest, match="cannot lie in the archive itself"):
            lab.export(["2026-03"], place, reports=False)
    assert lab.fixity() == []


def test_an_empty_archive_has_nothing_to_export(other: Make, tmp_path: Path) -> None:
    with pytest.raises(BadRequest, match="empty"):
        other().export([], tmp_path / "p")


def test_a_damaged_file_does_not_leave(origin: Path, tmp_path: Path) -> None:
    root = Path(shutil.copytree(origin, tmp_path / "lab"))
    path = root / "sealed" / f"{DROP}.h5"
    path.chmod(0o644)
    content = bytearray(path.read_bytes())
    content[len(content) // 2] ^= 1
    path.write_bytes(content)
    with Archive.open(root) as lab, pytest.raises(DamagedFile):
        lab.export(["2026-04"], tmp_path / "p", reports=False)
    assert [each.name for each in tmp_path.iterdir()] == ["lab"]
