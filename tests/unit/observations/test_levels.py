"""Levels: by column, by tolerance, by equality; chains; the measuring interval; too few levels."""

import numpy as np
import pytest

SCATTERED = "x,y\n0.00,1\n1.01,2\n2.00,3\n0.02,1\n0.99,2\n2.02,3\n"


def test_equal_stimulus_values_are_one_level(read):
    found = read({"a.csv": "x,y\n2,1\n0,2\n2,3\n1,4\n"})
    assert found.level.tolist() == [2, 0, 2, 1]
    assert found.level_index.tolist() == [2, 0, 2, 1]


def test_a_tolerance_groups_neighbours_and_labels_them_by_their_mean(read):
    found = read({"a.csv": SCATTERED}, "level_tolerance: 0.05")
    assert found.level_index.tolist() == [0, 1, 2, 0, 1, 2]
    np.testing.assert_allclose(found.level, [0.01, 1.0, 2.01, 0.01, 1.0, 2.01], rtol=1e-15)


def test_the_order_of_rows_does_not_change_the_levels(read):
    rows = SCATTERED.splitlines()
    forward = read({"a.csv": SCATTERED}, "level_tolerance: 0.05")
    backward = read({"a.csv": "\n".join([rows[0], *rows[:0:-1]])}, "level_tolerance: 0.05")
    assert forward.level.tolist() == backward.level.tolist()[::-1]


def test_a_gap_of_exactly_the_tolerance_joins_in_spite_of_binary_rounding(read):
    assert 1.02 - 1.0 > 0.02
    found = read({"a.csv": "x,y\n1,1\n1.02,2\n2,3\n3,4\n"}, "level_tolerance: 0.02")
    assert found.level_index.tolist() == [0, 0, 1, 2]


def test_levels_that_chain_beyond_the_tolerance_are_an_error_that_names_the_chain(problems):
    found = problems({"a.csv": "x,y\n0,1\n0.04,2\n0.08,3\n1,4\n2,5\n"}, "level_tolerance: 0.05")
    assert [(p.key, p.line) for p in found] == [("datasets[0].level_tolerance", 10)]
    assert "stimulus values 0, 0.04, 0.08 chain: each lies within 0.05 of the next" in found[0].message


def test_a_tolerance_that_leaves_the_groups_split_is_warned_about(read):
    text = "x,y\n" + "".join(f"{level + run * 0.004},{level}\n" for run in range(3) for level in range(6))
    (note,) = read({"a.csv": text}, "level_tolerance: 0.001").notes
    assert "there are 18 levels, which still gather in 6 groups" in note
    assert read({"a.csv": text}, "level_tolerance: 0.02").notes == ()


def test_a_level_column_names_the_levels_of_all_rows(read):
    data = "x,y,set\n0.1,1,0\n1.2,2,1\n0.9,3,1\n2,4,2\n1.1,5,1\n"
    extra = "exclusions:\n  - {where: {row: 6}, reason: r, person: p, date: 2026-01-01}"
    found = read({"a.csv": data}, extra, "stimulus: x, response: y, level: set")
    assert found.level.tolist() == [0, 1, 1, 2, 1]
    assert found.level_index.tolist() == [0, 1, 1, 2, -1]


def test_a_level_column_that_counts_instead_of_naming_values_is_an_error(problems):
    data = "x,y,set\n" + "".join(f"{10 * n},{n},{n}\n" for n in range(1, 6))
    found = problems({"a.csv": data}, columns="stimulus: x, response: y, level: set")
    assert {problem.key for problem in found} == {"datasets[0].columns.level"}
    assert "level 1 has the mean stimulus 10, which is nearer to level 5" in found[0].message


def test_a_row_nearer_to_another_declared_level_is_noted(read):
    data = "x,y,set\n0,1,0\n1,2,1\n1,2.5,1\n1,2.6,1\n2,2.7,1\n2,3,2\n2,3.5,2\n"
    (note,) = read({"a.csv": data}, columns="stimulus: x, response: y, level: set").notes
    assert note.startswith("a.csv row 6: the stimulus is nearer to another declared level")


def test_rows_not_used_get_the_level_they_lie_at_within_the_tolerance(read):
    data = "x,y,run\n0,1,1\n1,2,1\n2,3,1\n1.04,2,9\n1.5,2,9\n"
    found = read({"a.csv": data}, "level_tolerance: 0.05\nverification_points: {where: {run: 9}}")
    assert found.level[3] == 1 and np.isnan(found.level[4])
    assert found.level_index.tolist() == [0, 1, 2, -1, -1]


@pytest.mark.parametrize("interval", ["[0, 2]", "[0.5, 1.5]"])
def test_a_measuring_interval_within_the_levels_used_is_accepted_and_narrows_nothing(read, interval):
    assert read({"a.csv": "x,y\n0,1\n1,2\n2,3\n"}, f"measuring_interval: {interval}").state == ("used",) * 3


def test_a_measuring_interval_may_reach_as_far_as_the_tolerance_of_the_end_levels(read, problems):
    read({"a.csv": SCATTERED}, "level_tolerance: 0.05\nmeasuring_interval: [0, 2.07]")
    (found,) = problems({"a.csv": SCATTERED}, "level_tolerance: 0.05\nmeasuring_interval: [0, 2.08]")
    assert found.key == "datasets[0].measuring_interval"


def test_a_measuring_interval_beyond_the_levels_used_is_an_error_that_names_both(problems):
    data = {"a.csv": "x,y,run\n0,1,1\n1,2,1\n2,3,1\n3,4,9\n"}
    (found,) = problems(data, "measuring_interval: [0, 3]\nverification_points: {where: {run: 9}}")
    assert found.key == "datasets[0].measuring_interval"
    assert "[0, 3] reaches beyond the levels used, [0, 2]" in found.message


def test_one_level_is_told_and_does_not_stop_the_study(read):
    observations = read({"a.csv": "x,y\n1,1\n1,2\n"})
    assert observations.notes == ("only one level is used (2 used rows at 1): no function can be fitted",)


def test_no_used_row_is_an_error(problems):
    (found,) = problems({"a.csv": "x,y,run\n1,1,1\n2,2,1\n"}, "verification_points: {where: {run: 1}}")
    assert found.message == 'dataset "A-1": no row is used; at least two levels are needed'


def test_nothing_is_said_about_levels_while_rows_are_rejected(problems):
    found = problems({"a.csv": "x,y\n1,1\n2,\n"}, "measuring_interval: [0, 5]")
    assert [p.severity for p in found] == ["error", "warning"]
