"""What is done in threads beside comes out as if it had been done in one."""

from __future__ import annotations

import hashlib
import threading
from pathlib import Path

import numpy as np
import pytest

from archive.intake.beside import Beside


def test_items_come_in_order_and_from_another_thread():
    def items():
        for number in range(20):
            yield number, threading.get_ident()

    with Beside() as beside:
        seen = list(beside.ahead(items()))
    assert [number for number, _ in seen] == list(range(20))
    assert threading.get_ident() not in {thread for _, thread in seen}


def test_a_fault_comes_after_the_items_before_it():
    def items():
        yield 1
        yield 2
        message = "no third"
        raise ValueError(message)

    with Beside() as beside:
        coming = beside.ahead(items())
        assert [next(coming), next(coming)] == [1, 2]
        with pytest.raises(ValueError, match="no third"):
            next(coming)


def test_who_stops_early_may_close_the_source(tmp_path: Path):
    path = tmp_path / "log.csv"
    path.write_bytes(b"0\n" * 1000)
    with Beside() as beside, path.open("rb") as stream:
        lines = beside.ahead(iter(stream.readline, b""))
        assert next(lines) == b"0\n"
        lines.close()


def test_digests_of_mixed_pieces_are_those_of_the_whole():
    pieces = [np.arange(start, start + 100) for start in range(0, 30_000, 100)]
    with Beside() as beside:
        first, second = beside.digest(), beside.digest()
        for piece in pieces:
            first.update(piece.data)
            second.update(bytes(piece[::-1]))
        found = first.hexdigest(), second.hexdigest()
    assert found[0] == hashlib.sha256(np.concatenate(pieces).tobytes()).hexdigest()
    assert found[1] == hashlib.sha256(b"".join(bytes(piece[::-1]) for piece in pieces)).hexdigest()
