"""The versions of the libraries that numbers and figures are made with."""

from __future__ import annotations

import platform
from importlib.metadata import PackageNotFoundError, version

NUMERIC = ("numpy", "scipy", "pandas")
RENDERING = ("matplotlib", "jinja2")


def numeric_versions() -> dict[str, str]:
    """Return the versions that a result depends on: Python and the numeric libraries."""
    return {"python": platform.python_version(), **{name: installed_version(name) for name in NUMERIC}}


def rendering_versions() -> dict[str, str]:
    """Return the versions that only figures and the report depend on."""
    return {name: installed_version(name) for name in RENDERING}


def installed_version(name: str) -> str:
    """Return the version from the package's metadata (nothing is imported), or ``not installed``."""
    try:
        return version(name)
    except PackageNotFoundError:
        return "not installed"


def fitlib_version() -> str:
    """Return the version of this program."""
    return installed_version("fitlib")
