"""Calendar months, as intervals of a rule pack count them."""

from calendar import monthrange
from datetime import date


def months_after(day: date, months: int) -> date:
    """The same day of the month, `months` later; 29 February and the like go to the month's last.

    An expiry counted this way is the first day that no longer counts, so a yearly fit test of
    3 March is valid through 2 March of the next year.
    """
    index = day.month - 1 + months
    year, month = day.year + index // 12, index % 12 + 1
    return date(year, month, min(day.day, monthrange(year, month)[1]))


def months_before(day: date, months: int) -> date:
    """The day `months` calendar months earlier, by the same rule."""
    return months_after(day, -months)
