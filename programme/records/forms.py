"""What is asked while a file comes in: the file, how to read it, what its columns mean."""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any

from crispy_forms.helper import FormHelper
from crispy_forms.layout import Layout, Submit
from django import forms

from programme.records.intake.fields import Field, fields_of
from programme.records.intake.limits import MAX_BYTES, CannotRead, check_size, megabytes
from programme.records.intake.matching import (
    Matching,
    has_comma_numbers,
    has_year_last_dates,
    suggested_columns,
)
from programme.records.intake.preview import Preview
from programme.records.intake.reader import FileRead, read_file
from programme.records.intake.table import Table, encoding_examples, open_questions
from programme.records.intake.text_files import DELIMITERS

PASTED_AT_MOST = 1_000_000
PASTED_NAME = "pasted rows"


class StartForm(forms.Form):
    """A file, or rows pasted from a sheet."""

    file = forms.FileField(
        required=False,
        label="File",
        help_text=f"CSV, TSV or XLSX, at most {megabytes(MAX_BYTES)}; its first row names the columns",
    )
    pasted = forms.CharField(
        required=False,
        label="or paste the rows here, header first",
        widget=forms.Textarea(attrs={"rows": 8}),
        max_length=PASTED_AT_MOST,
        strip=False,
    )
    delimiter = forms.ChoiceField(
        required=False,
        label="Columns are separated by",
        choices=[("", "find out"), *DELIMITERS.items()],
        help_text="for text files and pasted rows",
    )

    def __init__(self, *args: Any, **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self.read: FileRead | None = None
        self.helper = FormHelper()
        self.helper.layout = Layout(
            "file", "pasted", "delimiter", Submit("send", "Read it; nothing is stored yet")
        )

    @property
    def file_name(self) -> str:
        """The name to keep, without control signs."""
        upload = self.cleaned_data.get("file")
        name = upload.name if upload else PASTED_NAME
        return "".join(sign for sign in name if sign.isprintable())[:200]

    def clean(self) -> dict[str, Any]:
        found = super().clean() or self.cleaned_data
        upload, pasted = found.get("file"), found.get("pasted") or ""
        if "file" in self.errors or "pasted" in self.errors:
            return found
        if bool(upload) == bool(pasted.strip()):
            self.add_error("file", "Give a file or pasted rows, one of the two.")
            return found
        try:
            if upload:
                check_size(upload.size)
            data = upload.read() if upload else pasted.encode()
            self.read = read_file(data, delimiter=found.get("delimiter", ""))
        except CannotRead as refused:
            self.add_error("file" if upload else "pasted", str(refused))
        return found


class ReadingForm(forms.Form):
    """Which sheet, and in which letters: asked, never guessed in silence."""

    def __init__(
        self, *args: Any, table: Mapping[str, Any], reading: Mapping[str, Any], **kwargs: Any
    ) -> None:
        super().__init__(*args, **kwargs)
        asked = open_questions(table, reading)
        if "sheet" in asked:
            sheets = [(name, f"{name}, {len(rows)} rows") for name, rows in table["sheets"].items()]
            self.fields["sheet"] = forms.ChoiceField(
                choices=[("", "choose a sheet"), *sheets], label="Sheet"
            )
        if "encoding" in asked:
            self.fields["encoding"] = forms.ChoiceField(
                choices=[("", "choose what reads right"), *encoding_examples(table)],
                label="Letters of the file",
                help_text=f"the file does not say; {reading['encoding']} is the likeliest",
            )
        self.helper = FormHelper()
        self.helper.layout = Layout(*self.fields, Submit("send", "Read it so"))

    @property
    def answers(self) -> dict[str, Any]:
        """What to keep in the batch's reading."""
        found = dict(self.cleaned_data)
        if "encoding" in found:
            found["is_encoding_chosen"] = True
        return found


@dataclass(frozen=True)
class MatchRow:
    """One of our fields on the matching page."""

    field: Field
    column: forms.BoundField
    fixed: forms.BoundField


class MatchForm(forms.Form):
    """Which column means what; a field without one may have one value for every row."""

    def __init__(
        self,
        *args: Any,
        kind: str,
        table: Table,
        kept: Mapping[str, Any],
        choices: Mapping[str, list[tuple[str, str]]],
        **kwargs: Any,
    ) -> None:
        """Build the boxes.

        Args:
            args: as `forms.Form`.
            kind: of the batch.
            table: as read.
            kept: a matching chosen before, as JSON; empty suggests one.
            choices: field -> values of the site it may be fixed to.
            kwargs: as `forms.Form`.
        """
        super().__init__(*args, **kwargs)
        self.wanted, self.table = fields_of(kind), table
        columns = kept.get("columns") if kept else suggested_columns(kind, table.header)
        fixed = kept.get("fixed", {})
        notes = " ".join(table.notes)
        options = [("", "no column")] + [
            (str(at), self._option(at)) for at in range(len(table.header))
        ]
        for field in self.wanted:
            self.fields[f"column_{field.key}"] = forms.ChoiceField(
                choices=options,
                required=False,
                label=f"{field.label}: column",
                initial=str(columns.get(field.key, "")) if columns else "",
            )
            first = fixed.get(field.key, "")
            if field.key == "note" and not kept and "note" not in (columns or {}):
                first = notes[:2000]
            self.fields[f"fixed_{field.key}"] = self._fixed(field, choices.get(field.key), first)
        self._add_marks(kept)

    def _option(self, at: int) -> str:
        examples = self.table.examples(at)
        return f"{self.table.column_name(at)} ({examples})" if examples else self.table.header[at]

    @staticmethod
    def _fixed(field: Field, choices: list[tuple[str, str]] | None, first: str) -> forms.Field:
        label = f"{field.label}: the same for every row"
        known = choices or list(field.choices)
        if known:
            return forms.ChoiceField(
                choices=[("", "–"), *known], required=False, label=label, initial=first
            )
        return forms.CharField(required=False, label=label, initial=first, max_length=2000)

    def _add_marks(self, kept: Mapping[str, Any]) -> None:
        has_commas = has_comma_numbers(self.table)
        marks = [("point", "a point: 0.02"), ("comma", "a comma: 0,02")]
        # Where a comma occurs the mark is asked for, never assumed.
        self.fields["decimal"] = forms.ChoiceField(
            choices=[("", "choose"), *marks] if has_commas else marks,
            label="Decimal mark",
            initial=kept.get("decimal") or ("" if has_commas else "point"),
        )
        self.fields["order"] = forms.ChoiceField(
            choices=[
                ("", "year first, or with one meaning only"),
                ("dmy", "day, month, year: 04/03/2026 is 4 March"),
                ("mdy", "month, day, year: 04/03/2026 is 3 April"),
            ],
            required=False,
            label="Dates are written",
            initial=kept.get("order") or "",
        )
        if not has_year_last_dates(self.table):
            self.fields["order"].help_text = "no date here needs it"

    def rows(self) -> Iterator[MatchRow]:
        """Our fields, each with its two boxes."""
        for field in self.wanted:
            yield MatchRow(field, self[f"column_{field.key}"], self[f"fixed_{field.key}"])

    def clean(self) -> dict[str, Any]:
        found = super().clean() or self.cleaned_data
        used: dict[str, str] = {}
        for field in self.wanted:
            column, fixed = f"column_{field.key}", f"fixed_{field.key}"
            at = found.get(column, "")
            if at and found.get(fixed):
                self.add_error(fixed, f"{field.label}: a column or one value, not both.")
            elif field.is_required and not at and not found.get(fixed):
                self.add_error(column, f"{field.label}: choose its column, or one value for all.")
            if at and at in used:
                self.add_error(column, f"{field.label}: this column is {used[at]} already.")
            if at:
                used.setdefault(at, field.label)
        return found

    @property
    def matching(self) -> Matching:
        """What was chosen."""
        found = self.cleaned_data
        columns = {
            field.key: int(found[f"column_{field.key}"])
            for field in self.wanted
            if found[f"column_{field.key}"]
        }
        fixed = {
            field.key: found[f"fixed_{field.key}"]
            for field in self.wanted
            if found[f"fixed_{field.key}"]
        }
        return Matching(columns, fixed, found["decimal"], found["order"] or None)


class StoreForm(forms.Form):
    """What a person has to agree to before rows are stored; only what applies is asked."""

    def __init__(self, *args: Any, preview: Preview, is_again: bool, **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        bad, asked = len(preview.bad), len(preview.asked)
        if bad:
            self._add("leave_out", f"Leave out the {bad} rows that cannot be stored")
        if asked:
            self._add("looked_at", f"I have looked at the {asked} rows with questions")
        if is_again:
            self._add("again", "Bring this file in again")
        new = len(preview.new)
        self.helper = FormHelper()
        self.helper.layout = Layout(
            *self.fields, Submit("send", f"Store {new} row{'' if new == 1 else 's'}")
        )

    def _add(self, name: str, label: str) -> None:
        self.fields[name] = forms.BooleanField(
            label=label, error_messages={"required": f"{label}: tick it, or mend the rows."}
        )
