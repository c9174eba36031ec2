"""Which paths a bag may hold."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from archive.exchange.bag_names import decoded, encoded, look_alikes, path_fault


@pytest.mark.parametrize(
    ("path", "says"),
    [
        pytest.param("", "empty", id="nothing"),
        pytest.param("/etc/passwd", "not relative", id="absolute"),
        pytest.param("~/x", "not relative", id="home"),
        pytest.param("data/../x", "climbs", id="climbing"),
        pytest.param("data/./x", "empty part", id="dot"),
        pytest.param("data//x", "empty part", id="two slashes"),
        pytest.param("data/x/", "empty part", id="slash at the end"),
        pytest.param("data\\..\\x", "not every file system", id="backslash"),
        pytest.param("C:/x", "not every file system", id="drive"),
        pytest.param("data/x\ny", "cannot be seen", id="line end"),
        pytest.param("data/x\x00", "cannot be seen", id="null"),
        pytest.param("data/\u202ecod.h5", "cannot be seen", id="direction mark"),
        pytest.param("data/\udcff", "cannot be seen", id="not UTF-8"),
        pytest.param("data/nul.h5", "device", id="device"),
        pytest.param("data/x.", "dot or a blank", id="dot at the end"),
        pytest.param("data/x ", "dot or a blank", id="blank at the end"),
        pytest.param("data/u\u0308.csv", "form C", id="decomposed"),
        pytest.param("data/" + "x" * 300, "too long", id="long name"),
        pytest.param("data/" + "x/" * 60 + "y", "too long", id="deep"),
    ],
)
def test_a_path_that_leads_elsewhere_or_not_everywhere_is_named(path: str, says: str) -> None:
    assert says in (path_fault(path) or "")


@pytest.mark.parametrize(
    "path", ["data/sealed/2026-03/s017@film-transition.2.h5", "bagit.txt", "data/Übersicht 1.csv"]
)
def test_a_plain_path_has_no_fault(path: str) -> None:
    assert path_fault(path) is None


@given(st.text())
def test_what_is_encoded_is_decoded_again(path: str) -> None:
    assert decoded(encoded(path)) == path
    assert "\n" not in encoded(path)


@pytest.mark.parametrize(
    "text", ["data/%2e%2e/x", "data/%", "data/%2", "data/%2F", "data/%00", "data/%c0%ae"]
)
def test_a_percent_sign_encodes_three_signs_only(text: str) -> None:
    """RFC 8493, section 2.1.3: CR, LF and the percent sign, and only those."""
    with pytest.raises(ValueError, match="encodes no sign"):
        decoded(text)


def test_the_signs_are_encoded_in_either_case() -> None:
    assert decoded("a%0ab%0Dc%25") == "a\nb\rc%"


@pytest.mark.parametrize(
    ("paths", "pair"),
    [
        pytest.param(["data/A.h5", "data/a.h5"], ("data/A.h5", "data/a.h5"), id="case of a file"),
        pytest.param(["data/X/1", "data/x/2"], ("data/X", "data/x"), id="case of a folder"),
        pytest.param(["data/ﬁ.h5", "data/fi.h5"], ("data/fi.h5", "data/ﬁ.h5"), id="ligature"),
        pytest.param(["data/straße", "data/STRASSE"], ("data/STRASSE", "data/straße"), id="sharp s"),
    ],
)
def test_paths_that_may_be_taken_for_one_another(paths: list[str], pair: tuple[str, str]) -> None:
    assert list(look_alikes(paths)) == [pair]


def test_paths_in_one_folder_are_no_look_alikes() -> None:
    assert list(look_alikes(["data/a/1", "data/a/2", "data/b/1"])) == []
