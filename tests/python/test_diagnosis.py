"""Least stiffnesses, mechanisms and states of self-stress against SciPy, from positions and tensions alone."""

import numpy as np
import pytest
import scipy.sparse as sp
import scipy.sparse.linalg as spla

import nets
import stubs
import talk
from report import check
from test_independent_solvers import brief_of

WANTED = 5


def found_of(run, state):
    """Parts of what was found of a state, by kind."""
    parts = {}
    for event in run.events:
        if event.WhichOneof("event") == "diagnosis" and event.diagnosis.case == state:
            kind = event.diagnosis.WhichOneof("part")
            parts.setdefault(kind, []).append(getattr(event.diagnosis, kind))
    return parts


def directions(net, x):
    """Unit vectors of the segments, and their lengths, with every node where the engine found it."""
    spans = x[net.ends[:, 1]] - x[net.ends[:, 0]]
    length = np.linalg.norm(spans, axis=1)
    return spans / length[:, None], length


@pytest.mark.parametrize("share", [0.05, 1.0], ids=["taut", "much-slack"])
def test_least_stiffnesses_and_counts(channel, share):
    net = nets.saddle_under_half_snow()
    net.loads *= share
    brief = brief_of(net) | {"diagnosis": {"modes_of_stiffness": WANTED}}
    run = talk.run(channel, brief)
    parts = found_of(run, "reference")
    x, tension = run.array("reference", "position_m"), run.array("reference", "tension_n")
    n, length = directions(net, x)
    outer = n[:, :, None] * n[:, None, :]
    taut = tension > 0.0
    assert (taut.sum() < len(tension)) == (share == 1.0)

    # The tangent, node by node, without the nodes whose place is not determined.
    loose = set(run.cases["reference"].summary.loose_nodes)
    material = (taut * net.axial_stiffness / net.unstressed)[:, None, None] * outer
    geometric = (tension / length)[:, None, None] * (np.eye(3) - outer)
    tangent = net.stiffness_matrix(material + geometric)
    placed = np.repeat([f"n{node}" not in loose for node in net.free], 3)
    tangent = tangent[placed][:, placed]
    values = np.sort(spla.eigsh(tangent, k=WANTED, sigma=0.0, which="LM", return_eigenvectors=False))
    engine = np.array([least.stiffness_n_per_m for least in parts["least_stiffness"]])
    source = "SciPy's eigsh (ARPACK, shift-invert) on the tangent rebuilt from positions and tensions"
    check(f"least stiffnesses, load x {share} (N/m)", source, values, engine, relative=1e-7)
    assert run.cases["reference"].summary.smallest_stiffness_n_per_m == engine[0]

    # Ranks of the equilibrium matrix by its singular values.
    wide = sp.kron(net.branch, sp.identity(3), format="csr")
    along = sp.csr_matrix(
        (n.ravel(), (np.repeat(np.arange(len(n)), 3), np.arange(3 * len(n)))), shape=(len(n), 3 * len(n))
    )
    stretch = (along @ wide).toarray()
    told = {part.members_considered: part for part in parts["mobility"]}
    for considered, rows in [
        (stubs.diagnosis.MEMBERS_CONSIDERED_ALL, np.ones(len(n), dtype=bool)),
        (stubs.diagnosis.MEMBERS_CONSIDERED_TAUT, taut),
    ]:
        if considered not in told:
            assert share != 1.0
            continue
        singular = np.linalg.svd(stretch[rows], compute_uv=False)
        rank = int(np.sum(singular > 1e-8 * singular[0]))
        part = told[considered]
        published = [rank, rows.sum() - rank, 3 * len(net.free) - rank]
        check(
            f"rank, self-stresses, mechanisms, load x {share}, {rows.sum()} members", "NumPy's singular values",
            published, [part.rank, part.self_stresses, part.mechanisms],
        )
