"""Motions over the wire against closed forms and published values: strings, beads, hung masses, a saddle."""

from math import pi, sqrt

import numpy as np
import pytest

import motions
import stubs
import talk
from closed_forms import force_on, length_of, node, rope
from motions import AVERAGE, CONSERVING, EXPLICIT, SCHEMES, asked, check_order, movement, period, watch
from report import check

FINISHED = stubs.motion_result.MOTION_OUTCOME_FINISHED


def follow(channel, brief, wanted):
    """Runs motions and reads them; all must come to their ends."""
    told = motions.read(talk.run(channel, brief | {"motions": list(wanted)}))
    assert list(told) == [motion["id"] for motion in wanted]
    for motion in told.values():
        assert motion.end.outcome == FINISHED, motion.end.failure
    return told


def brief_of(nodes, cables, lengths, sections, actions=(), **more):
    return {
        "id": "moving",
        "net": {"nodes": nodes, "cables": cables, "sections": sections},
        "prestress": {"rules": [length_of(name, length) for name, length in lengths.items()]},
        "actions": list(actions), **more,
    }


def two_strings(half, stiffness, unstressed, mass, actions=()):
    """A mass between two strings along x."""
    return brief_of(
        [node("L", -half, 0, 0, support={}), node("m", 0, 0, 0, mass=mass), node("R", half, 0, 0, support={})],
        [rope("a", "L", "m"), rope("b", "m", "R")], {"a": unstressed, "b": unstressed},
        [{"id": "rope", "axial_stiffness_n": stiffness}], actions,
    )


def moved(by, name="m"):
    return {"moved": [{"on": [name], "by_m": [float(c) for c in by]}]}


# A mass between two strings -------------------------------------------------------------------------------------------

@pytest.mark.parametrize("which", ["set 1", "set 2", "set 3"])
def test_period_of_a_mass_on_two_strings(channel, which):
    _, expected, source = motions.file("pub-20-mass-on-two-strings")
    given = expected[which]
    exact, amplitude = given["period_exact"], given["amplitude"]
    half, stiffness = given["half_span"], given["EA"]
    # Held aside by a force that a driven one takes away: strings without prestress have no state at rest of their own.
    long = sqrt(half**2 + amplitude**2)
    push = 2 * stiffness * (long / given["L0"] - 1) * amplitude / long
    brief = two_strings(half, stiffness, given["L0"], given["mass"], [
        {"id": "hold", "loads": [force_on("m", 0, push, 0)]}, {"id": "free", "loads": [force_on("m", 0, -push, 0)]},
    ])
    brief["net"]["nodes"][1]["xyz_m"] = [0.0, amplitude, 0.0]
    brief["prestress"]["under"] = ["hold"]
    counts = [200, 400, 800]
    told = follow(channel, brief, [
        asked(f"{name} {n}", scheme, 3.2 * exact, exact / n, n // 200, nodes=["m"],
              driven=[{"action": "free", "constant": 1.0}])
        for name, scheme in SCHEMES.items() for n in counts
    ])
    for name in SCHEMES:
        runs = [told[f"{name} {n}"] for n in counts]
        found = [period(m.time, m.at("m")[:, 1], m.speed("m")[:, 1]) for m in runs]
        check(f"{which}, {name}: period at 200 steps (s)", source, exact, found[0], relative=1e-3)
        check_order(f"{which}, {name}: period", [abs(value - exact) for value in found])
        limit = found[2] + (found[2] - found[1]) / 3.0
        check(f"{which}, {name}: period, limit of halved steps (s)", source, exact, limit, relative=1e-6)


def divisions(name, motion):
    """Equal parts of each step; only explicit ones are divided."""
    assert motion.end.steps == motion.begin.divided_steps
    assert motion.end.steps == motion.begin.steps or name == "explicit"
    return motion.end.steps // motion.begin.steps


def exact_steps(omega, h, count, scheme, start):
    """A linear oscillator let go at rest, step by step in closed form.

    Average acceleration and the conserving scheme: tan(w h / 2) = omega h / 2 (Hughes; Bathe; from memory). Central
    differences: sin(w h / 2) = omega h / 2 (from memory).
    """
    if scheme == "explicit":
        numeric = 2.0 * np.arcsin(0.5 * omega * h) / h
    else:
        numeric = 2.0 * np.arctan(0.5 * omega * h) / h
    return start * np.cos(numeric * h * np.arange(count + 1))


BEAD = {"half": 5.0, "EA": 2e6, "T0": 50e3, "mass": 100.0, "stiffness": 20e3}


def bead(actions=()):
    """The mass of pub-22, its natural frequency (rad/s) and how much the strings stiffen at an amplitude (-)."""
    brief = two_strings(BEAD["half"], BEAD["EA"], BEAD["half"] / (1 + BEAD["T0"] / BEAD["EA"]), BEAD["mass"], actions)
    omega = sqrt(BEAD["stiffness"] / BEAD["mass"])
    stiffening = lambda u: 0.5 * (BEAD["EA"] + BEAD["T0"]) / BEAD["T0"] * (u / BEAD["half"]) ** 2  # noqa: E731
    return brief, omega, stiffening


def test_elongation_of_the_period(channel):
    _, expected, source = motions.file("pub-22-sudden-load-newmark")
    brief, omega, stiffening = bead()
    amplitude, cycles = 2e-4, 20
    wanted = {(name, n): 2 * pi / omega / n for name in SCHEMES for n in (10, 20, 50, 100)}
    told = follow(channel, brief, [
        asked(f"{name} {n}", SCHEMES[name], cycles * n * h, h, nodes=["m"], start=moved([0, amplitude, 0]))
        for (name, n), h in wanted.items()
    ])
    for (name, n), h in wanted.items():
        motion = told[f"{name} {n}"]
        u = motion.at("m")[:, 1]
        assert motion.begin.steps == cycles * n
        # Explicit steps are divided by what the stiff movement along the strings could bear.
        divided = divisions(name, motion)
        # The stiffening turns the phase by at most half its share over the whole time.
        exact = exact_steps(omega, h / divided, cycles * n * divided, name, amplitude)[::divided]
        check(f"{name}, {n} steps a period: every step (m)", "closed form of the scheme, see the function", exact, u,
              absolute=amplitude * pi * cycles * stiffening(amplitude))
        if name != "explicit":
            quantity = f"period ratio T_num/T at {n} steps per period"
            ratio = 2 * pi / motions.numeric_frequency(u, h) / (n * h)
            check(f"{name}: {quantity}", source, expected[quantity], ratio, relative=1e-6)


def generalised_alpha(omega, h, count, radius, start):
    """The recursion of Chung & Hulbert 1993 (from memory) for a linear oscillator let go at rest."""
    inertia, force = (2 * radius - 1) / (radius + 1), radius / (radius + 1)
    gamma, beta = 0.5 - inertia + force, 0.25 * (1 - inertia + force) ** 2
    u, v, a = start, 0.0, -omega**2 * start
    history = [u]
    for _ in range(count):
        ahead = u + h * v + h * h * (0.5 - beta) * a
        right = -omega**2 * (force * u + (1 - force) * ahead) - inertia * a
        a1 = right / (1 - inertia + (1 - force) * omega**2 * beta * h * h)
        u, v, a = ahead + beta * h * h * a1, v + h * ((1 - gamma) * a + gamma * a1), a1
        history.append(u)
    return np.array(history)


def test_spectral_radius_of_generalised_alpha(channel):
    brief, omega, stiffening = bead()
    amplitude, count = 2e-4, 200
    # From well resolved to a step of five periods, where a step leaves little more than the radius.
    wanted = {(radius, n): 2 * pi / omega / n for radius in (0.0, 0.5, 0.8, 1.0) for n in (20, 5, 0.2)}
    told = follow(channel, brief, [
        asked(f"{radius} {n}", {"generalised_alpha": {"spectral_radius": radius}}, count * h, h, nodes=["m"],
              start=moved([0, amplitude, 0]))
        for (radius, n), h in wanted.items()
    ])
    for (radius, n), h in wanted.items():
        u = told[f"{radius} {n}"].at("m")[:, 1]
        exact = generalised_alpha(omega, h, count, radius, amplitude)
        largest = np.abs(exact).max()
        check(f"spectral radius {radius}, {n} steps a period (m)", "Chung & Hulbert 1993 (from memory)", exact, u,
              absolute=largest * count * omega * h * stiffening(largest))
        if radius < 1.0:
            assert told[f"{radius} {n}"].energy["error"][-1] < 0.0, "a scheme that damps of itself loses energy"


def test_sudden_load_doubles_the_static_movement(channel):
    _, expected, source = motions.file("pub-22-sudden-load-newmark")
    action = {"id": "push", "loads": [force_on("m", 0, 20, 0)]}
    brief, omega, stiffening = bead([action])
    brief["cases"] = [{"id": "static", "factors": {"push": 1.0}}]
    exact = 2 * pi / omega
    n = 2000
    more = {"driven": [{"action": "push", "constant": 1.0}], "watched": watch(u=movement("m", 0, 1, 0))}
    damped = {"damping": {"factors": {"mass_per_s": 2 * omega}}}
    step = {"driven": [{"action": "push", "step": {"at_s": exact, "after": 1.0}}], "watched": more["watched"]}
    wanted = [asked(name, scheme, 2 * exact, exact / n, **more) for name, scheme in SCHEMES.items()]
    wanted += [asked("compared", AVERAGE, 2 * exact, exact / n, compare_with="static", **more)]
    wanted += [asked("later", AVERAGE, 2 * exact, exact / n, **step)]
    wanted += [asked("damped", AVERAGE, 12 * exact, exact / 100, **more, **damped)]
    told = follow(channel, brief, wanted)
    static = expected["static deflection"]
    # A peak lies within half a step of a sample; strings stiffen by as much as they are stretched at the peak.
    allowed = (pi / n) ** 2 / 2 + stiffening(2 * static) + (2 * pi / n) ** 2
    for name in [*SCHEMES, "compared", "later"]:
        motion = told[name]
        check(f"{name}: peak (m)", source, expected["peak of the undamped step response"],
              motion.watched["u"].max(), relative=allowed)
        check(f"{name}: peak over all steps (m)", source, 2 * static, motion.end.largest_movement_m.value,
              relative=allowed)
        assert motion.end.largest_movement_m.id == "m"
        check(f"{name}: dynamic load factor", source, 2.0, motion.end.largest_movement_factor.value, relative=allowed)
        check(f"{name}: dynamic load factor (array)", source, 2.0, motion.arrays["movement_factor"][1],
              relative=allowed)
        late = exact if name == "later" else 0.0
        check(f"{name}: when (s)", "half a period after the load", late + exact / 2,
              motion.arrays["movement_max_time_s"][1], absolute=1.01 * exact / n)
        expected_u = np.where(motion.time > late, static * (1 - np.cos(omega * (motion.time - late))), 0.0)
        check(f"{name}: movement (m)", "P/k (1 - cos omega t)", expected_u, motion.watched["u"],
              absolute=2 * static * (2 * pi * 2 * ((2 * pi / n) ** 2 / 12 + stiffening(2 * static)) + (pi / n) ** 2))
    assert told["compared"].begin.compared_with == "static"
    check("static deflection (m)", source, static, told["damped"].watched["u"][-1], relative=1e-5)
    assert told["average"].units["u"] == "m"


# A string -------------------------------------------------------------------------------------------------------------

def string(data, n):
    """The string of pub-21 in `n` segments; its beads weigh what a metre of stretched string does."""
    length, tension, mass, stiffness = (data["inputs"][key] for key in ("length", "T", "mass_per_m", "EA"))
    piece = length / n
    unstressed = piece / (1 + tension / stiffness)
    nodes = [
        node(f"n{k}", k * piece, 0, 0, support={} if k in (0, n) else None, mass=mass * (piece - unstressed))
        for k in range(n + 1)
    ]
    section = {"id": "rope", "axial_stiffness_n": stiffness, "mass_kg_per_m": mass}
    return brief_of(nodes, [rope("s", *(entry["id"] for entry in nodes))], {"s": unstressed}, [section])


def test_plucked_string(channel):
    data, expected, source = motions.file("pub-21-plucked-string")
    length, tension, mass, stiffness = (data["inputs"][key] for key in ("length", "T", "mass_per_m", "EA"))
    amplitude, first = 1e-4, expected["continuous period 2L/c"]
    shape = lambda x: amplitude * np.where(x <= 0.25, 4.0 * x, (1.0 - x) / 0.75)  # noqa: E731
    source_sum = "modal sum of the beaded string, with the scheme's own frequencies (see exact_steps)"
    for n, steps, schemes in ((40, 2000, SCHEMES), (400, 800, {"average": AVERAGE})):
        start = {"moved": [{"on": [f"n{k}"], "by_m": [0, float(shape(k / n)), 0]} for k in range(1, n)]}
        told = follow(channel, string(data, n), [
            asked(name, scheme, 0.5 * first, 0.5 * first / steps, steps // 4, ropes=["s"], start=start)
            for name, scheme in schemes.items()
        ])
        for name, motion in told.items():
            field = motion.ropes["s"]
            assert field.nodes == [f"n{k}" for k in range(n + 1)]
            # Told over the unstressed length, for the rope alone, which weighs what an unstressed metre does, as plucked: the
            # steep quarter is tighter by its slope.
            stretch = 1 + tension / stiffness
            check("wave speed (m/s)", source, expected["wave speed"],
                  motion.waves["s"].transverse_most_m_per_s * stretch / sqrt(stretch),
                  relative=0.5 * stiffness / tension * (4 * amplitude / length) ** 2)
            u = field.position[:, :, 1]
            quarters = lambda frame: [u[frame, n // 4], u[frame, n // 2], u[frame, 3 * n // 4]]  # noqa: B023, E731
            if n == 400:
                # Beads blunt the kink of the string; 400 of them by less than the file allows.
                check("d'Alembert: mirrored after half a period (m)", source,
                      expected["continuous at T1/2: mirror image, values at L/4, L/2, 3L/4"],
                      -np.array(quarters(4)), absolute=3e-6)
                continue
            check(f"{name}: at half a period (m)", source,
                  expected["discrete displacement at x=L/4, L/2, 3L/4 at t = T1/2"], quarters(4), absolute=2e-7)
            check(f"{name}: at a quarter of a period (m)", source, expected["same at t = T1/4"], quarters(2),
                  absolute=2e-7)
            piece, j, k = length / n, np.arange(1, n), np.arange(n + 1)
            bead_mass = mass * piece
            omega = 2 * np.sqrt(tension / (bead_mass * piece)) * np.sin(j * pi / (2 * n))
            modes = np.sin(np.outer(j, k) * pi / n)
            part = modes[:, 1:-1] @ shape(k[1:-1] / n) * 2 / n
            divided = divisions(name, motion)
            h, count = 0.5 * first / steps / divided, steps * divided
            through = np.array([
                exact_steps(w, h, count, name, a)[:: steps // 4 * divided] for w, a in zip(omega, part, strict=True)
            ])
            # Slopes stretch the string: its tension, and with it the phase of each mode, is off by no more than this.
            slope = 4 * amplitude / length
            stiffening = 0.5 * stiffness / tension * slope**2
            allowed = np.abs(part) @ omega * 0.5 * first * 0.5 * stiffening
            check(f"{name}: all beads at all times (m)", source_sum, through.T @ modes, u, absolute=allowed)


# A rope that breaks ---------------------------------------------------------------------------------------------------

@pytest.mark.parametrize("name", SCHEMES)
def test_sudden_loss_of_one_of_two_ropes(channel, name):
    data, expected, source = motions.file("pub-30-sudden-cable-removal")
    mass, length, stiffness, gravity = (data["inputs"][key] for key in ("mass", "L0", "EA", "g"))
    before, after = expected["static extension before, after"]
    brief = brief_of(
        [node("top", 0, 0, 0, support={}), node("m", 0, 0, -length - before, mass=mass)],
        [rope("a", "top", "m"), rope("b", "top", "m")], {"a": length, "b": length},
        [{"id": "rope", "axial_stiffness_n": stiffness}], [{"id": "weight", "loads": [{"own_weight": {}}]}],
    )
    brief["net"]["gravity_m_per_s2"] = gravity
    brief["prestress"]["under"] = ["weight"]
    exact, n = expected["period after removal"], 1000
    quantities = watch(
        u=movement("m", 0, 0, -1), v={"velocity": {"node": "m", "along": [0, 0, -1]}},
        acceleration={"acceleration": {"node": "m", "along": [0, 0, -1]}},
        force={"largest_tension": "a"}, segment={"tension": {"cable": "b", "from": "top", "to": "m"}},
        pull={"support_force": {"node": "top", "along": [0, 0, 1]}},
    )
    motion = follow(channel, brief, [
        asked("lost", SCHEMES[name], 3 * exact, exact / n, breaks=[{"member": "b", "at_s": 0.0}], watched=quantities),
    ])["lost"]
    extension = before + motion.watched["u"]
    force = stiffness / length * extension
    check("force before (N)", source, expected["force in each cable before"], force[0], relative=1e-9)
    check("watched tension (N)", "EA / L0 times the extension", force, motion.watched["force"], relative=1e-9)
    # The largest rounding is of a movement from a coordinate of 4 m, by the stiffness of the rope.
    check("watched force of the support (N)", "that tension", force[1:], motion.watched["pull"][1:], relative=1e-9)
    assert np.all(motion.watched["segment"][1:] == 0.0)
    check("acceleration (m/s2)", "(W - T) / m", gravity - force[1:] / mass, motion.watched["acceleration"][1:],
          absolute=2 * gravity * 2 * pi / n if name == "conserving" else 1e-9 * gravity)
    check("peak force (N)", source, expected["peak force after removal"], motion.arrays["tension_max_n"][0],
          relative=1e-3)
    check("least force (N)", source, expected["minimum force after removal"], motion.arrays["tension_min_n"][0],
          relative=1e-3)
    check("peak over weight", source, 1.5, motion.end.largest_tension_n.value / (mass * gravity), relative=1e-3)
    check("peak over the static answer", source, 1.5, motion.end.largest_tension_factor.value, relative=1e-3)
    check("period (s)", source, exact, period(motion.time, extension - after, motion.watched["v"]), relative=1e-4)
    check("extension at T/4, T/2 (m)", source, expected["extension at t = T/4, T/2"], extension[[250, 500]],
          absolute=1e-6)
    check("extension (m)", "release from half the load: e1 + (e0 - e1) cos omega t",
          after + (before - after) * np.cos(2 * pi / exact * motion.time), extension,
          absolute=(after - before) * 6 * pi * (2 * pi / n) ** 2 / 12 * 1.01)
    check("released (J)", "EA e^2 / (2 L0)", stiffness * before**2 / (2 * length), motion.energy["released"][-1],
          relative=1e-9)
    kinds = [(event.kind, event.member) for event in motion.events]
    assert kinds == [(stubs.motion_result.MOTION_EVENT_KIND_BREAK, "b")]


# A saddle -------------------------------------------------------------------------------------------------------------

def saddle(data):
    """The net of a file, and its loads as an action."""
    model = data["model"]
    held = {support["node"] for support in model["supports"]}
    mass = data["inputs"]["node_mass"]
    return brief_of(
        [node(f"n{k}", *at, support={} if k in held else None, mass=mass) for k, at in enumerate(model["nodes"])],
        [rope(f"c{e}", f"n{m['i']}", f"n{m['j']}") for e, m in enumerate(model["elements"])],
        {f"c{e}": m["L0"] for e, m in enumerate(model["elements"])},
        [{"id": "rope", "axial_stiffness_n": model["elements"][0]["EA"]}],
        [{"id": "load", "loads": [force_on(f"n{p['node']}", *p["F"]) for p in model["point_loads"]]}],
    )


@pytest.mark.parametrize(("which", "damping"), [("inv-08-transient-saddle", 0.0), ("inv-10-transient-damped", 3.0)])
def test_saddle_under_a_sudden_load(channel, which, damping):
    data, expected, source = motions.file(which)
    times = np.array(expected["times"])
    wanted = [
        asked(f"{name} {h}", scheme, times[-1], h, round(times[1] / h), nodes=["n0", "n3"],
              driven=[{"action": "load", "constant": 1.0}], damping={"factors": {"mass_per_s": damping}})
        for name, scheme in SCHEMES.items() for h in (4e-4, 2e-4, 1e-4)
    ]
    told = follow(channel, saddle(data), wanted)
    nodes = {"n0": "displacement of node 0 (x, y, z) at these times", "n3": "displacement of node 3"}
    energies = np.array(expected["total energy (strain + kinetic - P.x) at these times"])
    for name in SCHEMES:
        errors = []
        for h in (4e-4, 2e-4, 1e-4):
            motion = told[f"{name} {h}"]
            assert np.allclose(motion.time, times, rtol=1e-12, atol=1e-12)
            off = [motion.moved(n) - np.array(expected[quantity]) for n, quantity in nodes.items()]
            errors.append(np.linalg.norm(off))
        check_order(f"{which}, {name}: movements", errors)
        for n, quantity in nodes.items():
            exact = np.array(expected[quantity])
            check(f"{name}, 1e-4 s: {quantity} (m)", source, exact, motion.moved(n),
                  absolute=5e-5 * np.abs(exact).max())
        check(f"{name}: largest force (N)", source, expected["largest member force in 0..tend"],
              motion.end.largest_tension_n.value, relative=1e-3)
        check(f"{name}: smallest force (N)", source, expected["smallest member force"],
              motion.arrays["tension_min_n"].min(), absolute=2.0)
        # The load is driven here: its potential is the work of the ledger.
        total = lambda m: m.energy["kinetic"] + m.energy["elastic"] - m.energy["work"]  # noqa: E731
        if name == "conserving" and damping == 0.0:
            check(f"{name}: energy (J)", source, energies, total(motion), relative=1e-9)
        elif name != "explicit":
            # What damping and averaging take is a series in even powers of the step; two eliminations leave the sixth.
            coarse, middle, fine = (total(told[f"{name} {h}"]) for h in (4e-4, 2e-4, 1e-4))
            once, twice = middle + (middle - coarse) / 3, fine + (fine - middle) / 3
            check(f"{name}: energy, limit of halved steps (J)", source, energies, twice + (twice - once) / 15,
                  absolute=np.abs(twice - once).max() + 1e-9 * energies.max())


# Damping --------------------------------------------------------------------------------------------------------------

def decay(time, omega, ratio, amplitude):
    """Movement of a damped oscillator let go at rest."""
    damped = omega * sqrt(1 - ratio**2)
    return amplitude * np.exp(-ratio * omega * time) * (
        np.cos(damped * time) + ratio * omega / damped * np.sin(damped * time)
    )


def second_order(omega, h, ratio, cycles):
    """Most that a scheme of second order is off over some cycles, over the amplitude (-).

    Periods are off by (omega h)^2 / 12 (central differences: half of it); explicit damping lags by another
    ratio (omega h)^2.
    """
    return 2 * pi * cycles * (omega * h) ** 2 * (1 / 12 + ratio)


@pytest.mark.parametrize("ratio", [0.005, 0.05])
def test_rayleigh_damping_by_its_ratio(channel, ratio):
    brief, omega, stiffening = bead()
    frequency, n, cycles, amplitude = omega / (2 * pi), 1000, 10, 2e-4
    high = 3.0 * frequency
    h = 2 * pi / omega / n
    at = lambda low, top: {"damping": {"ratio": {"ratio": ratio, "low_hz": low, "high_hz": top}}}  # noqa: E731
    told = follow(channel, brief, [
        asked(f"{name} {which}", scheme, cycles * n * h, h, 5, nodes=["m"], start=moved([0, amplitude, 0]),
              **at(*band))
        for name, scheme in SCHEMES.items()
        for which, band in (("low", (frequency, high)), ("high", (frequency / 3, frequency)),
                            ("middle", (frequency / 3, high)))
    ])
    a, b = 4 * pi * ratio * frequency * high / (frequency + high), ratio / (pi * (frequency + high))
    begin = told["average low"].begin
    check("Rayleigh factors (1/s, s)", "a / 2w + b w / 2 = ratio at both frequencies (from memory)", [a, b],
          [begin.damping_mass_per_s, begin.damping_stiffness_s], relative=1e-12)
    for name, motion in told.items():
        # Between the two frequencies the ratio is lower: a / 2w + b w / 2 = 2 * 3 / (1 + 9) of it in the middle of 1 : 9.
        here = ratio * (0.6 if name.endswith("middle") else 1.0)
        check(f"{name}, ratio {ratio}: movement (m)", "exp(-ratio omega t) (...), damped oscillator",
              decay(motion.time, omega, here, amplitude), motion.at("m")[:, 1],
              absolute=amplitude * (second_order(omega, h, here, cycles) + pi * cycles * stiffening(amplitude)))


@pytest.mark.parametrize("ratio", [0.02, 0.3])
def test_damping_along_ropes(channel, ratio):
    # Along the strings the mass is a linear oscillator as long as both are taut: 2 EA / L0, 2 c / L0.
    half, stiffness, tension, mass = 3.0, 4e6, 40e3, 250.0
    unstressed = half / (1 + tension / stiffness)
    omega = sqrt(2 * stiffness / unstressed / mass)
    dashpot = ratio * omega * mass * unstressed
    n, cycles = 1000, 6
    h, amplitude = 2 * pi / omega / n, 0.5 * half * tension / stiffness
    told = follow(channel, two_strings(half, stiffness, unstressed, mass), [
        asked(name, scheme, cycles * n * h, h, 5, nodes=["m"], start=moved([amplitude, 0, 0]),
              damping={"ropes": [{"on": ["a", "b"], "force_per_strain_rate_n_s": dashpot}]})
        for name, scheme in SCHEMES.items()
    ])
    for name, motion in told.items():
        exact = decay(motion.time, omega, ratio, amplitude)
        check(f"{name}, ratio {ratio}: movement (m)", "damped oscillator, 2 ratio omega m = 2 c / L0", exact,
              motion.at("m")[:, 0], absolute=amplitude * second_order(omega, h, ratio, cycles))
        # What is gone of the energy is what the dashpots took.
        left = motion.energy["kinetic"] + motion.energy["elastic"]
        check(f"{name}: taken by dashpots (J)", "loss of energy", left[0] - left, motion.energy["dissipated"],
              absolute=mass * (omega * amplitude) ** 2 / 2 * second_order(omega, h, ratio, cycles))


def test_a_dashpot_cannot_push(channel):
    # A mass thrown up on a rope: the rope goes slack in free flight, and its dashpot with it.
    length, stiffness, mass, gravity, speed = 2.0, 1e6, 20.0, 9.80665, 1.5
    hung = length * (1 + mass * gravity / stiffness)
    brief = brief_of(
        [node("top", 0, 0, 0, support={}), node("m", 0, 0, -hung, mass=mass)], [rope("a", "top", "m")], {"a": length},
        [{"id": "rope", "axial_stiffness_n": stiffness}], [{"id": "weight", "loads": [{"own_weight": {}}]}],
    )
    brief["prestress"]["under"] = ["weight"]
    h, duration, dashpot = 1e-5, 0.2, 2000.0
    told = follow(channel, brief, [
        asked(name, scheme, duration, h, 200, nodes=["m"],
              damping={"ropes": [{"on": ["a"], "force_per_strain_rate_n_s": dashpot}]},
              start={"velocities": [{"on": ["m"], "velocity_m_per_s": [0, 0, speed]}]})
        for name, scheme in SCHEMES.items()
    ])
    # Going up shortens the rope faster than its tension could follow: force and dashpot together would push, so that
    # nothing acts but gravity. What the rope had stored is taken by the dashpot.
    stored = stiffness * length * (hung / length - 1) ** 2 / 2
    assert mass * gravity < dashpot / length * speed
    for name, motion in told.items():
        t = motion.time
        check(f"{name}: free flight (m)", "throw under gravity", -hung + speed * t - gravity * t**2 / 2,
              motion.at("m")[:, 2], absolute=1e-9)
        check(f"{name}: taken by the dashpot (J)", "EA L0 strain^2 / 2", stored, motion.energy["dissipated"][-1],
              relative=1e-2)
        assert motion.slack[-1] == 1 and motion.end.slackenings == 1
