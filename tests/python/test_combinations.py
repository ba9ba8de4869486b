"""Rules that combine actions, over the wire: what they make against trying out every choice, and the two rules that a
standard states on effects against bisection on the balance of one node."""

import itertools
import random
from math import hypot

import pytest

import stubs
import talk
from closed_forms import force_on, node, root, rope
from report import check

TWO_BARS = "two bars under a load across, by bisection (our own)"


def by_trying(rule, classes, pair=False):
    """Factors of every sum that a rule of EN 1990:2002 asks for, from the text of its expressions.

    `classes`: name, kind, factors, ids of actions. Each action stays away, leads or accompanies: all ways are tried.
    """
    actions = [(action, kind, factors) for _, kind, factors, ids in classes for action in ids]
    found = set()
    for roles in itertools.product(("away", "leads", "beside"), repeat=len(actions)):
        acting = {action: role for (action, kind, _), role in zip(actions, roles) if kind == "variable"}
        if any(role != "away" for (_, kind, _), role in zip(actions, roles) if kind != "variable"):
            continue
        if any(sum(acting[a] != "away" for a in ids) > 1 for _, kind, _, ids in classes if kind == "variable"):
            continue
        n_lead = sum(role == "leads" for role in acting.values())
        n_beside = sum(role == "beside" for role in acting.values())
        for expression in ("a", "b") if pair else ("",):
            with_leader = rule != "quasi_permanent" and expression != "a"
            if with_leader and not (n_lead == 1 or n_lead + n_beside == 0) or not with_leader and n_lead:
                continue
            for permanent in ("adverse", "favourable"):
                sums = {}
                for action, kind, factors in actions:
                    if kind == "permanent":
                        value = factors[permanent] if rule == "fundamental" else 1.0
                        value *= 0.85 if expression == "b" and permanent == "adverse" else 1.0
                    elif acting[action] == "away":
                        continue
                    else:
                        gamma = factors["gamma"] if rule == "fundamental" else 1.0
                        leading, beside = {
                            "fundamental": (1.0, factors["psi0"]),
                            "characteristic": (1.0, factors["psi0"]),
                            "frequent": (factors["psi1"], factors["psi2"]),
                            "quasi_permanent": (None, factors["psi2"]),
                        }[rule]
                        value = gamma * (leading if acting[action] == "leads" else beside)
                    if round(value, 9):
                        sums[action] = round(value, 9)
                if sums:
                    found.add(frozenset(sums.items()))
    return found


def in_words(text):
    """Factors from the words of a case."""
    return frozenset((action, round(float(factor), 9)) for factor, action in (term.split(" ") for term in text.split(" + ")))


@pytest.mark.parametrize("seed", range(20))
def test_rules_make_every_case_and_no_other(channel, seed):
    rng = random.Random(seed)
    classes, n = [], 0
    for number in range(rng.randint(1, 3)):
        ids = [f"a{n + k}" for k in range(rng.randint(1, 3))]
        n += len(ids)
        if rng.random() < 0.3:
            classes.append((f"c{number}", "permanent", {"adverse": 1.35, "favourable": 1.0}, ids))
        else:
            psi = sorted((rng.choice((0.0, 0.2, 0.5, 0.7)) for _ in range(3)), reverse=True)
            classes.append((f"c{number}", "variable", dict(zip(("psi0", "psi1", "psi2"), psi), gamma=1.5), ids))
    rule = rng.choice(("fundamental", "characteristic", "frequent", "quasi_permanent"))
    pair = rule == "fundamental" and rng.random() < 0.5
    wanted = by_trying(rule, classes, pair)
    brief = two_bars()
    brief["actions"] = [
        {"id": action, "class": name, "loads": [force_on("m", 0, 0, -1)]} for name, _, _, ids in classes for action in ids
    ]
    brief["factors"] = {
        "source": "invented", "classes": [{"id": name, kind: factors} for name, kind, factors, _ in classes]
    }
    brief["combinations"] = [{"set": "made", rule: {"pair": {}} if pair else {}}]
    stub = stubs.service_grpc.BriefServiceStub(channel)
    report = list(stub.Check(stubs.service.CheckRequest(brief=talk.as_message(brief)), timeout=60))
    found = [in_words(case.in_words) for part in report for case in part.cases]
    errors = [finding.reason for part in report for finding in part.findings if finding.severity == 1]
    if wanted:
        assert not errors and len(found) == len(set(found)) and set(found) == wanted
    else:
        assert errors == ["COMBINATION_WITHOUT_ACTIONS"] and not found


def two_bars():
    """Two bars of 6 m in a line, EA 2400 kN, pulled to 18 kN."""
    return {
        "id": "two-bars",
        "net": {
            "nodes": [node("A", -6, 0, 0, support={}), node("m", 0, 0, 0), node("B", 6, 0, 0, support={})],
            "cables": [rope("left", "A", "m"), rope("right", "m", "B")],
            "sections": [{"id": "rope", "axial_stiffness_n": 2.4e6, "breaking_force_n": 100e3}],
        },
        "prestress": {"rules": [{"on": ["left", "right"], "tension_n": 18e3}]},
    }


def sag_and_tension(load):
    """Movement (m) and tension (N) of the two bars under a load across, from the balance of the middle."""
    ea, l0 = 2.4e6, 6 / (1 + 18e3 / 2.4e6)

    def tension(d):
        return ea * (hypot(6, d) / l0 - 1)

    d = root(0.0, 2.0, lambda d: 2 * tension(d) * d / hypot(6, d) - load)
    return d, tension(d)


def test_factors_on_actions_and_on_effects(channel):
    brief = two_bars()
    brief["actions"] = [{"id": "load", "class": "imposed", "loads": [force_on("m", 0, 0, -1500)]}]
    factors = {"gamma": 1.5, "psi0": 0.7, "psi1": 0.5, "psi2": 0.3}
    brief["factors"] = {"source": "invented", "classes": [{"id": "imposed", "variable": factors}]}
    brief["combinations"] = [{"set": "ultimate", "fundamental": {"on_effect": {"set": "ultimate"}}}]
    brief["cases"] = [{"id": "grows", "factors": {"load": 1}, "path": {}}]
    brief["checks"] = [{"safety": {"factor": 2}, "over": ["ultimate"]}]
    run = talk.run(channel, brief)
    (d, t), (_, t_factored) = sag_and_tension(1500), sag_and_tension(2250)
    # The digits of the worked example: 0.228058 m, 19.74606, 21.36055 and 29.61908 kN, 0.721.
    assert (round(d, 6), round(t, 2), round(t_factored, 2)) == (0.228058, 19746.06, 21360.55)
    action, effect = "ultimate-001", "ultimate-001-on-effect"
    close = {"relative": 1e-9, "absolute": 0.0}
    check("factor on the action: tensions (N)", TWO_BARS, [t_factored] * 2, run.array(action, "tension_n"), **close)
    check("factor on the effect: tensions (N)", TWO_BARS, [1.5 * t] * 2, run.array(effect, "tension_n"), **close)
    index = t_factored / (1.5 * t)
    check("index of over-linearity", TWO_BARS, [index] * 2, run.array(effect, "over_linearity"), **close)
    assert round(index, 3) == 0.721
    told = run.effects[effect]
    assert (told.rule, told.beside, told.factor) == (stubs.effect.EFFECT_RULE_ON_EFFECT, action, 1.5)
    assert [member.index for member in told.members] == pytest.approx([index] * 2, rel=1e-9)
    check("factor on the effect: movement (m)", TWO_BARS, 1.5 * d, told.largest_movement_m, **close)
    # The larger of both governs the check.
    assert run.summary.checks[0].governing_case == effect
    check("demand of the check (N)", TWO_BARS, 2 * 1.5 * t, run.summary.checks[0].demand, **close)
    # Does twice the load give twice the effect? 15 steps to 1.5 of it.
    loads = run.array("grows", "path_load_factor")
    check("path: load factors", TWO_BARS, [k / 10 for k in range(16)], loads, absolute=1e-15, relative=0.0)
    expected = [sag_and_tension(1500 * factor) for factor in loads]
    moved, tensions = zip(*expected)
    check("path: movements (m)", TWO_BARS, moved, run.array("grows", "path_movement_m"), absolute=1e-9, relative=1e-9)
    check("path: tensions (N)", TWO_BARS, [tensions] * 2, run.array("grows", "path_tension_n"), **close)


def test_a_loss_with_its_factor(channel, briefs):
    """Two ropes that cross: by symmetry the crossing moves up and down only, also when one of them is lost."""
    brief = {
        "id": "loss",
        "net": {
            "nodes": [
                node("A", 0, 0, 3, support={}), node("B", 9, 0, 0, support={}),
                node("C", 9, 9, 3, support={}), node("D", 0, 9, 0, support={}),
            ],
            "cables": [rope("carrying", "A", "m", "C"), rope("bracing", "B", "m", "D")],
            "sections": [{"id": "rope", "axial_stiffness_n": 6.5e6, "breaking_force_n": 82e3}],
        },
        "prestress": {"rules": [{"on": ["carrying", "bracing"], "force_density_n_per_m": 3000}]},
        "actions": [{"id": "snow", "class": "snow", "loads": [force_on("m", 0, 0, -5000)]}],
        "factors": {
            "source": "invented",
            "classes": [{"id": "snow", "variable": {"gamma": 1.5, "psi0": 0.5, "psi1": 1.0, "psi2": 0}}],
        },
        "combinations": [{"set": "loss", "accidental": {"remove_each": ["bracing"], "effect_factor": 1.5}}],
    }
    run = talk.run(channel, brief)
    ea, half = 6.5e6, 4.5 * 2**0.5
    length = hypot(half, 1.5)
    l0 = length / (1 + 3000 * length / ea)

    def state(bracing):
        def forces(z):
            ropes = [(3 - z, True), (z, bracing)]
            return [max(0.0, ea * (hypot(half, h) / l0 - 1)) * there for h, there in ropes]

        def out_of_balance(z):
            up, down = forces(z)
            return 2 * up * (3 - z) / hypot(half, 3 - z) - 2 * down * z / hypot(half, z) - 5000

        z = root(0.0, 2.0, out_of_balance)
        return z, *forces(z)

    intact, lost = state(True), state(False)
    source = "two ropes that cross, one of them lost, by bisection (our own)"
    z, up, _ = (a + 1.5 * (b - a) for a, b in zip(intact, lost))
    names = ("loss-002", "loss-002-without-bracing", "loss-002-without-bracing-effect")
    for name, tension, height in zip(names, (intact[1], lost[1], up), (intact[0], lost[0], z)):
        check(f"{name}: carrying rope (N)", source, [tension] * 2, run.array(name, "tension_n")[:2], relative=1e-9)
        moved = run.at_node(name, "displacement_m", "m")[2]
        check(f"{name}: crossing moves (m)", source, height - 1.5, moved, relative=1e-9, absolute=1e-9)
    (row,) = run.losses
    assert list(row.removed) == ["bracing"] and row.cases == 2 and row.factor == 1.5 and not row.unanswered
    check("largest tension after the loss (N)", source, max(up, lost[1], 1.0), row.worst[0].force_n, relative=1e-9)
