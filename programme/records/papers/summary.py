"""The compliance summary of a site for a period, for whoever has to sign or audit it."""

from collections import Counter
from dataclasses import dataclass
from datetime import date, datetime

from programme.drawing.paper import chain_drawing
from programme.figures import down
from programme.fit.models import FitTest
from programme.ledger.actions import head_of
from programme.records.papers.sheet import BOLD, CAUTION, FONT, UNCONFIRMED, Sheet
from programme.roster.models import Site, Worker
from programme.rulepack.load import load
from programme.selection.assess import assess_site
from programme.selection.chain import (
    ASK,
    SEVERITIES,
    SEVERITY_SAYS,
    Chain,
    CrewVerdict,
    Mismatch,
    veiled,
)
from programme.selection.links.air import STATISTIC_SAYS


@dataclass(frozen=True)
class Scope:
    """What is printed: which site and period, judged for which day, by whom and when."""

    site: Site
    start: date
    end: date
    on: date
    by: str
    printed_at: datetime
    has_working: bool = True

    def __post_init__(self) -> None:
        if self.start > self.end:
            raise ValueError(f"end: {self.end} is not allowed; it must be {self.start} or later")


def _mark(one: Mismatch) -> str:
    return f"{one.source}{UNCONFIRMED if one.is_unconfirmed else ''}"


def compliance_summary(scope: Scope) -> bytes:
    """The summary as PDF.

    Args:
        scope: site, period and judging day; the period bounds the fit-test register.
    """
    site = scope.site
    # Whoever holds the paper may not be meant to know why a clearance stands in the way.
    chains = [veiled(chain) for chain in assess_site(site, on=scope.on)]
    head = head_of(site.code)
    sheet = Sheet(
        title=f"{site.name}: compliance summary {scope.start} to {scope.end}",
        footer=f"judged for {scope.on}; ledger {head}",
        printed_at=scope.printed_at,
        by=scope.by,
    )
    _cover(sheet, scope, head)
    _counts(sheet, scope, chains)
    _chains(sheet, chains)
    _mismatches(sheet, chains)
    _roster(sheet, chains)
    _register(sheet, scope)
    _changes(sheet, chains)
    _not_assessed(sheet, scope, chains)
    if scope.has_working:
        _workings(sheet, chains)
    _signing(sheet, head)
    return sheet.pdf()


def _cover(sheet: Sheet, scope: Scope, head: str) -> None:
    site, pack = scope.site, load(scope.site.rule_pack)
    sheet.heading("Respiratory protection: compliance summary", level=1)
    sheet.text(site.name, style="h2")
    lists = ", ".join((*pack.limit_lists, *site.adopted_limit_lists, "the site's own"))
    sheet.table(
        ("Scope", ""),
        [
            ("Period", f"{scope.start} to {scope.end}"),
            ("Judged for", f"the shift that starts on {scope.on}"),
            ("Rules", f"{pack.title}, edition {pack.edition}: {pack.jurisdiction}"),
            ("Exposure limits", lists),
            ("Exposure statistic", STATISTIC_SAYS[site.statistic]),
            ("Due soon", f"within {site.due_soon_days} days"),
            ("Ledger at printing", head),
            ("Printed", f"{scope.printed_at:%Y-%m-%d %H:%M %Z} by {scope.by}"),
        ],
        widths=(1, 4),
    )
    sheet.space()
    sheet.text(CAUTION)
    sheet.text(pack.caution, style="small")
    unsure = "Values marked (unconfirmed) were recalled, not read in the cited text."
    sheet.text(unsure, style="small")


def _counts(sheet: Sheet, scope: Scope, chains: list[Chain]) -> None:
    sheet.heading("Counts")
    crew = [one for chain in chains for one in chain.crew]
    people = {one.worker_id for one in crew}
    ready = {one.worker_id for one in crew if all(m.severity == "plan" for m in one.mismatches)}
    amiss = {one.worker_id for one in crew} - ready
    severities = Counter(m.severity for chain in chains for m in chain.mismatches)
    whole = sum(1 for chain in chains if chain.holds)
    active = Worker.objects.at(scope.site).active(scope.on).count()
    rows: list[tuple[str, str, str]] = [
        ("Chains that hold", f"{whole} of {len(chains)}", "active tasks with all six links whole"),
        (
            "Places on crews that may start",
            f"{sum(chain.may_start for chain in chains)} of {len(crew)}",
            "a worker on two tasks has two places",
        ),
        (
            "Workers with nothing against them",
            f"{len(ready - amiss)} of {len(people)}",
            "workers on a crew; cleared, trained, fitted, filter in time",
        ),
        ("Workers on a crew", f"{len(people)} of {active}", "active workers of the site"),
    ]
    rows += [
        (f"Mismatches: {SEVERITY_SAYS[key].lower()}", str(severities[key]), "listed below")
        for key in SEVERITIES
    ]
    sheet.table(("Count", "Figure", "Definition"), rows, widths=(3, 1.4, 4))


def _chains(sheet: Sheet, chains: list[Chain]) -> None:
    sheet.new_page()
    sheet.heading("Chain of each task")
    if not chains:
        sheet.text("No task was active on that day.")
    from reportlab.platypus import KeepTogether

    for chain in chains:
        at = len(sheet.story)
        sheet.heading(f"{chain.task} ({chain.task_code})", level=3)
        sheet.text(chain.verdict)
        sheet.draw(chain_drawing(chain, width_pt=sheet.width_pt, font=FONT, bold=BOLD))
        sheet.text(f"In words: {chain.as_text}", style="small")
        sheet.story[at:] = [KeepTogether(sheet.story[at:])]


def _mismatches(sheet: Sheet, chains: list[Chain]) -> None:
    sheet.heading("Mismatches and what mends them")
    for key in SEVERITIES:
        found = [(c, m) for c in chains for m in c.mismatches if m.severity == key]
        sheet.heading(f"{SEVERITY_SAYS[key]} ({len(found)})", level=3)
        rows = [
            (
                chain.task,
                one.link,
                one.says,
                " or: ".join(remedy.says for remedy in one.remedies) or "see the working",
                _mark(one),
            )
            for chain, one in found
        ]
        header = ("Task", "Link", "What does not fit", "Remedy", "Clause")
        sheet.table(header, rows, widths=(2, 0.8, 4, 2.4, 2.4))


def _why(chain: Chain, one: CrewVerdict) -> str:
    if one.may_start:
        return "may start"
    if one.is_medical:
        return f"may not: {ASK}"
    if one.why_not:
        return f"may not: {one.why_not}"
    broken = chain.first_break
    return f"waits on {broken.name if broken else 'the task'}"


def _roster(sheet: Sheet, chains: list[Chain]) -> None:
    sheet.heading("Roster readiness")
    pairs = [(chain, one) for chain in chains for one in chain.crew]
    rows = [
        (
            f"{one.worker} ({one.personnel_number})",
            chain.task,
            _why(chain, one),
            one.wears,
            down(one.fit_factor) if one.fit_factor else "-",
            f"{one.good_until} ({one.good_until_says})" if one.good_until else "-",
        )
        for chain, one in sorted(pairs, key=lambda pair: pair[1].worker)
    ]
    header = ("Worker", "Task", "On that day", "Wears", "Fit factor", "First lapse")
    sheet.table(header, rows, widths=(2.2, 2, 3.6, 2.4, 1, 1.6))
    sheet.text(
        "A fit factor is not a protection factor. The day of lapse is the first that no longer "
        "counts.",
        style="small",
    )


def _register(sheet: Sheet, scope: Scope) -> None:
    sheet.heading("Fit-test register")
    tests = (
        FitTest.objects.at(scope.site)
        .filter(tested_on__gte=scope.start, tested_on__lte=scope.end)
        .select_related("worker", "size__facepiece", "replaced_by")
        .order_by("tested_on", "worker__name")
    )
    pack = load(scope.site.rule_pack)
    rows = []
    for test in tests:
        protocol = pack.find_protocol(test.protocol)
        state = "stands"
        if test.replaced_by_id:
            state = f"replaced by record {test.replaced_by_id}: {test.change_reason}"
        elif test.withdrawn_at:
            state = f"withdrawn: {test.change_reason}"
        rows.append(
            (
                str(test.pk),
                test.tested_on,
                test.worker.name,
                f"{test.size.facepiece.name}, {test.size.label}",
                protocol.name if protocol else test.protocol,
                down(test.overall_fit_factor) if test.overall_fit_factor else "-",
                test.get_outcome_display(),
                state,
            )
        )
    header = ("No.", "Day", "Worker", "Facepiece, size", "Protocol", "Overall", "Outcome", "Record")
    sheet.table(header, rows, widths=(0.6, 1.1, 1.8, 1.8, 2.6, 0.9, 1, 1.4))


def _changes(sheet: Sheet, chains: list[Chain]) -> None:
    sheet.heading("Change schedule")
    rows = []
    for chain in chains:
        for working in chain.links[5].workings:
            others = "; ".join(f"{row.label}: {row.text}" for row in working.rows)
            rows.append((chain.task, working.title, others))
    header = ("Task", "Schedule", "From what, the losing reasons included")
    sheet.table(header, rows, widths=(2, 3.4, 6))
    due = [
        (one.filter_due_on, one.worker, chain.task, one.filter_says)
        for chain in chains
        for one in chain.crew
        if one.filter_due_on
    ]
    sheet.heading("Next change of each worker", level=3)
    sheet.table(("Due", "Worker", "Task", "State"), sorted(due), widths=(1, 2, 2, 2))


def _not_assessed(sheet: Sheet, scope: Scope, chains: list[Chain]) -> None:
    sheet.heading("What was not assessed")
    unknown = {
        "exposure-unknown",
        "agent-missing",
        "limit-missing",
        "sample-before-change",
        "peak-unsampled",
        "oxygen-unknown",
        "dust-load-unknown",
        "change-schedule",
    }
    rows = [
        (chain.task, one.link, one.says)
        for chain in chains
        for one in chain.mismatches
        if one.code in unknown
    ]
    sheet.table(("Task", "Link", "Not known"), rows, widths=(2, 1, 6))
    sheet.text(
        "Not part of this summary: additive mixtures, inspection of emergency sets, breathing air, "
        f"the written programme and its evaluation. Records are as known on {scope.printed_at:%Y-%m-%d}.",
        style="small",
    )


def _workings(sheet: Sheet, chains: list[Chain]) -> None:
    sheet.new_page()
    sheet.heading("Working of every figure")
    for chain in chains:
        sheet.heading(chain.task, level=3)
        rows = []
        for link in chain.links:
            for working in link.workings:
                inputs = "; ".join(
                    f"{row.label}: {row.text}{UNCONFIRMED if row.is_unconfirmed else ''}"
                    for row in working.rows
                )
                source = f"{working.source}{UNCONFIRMED if working.is_unconfirmed else ''}"
                rows.append((link.name, working.title, working.formula, inputs, source))
        header = ("Link", "Figure", "Formula", "Inputs", "Source")
        sheet.table(header, rows, widths=(0.7, 2, 2.2, 5, 2))


def _signing(sheet: Sheet, head: str) -> None:
    from reportlab.platypus import KeepTogether

    at = len(sheet.story)
    sheet.heading("Signatures")
    sheet.text(f"Each signs for what stands beside the name, on the state of ledger {head}.")
    rows = [
        (meaning, "", "", "")
        for meaning in ("entered by", "reviewed by (hygienist)", "accepted by (manager)")
    ]
    sheet.table(("Meaning", "Printed name", "Signature", "Date"), rows, widths=(2, 3, 3, 1.5))
    sheet.story[at:] = [KeepTogether(sheet.story[at:])]
