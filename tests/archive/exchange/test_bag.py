"""A bag that was written is valid for others too; one that came from elsewhere is refused for every trick."""

from __future__ import annotations

import hashlib
import os
import shutil
import socket
from collections.abc import Callable
from pathlib import Path

import pytest

from archive.errors import BadRequest, DamagedFile, NotAnArchive
from archive.exchange.bag_reading import BagLimits, read_bag
from archive.exchange.bag_writing import new_bag
from tests.archive.exchange.forging import retagged
from tests.outside import missing

FILES = {
    "a.txt": b"first",
    "folder/b.bin": bytes(range(256)) * 40,
    "folder/50%.txt": b"",
    "Übersicht.csv": b"1,2\n",
}


@pytest.fixture
def bag(tmp_path: Path) -> Path:
    """Write a small bag."""
    target = tmp_path / "bag"
    with new_bag(target) as writer:
        for path, content in FILES.items():
            writer.add(path, [content[:3], content[3:]])
        writer.finish([("Bagging-Date", "2026-12-01"), ("External-Description", "two\nlines")])
    return target


def listed(bag: Path, name: str) -> dict[str, str]:
    """Digest by spelled path."""
    lines = (bag / name).read_text(encoding="utf-8").splitlines()
    return {path: digest for digest, path in (line.split("  ", 1) for line in lines)}


def test_a_written_bag_is_read_back_whole(bag: Path) -> None:
    read = read_bag(bag)
    assert read.findings == []
    assert {path: digests["sha512"] for path, (_, digests) in read.payload.items()} == {
        f"data/{path}": hashlib.sha512(content).hexdigest() for path, content in FILES.items()
    }
    assert dict(read.info)["External-Description"] == "two lines"
    assert dict(read.info)["Payload-Oxum"] == f"{sum(map(len, FILES.values()))}.{len(FILES)}"
    assert "data/folder/50%25.txt" in listed(bag, "manifest-sha256.txt")


def test_another_implementation_finds_the_bag_valid(tmp_path: Path) -> None:
    """Against the Python library of the BagIt authors, bagit 1.9: complete validation, digests too.

    That version spells no percent sign as RFC 8493, 2.1.3, asks for, so no name here holds one.
    """
    try:
        import bagit
    except ImportError:
        missing("the package bagit is not installed")
    target = tmp_path / "bag"
    with new_bag(target) as writer:
        for path in ("a.txt", "folder/b.bin", "Übersicht.csv"):
            writer.add(path, [FILES[path]])
        writer.finish([("Bagging-Date", "2026-12-01")])
    other = bagit.Bag(str(target))
    assert other.validate()
    assert other.version_info == (1, 0)
    (target / "data" / "a.txt").write_bytes(b"First")
    with pytest.raises(bagit.BagValidationError):
        bagit.Bag(str(target)).validate()


def _append(name: str, text: str) -> Callable[[Path], None]:
    def spoil(bag: Path) -> None:
        path = bag / name
        path.write_bytes((path.read_bytes() if path.exists() else b"") + text.encode())
        if not name.startswith("tagmanifest"):
            retagged(bag)

    return spoil


def _put(name: str, content: bytes, *, again: bool = True) -> Callable[[Path], None]:
    def spoil(bag: Path) -> None:
        (bag / name).parent.mkdir(parents=True, exist_ok=True)
        (bag / name).write_bytes(content)
        if again:
            retagged(bag)

    return spoil


def _link(bag: Path) -> None:
    (bag / "data" / "a.txt").unlink()
    (bag / "data" / "a.txt").symlink_to("/etc/hostname")


def _linked_folder(bag: Path) -> None:
    shutil.move(bag / "data", bag.parent / "elsewhere")
    (bag / "data").symlink_to(bag.parent / "elsewhere")


def _pipe(bag: Path) -> None:
    os.mkfifo(bag / "data" / "pipe")


def _socket(bag: Path) -> None:
    place = Path.cwd()
    os.chdir(bag / "data")  # the address of a socket is short
    try:
        with socket.socket(socket.AF_UNIX) as made:
            made.bind("s")
    finally:
        os.chdir(place)


def _one_manifest_short(bag: Path) -> None:
    path = bag / "manifest-sha512.txt"
    path.write_text("".join(path.read_text(encoding="utf-8").splitlines(keepends=True)[1:]), encoding="utf-8")
    retagged(bag)


def _twice(bag: Path) -> None:
    path = bag / "manifest-sha256.txt"
    path.write_text(
        path.read_text(encoding="utf-8") + path.read_text(encoding="utf-8").splitlines()[0] + "\n",
        encoding="utf-8",
    )
    retagged(bag)


def _changed(bag: Path) -> None:
    (bag / "data" / "folder" / "b.bin").write_bytes(bytes(256 * 40))


def _removed(bag: Path) -> None:
    (bag / "data" / "a.txt").unlink()
    _put("bag-info.txt", b"Payload-Oxum: 10244.3\n")(bag)


def _unmade(name: str) -> Callable[[Path], None]:
    def spoil(bag: Path) -> None:
        (bag / name).unlink()

    return spoil


def _only_tags_of(algorithm: str) -> Callable[[Path], None]:
    def spoil(bag: Path) -> None:
        for kind in ("manifest", "tagmanifest"):
            for name in ("sha256", "sha512"):
                (bag / f"{kind}-{name}.txt").unlink()
        payload = sorted(p for p in (bag / "data").rglob("*") if p.is_file())
        lines = [
            f"{hashlib.new(algorithm, p.read_bytes()).hexdigest()}  {p.relative_to(bag).as_posix()}\n"
            for p in payload
        ]
        (bag / f"manifest-{algorithm}.txt").write_text("".join(lines), encoding="utf-8")

    return spoil


ZERO = "0" * 64

HOSTILE = [
    pytest.param(_changed, "bag-file-damaged", id="changed byte of equal size"),
    pytest.param(_removed, "bag-file-missing", id="file gone"),
    pytest.param(_put("data/more.txt", b"x", again=False), "bag-size", id="file more"),
    pytest.param(_append("data/a.txt", "!"), "bag-size", id="file longer than Payload-Oxum allows"),
    pytest.param(_link, "bag-link", id="link"),
    pytest.param(_linked_folder, "bag-link", id="payload is a link"),
    pytest.param(_pipe, "bag-device", id="pipe"),
    pytest.param(_socket, "bag-device", id="socket"),
    pytest.param(_put("fetch.txt", b"file:///etc/hostname 5 data/a.txt\n"), "bag-fetch", id="fetch"),
    pytest.param(
        _append("manifest-sha256.txt", f"{ZERO}  data/../../escape\n"), "bag-path", id="climbing out"
    ),
    pytest.param(_append("manifest-sha256.txt", f"{ZERO}  /etc/hostname\n"), "bag-path", id="absolute"),
    pytest.param(
        _append("manifest-sha256.txt", f"{ZERO}  data/%2e%2e/%2e%2e/x\n"), "bag-path", id="percent tricks"
    ),
    pytest.param(
        _append("manifest-sha256.txt", f"{ZERO}  bagit.txt\n"),
        "bag-path",
        id="tag file in the payload manifest",
    ),
    pytest.param(
        _append("tagmanifest-sha256.txt", f"{ZERO}  data/a.txt\n"),
        "bag-path",
        id="payload in the tag manifest",
    ),
    pytest.param(_append("manifest-sha256.txt", "no digest\n"), "bag-manifest", id="no digest"),
    pytest.param(
        _append("manifest-sha256.txt", f"{'0' * 32}  data/a.txt\n"),
        "bag-manifest",
        id="digest of another length",
    ),
    pytest.param(_twice, "bag-path", id="path twice"),
    pytest.param(_one_manifest_short, "bag-file-unlisted", id="not in every manifest"),
    pytest.param(
        _append("tagmanifest-sha256.txt", f"{ZERO}  notes.txt\n"), "bag-file-missing", id="tag file gone"
    ),
    pytest.param(_put("notes.txt", b"x", again=False), "bag-file-unlisted", id="unlisted tag file"),
    pytest.param(_put("manifest-sha3.txt", b""), "bag-algorithm", id="unknown algorithm"),
    pytest.param(_only_tags_of("md5"), "bag-algorithm", id="broken algorithm"),
    pytest.param(
        _put("bagit.txt", b"BagIt-Version: 0.97\nTag-File-Character-Encoding: UTF-8\n"),
        "bag-declaration",
        id="older",
    ),
    pytest.param(
        _put("bagit.txt", b"BagIt-Version: 1.0\nTag-File-Character-Encoding: UTF-16\n"),
        "bag-declaration",
        id="encoding",
    ),
    pytest.param(_put("bagit.txt", b"hello"), "bag-declaration", id="no declaration"),
    pytest.param(_unmade("bagit.txt"), "bag-declaration", id="declaration gone"),
    pytest.param(_put("manifest-sha256.txt", b"\xff\xfe"), "bag-encoding", id="not UTF-8"),
    pytest.param(
        _put("bag-info.txt", b"\xef\xbb\xbfPayload-Oxum: 1.1\n"), "bag-encoding", id="byte order mark"
    ),
    pytest.param(_put("bag-info.txt", b"Payload-Oxum: 1.1\n"), "bag-size", id="another size"),
    pytest.param(_put("bag-info.txt", b"Payload-Oxum: many\n"), "bag-info", id="no number"),
    pytest.param(_put("bag-info.txt", b"Bagging-Date: 2026-12-01\n"), "bag-info", id="no size"),
    pytest.param(_put("bag-info.txt", b"gibberish\n"), "bag-info", id="no label"),
    pytest.param(_unmade("bag-info.txt"), "bag-info", id="no info"),
    pytest.param(_put("data/A.TXT", b"x", again=False), "bag-look-alike", id="case collision"),
    pytest.param(_put("data/u\u0308.txt", b"x", again=False), "bag-path", id="decomposed name"),
    pytest.param(_put("data/x\ny", b"x", again=False), "bag-path", id="line end in a name"),
]


@pytest.mark.parametrize(("spoil", "code"), HOSTILE)
def test_a_spoiled_bag_is_refused_for_what_is_wrong(
    bag: Path, spoil: Callable[[Path], None], code: str
) -> None:
    spoil(bag)
    found = read_bag(bag).findings
    assert code in {finding.code for finding in found}, [finding.sentence() for finding in found]
    assert all(finding.severity == "error" for finding in found)


def test_a_file_that_grew_is_named_beside_the_size(bag: Path) -> None:
    with (bag / "data" / "a.txt").open("ab") as stream:
        stream.write(b"!")
    assert [(finding.code, finding.file) for finding in read_bag(bag).findings] == [
        ("bag-size", "bag-info.txt"),
        ("bag-file-damaged", "data/a.txt"),
        ("bag-file-damaged", "data/a.txt"),
    ]


def test_a_bag_far_larger_than_it_says_is_not_read(bag: Path) -> None:
    with (bag / "data" / "a.txt").open("r+b") as stream:
        stream.truncate(1 << 40)  # a hole that takes no room, and a day to read
    (finding,) = read_bag(bag).findings
    assert finding.code == "bag-size"


def test_all_faults_are_told_at_once(bag: Path) -> None:
    _append("manifest-sha256.txt", f"{ZERO}  data/../x\n{ZERO}  /y\n")(bag)
    _put("fetch.txt", b"x")(bag)
    assert {"bag-path", "bag-fetch"} <= {finding.code for finding in read_bag(bag).findings}
    assert sum(finding.code == "bag-path" for finding in read_bag(bag).findings) == 2


def test_a_name_that_is_no_text_is_refused(bag: Path) -> None:
    (bag / "data" / os.fsdecode(b"\xff")).write_bytes(b"")
    (finding,) = read_bag(bag).findings
    assert finding.code == "bag-path"
    assert finding.file == "data/\\udcff"


def test_a_bag_of_too_many_files_is_not_read_to_its_end(bag: Path) -> None:
    (finding,) = read_bag(bag, BagLimits(files=5)).findings
    assert finding.code == "bag-too-large"


def test_line_ends_and_capital_digits_of_others_are_taken(bag: Path) -> None:
    """RFC 8493, sections 2.1.3 and 2.2.2: LF, CR or CRLF; digests in either case; folded values of labels."""
    for name in ("manifest-sha256.txt", "manifest-sha512.txt"):
        table = listed(bag, name)
        (bag / name).write_bytes("".join(f"{d.upper()}\t{p}\r\n" for p, d in table.items()).encode())
    with (bag / "bag-info.txt").open("a") as stream:
        stream.write("Contact-Name: data\n  steward\n")
    retagged(bag)
    read = read_bag(bag)
    assert read.findings == []
    assert ("Contact-Name", "data steward") in read.info


def test_there_must_be_a_folder(tmp_path: Path) -> None:
    with pytest.raises(NotAnArchive):
        read_bag(tmp_path / "nothing")


@pytest.mark.parametrize("what", ["file", "full folder", "link", "no parent"])
def test_a_bag_is_not_written_over_anything(tmp_path: Path, what: str) -> None:
    target = tmp_path / "target"
    if what == "file":
        target.write_text("mine")
    elif what == "full folder":
        target.mkdir()
        (target / "mine").write_text("mine")
    elif what == "link":
        target.symlink_to(tmp_path)
    else:
        target = tmp_path / "no" / "target"
    before = sorted(tmp_path.rglob("*"))
    with pytest.raises(BadRequest), new_bag(target):
        raise AssertionError("not reached")
    assert sorted(tmp_path.rglob("*")) == before


def test_an_empty_folder_makes_way(tmp_path: Path) -> None:
    (tmp_path / "target").mkdir()
    with new_bag(tmp_path / "target") as writer:
        writer.add("a", [b"a"])
        writer.finish([])
    assert read_bag(tmp_path / "target").findings == []


@pytest.mark.parametrize(
    ("path", "says"),
    [("../x", "climbs"), ("a.txt", "is taken"), ("con.txt", "device")],
    ids=["climbing", "twice", "device"],
)
def test_a_path_that_cannot_be_held_is_refused_and_nothing_stays(
    tmp_path: Path, path: str, says: str
) -> None:
    with pytest.raises(BadRequest, match=says), new_bag(tmp_path / "target") as writer:  # noqa: PT012 - the bag is the point
        writer.add("a.txt", [b"a"])
        writer.add(path, [b"b"])
    assert list(tmp_path.iterdir()) == []


def test_other_bytes_than_promised_leave_nothing(tmp_path: Path) -> None:
    with pytest.raises(DamagedFile), new_bag(tmp_path / "target") as writer:
        writer.add("a.txt", [b"a"], sha256=ZERO)
    assert list(tmp_path.iterdir()) == []


def test_paths_that_look_alike_are_not_written(tmp_path: Path) -> None:
    with pytest.raises(BadRequest, match="same on some"), new_bag(tmp_path / "target") as writer:  # noqa: PT012 - as above
        writer.add("a.txt", [b"a"])
        writer.add("A.txt", [b"a"])
        writer.finish([])
    assert list(tmp_path.iterdir()) == []
