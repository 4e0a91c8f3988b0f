"""Text as HTML: powers of x raised, long names that may break at their underscores."""

from __future__ import annotations

import functools
import re
from html import escape

_POWER = re.compile(r"\bx\^(\d+)")
_SPECIAL = re.compile(r"""[&<>"'_^]""")
_NAME = re.compile(r"\w+_\w+")
_LONG = 12  # letters; shorter names fit anywhere


def prose(text: object) -> str:
    """HTML of a text that may come from a user.

    Parameters
    ----------
    text : object
        Turned into text; whatever is HTML in it is shown as text.

    Returns
    -------
    str
        Escaped; ``x^2`` with a raised 2, and a possible break after each underscore of a long name.
    """
    words = str(text)
    return _prose(words) if _SPECIAL.search(words) else words


@functools.lru_cache(maxsize=1 << 15)
def _prose(text: str) -> str:
    raised = _POWER.sub(r"x<sup>\1</sup>", escape(text))
    return _NAME.sub(lambda name: name[0].replace("_", "_<wbr>") if len(name[0]) >= _LONG else name[0], raised)
