"""Targets of a shape against SciPy's least squares on the same wishes, by an own force-density solve."""

import numpy as np
import scipy.optimize

import stubs
import talk
from report import check

SOURCE = "scipy.optimize.least_squares on the same deviations"


def saddle():
    """A saddle of three ropes each way; nodes by name, ropes as paths."""
    at = lambda u, w: (4.0 * u, 4.0 * w, 1.5 * (u * u - w * w))  # noqa: E731
    place = {1: -0.5, 2: 0.0, 3: 0.5}
    held, paths = {}, {}
    for k, p in place.items():
        held |= {f"w{k}": at(-1, p), f"e{k}": at(1, p), f"s{k}": at(p, -1), f"n{k}": at(p, 1)}
        paths[f"c{k}"] = [f"w{k}", *(f"m{i}{k}" for i in place), f"e{k}"]
        paths[f"b{k}"] = [f"s{k}", *(f"m{k}{j}" for j in place), f"n{k}"]
    return held, paths


def brief(held, paths, targets, load):
    inner = sorted({n for path in paths.values() for n in path} - set(held))
    return {
        "id": "targets",
        "net": {
            "nodes": [{"id": n, "xyz_m": list(x), "support": {}} for n, x in held.items()],
            "sections": [{"id": "r", "axial_stiffness_n": 8e6}],
            "roles": [{"id": "rope", "section": "r"}],
            "cables": [{"id": c, "role": "rope", "nodes": path} for c, path in paths.items()],
        },
        "prestress": {
            "under": ["load"],
            "rules": [{"on": ["rope"], "force_density_n_per_m": 2500, "adjust": {}}],
            "targets": targets,
        },
        "actions": [{"id": "load", "loads": [{"nodes": {"on": inner, "force_n": [0, 0, -load]}}]}],
    }


def shape(held, paths, densities, load):
    """Positions by name: one linear solve (Schek 1974), written out without the engine."""
    free = sorted({n for path in paths.values() for n in path} - set(held))
    number = {n: k for k, n in enumerate(free)}
    matrix, right = np.zeros((len(free), len(free))), np.zeros((len(free), 3))
    right[:, 2] = -load
    for q, path in zip(densities, paths.values(), strict=True):
        for a, b in zip(path, path[1:]):
            for one, other in ((a, b), (b, a)):
                if one in number:
                    matrix[number[one], number[one]] += q
                    if other in number:
                        matrix[number[one], number[other]] -= q
                    else:
                        right[number[one]] += q * np.array(held[other])
    solved = np.linalg.solve(matrix, right)
    return {n: np.array(x) for n, x in held.items()} | dict(zip(free, solved))


def test_wishes_that_fight_end_where_least_squares_does(channel):
    held, paths = saddle()
    load = 300.0
    wanted = {"m22": -0.2, "m11": 0.1, "m33": 0.05, "m13": -0.15}
    tensions = {"c1": 9000.0, "c2": 4000.0, "c3": 6000.0, "b1": 5000.0, "b2": 7000.0, "b3": 3000.0}
    targets = [{"id": n, "place": {"node": n, "z_m": z}} for n, z in wanted.items()]
    targets += [{"id": f"pull {c}", "tension": {"on": [c], "mean_tension_n": t}} for c, t in tensions.items()]
    corners = np.array(list(held.values()))
    scale = np.linalg.norm(corners.max(axis=0) - corners.min(axis=0)) / 100

    def mean_tension(x, path, q):
        return q * np.mean([np.linalg.norm(x[b] - x[a]) for a, b in zip(path, path[1:])])

    def deviations(y):
        q = np.exp(y)
        x = shape(held, paths, q, load)
        of_places = [(x[n][2] - z) / scale for n, z in wanted.items()]
        of_tensions = [
            np.log(mean_tension(x, path, density) / tensions[c])
            for (c, path), density in zip(paths.items(), q, strict=True)
        ]
        return np.array(of_places + of_tensions)

    start = np.log(np.full(len(paths), 2500.0))
    best = scipy.optimize.least_squares(deviations, start, xtol=1e-14, ftol=1e-14, gtol=1e-14, x_scale="jac")
    expected = shape(held, paths, np.exp(best.x), load)

    run = talk.run(channel, brief(held, paths, targets, load))
    assert run.cases["reference"].summary.outcome == stubs.result.CASE_OUTCOME_ANSWERED
    assert any(f.reason == "TARGETS_UNMET" for f in run.findings)
    report = next(e.shape_report for e in run.events if e.WhichOneof("event") == "shape_report")
    misses = np.array([wish.miss for wish in report.wishes])
    check("targets: sum of squared deviations", SOURCE, 2 * best.cost, np.sum(misses**2), relative=1e-8)
    for node in wanted:
        found = run.at_node("reference", "position_m", node)
        check(f"targets: nearest place of {node} (m)", SOURCE, expected[node], found, absolute=1e-5)
    assert list(np.abs(misses)) == sorted(np.abs(misses), reverse=True)
    assert report.total == 10 and report.rank == 6 and len(report.fights) >= 1


def test_freedom_left_over_changes_least(channel):
    held, paths = saddle()
    load = 300.0
    targets = [{"place": {"node": "m22", "z_m": -0.1}}, {"place": {"node": "m13", "z_m": -0.1}}]

    def heights(y):
        x = shape(held, paths, np.exp(y), load)
        return np.array([x["m22"][2] + 0.1, x["m13"][2] + 0.1])

    start = np.log(np.full(len(paths), 2500.0))
    least = scipy.optimize.minimize(
        lambda y: np.sum((y - start) ** 2),
        start,
        jac=lambda y: 2 * (y - start),
        constraints={"type": "eq", "fun": heights},
        method="SLSQP",
        options={"ftol": 1e-16, "maxiter": 500},
    )
    run = talk.run(channel, brief(held, paths, targets, load))
    position = dict(zip(run.ids[stubs.result.RANGE_NODE], run.array("reference", "position_m"), strict=True))
    tension = iter(run.array("reference", "tension_n"))
    found = []
    for path in paths.values():
        of_path = [next(tension) / np.linalg.norm(position[b] - position[a]) for a, b in zip(path, path[1:])]
        found.append(np.log(np.mean(of_path)))
    source = "scipy.optimize.minimize (SLSQP)"
    check("targets: least change of ln q", source, np.sqrt(least.fun), np.linalg.norm(found - start), relative=1e-6)
    check("targets: ln q", source, least.x, found, absolute=1e-4)
