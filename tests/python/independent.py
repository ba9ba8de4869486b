"""Equilibrium of tension-only nets by routes that share nothing with the engine.

A net is the minimum of a convex energy,

    Pi(x) = sum k/2 max(0, l - a)^2 - p . x,    k = EA / a,

found here in two ways: as a second-order cone program (Kanno, Ohsaki & Ito 2002), and by general minimisation of the
energy. Both end near 1e-4 to 1e-7 of the largest tension, so that a Newton polish of a few iterations follows, which
carries the tensions along instead of recomputing them from tiny differences of length.
"""

from dataclasses import dataclass

import clarabel
import numpy as np
import scipy.optimize
import scipy.sparse as sp
import scipy.sparse.linalg as spla


@dataclass
class Net:
    """Positions (m), which nodes are held, segments, stress-free lengths (m), EA (N), loads (N)."""

    xyz: np.ndarray
    held: np.ndarray
    ends: np.ndarray
    unstressed: np.ndarray
    axial_stiffness: np.ndarray
    loads: np.ndarray

    def __post_init__(self):
        self.free = np.flatnonzero(~self.held)
        n_segments = len(self.ends)
        rows = np.repeat(np.arange(n_segments), 2)
        signs = np.tile([-1.0, 1.0], n_segments)
        whole = sp.csr_matrix((signs, (rows, self.ends.ravel())), shape=(n_segments, len(self.xyz)))
        self.branch = whole[:, self.free].tocsr()
        self.offset = whole[:, np.flatnonzero(self.held)] @ self.xyz[self.held]
        self.stiffness = self.axial_stiffness / self.unstressed
        self.pull = self.loads[self.free]

    def spans(self, x):
        """Segment vectors at free positions x."""
        return self.branch @ x + self.offset

    def tensions(self, x):
        """Tensions by the exact law."""
        length = np.linalg.norm(self.spans(x), axis=1)
        return self.stiffness * np.maximum(0.0, length - self.unstressed)

    def residual(self, x):
        """Loads less the pull of the segments, on free nodes."""
        d = self.spans(x)
        q = self.tensions(x) / np.linalg.norm(d, axis=1)
        return self.pull - self.branch.T @ (q[:, None] * d)

    def stiffness_matrix(self, blocks):
        """Assembles 3 x 3 segment blocks over the free nodes, node by node."""
        wide = sp.kron(self.branch, sp.identity(3), format="csr")
        return (wide.T @ sp.block_diag(list(blocks), format="csr") @ wide).tocsc()


def by_cone_program(net):
    """Free positions and tensions from min sum k eps^2 / 2 - p . x with |d| <= a + eps."""
    n_x, n_segments = 3 * len(net.free), len(net.ends)
    # Kilonewtons keep the numbers of the program near one.
    quadratic = sp.diags(np.concatenate([np.zeros(n_x), net.stiffness / 1e3]), format="csc")
    linear = np.concatenate([-net.pull.ravel() / 1e3, np.zeros(n_segments)])
    wide = sp.kron(net.branch, sp.identity(3), format="coo")
    first = 4 * np.arange(n_segments)
    rows = np.concatenate([first, 4 * (wide.row // 3) + 1 + wide.row % 3])
    columns = np.concatenate([n_x + np.arange(n_segments), wide.col])
    values = np.concatenate([-np.ones(n_segments), -wide.data])
    constraint = sp.csc_matrix((values, (rows, columns)), shape=(4 * n_segments, n_x + n_segments))
    right = np.column_stack([net.unstressed, net.offset]).ravel()
    settings = clarabel.DefaultSettings()
    settings.verbose = False
    cones = [clarabel.SecondOrderConeT(4)] * n_segments
    solution = clarabel.DefaultSolver(quadratic, linear, constraint, right, cones, settings).solve()
    assert str(solution.status) in ("Solved", "AlmostSolved"), solution.status
    answer = np.array(solution.x)
    x = answer[:n_x].reshape(-1, 3)
    tension = np.maximum(0.0, net.stiffness * answer[n_x:])
    return x, tension


def by_minimisation(net):
    """Free positions and tensions from a general minimisation of the energy, started from the given positions."""
    start = net.xyz[net.free]

    def energy(flat):
        x = flat.reshape(-1, 3)
        stretched = np.maximum(0.0, np.linalg.norm(net.spans(x), axis=1) - net.unstressed)
        value = 0.5 * net.stiffness @ stretched**2 - np.sum(net.pull * (x - start))
        return value, -net.residual(x).ravel()

    found = scipy.optimize.minimize(
        energy, start.ravel(), jac=True, method="L-BFGS-B",
        options={"maxiter": 200_000, "maxfun": 400_000, "maxcor": 40, "ftol": 0.0, "gtol": 1e-3},
    )
    x = found.x.reshape(-1, 3)
    return x, net.tensions(x)


def polish(net, x, tension, limit=60):
    """Newton from a near answer, with tensions carried along; returns positions and tensions by the exact law.

    The tangent is k n n^T + N/l (I - n n^T) on the taut segments with the carried N, and 1e-11 k I everywhere.
    """
    length = np.linalg.norm(net.spans(x), axis=1)
    largest = tension.max()
    taut = tension / largest > (net.unstressed + tension / net.stiffness - length) / net.unstressed
    carried = np.where(taut, tension, 0.0)
    force_scale = max(largest, np.abs(net.pull).max())
    for _ in range(limit):
        d = net.spans(x)
        length = np.linalg.norm(d, axis=1)
        n = d / length[:, None]
        stretched = net.stiffness * (length - net.unstressed)
        pulls = np.where(taut, stretched, 0.0)
        residual = net.pull - net.branch.T @ (pulls[:, None] * n)
        if np.abs(net.residual(x)).max() <= 1e-11 * force_scale:
            break
        outer = n[:, :, None] * n[:, None, :]
        geometric = np.where(taut, carried / length, 0.0)[:, None, None] * (np.eye(3) - outer)
        material = np.where(taut, net.stiffness, 0.0)[:, None, None] * outer
        floor = (1e-11 * net.stiffness)[:, None, None] * np.eye(3)
        step = spla.spsolve(net.stiffness_matrix(material + geometric + floor), residual.ravel()).reshape(-1, 3)
        carried = np.where(taut, stretched + net.stiffness * np.sum(n * (net.branch @ step), axis=1), 0.0)
        x = x + step
        now = net.stiffness * (np.linalg.norm(net.spans(x), axis=1) - net.unstressed)
        slackened = taut & (carried <= 0.0)
        tightened = ~taut & (now > 1e-9 * force_scale)
        taut = (taut & ~slackened) | tightened
        carried = np.where(slackened, 0.0, np.where(tightened, np.minimum(now, force_scale), carried))
    worst = np.abs(net.residual(x)).max()
    assert worst <= 1e-9 * force_scale, f"the polish leaves {worst:.3e} N"
    return x, net.tensions(x)
