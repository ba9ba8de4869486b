"""What clients of motions rely on: the same bits, deadlines, cancelling, sizes of messages, refusals that name the size."""

import time

import grpc
import numpy as np
import pytest
from google.rpc import error_details_pb2

import motions
import nets
import stubs
import talk
from engine import Engine
from motions import AVERAGE, CONSERVING, EXPLICIT, asked, movement, watch
from test_independent_solvers import brief_of as net_brief
from test_motions import bead, follow, moved
from test_motions_net import brief, start
from test_protocol import details


def busy_brief():
    """Two motions of a net with snatches: one of each kind of thing that is told."""
    net, mass, velocity = nets.thrown(2.0, 1e-3)
    given = brief(net, mass)
    shown = {"nodes": [f"n{k}" for k in net.free], "ropes": ["c3", "c7"]}
    given["motions"] = [
        asked("one", CONSERVING, 0.5, 5e-4, 10, start=start(net, velocity), **shown, spectra={"from_s": 0.1},
              watched=watch(u=movement("n5", 0, 0, 1), T={"largest_tension": "c3"})),
        asked("two", {"generalised_alpha": {"error_m": 1e-6}}, 0.3, 1e-3, start=start(net, velocity), **shown),
    ]
    return given


def call(channel, given, only=()):
    request = stubs.service.RunRequest(brief=talk.as_message(given), only=only)
    return stubs.service_grpc.BriefServiceStub(channel).Run(request, timeout=120)


def of_motion(events, name):
    """The bytes of all that is told of a motion."""
    kept = []
    for event in events:
        kind = event.WhichOneof("event")
        if (kind == "motion" and event.motion.motion == name) or (
            kind == "columns" and event.columns.case == f"motion/{name}"
        ):
            kept.append(event.SerializeToString(deterministic=True))
    return kept


def lasting(events):
    """The bytes of all events but progress and times."""
    return [
        event.SerializeToString(deterministic=True) for event in events
        if event.WhichOneof("event") not in ("progress", "timing")
    ]


def test_same_request_same_bits(channel):
    given = busy_brief()
    first = list(call(channel, given))
    assert len(of_motion(first, "one")) > 100
    assert lasting(first) == lasting(call(channel, given))

    # A reader that takes its time gets the same.
    slow = []
    for k, event in enumerate(call(channel, given)):
        slow.append(event)
        if k % 20 == 0:
            time.sleep(0.02)
    assert lasting(first) == lasting(slow)

    # So does one who asks for one of the motions alone.
    for name in ("one", "two"):
        alone = list(call(channel, given, only=[name]))
        assert of_motion(alone, name) == of_motion(first, name)
        assert list(motions.read(talk.Run(alone))) == [name]


@pytest.mark.parametrize("threads", ["1", "3"])
def test_same_bits_with_any_number_of_threads(channel, threads):
    given = busy_brief()
    with Engine("--threads", threads) as other, grpc.insecure_channel(other.address) as elsewhere:
        theirs = list(call(elsewhere, given))
    ours = list(call(channel, given))
    for name in ("one", "two"):
        assert of_motion(ours, name) == of_motion(theirs, name)


def test_motions_run_only_where_named(channel):
    given = busy_brief()
    given["cases"] = [{"id": "bare", "factors": {}}]
    told = motions.read(talk.run(channel, given, only=["bare"]))
    assert told == {}


def endless():
    net, mass, velocity = nets.thrown(2.0, 1e-3)
    given = brief(net, mass)
    given["motions"] = [asked("endless", CONSERVING, 1e4, 1e-3, 1000, start=start(net, velocity))]
    return given


def short(channel):
    given, omega, _ = bead()
    follow(channel, given, [asked("short", AVERAGE, 0.1, 1e-3, start=moved([0, 1e-4, 0]))])


def frames_until(stream, wanted):
    for event in stream:
        if event.WhichOneof("event") == "motion" and event.motion.WhichOneof("part") == "frame":
            wanted -= 1
            if wanted == 0:
                return


def test_a_long_motion_is_cancelled(channel):
    # Calls that may run at a time are few: were they not given back, the last would not be answered.
    for _ in range(6):
        stream = call(channel, endless())
        frames_until(stream, 3)
        stream.cancel()
        with pytest.raises(grpc.RpcError) as raised:
            list(stream)
        assert raised.value.code() == grpc.StatusCode.CANCELLED
    short(channel)


def test_a_deadline_ends_a_long_motion(channel):
    request = stubs.service.RunRequest(brief=talk.as_message(endless()))
    stream = stubs.service_grpc.BriefServiceStub(channel).Run(request, timeout=1.0)
    frames = 0
    with pytest.raises(grpc.RpcError) as raised:
        for event in stream:
            frames += event.WhichOneof("event") == "motion"
    assert raised.value.code() == grpc.StatusCode.DEADLINE_EXCEEDED
    assert frames > 0
    short(channel)


@pytest.mark.parametrize(("scheme", "step"), [(AVERAGE, 1e-9), (CONSERVING, 1e-9), (EXPLICIT, 1e-9)])
def test_too_many_steps_are_refused(channel, scheme, step):
    given, _, _ = bead()
    given["motions"] = [asked("huge", scheme, 1.0, step, 1_000_000)]
    with pytest.raises(grpc.RpcError) as raised:
        list(call(channel, given))
    assert raised.value.code() == grpc.StatusCode.INVALID_ARGUMENT
    found = details(raised.value)[error_details_pb2.BadRequest].field_violations
    assert any(v.field.startswith("motions[huge]") for v in found), found
    # The size as it would be, and what is allowed.
    words = " ".join(v.description for v in found)
    assert any(size in words for size in ("1000000000", "1e9", "1e+09", "1 000 000 000")), words


def test_a_large_net_shown_whole_comes_in_small_messages(channel):
    xyz, held, ends = nets._grid(60, 60, lambda i, j: (1.0 * i, 1.0 * j, 0.002 * ((i - 30) ** 2 - (j - 30) ** 2)))
    length = np.linalg.norm(xyz[ends[:, 1]] - xyz[ends[:, 0]], axis=1)
    net = nets.Net(xyz, held, ends, length / 1.004, np.full(len(ends), 5e6), np.zeros_like(xyz))
    given = net_brief(net)
    given["prestress"]["under"], given["actions"] = [], []
    for section in given["net"]["sections"]:
        section["mass_kg_per_m"] = 1.0
    nodes, ropes = [f"n{k}" for k in range(len(xyz))], [f"c{e}" for e in range(len(ends))]
    given["motions"] = [asked("whole", AVERAGE, 0.02, 2e-3, nodes=nodes, ropes=ropes, start={
        "velocities": [{"on": [f"n{net.free[100]}"], "velocity_m_per_s": [0.0, 0.0, 2.0]}]})]
    run = talk.run(channel, given)
    sizes = [event.ByteSize() for event in run.events]
    assert max(sizes) < 1 << 20, max(sizes)
    motion = motions.read(run)["whole"]
    assert motion.position.shape == (11, len(xyz), 3) and len(motion.ropes) == len(ends)
    # What is told twice agrees: ends of ropes are nodes, tension follows from positions.
    for e in (0, 777, len(ends) - 1):
        field = motion.ropes[f"c{e}"]
        i, j = ends[e]
        assert np.array_equal(field.position[:, 0], motion.position[:, i])
        assert np.array_equal(field.velocity[:, 1], motion.velocity[:, j])
        stretch = np.linalg.norm(motion.position[:, j] - motion.position[:, i], axis=1) / net.unstressed[e]
        assert np.allclose(field.stretch[:, 0], stretch, rtol=1e-12)
        assert np.allclose(field.tension[:, 0], 5e6 * (stretch - 1), atol=1e-4)
    frames = [e.motion.frame for e in run.events
              if e.WhichOneof("event") == "motion" and e.motion.WhichOneof("part") == "frame"]
    print(f"{len(xyz)} nodes, {len(ends)} ropes: {len(frames)} messages for 11 frames, largest {max(sizes)} bytes")
