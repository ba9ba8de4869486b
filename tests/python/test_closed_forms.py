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
