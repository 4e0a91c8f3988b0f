"""Response from stimulus, within the measuring interval only."""

from __future__ import annotations

from fitlib.conversion.issued import Question
from fitlib.conversion.record import ABOVE, BELOW, NOT_EVALUATED, WITHIN, Conversion
from fitlib.conversion.words import interval_note
from fitlib.numerics.inverse import inverse_evaluation


def response_from_stimulus(question: Question) -> Conversion:
    """Give the response expected at a stimulus, or say why not.

    Parameters
    ----------
    question : Question
        A finite stimulus.

    Returns
    -------
    Conversion
    """
    lower, upper = question.issued.interval
    if question.given < lower:
        return question.refuse(BELOW, interval_note(question, lower))
    if question.given > upper:
        return question.refuse(ABOVE, interval_note(question, upper))
    if question.issued.from_response:
        return _invert(question)
    value = question.issued.value(question.given)
    return question.accept(value, question.issued.spread.predicted(question.given, question.readings))


def _invert(question: Question) -> Conversion:
    """An analysis function gives the stimulus; the response is where it takes the stimulus given."""
    issued = question.issued
    responses = sorted(end.response for end in issued.ends)
    inverse = inverse_evaluation(issued.curve, question.given, *responses)
    if inverse.verdict != WITHIN:
        return question.refuse(NOT_EVALUATED, "no single response belongs to this stimulus")
    return question.accept(inverse.value, issued.spread.converted(inverse.value, question.readings))
