"""Rows of a check table: a value published or computed elsewhere, its tolerance and source."""

import csv
import re
from dataclasses import dataclass
from pathlib import Path

DATA = Path(__file__).parent / "data"

TO_SI = {
    "um": 1e-6,
    "nm": 1e-9,
    "mm": 1e-3,
    "L/min": 1.0 / 60_000.0,
    "mg/m3": 1e-6,
    "mg": 1e-6,
    "g/m2": 1e-3,
    "m2/g": 1e3,
    "cm2": 1e-4,
    "h": 3600.0,
}

PAIR = re.compile(r"([A-Za-z][\w ]*?)=([-+]?\d[\d.]*(?:e[-+]?\d+)?)\s*([\w/]*)")


@dataclass(frozen=True)
class Row:
    """One check: an expected value in SI, how close to come, and who says so."""

    id: str
    quantity: str
    inputs: str
    printed: str
    unit: str
    rel_tol: float
    source: str
    sure: str

    @property
    def expected(self):
        return float(self.printed) * TO_SI.get(self.unit, 1.0)

    @property
    def is_fact(self):
        """Something to cite, not to compute: no tolerance, or no single number."""
        try:
            float(self.printed)
        except ValueError:
            return True
        return self.rel_tol == 0.0

    def given(self, key, default=None):
        """The input of that name, in SI."""
        for name, number, unit in PAIR.findall(self.inputs):
            if name.strip() == key:
                return float(number) * TO_SI.get(unit, 1.0)
        if default is None:
            raise KeyError(f"{self.id}: no {key} in {self.inputs!r}")
        return default


def read_rows(name):
    with (DATA / name).open(encoding="utf-8", newline="") as file:
        return [
            Row(
                id=line["id"],
                quantity=line["quantity"],
                inputs=line["inputs"],
                printed=line["expected"],
                unit=line["unit"],
                rel_tol=float(line["rel_tol"] or 0.0),
                source=line["source"],
                sure=line["sure"],
            )
            for line in csv.DictReader(file)
        ]


def read_commented(name):
    """Rows of a table whose first lines may be comments."""
    with (DATA / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(line for line in file if not line.startswith("#")))
