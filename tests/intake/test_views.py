"""The way in by the browser: read, match, look, store, take back; nothing stored by looking."""

import csv
import io
from datetime import date

import pytest
from django.core.files.uploadedfile import SimpleUploadedFile
from django.test import Client
from django.urls import reverse

from exposure.models import Sample
from programme.fit.models import FitTest
from programme.ledger.models import Entry
from programme.records.models import ImportBatch
from programme.roster.models import Worker
from tests.builders import (
    client_for,
    make_agent,
    make_facepiece,
    make_sample,
    make_site,
    make_task,
    make_task_agent,
    make_user,
    make_worker,
)
from tests.intake.files import csv_bytes, xlsx_bytes

pytestmark = pytest.mark.django_db
SAMPLES = csv_bytes(
    "Task,Agent,Date,Result,Unit,Where,Span,Sample number",
    "reline,7439-92-1,2026-02-03,0.031,mg/m3,personal,full,L-1",
    "reline,7439-92-1,2026-02-03,<0.02,mg/m3,personal,full,L-2",
)
BAD_LINE = b"reline,7439-92-1,2026-02-03,0,mg/m3,personal,full,=L-3\n"
REASON = "wrong campaign, sent twice"


@pytest.fixture
def site():
    site = make_site()
    lead = make_agent("Lead", key="7439-92-1")
    make_task_agent(make_task(site, code="reline"), lead)
    return site


@pytest.fixture
def client(site):
    return client_for(make_user("administrator", site))


def page(name, *args, site="north"):
    return reverse(f"records:{name}", args=[site, *args])


def upload(client, data, kind="samples", name="lab.csv", **rest):
    return client.post(page("import_start", kind), {"file": SimpleUploadedFile(name, data), **rest})


def batch():
    return ImportBatch.objects.latest("pk")


def match(client, **changes):
    """Take the suggested matching, with changes."""
    form = client.get(page("import_match", batch().pk)).context["form"]
    data = {name: form[name].value() or "" for name in form.fields} | changes
    return client.post(page("import_match", batch().pk), data)


def bring_in(client, data, kind="samples", name="lab.csv", **changes):
    upload(client, data, kind, name)
    match(client, **changes)
    return client.get(page("import_preview", batch().pk))


def store(client, **ticks):
    return client.post(page("import_store", batch().pk), ticks, follow=True)


def test_nothing_is_stored_before_it_was_confirmed(client):
    answer = bring_in(client, SAMPLES)
    assert (len(answer.context["preview"].new), Sample.objects.count()) == (2, 0)


def test_a_confirmed_file_is_stored_with_its_batch_and_in_the_ledger(client):
    bring_in(client, SAMPLES)
    answer = store(client)
    assert b"2 rows stored" in answer.content
    assert set(Sample.objects.values_list("batch", flat=True)) == {f"import-{batch().pk}"}
    assert Entry.objects.filter(act="file brought in").count() == 1


def test_the_same_file_twice_does_not_double_the_data(client):
    bring_in(client, SAMPLES)
    store(client)
    answer = bring_in(client, SAMPLES)
    assert len(answer.context["preview"].known) == 2
    assert b"The same file was stored on" in answer.content
    store(client, again="on")
    assert Sample.objects.count() == 2


def test_a_second_press_stores_nothing_more(client):
    bring_in(client, SAMPLES)
    store(client)
    answer = store(client)
    assert b"is not stored twice" in answer.content
    assert Sample.objects.count() == 2


def test_bad_rows_stop_the_file_until_they_are_left_out(client):
    bring_in(client, SAMPLES + BAD_LINE)
    answer = store(client)
    assert (answer.status_code, Sample.objects.count()) == (422, 0)
    store(client, leave_out="on")
    assert Sample.objects.count() == 2


@pytest.mark.parametrize("ending", ["csv", "xlsx"])
def test_the_error_file_has_the_bad_rows_only_and_says_why(client, ending):
    bring_in(client, SAMPLES + BAD_LINE)
    answer = client.get(page("import_errors", batch().pk), {"format": ending})
    assert f'filename="lab-errors.{ending}"' in answer["Content-Disposition"]
    if ending == "csv":
        rows = list(csv.reader(io.StringIO(answer.content.decode())))
        assert len(rows) == 2
        assert (rows[1][7], rows[1][8]) == ("'=L-3", "4")
        assert "enter the detection limit as <value" in rows[1][9]


def test_a_corrected_error_file_comes_in_again(client):
    bring_in(client, SAMPLES + BAD_LINE)
    store(client, leave_out="on")
    errors = client.get(page("import_errors", batch().pk)).content
    bring_in(client, errors.replace(b",0,mg/m3", b",<0.02,mg/m3"), column_note="")
    store(client)
    assert Sample.objects.get(reference="=L-3").is_censored


def test_a_whole_file_is_taken_back_with_a_reason(client):
    bring_in(client, SAMPLES)
    store(client)
    client.post(page("import_undo", batch().pk), {"reason": REASON})
    assert not Sample.objects.in_force().exists()
    assert set(Sample.objects.values_list("change_reason", flat=True)) == {REASON}
    assert Entry.objects.filter(act="sample withdrawn", reason=REASON).count() == 2


def test_taking_back_needs_a_reason(client):
    bring_in(client, SAMPLES)
    store(client)
    client.post(page("import_undo", batch().pk), {"reason": " "})
    assert Sample.objects.in_force().count() == 2


def test_a_file_taken_back_may_come_in_again(client):
    bring_in(client, SAMPLES)
    store(client)
    client.post(page("import_undo", batch().pk), {"reason": REASON})
    bring_in(client, SAMPLES)
    store(client)
    assert Sample.objects.in_force().count() == 2


def test_pasted_rows_are_read_like_a_file(client):
    text = SAMPLES.decode().replace(",", "\t")
    client.post(page("import_start", "samples"), {"pasted": text})
    match(client)
    store(client)
    assert Sample.objects.count() == 2


def test_a_workbook_with_two_sheets_asks_for_one(client):
    rows = [line.split(",") for line in SAMPLES.decode().split()]
    rows = list(csv.reader(io.StringIO(SAMPLES.decode())))
    answer = upload(client, xlsx_bytes([["x"], [1]], rows), name="lab.xlsx")
    assert answer["Location"] == page("import_reading", batch().pk)
    client.post(answer["Location"], {"sheet": "Sheet2"})
    match(client)
    store(client)
    assert Sample.objects.count() == 2


def test_a_guessed_encoding_is_asked_with_the_words_it_changes(client):
    data = csv_bytes(
        "Name,Personnel number,Start date", "Zoë Größe,W-1,2024-01-08", encoding="cp1252"
    )
    answer = client.get(upload(client, data, "workers")["Location"])
    assert "Western European (Windows): Zoë Größe" in answer.content.decode()
    client.post(page("import_reading", batch().pk), {"encoding": "cp1252"})
    match(client)
    store(client)
    assert Worker.objects.get().name == "Zoë Größe"


def test_a_decimal_comma_is_asked_for_and_never_assumed(client):
    data = SAMPLES.replace(b",", b";").replace(b".", b",")
    upload(client, data)
    assert match(client).status_code == 422
    match(client, decimal="comma")
    store(client)
    assert sorted(Sample.objects.values_list("value", flat=True)) == [0.02, 0.031]


def test_what_the_file_leaves_out_may_be_fixed_for_every_row(client):
    upload(client, csv_bytes("value,censored", "0.4,0", "0.1,1"))
    assert match(client).status_code == 422
    match(client, fixed_task="reline", fixed_agent="7439-92-1", fixed_date="2026-02-03",
          fixed_unit="ug/m3", fixed_where="personal", fixed_span="full")  # fmt: skip
    store(client)
    assert sorted(Sample.objects.values_list("value", "is_censored")) == [
        (0.0001, True),
        (0.0004, False),
    ]


def test_a_citation_line_is_offered_as_the_note(client):
    upload(client, b"# A paper, 1989\n" + SAMPLES)
    match(client)
    store(client)
    assert set(Sample.objects.values_list("note", flat=True)) == {"A paper, 1989"}


def test_a_column_cannot_be_two_things(client):
    upload(client, SAMPLES)
    answer = match(client, column_note="1")
    assert b"this column is Agent already" in answer.content


@pytest.mark.parametrize(
    ("data", "says"),
    [(b"", b"empty"), (b"Task,Result\n", b"a header only"), (b"a,b\n1,\x002\n", b"a NUL sign")],
)
def test_a_file_that_cannot_be_read_is_refused_by_name(client, data, says):
    answer = upload(client, data)
    assert answer.status_code == 422
    assert says in answer.content


def test_a_file_of_200_mb_is_refused_before_it_is_read(client):
    answer = client.generic(
        "POST", page("import_start", "samples"), b"", CONTENT_LENGTH="209715200"
    )
    assert answer.status_code == 413
    assert b"at most 20 MB" in answer.content


def test_too_many_pasted_rows_are_refused_by_name(client):
    answer = client.post(page("import_start", "samples"), {"pasted": "x" * 3_000_000})
    assert answer.status_code == 413


def test_a_file_without_the_forms_token_is_refused(site):
    strict = Client(enforce_csrf_checks=True)
    strict.force_login(
        make_user("administrator", site), "allauth.account.auth_backends.AuthenticationBackend"
    )
    assert upload(strict, SAMPLES).status_code == 403


@pytest.mark.parametrize(
    ("role", "kind", "status"),
    [
        ("coordinator", "workers", 200),
        ("coordinator", "samples", 403),
        ("hygienist", "samples", 200),
        ("hygienist", "workers", 403),
        ("manager", "fit_tests", 403),
        ("hygienist", "fit-tests", 200),
        ("administrator", "anything", 404),
    ],
)
def test_each_role_brings_in_what_it_may_record(site, role, kind, status):
    assert client_for(make_user(role, site)).get(page("import_start", kind)).status_code == status


@pytest.mark.parametrize(
    ("name", "method"),
    [("import_preview", "get"), ("import_match", "get"), ("import_reading", "get"),
     ("import_errors", "get"), ("import_store", "post"), ("import_undo", "post")],
)  # fmt: skip
def test_another_sites_file_is_not_found(client, name, method):
    bring_in(client, SAMPLES)
    south = make_site("south")
    stranger = client_for(make_user("administrator", south))
    for code in ("north", "south"):
        assert getattr(stranger, method)(page(name, batch().pk, site=code)).status_code == 404


def test_looking_changes_nothing(client):
    bring_in(client, SAMPLES)
    before = (Sample.objects.count(), Entry.objects.count(), ImportBatch.objects.count())
    for name in ("import_preview", "import_match", "import_errors"):
        client.get(page(name, batch().pk))
    client.get(page("imports"))
    assert (Sample.objects.count(), Entry.objects.count(), ImportBatch.objects.count()) == before


def test_a_cell_is_shown_as_text(client):
    bring_in(client, SAMPLES.replace(b"L-1", b"<script>x</script>"))
    answer = client.get(page("import_preview", batch().pk))
    assert b"<script>x" not in answer.content
    assert b"&lt;script&gt;x" in answer.content


def test_people_without_records_are_removed_and_others_stay(client, site):
    data = csv_bytes("Name,Personnel number,Start date", "Ana,W-1,2024-01-08", "Ben,W-2,2024-01-08")
    bring_in(client, data, "workers")
    store(client)
    lead = site.tasks.get().agents.get()
    make_sample(lead, worker=Worker.objects.get(personnel_number="W-1"))
    answer = client.post(page("import_undo", batch().pk), {"reason": REASON}, follow=True)
    assert [worker.name for worker in Worker.objects.all()] == ["Ana"]
    assert b"1 rows taken back; 1 stay" in answer.content


def test_fit_tests_are_stored_with_their_exercises_and_taken_back(client, site):
    make_worker(site, "Ana", personnel_number="W-1")
    make_facepiece(site, name="Half A")
    figures = ",".join(f"Ex {n}" for n in range(1, 9))
    data = csv_bytes(
        f"Worker,Facepiece,Size,Protocol,Date,{figures}",
        "W-1,Half A,M,ambient_aerosol_cnc,2026-02-03,200,150,90,180,120,,110,200",
    )
    bring_in(client, data, "fit_tests")
    store(client)
    test = FitTest.objects.get()
    assert (test.exercises.count(), test.batch) == (8, f"import-{batch().pk}")
    client.post(page("import_undo", batch().pk), {"reason": REASON})
    assert not FitTest.objects.in_force().exists()


def test_5000_rows_are_stored_in_one_go(client):
    lines = [
        f"reline,7439-92-1,2026-02-03,0.0{n % 9 + 1},mg/m3,personal,full,N-{n}"
        for n in range(5_000)
    ]
    bring_in(client, csv_bytes(SAMPLES.decode().split("\n")[0], *lines))
    store(client)
    assert Sample.objects.count() == 5_000


def test_a_site_day_of_the_future_is_no_sample_day(client):
    future = date.today().year + 1
    answer = bring_in(client, SAMPLES.replace(b"2026-02-03", f"{future}-12-31".encode()))
    assert len(answer.context["preview"].bad) == 2
