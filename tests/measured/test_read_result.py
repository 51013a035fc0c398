"""Below detection stays below detection; zero and minus are never results."""

import pytest

from programme.measured import Refused, read_result


@pytest.mark.parametrize(
    ("text", "lod", "value", "is_censored", "kept"),
    [
        ("0.31", "", 0.31, False, None),
        ("0.31", "0.02", 0.31, False, 0.02),
        ("<0.02", "", 0.02, True, 0.02),
        ("< 0.02", "0.02", 0.02, True, 0.02),
        ("ND", "0.02", 0.02, True, 0.02),
        ("n.d.", "0.02", 0.02, True, 0.02),
        ("<LOD", "0.02", 0.02, True, 0.02),
        ("Not detected", " 0.02 ", 0.02, True, 0.02),
        (0.31, "", 0.31, False, None),
    ],
)
def test_a_result_is_read(text, lod, value, is_censored, kept):
    reading = read_result(text, lod)
    assert (reading.value, reading.is_censored, reading.lod) == (value, is_censored, kept)


def test_a_comma_is_read_behind_the_sign_when_declared():
    assert read_result("< 0,02", decimal="comma").value == 0.02


def test_the_text_is_kept_as_reported():
    assert read_result(" < 0.020 ").as_reported == "< 0.020"


@pytest.mark.parametrize(
    ("text", "lod", "says"),
    [
        ("ND", "", "needs its detection limit"),
        ("<LOD", "", "needs its detection limit"),
        ("0", "", "a measured zero is not possible; enter the detection limit as <value"),
        ("0.0", "0.02", "a measured zero is not possible"),
        (0, "", "a measured zero is not possible"),
        ("-0.3", "", "a result must be above 0"),
        ("\u22120.3", "", "a result must be above 0"),
        ("<0", "", "must be above 0"),
        ("<-1", "", "write < and a number above 0"),
        ("<<1", "", "write < and a number above 0"),
        ("<=1", "", "write < and a number above 0"),
        ("<", "", "write < and the detection limit"),
        ("<0.02", "0.05", "disagrees with its detection limit 0.05"),
        ("0.01", "0.05", "below its detection limit 0.05; write <0.05"),
        (">5", "", "is not a number"),
        ("trace", "", "is not a number"),
        ("NaN", "", "is not a number"),
        ("0.3", "0", "a detection limit must be above 0"),
        ("0.3", "-1", "a detection limit must be above 0"),
        ("0.3", "ND", "is not a number"),
        ("<1,234", "", "can be read as 1.234 or as 1234"),
    ],
)
def test_what_is_no_result_is_refused_by_name(text, lod, says):
    with pytest.raises(Refused, match=says):
        read_result(text, lod)
