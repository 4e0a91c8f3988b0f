"""Stimulus from response: the ends first, then the one function, inverted."""

from __future__ import annotations

from fitlib.conversion.issued import End, Issued, Question
from fitlib.conversion.record import NOT_EVALUATED, NOT_UNIQUE, WITHIN, Conversion
from fitlib.conversion.words import end_note, not_unique_note, quoted
from fitlib.numerics.inverse import inverse_evaluation


def stimulus_from_response(question: Question) -> Conversion:
    """Convert a response, or say why not.

    Parameters
    ----------
    question : Question
        A finite response.

    Returns
    -------
    Conversion
    """
    issued = question.issued
    small, large = issued.ends
    values = [issued.value(point) for point in issued.turning_points]
    if question.given < min([small.response, *values]):
        return _beyond(question, small)
    if question.given > max([large.response, *values]):
        return _beyond(question, large)
    if issued.from_response:
        value = issued.value(question.given)
        return question.accept(value, issued.spread.predicted(question.given, question.readings))
    if issued.turning_points:
        return _where_it_turns(question, small, large)
    return _invert(question, small, large)


def _invert(question: Question, small: End, large: End) -> Conversion:
    issued = question.issued
    if small.response == large.response:
        return question.refuse(
            NOT_EVALUATED, "the function is level: every stimulus of its interval gives this response"
        )
    value = _at_an_end(issued, question.given, small, large)
    if value is None:
        inverse = inverse_evaluation(issued.curve, question.given, *issued.interval)
        if inverse.verdict != WITHIN:
            return question.refuse(NOT_EVALUATED, "no value was found within the measuring interval")
        value = inverse.value
    return question.accept(value, issued.spread.converted(value, question.readings))


def _at_an_end(issued: Issued, response: float, small: End, large: End) -> float | None:
    """The end itself, where the response is the stored one or lies in the last bits between it and this machine's."""
    if response == small.response or response <= issued.value(small.stimulus):
        return small.stimulus
    if response == large.response or response >= issued.value(large.stimulus):
        return large.stimulus
    return None


def _where_it_turns(question: Question, small: End, large: End) -> Conversion:
    """A function that rises and falls: the solutions themselves are counted."""
    issued, response = question.issued, question.given
    for end in (small, large):
        if response == end.response:  # the end is one of the solutions, whatever the last bits of this machine
            response = issued.value(end.stimulus)
    inverse = inverse_evaluation(issued.curve, response, *issued.interval)
    if inverse.verdict == WITHIN:
        return question.accept(inverse.value, issued.spread.converted(inverse.value, question.readings))
    turning = inverse.turning_points
    if inverse.verdict == NOT_UNIQUE:
        note = not_unique_note(question, inverse.competing, turning)
        return question.refuse(NOT_UNIQUE, note, competing=inverse.competing, turning_points=turning)
    return question.refuse(NOT_EVALUATED, _no_solution(question), turning_points=turning)


def _no_solution(question: Question) -> str:
    return f"the function does not take the response {quoted(question.given, question.given_unit)} in its interval"


def _beyond(question: Question, end: End) -> Conversion:
    """A response that no stimulus inside the interval gives."""
    issued = question.issued
    if _outdone(issued, end, question.given):
        return question.refuse(NOT_EVALUATED, _no_solution(question), turning_points=issued.turning_points)
    agrees = _distance(question, end) <= _half_width(question, end)
    return question.refuse(end.verdict, end_note(question, end.response, end.stimulus, agrees), agrees_with_end=agrees)


def _outdone(issued: Issued, end: End, response: float) -> bool:
    """Whether a turning point, and not this end, bounds the responses on that side."""
    values = [issued.value(point) for point in issued.turning_points]
    return any(value < end.response if response < end.response else value > end.response for value in values)


def _distance(question: Question, end: End) -> float:
    """From the end, in the unit of the fitted quantity: an analysis function is followed along its slope."""
    distance = abs(question.given - end.response)
    return distance * abs(question.issued.slope(end.response)) if question.issued.from_response else distance


def _half_width(question: Question, end: End) -> float:
    abscissa = end.response if question.issued.from_response else end.stimulus
    return question.issued.spread.half_prediction(abscissa, question.readings)
