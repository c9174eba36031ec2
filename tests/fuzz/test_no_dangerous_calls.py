"""What turns data into code, or a word into a shell's command, does not occur in the program."""

from __future__ import annotations

import ast
from pathlib import Path

_ROOT = Path(__file__).parents[2]
_SOURCES = sorted(
    path for folder in ("archive", "schemas", "migrations", "templates") for path in (_ROOT / folder).rglob("*.py")
)  # fmt: skip
_MODULES = {
    "pickle",
    "cPickle",
    "marshal",
    "shelve",
    "dill",
    "cloudpickle",
    "joblib",
    "yaml",
    "ruamel",
    "code",
    "pty",
}
_CALLS = {"eval", "exec", "compile", "__import__", "input"}
_METHODS = {("os", "system"), ("os", "popen"), ("yaml", "load"), ("np", "load"), ("numpy", "load")}

# Each with the reason why it may stand.
_EXCEPTED = {
    (
        "schemas/unit_registry.py",
        "pickle",
    ): "the units library keeps its own cache so; only its faults are named",
    (
        "archive/reduction/trials.py",
        "pickle",
    ): "from one process to its own children, as the standard library does",
    ("archive/intake/hdf5_source.py", "np.load"): "the answer of our own child, with allow_pickle=False",
}


def _occurrences(path: Path) -> set[str]:
    found: set[str] = set()
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names if alias.name.partition(".")[0] in _MODULES}
        elif isinstance(node, ast.ImportFrom) and (node.module or "").partition(".")[0] in _MODULES:
            found.add(str(node.module))
        elif isinstance(node, ast.Call):
            found |= _called(node)
    return found


def _called(node: ast.Call) -> set[str]:
    found: set[str] = set()
    if isinstance(node.func, ast.Name) and node.func.id in _CALLS:
        found.add(node.func.id)
    if isinstance(node.func, ast.Attribute) and isinstance(node.func.value, ast.Name):
        name = (node.func.value.id, node.func.attr)
        if name in _METHODS:
            found.add(".".join(name))
    for keyword in node.keywords:
        given = keyword.value.value if isinstance(keyword.value, ast.Constant) else None
        if (keyword.arg == "shell" and given is not False) or (
            keyword.arg == "allow_pickle" and given is not False
        ):
            found.add(f"{keyword.arg}={given}")
    return found


def test_no_module_makes_code_of_data() -> None:
    assert len(_SOURCES) > 300
    found = {(path.relative_to(_ROOT).as_posix(), each) for path in _SOURCES for each in _occurrences(path)}
    assert found - set(_EXCEPTED) == set()


def test_every_exception_is_still_needed() -> None:
    for name, each in _EXCEPTED:
        assert each in _occurrences(_ROOT / name), (name, each)
