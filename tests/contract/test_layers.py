"""Imports point down only. The order stands in ``ORDER``; packages in one line do not import each other."""

from __future__ import annotations

import ast
import sys
from dataclasses import dataclass
from pathlib import Path

import pytest

import fitlib

ROOT = Path(fitlib.__file__).parent

ORDER = (
    ("cli",),
    ("engine",),
    ("report", "figures"),
    ("conversion", "collect", "revision"),
    ("analysis",),
    ("plan",),
    ("start",),
    ("observations",),
    ("study",),
    ("numerics",),
    ("errors",),
)
RANK = {name: len(ORDER) - line for line, names in enumerate(ORDER) for name in names}

#: Below the line: numpy and scipy, and of the standard library what reads no file, no clock and no chance.
NUMERIC_LIBRARIES = {"numpy", "scipy"}
NUMERIC_STANDARD = {
    "__future__",
    "abc",
    "collections",
    "contextlib",
    "dataclasses",
    "enum",
    "decimal",
    "fractions",
    "functools",
    "itertools",
    "math",
    "numbers",
    "operator",
    "types",
    "typing",
    "warnings",
}
FORBIDDEN_CALLS = {"open", "print", "input", "exec", "eval", "breakpoint"}


@dataclass(frozen=True)
class Import:
    """One import of one module, wherever it stands in the file."""

    module: str
    line: int
    target: str
    names: tuple[str, ...] = ()


def module_name(path: Path, root: Path) -> str:
    """``fitlib.study.loader`` for a file; a package goes by its own name."""
    parts = ("fitlib", *path.relative_to(root).with_suffix("").parts)
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


def imports_of(module: str, text: str, is_package: bool) -> list[Import]:
    """Every import of a module, those inside functions too, relative ones made absolute."""
    found = []
    for node in ast.walk(ast.parse(text)):
        if isinstance(node, ast.Import):
            found += [Import(module, node.lineno, alias.name) for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            names = tuple(alias.name for alias in node.names)
            found.append(Import(module, node.lineno, _absolute(module, node, is_package), names))
    return found


def _absolute(module: str, node: ast.ImportFrom, is_package: bool) -> str:
    if not node.level:
        return node.module or ""
    parts = module.split(".")
    base = parts[: len(parts) - node.level + is_package]
    return ".".join([*base, *([node.module] if node.module else [])])


def read_modules(root: Path) -> dict[str, tuple[Path, str]]:
    """Module name to file and text."""
    return {module_name(path, root): (path, path.read_text(encoding="utf-8")) for path in sorted(root.rglob("*.py"))}


def all_imports(root: Path) -> list[Import]:
    """Every import of the package."""
    return [
        each
        for module, (path, text) in read_modules(root).items()
        for each in imports_of(module, text, path.name == "__init__.py")
    ]


def part_of(module: str) -> str:
    """The room in which a module stands; empty for the root."""
    parts = module.split(".")
    return parts[1] if len(parts) > 1 else ""


def own_targets(each: Import, modules) -> list[str]:
    """The modules of fitlib that an import reaches; ``from fitlib.x import y`` may reach the module ``fitlib.x.y``."""
    if each.target != "fitlib" and not each.target.startswith("fitlib."):
        return []
    return [f"{each.target}.{name}" if f"{each.target}.{name}" in modules else each.target for name in each.names] or [
        each.target
    ]


def upward(root: Path) -> list[str]:
    """Imports that do not point down: into a higher room, or into another room of the same line."""
    modules = read_modules(root)
    faults = []
    for each in all_imports(root):
        here = part_of(each.module)
        if here in ("", "__main__"):
            continue
        for target in own_targets(each, modules):
            there = part_of(target)
            if there and there != here and RANK.get(there, 0) >= RANK.get(here, 99):
                faults.append(f"{each.module}:{each.line} imports {target}")
    return faults


def unranked(root: Path) -> set[str]:
    """Rooms that the order does not know."""
    return {part_of(module) for module in read_modules(root)} - set(RANK) - {"", "__main__"}


def root_imports(root: Path) -> list[str]:
    """Leaves that import the package root itself, which would make a cycle through its lazy names."""
    modules = read_modules(root)
    return [
        f"{each.module}:{each.line} imports the package root"
        for each in all_imports(root)
        if each.module not in ("fitlib", "fitlib.__main__") and "fitlib" in own_targets(each, modules)
    ]


def graph(root: Path) -> dict[str, set[str]]:
    """Module to the modules that it imports when it is loaded or called; imports for type checking do not run."""
    modules = read_modules(root)
    edges: dict[str, set[str]] = {module: set() for module in modules}
    for module, (path, text) in modules.items():
        for each in imports_of(module, _without_type_checking(text), path.name == "__init__.py"):
            edges[module] |= {target for target in own_targets(each, modules) if target in modules and target != module}
    return edges


def _without_type_checking(text: str) -> str:
    class Remove(ast.NodeTransformer):
        def visit_If(self, node: ast.If):
            name = node.test.attr if isinstance(node.test, ast.Attribute) else getattr(node.test, "id", "")
            return node.orelse or ast.Pass() if name == "TYPE_CHECKING" else self.generic_visit(node)

    return ast.unparse(Remove().visit(ast.parse(text)))


def cycles(root: Path) -> list[list[str]]:
    """Every group of modules that import each other in a circle."""
    edges = graph(root)
    reach = {module: _reachable(edges, module) for module in edges}
    groups = {
        frozenset(other for other in reach[module] if module in reach[other])
        for module in edges
        if module in reach[module]
    }
    return sorted(sorted(group) for group in groups)


def _reachable(edges: dict[str, set[str]], start: str) -> set[str]:
    found: set[str] = set()
    waiting = list(edges[start])
    while waiting:
        module = waiting.pop()
        if module not in found:
            found.add(module)
            waiting += edges[module]
    return found


def numeric_faults(root: Path) -> list[str]:
    """What does not belong below the line: other libraries, files, printing, unnamed chance."""
    faults = []
    for module, (path, text) in read_modules(root).items():
        if part_of(module) != "numerics":
            continue
        for each in imports_of(module, text, path.name == "__init__.py"):
            top = each.target.split(".")[0]
            if top not in NUMERIC_LIBRARIES | NUMERIC_STANDARD | {"fitlib"}:
                faults.append(f"{module}:{each.line} imports {top}")
        faults += [f"{module}:{line} calls {name}" for line, name in _calls(ast.parse(text))]
    return faults


def _calls(tree: ast.AST) -> list[tuple[int, str]]:
    """Calls of forbidden built-ins, and of numpy's generators: randomness comes from outside."""
    found = []
    for node in ast.walk(tree):
        if isinstance(node, ast.Call):
            name = ast.unparse(node.func)
            if name in FORBIDDEN_CALLS or name.startswith(("np.random.", "numpy.random.")):
                found.append((node.lineno, name))
    return found


def errors_faults(root: Path) -> list[str]:
    """The lowest room needs nothing but the standard library."""
    return [
        f"{each.module}:{each.line} imports {each.target}"
        for each in all_imports(root)
        if part_of(each.module) == "errors" and each.target.split(".")[0] not in sys.stdlib_module_names
    ]


CHECKS = {
    "upward": upward,
    "unranked": unranked,
    "root_imports": root_imports,
    "cycles": cycles,
    "numeric_faults": numeric_faults,
    "errors_faults": errors_faults,
}


@pytest.mark.parametrize("name", CHECKS)
def test_the_package_keeps_its_layers(name):
    assert not CHECKS[name](ROOT)


def test_every_room_of_the_order_is_there():
    """An order that names rooms which do not exist would check nothing."""
    assert {part_of(module) for module in read_modules(ROOT)} >= set(RANK)


CLEAN = {
    "__init__.py": "def __getattr__(name):\n    from fitlib import cli\n",
    "errors.py": "from dataclasses import dataclass\n",
    "numerics/__init__.py": "import numpy as np\nfrom fitlib.numerics.lines import fit\n",
    "numerics/lines.py": "from scipy import linalg\nimport fitlib.errors\nfit = linalg.lstsq\n",
    "study/__init__.py": "from .loader import load\n",
    "study/loader.py": "from fitlib.errors import InputError\nimport yaml\nload = open\n",
    "cli/__init__.py": "def main():\n    from fitlib.study import load\n",
}

PLANTED = [
    ("upward", "study/loader.py", "from fitlib.cli import main\n", "fitlib.study.loader:1 imports fitlib.cli"),
    ("upward", "study/loader.py", "def f():\n    import fitlib.cli\n", "fitlib.study.loader:2 imports fitlib.cli"),
    ("upward", "study/loader.py", "from ..cli import main\n", "fitlib.study.loader:1 imports fitlib.cli"),
    ("upward", "study/loader.py", "from fitlib import cli\n", "fitlib.study.loader:1 imports fitlib.cli"),
    (
        "upward",
        "numerics/lines.py",
        "import fitlib.study.loader\n",
        "fitlib.numerics.lines:1 imports fitlib.study.loader",
    ),
    ("upward", "errors.py", "import fitlib.numerics\n", "fitlib.errors:1 imports fitlib.numerics"),
    ("upward", "figures/__init__.py", "import fitlib.report\n", "fitlib.figures:1 imports fitlib.report"),
    ("unranked", "extras/__init__.py", "", "extras"),
    ("root_imports", "study/loader.py", "import fitlib\n", "fitlib.study.loader:1 imports the package root"),
    ("root_imports", "study/loader.py", "from .. import run\n", "fitlib.study.loader:1 imports the package root"),
    ("root_imports", "study/loader.py", "from fitlib import run\n", "fitlib.study.loader:1 imports the package root"),
    (
        "cycles",
        "study/loader.py",
        "def f():\n    from fitlib.study import load\n",
        ["fitlib.study", "fitlib.study.loader"],
    ),
    ("cycles", "study/loader.py", "from . import load\n", ["fitlib.study", "fitlib.study.loader"]),
    ("errors_faults", "errors.py", "import numpy\n", "fitlib.errors:1 imports numpy"),
    ("numeric_faults", "numerics/lines.py", "print(1)\n", "fitlib.numerics.lines:1 calls print"),
    ("numeric_faults", "numerics/lines.py", "open('x')\n", "fitlib.numerics.lines:1 calls open"),
    ("numeric_faults", "numerics/lines.py", "np.random.rand()\n", "fitlib.numerics.lines:1 calls np.random.rand"),
]
PLANTED += [
    ("numeric_faults", "numerics/lines.py", f"def f():\n    import {name}\n", f"fitlib.numerics.lines:2 imports {name}")
    for name in ("yaml", "pandas", "matplotlib", "snakemake", "pydantic", "jinja2", "os", "pathlib", "random", "time")
]


def write_package(root: Path, files: dict[str, str]) -> Path:
    """A small package on disk."""
    for name, text in files.items():
        path = root / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, encoding="utf-8")
    return root


@pytest.mark.parametrize("name", CHECKS)
def test_a_clean_package_has_no_fault(name, tmp_path):
    assert not CHECKS[name](write_package(tmp_path, CLEAN))


@pytest.mark.parametrize(("name", "file", "text", "expected"), PLANTED)
def test_a_planted_fault_is_found(name, file, text, expected, tmp_path):
    assert list(CHECKS[name](write_package(tmp_path, {**CLEAN, file: text}))) == [expected]


def test_an_import_for_type_checking_makes_no_cycle(tmp_path):
    text = "from typing import TYPE_CHECKING\nif TYPE_CHECKING:\n    from fitlib.study import load\n"
    assert not cycles(write_package(tmp_path, {**CLEAN, "study/loader.py": text}))
