"""How long a fit test counts: months on the calendar, by the pack's interval or a shorter one."""

from dataclasses import dataclass
from datetime import date, timedelta

from programme.fit.models import FitTest
from programme.roster.models import Site
from programme.roster.months import months_after, months_before
from programme.rulepack.pack import RulePack

FIT_TEST = "fit"


def shorter_months(pack_months: int | None, site_months: int | None) -> int | None:
    """The shorter of both intervals; a site may tighten a pack, never loosen it."""
    given = [months for months in (pack_months, site_months) if months is not None]
    return min(given, default=None)


def interval_months(pack: RulePack, site: Site) -> int | None:
    """After how many months a test at that site no longer counts; None where nothing is set."""
    return shorter_months(pack.interval(FIT_TEST).months, site.fit_interval_months)


def last_lapsed_day(on: date, months: int) -> date:
    """The latest day of test whose test no longer counts on `on`."""
    day = months_before(on, months) + timedelta(days=4)
    while months_after(day, months) > on:
        day -= timedelta(days=1)
    return day


@dataclass(frozen=True)
class Validity:
    """Until when one test counts.

    Attributes:
        state: "valid", "due soon", "lapsed", "not yet" or "counts for nothing".
        through: last day on which it counts; None where it never does or no interval is set.
        says: a sentence.
    """

    state: str
    through: date | None
    says: str


def validity_of(test: FitTest, *, pack: RulePack, on: date) -> Validity:
    """Until when the test counts by its date alone; the face is judged elsewhere."""
    if test.outcome != FitTest.Outcome.PASSED or not test.stands:
        return Validity("counts for nothing", None, "")
    site = test.worker.site
    months = interval_months(pack, site)
    if months is None:
        return Validity("valid", None, "No retest interval is set for this site.")
    expires = months_after(test.tested_on, months)
    through = expires - timedelta(days=1)
    if on < test.tested_on:
        state = "not yet"
    elif on >= expires:
        state = "lapsed"
    else:
        state = "due soon" if on >= expires - timedelta(days=site.due_soon_days) else "valid"
    return Validity(state, through, f"Valid through {through:%-d %B %Y}.")
