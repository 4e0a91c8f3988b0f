"""Every key, column and word of fitlib has a meaning and a source in the glossary."""

from __future__ import annotations

import re

import pytest

from fitlib.study import load_glossary, study_keys


def words(text: str) -> list[str]:
    return text.split()


# The words of the vocabulary, and the columns of the tables of a revision.
VOCABULARY = words("""
study dataset stimulus response level series direction replicate family candidate calibration_function
analysis_function direct_evaluation inverse_evaluation measuring_interval standard_uncertainty expanded_uncertainty
coverage_factor coverage_probability coverage_interval uncertainty_budget type_a type_b target_uncertainty
maximum_permissible_error confidence_band prediction_interval residual_standard_deviation degrees_of_freedom lack_of_fit
pure_error repeatability level_deviation loss evaluation inverse direct verification_points exclusions reason person
date weighting none per_point inverse_stimulus inverse_stimulus_squared estimated verdict adequate inadequate
not_evaluated choice decided tie within_interval below_range above_range not_unique not_a_number revision rising falling
smallest_loss one_standard_error f_test aicc bic leave_one_level_out leave_one_series_out leave_one_out k_fold bootstrap
polynomial calibration analysis comma semicolon tab point observation fold
""")
COLUMNS = words("""
dataset file row series level stimulus response state used excluded verification reason fitted residual leverage
studentized_residual flag suspect family candidate parameters degrees_of_freedom residual_sum_of_squares
residual_standard_deviation aicc bic condition_number monotone loss_<scheme> loss_<scheme>_se bootstrap_share eligible
chosen verdict choice runner_up margin loss outer_loss outer_loss_interior lack_of_fit_f lack_of_fit_p largest_residual
term estimate standard_uncertainty scheme fold read rejected file_name
""")
SOURCES = re.compile(
    r"(VIM [0-9]\.[0-9]+|GUM [A-Z0-9]+(\.[0-9]+)+|ISO 3534-[1-4]|ISO/TS 2803[78]|ISO 6143|ISO 5725-[1-6]"
    r"|ISO 8601-1|ISO/IEC 17025:2017(, [0-9.]+)?|fitlib)"
)


@pytest.mark.parametrize("needed", [study_keys(), VOCABULARY, COLUMNS], ids=["study keys", "vocabulary", "columns"])
def test_every_word_has_an_entry(needed):
    assert len(needed) > 40
    assert sorted(set(needed) - set(load_glossary())) == []


def test_a_word_without_an_entry_would_be_noticed():
    assert {*study_keys(), "no_such_key"} - set(load_glossary()) == {"no_such_key"}


def test_every_entry_has_a_known_source():
    unsourced = {
        word: entry.source
        for word, entry in load_glossary().items()
        if not all(SOURCES.fullmatch(part.strip()) for part in entry.source.split(";"))
    }
    assert unsourced == {}


def test_every_meaning_is_one_sentence():
    odd = [word for word, entry in load_glossary().items() if not re.fullmatch(r"[A-Z].{10,}[^.]\.", entry.meaning)]
    assert odd == []
