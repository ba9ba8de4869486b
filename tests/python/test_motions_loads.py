"""Motions under wind, moving supports and the loss of ropes, against closed forms, SciPy and the engine's own statics."""

from math import pi, sqrt

import numpy as np
import pytest
import scipy.integrate

import motions
import nets
import talk
from closed_forms import force_on, length_of, node, rope
from motions import AVERAGE, CONSERVING, SCHEMES, asked, movement, watch
from report import check
from test_independent_solvers import brief_of as net_brief
from test_motions import brief_of, decay, follow

# Wind on a panel that moves -------------------------------------------------------------------------------------------

SIDE, AIR, SPEED, COEFFICIENT = 4.0, 1.25, 12.0, 1.1
HALF, STIFFNESS, TENSION, MASS = 5.0, 1e5, 8e3, 60.0
UNSTRESSED = HALF / (1 + TENSION / STIFFNESS)
SPRING = 2 * STIFFNESS / UNSTRESSED
OMEGA = sqrt(SPRING / MASS)
SHARE = SIDE * SIDE / 4  # area of the panel that a corner carries


def panel():
    """A level square panel whose corners move up and down between prestressed ropes, as on springs."""
    corners = {"p": (0, 0), "q": (SIDE, 0), "r": (SIDE, SIDE), "s": (0, SIDE)}
    rail = {"free": [{"along": [0.0, 0.0, 1.0]}]}
    nodes, cables, lengths = [], [], {}
    for name, (x, y) in corners.items():
        nodes += [node(name, x, y, 0, support=rail, mass=MASS), node(f"{name}t", x, y, HALF, support={}),
                  node(f"{name}b", x, y, -HALF, support={})]
        for end in "tb":
            cables.append(rope(f"{name}-{end}", name, f"{name}{end}"))
            lengths[f"{name}-{end}"] = UNSTRESSED
    given = brief_of(nodes, cables, lengths, [{"id": "rope", "axial_stiffness_n": STIFFNESS}])
    given["net"]["skins"] = [{"id": "cloth"}]
    given["net"]["panels"] = [{"id": "square", "skin": "cloth", "nodes": list(corners)}]
    return given


def wind(history, **more):
    return {"wind": {"along": [0.0, 0.0, -1.0], "coefficients": {"cloth": COEFFICIENT},
                     "air_density_kg_per_m3": AIR, **more}, **history}


def lifted(by):
    return {"moved": [{"on": list("pqrs"), "by_m": [0.0, 0.0, float(by)]}]}


@pytest.mark.parametrize("name", SCHEMES)
def test_aerodynamic_damping_of_a_small_swing(channel, name):
    # p = rho c (U - v)^2 / 2 about v = 0: damping rho c U an area, ratio rho c U A / (2 m omega); and the swing is about the
    # place where the wind holds the panel.
    pressure = AIR * COEFFICIENT * SPEED**2 / 2
    held = -pressure * SHARE / SPRING
    ratio = AIR * COEFFICIENT * SPEED * SHARE / (2 * MASS * OMEGA)
    n, cycles, amplitude = 200, 10, 1e-4
    h = 2 * pi / OMEGA / n
    motion = follow(channel, panel(), [
        asked("swing", SCHEMES[name], cycles * n * h, h, driven=[wind({"constant": SPEED})],
              start=lifted(held + amplitude), watched=watch(u=movement("q", 0, 0, 1))),
    ])["swing"]
    swing = motion.watched["u"] + amplitude  # watched from where it starts
    # What is left out of the linear damping is v / 2U of it, at most omega amplitude / 2U.
    swift = OMEGA * amplitude / (2 * SPEED)
    allowed = amplitude * (2 * pi * cycles * ((OMEGA * h) ** 2 / 12 + ratio * (OMEGA * h) ** 2 + ratio * swift))
    check(f"{name}: swing at a damping ratio of {ratio:.4f} (m)", "linearised relative wind: rho c U A / (2 m omega)",
          decay(motion.time, OMEGA, ratio, amplitude), swing, absolute=allowed)
    assert ratio > 0.005


@pytest.mark.parametrize("name", SCHEMES)
def test_panel_in_a_gust_beside_scipy(channel, name):
    # A swing so fast that the panel outruns the wind at times: U - v changes sign.
    values, spacing = [0.0, 6.0, 2.0, -3.0, 4.0, 0.5], 0.15

    def rates(t, y):
        relative = np.interp(t, spacing * np.arange(6), values) + y[1]  # the wind blows down
        return [y[1], -(SPRING * y[0] + SHARE * AIR * COEFFICIENT * abs(relative) * relative / 2) / MASS]

    start, duration = 0.25, 0.9
    exact = scipy.integrate.solve_ivp(rates, (0, duration), [start, 0.0], method="DOP853", rtol=1e-11, atol=1e-13,
                                      max_step=1e-3, t_eval=np.linspace(0, duration, 91)).y
    steps = [1e-3, 5e-4, 2.5e-4]
    told = follow(channel, panel(), [
        asked(f"{h}", SCHEMES[name], duration, h, round(0.01 / h), start=lifted(start), nodes=["r"],
              driven=[wind({"table": {"values": values, "every_s": spacing}})]) for h in steps
    ])
    off = [np.linalg.norm(told[f"{h}"].at("r")[:, 2] - exact[0]) for h in steps]
    motions.check_order(f"{name}: panel in a gust", off)
    fine, coarse = told["0.00025"], told["0.0005"]
    limit = fine.at("r") + (fine.at("r") - coarse.at("r")) / 3
    check(f"{name}: movement, limit of halved steps (m)", "SciPy's DOP853 on the equation of one corner", exact[0],
          limit[:, 2], absolute=0.1 * np.abs(fine.at("r") - coarse.at("r")).max())
    # The work of the wind is its force times the way.
    speed = exact[1]
    relative = np.interp(fine.time, spacing * np.arange(6), values) + speed
    assert relative.min() < 0 < relative.max()
    power = -4 * SHARE * AIR * COEFFICIENT * np.abs(relative) * relative / 2 * speed
    work = np.concatenate([[0.0], np.cumsum(0.005 * (power[1:] + power[:-1]))])
    check(f"{name}: work of the wind (J)", "integral of force times velocity", work, fine.energy["work"],
          absolute=2e-3 * np.abs(power).max() * duration)


# Supports that move ---------------------------------------------------------------------------------------------------

@pytest.mark.parametrize("name", SCHEMES)
@pytest.mark.parametrize("r", [0.6, 1.0, 2.0])
def test_transmissibility_of_a_rope(channel, name, r):
    length, stiffness, mass, ratio, way = 3.0, 6e5, 80.0, 0.1, 1e-4
    omega = sqrt(stiffness / length / mass)
    dashpot = 2 * ratio * omega * mass * length
    actions = [
        {"id": "weight", "loads": [{"own_weight": {}}]},
        {"id": "shake", "loads": [{"move": {"node": "top", "by_m": [0.0, 0.0, way]}}]},
    ]
    given = brief_of(
        [node("top", 0, 0, 0, support={}), node("m", 0, 0, -length, mass=mass)], [rope("a", "top", "m")],
        {"a": length}, [{"id": "rope", "axial_stiffness_n": stiffness}], actions,
    )
    given["prestress"]["under"] = ["weight"]
    forced = r * omega
    n = 500
    h = 2 * pi / forced / n
    settle = int(np.ceil(14 / (ratio * omega) / (n * h)))
    motion = follow(channel, given, [
        asked("shaken", SCHEMES[name], (settle + 4) * n * h, h, 5, nodes=["top", "m"],
              driven=[{"action": "shake", "harmonic": {"amplitude": 1.0, "frequency_hz": forced / (2 * pi)}}],
              damping={"ropes": [{"on": ["a"], "force_per_strain_rate_n_s": dashpot}]},
              watched=watch(pull={"support_force": {"node": "top", "along": [0, 0, 1]}})),
    ])["shaken"]
    assert motion.slack.max() == 0
    check("movement of the support (m)", "as given", way * np.sin(forced * motion.time), motion.moved("top")[:, 2],
          absolute=1e-9 * way)
    late = motion.time > settle * n * h
    amplitude, phase, _ = motions.amplitude_and_phase(motion.time[late], motion.moved("m")[late, 2], forced)
    answer = (1 + 2j * ratio * r) / (1 - r * r + 2j * ratio * r)
    # Steps move the frequency by (omega h)^2 / 12 of it: near the peak by as much over the damping.
    allowed = (max(forced, omega) * h) ** 2 * (1 / (6 * ratio) + 1) + 2e-6
    source = "base-excited oscillator: (1 + 2 i ratio r) / (1 - r^2 + 2 i ratio r)"
    check(f"{name}, r = {r}: transmissibility", source, abs(answer), amplitude / way, relative=allowed)
    check(f"{name}, r = {r}: phase (rad)", source, np.angle(answer), phase, absolute=allowed)
    swing, _, mean = motions.amplitude_and_phase(motion.time[late], motion.watched["pull"][late], forced)
    check(f"{name}, r = {r}: pull on the support (N)", "mass times acceleration", mass * forced**2 * way * abs(answer),
          swing, relative=allowed)
    check(f"{name}, r = {r}: mean pull (N)", "weight", mass * 9.80665, mean, relative=1e-6)


# Against the engine's own statics -------------------------------------------------------------------------------------

def saddle():
    """A light saddle of 5 x 5 inner nodes; nothing acts but what cases name, so that a rope that is gone takes no load."""
    xyz, held, ends = nets._grid(7, 7, lambda i, j: (2.0 * i, 2.0 * j, 0.1 * ((i - 3) ** 2 - (j - 3) ** 2)))
    length = np.linalg.norm(xyz[ends[:, 1]] - xyz[ends[:, 0]], axis=1)
    net = nets.Net(xyz, held, ends, length / 1.003, np.full(len(ends), 3e6), np.zeros_like(xyz))
    given = net_brief(net)
    given["prestress"]["under"] = []
    for section in given["net"]["sections"]:
        section["mass_kg_per_m"] = 2.0
    loads = [force_on(f"n{k}", 0, 0, -800) for k in net.free]
    given["actions"] = [{"id": "snow", "loads": loads}]
    given["cases"] = [
        {"id": "snow", "factors": {"snow": 1.0}}, {"id": "lost", "factors": {"snow": 1.0}, "remove": ["c20"]},
    ]
    return given, net


def test_end_after_a_break_is_the_state_without_the_member(channel):
    given, net = saddle()
    # Damping near critical for the lowest modes, and along ropes for the stiff ones.
    wanted = asked("loss", {"generalised_alpha": {"spectral_radius": 0.5}}, 12.0, 5e-3, 100,
                   nodes=[f"n{k}" for k in net.free], breaks=[{"member": "c20", "at_s": 0.1}],
                   damping={"factors": {"mass_per_s": 8.0}}) | {"from": "snow"}
    given["motions"] = [wanted]
    run = talk.run(channel, given)
    motion = motions.read(run)["loss"]
    assert motion.begin.compared_with == "at rest under what acts at the end"
    static = run.array("lost", "position_m")[net.free]
    largest = np.abs(run.array("lost", "displacement_m")).max()
    check("start (m)", "the case that it starts from", run.array("snow", "position_m")[net.free], motion.position[0],
          absolute=1e-12)
    check("end (m)", "the case without the member", static, motion.position[-1], absolute=1e-6 * largest)
    assert np.abs(motion.position[-1] - motion.position[0]).max() > 1e-3
    # The static answer that peaks are compared with is that case: factors times it are the peaks.
    peaks, factors = motion.arrays["tension_max_n"], motion.arrays["tension_factor"]
    tension = run.array("lost", "tension_n")
    told = factors > 0.0
    assert told.sum() > 40
    check("factors of tension", "peak over the case without the member", peaks[told] / tension[told], factors[told],
          relative=1e-6)
    counted = tension >= 0.05 * tension.max()
    check("largest factor of tension", "largest of the array where tension is 5 % of the largest", factors[counted].max(),
          motion.end.largest_tension_factor.value, relative=1e-9)


def test_compared_with_a_case_of_the_brief(channel):
    given, net = saddle()
    given["motions"] = [asked("loss", CONSERVING, 0.5, 1e-3, breaks=[{"member": "c20", "at_s": 0.0}],
                              compare_with="lost") | {"from": "snow"},
                        asked("own", CONSERVING, 0.5, 1e-3, breaks=[{"member": "c20", "at_s": 0.0}])
                        | {"from": "snow"}]
    run = talk.run(channel, given)
    told = motions.read(run)
    loss, own = told["loss"], told["own"]
    assert loss.begin.compared_with == "lost" and loss.begin.not_compared == ""
    start, lost = run.array("snow", "position_m"), run.array("lost", "position_m")
    way = np.linalg.norm(lost - start, axis=1)
    tension = run.array("lost", "tension_n")
    whole = tension > 0.01 * tension.max()
    check("factors of tension", "peak over the case", loss.arrays["tension_max_n"][whole] / tension[whole],
          loss.arrays["tension_factor"][whole], relative=1e-9)
    check("peaks", "the same motion compared otherwise", own.arrays["tension_max_n"], loss.arrays["tension_max_n"],
          absolute=0.0)
    far = way > 0.05 * way.max()
    check("factors of movement", "compared with rest under what acts at the end", loss.arrays["movement_factor"][far],
          own.arrays["movement_factor"][far], relative=1e-5)
    worst = loss.arrays["movement_factor"][far].max()
    check("largest factor of movement", "largest of the array where movement is 5 % of the largest", worst,
          loss.end.largest_movement_factor.value, relative=1e-9)
    print(f"loss of a rope: movement {worst:.2f}, tension {loss.end.largest_tension_factor.value:.2f} of the static one")
    assert 1.0 < worst


def test_sudden_load_on_a_net(channel):
    # A small load put on at once on a net in its lowest mode's own shape doubles every static movement.
    given, net = saddle()
    given["cases"] = []
    given["modes"] = {"about": ["reference"], "count": 1}
    first = talk.run(channel, given)
    shape = first.array("reference", "mode_shape")
    mode = next(e.modes.mode for e in first.events
                if e.WhichOneof("event") == "modes" and e.modes.WhichOneof("part") == "mode")
    # Loads m phi move the net along phi alone: static phi / omega^2.
    mass = np.zeros(len(net.xyz))
    for end in (0, 1):
        np.add.at(mass, net.ends[:, end], 0.5 * 2.0 * net.unstressed)
    omega = 2 * pi * mode.frequency_hz
    size = 1e-5
    force = size * omega**2 * mass[:, None] * shape
    given["actions"] = [{"id": "push", "loads": [force_on(f"n{k}", *force[k]) for k in net.free]}]
    given["cases"] = [{"id": "static", "factors": {"push": 1.0}}]
    del given["modes"]
    h = 2 * pi / omega / 400
    given["motions"] = [asked("push", AVERAGE, 800 * h, h, nodes=[f"n{k}" for k in net.free],
                              driven=[{"action": "push", "constant": 1.0}])]
    run = talk.run(channel, given)
    motion = motions.read(run)["push"]
    check("static movement (m)", "mode over omega^2", size * shape[net.free], run.array("static", "displacement_m")[net.free],
          absolute=2e-3 * size)
    along = 1 - np.cos(omega * motion.time)
    # Second order in the movement: the net stiffens or softens by movement over length, over a sag of about a metre.
    check("movement (m)", "mode times (1 - cos omega t)", size * along[:, None, None] * shape[net.free],
          motion.position - motion.position[0], absolute=4 * pi * (pi / 200) ** 2 * size / 12 * 2 + 2e-3 * size)
    check("dynamic factor", "2 for a sudden load on one mode", 2.0, motion.end.largest_movement_factor.value, relative=2e-3)
