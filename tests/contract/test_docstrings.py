"""What a package hands out is described: a docstring each, and parameters as in the signature."""

from __future__ import annotations

import importlib
import inspect
import pkgutil
import re
from types import ModuleType

import pytest

import fitlib

#: A section title of a numpydoc docstring: a word, underlined.
SECTION = re.compile(r"^(?P<title>[A-Z][A-Za-z ]+)\n-{3,}$", re.MULTILINE)
#: A line of a Parameters section that names parameters: not indented, ``a, b : type``.
ENTRY = re.compile(r"^(?P<names>\*{0,2}\w+(?:, *\*{0,2}\w+)*)(?: *:.*)?$")


def packages() -> list[str]:
    """Every package of fitlib, itself included."""
    found = pkgutil.walk_packages(fitlib.__path__, "fitlib.")
    return ["fitlib", *sorted(each.name for each in found if each.ispkg and "._" not in each.name)]


def section(docstring: str, title: str) -> str | None:
    """The text of a section; None when there is no such section."""
    marks = list(SECTION.finditer(docstring))
    ends = [*(mark.start() for mark in marks[1:]), len(docstring)]
    return next((docstring[m.end() : end] for m, end in zip(marks, ends, strict=False) if m["title"] == title), None)


def documented_names(docstring: str) -> list[str] | None:
    """Names in the Parameters section, in order; None when there is no such section."""
    text = section(docstring, "Parameters")
    if text is None:
        return None
    entries = [ENTRY.match(line) for line in text.splitlines() if line and not line.startswith((" ", "\t"))]
    return [name.strip().lstrip("*") for entry in entries if entry for name in entry["names"].split(",")]


def signature_names(function) -> list[str]:
    """Parameters of a function, without ``self`` and ``cls``."""
    return [name for name in inspect.signature(function).parameters if name not in ("self", "cls")]


def function_fault(name: str, function, section_required: bool) -> str | None:
    """What is wrong with the docstring of a function."""
    docstring = inspect.getdoc(function)
    if not docstring:
        return f"{name}: no docstring"
    documented, expected = documented_names(docstring), signature_names(function)
    if documented is None:
        return f"{name}: no Parameters section" if expected and section_required else None
    return None if documented == expected else f"{name}: Parameters {documented}, signature {expected}"


def class_faults(name: str, cls: type) -> list[str]:
    """What is wrong with a class and its public methods; a short method needs no Parameters section."""
    # A dataclass without a docstring is given its signature as one
    bare = not cls.__doc__ or cls.__doc__.startswith(f"{cls.__name__}(")
    faults = [f"{name}: no docstring"] if bare else []
    for attribute, value in vars(cls).items():
        member = (
            value.fget if isinstance(value, property) else getattr(value, "__func__", getattr(value, "func", value))
        )
        if attribute.startswith("_") or not inspect.isfunction(member) or member.__module__ != cls.__module__:
            continue
        if fault := function_fault(f"{name}.{attribute}", member, section_required=False):
            faults.append(fault)
    return faults


def hands_out(module: ModuleType) -> list[str]:
    """Public names of a package other than its modules."""
    return [name for name, value in vars(module).items() if not name.startswith("_") and not inspect.ismodule(value)]


def faults_of(module: ModuleType) -> list[str]:
    """What is wrong with the public names of a package."""
    if not module.__doc__:
        return [f"{module.__name__}: no docstring"]
    if not hasattr(module, "__all__") and hands_out(module):
        return [f"{module.__name__}: no __all__"]
    faults = []
    for name in getattr(module, "__all__", ()):
        value = getattr(module, name)
        if inspect.isclass(value):
            faults += class_faults(f"{module.__name__}.{name}", value)
        elif inspect.isfunction(value) and (fault := function_fault(f"{module.__name__}.{name}", value, True)):
            faults.append(fault)
    return faults


@pytest.mark.parametrize("package", packages())
def test_public_names_are_described(package):
    assert faults_of(importlib.import_module(package)) == []


def test_the_packages_are_found():
    assert {"fitlib", "fitlib.cli", "fitlib.conversion", "fitlib.numerics.families"} <= set(packages())


def a_module(source: str) -> ModuleType:
    """A package made from source text."""
    module = ModuleType("planted", "A planted package.")
    exec(source, module.__dict__)
    return module


DESCRIBED = '''
def public(first, *more, named=1):
    """Do something.

    Parameters
    ----------
    first : ndarray of shape (n,)
        In the unit of the response; for example: 1, 2
    *more : float
    named : int, optional

    Returns
    -------
    nothing : None
    """

class Record:
    """A record."""

    @property
    def size(self):
        """How large it is."""

    @classmethod
    def make(cls, size):
        """Make one."""

__all__ = ["public", "Record"]
'''


def test_a_described_package_has_no_fault():
    assert faults_of(a_module(DESCRIBED)) == []


@pytest.mark.parametrize(
    ("old", "new", "fault"),
    [
        ("def public(first,", "def public(first, second,", "signature ['first', 'second', 'more', 'named']"),
        ("    named : int, optional\n", "", "Parameters ['first', 'more']"),
        ("    first : ndarray", "    frist : ndarray", "Parameters ['frist', 'more', 'named']"),
        (
            "    first : ndarray",
            "    named : int\n    first : ndarray",
            "Parameters ['named', 'first', 'more', 'named']",
        ),
        ("    Parameters\n    ----------\n", "    Input\n    -----\n", "planted.public: no Parameters section"),
        ('    """A record."""', "    pass", "planted.Record: no docstring"),
        ('"""How large it is."""', "pass", "planted.Record.size: no docstring"),
        ('"""Make one."""', "pass", "planted.Record.make: no docstring"),
        ('__all__ = ["public", "Record"]', "", "planted: no __all__"),
    ],
)
def test_a_planted_fault_is_found(old, new, fault):
    assert old in DESCRIBED
    faults = faults_of(a_module(DESCRIBED.replace(old, new, 1)))
    assert len(faults) == 1 and fault in faults[0]


def test_a_function_without_docstring_is_found():
    source = '__all__ = ["public"]\ndef public(): pass'
    assert faults_of(a_module(source)) == ["planted.public: no docstring"]


def test_a_package_without_docstring_is_found():
    assert faults_of(ModuleType("planted")) == ["planted: no docstring"]
