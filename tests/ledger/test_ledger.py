import pytest
from django.db import DatabaseError, connection, transaction

from programme.ledger.actions import Act, enter, enter_many, head_of, verify
from programme.ledger.models import Entry, Head
from tests import builders as b

pytestmark = pytest.mark.django_db


def three(site):
    return enter_many([Act("site changed", site) for _ in range(3)], chain="north", by="ada")


def without_guard():
    """What somebody who owns the database could do: put the guard aside."""
    with connection.cursor() as cursor:
        if connection.vendor == "sqlite":
            cursor.execute("DROP TRIGGER ledger_entry_no_update")
            cursor.execute("DROP TRIGGER ledger_entry_no_delete")
        else:
            cursor.execute("ALTER TABLE ledger_entry DISABLE TRIGGER ledger_entry_stays")


def test_an_untouched_ledger_is_whole_and_prints_its_head():
    three(b.make_site())
    verdict = verify("north")
    assert verdict.is_whole
    assert verdict.rows == 3
    assert verdict.head == head_of("north")


def test_a_row_changed_behind_the_apps_back_is_found():
    rows = three(b.make_site())
    without_guard()
    Entry.objects.filter(pk=rows[1].pk).update(says="something else")
    assert verify("north").faults == ("row 2 was changed after it was written",)


def test_a_row_removed_from_the_middle_is_found():
    rows = three(b.make_site())
    without_guard()
    Entry.objects.filter(pk=rows[1].pk).delete()
    assert "row 2 is missing before row 3" in verify("north").faults


def test_a_tail_cut_off_is_found_by_the_head():
    rows = three(b.make_site())
    without_guard()
    Entry.objects.filter(pk=rows[2].pk).delete()
    assert not verify("north").is_whole


@pytest.mark.parametrize("change", ["update", "delete"])
def test_the_database_refuses_to_change_or_remove_a_row(change):
    rows = three(b.make_site())
    found = Entry.objects.filter(pk=rows[0].pk)
    with pytest.raises(DatabaseError, match="never"), transaction.atomic():
        found.update(says="x") if change == "update" else found.delete()


def test_each_site_has_a_chain_of_its_own():
    site = b.make_site()
    three(site)
    enter("site changed", chain="south", of=site, by="bo")
    assert Head.objects.get(chain="south").serial == 1
    assert verify("south").is_whole
