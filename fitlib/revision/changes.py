"""CHANGES.md: what changed since the last revision, and what it did."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from fitlib.revision.comparison import Comparison

# Characters that Markdown, or HTML inside it, would act upon; an underscore inside a word is harmless.
_MARKUP = re.compile(r"[\\`*\[\]<>&|~#]|(?<!\w)_|_(?!\w)")


@dataclass(frozen=True)
class History:
    """How a new revision stands to those before it.

    Attributes
    ----------
    previous : str
        Name of the last revision; empty for the first.
    comparison : Comparison or None
        None for the first, and when the last could not be read.
    missing : tuple of str
        Revisions that were published and are no longer there.
    """

    previous: str = ""
    comparison: Comparison | None = None
    missing: tuple[str, ...] = ()

    def lines(self) -> list[str]:
        """Plain sentences for the report."""
        return self.notes() + (self.comparison.lines() if self.comparison else [])

    def notes(self) -> list[str]:
        """Sentences on the revisions themselves."""
        notes = [f"{name} was published and is no longer in the folder." for name in self.missing]
        if not self.previous:
            notes.append("First revision." if not self.missing else "No earlier revision is left to compare with.")
        elif self.comparison is None:
            notes.append(
                f"Could not be compared with {self.previous}: it is not as it was published, or not readable here."
            )
        else:
            notes.append(f"Compared with {self.previous}.")
        return notes


def changes_text(study: str, revision: str, history: History) -> str:
    """Text of CHANGES.md.

    Parameters
    ----------
    study, revision : str
        Names.
    history : History

    Returns
    -------
    str
        Markdown; whatever comes from the study is text, never markup.
    """
    lines = [f"# {study}, {revision}", "", " ".join(escaped(note) for note in history.notes()), ""]
    if history.comparison is not None:
        lines += _section("What changed", history.comparison.causes())
        lines += _section("What it did", history.comparison.effects())
    return "\n".join(lines)


def _section(title: str, sentences: Sequence[str]) -> list[str]:
    items = [f"- {escaped(sentence)}" for sentence in sentences] or ["- Nothing."]
    return [f"## {title}", "", *items, ""]


def escaped(text: str) -> str:
    """Text that Markdown shows as it is."""
    return _MARKUP.sub(lambda match: _ENTITIES.get(match[0], f"\\{match[0]}"), text)


_ENTITIES = {"<": "&lt;", ">": "&gt;", "&": "&amp;"}
