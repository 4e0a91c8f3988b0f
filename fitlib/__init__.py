"""Choose, defend and hand over calibration functions.

The public names are fetched on first use, so that ``import fitlib`` costs nothing:
``check``, ``run``, ``read_revision``, ``load_function`` and ``FitlibError``.
"""

from importlib import import_module as _import_module

__all__ = ["FitlibError", "check", "load_function", "read_revision", "run"]

_HOMES = {
    "FitlibError": ("fitlib.errors", "FitlibError"),
    "check": ("fitlib.cli.checking", "check"),
    "load_function": ("fitlib.conversion", "load_function"),
    "read_revision": ("fitlib.revision", "read_revision"),
    "run": ("fitlib.engine", "run_study"),
}


def __getattr__(name: str):
    if name == "__version__":
        return _import_module("importlib.metadata").version("fitlib")
    if name not in _HOMES:
        raise AttributeError(f"module 'fitlib' has no attribute '{name}'")
    module, attribute = _HOMES[name]
    value = getattr(_import_module(module), attribute)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted([*globals(), *__all__, "__version__"])
