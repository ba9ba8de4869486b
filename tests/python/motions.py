"""Asks for motions and gathers what is told of them: frames joined, histories as arrays."""

import json
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

import stubs

DATA = Path(__file__).resolve().parents[1] / "verification/data"

AVERAGE = {"generalised_alpha": {"spectral_radius": 1.0}}
CONSERVING = {"energy_conserving": {}}
EXPLICIT = {"central_differences": {}}
SCHEMES = {"average": AVERAGE, "conserving": CONSERVING, "explicit": EXPLICIT}

ENERGIES = [energy.name for energy in stubs.motion_result.EnergyLedger.DESCRIPTOR.fields]


# What is told ---------------------------------------------------------------------------------------------------------

@dataclass
class Rope:
    """A shown rope: points along it, and its history over frames, points and components."""

    material: np.ndarray
    nodes: list
    position: np.ndarray = None
    velocity: np.ndarray = None
    stretch: np.ndarray = None
    tension: np.ndarray = None


@dataclass
class Motion:
    """A motion as it was told; arrays over frames first."""

    id: str
    begin: object = None
    end: object = None
    nodes: list = field(default_factory=list)
    ropes: dict = field(default_factory=dict)
    units: dict = field(default_factory=dict)
    in_words: dict = field(default_factory=dict)
    waves: dict = field(default_factory=dict)
    events: list = field(default_factory=list)
    spectra: dict = field(default_factory=dict)
    arrays: dict = field(default_factory=dict)
    step: np.ndarray = None
    time: np.ndarray = None
    slack: np.ndarray = None
    energy: dict = field(default_factory=dict)
    watched: dict = field(default_factory=dict)
    position: np.ndarray = None
    velocity: np.ndarray = None

    def at(self, node):
        """Positions of a shown node over the frames (m)."""
        return self.position[:, self.nodes.index(node)]

    def speed(self, node):
        """Velocities of a shown node over the frames (m/s)."""
        return self.velocity[:, self.nodes.index(node)]

    def moved(self, node):
        """Movement of a shown node from the first frame (m)."""
        return self.at(node) - self.at(node)[0]


ORDER = ["begin", "shown", "waves", "frame", "events", "spectrum", "end"]


def read(run):
    """The motions of a run by id, checked for what the contract promises about order and completeness."""
    order, motions, parts, frames, place = [], {}, {}, {}, {}
    is_open = None
    for event in run.events:
        kind = event.WhichOneof("event")
        if kind == "case_begin":
            assert not order, "motions follow all cases"
        if kind == "columns" and event.columns.case.startswith("motion/"):
            assert event.columns.case == f"motion/{is_open}", "arrays stand within their motion"
            place[is_open] = "arrays"
        if kind != "motion":
            continue
        told = event.motion
        part = told.WhichOneof("part")
        assert part, "a part that says nothing"
        if told.motion != is_open:
            assert is_open is None and told.motion not in motions, "each motion comes in one piece"
            is_open = told.motion
            order.append(is_open)
            motions[is_open] = Motion(is_open)
            frames[is_open] = []
        motion = motions[is_open]
        assert place.get(is_open) != "arrays" or part == "end", f"{part} after arrays"
        before = place.get(is_open, "begin")
        if before != "arrays":
            assert ORDER.index(part) >= ORDER.index(before), f"{part} after {before}"
        place[is_open] = part
        value = getattr(told, part)
        if part == "begin":
            assert motion.begin is None
            motion.begin = value
        elif part == "shown":
            motion.nodes += value.nodes
            for rope in value.ropes:
                motion.ropes[rope.cable] = Rope(np.array(rope.material_m), list(rope.nodes))
            for quantity in value.watched:
                motion.units[quantity.id] = quantity.unit
                motion.in_words[quantity.id] = quantity.in_words
        elif part == "waves":
            motion.waves |= {rope.cable: rope for rope in value.ropes}
        elif part == "frame":
            _add_frame(frames[is_open], value)
        elif part == "events":
            motion.events += value.events
        elif part == "spectrum":
            motion.spectra[value.watched] = value
        elif part == "end":
            motion.end = value
            is_open = None
    assert is_open is None, f"{is_open} has no end"
    for motion in motions.values():
        _join(motion, frames[motion.id])
        motion.arrays = run.cases[f"motion/{motion.id}"].arrays if f"motion/{motion.id}" in run.cases else {}
        if motion.end.outcome == stubs.motion_result.MOTION_OUTCOME_FINISHED:
            assert not motion.end.HasField("failure")
            assert len(motion.time) == motion.begin.frames
            assert motion.step[-1] == motion.begin.steps
        else:
            assert motion.end.HasField("failure"), "a motion that did not finish tells why"
    return motions


def _add_frame(frames, told):
    if told.continues:
        last = frames[-1]
        assert (told.step, told.time_s) == (last["step"], last["time"]) or not (told.step or told.time_s)
        assert not told.watched
    else:
        last = {
            "step": told.step, "time": told.time_s, "slack": told.slack_segments,
            "energy": [getattr(told.energy, name) for name in ENERGIES], "watched": list(told.watched),
            "position": [], "velocity": [], "ropes": {},
        }
        frames.append(last)
    last["position"] += told.positions_m
    last["velocity"] += told.velocities_m_per_s
    for part in told.ropes:
        rope = last["ropes"].setdefault(part.rope, {"position": [], "velocity": [], "stretch": [], "tension": []})
        assert 3 * getattr(part, "from") == len(rope["position"]), "a rope without holes"
        rope["position"] += part.positions_m
        rope["velocity"] += part.velocities_m_per_s
        rope["stretch"] += part.stretch
        rope["tension"] += part.tension_n


def _join(motion, frames):
    n, shown = len(frames), len(motion.nodes)
    gather = lambda key: np.array([frame[key] for frame in frames])  # noqa: E731
    motion.step, motion.time, motion.slack = gather("step"), gather("time"), gather("slack")
    assert np.all(np.diff(motion.step.astype(float)) > 0)
    energies = gather("energy").reshape(n, len(ENERGIES))
    motion.energy = {name.removesuffix("_j"): energies[:, k] for k, name in enumerate(ENERGIES)}
    watched = gather("watched").reshape(n, len(motion.units))
    motion.watched = {name: watched[:, k] for k, name in enumerate(motion.units)}
    motion.position = gather("position").reshape(n, shown, 3)
    motion.velocity = gather("velocity").reshape(n, shown, 3)
    for number, rope in enumerate(motion.ropes.values()):
        points = len(rope.material)
        assert len(rope.nodes) == points
        take = lambda key: np.array([frame["ropes"][number][key] for frame in frames])  # noqa: B023, E731
        rope.position = take("position").reshape(n, points, 3)
        rope.velocity = take("velocity").reshape(n, points, 3)
        rope.stretch = take("stretch").reshape(n, points - 1)
        rope.tension = take("tension").reshape(n, points - 1)


# What is asked --------------------------------------------------------------------------------------------------------

def movement(node, *along):
    """A watched movement, to be given an id by `watch`."""
    return {"movement": {"node": node, "along": [float(c) for c in along]}}


def watch(**quantities):
    return [{"id": name, **quantity} for name, quantity in quantities.items()]


def asked(name, scheme, duration, step, every=1, **more):
    """A motion with a frame after every `every` steps; `nodes` and `ropes` are those shown."""
    frames = {"every_steps": every}
    for shown in ("nodes", "ropes"):
        if shown in more:
            frames[shown] = more.pop(shown)
    return {"id": name, **scheme, "duration_s": duration, "step_s": step, "frames": frames, **more}


def file(name):
    """A verification case: its whole content, and its expected values by quantity."""
    content = json.loads((DATA / f"{name}.json").read_text())
    expected = {entry["quantity"]: entry["value"] for entry in content["expected"]}
    return content, expected, f"{content['source']} ({content['origin']})"


# What histories say ---------------------------------------------------------------------------------------------------

def passages(time, u, v):
    """Moments at which a history passes zero, by the cubic through its values and velocities at neighbouring frames."""
    found = []
    for k in np.flatnonzero(u[:-1] * u[1:] < 0.0):
        h = time[k + 1] - time[k]
        u0, u1, s0, s1 = u[k], u[k + 1], h * v[k], h * v[k + 1]
        cubic = [2 * u0 - 2 * u1 + s0 + s1, -3 * u0 + 3 * u1 - 2 * s0 - s1, s0, u0]
        within = [r.real for r in np.roots(cubic) if abs(r.imag) < 1e-12 and -1e-12 <= r.real <= 1 + 1e-12]
        assert len(within) == 1
        found.append(time[k] + h * within[0])
    return np.array(found)


def period(time, u, v):
    """Period of a swing (s) by its passages through zero."""
    at = passages(time, u, v)
    return 2.0 * (at[-1] - at[0]) / (len(at) - 1)


def numeric_frequency(u, h):
    """Angular frequency (rad/s) of a sampled sine: u[n+1] + u[n-1] = 2 cos(omega h) u[n], by least squares."""
    inner = u[1:-1]
    return np.arccos(inner @ (u[2:] + u[:-2]) / (2.0 * inner @ inner)) / h


def amplitude_and_phase(time, u, omega):
    """Amplitude and phase (rad) of the sine of one frequency in a history, and its mean, by least squares."""
    matrix = np.column_stack([np.sin(omega * time), np.cos(omega * time), np.ones_like(time)])
    (sine, cosine, mean), *_ = np.linalg.lstsq(matrix, u, rcond=None)
    return np.hypot(sine, cosine), np.arctan2(cosine, sine), mean


def check_order(name, errors, order=2.0):
    """Errors at halved steps fall with the order of a scheme."""
    ratios = np.array(errors[:-1]) / np.array(errors[1:])
    print(f"order: {name} | {order} | {np.log2(ratios)}")
    assert np.all(np.abs(np.log2(ratios) - order) < 0.1), f"{name}: {errors}"
