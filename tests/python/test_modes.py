"""Natural frequencies against SciPy on matrices rebuilt from positions, tensions and masses alone."""

import numpy as np
import pytest
import scipy.sparse as sp
import scipy.sparse.linalg as spla

import nets
import stubs
import talk
from report import check
from test_diagnosis import directions
from test_independent_solvers import brief_of

WANTED = 10
MASS_PER_LENGTH = 1.7
ADDED = {"n40": 85.0, "n77": 12.5}
SOURCE = "SciPy's eigsh (ARPACK, shift-invert) on stiffness and mass rebuilt from positions and tensions"


def modes_of(run, state):
    """What holds for all modes of a state, and the modes."""
    parts = [e.modes for e in run.events if e.WhichOneof("event") == "modes" and e.modes.case == state]
    found = [part.found for part in parts if part.WhichOneof("part") == "found"]
    return found[0], [part.mode for part in parts if part.WhichOneof("part") == "mode"]


@pytest.mark.parametrize("share", [0.05, 1.0], ids=["taut", "much-slack"])
def test_frequencies_shapes_and_participation(channel, share):
    net = nets.saddle_under_half_snow()
    net.loads *= share
    brief = brief_of(net)
    for section in brief["net"]["sections"]:
        section["mass_kg_per_m"] = MASS_PER_LENGTH
    added = [{"on": [node], "mass_kg": mass} for node, mass in ADDED.items()]
    brief["modes"] = {"about": ["reference"], "count": WANTED, "added": added}
    run = talk.run(channel, brief)
    found, modes = modes_of(run, "reference")
    x, tension = run.array("reference", "position_m"), run.array("reference", "tension_n")
    n, length = directions(net, x)
    outer = n[:, :, None] * n[:, None, :]
    taut = tension > 0.0
    assert (taut.sum() < len(tension)) == (share == 1.0)

    material = (taut * net.axial_stiffness / net.unstressed)[:, None, None] * outer
    geometric = (tension / length)[:, None, None] * (np.eye(3) - outer)
    tangent = net.stiffness_matrix(material + geometric).tocsr()
    mass = np.zeros(len(x))
    for end in (0, 1):
        np.add.at(mass, net.ends[:, end], 0.5 * MASS_PER_LENGTH * net.unstressed)
    for node, more in ADDED.items():
        mass[int(node[1:])] += more
    mass = np.repeat(mass[net.free], 3)

    # Nodes of slack ropes alone have no stiffness: nothing of them is left.
    touched = np.zeros(len(x), dtype=int)
    np.add.at(touched, net.ends[taut].ravel(), 1)
    floating = [f"n{node}" for node in net.free if touched[node] == 0]
    assert sorted(found.floating_nodes) == sorted(floating)
    kept = np.repeat([touched[node] > 0 for node in net.free], 3)
    tangent, moving = tangent[kept][:, kept].tocsc(), mass[kept]

    roots, vectors = spla.eigsh(tangent, k=WANTED, M=sp.diags(moving).tocsc(), sigma=0.0, which="LM")
    order = np.argsort(roots)
    wanted = np.sqrt(roots[order]) / (2.0 * np.pi)
    engine = np.array([mode.frequency_hz for mode in modes])[:WANTED]
    check(f"natural frequencies, load x {share} (Hz)", SOURCE, wanted, engine, relative=1e-8)
    assert found.complete and found.counted == found.modes == len(modes)
    below = np.sum(np.linalg.eigvalsh((tangent - found.counted_below_rad2_per_s2 * sp.diags(moving)).toarray()) < 0.0)
    check(f"modes below the count, load x {share}", "NumPy's eigenvalues of K - s M", [below], [found.counted])
    check(f"moving mass, load x {share} (kg)", "sum of lumped masses", [moving.sum() / 3.0] * 3,
          list(found.moving_mass_kg), relative=1e-12)

    # Shapes: each is in the span of those of SciPy with nearly its frequency, and takes part as much.
    shapes = run.array("reference", "mode_shape").reshape(len(x), len(modes), 3)
    for number, mode in enumerate(modes[:WANTED]):
        shape = shapes[:, number, :][net.free].ravel()[kept]
        assert mode.kind == stubs.modes.MODE_KIND_VIBRATES and mode.residual < 1e-7
        assert np.abs(shapes[:, number, :]).max() <= 1.0 + 1e-12
        left = tangent @ shape - mode.root_rad2_per_s2 * moving * shape
        assert np.linalg.norm(left) <= 1e-6 * np.linalg.norm(tangent @ shape), number
        modal = shape @ (moving * shape)
        part = [(shape @ (moving * np.tile(axis, len(shape) // 3))) ** 2 / modal for axis in np.eye(3)]
        assert np.allclose(part, mode.effective_mass_kg, rtol=1e-8, atol=1e-9 * moving.sum())
        assert np.isclose(modal, mode.modal_mass_kg, rtol=1e-10)
