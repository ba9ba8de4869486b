#!/usr/bin/env python3
"""A cable net as an office would solve it by itself: full Newton with numpy and SciPy's sparse LU.

    python peer_newton.py --n 100

The problem, the same as in the kernel's bench `newton`:

    net        n x n free nodes on a square plan of 60 m, all of the rim held on z = 6 (x^2 - y^2) / 30^2 (m);
               ropes along both directions; 20 MN of stiffness and 25 kN of prestress per metre of width
    start      equal force densities, so that every rope is in balance; unstressed lengths follow from the prestress
    load       0.9 kN/m2 on plan where x >= 0 and half of it elsewhere, on the free nodes, in equal steps
    stop       largest residual <= 1e-8 of the largest load on a node
    element    N = EA (l/L0 - 1), nothing while slack, with 1e-8 of its axial stiffness kept in the tangent

Prints one line of JSON: iterations a step, largest movement, largest tension, slack ropes, median seconds.
"""

import argparse
import json
import statistics
import time

import numpy as np
import scipy.sparse as sp
import scipy.sparse.linalg as spla

SPAN, RISE = 60.0, 6.0
STIFFNESS, PRESTRESS, SNOW = 20e6, 25e3, 900.0
SLACK, TOLERANCE, MOST_ITERATIONS = 1e-8, 1e-8, 60


def factorise(matrix):
    """LU with minimum degree on A + A^T in symmetric mode: the fair choice for these matrices."""
    return spla.splu(matrix, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options={"SymmetricMode": True})


class Saddle:
    """The net in its prestressed start shape. Free nodes are numbered first."""

    def __init__(self, n):
        mesh = SPAN / (n + 1)
        i, j = (axis.ravel() for axis in np.indices((n + 2, n + 2)))
        x, y = i * mesh - SPAN / 2, j * mesh - SPAN / 2
        free = (0 < i) & (i <= n) & (0 < j) & (j <= n)
        order = np.argsort(~free, kind="stable")
        number = np.empty(len(order), dtype=int)
        number[order] = np.arange(len(order))
        grid = number.reshape(n + 2, n + 2)
        self.n_free = n * n
        self.xyz = np.column_stack([x, y, RISE * (x**2 - y**2) / (SPAN / 2) ** 2])[order]
        self.ends = np.column_stack([
            np.concatenate([grid[:-1, 1:-1].ravel(), grid[1:-1, :-1].ravel()]),
            np.concatenate([grid[1:, 1:-1].ravel(), grid[1:-1, 1:].ravel()]),
        ])
        self._shape()
        length = np.linalg.norm(self.xyz[self.ends[:, 1]] - self.xyz[self.ends[:, 0]], axis=1)
        self.stiffness = STIFFNESS * mesh
        self.unstressed = length / (1.0 + PRESTRESS * length / self.stiffness)
        self.load = np.zeros((self.n_free, 3))
        self.load[:, 2] = -SNOW * mesh**2 * np.where(self.xyz[: self.n_free, 0] >= 0.0, 1.0, 0.5)

    def _shape(self):
        rows = np.arange(len(self.ends))
        shape = (len(self.ends), len(self.xyz))
        branch = sp.csc_matrix((np.ones(len(rows)), (rows, self.ends[:, 1])), shape=shape)
        branch -= sp.csc_matrix((np.ones(len(rows)), (rows, self.ends[:, 0])), shape=shape)
        free, held = branch[:, : self.n_free], branch[:, self.n_free :]
        self.xyz[: self.n_free] = -factorise((free.T @ free).tocsc()).solve(free.T @ held @ self.xyz[self.n_free :])


class Assembly:
    """Residual and tangent, vectorised over the ropes; where entries go is worked out once."""

    def __init__(self, net):
        self.net = net
        of_ends = 3 * net.ends[:, :, None] + np.arange(3)
        dofs = of_ends.reshape(-1, 6)
        rows, columns = np.repeat(dofs, 6, axis=1).ravel(), np.tile(dofs, (1, 6)).ravel()
        self.kept = np.flatnonzero(np.maximum(rows, columns) < 3 * net.n_free)
        self.rows, self.columns = rows[self.kept], columns[self.kept]

    def __call__(self, xyz):
        net = self.net
        span = xyz[net.ends[:, 1]] - xyz[net.ends[:, 0]]
        length = np.sqrt(np.einsum("ei,ei->e", span, span))
        direction = span / length[:, None]
        axial = net.stiffness / net.unstressed
        tension = axial * (length - net.unstressed)
        slack = tension <= 0.0
        tension = np.where(slack, 0.0, tension)
        density = tension / length
        block = (np.where(slack, SLACK, 1.0) * axial - density)[:, None, None] * np.einsum(
            "ei,ej->eij", direction, direction
        )
        block += density[:, None, None] * np.eye(3)
        whole = np.concatenate([np.concatenate([block, -block], 2), np.concatenate([-block, block], 2)], 1)
        size = 3 * net.n_free
        tangent = sp.coo_matrix((whole.ravel()[self.kept], (self.rows, self.columns)), shape=(size, size)).tocsc()
        pull = tension[:, None] * direction
        inner = np.empty_like(xyz)
        for axis in range(3):
            inner[:, axis] = np.bincount(net.ends[:, 1], pull[:, axis], len(xyz))
            inner[:, axis] -= np.bincount(net.ends[:, 0], pull[:, axis], len(xyz))
        return tangent, inner[: net.n_free], tension


def newton(net, steps):
    """Full Newton in equal load steps; returns positions, tensions, iterations a step and seconds by kind of work."""
    seconds = {"assembly": 0.0, "factor": 0.0, "solve": 0.0}

    def timed(kind, work, *given):
        started = time.perf_counter()
        answer = work(*given)
        seconds[kind] += time.perf_counter() - started
        return answer

    began = time.perf_counter()
    assembly = Assembly(net)
    xyz, iterations = net.xyz.copy(), []
    allowed = TOLERANCE * np.abs(net.load).max()
    for step in range(1, steps + 1):
        for iteration in range(MOST_ITERATIONS + 1):
            tangent, inner, tension = timed("assembly", assembly, xyz)
            residual = net.load * (step / steps) - inner
            if np.abs(residual).max() <= allowed:
                break
            solver = timed("factor", factorise, tangent)
            xyz[: net.n_free] += timed("solve", solver.solve, residual.ravel()).reshape(-1, 3)
        else:
            raise SystemExit(f"no convergence in load step {step}")
        iterations.append(iteration)
    seconds["total"] = time.perf_counter() - began
    return xyz, tension, iterations, seconds


def main():
    options = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    options.add_argument("--n", type=int, default=32, help="free nodes a side")
    options.add_argument("--steps", type=int, default=4, help="load steps")
    options.add_argument("--repeat", type=int, default=1, help="runs, of which the median counts")
    given = options.parse_args()
    net = Saddle(given.n)
    runs = [newton(net, given.steps) for _ in range(given.repeat)]
    xyz, tension, iterations, _ = runs[0]
    moved = np.abs(xyz[: net.n_free] - net.xyz[: net.n_free]).max()
    print(json.dumps({
        "program": "peer", "n": given.n, "iterations": iterations, "largest_movement_m": moved,
        "largest_tension_n": tension.max(), "slack": int((tension <= 0.0).sum()),
        "seconds": {kind: statistics.median(run[3][kind] for run in runs) for kind in runs[0][3]},
    }))


if __name__ == "__main__":
    main()
