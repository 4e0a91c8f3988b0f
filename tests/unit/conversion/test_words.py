"""Values are shown to the digits that their uncertainty allows."""

import pytest

from fitlib.conversion import rounded, with_unit


@pytest.mark.parametrize(
    ("value", "uncertainty", "shown"),
    [
        (5.251234, 0.012345, ("5.251", "0.012")),
        (5.251234, 0.0996, ("5.25", "0.10")),
        (5.25, 0.0999, ("5.25", "0.10")),
        (12345.678, 123.4, ("12350", "120")),
        (12345.678, 12.34, ("12346", "12")),
        (-0.5, 3.0, ("-0.5", "3.0")),
        (1.5e-9, 2.5e-11, ("0.000000001500", "0.000000000025")),
        (5.25, 0.0, ("5.25", "0.0")),
        (5.25, 1.23e-20, ("5.25", "1.2e-20")),
    ],
)
def test_two_digits_of_the_uncertainty_are_kept(value, uncertainty, shown):
    """JCGM 100:2008, 7.2.6: at most two significant digits of the uncertainty, the value to the same place."""
    assert rounded(value, uncertainty) == shown


def test_a_quantity_of_dimension_one_has_no_unit():
    assert [with_unit("5", unit) for unit in ("m", "1", "")] == ["5 m", "5", "5"]
