"""Bad briefs from a foreign client: each gets a precise answer that names place and id, and the engine lives on."""

import copy
import json
import math

import grpc
import pytest
from google.rpc import error_details_pb2

import closed_forms as by_hand
import stubs
import talk
from test_protocol import details


def spoil_nan(brief):
    brief["net"]["nodes"][0]["xyz_m"][2] = "NaN"


def spoil_infinite(brief):
    brief["net"]["sections"][0]["axial_stiffness_n"] = "Infinity"


def spoil_zero_stiffness(brief):
    brief["net"]["sections"][0]["axial_stiffness_n"] = 0.0


def spoil_zero_length(brief):
    brief["prestress"]["rules"] = [{"on": ["carrying", "bracing"], "unstressed_length_m": 0.0}]


def spoil_repeated_id(brief):
    brief["net"]["nodes"].append({"id": "A", "xyz_m": [1, 1, 1], "support": {}})


def spoil_dangling_id(brief):
    brief["prestress"]["rules"][0]["on"].append("braicng")


def spoil_node_used_once(brief):
    brief["net"]["cables"].append({"id": "third", "section": "r10", "nodes": ["A", "lonely"]})
    brief["prestress"]["rules"][0]["on"].append("third")


def spoil_one_node(brief):
    brief["net"]["cables"][1]["nodes"] = ["B"]


def spoil_unsupported(brief):
    for node in brief["net"]["nodes"]:
        del node["support"]


def spoil_no_members(brief):
    brief["net"]["cables"] = []
    brief["prestress"]["rules"] = []
    brief["actions"] = []
    brief["cases"] = []


def spoil_unknown_action(brief):
    brief["cases"][0]["factors"]["rain"] = 1.0


def spoil_factor(brief):
    brief["cases"][0]["factors"]["snow"] = "-Infinity"


def spoil_short_vector(brief):
    brief["actions"][0]["loads"][0]["nodes"]["force_n"] = [0.0, -5000.0]


def spoil_tie(brief):
    brief["prestress"]["rules"].append({"on": ["bracing"], "tension_n": 4000.0})


def spoil_pushing_rope(brief):
    brief["prestress"]["rules"][0]["force_density_n_per_m"] = -3000.0


@pytest.mark.parametrize(
    ("spoil", "reason", "place", "named"),
    [
        (spoil_nan, "NOT_FINITE", "net.nodes[A].xyz_m", "A"),
        (spoil_infinite, "NOT_FINITE", "net.sections[r10].axial_stiffness_n", "r10"),
        (spoil_zero_stiffness, "NOT_POSITIVE", "net.sections[r10].axial_stiffness_n", "r10"),
        (spoil_zero_length, "NOT_POSITIVE", "prestress.rules[0].unstressed_length_m", "unstressed length"),
        (spoil_repeated_id, "DUPLICATE_ID", "net.nodes[", "A"),
        (spoil_dangling_id, "UNKNOWN_ID", "prestress.rules[0].on", "bracing"),
        (spoil_node_used_once, "NODE_USED_ONCE", "net.cables[third].nodes", "lonely"),
        (spoil_one_node, "TOO_FEW_NODES", "net.cables[bracing].nodes", "bracing"),
        (spoil_unsupported, "PART_NOT_HELD", "net", "A"),
        (spoil_no_members, "EMPTY_NET", "net", "cable"),
        (spoil_unknown_action, "UNKNOWN_ID", "cases[full-snow].factors[rain]", "rain"),
        (spoil_factor, "NOT_FINITE", "cases[full-snow].factors[snow]", "snow"),
        (spoil_short_vector, "WRONG_COUNT", "actions[snow].loads[0].nodes.force_n", "2"),
        (spoil_tie, "RULES_TIE", "prestress.rules", "bracing"),
        (spoil_pushing_rope, "CABLE_PUSHES", "prestress.rules[0].force_density_n_per_m", "carrying"),
    ],
    ids=lambda value: value.__name__ if callable(value) else "",
)
def test_refused_with_place_and_id(channel, briefs, spoil, reason, place, named):
    good = json.loads((briefs / "first-net.json").read_text())
    bad = copy.deepcopy(good)
    spoil(bad)
    with pytest.raises(grpc.RpcError) as raised:
        talk.run(channel, bad)
    assert raised.value.code() == grpc.StatusCode.INVALID_ARGUMENT
    violations = details(raised.value)[error_details_pb2.BadRequest].field_violations
    told = [(v.reason, v.field, v.description) for v in violations]
    assert any(r == reason and f.startswith(place) and named in d for r, f, d in told), told
    # The same through `Check`, which ends well and tells the cure.
    request = stubs.service.CheckRequest(brief=talk.as_message(bad))
    findings = [
        f
        for response in stubs.service_grpc.BriefServiceStub(channel).Check(request, timeout=30)
        for f in response.findings
    ]
    found = [f for f in findings if f.reason == reason and f.path.startswith(place)]
    assert found
    assert all(f.severity == stubs.finding.FINDING_SEVERITY_ERROR and f.message and f.cure for f in found)
    assert talk.run(channel, good).summary.answered.count == 2


def test_thousands_of_errors_fit_a_header(channel, briefs):
    brief = json.loads((briefs / "first-net.json").read_text())
    brief["net"]["sections"] = [{"id": f"s{i}", "axial_stiffness_n": -1.0} for i in range(5_000)]
    with pytest.raises(grpc.RpcError) as raised:
        talk.run(channel, brief)
    found = details(raised.value)
    assert found[error_details_pb2.BadRequest].ByteSize() <= 6 * 1024
    assert int(found[error_details_pb2.ErrorInfo].metadata["errors"]) >= 5_000
    reasons = {v.reason for v in found[error_details_pb2.BadRequest].field_violations}
    assert {"NOT_POSITIVE", "UNKNOWN_ID"} <= reasons


def outcome_of(channel, brief):
    """The reference state of a brief that is valid, with its outcome."""
    return talk.run(channel, brief).cases["reference"].summary


def test_mechanism_is_named(channel):
    """A mast between two guys in one plane, its foot above their anchors: nothing holds the head across the plane.

    Out of the plane the head has the stiffness 2 T / l of the guys less N / h of the mast, and N / h is the larger one.
    """
    brief = by_hand.brief(
        [
            by_hand.node("foot", 0, 0, 0.5, support={}), by_hand.node("head", 0, 0, 5),
            by_hand.node("west", -4, 0, 0, support={}), by_hand.node("east", 4, 0, 0, support={}),
        ],
        [by_hand.rope("a", "west", "head"), by_hand.rope("b", "east", "head")],
        [{"on": ["a", "b"], "tension_n": 5e3}, {"on": ["mast"], "balance": {}}],
        sections=[{"id": "rope", "axial_stiffness_n": by_hand.EA}, {"id": "tube", "axial_stiffness_n": 5e8}],
        struts=[{"id": "mast", "section": "tube", "nodes": ["foot", "head"]}],
        hold=["head"],
    )
    summary = outcome_of(channel, brief)
    assert summary.outcome == stubs.result.CASE_OUTCOME_NO_EQUILIBRIUM
    assert "head" in summary.failure.nodes
    assert {"a", "b", "mast"} & set(summary.failure.members)
    assert summary.failure.reason and summary.failure.message and summary.failure.cure


def test_load_on_a_slack_start_is_answered(channel):
    """A rope 5 % too long, loaded at its middle: V of two straight halves."""
    l0, half, load, ea = 5.25, 5.0, 8e3, by_hand.EA
    brief = by_hand.brief(
        [by_hand.node("A", 0, 0, 0, support={}), by_hand.node("m", 5, 0, 0), by_hand.node("B", 10, 0, 0, support={})],
        [by_hand.rope("a", "A", "m"), by_hand.rope("b", "m", "B")],
        [by_hand.length_of("a", l0), by_hand.length_of("b", l0)],
        always=[by_hand.force_on("m", 0, 0, -load)],
    )
    run = talk.run(channel, brief)
    assert run.cases["reference"].summary.outcome == stubs.result.CASE_OUTCOME_ANSWERED
    depth = by_hand.root(
        0.1, 5.0, lambda d: 2 * ea * (math.hypot(half, d) / l0 - 1) * d / math.hypot(half, d) - load
    )
    assert abs(run.at_node("reference", "position_m", "m")[2] + depth) < 1e-8


@pytest.mark.parametrize("stiffness", [1e300, 1e-300])
def test_absurd_stiffness_gets_an_answer_or_a_reason(channel, briefs, stiffness):
    brief = json.loads((briefs / "first-net.json").read_text())
    brief["net"]["sections"][0]["axial_stiffness_n"] = stiffness
    try:
        run = talk.run(channel, brief)
    except grpc.RpcError as refused:
        assert refused.code() == grpc.StatusCode.INVALID_ARGUMENT
        violations = details(refused)[error_details_pb2.BadRequest].field_violations
        assert any("r10" in v.description and v.field.startswith("net.sections[r10]") for v in violations)
        return
    for case in run.cases.values():
        for name, values in case.arrays.items():
            assert all(map(math.isfinite, values.ravel())), name
        if case.summary is not None and case.summary.outcome != stubs.result.CASE_OUTCOME_ANSWERED:
            assert case.summary.failure.reason and case.summary.failure.message


def test_a_ring_that_runs_to_the_end_of_its_rope_is_named(channel):
    # A lamp on a taut line, pushed along it without its weight: nothing stops it before the anchor.
    brief = {
        "id": "lamp",
        "net": {
            "nodes": [{"id": "A", "xyz_m": [0, 0, 3], "support": {}}, {"id": "B", "xyz_m": [10, 0, 3], "support": {}}],
            "sections": [{"id": "r6", "axial_stiffness_n": 2e6}],
            "cables": [{"id": "line", "section": "r6", "nodes": ["A", "lamp", "B"], "slides": {}}],
        },
        "prestress": {"under": ["weight"], "rules": [{"on": ["line"], "force_density_n_per_m": 2000}]},
        "actions": [
            {"id": "weight", "loads": [{"nodes": {"on": ["lamp"], "force_n": [0, 0, -300]}}]},
            {"id": "push", "loads": [{"nodes": {"on": ["lamp"], "force_n": [500, 0, 0]}}]},
        ],
        "cases": [
            {"id": "pushed", "factors": {"push": 1}}, {"id": "pushed-much", "factors": {"weight": 1, "push": 0.1}},
            {"id": "pushed-little", "factors": {"weight": 1, "push": 0.005}},
        ],
    }
    run = talk.run(channel, brief)
    # At B the rope holds the lamp if it can bear what is left there of push H, weight W and its own pull T, about 9.6 kN:
    # (T - H)^2 + W^2 <= T^2. It can for 50 N along the rope, and not for 2.5 N: then the weight keeps the lamp on the line.
    for case in ("pushed", "pushed-much"):
        failure = run.cases[case].summary.failure
        assert 'nothing stops "lamp" from running along "line" to "B"' in failure.message
        assert "clamp the rope" in failure.cure
        assert "lamp" in failure.nodes and "gave up, not the net" not in failure.message
    assert run.cases["pushed-little"].summary.audited


def blown(pressure):
    """A square of soft ropes under a cloth, rim fixed, under suction (Pa)."""
    n = 4
    inner = range(1, n)
    rim = [(i, j) for i in inner for j in (0, n)] + [(i, j) for i in (0, n) for j in inner]
    ropes = {f"a{i}": [f"n{i}{j}" for j in range(n + 1)] for i in inner}
    ropes |= {f"b{i}": [f"n{j}{i}" for j in range(n + 1)] for i in inner}
    return {
        "id": "blown",
        "net": {
            "nodes": [{"id": f"n{i}{j}", "xyz_m": [2 * i, 2 * j, 0], "support": {}} for i, j in rim],
            "sections": [{"id": "soft", "axial_stiffness_n": 5e3}],
            "cables": [{"id": rope, "section": "soft", "nodes": nodes} for rope, nodes in ropes.items()],
            "skins": [{"id": "cloth", "between": list(ropes)}],
        },
        "prestress": {"rules": [{"on": list(ropes), "force_density_n_per_m": 50}]},
        "actions": [{"id": "blow", "loads": [{"on_surface": {"pressure_pa": pressure, "coefficients": {"cloth": -1}}}]}],
        "cases": [{"id": "blown", "factors": {"blow": 1}}],
    }


def test_pressure_that_no_net_holds_keeps_the_last_good_share(channel):
    # Pressure works like the cube of the size, ropes resist like its square: beyond some pressure nothing holds.
    held = talk.run(channel, blown(400.0)).cases["blown"].summary
    assert held.audited and held.largest_movement_m > 1
    burst = talk.run(channel, blown(5000.0)).cases["blown"].summary
    assert 0.0 < burst.load_factor < 1.0 and not burst.failure.message == ""
    assert "Last good state kept" in burst.failure.message and "gave up, not the net" not in burst.failure.message
