"""Sends briefs and gathers what comes back."""

from dataclasses import dataclass, field

import numpy as np
from google.protobuf import json_format

import stubs


def as_message(brief):
    """A brief given as JSON-like data, as its message."""
    return json_format.ParseDict(brief, stubs.brief.Brief())


@dataclass
class Case:
    """Arrays of a state by name, and its summary."""

    arrays: dict = field(default_factory=dict)
    summary: object = None
    history: dict = field(default_factory=dict)


class Run:
    """Everything that one `Run` streamed, checked for its promises about order and completeness."""

    def __init__(self, events):
        self.events = list(events)
        self.ids = {}
        self.cases = {}
        self.findings = []
        self.effects = {}
        self.losses = []
        self.started = self.summary = self.timing = None
        parts = {}
        open_case = open_effect = None
        for event in self.events:
            kind = event.WhichOneof("event")
            assert self.summary is None, "nothing follows the summary"
            if kind == "started":
                self.started = event.started
            elif kind == "ids":
                ids = self.ids.setdefault(event.ids.over, [])
                assert event.ids.offset == len(ids)
                ids.extend(event.ids.ids)
            elif kind == "case_begin":
                assert open_case is None, "a case ends before the next begins"
                open_case, open_effect = event.case_begin.case, None
                again = event.case_begin.again
                assert again == (open_case in self.cases), "a case is told twice only where that is said"
                self.cases.setdefault(open_case, Case())
            elif kind == "columns":
                columns = event.columns
                assert columns.case in (open_case, open_effect) or columns.case.split("/")[0] in ("envelope", "motion")
                gathered = parts.setdefault((columns.case, columns.name), [])
                assert columns.offset == len(gathered), f"{columns.name} has a hole"
                gathered.extend(columns.values)
                if len(gathered) == columns.total:
                    array = np.array(gathered)
                    if columns.components > 1:
                        array = array.reshape(-1, columns.components)
                    self.cases.setdefault(columns.case, Case()).arrays[columns.name] = array
                    del parts[columns.case, columns.name]
            elif kind == "case_summary":
                assert event.case_summary.case == open_case
                self.cases[open_case].summary = event.case_summary
                open_case = None
            elif kind == "design_effect":
                assert open_case is None, "an effect follows the cases that it needs"
                open_effect = event.design_effect.id
                self.effects[open_effect] = event.design_effect
            elif kind == "loss_table":
                assert event.loss_table.offset == len(self.losses)
                self.losses.extend(event.loss_table.rows)
            elif kind == "finding":
                self.findings.append(event.finding)
            elif kind == "timing":
                self.timing = event.timing
            elif kind == "summary":
                self.summary = event.summary
        assert not parts, f"arrays left unfinished: {sorted(parts)}"
        assert self.summary is not None, "a stream that ends well has a summary"

    def array(self, case, name):
        """An array of a case."""
        return self.cases[case].arrays[name]

    def at_node(self, case, name, node):
        """An entry of an array over nodes."""
        return self.array(case, name)[self.ids[stubs.result.RANGE_NODE].index(node)]

    def at_support(self, case, name, node):
        """An entry of an array over supports."""
        return self.array(case, name)[self.ids[stubs.result.RANGE_SUPPORT].index(node)]


def run(channel, brief, only=(), timeout=120):
    """Runs a brief, given as a message or as data, to its summary."""
    message = as_message(brief) if isinstance(brief, dict) else brief
    request = stubs.service.RunRequest(brief=message, only=only)
    return Run(stubs.service_grpc.BriefServiceStub(channel).Run(request, timeout=timeout))
