"""The order of the tests: files that take minutes come first, so that no worker is left alone with one at the end.

No drawn example has a time limit: on a machine that others use, a pause of a second is no fault of the code.
"""

from __future__ import annotations

import pytest
from hypothesis import settings

settings.register_profile("shared machine", deadline=None)
settings.load_profile("shared machine")

LONGEST = (
    "tests/archive/commands/test_demo_command.py",
    "tests/archive/demo/test_reduction.py",
    "tests/crash/test_stopped.py",
    "tests/archive/reduction/test_dynamic_steps.py",
    "tests/crash/test_system_calls.py",
    "tests/crash/test_power_cut.py",
)


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    """Bring the longest files to the front; all else keeps its order."""
    ranks = {name: place for place, name in enumerate(LONGEST)}
    items.sort(key=lambda item: ranks.get(item.nodeid.partition("::")[0], len(LONGEST)))
