"""Which keys, paths and raw names are taken."""

from __future__ import annotations

import pytest

from archive.errors import BadRequest
from archive.store.names import checked_key, checked_path, checked_raw_name, is_key


@pytest.mark.parametrize(
    "key", ["2026-03/2026-03.a1", "2026-03/s017@film-transition.2", "a/b", "things/TO-4.r2", "x+y/z_"]
)
def test_keys_that_are_taken(key: str) -> None:
    assert checked_key(key) == key


@pytest.mark.parametrize(
    "key",
    [
        "",
        "a",
        "a/b/c",
        "/a",
        "a/",
        "../a",
        "a/..",
        "a/.hidden",
        "-a/b",
        "a/b.",
        "a/b.h5",
        "a/b.H5",
        "a/b c",
        "a/b\n",
        "a/bü",
        "a/b~c",
        "a\\b/c",
        "C:/b",
        "nul/b",
        "a/COM1.x",
        "a/" + "b" * 201,
    ],
)
def test_keys_that_are_not(key: str) -> None:
    assert not is_key(key)
    with pytest.raises(BadRequest, match="key"):
        checked_key(key)


@pytest.mark.parametrize("path", ["sweeps/s017/period", "x", "fits/s017.2/cov", "raws/x", "documents"])
def test_paths_that_are_taken(path: str) -> None:
    assert checked_path(path) == path


@pytest.mark.parametrize(
    "path", ["", "/x", "x/", "a//b", "raw/x", "raw", "document", "a/../b", ".", "a b", "µ"]
)
def test_paths_that_are_not(path: str) -> None:
    with pytest.raises(BadRequest, match="path"):
        checked_path(path)


@pytest.mark.parametrize("name", ["T.csv", "log/Lock-in Übersicht (2).csv", "...", "-x", "温度.dat", "a:b?"])
def test_raw_names_that_are_taken(name: str) -> None:
    assert checked_raw_name(name) == name


@pytest.mark.parametrize(
    "name",
    ["", "/etc/x", "a//b", "../x", "a/..", "./x", "a\\b", "a\nb", "a\0", "a\x7f", "\udcff.csv", "ü" * 128],
)
def test_raw_names_that_are_not(name: str) -> None:
    with pytest.raises(BadRequest, match="raw file"):
        checked_raw_name(name)
