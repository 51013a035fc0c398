"""What each kind of file may bring: our fields, and how others head the same column."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from exposure.models import Sample

EXERCISES = 12


@dataclass(frozen=True)
class Field:
    """One thing a row may say.

    Attributes:
        key: as kept in the matching.
        label: as a person reads it.
        words: header spellings that mean it, in lower case without signs.
        is_required: a column or one value for all rows must be given.
        choices: values one may fix it to, `(value, label)`; empty for free text.
        hint: what it may hold.
    """

    key: str
    label: str
    words: tuple[str, ...] = ()
    is_required: bool = False
    choices: Sequence[tuple[str, Any]] = ()
    hint: str = ""


UNITS = (
    ("mg/m3", "mg/m³"),
    ("ug/m3", "µg/m³"),
    ("ppm", "ppm"),
    ("ppb", "ppb"),
    ("f/cm3", "f/cm³"),
)
_YES_NO = (("no", "no"), ("yes", "yes"))

WORKERS = (
    Field("name", "Name", ("name", "full name", "worker", "employee", "person"), True),
    Field(
        "number",
        "Personnel number",
        ("personnel number", "personnel no", "employee number", "employee id", "staff number",
         "id", "number", "no", "payroll number", "badge"),
        True,
    ),
    Field("job", "Job", ("job", "job title", "trade", "occupation", "position")),
    Field("employer", "Employer", ("employer", "company", "firm"), hint="empty: the site's own"),
    Field("contractor", "Contractor", ("contractor", "is contractor", "external"), False, _YES_NO),
    Field("born", "Born on", ("born", "born on", "date of birth", "birth date", "dob")),
    Field(
        "from",
        "First day here",
        ("from", "first day", "first day here", "start", "start date", "active from", "hired",
         "hired on", "since"),
        True,
        hint="a date",
    ),
    Field(
        "to",
        "No longer here from",
        ("to", "until", "end", "end date", "active to", "left", "left on", "no longer here from"),
        hint="first day on which the person no longer works here",
    ),
    Field("spectacles", "Wears spectacles", ("spectacles", "glasses"), False, _YES_NO),
)  # fmt: skip

SAMPLES = (
    Field("task", "Task", ("task", "task code", "operation", "activity", "seg",
                           "similar exposure group", "exposure group"), True),
    Field(
        "agent",
        "Agent",
        ("agent", "substance", "analyte", "contaminant", "cas", "cas number", "cas no",
         "compound", "chemical", "parameter"),
        True,
        hint="name, synonym or CAS number",
    ),
    Field("fraction", "Fraction", ("fraction", "size fraction", "particle fraction"),
          hint="only where the task has the agent in two fractions"),
    Field("date", "Date sampled", ("date", "sampled", "sampled on", "date sampled",
                                   "sample date", "sampling date", "day", "date on"), True),
    Field("worker", "Worker", ("worker", "personnel number", "employee", "person", "name",
                               "employee id", "worn by"), hint="personnel number or name"),
    Field(
        "result",
        "Result",
        ("result", "value", "concentration", "conc", "twa", "reported result", "measurement"),
        True,
        hint="a number above 0, <0.02, or ND with its detection limit",
    ),
    Field("unit", "Unit of the result", ("unit", "units", "unit of result", "result unit"),
          True, UNITS),
    Field("censored", "Below detection? (1 or 0)",
          ("censored", "nondetect", "non detect", "below detection", "below lod", "is censored"),
          hint="1: the result column holds the detection limit"),
    Field("lod", "Detection limit", ("lod", "detection limit", "limit of detection", "dl",
                                     "reporting limit", "mdl"), hint="same unit as the result"),
    Field("minutes", "Minutes sampled", ("minutes", "min", "duration", "time min",
                                         "sampling time", "sample time", "duration min")),
    Field("flow", "Flow, L/min", ("flow", "flow rate", "flow l min", "l min", "lpm",
                                  "pump flow")),
    Field("volume", "Volume, L", ("volume", "air volume", "volume l", "litres", "liters",
                                  "sample volume")),
    Field("where", "Where taken", ("where", "type", "sample type", "personal area",
                                   "location type"), True, tuple(Sample.Where.choices)),
    Field("span", "Span", ("span", "kind", "period", "basis", "averaging", "full shift"),
          True, tuple(Sample.Span.choices)),
    Field("method", "Method", ("method", "analytical method", "sampling method")),
    Field("laboratory", "Laboratory", ("laboratory", "lab", "analysed by", "analyzed by")),
    Field("reference", "Sample number", ("sample number", "sample no", "sample id", "sample",
                                         "reference", "lab number", "id", "number")),
    Field("note", "Note", ("note", "notes", "remark", "remarks", "comment", "comments")),
)  # fmt: skip

_EXERCISE_WORDS = ("exercise {n}", "ex {n}", "ex{n}", "e{n}", "ff{n}", "ff {n}", "factor {n}",
                   "fit factor {n}")  # fmt: skip

FIT_TESTS = (
    Field("worker", "Worker", ("worker", "personnel number", "employee id", "employee",
                               "personnel no", "person", "name", "id"), True,
          hint="personnel number or name"),
    Field("facepiece", "Facepiece", ("facepiece", "model", "respirator", "mask", "make model",
                                     "make and model"), True, hint="name as under Respirators"),
    Field("size", "Size", ("size", "mask size", "facepiece size"), True),
    Field("protocol", "Protocol", ("protocol", "method", "test type", "type of test"), True),
    Field("date", "Date tested", ("date", "tested", "tested on", "test date", "date tested",
                                  "day"), True),
    Field("overall", "Overall fit factor as reported",
          ("overall", "overall fit factor", "overall ff", "fit factor", "ff", "result"),
          hint="kept beside; the figure that counts is worked out from the exercises"),
    Field("outcome", "Outcome", ("outcome", "pass fail", "passed", "verdict"), False,
          (("passed", "passed"), ("failed", "failed"), ("incomplete", "incomplete")),
          hint="needed for a qualitative test"),
    Field("element", "Filter used", ("filter", "element", "filter used", "cartridge")),
    Field("tester", "Tester", ("tester", "tested by", "operator", "conducted by")),
    Field("note", "Note", ("note", "notes", "remark", "remarks", "comment", "comments")),
    *(
        Field(f"exercise_{n}", f"Exercise {n}, fit factor",
              tuple(word.format(n=n) for word in _EXERCISE_WORDS))
        for n in range(1, EXERCISES + 1)
    ),
)  # fmt: skip

FIELDS = {"workers": WORKERS, "samples": SAMPLES, "fit_tests": FIT_TESTS}


def fields_of(kind: str) -> tuple[Field, ...]:
    """The fields of a kind of file.

    Raises:
        ValueError: no such kind.
    """
    if kind not in FIELDS:
        raise ValueError(f"kind: {kind!r} is not known; known are {', '.join(FIELDS)}")
    return FIELDS[kind]
