"""Hostile and clumsy input ends in a finding or a sentence: never in a traceback, a hang or a full memory."""

from __future__ import annotations

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tests.fuzz.strategies import SEEDS, hostile_text, mutated
from tests.fuzz.targets import BYTES, TEXTS

# Derandomised: a run of the tests finds the same today and tomorrow; `long_run.py` is for finding new things.
_FEW = settings(
    max_examples=40, deadline=None, derandomize=True, database=None, suppress_health_check=list(HealthCheck)
)


@pytest.mark.parametrize("name", sorted(BYTES))
def test_spoilt_bytes(name: str) -> None:
    @_FEW
    @given(mutated(name))
    def holds(data: bytes) -> None:
        BYTES[name](data)

    holds()


@pytest.mark.parametrize("name", sorted(BYTES))
def test_the_good_examples_and_plain_noise(name: str) -> None:
    for seed in SEEDS[name]:
        BYTES[name](seed)
        BYTES[name](seed[: len(seed) // 2])

    @settings(_FEW, max_examples=15)
    @given(st.binary(max_size=300))
    def holds(data: bytes) -> None:
        BYTES[name](data)

    holds()


@pytest.mark.parametrize("name", sorted(TEXTS))
def test_hostile_texts(name: str) -> None:
    @settings(_FEW, max_examples=150)
    @given(hostile_text())
    def holds(text: str) -> None:
        TEXTS[name](text)

    holds()
