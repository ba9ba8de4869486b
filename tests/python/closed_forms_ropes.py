"""Briefs with answers by hand: ropes that slide, hang and are drawn in by adjusters."""

from math import exp, hypot, pi

import numpy as np
import scipy.optimize

from closed_forms import EA, ClosedForm, array, at_node, at_support, brief, force_on, length_of, node, rope


# Sliding -------------------------------------------------------------------------------------------------------------

def over_an_edge(name, first, then, friction, edge):
    """A rope from an anchor, level to an edge and down to a weight: `first` (N) in the reference state, `then` in the case.

    `edge`: tension of the level piece (N) in the case.
    """
    l0 = 7.0
    level = 4 / (1 + edge / EA)
    deep = (l0 - level) * (1 + then / EA)
    slides = {"at": ["edge"]}
    if friction:
        slides["friction_coefficient"] = friction
    before = 4 / (1 + first / EA)
    return ClosedForm(
        name,
        brief(
            [node("A", -4, 0, 0, support={}), node("edge", 0, 0, 0, support={}), node("w", 0, 0, -2)],
            [rope("r", "A", "edge", "w") | {"slides": slides}],
            [length_of("r", l0)],
            always=[force_on("w", 0, 0, -first)],
            loads=[force_on("w", 0, 0, first - then)],
        ),
        [
            ("tensions (N)", [edge, then], array("case", "tension_n")),
            ("the weight hangs at (m)", [0, 0, -deep], at_node("case", "position_m", "w")),
            ("rope that has passed the edge (m)", [before - level], array("case", "slid_m")),
            ("force at the edge (N)", [edge, 0, then], at_support("case", "support_force_n", "edge")),
            ("in the reference state it slides freely (N)", [first] * 2, array("reference", "tension_n")),
        ],
        absolute=1e-8,
        source="capstan of Euler and Eytelwein, by hand (our own)",
    )


def slips_on():
    return over_an_edge("sliding towards the weight", 1000, 9000, 0.3, 9000 * exp(-0.3 * pi / 2))


def slips_back():
    return over_an_edge("sliding back from the weight", 9000, 1000, 0.3, 1000 * exp(0.3 * pi / 2))


def sticks():
    # exp(0.3 pi/2) = 1.60: nothing passes, so that the level piece keeps its tension.
    return over_an_edge("sliding held by friction", 3000, 4500, 0.3, 3000)


def slides_freely():
    return over_an_edge("sliding without friction", 1000, 9000, None, 9000)


def pulley():
    """A weight on a pulley: the rope is an ellipse's string, and rises equally steep to both sides; `T = W / (2 cos phi)`."""
    l0, weight, span = 11.0, 3000.0, 9.0

    def out_of_balance(tension):
        stretched = l0 * (1 + tension / EA)
        return tension - weight / 2 / np.sqrt(1 - (span / stretched) ** 2)

    tension = scipy.optimize.brentq(out_of_balance, 1.0, 1e5, xtol=1e-12, rtol=1e-15)
    stretched = l0 * (1 + tension / EA)
    up = np.sqrt(stretched**2 - span**2)
    # Left it climbs 3 m more than half of what is left, right 1 m more.
    rise = (up + 2) / 2
    left = rise * span / up
    return ClosedForm(
        "sliding pulley",
        brief(
            [node("A", 0, 0, 3, support={}), node("m", 1, 0.2, 0), node("B", 9, 0, 1, support={})],
            [rope("r", "A", "m", "B") | {"slides": {}}],
            [length_of("r", l0)],
            always=[force_on("m", 0, 0, -weight)],
        ),
        [
            ("tensions (N)", [tension] * 2, array("reference", "tension_n")),
            ("the pulley (m)", [left, 0, 3 - rise], at_node("reference", "position_m", "m")),
        ],
        absolute=1e-6,
    )


# Hanging -------------------------------------------------------------------------------------------------------------

def catenary_span(horizontal, up, l0, ea, weight):
    """End of an elastic catenary from its start, which is held by `-horizontal` and `up` (N) (Irvine 1981)."""
    left = up - weight * l0
    x = horizontal * l0 / ea + horizontal / weight * (np.arcsinh(up / horizontal) - np.arcsinh(left / horizontal))
    z = (left**2 - up**2) / (2 * ea * weight) + (hypot(horizontal, left) - hypot(horizontal, up)) / weight
    return np.array([x, z])


def hanging(name, dx, dz, l0, ea, weight):
    """A rope that hangs between two anchors in pieces of unequal length, its inner node on the curve."""
    # The logarithm keeps the horizontal force positive: there is a second root of the equations below zero.
    logarithm, up = scipy.optimize.fsolve(
        lambda y: catenary_span(np.exp(y[0]), y[1], l0, ea, weight) - [dx, dz],
        [np.log(weight * dx), weight * l0 / 2], xtol=1e-12,
    )
    horizontal = np.exp(logarithm)
    assert np.allclose(catenary_span(horizontal, up, l0, ea, weight), [dx, dz], rtol=0, atol=1e-10)
    share = 0.3
    x, z = catenary_span(horizontal, up, share * l0, ea, weight)
    left = up - weight * l0
    gravity = 9.80665
    return ClosedForm(
        name,
        brief(
            [node("A", 0, 0, 0, support={}), node("m", share * dx, 0.1, share * dz), node("B", dx, 0, dz, support={})],
            [rope("a", "A", "m") | {"hangs": {}}, rope("b", "m", "B") | {"hangs": {}}],
            [length_of("a", share * l0), length_of("b", (1 - share) * l0)],
            sections=[{"id": "rope", "axial_stiffness_n": ea, "mass_kg_per_m": weight / gravity}],
            always=[{"own_weight": {}}],
        ),
        [
            ("force at A (N)", [-horizontal, 0, up], at_support("reference", "support_force_n", "A")),
            ("force at B (N)", [horizontal, 0, -left], at_support("reference", "support_force_n", "B")),
            ("a node on the curve (m)", [x, 0, z], at_node("reference", "position_m", "m")),
            (
                "larger tension of each piece (N)",
                [
                    max(hypot(horizontal, up), hypot(horizontal, up - share * weight * l0)),
                    max(hypot(horizontal, left), hypot(horizontal, up - share * weight * l0)),
                ],
                array("reference", "tension_n"),
            ),
            (
                "weight (N)", [0, 0, -weight * l0],
                lambda run: np.array(run.cases["reference"].summary.load_sum_n),
            ),
        ],
        relative=1e-8,
        absolute=1e-6,
        source="elastic catenary (Irvine 1981, from memory), its ends by scipy.optimize.fsolve",
    )


# Adjusters -----------------------------------------------------------------------------------------------------------

def adjusted(name, amount, change):
    """A straight rope of two reaches; the adjuster at B changes the length of the second alone."""
    # The reference tension decides the lengths.
    lengths = np.array([4.0, 6.0]) / (1 + 12e3 / EA)
    after = lengths + [0, change]
    tension = EA * (10 - after.sum()) / after.sum()
    given = brief(
        [node("A", 0, 0, 0, support={}), node("m", 4, 0, 0), node("B", 10, 0, 0, support={})],
        [rope("r", "A", "m", "B")],
        [{"on": ["r"], "tension_n": 12e3}],
        loads=[{"adjust": {"adjuster": "bottle", **amount}}],
    )
    given["net"]["adjusters"] = [
        {"id": "bottle", "cable": "r", "at": "B", "in_m": 0.1, "out_m": 0.1, "per_turn_m": 0.004}
    ]
    return ClosedForm(
        name,
        given,
        [
            ("tensions (N)", [tension] * 2, array("case", "tension_n")),
            ("unstressed lengths (m)", after, array("case", "unstressed_length_m")),
            ("joint (m)", [after[0] * (1 + tension / EA), 0, 0], at_node("case", "position_m", "m")),
        ],
    )


ALL = [
    slips_on(), slips_back(), sticks(), slides_freely(), pulley(),
    hanging("hanging level", 100, 0, 105, 2e7, 60), hanging("hanging steeply", 100, 40, 130, 5e6, 120),
    hanging("hanging taut", 80, -12, 80.7, 3e7, 45),
    adjusted("adjuster drawn in by turns", {"turns": -3}, -0.012),
    adjusted("adjuster let out", {"open_m": 0.02}, 0.02),
]
