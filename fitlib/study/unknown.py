"""The stand-in for a value that was reported as faulty, so that the other rules can still be checked.

A rule that touches it is given up: what it depends on has been reported already.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from typing import Any, NoReturn


class UnknownValue(Exception):
    """A rule needed a value that is faulty."""


class Unknown:
    """A faulty value; any use of it raises `UnknownValue`."""

    def _refuse(self, *_: Any) -> NoReturn:
        raise UnknownValue

    __eq__ = __ne__ = __lt__ = __le__ = __gt__ = __ge__ = _refuse  # type: ignore[assignment]
    __bool__ = __len__ = __iter__ = __hash__ = __contains__ = __getitem__ = _refuse  # type: ignore[assignment]

    def __getattr__(self, name: str) -> NoReturn:
        if name.startswith("__"):
            raise AttributeError(name)
        raise UnknownValue

    def __repr__(self) -> str:
        return "<faulty>"


UNKNOWN = Unknown()

Finding = tuple[str, str]  # dotted key, message


def attempt(rule: Callable[..., Iterable[Finding]], *arguments: Any) -> list[Finding]:
    """Return what a rule finds, up to the point where it needs a faulty value."""
    found: list[Finding] = []
    try:
        for finding in rule(*arguments):
            found.append(finding)
    except UnknownValue:
        pass
    return found
