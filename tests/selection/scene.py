"""A task whose chain holds, to be broken one thing at a time."""

from datetime import date
from types import SimpleNamespace

from programme.selection.assess import assess
from programme.selection.chain import Chain
from tests import builders as b

RESULTS = (0.02, 0.05, 0.03, 0.08, 0.04, 0.06, 0.03)


def whole(pack: str = "us-2026-1", results=RESULTS, **task_fields) -> SimpleNamespace:
    """A task with one agent, one assembly and one worker; all six links hold on `b.DAY`."""
    site = b.make_site(code=pack[:2], rule_pack=pack)
    task = b.make_task(site, **task_fields)
    agent = b.make_agent()
    limit = b.make_limit(
        agent, list_code=f"{pack[:2].upper()}-{'PEL' if pack[0] == 'u' else 'WEL'}"
    )
    task_agent = b.make_task_agent(task, agent, dust_load_mg_m3=2.0, cake="fine_dust")
    samples = [b.make_sample(task_agent, value) for value in results]
    facepiece = b.make_facepiece(site)
    p_class, r_class = ("P100", "apr_half") if pack[0] == "u" else ("P3", "half_p3")
    element = b.make_element(site, particulate_class=p_class, area_cm2=300, clean_resistance_pa=120)
    assembly = b.make_assembly(site, facepiece, element, respirator_class=r_class)
    b.assign(task, assembly)
    worker = b.make_worker(site)
    b.make_clearance(worker)
    training = b.make_training(worker)
    fit_test = b.make_fit_test(worker, b.size_of(facepiece))
    member = b.make_crew(task, worker, assembly)
    b.make_filter_change(worker, assembly)
    return SimpleNamespace(
        site=site,
        task=task,
        agent=agent,
        limit=limit,
        task_agent=task_agent,
        samples=samples,
        facepiece=facepiece,
        element=element,
        assembly=assembly,
        worker=worker,
        training=training,
        fit_test=fit_test,
        member=member,
    )


def judged(scene, on: date = b.DAY) -> Chain:
    scene.task.refresh_from_db()
    return assess(scene.task, on=on)


def codes(scene, on: date = b.DAY) -> set[str]:
    return {one.code for one in judged(scene, on).mismatches}
