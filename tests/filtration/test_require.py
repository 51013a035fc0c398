import re

import numpy as np
import pytest

from filtration import require


def test_a_scalar_and_an_array_come_back_as_floats_of_their_shape():
    assert require("flow_l_min", 3).shape == ()
    assert require("flow_l_min", [[1, 2]]).shape == (1, 2)
    assert require("flow_l_min", [1, 2]).dtype == np.float64


@pytest.mark.parametrize(
    ("limits", "says"),
    [
        ({"at_least": 0, "at_most": 1}, "x: 7 is not allowed; it must be 0 to 1"),
        ({"at_most": 1}, "x: 7 is not allowed; it must be 1 or less"),
        ({"at_least": 8}, "x: 7 is not allowed; it must be 8 or more"),
        ({"above": 7}, "x: 7 is not allowed; it must be more than 7"),
        ({"at_least": 0, "below": 7}, "x: 7 is not allowed; it must be 0 or more and less than 7"),
    ],
    ids=["both ends", "upper", "lower", "open lower", "half open"],
)
def test_a_value_out_of_range_is_refused_in_one_wording(limits, says):
    with pytest.raises(ValueError, match=f"^{re.escape(says)}$"):
        require("x", 7.0, **limits)


@pytest.mark.parametrize(
    "unknown",
    [
        float("nan"),
        float("inf"),
        None,
        "3.5",
        True,
        1 + 2j,
        [1.0, None],
        [[1.0], [1.0, 2.0]],
        np.ma.masked_array([1.0, 2.0], mask=[False, True]),
    ],
    ids=["nan", "inf", "none", "text", "bool", "complex", "hole", "ragged", "masked"],
)
def test_whatever_stands_for_unknown_is_refused(unknown):
    with pytest.raises(ValueError, match=r"^x: .* is not allowed; it must be a finite number$"):
        require("x", unknown)


def test_the_first_bad_entry_is_named():
    with pytest.raises(ValueError, match=r"^efficiency: 1\.2 is not allowed; it must be 0 to 1$"):
        require("efficiency", [0.3, 1.2, 5.0], at_least=0.0, at_most=1.0)


def test_an_unmasked_masked_array_passes():
    assert require("x", np.ma.masked_array([1.0, 2.0])).tolist() == [1.0, 2.0]
