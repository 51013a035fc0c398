"""The one reading of measured numbers, results and dates, used at every entrance.

Form, paste, CSV, XLSX, API and command line all come through here, so that one text never means
two things. A text is read only where its meaning is single; anything else is refused with what
was met and what is allowed.
"""

import math
import re
from dataclasses import dataclass
from datetime import date

POINT, COMMA, EITHER = "point", "comma", "either"
LONGEST = 40
FIRST_YEAR, LAST_YEAR = 1900, 2100

# Space, no-break space, figure space, thin space, narrow no-break space.
_SPACES = " \u00a0\u2007\u2009\u202f"
_NUMBER = re.compile(r"([+-]?)([0-9]+(?:[.,][0-9]*)?|[.,][0-9]+)([eE][+-]?[0-9]{1,4})?")
_GROUPED = re.compile(rf"[+-]?[1-9][0-9]{{0,2}}(?:[.,'{_SPACES}][0-9]{{3}})+(?:[.,][0-9]+)?")
_ONE_GROUP = re.compile(r"[+-]?[1-9][0-9]{0,2}[.,][0-9]{3}")
_GLUED = re.compile(r"[+-]?[0-9.,]+(?:[eE][+-]?[0-9]+)?\s*[A-Za-zµμ°].*")

NOT_DETECTED = frozenset(
    {"nd", "n.d.", "n.d", "not detected", "none detected", "<lod", "<dl", "bdl", "below detection"}
)


class Refused(ValueError):
    """A text that cannot be read with one meaning.

    Attributes:
        value: the text as it was met.
        allowed: what may be written instead.
    """

    def __init__(
        self, value: object, allowed: str, *, why: str = "is not a number that can be read"
    ) -> None:
        self.value = str(value)
        self.allowed = allowed
        shown = self.value if len(self.value) <= LONGEST else self.value[:LONGEST] + "…"
        super().__init__(f"{shown!r} {why}; {allowed}")


def _known_mark(decimal: str) -> None:
    if decimal not in {POINT, COMMA, EITHER}:
        raise ValueError(f"decimal: {decimal!r} is not allowed; it may be point, comma or either")


def _example(decimal: str) -> str:
    mark = "comma" if decimal == COMMA else "point"
    sample = "0,25" if decimal == COMMA else "0.25"
    return f"write digits with a decimal {mark} and no unit, for example 1000 or {sample}"


def _from_number(value: float) -> float:
    if isinstance(value, bool) or not math.isfinite(value):
        raise Refused(value, "it must be a finite number")
    return float(value) + 0.0


def _refuse_shape(text: str, decimal: str) -> None:
    """Say the likeliest slip by name; falls through to the general refusal."""
    if _GROUPED.fullmatch(text):
        digits = re.sub(rf"[.,'{_SPACES}]", "", text)
        raise Refused(
            text, f"leave out the thousands separator: {digits}", why="is not allowed as a number"
        )
    if "%" in text:
        raise Refused(text, "leave out the percent sign and write the number alone")
    if _GLUED.fullmatch(text):
        raise Refused(text, "leave out the unit and write the number alone, for example 0.25")
    raise Refused(text, _example(decimal))


def _refuse_mark(text: str, decimal: str) -> None:
    """Refuse a mark other than the declared one, and one that may be of tens or of thousands."""
    met = "," if "," in text else "." if "." in text else ""
    if not met:
        return
    as_decimal = text.replace(",", ".")
    declared = {POINT: ".", COMMA: ",", EITHER: met}[decimal]
    if _ONE_GROUP.fullmatch(text) and (met != declared or decimal == EITHER):
        whole = re.sub("[.,]", "", text)
        raise Refused(
            text,
            f"say which mark is the decimal one, or write {whole}",
            why=f"can be read as {as_decimal} or as {whole}",
        )
    if met != declared:
        wanted = "point" if decimal == POINT else "comma"
        written = as_decimal if decimal == POINT else text.replace(".", ",")
        raise Refused(text, f"the decimal mark is a {wanted}: write {written}")


def read_number(text: str | float, *, decimal: str = POINT) -> float:
    """Read one measured number.

    Args:
        text: ASCII digits with at most one decimal mark and an exponent; a leading minus may be
            "-" or U+2212. A float or int (JSON, a number cell) is checked and passed on.
        decimal: "point", "comma", or "either" (both marks, where only one meaning is possible).

    Returns:
        A finite float; minus zero comes back as zero.

    Raises:
        Refused: NaN, infinity, underscore, other digits, thousands separator, percent, glued unit,
            a magnitude a float cannot hold, or a text with two meanings.
        ValueError: `decimal` is none of the three.
    """
    _known_mark(decimal)
    if not isinstance(text, str):
        return _from_number(text)
    bare = text.strip(_SPACES + "\t\r\n").replace("\u2212", "-")
    if not bare:
        raise Refused(text, _example(decimal), why="is empty")
    match = _NUMBER.fullmatch(bare) if len(bare) <= LONGEST else None
    if match is None:
        _refuse_shape(bare, decimal)
        raise Refused(bare, _example(decimal))
    _refuse_mark(bare, decimal)
    value = float(bare.replace(",", "."))
    if math.isinf(value):
        raise Refused(bare, "it must be below 1e308", why="is too large to be kept")
    if value == 0 and any(digit in "123456789" for digit in match[2]):
        raise Refused(bare, "it must be 0 or at least 1e-300", why="is too small to be kept")
    return value + 0.0


@dataclass(frozen=True)
class Reading:
    """One result as read.

    Attributes:
        value: the result, or the detection limit where it lies below; above 0.
        is_censored: below the detection limit.
        lod: detection limit in the same unit, if known.
        as_reported: the text as it was met.
    """

    value: float
    is_censored: bool
    lod: float | None
    as_reported: str


def _limit(text: str | float, decimal: str) -> float | None:
    if isinstance(text, str) and not text.strip(_SPACES):
        return None
    value = read_number(text, decimal=decimal)
    if not value > 0:
        raise Refused(text, "a detection limit must be above 0", why="is not allowed")
    return value


def shown_number(value: str | float) -> str:
    """A number cell as text: 22.0 as 22, never with an exponent's rounding."""
    if isinstance(value, str):
        return value.strip(_SPACES)
    is_whole = math.isfinite(value) and value == int(value) and abs(value) < 1e15
    return str(int(value)) if is_whole else repr(float(value))


def _below(text: str, lod: float | None, decimal: str) -> Reading:
    """A text that begins with "<" or says not detected."""
    if text.lower() in NOT_DETECTED:
        if lod is None:
            raise Refused(
                text,
                "enter the detection limit too, or write the result as <value",
                why="needs its detection limit",
            )
        return Reading(lod, is_censored=True, lod=lod, as_reported=text)
    rest = text[1:].strip(_SPACES)
    if rest[:1] in {"<", "=", "-", "\u2212"}:
        raise Refused(
            text, "write < and a number above 0, for example <0.02", why="is not a result"
        )
    value = _limit(rest, decimal)
    if value is None:
        raise Refused(text, "write < and the detection limit, for example <0.02")
    if lod is not None and not math.isclose(value, lod, rel_tol=1e-9):
        raise Refused(
            text, "give one of the two", why=f"disagrees with its detection limit {lod:g}"
        )
    return Reading(value, is_censored=True, lod=value, as_reported=text)


def read_result(text: str | float, lod_text: str | float = "", *, decimal: str = POINT) -> Reading:
    """Read one sample result, with "<" and "not detected" kept as what they are.

    Args:
        text: "0.31", "<0.02", "< 0,02", "ND", "n.d.", "<LOD", "not detected".
        lod_text: detection limit in the unit of the result; empty if none is given.
        decimal: as for `read_number`.

    Raises:
        Refused: zero, a negative, not detected without a limit, a result below its own limit, or
            any text `read_number` refuses.
    """
    lod = _limit(lod_text, decimal)
    shown = shown_number(text)
    if shown.startswith("<") or shown.lower() in NOT_DETECTED:
        return _below(shown, lod, decimal)
    value = read_number(text, decimal=decimal)
    if value == 0:
        raise Refused(
            shown,
            "enter the detection limit as <value",
            why="is not allowed: a measured zero is not possible",
        )
    if value < 0:
        raise Refused(shown, "a result must be above 0", why="is not allowed")
    if lod is not None and value < lod:
        raise Refused(
            shown,
            f"write <{lod:g} if nothing was found, or leave the detection limit empty",
            why=f"is below its detection limit {lod:g}",
        )
    return Reading(value, is_censored=False, lod=lod, as_reported=shown)


_MONTH_NAMES = """
january february march april may june july august september october november december
"""
_MONTHS = {
    written: month
    for month, name in enumerate(_MONTH_NAMES.split(), start=1)
    for written in (name, name[:3])
} | {"sept": 9}
_TIME = r"(?:[T ][0-9]{1,2}:[0-9]{2}(?::[0-9]{2}(?:\.[0-9]+)?)?(?:Z|[+-][0-9]{2}:?[0-9]{2})?)?"
_YEAR_FIRST = re.compile(rf"([0-9]{{4}})[-/.]([0-9]{{1,2}})[-/.]([0-9]{{1,2}}){_TIME}")
_YEAR_LAST = re.compile(rf"([0-9]{{1,2}})[-/.]([0-9]{{1,2}})[-/.]([0-9]{{4}}){_TIME}")
_TWO_DIGITS = re.compile(r"[0-9]{1,2}[-/. ](?:[0-9]{1,2}|[A-Za-z]+)[-/. ][0-9]{2}")
_DAY_NAME = re.compile(r"([0-9]{1,2})[-/. ]+([A-Za-z]+)\.?,?[-/. ]+([0-9]{4})")
_NAME_DAY = re.compile(r"([A-Za-z]+)\.?[-/. ]+([0-9]{1,2}),?[-/. ]+([0-9]{4})")
_WRITE_ISO = "write it as year-month-day, for example 2026-03-04"
_NO_DATE = "is not a date that can be read"


def _day(text: str, parts: tuple[int, int, int]) -> date:
    year, month, day = parts
    if not FIRST_YEAR <= year <= LAST_YEAR:
        raise Refused(
            text, f"the year must be {FIRST_YEAR} to {LAST_YEAR}", why="is not allowed as a date"
        )
    try:
        return date(year, month, day)
    except ValueError:
        raise Refused(text, _WRITE_ISO, why="is not a day of the calendar") from None


def _year_last(text: str, match: re.Match[str], order: str | None) -> date:
    first, second, year = (int(part) for part in match.groups())
    if order is None and first != second and first <= 12 and second <= 12:
        readings = f"{year}-{second:02}-{first:02} or as {year}-{first:02}-{second:02}"
        raise Refused(text, "say which comes first, day or month", why=f"can be read as {readings}")
    day_first = order == "dmy" or (order is None and first > 12)
    day, month = (first, second) if day_first else (second, first)
    return _day(text, (year, month, day))


def _month_by_name(text: str) -> date | None:
    if match := _DAY_NAME.fullmatch(text):
        day, name, year = match.groups()
    elif match := _NAME_DAY.fullmatch(text):
        name, day, year = match.groups()
    else:
        return None
    month = _MONTHS.get(name.lower())
    return _day(text, (int(year), month, int(day))) if month else None


def read_date(text: str | date, *, order: str | None = None) -> date:
    """Read one date; the ISO form always, others where only one meaning is possible.

    Args:
        text: "2026-03-04", "13/04/2026", "4 March 2026"; a date (a date cell) is checked.
        order: "dmy" or "mdy" for dates with the year last; None asks where both are possible.

    Raises:
        Refused: two-digit years, 03/04/2026 without `order`, a day that does not exist, a bare
            spreadsheet serial, years outside 1900 to 2100.
        ValueError: `order` is none of the three.
    """
    if order not in {None, "dmy", "mdy"}:
        raise ValueError(f"order: {order!r} is not allowed; it may be dmy, mdy or None")
    if isinstance(text, date):
        return _day(str(text), (text.year, text.month, text.day))
    bare = text.strip(_SPACES + "\t\r\n")
    if not bare:
        raise Refused(text, _WRITE_ISO, why="is empty")
    if not bare.isascii() or len(bare) > LONGEST:
        raise Refused(bare, _WRITE_ISO, why=_NO_DATE)
    if match := _YEAR_FIRST.fullmatch(bare):
        year, month, day = (int(part) for part in match.groups())
        return _day(bare, (year, month, day))
    if match := _YEAR_LAST.fullmatch(bare):
        return _year_last(bare, match, order)
    if _TWO_DIGITS.fullmatch(bare):
        raise Refused(
            bare, "write the year with four digits", why="is not allowed: which century is open"
        )
    named = _month_by_name(bare)
    if named is None:
        raise Refused(bare, _WRITE_ISO, why=_NO_DATE)
    return named
