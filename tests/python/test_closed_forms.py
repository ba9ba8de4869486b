"""Each kind of support, load and prestress rule once over the wire, against its closed form."""

import pytest

import closed_forms
import closed_forms_ropes
import stubs
import talk
from report import check


@pytest.mark.parametrize("case", closed_forms.ALL + closed_forms_ropes.ALL, ids=lambda case: case.name.replace(" ", "-"))
def test_closed_form(channel, case):
    run = talk.run(channel, case.brief)
    for name, state in run.cases.items():
        if name != "envelope":
            assert state.summary.outcome == stubs.result.CASE_OUTCOME_ANSWERED, state.summary.failure
            assert state.summary.audited
    for what, value, read in case.numbers:
        check(f"{case.name}: {what}", case.source, value, read(run), case.relative, case.absolute)


def test_paths_of_ropes_that_slide_and_hang(channel):
    """Each state of a path stands for itself: at the load factor 1 it is that of the case."""
    hanging = closed_forms_ropes.hanging("hanging", 100, 0, 105, 2e7, 60).brief
    hanging["actions"].append({"id": "load", "loads": [closed_forms.force_on("m", 0, 0, -3000)]})
    hanging["cases"] = [{"id": "case", "factors": {"always": 1, "load": 1}}]
    slipping = closed_forms_ropes.slips_on().brief
    for brief in (hanging, slipping):
        brief["cases"][0]["path"] = {"to_factor": 1.0, "steps": 4}
        run = talk.run(channel, brief)
        assert run.cases["case"].summary.outcome == stubs.result.CASE_OUTCOME_ANSWERED
        check("path: load factors (-)", "four steps", [0, 0.25, 0.5, 0.75, 1], run.array("case", "path_load_factor"))
        largest = {}
        cables = [cable["id"] for cable in brief["net"]["cables"] for _ in cable["nodes"][1:]]
        for state in ("reference", "case"):
            for cable, tension in zip(cables, run.array(state, "tension_n")):
                largest[state, cable] = max(tension, largest.get((state, cable), 0))
        for cable, tensions in zip(dict.fromkeys(cables), run.array("case", "path_tension_n")):
            ends = [largest["reference", cable], largest["case", cable]]
            check("path: first and last tension (N)", "reference state and case", ends, tensions[[0, -1]], relative=1e-8)
