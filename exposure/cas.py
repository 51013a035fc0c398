"""The check digit of a CAS registry number."""

import re

_SHAPE = re.compile(r"([0-9]{2,7})-([0-9]{2})-([0-9])")


def check_digit(digits: str) -> int:
    """The check digit that belongs to the digits before it, the hyphens left out.

    Each digit is weighted by its place counted from the right, starting at 1; the digit is the
    sum modulo 10.

    Source: CAS, Check Digit Verification of CAS Registry Numbers (from memory).
    """
    return sum(place * int(digit) for place, digit in enumerate(reversed(digits), start=1)) % 10


class CheckDigitError(ValueError):
    """A CAS number whose check digit is wrong.

    Attributes:
        likely: the number with the digit that belongs to the others.
    """

    def __init__(self, message: str, likely: str) -> None:
        super().__init__(message)
        self.likely = likely


def read_cas(text: str) -> str:
    """The CAS number in `text`.

    Raises:
        ValueError: not of the form 7439-92-1.
        CheckDigitError: a ValueError; its check digit does not belong to its other digits.
    """
    bare = text.strip().replace("\u2010", "-").replace("\u2011", "-").replace("\u2013", "-")
    match = _SHAPE.fullmatch(bare)
    if match is None or not bare.isascii():
        raise ValueError(
            f"CAS number: {bare} is not allowed; "
            "write 2 to 7 digits, 2 digits and 1 check digit, for example 7439-92-1"
        )
    first, second, last = match.groups()
    wanted = check_digit(first + second)
    if wanted != int(last):
        likely = f"{first}-{second}-{wanted}"
        raise CheckDigitError(
            f"CAS number: {bare} is not allowed; with these digits the last one must be {wanted} "
            f"({likely}): look for a slip",
            likely,
        )
    return bare
