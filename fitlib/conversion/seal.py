"""The digest that an issued function carries: was it changed after it was issued?"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from fitlib.analysis.function_record import record_digest

KEY = "digest"


def seal_fault(record: Mapping[str, Any]) -> str:
    """What is wrong with the digest of a record; empty when it fits.

    Parameters
    ----------
    record : mapping
        As read from JSON.

    Returns
    -------
    str
    """
    if KEY not in record:
        return "is missing; take the function from its revision again"
    try:
        fits = record[KEY] == record_digest({key: value for key, value in record.items() if key != KEY})
    except (ValueError, RecursionError):  # a lone surrogate, for example
        fits = False
    return "" if fits else "the function was changed after it was issued; take it from its revision again"
