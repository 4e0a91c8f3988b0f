"""JSON documents: one way of writing them, and the calibration functions for machines."""

from __future__ import annotations

import json


def dump_json(obj: object) -> str:
    """JSON text with the same bytes for the same content.

    Parameters
    ----------
    obj : object
        Dicts, lists, text, finite numbers, truth values, None.

    Returns
    -------
    str
        Keys sorted, two blanks of indentation, numbers as ``repr`` writes them, one newline at the end.

    Raises
    ------
    ValueError
        If a number is not finite.
    TypeError
        If something has no JSON form.
    """
    return json.dumps(obj, sort_keys=True, allow_nan=False, ensure_ascii=False, indent=2) + "\n"


def function_path(result: dict) -> str:
    """Where the function of a dataset lies in the revision.

    Parameters
    ----------
    result : dict
        Result of one dataset.

    Returns
    -------
    str
    """
    return f"functions/{result['file_name']}.json"


def function_files(bundle: dict) -> dict[str, str]:
    """The issued function of each dataset that has one.

    Parameters
    ----------
    bundle : dict
        The study with its results.

    Returns
    -------
    dict of str to str
        JSON text by relative path, ``functions/<file_name>.json``.

    Raises
    ------
    ValueError
        If two datasets would be written to one file: a fault of the program.
    """
    files: dict[str, str] = {}
    taken: set[str] = set()
    for result in bundle["results"]:
        if result["function"] is None:
            continue
        path = function_path(result)
        if path.casefold() in taken:  # a file system that ignores case would keep one of the two
            raise ValueError(f"{path}: two datasets have this file name")
        taken.add(path.casefold())
        files[path] = dump_json(result["function"])
    return dict(sorted(files.items()))
