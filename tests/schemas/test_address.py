"""What spells an address, and what it names."""

from __future__ import annotations

import pytest

from schemas.address import parse_address


@pytest.mark.parametrize(
    ("text", "kind", "head", "number", "revision"),
    [
        ("2026-03", "name", "2026-03", None, None),
        ("2026-03.a1", "accession", "2026-03", 1, None),
        ("2026-03.m1", "amendment", "2026-03", 1, None),
        ("2026-03.w12", "withdrawal", "2026-03", 12, None),
        ("RX-2-cal.r2", "record", "RX-2-cal", 2, None),
        ("RX-2-cal.r2.w1", "withdrawal", "RX-2-cal", 1, 2),
        ("2026-03/s017@film-transition.2#T_KT", "output", "2026-03", 2, None),
    ],
)
def test_an_address_names_its_thing(
    text: str, kind: str, head: str, number: int | None, revision: int | None
) -> None:
    found = parse_address(text)
    assert (found.text, found.kind, found.head, found.number, found.revision) == (
        text,
        kind,
        head,
        number,
        revision,
    )


@pytest.mark.parametrize(
    "text",
    [
        "2026-03.m0",
        "2026-03.w",
        "2026-03.m1.w1",
        "RX-2-cal.w1.r2",
        "RX-2-cal.r2.m1",
        "2026-03/s1.m1",
        ".m1",
        "2026-03\n",
        "2026-03/s1#T\n",
    ],
)
def test_what_is_no_address_is_refused(text: str) -> None:
    with pytest.raises(ValueError, match="is no address"):
        parse_address(text)
