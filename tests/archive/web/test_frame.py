"""What every request must pass and what every answer carries, held against the standards that say so."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from starlette.testclient import TestClient

from archive.web import application
from archive.web.links import address_at, path_of
from archive.web.serving import is_loopback
from tests.filled_archive import PLAIN, filled


@pytest.mark.parametrize("path", ["/", "/cooldowns", "/at/2025-11", "/nowhere", "/at/2026-04", "/to"])
def test_every_answer_is_guarded(client: TestClient, path: str) -> None:
    headers = client.get(path).headers
    policy = dict(part.strip().partition(" ")[::2] for part in headers["content-security-policy"].split(";"))
    assert policy["default-src"] == "'none'"
    assert policy["script-src"] == policy["style-src"] == policy["form-action"] == "'self'"
    assert policy["frame-ancestors"] == policy["base-uri"] == "'none'"
    assert "unsafe" not in headers["content-security-policy"]
    assert headers["x-content-type-options"] == "nosniff"
    assert headers["referrer-policy"] == "no-referrer"
    assert headers["cross-origin-resource-policy"] == "same-origin"
    assert "server" not in headers


@pytest.mark.parametrize(
    ("host", "status"),
    [
        ("localhost:8321", 200),
        ("127.0.0.1:9000", 200),
        ("[::1]:8321", 200),
        ("LOCALHOST", 200),
        ("elsewhere.example:8321", 421),
        ("127.0.0.1.elsewhere.example", 421),
        ("192.0.2.7:8321", 421),
        ("", 421),
    ],
)
def test_only_its_own_name_is_answered(client: TestClient, host: str, status: int) -> None:
    answer = client.get("/", headers={"Host": host})
    assert answer.status_code == status
    assert ("Open the address" in answer.text) == (status == 421)


@pytest.mark.parametrize("method", ["POST", "PUT", "DELETE", "PATCH", "OPTIONS"])
def test_nothing_can_be_changed(client: TestClient, method: str) -> None:
    answer = client.request(method, "/at/2025-11")
    assert (answer.status_code, answer.headers["allow"]) == (405, "GET, HEAD")


def test_head_says_what_get_would(client: TestClient) -> None:
    head, get = client.head("/cooldowns"), client.get("/cooldowns")
    assert (head.status_code, head.headers["content-length"]) == (200, get.headers["content-length"])


def test_a_token_opens_once_and_stays_as_a_cookie(root: Path) -> None:
    app = application(root, hosts={"fridge", "*"}, token="aB3-token")  # noqa: S106 - of this test
    with TestClient(app, base_url="http://192.0.2.7:8321", follow_redirects=False) as visitor:
        assert visitor.get("/cooldowns").status_code == 401
        assert visitor.get("/cooldowns?token=wrong").status_code == 401
        let_in = visitor.get("/at/2026-03/s001?token=aB3-token&with=2026-03/s002")
        assert let_in.status_code == 303
        assert let_in.headers["location"] == "/at/2026-03/s001?with=2026-03%2Fs002"
        assert "httponly" in let_in.headers["set-cookie"].lower()
        assert "samesite=strict" in let_in.headers["set-cookie"].lower()
        assert visitor.get("/cooldowns").status_code == 200
        # A path of two solidi would be another host's.
        away = visitor.get("//elsewhere.example/?token=aB3-token")
        assert not away.headers.get("location", "/").startswith("//")


@pytest.mark.parametrize(
    ("host", "alone"), [("127.0.0.1", True), ("localhost", True), ("::1", True), ("::", False), ("192.0.2.7", False), ("fridge", False)]
)  # fmt: skip
def test_what_only_this_machine_reaches(host: str, alone: bool) -> None:  # noqa: FBT001 - a parameter
    assert is_loopback(host) is alone


def test_static_files_are_named_by_their_content(client: TestClient) -> None:
    page = client.get("/").text
    sheet = next(iter(re.findall(r'href="(/style/[0-9a-f]{16}/stillroom.css)"', page)))
    answer = client.get(sheet)
    assert answer.headers["content-type"] == "text/css; charset=utf-8"
    assert "immutable" in answer.headers["cache-control"]
    older = client.get("/style/0000000000000000/stillroom.css", follow_redirects=False)
    assert (older.status_code, older.headers["location"]) == (307, sheet)
    for name in (
        "nothing.css",
        "../../../pyproject.toml",
        "%2e%2e/frame.html.j2",
        "..%2f..%2fpyproject.toml",
    ):
        assert client.get(f"/style/0000000000000000/{name}").status_code == 404


@pytest.mark.parametrize(
    "address",
    ["2026-03", "TO-4.r2", "2026-03/s017", "2026-03/s017#period", "2026-03/s017@film-transition.2#T_KT", "2026-03.a1:raw/a b/%41?#ü.csv"],
)  # fmt: skip
def test_an_address_is_a_path_and_back(address: str) -> None:
    from urllib.parse import unquote

    path = path_of(address)
    assert path.isascii()
    assert not set(path) & set("?# ")
    assert address_at(unquote(path.removeprefix("/at/"))) == address


def test_the_address_field_leads_there(client: TestClient) -> None:
    assert client.get("/to", params={"address": " 2026-03/s002 "}).url.path == "/at/2026-03/s002"
    near = client.get("/to", params={"address": "2026-3"})
    assert near.status_code == 404
    assert 'href="/at/2025-11"' in near.text


def test_an_empty_archive_says_what_to_do(tmp_path: Path) -> None:
    from archive import Archive

    Archive.create(tmp_path / "lab").close()
    with TestClient(application(tmp_path / "lab"), base_url="http://localhost") as visitor:
        assert "stillroom ingest FOLDER" in visitor.get("/").text


def test_a_lost_or_damaged_index_has_its_page(tmp_path: Path) -> None:
    lab = filled(tmp_path)
    with TestClient(application(lab), base_url="http://localhost") as visitor:
        assert visitor.get("/cooldowns").status_code == 200
        for beside in lab.glob("index.sqlite3*"):
            beside.unlink()
        lost = visitor.get("/cooldowns")
        assert (lost.status_code, "rebuild-index" in lost.text) == (500, True)
        (lab / "index.sqlite3").write_bytes(b"no database" * 1000)
        damaged = visitor.get("/cooldowns")
        assert (damaged.status_code, "Something is damaged" in damaged.text) == (500, True)


def test_a_damaged_sealed_file_is_named_and_the_rest_goes_on(tmp_path: Path) -> None:
    lab = filled(tmp_path)
    hurt = lab / "sealed" / PLAIN / f"{PLAIN}.a1.h5"
    content = bytearray(hurt.read_bytes())
    content[: len(content) // 2] = bytes(len(content) // 2)
    hurt.chmod(0o644)
    hurt.write_bytes(content)
    (lab / "journal.jsonl").unlink()
    with TestClient(application(lab), base_url="http://localhost") as visitor:
        damaged = visitor.get(f"/at/{PLAIN}")
        assert (damaged.status_code, f"{PLAIN}.a1" in damaged.text) == (500, True)
        assert "stillroom mend --from COPY" in damaged.text
        assert visitor.get("/search").status_code == 200
        assert "No fixity pass is on record" in visitor.get("/state").text
