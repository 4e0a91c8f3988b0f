"""Fixed words of the report: rules, verdicts, cautions."""

from __future__ import annotations

FIT_ONLY = "fit-only uncertainty: not a complete measurement uncertainty"

CAUTIONS = (
    "Use a function only within its measuring interval, under the conditions, for the instrument (serial number) and "
    "from the date that its record states. What the record does not state is not known.",
    f"The uncertainties stated here are {FIT_ONLY}. Reference standard, resolution, drift, hysteresis and influence "
    "quantities are not in them.",
    "This report is not a substitute for an accredited procedure or a functional-safety assessment.",
    "Check a function against an independent standard before it is used.",
    "Local codes, accredited procedures and licensed practice take precedence over anything written here.",
    "Only a function whose verdict is adequate may be used for conversion; a tie wants a person's decision.",
)

RULES = {
    "supported_gain": "the simplest eligible candidate over which no gain of one with more parameters is supported, "
    "both by the deciding loss (paired by level, end levels half) and by an F test on level means",
    "one_standard_error": "the simplest eligible candidate whose deciding loss is within one standard error of the "
    "smallest one",
    "smallest_loss": "the eligible candidate with the smallest deciding loss",
    "f_test": "backward elimination by F tests of nested candidates, on level means",
    "aicc": "the eligible candidate with the smallest AICc, on level means",
    "bic": "the eligible candidate with the smallest BIC, on level means",
}

VERDICTS = {"adequate": "✓ adequate", "inadequate": "✗ inadequate", "not_evaluated": "? not evaluated"}

VERDICT_MEANING = {
    "adequate": "No misfit was detected that counts against the function.",
    "inadequate": "The function misses these observations in a way that matters: it must not be used.",
    "not_evaluated": "The observations do not allow a verdict: the function must not be used until they do.",
}

# Stands wherever the function of a dataset is shown, so that no table or figure is read without it.
UNUSABLE = {
    "inadequate": "verdict inadequate: must not be used",
    "not_evaluated": "verdict not evaluated: must not be used",
}

UNITS_LEFT_OUT = {"level": "whole levels", "series": "whole series", "observation": "single rows"}

ROW_WISE_WHY = (
    "replicates of a level, and levels shared by all series, then stand on both sides of the split, so that a function "
    "that follows the deviation of each level is not found out"
)
SERIES_WHY = (
    "every level of a series left out is still there in the other series, so that a function that follows the "
    "deviation of each level is not found out; this scheme judges run-to-run error and never decides alone"
)
END_LEVELS = (
    "Leaving out an end level is extrapolation and carries most of the loss of candidates with many parameters."
)
OPTIMISTIC = (
    "The loss of the chosen candidate is optimistic, because the smallest was looked for. The outer loss comes from a "
    "loop that repeats the whole selection without each level in turn, and is the one to quote."
)


def spoken(word: str | None) -> str:
    """A key as words."""
    return "–" if word is None else str(word).replace("_", " ")


def sentence(text: str | None) -> str:
    """A clause as a sentence: capital letter and full stop."""
    text = (text or "").strip()
    if not text:
        return ""
    first = text[0].upper() if text[:2].islower() or len(text.split(" ", 1)[0]) == 1 else text[0]
    return first + text[1:] + ("" if text[-1] in ".!?" else ".")


def listed(items: list[str]) -> str:
    """Words joined by commas and ``and``."""
    return items[0] if len(items) == 1 else ", ".join(items[:-1]) + " and " + items[-1] if items else ""


def counted(count: int, singular: str, plural: str) -> str:
    """A count with its noun."""
    return f"{count} {singular if count == 1 else plural}"
