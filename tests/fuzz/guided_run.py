"""A coverage-guided run against one target, kept out of CI: `python -m tests.fuzz.guided_run sheet --minutes 3`.

It needs atheris (`pip install atheris`), which is no dependency of the tests. Functions of the modules that read what comes
from outside are instrumented one by one after everything is imported: by its import hook atheris instruments a whole package,
which took minutes before the first input. libFuzzer then keeps each input that reaches a branch nothing reached before. A find
is left as `crash-*` in the folder that is named, to become a test.
"""

from __future__ import annotations

import argparse
import inspect
import sys
from collections.abc import Callable, Iterator
from importlib import import_module
from pathlib import Path
from types import FunctionType, ModuleType
from typing import Any

from tests.fuzz.strategies import SEEDS
from tests.fuzz.targets import BYTES, TEXTS

# The readers, the grammars of text and what sheets are made of; nothing of physics, pydantic or h5py.
_INSTRUMENTED = (
    "schemas.toml_text", "schemas.address", "schemas.quantity_text", "schemas.quantity_value", "schemas.uncertain_text", "schemas.interval_text",
    "schemas.cooldown", "schemas.sweep", "schemas.gas", "schemas.plan", "schemas.acts", "schemas.visible_text", "archive.intake.sheet",
    "archive.intake.act_sheets", "archive.intake.settings", "archive.intake.tables", "archive.intake.sources", "archive.intake.draft",
    "archive.intake.folder", "archive.intake.reading", "archive.intake.hdf5_source", "archive.intake.numpy_source", "archive.intake.guess", "schemas.ranges", "archive.reduction.planning", "archive.exchange.bag_reading",
    "archive.exchange.bag_names", "archive.exchange.unpacking", "archive.reports.prose", "archive.reports.tex",
)  # fmt: skip
_SLOWEST_S, _MEMORY_MB, _LONGEST = 60, 4096, 20_000


def _functions(module: ModuleType) -> Iterator[FunctionType]:
    """Yield the functions and methods that a module itself defines, below whatever decorates them."""
    held = list(vars(module).values())
    inside = [
        vars(each).values() for each in held if isinstance(each, type) and each.__module__ == module.__name__
    ]
    for each in [*held, *(one for group in inside for one in group)]:
        bare = each.fget if isinstance(each, property) else getattr(each, "__func__", each)
        found = inspect.unwrap(bare) if callable(bare) else bare
        if isinstance(found, FunctionType) and found.__module__ == module.__name__:
            yield found


def main() -> None:
    """Run until the time is over or something is found."""
    atheris: Any = import_module("atheris")
    asked = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    asked.add_argument("target", choices=sorted({**BYTES, **TEXTS}))
    asked.add_argument("--minutes", type=float, default=3.0)
    asked.add_argument("--folder", type=Path, default=Path("fuzz-finds"))
    given = asked.parse_args()
    for module in _INSTRUMENTED:
        for each in _functions(import_module(module)):
            atheris.instrument_func(each)
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
