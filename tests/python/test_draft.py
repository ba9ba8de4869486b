"""The courtyard brief with everything that shape and statics reach: it runs whole, and its numbers are those of another
solve."""

import copy
import json

import numpy as np
import pytest

import stubs
import talk
from report import check

# Largest movement (mm) and its node, and pull of S (kN), with b2 clamped at N; pull of N (kN) with b2 sliding there. With
# b2 clamped the pull of N depends on the tension in its tail, which the other solve does not state.
WORKED = {
    "snow": (324, "n32", 103.2, 100.7),
    "lift": (237, "n21", 143.1, 135.4),
    "snow-factored": (460, "n32", 114.4, 111.3),
    "lift-factored": (351, "n21", 164.9, 155.6),
    "storm": (496, "n31", 115.6, 112.5),
    "hot": (6, "n22", 91.2, 87.6),
}
SOURCE = "own Newton solve with follower pressure in another language, three digits (our own)"


@pytest.fixture(scope="module")
def yard(briefs):
    return json.loads((briefs / "quince-yard-statics.json").read_text())


def by_hand(yard, slides):
    """The cases of the other solve: the bracket rigid, the rope over it clamped or sliding without friction."""
    brief = copy.deepcopy(yard)
    for part in ("factors", "combinations", "diagnosis", "modes"):
        brief.pop(part, None)
    brief["checks"] = []
    next(node for node in brief["net"]["nodes"] if node["id"] == "N")["support"] = {}
    rope = next(cable for cable in brief["net"]["cables"] if cable["id"] == "b2")
    rope.pop("slides")
    if slides:
        rope["slides"] = {"at": ["N"]}
    factors = {
        "snow": {"self": 1, "snow": 1},
        "lift": {"self": 1, "wind-lift": 1},
        "snow-factored": {"self": 1.35, "snow": 1.5},
        "lift-factored": {"self": 1, "wind-lift": 1.5},
        "storm": {"self": 1.35, "snow-west": 1.5, "wind-press": 0.9},
        "hot": {"self": 1, "hot": 1},
    }
    brief["cases"] = [{"id": case, "factors": of} for case, of in factors.items()]
    return brief


def pull(run, case, node):
    return np.linalg.norm(run.at_support(case, "support_force_n", node)) / 1e3


def tensions(run, case, *cables):
    """Least and largest tension in some cables (kN)."""
    ids = run.ids[stubs.result.RANGE_SEGMENT]
    of = [tension for cable, tension in zip(ids, run.array(case, "tension_n")) if cable in cables]
    return [min(of) / 1e3, max(of) / 1e3]


def test_numbers_of_another_solve(channel, yard):
    clamped = talk.run(channel, by_hand(yard, slides=False))
    sliding = talk.run(channel, by_hand(yard, slides=True))
    for what, cables, published in [
        ("carrying", ("c1", "c2", "c3"), [10.3, 21.7]),
        ("bracing", ("b1", "b2", "b3"), [9.9, 20.6]),
        ("edges", ("eSW", "eSE", "eNE", "eNW"), [54.6, 63.5]),
        ("guys", ("gW1", "gW2", "gE1", "gE2"), [104.7, 104.7]),
    ]:
        found = tensions(clamped, "reference", *cables)
        check(f"courtyard, reference: {what} (kN)", SOURCE, published, found, absolute=0.06)
    height = clamped.at_node("reference", "position_m", "n22")[2]
    check("courtyard, reference: height of n22 (m)", SOURCE, 3.62, height, absolute=0.006)
    for case, (moved, node, of_s, of_n_sliding) in WORKED.items():
        summary = clamped.cases[case].summary
        assert summary.largest_movement_node == node
        check(f"courtyard, {case}: movement (mm)", SOURCE, moved, 1e3 * summary.largest_movement_m, absolute=0.6)
        check(f"courtyard, {case}: pull of S (kN)", SOURCE, of_s, pull(clamped, case, "S"), absolute=1.0)
        found = pull(sliding, case, "N")
        check(f"courtyard, {case}: pull of N, b2 sliding (kN)", SOURCE, of_n_sliding, found, absolute=1.0)


def test_it_runs_whole(channel, yard):
    brief = dict(yard, keep={"full": ["reference", "governing"], "envelopes": ["ultimate", "service", "loss"]})
    run = talk.run(channel, brief)
    answered, audited = run.summary.answered, run.summary.audited
    assert answered.count == answered.of == audited.count == audited.of > 190
    # 110 and 55 by the rules. One of the 55, self weight alone, is one of the 110 too; `storm-snow` has a path of its own and
    # shares its case with no rule.
    made = [name for name, case in run.cases.items() if case.summary and name.split("-")[0] in ("ultimate", "service")]
    assert [sum(name.startswith(of) for name in made) for of in ("ultimate", "service")] == [110, 54]
    assert run.summary.verdict == stubs.result.VERDICT_EXCEEDS
    # Every check judged everything that it covers.
    assert [check.not_judged for check in run.summary.checks] == [0] * len(run.summary.checks)
    # Arrays of the reference state and of what governs, to the bit those of a run that keeps all.
    governing = {check.governing_case for check in run.summary.checks} & set(run.cases)
    with_arrays = {name for name, case in run.cases.items() if "position_m" in case.arrays}
    assert with_arrays == governing | {"reference"}
    for set_name in ("ultimate", "service", "loss"):
        assert f"envelope/{set_name}" in run.cases
    whole = talk.run(channel, yard, only=sorted(governing))
    for case in governing:
        for name, array in run.cases[case].arrays.items():
            np.testing.assert_array_equal(array, whole.cases[case].arrays[name])


def test_what_can_not_be_kept(channel, yard):
    for keep, path in [({"full": ["nothing"]}, "keep.full[0]"), ({"envelopes": ["storm-snow"]}, "keep.envelopes[0]")]:
        request = stubs.service.CheckRequest(brief=talk.as_message(dict(yard, keep=keep)))
        parts = stubs.service_grpc.BriefServiceStub(channel).Check(request, timeout=60)
        findings = [finding for part in parts for finding in part.findings]
        assert [finding.path for finding in findings if finding.reason == "UNKNOWN_ID"] == [path]
