"""Spoiling packages and making them consistent again, as a forger would; and seeing that nothing came of it."""

from __future__ import annotations

import hashlib
import json
from pathlib import Path
from typing import Any

from archive import Archive

__all__ = ["account", "contents", "refused", "resealed", "retagged", "rewrite", "swap", "without"]


def resealed(bag: Path) -> None:
    """Make manifests, tag manifests and the count of the payload anew, as a forger would."""
    payload = sorted(p for p in (bag / "data").rglob("*") if p.is_file())
    for name in ("sha256", "sha512"):
        lines = [
            f"{hashlib.new(name, p.read_bytes()).hexdigest()}  {p.relative_to(bag).as_posix().replace('%', '%25')}\n"
            for p in payload
        ]
        (bag / f"manifest-{name}.txt").write_text("".join(lines), encoding="utf-8")
    size = sum(p.stat().st_size for p in payload)
    (bag / "bag-info.txt").write_text(f"Payload-Oxum: {size}.{len(payload)}\n")
    retagged(bag)


def retagged(bag: Path) -> None:
    """Make the tag manifests anew."""
    tags = sorted(p for p in bag.iterdir() if p.is_file() and not p.name.startswith("tagmanifest"))
    for name in ("sha256", "sha512"):
        lines = [f"{hashlib.new(name, p.read_bytes()).hexdigest()}  {p.name}\n" for p in tags]
        (bag / f"tagmanifest-{name}.txt").write_text("".join(lines))


def contents(root: Path) -> dict[str, str]:
    """Digest of every file below a folder but the index and the lock, which an open archive may touch."""
    return {
        path.relative_to(root).as_posix(): hashlib.sha256(path.read_bytes()).hexdigest()
        for path in sorted(root.rglob("*"))
        if path.is_file() and not path.name.startswith(("index.sqlite3", "archive.lock"))
    }


def account(package: Path) -> dict[str, Any]:
    """What a package says about itself."""
    content: dict[str, Any] = json.loads(
        (package / "data" / "stillroom-package.json").read_text(encoding="utf-8")
    )
    return content


def rewrite(package: Path, content: dict[str, Any]) -> None:
    """Let a package say something else about itself, and make the bag consistent again."""
    (package / "data" / "stillroom-package.json").write_text(json.dumps(content), encoding="utf-8")
    resealed(package)


def swap(package: Path, key: str, content: bytes) -> None:
    """Put another file in the place of a sealed one, with all digests right."""
    path = package / "data" / "sealed" / f"{key}.h5"
    path.write_bytes(content)
    told = account(package)
    for each in told["files"]:
        if each["key"] == key:
            each["sha256"], each["size"] = hashlib.sha256(content).hexdigest(), len(content)
    rewrite(package, told)


def without(package: Path, *keys: str) -> None:
    """Take sealed files out of a package as if they had never been in it."""
    told = account(package)
    told["files"] = [each for each in told["files"] if each["key"] not in keys]
    for key in keys:
        (package / "data" / "sealed" / f"{key}.h5").unlink()
    rewrite(package, told)


def refused(lab: Archive, package: Path) -> set[str]:
    """Codes for which a package is refused, after seeing that nothing changed."""
    before, rows = contents(lab.root), lab._index.rows()
    outcome = lab.import_package(package)
    assert outcome.state == "refused", outcome
    assert outcome.taken == ()
    assert contents(lab.root) == before
    assert lab._index.rows() == rows
    return {finding.code for finding in outcome.findings}
