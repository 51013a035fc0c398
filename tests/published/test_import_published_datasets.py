"""Published data sets, brought in through the pages as a site would, give the published figures.

The two files are copies of the printed tables, citation in their first line:
NIOSH HETA 89-052 (1989), printed in Krishnamoorthy, Mathew, Ramachandran, J Occup Environ Hyg
2006;3:642-650 (area samples, entered here as one group for the arithmetic's sake); and USEPA
Unified Guidance EPA 530/R-09-007 (2009), Example 15-1 (manganese in ground water, µg/L, six of 25
below three detection limits, entered here as µg/m3 for the arithmetic's sake).
"""

import math
from dataclasses import dataclass
from datetime import date
from pathlib import Path

import pytest
from django.core.files.uploadedfile import SimpleUploadedFile
from django.urls import reverse

from exposure.models import Sample
from programme.records.models import ImportBatch
from programme.selection.assess import assess
from tests.builders import (
    client_for,
    make_agent,
    make_limit,
    make_site,
    make_task,
    make_task_agent,
    make_user,
)

pytestmark = pytest.mark.django_db
DATA = Path(__file__).parent / "data" / "datasets"


@dataclass(frozen=True)
class Published:
    """A data set, the day it is entered under, and what is known of it in mg/m3."""

    file: str
    sampled_on: date
    n: int
    n_censored: int
    cites: str
    figures: dict


LEAD = Published(
    "niosh_air_lead_1989.csv",
    date(1989, 2, 23),
    n=15,
    n_censored=0,
    cites="HETA 89-052",
    # Moments of the logarithms and one-sided tolerance limits of the 15 printed values (computed;
    # k by the noncentral t distribution): µg/m3 over 1000.
    figures={
        "gm": 0.07616197775,
        "gsd": 5.694156973,
        "x95": 1.331401555,
        "x95_upper70": 2.135695563,
        "x95_upper95": 6.609528265,
    },
)
MANGANESE = Published(
    "epa_manganese_15_1.csv",
    date(2009, 3, 2),
    n=25,
    n_censored=6,
    cites="Example 15-1",
    # Mean 2.215905 and standard deviation 1.356291 of the logarithms by maximum likelihood:
    # documentation of an open statistics package for Example 15-1 (verified); 95th percentile
    # computed from them.
    figures={
        "gm": math.exp(2.215905) / 1000,
        "gsd": math.exp(1.356291),
        "x95": 0.08535381472,
    },
)
BOTH = pytest.mark.parametrize("published", [LEAD, MANGANESE], ids=["lead", "manganese"])


def brought_in(published):
    """The task under which the data set was brought in by upload, match and confirmation."""
    site = make_site()
    user = make_user("administrator", site)
    client, since = client_for(user), date(published.sampled_on.year, 1, 1)
    task = make_task(site, code="assay", active_from=since)
    agent = make_agent("Metal", key="NOCAS-METAL")
    make_limit(agent, 0.05, fraction="total")
    make_task_agent(task, agent, fraction="total")
    upload = SimpleUploadedFile(published.file, (DATA / published.file).read_bytes())
    client.post(reverse("records:import_start", args=[site.code, "samples"]), {"file": upload})
    batch = ImportBatch.objects.get()
    page = reverse("records:import_match", args=[site.code, batch.pk])
    form = client.get(page).context["form"]
    chosen = {name: form[name].value() or "" for name in form.fields} | {
        "fixed_task": "assay",
        "fixed_agent": "NOCAS-METAL",
        "fixed_date": published.sampled_on.isoformat(),
        "fixed_unit": "ug/m3",
        "fixed_where": "personal",
        "fixed_span": "full",
        "fixed_reference": "row {row}",
        # In the second file the well and its sample number recur; the row tells the lines apart.
        "column_reference": "",
        "column_task": "",
    }
    client.post(page, chosen)
    store = reverse("records:import_store", args=[site.code, batch.pk])
    client.post(store, {"looked_at": "on"})
    return task


@BOTH
def test_every_printed_value_is_stored_with_its_citation(published):
    brought_in(published)
    samples = Sample.objects.all()
    assert samples.count() == published.n
    assert samples.filter(is_censored=True).count() == published.n_censored
    assert all(published.cites in sample.note for sample in samples)


@BOTH
def test_the_task_shows_the_published_figures(published):
    chain = assess(brought_in(published), on=published.sampled_on)
    figures = next(
        working.figures
        for link in chain.links
        for working in link.workings
        if "gm" in working.figures
    )
    assert (figures["n"], figures["n_censored"]) == (published.n, published.n_censored)
    for name, value in published.figures.items():
        assert figures[name] == pytest.approx(value, rel=1e-5), name
