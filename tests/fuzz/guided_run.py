"""A coverage-guided run against one target, kept out of CI: `python -m tests.fuzz.guided_run sheet --minutes 3`.

It needs atheris (`pip install atheris`), which is no dependency of the tests. Modules that read what comes from outside are
instrumented as they are imported; libFuzzer then keeps each input that reaches a branch nothing reached before. A find is
left as `crash-*` in the folder that is named, to become a test.
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Callable
from importlib import import_module
from pathlib import Path
from typing import Any

# The readers and the grammars of text; more costs minutes before the first input.
_INSTRUMENTED = ["schemas.toml_text", "schemas.address", "schemas.quantity_text", "archive.intake.sheet", "archive.intake.act_sheets", "archive.commands.ranges"]  # fmt: skip
_SLOWEST_S, _MEMORY_MB, _LONGEST = 60, 4096, 20_000


def main() -> None:
    """Run until the time is over or something is found."""
    atheris: Any = import_module("atheris")
    with atheris.instrument_imports(include=_INSTRUMENTED, enable_loader_override=False):
        from tests.fuzz.strategies import SEEDS
        from tests.fuzz.targets import BYTES, TEXTS

    asked = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    asked.add_argument("target", choices=sorted({**BYTES, **TEXTS}))
    asked.add_argument("--minutes", type=float, default=3.0)
    asked.add_argument("--folder", type=Path, default=Path("fuzz-finds"))
    given = asked.parse_args()
    corpus = given.folder / f"corpus-{given.target}"
    corpus.mkdir(parents=True, exist_ok=True)
    for number, seed in enumerate(SEEDS.get(given.target, ())):
        (corpus / f"seed-{number}").write_bytes(seed)
    one: Callable[[bytes], None]
    if given.target in BYTES:
        one = BYTES[given.target]
    else:
        text_target = TEXTS[given.target]

        def one(data: bytes) -> None:
            text_target(data.decode("utf-8", errors="surrogateescape"))

    options = [
        f"-max_total_time={int(given.minutes * 60)}", f"-timeout={_SLOWEST_S}", f"-rss_limit_mb={_MEMORY_MB}", f"-max_len={_LONGEST}",
        f"-artifact_prefix={given.folder}/", "-print_final_stats=1",
    ]  # fmt: skip
    atheris.Setup([sys.argv[0], *options, str(corpus)], one)
    atheris.Fuzz()


if __name__ == "__main__":
    main()
