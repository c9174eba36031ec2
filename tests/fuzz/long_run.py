"""A long random run against every target, kept out of CI: `python -m tests.fuzz.long_run --minutes 10`.

Hypothesis makes and shrinks the examples. Each find is written to a file beside the others, with the name of its target,
so that it can become a test.
"""

from __future__ import annotations

import argparse
import hashlib
import random
import resource
import signal
import sys
import time
import traceback
from collections.abc import Callable
from pathlib import Path

from hypothesis import HealthCheck, Phase, given, seed, settings
from hypothesis import strategies as st

from tests.fuzz.strategies import SEEDS, hostile_text, mutated
from tests.fuzz.targets import BYTES, TEXTS

_MEMORY = 6 << 30
_SLOW_S = 5.0
_HANG_S = 120
_A_ROUND = 300


def _say(text: str) -> None:
    sys.stdout.write(text + "\n")
    sys.stdout.flush()


def _kept(folder: Path, name: str, data: bytes, why: str) -> None:
    folder.mkdir(parents=True, exist_ok=True)
    stem = folder / f"{name}-{hashlib.sha256(data).hexdigest()[:12]}"
    stem.with_suffix(".bin").write_bytes(data)
    stem.with_suffix(".txt").write_text(why, encoding="utf-8", errors="backslashreplace")


def _hung(_number: int, _frame: object) -> None:
    raise TimeoutError(f"no end after {_HANG_S} s")


def _round(name: str, number: int, folder: Path) -> bool:
    """Throw one round of examples at a target; whether all was well."""
    target: Callable[..., None] = BYTES.get(name) or TEXTS[name]
    made = (
        mutated(name) | st.binary(max_size=2000) if name in BYTES else hostile_text() | st.text(max_size=200)
    )
    last = b""

    @seed(number)
    @settings(
        max_examples=_A_ROUND, deadline=None, database=None, suppress_health_check=list(HealthCheck),
        phases=(Phase.generate, Phase.shrink),
    )  # fmt: skip
    @given(made)
    def holds(data: bytes | str) -> None:
        nonlocal last
        last = data if isinstance(data, bytes) else data.encode("utf-8", "surrogatepass")
        begin = time.process_time()
        signal.alarm(_HANG_S)
        try:
            target(data)
        finally:
            signal.alarm(0)
        took = time.process_time() - begin
        assert took < _SLOW_S, f"took {took:.1f} s"

    try:
        holds()
    except BaseException:  # noqa: BLE001 - a find of any kind is what this is for
        why = traceback.format_exc()
        _kept(folder, name, last, why)
        _say(f"FOUND {name} in round {number}: {why.strip().splitlines()[-1][:300]}")
        return False
    return True


def main() -> int:
    """Run for some minutes; exit code 1 if anything was found."""
    reader = argparse.ArgumentParser(description=__doc__)
    reader.add_argument("--minutes", type=float, default=10.0)
    reader.add_argument(
        "--targets", nargs="*", choices=sorted([*BYTES, *TEXTS]), default=sorted([*BYTES, *TEXTS])
    )
    reader.add_argument("--seed", type=int, default=None, help="first round's number; random if left out")
    reader.add_argument("--finds", type=Path, default=Path("fuzz-finds"), help="folder for what is found")
    asked = reader.parse_args()
    signal.signal(signal.SIGALRM, _hung)
    resource.setrlimit(resource.RLIMIT_AS, (_MEMORY, _MEMORY))
    number = asked.seed if asked.seed is not None else random.SystemRandom().randrange(1 << 30)
    begin, rounds, found = time.monotonic(), 0, 0
    while time.monotonic() - begin < asked.minutes * 60:
        for name in asked.targets:
            found += not _round(name, number, asked.finds)
            rounds += 1
            if time.monotonic() - begin > asked.minutes * 60:
                break
        number += 1
    _say(
        f"{rounds} rounds of up to {_A_ROUND} examples, {len(SEEDS)} kinds of seed, last number {number}; found {found}"
    )
    return 1 if found else 0


if __name__ == "__main__":
    sys.exit(main())
