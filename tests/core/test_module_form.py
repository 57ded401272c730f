"""The form that every module keeps: under 400 lines, and a docstring whose first line is one sentence."""

import ast
import re
from importlib.util import find_spec
from pathlib import Path

import pytest

LIMIT = 400


def _modules() -> list[Path]:
    found: list[Path] = []
    for package in ("colure", "colure_viewer", "colure_resources"):
        spec = find_spec(package)
        assert spec is not None
        assert spec.submodule_search_locations
        found += sorted(Path(next(iter(spec.submodule_search_locations))).rglob("*.py"))
    return [path for path in found if not path.name.startswith("build_")]  # scripts that are run, not imported


MODULES = _modules()


@pytest.mark.parametrize("path", MODULES, ids=lambda path: "/".join(path.parts[-2:]))
def test_module_is_short_and_says_what_it_is(path: Path) -> None:
    text = path.read_text(encoding="utf-8")
    assert len(text.splitlines()) < LIMIT
    docstring = ast.get_docstring(ast.parse(text))
    assert docstring, "no docstring"
    first = docstring.splitlines()[0]
    assert first.endswith((".", "?")), f"first line does not end a sentence: {first!r}"
    # One sentence: no full stop, question or exclamation mark that another sentence follows.
    assert not re.search(r"[.!?]\s+[A-Z]", first), f"more than one sentence: {first!r}"
    assert first[0].isupper() or first[0] == "`"  # a command's own name may come first


def test_all_three_packages_are_seen() -> None:
    names = {path.parts[-2] for path in MODULES}
    assert {"colure", "colure_viewer", "colure_resources"} <= names
