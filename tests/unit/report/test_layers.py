"""What the report may import."""

from __future__ import annotations

import ast
import sys
from pathlib import Path

import fitlib.report

ALLOWED = {"jinja2", "fitlib.report", "fitlib.errors"} | set(sys.stdlib_module_names)


def imported(path: Path) -> set[str]:
    """Full names of the modules that a file imports."""
    found = set()
    for node in ast.walk(ast.parse(path.read_text())):
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom):
            found.add(node.module)
    return found


def test_the_report_imports_only_jinja2_and_itself():
    files = sorted(Path(fitlib.report.__file__).parent.glob("*.py"))
    assert len(files) > 5
    for path in files:
        for name in imported(path):
            top = ".".join(name.split(".")[:2]) if name.startswith("fitlib") else name.split(".")[0]
            assert top in ALLOWED, (path.name, name)
