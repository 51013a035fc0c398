from datetime import UTC, datetime, timedelta

import pypdfium2
import pytest

from programme.records.papers.sheet import plain
from programme.records.papers.shift import shift_sheet
from programme.records.papers.summary import Scope, compliance_summary
from programme.selection.assess import assess
from tests import builders as b
from tests.selection.scene import whole

pytestmark = pytest.mark.django_db
STAMP = datetime(2026, 3, 2, 8, 30, tzinfo=UTC)


def scope(site, **fields):
    known = {"start": b.DAY - timedelta(days=365), "end": b.DAY, "on": b.DAY}
    return Scope(site=site, by="mara, Manager", printed_at=STAMP, **(known | fields))


def words(pdf):
    document = pypdfium2.PdfDocument(pdf)
    pages = [page.get_textpage().get_text_bounded() for page in document]
    return " ".join("\n".join(pages).split())


def outline(pdf):
    return [one.get_title() for one in pypdfium2.PdfDocument(pdf).get_toc()]


def test_the_summary_prints_the_figures_of_the_chain():
    scene = whole()
    printed = words(compliance_summary(scope(scene.site)))
    chain = assess(scene.task, on=b.DAY)
    assert chain.verdict in printed
    for link in chain.links:
        assert link.figure in printed
    assert "Geometric mean: 0.0404 mg/m³" in printed


def test_every_page_is_numbered_and_carries_the_caution():
    pdf = compliance_summary(scope(whole().site))
    document = pypdfium2.PdfDocument(pdf)
    for number, page in enumerate(document, start=1):
        text = page.get_textpage().get_text_bounded()
        assert f"page {number} of {len(document)}" in text
        assert "not a licence to work" in text


def test_the_outline_names_the_parts():
    named = outline(compliance_summary(scope(whole().site)))
    for part in ("Counts", "Chain of each task", "Fit-test register", "What was not assessed"):
        assert part in named


def test_the_same_data_and_stamp_give_the_same_bytes():
    site = whole().site
    assert compliance_summary(scope(site)) == compliance_summary(scope(site))


def test_a_medical_reason_is_never_printed():
    scene = whole()
    scene.worker.clearances.update(outcome="not_able")
    printed = words(compliance_summary(scope(scene.site)))
    assert "not cleared" not in printed
    assert "ask the programme administrator" in printed


def test_a_mark_in_a_name_is_printed_as_typed():
    scene = whole()
    scene.worker.name = "Ana <b>&amp; Bo"
    scene.worker.save()
    assert "Ana <b>&amp; Bo" in words(compliance_summary(scope(scene.site)))


def test_a_site_without_any_record_prints_its_gaps():
    printed = words(compliance_summary(scope(b.make_site("bare"))))
    assert "No task was active on that day." in printed


def test_a_period_upside_down_is_refused():
    with pytest.raises(ValueError, match=r"^end: 2026-03-01 is not allowed"):
        scope(b.make_site(), start=b.DAY, end=b.DAY - timedelta(days=1))


@pytest.mark.parametrize(
    ("text", "shown"),
    [("0.05 mg/m³ ≥ 3", "0.05 mg/m³ ≥ 3"), ("10\u2009000", "10\u00a0000"), ("Łucja ő", "Łucja o")],
    ids=["units", "thin space", "names"],
)
def test_a_sign_that_the_font_lacks_is_replaced_by_what_says_the_same(text, shown):
    assert plain(text) in {shown, text}


def test_the_posted_sheet_names_only_who_may_start():
    scene = whole()
    other = b.make_worker(scene.site, "Bo Untrained")
    b.make_crew(scene.task, other, scene.assembly)
    printed = words(shift_sheet(assess(scene.task, on=b.DAY), by="corin", printed_at=STAMP))
    assert scene.worker.name in printed
    assert "Bo Untrained" not in printed
