"""Briefs with answers by hand: each kind of support, load and prestress rule once.

Each entry: what it shows, the brief, and for each number its name, its value by hand, and how to read it from a run.
"""

from dataclasses import dataclass
from math import hypot, sqrt

import numpy as np

BY_HAND = "statics by hand (our own)"


@dataclass
class ClosedForm:
    """A brief and the numbers it must give, within a relative or an absolute tolerance."""

    name: str
    brief: dict
    numbers: list
    relative: float = 1e-9
    absolute: float = 1e-9
    source: str = BY_HAND


def node(name, *xyz, support=None, mass=None):
    entry = {"id": name, "xyz_m": [float(c) for c in xyz]}
    if support is not None:
        entry["support"] = support
    if mass is not None:
        entry["attached_mass_kg"] = mass
    return entry


def rope(name, *path, section="rope"):
    return {"id": name, "section": section, "nodes": list(path)}


def brief(nodes, cables, rules, *, sections=None, struts=(), groups=(), always=(), loads=(), hold=()):
    """A brief whose reference state bears `always`, and whose one case bears `loads` besides."""
    actions, factors = [], {}
    for name, given in (("always", always), ("loads", loads)):
        if given:
            actions.append({"id": name, "loads": list(given)})
            factors[name] = 1.0
    entry = {
        "id": "by-hand",
        "net": {
            "nodes": nodes, "cables": cables, "struts": list(struts), "support_groups": list(groups),
            "sections": sections or [{"id": "rope", "axial_stiffness_n": EA, "breaking_force_n": 100e3}],
        },
        "prestress": {"rules": rules, "under": ["always"] if always else [], "hold": list(hold)},
        "actions": actions,
    }
    if loads:
        entry["cases"] = [{"id": "case", "factors": factors}]
    return entry


def length_of(name, unstressed):
    return {"on": [name], "unstressed_length_m": unstressed}


def force_on(name, *force):
    return {"nodes": {"on": [name], "force_n": [float(f) for f in force]}}


def array(case, name):
    return lambda run: run.array(case, name)


def at_node(case, name, which):
    return lambda run: run.at_node(case, name, which)


def at_support(case, name, which):
    return lambda run: run.at_support(case, name, which)


def root(low, high, f):
    """Root of a function that changes sign between low and high, by bisection to the last digit."""
    sign = np.sign(f(low))
    assert sign != np.sign(f(high))
    while True:
        middle = 0.5 * (low + high)
        if middle in (low, high):
            return middle
        if np.sign(f(middle)) == sign:
            low = middle
        else:
            high = middle


EA = 4e6


# Supports ------------------------------------------------------------------------------------------------------------

def rigid():
    load = 16e3
    tension = 5 * load / 8
    l0 = 5 / (1 + tension / EA)
    return ClosedForm(
        "support rigid",
        brief(
            [node("L", -3, 0, 4, support={}), node("R", 3, 0, 4, support={}), node("m", 0.4, 0.1, -0.2)],
            [rope("a", "L", "m"), rope("b", "m", "R")],
            [length_of("a", l0), length_of("b", l0)],
            always=[force_on("m", 0, 0, -load)],
        ),
        [
            ("force on the net (N)", [-0.6 * tension, 0, 0.8 * tension], at_support("reference", "support_force_n", "L")),
            ("where the load hangs (m)", [0, 0, 0], at_node("reference", "position_m", "m")),
        ],
        absolute=1e-6,
    )


def on_a_rail(spring):
    u = np.array([2.0, 1.0, -2.0]) / 3
    at = np.array([2.0, -1.0, 4.0])
    load = np.array([900.0, -300.0, 600.0])
    tension = 4000.0
    l0 = 3 / (1 + tension / EA)
    k = EA / l0
    along = load @ u
    moved = along / (2 * k + spring)
    release = {"along": [2.0, 1.0, -2.0]}
    support = {"springs": [{**release, "stiffness_n_per_m": spring}]} if spring else {"free": [release]}
    across = load - along * u
    return ClosedForm(
        "support skew spring" if spring else "support skew release",
        brief(
            [node("A", *(at - 3 * u), support={}), node("B", *(at + 3 * u), support={}), node("m", *at, support=support)],
            [rope("a", "A", "m"), rope("b", "m", "B")],
            [length_of("a", l0), length_of("b", l0)],
            loads=[force_on("m", *load)],
        ),
        [
            ("tensions (N)", [tension + k * moved, tension - k * moved], array("case", "tension_n")),
            ("movement (m)", moved * u, at_node("case", "displacement_m", "m")),
            ("force on the net (N)", -across - spring * moved * u, at_support("case", "support_force_n", "m")),
            (
                "force along the rail (N)", spring * moved,
                lambda run: abs(run.at_support("case", "support_force_own_axes_n", "m")[2]),
            ),
        ],
        absolute=1e-6,
    )


def sprung(moves):
    span, l0, spring = 10.0, 9.97, 3e5
    tension = (span + moves - l0) / (1 / spring + l0 / EA)
    state = "case" if moves else "reference"
    return ClosedForm(
        "support spring whose anchor moves" if moves else "support spring",
        brief(
            [
                node("A", 0, 0, 0, support={}),
                node("B", span, 0, 0, support={"springs": [{"along": [1.0, 0.0, 0.0], "stiffness_n_per_m": spring}]}),
            ],
            [rope("a", "A", "B")],
            [length_of("a", l0)],
            loads=[{"move": {"node": "B", "by_m": [moves, 0.0, 0.0]}}] if moves else [],
        ),
        [
            ("tension (N)", [tension], array(state, "tension_n")),
            ("position (m)", [span + moves - tension / spring, 0, 0], at_node(state, "position_m", "B")),
            ("force on the net (N)", [tension, 0, 0], at_support(state, "support_force_n", "B")),
        ],
        absolute=1e-6,
    )


def prescribed_movement():
    l0, by = 9.98, np.array([0.03, -0.4, 0.25])
    ends = np.array([10.0, 0.0, 0.0]) + by
    length = np.linalg.norm(ends)
    tension = EA * (length / l0 - 1)
    return ClosedForm(
        "support moved",
        brief(
            [node("A", 0, 0, 0, support={}), node("m", 5, 0, 0), node("B", 10, 0, 0, support={})],
            [rope("a", "A", "m"), rope("b", "m", "B")],
            [length_of("a", l0 / 2), length_of("b", l0 / 2)],
            loads=[{"move": {"node": "B", "by_m": list(by)}}],
        ),
        [
            ("tensions (N)", [tension, tension], array("case", "tension_n")),
            ("middle (m)", ends / 2, at_node("case", "position_m", "m")),
            ("force on the net (N)", tension * ends / length, at_support("case", "support_force_n", "B")),
        ],
        absolute=1e-5,
    )


def coupled():
    span, l0 = 8.0, np.array([7.97, 7.99])
    wall = np.array([[8e5, -3e5], [-3e5, 5e5]])
    stiffness = np.kron(wall, np.diag([1.0, 0.0, 0.0])) + np.kron(np.eye(2), np.diag([0.0, 4e6, 4e6]))
    ropes = EA / l0
    tight = ropes * (span - l0)
    moved = np.linalg.solve(wall + np.diag(ropes), -tight)
    tensions = tight + ropes * moved
    return ClosedForm(
        "support stiffness matrix",
        brief(
            [
                node("A0", 0, 0, 1, support={}), node("A1", 0, 2, 1, support={}),
                node("W0", span, 0, 1, support={}), node("W1", span, 2, 1, support={}),
            ],
            [rope("a", "A0", "W0"), rope("b", "A1", "W1")],
            [length_of("a", l0[0]), length_of("b", l0[1])],
            groups=[{"id": "wall", "nodes": ["W0", "W1"], "stiffness_n_per_m": list(stiffness.ravel())}],
        ),
        [
            ("tensions (N)", tensions, array("reference", "tension_n")),
            ("movement of the wall (m)", moved[0] + span, lambda run: run.at_node("reference", "position_m", "W0")[0]),
            ("force on the net (N)", [tensions[1], 0, 0], at_support("reference", "support_force_n", "W1")),
        ],
        absolute=1e-5,
    )


# Loads ---------------------------------------------------------------------------------------------------------------

def inclined(name, load, force):
    """A straight rope, half of it 4 m on plan and 3 m high; a force across it at its middle: 2 N d / l = P."""
    l0 = 5 / 1.005
    d = root(0.0, 5.0, lambda d: 2 * EA * (hypot(5, d) / l0 - 1) * d / hypot(5, d) - force)
    tension = EA * (hypot(5, d) / l0 - 1)
    return ClosedForm(
        name,
        brief(
            [node("A", 0, 0, 0, support={}), node("m", 4, 0, 3), node("B", 8, 0, 6, support={})],
            [rope("c", "A", "m", "B")],
            [{"on": ["c"], "unstressed_length_m": l0}],
            loads=[load],
        ),
        [
            ("deflection (m)", [0, d, 0], at_node("case", "displacement_m", "m")),
            ("tensions (N)", [tension, tension], array("case", "tension_n")),
        ],
    )


def nodal():
    return inclined("load on a node", force_on("m", 0, 1500, 0), 1500.0)


def per_unstressed_length():
    load = {"on_length": {"on": ["c"], "force_n_per_m": [0.0, 350.0, 0.0]}}
    return inclined("load per unstressed length", load, 350.0 * 5 / 1.005)


def per_plan_length():
    load = {"on_plan_length": {"on": ["c"], "force_n_per_m": [0.0, 350.0, 0.0]}}
    return inclined("load per plan length", load, 350.0 * 4)


def own_weight():
    ea, mass_per_length, lamp, gravity = 5e6, 4.0, 300.0, 9.80665
    tensions = [gravity * (lamp + mass_per_length * 14), gravity * (lamp + mass_per_length * 4)]
    return ClosedForm(
        "load own weight with an attached mass",
        brief(
            [node("top", 0, 0, 0, support={}), node("m", 0, 0, -12), node("lamp", 0, 0, -20, mass=lamp)],
            [rope("a", "top", "m"), rope("b", "m", "lamp")],
            [length_of("a", 12.0), length_of("b", 8.0)],
            sections=[{"id": "rope", "axial_stiffness_n": ea, "mass_kg_per_m": mass_per_length}],
            always=[{"own_weight": {}}],
        ),
        [
            ("tensions (N)", tensions, array("reference", "tension_n")),
            (
                "the lamp hangs at (m)", -20 - (12 * tensions[0] + 8 * tensions[1]) / ea,
                lambda run: run.at_node("reference", "position_m", "lamp")[2],
            ),
            (
                "force on the net (N)", [0, 0, gravity * (lamp + 20 * mass_per_length)],
                at_support("reference", "support_force_n", "top"),
            ),
        ],
        absolute=1e-8,
    )


def temperature():
    expansion, change = 12e-6, 35.0
    warm = 2.98 * (1 + expansion * change)
    tension = EA * (10 - warm - 6.97) / (warm + 6.97)
    given = brief(
        [node("A", 0, 0, 0, support={}), node("m", 3, 0, 0), node("B", 10, 0, 0, support={})],
        [rope("a", "A", "m"), rope("b", "m", "B")],
        [length_of("a", 2.98), length_of("b", 6.97)],
        sections=[{"id": "rope", "axial_stiffness_n": EA, "expansion_per_k": expansion}],
        loads=[{"temperature": {"change_k": change, "on": ["a"]}}],
    )
    given["net"]["reference_temperature_deg_c"] = 10.0
    return ClosedForm(
        "load temperature",
        given,
        [
            ("tensions (N)", [tension, tension], array("case", "tension_n")),
            ("joint (m)", [warm * (1 + tension / EA), 0, 0], at_node("case", "position_m", "m")),
        ],
    )


def prestress_share():
    return ClosedForm(
        "load prestress share",
        brief(
            [node("A", 0, 0, 0, support={}), node("m", 4, 0, 3), node("B", 8, 0, 6, support={})],
            [rope("c", "A", "m", "B")],
            [{"on": ["c"], "tension_n": 10e3}],
            loads=[{"prestress": {"share": 0.3, "on": ["c"]}}],
        ),
        [
            ("tensions (N)", [13e3, 13e3], array("case", "tension_n")),
            ("unstressed lengths (m)", [5 / (1 + 13e3 / EA)] * 2, array("case", "unstressed_length_m")),
            ("middle stays (m)", [0, 0, 0], at_node("case", "displacement_m", "m")),
        ],
    )


# Rules of prestress --------------------------------------------------------------------------------------------------

def force_density():
    anchors = np.array([[0.0, 0.0, 3.0], [8.0, 1.0, 0.0], [2.0, 7.0, 1.0]])
    q = np.array([2000.0, 3000.0, 5000.0])
    mean = q @ anchors / q.sum()
    lengths = np.linalg.norm(anchors - mean, axis=1)
    return ClosedForm(
        "rule force density",
        brief(
            [node(f"A{i}", *at, support={}) for i, at in enumerate(anchors)],
            [rope(f"c{i}", f"A{i}", "m") for i in range(3)],
            [{"on": [f"c{i}"], "force_density_n_per_m": q[i]} for i in range(3)],
        ),
        [
            ("node (m)", mean, at_node("reference", "position_m", "m")),
            ("tensions (N)", q * lengths, array("reference", "tension_n")),
            ("unstressed lengths (m)", lengths / (1 + q * lengths / EA), array("reference", "unstressed_length_m")),
        ],
    )


def star(name, rule):
    """Three ropes with one tension meet at angles of 120 degrees (Torricelli's point)."""
    half = 3.0
    return ClosedForm(
        name,
        brief(
            [node("L", -half, 0, 2, support={}), node("R", half, 0, 2, support={}), node("T", 0, 7, 2, support={})],
            [rope("a", "L", "m"), rope("b", "R", "m"), rope("c", "T", "m")],
            [{"on": ["a", "b", "c"], **rule}],
        ),
        [
            ("tensions (N)", [12e3] * 3, array("reference", "tension_n")),
            ("node (m)", [0, half / sqrt(3), 2], at_node("reference", "position_m", "m")),
        ],
        absolute=1e-8,
        source="Torricelli's point (from memory)",
    )


def tension():
    return star("rule tension", {"tension_n": 12e3})


def share_of_breaking():
    return star("rule share of breaking", {"share_of_breaking": 0.12})


def mean_tension():
    third, load, wanted = 4.0, 3000.0, 20e3
    q = root(1.0, 1e6, lambda q: q * (2 * hypot(third, load / q) + third) / 3 - wanted)
    steep = q * hypot(third, load / q)
    return ClosedForm(
        "rule mean tension",
        brief(
            [node("A", 0, 0, 0, support={}), node("B", 3 * third, 0, 0, support={})],
            [rope("c", "A", "m1", "m2", "B")],
            [{"on": ["c"], "mean_tension_n": wanted}],
            always=[force_on("m1", 0, 0, -load), force_on("m2", 0, 0, -load)],
        ),
        [
            ("mean (N)", wanted, lambda run: run.array("reference", "tension_n").mean()),
            ("tensions (N)", [steep, q * third, steep], array("reference", "tension_n")),
            ("node (m)", [third, 0, -load / q], at_node("reference", "position_m", "m1")),
        ],
        relative=1e-8,
    )


def unstressed_length():
    l0 = [2.99, 4.98]
    pull = EA * (8 - sum(l0)) / sum(l0)
    return ClosedForm(
        "rule unstressed length",
        brief(
            [node("A", 0, 0, 0, support={}), node("B", 8, 0, 0, support={}), node("m", 1, 1, 1)],
            [rope("a", "A", "m"), rope("b", "m", "B")],
            [length_of("a", l0[0]), length_of("b", l0[1])],
        ),
        [
            ("tensions (N)", [pull, pull], array("reference", "tension_n")),
            ("joint (m)", [8 * l0[0] / sum(l0), 0, 0], at_node("reference", "position_m", "m")),
        ],
    )


def balance():
    pull = 16e3
    guy = sqrt(50) * pull / 8
    return ClosedForm(
        "rule balance",
        brief(
            [
                node("foot", 0, 0, 0, support={}), node("head", 0, 0, 5), node("wall", 10, 0, 5, support={}),
                node("g1", -4, -3, 0, support={}), node("g2", -4, 3, 0, support={}),
            ],
            [rope("c", "head", "wall"), rope("a", "head", "g1", section="guy"), rope("b", "head", "g2", section="guy")],
            [{"on": ["c"], "tension_n": pull}, {"on": ["a", "b", "mast"], "balance": {}}],
            sections=[
                {"id": "rope", "axial_stiffness_n": EA}, {"id": "guy", "axial_stiffness_n": 2e7},
                {"id": "tube", "axial_stiffness_n": 5e8},
            ],
            struts=[{"id": "mast", "section": "tube", "nodes": ["foot", "head"]}],
            hold=["head"],
        ),
        [
            ("rope and guys (N)", [pull, guy, guy], array("reference", "tension_n")),
            ("mast (N)", [-1.25 * pull], array("reference", "axial_force_n")),
            ("the head stays (m)", [0, 0, 5], at_node("reference", "position_m", "head")),
        ],
    )


# Skins and ropes in the wind ------------------------------------------------------------------------------------------

def clothed(name, load, upwards, **case):
    """A square of 10 m with a skin, its corners fixed, its middle on four ropes; a third of each panel's load goes there.

    `upwards`: sum of the load (N). The middle moves up or down, so that areas on plan stay: 4 N h / l = P / 3.
    """
    l0 = 7.0
    corners = {"a": (-5, -5), "b": (5, -5), "c": (5, 5), "d": (-5, 5)}

    def resists(h):
        length = sqrt(50 + h * h)
        return 4 * EA * (length / l0 - 1) * h / length

    height = np.sign(upwards) * root(1e-3, 5, lambda h: resists(h) - abs(upwards) / 3)
    given = brief(
        [node(i, x, y, 0, support={}) for i, (x, y) in corners.items()] + [node("m", 0, 0, 0)],
        [rope("rim", "a", "b", "c", "d", "a"), *[rope(f"s{i}", i, "m") for i in corners]],
        [length_of("rim", 10.0)] + [length_of(f"s{i}", l0) for i in corners],
        loads=[load],
    )
    given["net"]["skins"] = [{"id": "cloth", "between": ["rim", "sa", "sb", "sc", "sd"], "mass_kg_per_m2": 1.2}]
    given["net"]["zones"] = [{"id": "all", "skin": "cloth", "outline_xy_m": [-6, -6, 6, -6, 6, 6, -6, 6]}]

    def vertical(run):
        return run.cases["case"].summary.load_sum_n[2]

    def lever(run):
        summary = run.cases["case"].summary
        return (np.array(summary.load_moment_nm) + np.array(summary.support_moment_nm)) / upwards

    return ClosedForm(
        name,
        given,
        [
            ("height of the middle (m)", [0, 0, height], at_node("case", "position_m", "m")),
            ("sum of the load (N)", upwards, vertical),
            ("moment of loads and supports over the load (m)", [0, 0, 0], lever),
        ],
        absolute=1e-7,
        **case,
    )


def snow():
    return clothed("load on plan", {"on_plan": {"on": ["cloth"], "pressure_pa": 600}}, -600 * 100)


def suction():
    load = {"on_surface": {"pressure_pa": 500, "coefficients": {"all": -0.9}}}
    return clothed("load on surface", load, 0.9 * 500 * 100, relative=1e-6)


def along_ropes(name, load, force):
    """A level rope of two reaches of 5 m; half of what each bears goes to its middle."""
    l0 = 5 / 1.005
    size = hypot(*force)
    moved = root(1e-9, 3, lambda d: 2 * EA * (hypot(5, d) / l0 - 1) * d / hypot(5, d) - size)
    place = [0, moved * force[0] / size, moved * force[1] / size]
    return ClosedForm(
        name,
        brief(
            [node("A", -5, 0, 0, support={}), node("B", 5, 0, 0, support={}), node("m", 0, 0, 0)],
            [rope("r", "A", "m", "B")],
            [length_of("r", l0)],
            sections=[{"id": "rope", "axial_stiffness_n": EA, "diameter_m": 0.02}],
            loads=[load],
        ),
        [("where the middle goes (m)", place, at_node("case", "position_m", "m"))],
    )


def wind_on_a_rope():
    wind = {"pressure_pa": 800, "along": [0, 3, 0], "drag_coefficient": 1.1, "on": ["r"]}
    return along_ropes("load wind on ropes", {"wind_on_ropes": wind}, [800 * 1.1 * 0.02 * 5, 0])


def ice_on_a_rope():
    ring = np.pi * (0.035**2 - 0.01**2)
    weight = 9.80665 * 900 * ring * 5 / 1.005
    return along_ropes("load ice", {"ice": {"thickness_m": 0.025, "on": ["r"]}}, [0, -weight])


ALL = [
    rigid(), on_a_rail(0.0), sprung(0.0), sprung(0.02), on_a_rail(1.5e6), prescribed_movement(), coupled(),
    nodal(), own_weight(), per_unstressed_length(), per_plan_length(), temperature(), prestress_share(),
    force_density(), tension(), mean_tension(), unstressed_length(), share_of_breaking(), balance(),
    snow(), suction(), wind_on_a_rope(), ice_on_a_rope(),
]
