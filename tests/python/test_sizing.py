"""Choice of sections over the wire, against a run of every choice and the lightest that passes."""

import itertools

import numpy as np

import stubs
import talk
from closed_forms import brief, force_on, node, rope
from report import check

# Invented ropes: mass grows a little faster than strength, so that the lightest choice is not the smallest everywhere.
SECTIONS = [
    {"id": f"d{d}", "axial_stiffness_n": 65e3 * d * d, "mass_kg_per_m": 0.0041 * d**2.1, "breaking_force_n": 820.0 * d * d,
     "expansion_per_k": 12e-6}
    for d in (8, 10, 12, 16, 20)
]


def bare(carrying, bracing):
    """Two ropes that cross, under snow and in the cold, with a strength check and one of movement."""
    given = brief(
        [
            node("A", 0, 0, 3, support={}), node("C", 9, 9, 3, support={}),
            node("B", 9, 0, 0, support={}), node("D", 0, 9, 0, support={}),
        ],
        [rope("carrying", "A", "m", "C", section=carrying), rope("bracing", "B", "m", "D", section=bracing)],
        [{"on": ["carrying", "bracing"], "force_density_n_per_m": 2500}],
        sections=SECTIONS,
    )
    given["actions"] = [
        {"id": "snow", "loads": [force_on("m", 0, 0, -14e3)]},
        {"id": "uplift", "loads": [force_on("m", 0, 0, 9e3)]},
        {"id": "cold", "loads": [{"temperature": {"change_k": -25.0}}]},
    ]
    given["cases"] = [
        {"id": "winter", "factors": {"snow": 1.0, "cold": 1.0}}, {"id": "storm", "factors": {"uplift": 1.0}},
    ]
    given["net"]["reference_temperature_deg_c"] = 10.0
    given["checks"] = [{"safety": {"factor": 3.0}}, {"movement": {"limit_m": 0.06}}]
    return given


def test_the_lightest_choice_is_found(channel):
    names = [section["id"] for section in SECTIONS]
    mass_per_length = {section["id"]: section["mass_kg_per_m"] for section in SECTIONS}
    length = 2 * np.hypot(4.5 * 2**0.5, 1.5)
    passing = {}
    for carrying, bracing in itertools.product(names, names):
        run = talk.run(channel, bare(carrying, bracing))
        if all(result.verdict == stubs.result.VERDICT_PASSES for result in run.summary.checks):
            passing[carrying, bracing] = length * (mass_per_length[carrying] + mass_per_length[bracing])
    assert 0 < len(passing) < len(names) ** 2
    best = min(passing, key=passing.get)
    # It is a choice: neither the same section for both nor the smallest for one.
    assert best[0] != best[1] and names[0] not in best, best

    given = bare("d8", "d8")
    given["sizing"] = {
        "on": ["carrying"], "sections": names, "choices": [{"on": ["bracing"], "sections": names}],
    }
    run = talk.run(channel, given)
    sizing = next(event.sizing for event in run.events if event.WhichOneof("event") == "sizing")
    assert sizing.passes and sizing.proven
    assert tuple(choice.section for choice in sizing.choices) == best
    source = "a run of each of the 25 choices, the lightest that passes"
    check("sizing: mass (kg)", source, passing[best], sizing.mass_kg, relative=1e-9)
    # What the run tells is the net of the chosen sections.
    chosen = talk.run(channel, bare(*best))
    for case in ("reference", "winter", "storm"):
        check(
            f"sizing: tensions, {case} (N)", "a run with the sections written in",
            chosen.array(case, "tension_n"), run.array(case, "tension_n"), relative=1e-12,
        )
    ratios = [result.ratio for result in chosen.summary.checks]
    check("sizing: ratios (-)", "a run with the sections written in", ratios,
          [result.ratio for result in run.summary.checks], relative=1e-12)


def test_lists_that_are_too_small_say_what_is_needed(channel):
    given = bare("d8", "d8")
    given["sizing"] = {"on": ["carrying", "bracing"], "sections": ["d8", "d10"]}
    run = talk.run(channel, given)
    sizing = next(event.sizing for event in run.events if event.WhichOneof("event") == "sizing")
    assert not sizing.passes and sizing.proven and sizing.needs
    for need in sizing.needs:
        print(need.check, need.id, need.message)
        assert need.ratio > 1.0 and need.governing_case in ("winter", "storm")
