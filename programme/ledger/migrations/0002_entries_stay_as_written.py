"""The database itself refuses to change or remove a ledger row, on SQLite and on PostgreSQL."""

from django.db import migrations

SQLITE = (
    "CREATE TRIGGER ledger_entry_no_update BEFORE UPDATE ON ledger_entry "
    "BEGIN SELECT RAISE(ABORT, 'ledger rows are never changed'); END",
    "CREATE TRIGGER ledger_entry_no_delete BEFORE DELETE ON ledger_entry "
    "BEGIN SELECT RAISE(ABORT, 'ledger rows are never removed'); END",
)
POSTGRESQL = (
    "CREATE FUNCTION ledger_entry_stays() RETURNS trigger LANGUAGE plpgsql AS "
    "$$ BEGIN RAISE EXCEPTION 'ledger rows are never changed or removed'; END $$",
    "CREATE TRIGGER ledger_entry_stays BEFORE UPDATE OR DELETE ON ledger_entry "
    "FOR EACH ROW EXECUTE FUNCTION ledger_entry_stays()",
)
BACK = {
    "sqlite": ("DROP TRIGGER ledger_entry_no_update", "DROP TRIGGER ledger_entry_no_delete"),
    "postgresql": (
        "DROP TRIGGER ledger_entry_stays ON ledger_entry",
        "DROP FUNCTION ledger_entry_stays",
    ),
}
FORTH = {"sqlite": SQLITE, "postgresql": POSTGRESQL}


def forth(apps, schema_editor):
    for statement in FORTH[schema_editor.connection.vendor]:
        schema_editor.execute(statement)


def back(apps, schema_editor):
    for statement in BACK[schema_editor.connection.vendor]:
        schema_editor.execute(statement)


class Migration(migrations.Migration):
    dependencies = [("ledger", "0001_initial")]
    operations = [migrations.RunPython(forth, back)]
