"""A net that is thrown, so that its ropes go slack and snatch: beside SciPy, and its energy over long times."""

from functools import cache

import numpy as np
import pytest

import motions
import nets
import stubs
from motions import SCHEMES, asked, check_order
from moving import Thrown
from report import check
from test_independent_solvers import brief_of
from test_motions import follow

SOURCE = "SciPy's DOP853, rtol 1e-11, stopped and begun anew at each bend that its events find"
SLACK = stubs.motion_result.MOTION_EVENT_KIND_SLACK
SNATCH = stubs.motion_result.MOTION_EVENT_KIND_SNATCH


def brief(net, mass):
    given = brief_of(net)
    for k, kilograms in zip(net.free, mass, strict=True):
        given["net"]["nodes"][k]["attached_mass_kg"] = float(kilograms)
    return given


def start(net, velocity):
    throw = [
        {"on": [f"n{k}"], "velocity_m_per_s": [float(c) for c in v]}
        for k, v in zip(net.free, velocity, strict=True)
    ]
    return {"velocities": throw}


TIMES = np.arange(0.0, 1.01, 0.05)


@cache
def beside():
    """Positions at `TIMES`, and the moments at which segments went slack or taut."""
    thrown = Thrown(*nets.thrown(0.7, 1.6e-3))
    return thrown, thrown.follow(TIMES)


def test_two_independent_integrators_agree():
    thrown, x = beside()
    other = Thrown(*nets.thrown(0.7, 1.6e-3))
    check("positions (m)", "SciPy's RK45, rtol 1e-8, in place of DOP853", x, other.follow(TIMES, 1e-8, "RK45"),
          absolute=1e-6)
    assert [event[1:] for event in other.events] == [event[1:] for event in thrown.events]
    assert sum(taut for _, _, taut in thrown.events) > 25, "many snatches"


@pytest.mark.parametrize("name", ["average", "conserving", "explicit"])
def test_thrown_net_beside_scipy(channel, name):
    thrown, exact = beside()
    net = thrown.net
    shown = [f"n{k}" for k in net.free]
    steps = [2e-4, 1e-4, 5e-5, 2.5e-5]
    told = follow(channel, brief(net, thrown.mass), [
        asked(f"{h}", SCHEMES[name], TIMES[-1], h, round(0.05 / h), nodes=shown, start=start(net, thrown.velocity))
        for h in steps
    ])
    runs = [told[f"{h}"] for h in steps]
    for motion in runs:
        assert np.allclose(motion.time, TIMES, rtol=0, atol=1e-12)
    off = [np.linalg.norm(motion.position - exact, axis=(1, 2)) for motion in runs]

    # As long as nothing has gone slack the forces are smooth, and the error falls with the square of the step.
    smooth = [k for k, t in enumerate(TIMES) if 0.0 < t < thrown.events[0][0]]
    assert smooth
    for k in smooth:
        check_order(f"{name}: positions at {TIMES[k]:.2f} s", [errors[k] for errors in off])
    # Then each bend within a step costs up to the square of the step as well, at a place within the step that no halving
    # keeps: what is off is no more than what the last halvings still moved.
    halved = [
        np.linalg.norm(coarse.position - fine.position, axis=(1, 2)) for coarse, fine in zip(runs, runs[1:])
    ]
    print(f"{name}: off {off[-1]}\nhalved {halved[-1]}")
    assert np.all(off[-1] <= np.maximum(halved[-1], halved[-2]) + 1e-8)
    check(f"{name}: positions up to the end (m)", SOURCE, exact, runs[-1].position,
          absolute=halved[-1].max())

    # Events: as far as both tell the same ones in the same order, each within a step.
    events = [(e.time_s, e.segment, e.kind == SNATCH) for e in runs[-1].events]
    assert all(e.kind in (SLACK, SNATCH) for e in runs[-1].events)
    assert all((e.member, e.to, getattr(e, "from")) == _segment(net, e.segment) for e in runs[-1].events)
    early = [event for event in thrown.events if event[0] < 0.8]
    assert len(early) > 40
    # Two that are nearer to each other than a step may change places.
    ours = sorted(events[: len(early)], key=lambda event: event[1:])
    theirs = sorted(early, key=lambda event: event[1:])
    assert [event[1:] for event in ours] == [event[1:] for event in theirs]
    check(f"{name}: times of the first {len(early)} events (s)", SOURCE, [event[0] for event in theirs],
          [event[0] for event in ours], absolute=steps[-1])
    taut = np.array([event[2] for event in thrown.events])
    counts = [runs[-1].end.slackenings, runs[-1].end.snatches]
    check(f"{name}: segments that went slack, came taut", SOURCE, [np.sum(~taut), np.sum(taut)], counts,
          absolute=0.0)


def _segment(net, e):
    i, j = net.ends[e]
    return f"c{e}", f"n{j}", f"n{i}"


@pytest.mark.parametrize("h", [1e-3, 5e-3])
def test_energy_is_conserved_through_thousands_of_snatches(channel, h):
    net, mass, velocity = nets.thrown(3.0, 5e-4)
    given = brief(net, mass)
    # Half of the loads act throughout; more is put on at once, and its work is told apart.
    given["actions"].append({"id": "push", "loads": [{"nodes": {"on": ["n5", "n9"], "force_n": [10.0, -5.0, 30.0]}}]})
    shown = [f"n{k}" for k in net.free]
    motion = follow(channel, given, [
        asked("long", motions.CONSERVING, 12_000 * h, h, 20, nodes=shown, start=start(net, velocity),
              driven=[{"action": "push", "constant": 1.0}]),
    ])["long"]
    energy = motion.energy
    total = energy["kinetic"][0] + energy["elastic"][0]
    print(f"step {h}: {motion.end.snatches} snatches, drift {np.abs(energy['error']).max() / total:.1e} of {total} J, "
          f"smallest step {motion.end.smallest_step_s}")
    assert motion.end.snatches >= 3000
    check(f"step {h}: drift over the total", "energy is conserved", np.zeros(len(motion.time)),
          energy["error"] / total, absolute=1e-9)
    assert motion.end.largest_error_j <= 1e-9 * total
    _check_ledger(f"step {h}", motion, net, mass, total)
    pushed = np.array([f"n{k}" in ("n5", "n9") for k in net.free])
    work = (motion.position - motion.position[0])[:, pushed].sum(axis=1) @ np.array([10.0, -5.0, 30.0])
    check(f"step {h}: work of what is driven (J)", "force times way", work, energy["work"], absolute=1e-9 * total)


def _check_ledger(name, motion, net, mass, total):
    """The ledger's energies anew from positions and velocities; what rounding leaves in lengths counts elastically."""
    energy = motion.energy
    kinetic = 0.5 * np.sum(mass[:, None] * motion.velocity**2, axis=(1, 2))
    spans = np.array([net.spans(x) for x in motion.position])
    excess = np.maximum(0.0, np.linalg.norm(spans, axis=2) - net.unstressed)
    elastic = 0.5 * excess**2 @ net.stiffness
    potential = -np.sum(net.pull * (motion.position - motion.position[0]), axis=(1, 2))
    for part, value in (("kinetic", kinetic), ("elastic", elastic), ("potential", potential)):
        check(f"{name}: {part} energy (J)", "anew from positions and velocities", value, energy[part],
              absolute=1e-11 * total)
    slack = np.sum(np.linalg.norm(spans, axis=2) <= net.unstressed, axis=1)
    check(f"{name}: slack segments", "anew from positions", slack, motion.slack, absolute=0.0)
    whole = sum(energy[part] for part in ("kinetic", "elastic", "potential"))
    told = whole - whole[0] - energy["work"] + energy["dissipated"] + energy["released"]
    check(f"{name}: error of the ledger (J)", "its own equation", told, energy["error"], absolute=1e-11 * total)


@pytest.mark.parametrize("name", ["average", "conserving", "explicit"])
def test_ledger_with_all_that_takes_and_gives(channel, name):
    net, mass, velocity = nets.thrown(1.0, 1e-3)
    given = brief(net, mass)
    given["actions"].append({"id": "push", "loads": [{"nodes": {"on": ["n5"], "force_n": [10.0, -5.0, 80.0]}}]})
    harmonic = {"action": "push", "harmonic": {"amplitude": 1.0, "frequency_hz": 3.0}}
    damping = {"factors": {"mass_per_s": 0.4, "stiffness_s": 2e-5},
               "ropes": [{"on": [f"c{e}" for e in range(len(net.ends))], "force_per_strain_rate_n_s": 30.0}]}
    steps = [1e-4, 5e-5]
    told = follow(channel, given, [
        asked(f"{h}", SCHEMES[name], 0.5, h, round(1e-3 / h), nodes=[f"n{k}" for k in net.free],
              start=start(net, velocity), driven=[harmonic], damping=damping,
              breaks=[{"member": "c7", "at_s": 0.2, "release_s": 0.05}])
        for h in steps
    ])
    total = told["5e-05"].energy["kinetic"][0] + told["5e-05"].energy["elastic"][0]
    errors = [np.abs(told[f"{h}"].energy["error"]).max() / total for h in steps]
    print(f"{name}: error of the ledger over the total {errors}")
    for h in steps:
        energy = told[f"{h}"].energy
        whole = sum(energy[part] for part in ("kinetic", "elastic", "potential"))
        left = whole - whole[0] - energy["work"] + energy["dissipated"] + energy["released"]
        check(f"{name}, {h}: error of the ledger (J)", "its own equation", left, energy["error"],
              absolute=1e-11 * total)
        assert np.all(np.diff(energy["dissipated"]) >= -1e-9 * total), "damping only takes"
        assert energy["dissipated"][-1] > 0.01 * total and energy["released"][-1] > 0.0
        # Work of the driven force by Simpson's rule over frames at every tenth step, from velocities.
        motion = told[f"{h}"]
        force = np.sin(6 * np.pi * motion.time)[:, None] * np.array([10.0, -5.0, 80.0])
        power = np.sum(force * motion.speed("n5"), axis=1)
        work = np.concatenate([[0.0], np.cumsum(np.diff(motion.time) * (power[1:] + power[:-1]) / 2)])
        check(f"{name}, {h}: work of the harmonic force (J)", "integral of force times velocity", work,
              energy["work"], absolute=2e-3 * np.abs(power).max() * 0.5)
    if name == "conserving":
        assert errors[-1] < 1e-9
    else:
        assert errors[1] < 0.6 * errors[0], "what the steps make falls with them"


@pytest.mark.parametrize("which", ["set 1", "set 2"])
def test_scipy_meets_the_closed_form(which):
    # The independent solver itself, before anything is held against it. (The strings of set 3 touch their stress-free
    # length at each passage and never go slack: an event that is none.)
    _, expected, source = motions.file("pub-20-mass-on-two-strings")
    given = expected[which]
    half, exact = given["half_span"], given["period_exact"]
    xyz = np.array([[-half, 0, 0], [0, given["amplitude"], 0], [half, 0, 0]])
    net = nets.Net(xyz, np.array([True, False, True]), np.array([[0, 1], [1, 2]]), np.full(2, given["L0"]),
                   np.full(2, given["EA"]), np.zeros((3, 3)))
    thrown = Thrown(net, np.array([given["mass"]]), np.zeros((1, 3)))
    x = thrown.follow(exact * np.array([0.0, 0.25, 0.5, 1.0, 1.5]), 1e-12)[:, 0, 1]
    amplitude = given["amplitude"]
    # At a quarter the mass passes zero at its largest speed: a period off by 1e-6 of it shows as 2e-6 of the amplitude.
    check(f"{which}: passages and turns (m)", source, amplitude * np.array([1, 0, -1, 1, -1]), x,
          absolute=4e-6 * amplitude)
