"""What the figures may import."""

from __future__ import annotations

import ast
import sys
from pathlib import Path

import fitlib.figures

ALLOWED = {"numpy", "matplotlib", "fitlib.figures", "fitlib.errors"} | set(sys.stdlib_module_names)


def imported(path: Path) -> set[str]:
    """Full names of the modules that a file imports."""
    found = set()
    for node in ast.walk(ast.parse(path.read_text())):
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom):
            found.add(node.module)
    return found


def test_figures_import_only_numpy_matplotlib_and_themselves():
    files = sorted(Path(fitlib.figures.__file__).parent.glob("*.py"))
    assert len(files) > 5
    for path in files:
        for name in imported(path):
            top = ".".join(name.split(".")[:2]) if name.startswith("fitlib") else name.split(".")[0]
            assert top in ALLOWED, (path.name, name)
            assert name != "matplotlib.pyplot"
