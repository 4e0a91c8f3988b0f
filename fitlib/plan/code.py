"""The identity of the program: two hashes that tell whether numbers, or only their rendering, could have changed.

A module counts by its syntax tree without docstrings; comments and layout are no part of a syntax tree. Anything else
that is shipped (templates, workflow files) counts by its bytes.
"""

from __future__ import annotations

import ast
import hashlib
import json
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path

PACKAGE = Path(__file__).resolve().parents[1]

NUMERICS = ("errors.py", "numerics", "study", "observations", "plan", "analysis")
"""What can change a number of a result."""

NO_DRAWING = ("__init__.py", "__main__.py", "cli", "collect", "conversion", "engine", "report", "revision", "workflow")
"""What shapes a revision but no figure of a dataset; what is not named here is taken to."""

NEITHER = ("start",)
"""Writes a first draft of a study; nothing of it is in a result."""

_DERIVED = ".schema.json"  # written from the models, for editors; no result depends on it


@dataclass(frozen=True)
class CodeIdentity:
    """Hashes of the program's text.

    Attributes
    ----------
    numerics : str
        Of everything that can change a number: results are computed again when it differs.
    drawing : str
        Of everything that can change a figure: figures are drawn again when it differs.
    rendering : str
        Of everything else that shapes a revision, drawing included.
    """

    numerics: str
    drawing: str
    rendering: str


def workflow_folder() -> Path:
    """Return the folder of the Snakefile: inside an installed wheel, or beside the package in a checkout."""
    shipped = PACKAGE / "_workflow"
    return shipped if shipped.is_dir() else PACKAGE.parent / "workflow"


def code_identity(cache: Path | None = None) -> CodeIdentity:
    """Return the identity of the modules that are installed here.

    Parameters
    ----------
    cache : Path, optional
        A file that maps the SHA-256 of a module's bytes to the hash of its syntax tree, so that a process need not
        parse what another has parsed. It is read if it is there and sound. See :func:`remember_trees`.

    Returns
    -------
    CodeIdentity
    """
    known = _read_cache(cache)
    hashes = {name: _hash_file(path, known) for name, path in _shipped_files()}
    return CodeIdentity(
        numerics=_combine(hashes, lambda top: top in NUMERICS),
        drawing=_combine(hashes, lambda top: top not in (*NUMERICS, *NEITHER, *NO_DRAWING)),
        rendering=_combine(hashes, lambda top: top not in (*NUMERICS, *NEITHER)),
    )


def remember_trees(cache: Path) -> str | None:
    """Return the text that the cache file of :func:`code_identity` should have.

    Parameters
    ----------
    cache : Path
        The file as it is now; it may be missing.

    Returns
    -------
    str or None
        None when the file knows the modules that are installed here.
    """
    before = _read_cache(cache)
    known = dict(before)
    for _, path in _shipped_files():
        _hash_file(path, known)
    return json.dumps({"by": _own_hash(), "trees": known}, sort_keys=True) if known != before else None


def _combine(hashes: dict[str, str], belongs) -> str:
    """Names are relative to the package, so that a wheel and a checkout of the same text agree."""
    chosen = sorted((name, value) for name, value in hashes.items() if belongs(name.split("/", 1)[0]))
    return hashlib.sha256(json.dumps(chosen).encode()).hexdigest()


def _shipped_files() -> Iterator[tuple[str, Path]]:
    for path in _files_below(PACKAGE):
        name = path.relative_to(PACKAGE).as_posix()
        if not name.startswith("_workflow/") and not name.endswith(_DERIVED):
            yield name, path
    workflow = workflow_folder()
    for path in _files_below(workflow):
        yield f"workflow/{path.relative_to(workflow).as_posix()}", path


def _files_below(folder: Path) -> Iterable[Path]:
    """Every file, without what Python, tools or editors leave behind."""
    for path in sorted(folder.iterdir()) if folder.is_dir() else ():
        if path.name.startswith(".") or path.name == "__pycache__" or path.suffix in (".pyc", ".pyo"):
            continue
        if path.is_dir():
            yield from _files_below(path)
        elif not path.name.endswith("~"):
            yield path


def _hash_file(path: Path, known: dict[str, str]) -> str:
    content = path.read_bytes()
    raw = hashlib.sha256(content).hexdigest()
    if path.suffix != ".py":
        return raw
    if raw not in known:
        known[raw] = tree_hash(content)
    return known[raw]


def tree_hash(source: bytes | str) -> str:
    """Return the SHA-256 of a module's syntax tree, without docstrings.

    Parameters
    ----------
    source : bytes or str
        The text of the module.

    Returns
    -------
    str
        64 hexadecimal digits. Fields that are empty do not count, so that Python versions that add an optional field
        to their trees agree.
    """
    return hashlib.sha256(repr(_shape(ast.parse(source))).encode("utf-8", "surrogatepass")).hexdigest()


def _shape(node) -> object:
    if isinstance(node, ast.AST):
        values = ((name, _shape(value)) for name, value in _fields_without_docstring(node))
        return (type(node).__name__, *((name, shape) for name, shape in values if shape not in (None, ())))
    if isinstance(node, list):
        return tuple(_shape(item) for item in node)
    return None if node is None else f"{type(node).__name__} {node!r}"


def _fields_without_docstring(node: ast.AST) -> Iterator[tuple[str, object]]:
    for name, value in ast.iter_fields(node):
        if name == "body" and isinstance(node, ast.Module | ast.ClassDef | ast.FunctionDef | ast.AsyncFunctionDef):
            value = [each for each in value if not _is_text_alone(each)]
        yield name, value


def _is_text_alone(statement: ast.stmt) -> bool:
    """A docstring, or text under an attribute that serves as one: evaluated for nothing."""
    return isinstance(statement, ast.Expr) and isinstance(getattr(statement.value, "value", None), str)


def _own_hash() -> str:
    return hashlib.sha256(Path(__file__).read_bytes()).hexdigest()


def _read_cache(cache: Path | None) -> dict[str, str]:
    """A cache of another version of this module, or one that is damaged, is as good as none."""
    if cache is None:
        return {}
    try:
        content = json.loads(cache.read_bytes())
        return dict(content["trees"]) if content["by"] == _own_hash() else {}
    except (OSError, ValueError, KeyError, TypeError, RecursionError):
        return {}
