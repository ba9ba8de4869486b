"""What any foreign client relies on: information, errors with details, health, reflection, deadlines, cancelling."""

import json
import time

import grpc
import pytest
from google.rpc import error_details_pb2
from grpc_health.v1 import health_pb2, health_pb2_grpc
from grpc_reflection.v1alpha.proto_reflection_descriptor_database import ProtoReflectionDescriptorDatabase
from grpc_status import rpc_status

import nets
import stubs
import talk
from test_independent_solvers import brief_of


def details(error):
    """The details of a failed call by type."""
    status = rpc_status.from_call(error)
    assert status is not None, f"{error.code()} without details: {error.details()}"
    found = {}
    for any_message in status.details:
        for kind in (error_details_pb2.BadRequest, error_details_pb2.ErrorInfo, error_details_pb2.RetryInfo):
            if any_message.Is(kind.DESCRIPTOR):
                message = kind()
                any_message.Unpack(message)
                found[kind] = message
    return found


def first_net(briefs):
    return json.loads((briefs / "first-net.json").read_text())


def long_brief():
    """Enough cases of a net that takes its time to be interrupted in the middle."""
    brief = brief_of(nets.slack_hammock())
    brief["actions"].append({"id": "more", "loads": [{"nodes": {"on": ["n40"], "force_n": [0.0, 0.0, -1.0]}}]})
    brief["cases"] = [
        {"id": f"case-{i}", "factors": {"all": 1.0 + i / 10_000, "more": 1.0}, "load_steps": 50} for i in range(2_000)
    ]
    return brief


def test_get_info(channel):
    info = stubs.server_grpc.ServerServiceStub(channel).GetInfo(stubs.server.GetInfoRequest(), timeout=10)
    assert info.engine.contract == "ropewalk.v1"
    assert info.engine.version
    assert info.engine.instruction_set
    assert info.limits.request_bytes >= 64 << 20
    assert 0 < info.limits.response_bytes <= 1 << 20
    assert {"net.nodes", "cases", "prestress"} <= set(info.served)
    assert "motions" in info.served and "stages" in info.not_served
    assert info.cautions


def test_errors_come_with_details(channel, briefs):
    brief = first_net(briefs)
    brief["net"]["sections"][0]["axial_stiffness_n"] = -1.0
    brief["net"]["cables"][0]["nodes"] = ["A", "m", "X"]
    with pytest.raises(grpc.RpcError) as raised:
        talk.run(channel, brief)
    assert raised.value.code() == grpc.StatusCode.INVALID_ARGUMENT
    found = details(raised.value)
    info = found[error_details_pb2.ErrorInfo]
    assert (info.domain, info.reason) == ("ropewalk", "BRIEF_HAS_ERRORS")
    assert int(info.metadata["errors"]) >= 2
    assert "Check" in info.metadata["all"]
    violations = found[error_details_pb2.BadRequest].field_violations
    places = [violation.field for violation in violations]
    assert "net.sections[r10].axial_stiffness_n" in places
    assert any('"X"' in violation.description for violation in violations)
    assert all(violation.reason for violation in violations)
    # The engine lives on.
    talk.run(channel, first_net(briefs))


def test_part_that_is_not_served_is_refused_by_name(channel, briefs):
    brief = first_net(briefs)
    brief["workshop"] = {}
    with pytest.raises(grpc.RpcError) as raised:
        talk.run(channel, brief)
    assert raised.value.code() == grpc.StatusCode.INVALID_ARGUMENT
    violations = details(raised.value)[error_details_pb2.BadRequest].field_violations
    assert [v.reason for v in violations if v.field == "workshop"] == ["NOT_SERVED"]


def test_bytes_that_are_no_message(channel):
    call = channel.unary_stream("/ropewalk.v1.BriefService/Run")
    with pytest.raises(grpc.RpcError) as raised:
        list(call(b"\xff\xff\xff\xff", timeout=10))
    assert raised.value.code() == grpc.StatusCode.INVALID_ARGUMENT
    assert details(raised.value)[error_details_pb2.ErrorInfo].reason == "MALFORMED_MESSAGE"


def test_fields_that_the_contract_does_not_have(channel, briefs):
    # Field 999 of the brief, a varint: encoded inside of field 1 of the request.
    brief = talk.as_message(first_net(briefs)).SerializeToString() + b"\xb8\x3e\x01"
    size, length = len(brief), b""
    while size > 127:
        length += bytes([size & 127 | 128])
        size >>= 7
    call = channel.unary_stream("/ropewalk.v1.BriefService/Run")
    with pytest.raises(grpc.RpcError) as raised:
        list(call(b"\x0a" + length + bytes([size]) + brief, timeout=10))
    assert raised.value.code() == grpc.StatusCode.INVALID_ARGUMENT
    assert details(raised.value)[error_details_pb2.ErrorInfo].reason == "UNKNOWN_FIELDS"


def test_health(channel):
    stub = health_pb2_grpc.HealthStub(channel)
    for service in ("", "ropewalk.v1.BriefService", "ropewalk.v1.ServerService"):
        answer = stub.Check(health_pb2.HealthCheckRequest(service=service), timeout=10)
        assert answer.status == health_pb2.HealthCheckResponse.SERVING, service


def test_reflection_by_the_stock_helper(channel):
    database = ProtoReflectionDescriptorDatabase(channel)
    services = set(database.get_services())
    assert {"ropewalk.v1.BriefService", "ropewalk.v1.ServerService", "grpc.health.v1.Health"} <= services
    # A pool of its own, or the stubs' descriptors would answer.
    file = database.FindFileContainingSymbol("ropewalk.v1.BriefService")
    assert file.package == "ropewalk.v1"
    methods = [method.name for service in file.service for method in service.method]
    assert methods == ["Check", "Run", "Freeze"]


def test_deadline_inside_the_stream(channel):
    stub = stubs.service_grpc.BriefServiceStub(channel)
    started = time.monotonic()
    with pytest.raises(grpc.RpcError) as raised:
        list(stub.Run(stubs.service.RunRequest(brief=talk.as_message(long_brief())), timeout=0.7))
    assert raised.value.code() == grpc.StatusCode.DEADLINE_EXCEEDED
    assert time.monotonic() - started < 5.0


def test_cancelling_leaves_the_engine_free(channel, briefs):
    """More cancelled runs than the engine may hold at a time: each must give its place back."""
    stub = stubs.service_grpc.BriefServiceStub(channel)
    limits = stubs.server_grpc.ServerServiceStub(channel).GetInfo(stubs.server.GetInfoRequest(), timeout=10).limits
    request = stubs.service.RunRequest(brief=talk.as_message(long_brief()))
    for _ in range(2 * (limits.running + limits.waiting)):
        stream = stub.Run(request)
        first = next(iter(stream))
        assert first.WhichOneof("event") == "started"
        stream.cancel()
    run = talk.run(channel, first_net(briefs), timeout=30)
    assert run.summary.answered.count == 2
