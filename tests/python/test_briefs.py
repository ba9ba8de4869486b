"""The example briefs: their numbers, and their way through the formats."""

import json

import pytest
from google.protobuf import json_format

import stubs
import talk
from report import check

# The numbers of the minimal brief come from a Newton solve in another language; digits as given there.
SOURCE = "the minimal brief, own Newton solve in another language (our own)"


def test_minimal_brief_gives_its_numbers(channel, briefs):
    run = talk.run(channel, json.loads((briefs / "first-net.json").read_text()))
    check("first net: crossing (m)", SOURCE, [4.5, 4.5, 1.5], run.at_node("reference", "position_m", "m"), absolute=1e-9)
    check("first net: tensions (N)", SOURCE, [19615.0] * 4, run.array("reference", "tension_n"), absolute=0.5)
    check(
        "first net: unstressed lengths (m)", SOURCE, [6.518677] * 4,
        run.array("reference", "unstressed_length_m"), absolute=5e-7,
    )
    sinks = -run.at_node("full-snow", "displacement_m", "m")[2]
    check("first net under snow: crossing sinks (m)", SOURCE, 0.02259, sinks, absolute=5e-6)
    check(
        "first net under snow: tensions (N)", SOURCE, [24820.0, 24820.0, 14484.0, 14484.0],
        run.array("full-snow", "tension_n"), absolute=0.5,
    )
    assert run.summary.answered.count == run.summary.answered.of == 2
    assert run.summary.audited.count == 2
    assert len(run.summary.cautions) > 0


@pytest.mark.parametrize("name", ["first-net", "quince-yard"])
def test_json_to_binary_to_json(briefs, name):
    text = json.loads((briefs / f"{name}.json").read_text())
    message = talk.as_message(text)
    again = stubs.brief.Brief.FromString(message.SerializeToString(deterministic=True))
    assert again == message
    back = json_format.MessageToDict(
        again, preserving_proto_field_name=True, always_print_fields_with_no_presence=True
    )
    assert json_format.ParseDict(back, stubs.brief.Brief()) == message
    # Nothing of the file is lost: each value of it stands in what came back.
    assert_within(text, back, name)


def assert_within(given, back, where):
    if isinstance(given, dict):
        for key, value in given.items():
            assert key in back, f"{where}.{key} is lost"
            assert_within(value, back[key], f"{where}.{key}")
    elif isinstance(given, list):
        assert len(given) == len(back), where
        for i, (value, other) in enumerate(zip(given, back)):
            assert_within(value, other, f"{where}[{i}]")
    elif isinstance(given, float | int) and not isinstance(given, bool):
        assert float(given) == float(back), where
    else:
        assert given == back, where


def test_json_and_binary_have_one_digest(channel, briefs):
    text = json.loads((briefs / "first-net.json").read_text())
    direct = talk.run(channel, text)
    again = stubs.brief.Brief.FromString(talk.as_message(text).SerializeToString())
    assert talk.run(channel, again).started.digest == direct.started.digest


def test_same_brief_same_bits(channel, briefs):
    """Everything but progress and timing is equal between two runs."""
    text = json.loads((briefs / "first-net.json").read_text())

    def lasting():
        events = talk.run(channel, text).events
        return [
            event.SerializeToString(deterministic=True)
            for event in events
            if event.WhichOneof("event") not in ("progress", "timing")
        ]

    assert lasting() == lasting()


def test_frozen_brief_gives_the_same_state(channel, briefs):
    """Freezing writes coordinates and lengths in; running the frozen brief finds the same reference state."""
    text = json.loads((briefs / "first-net.json").read_text())
    first = talk.run(channel, text)
    stub = stubs.service_grpc.BriefServiceStub(channel)
    frozen, summary = stubs.brief.Brief(), None
    for response in stub.Freeze(stubs.service.FreezeRequest(brief=talk.as_message(text)), timeout=60):
        if response.WhichOneof("part") == "brief":
            frozen.MergeFrom(response.brief)
        elif response.WhichOneof("part") == "summary":
            summary = response.summary
    assert summary.from_digest == first.started.digest
    second = talk.run(channel, frozen)
    assert second.started.frozen
    assert second.started.digest == summary.digest
    for array in ("position_m", "tension_n", "unstressed_length_m"):
        for case in ("reference", "full-snow"):
            before, after = first.array(case, array), second.array(case, array)
            check(f"frozen first net, {case}: {array}", "the brief before freezing", before, after, relative=1e-9, absolute=1e-9)


def test_check_tells_the_brief_as_understood(channel, briefs):
    stub = stubs.service_grpc.BriefServiceStub(channel)
    request = stubs.service.CheckRequest(brief=talk.as_message(json.loads((briefs / "first-net.json").read_text())))
    responses = list(stub.Check(request, timeout=60))
    assert responses[-1].HasField("totals")
    assert responses[-1].totals.cases == 1
    assert responses[-1].totals.sizes.nodes == 5
    errors = [f for r in responses for f in r.findings if f.severity == stubs.finding.FINDING_SEVERITY_ERROR]
    assert errors == []
    assert [c.case for r in responses for c in r.cases] == ["full-snow"]
    assert any(r.resolved for r in responses)
