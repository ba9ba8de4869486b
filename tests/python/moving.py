"""Motions of nets of ropes by routes that share nothing with the engine: SciPy's Runge-Kutta of order 8."""

from dataclasses import dataclass, field

import numpy as np
import scipy.integrate

from independent import Net


@dataclass
class Thrown:
    """A net with a mass (kg) and a velocity at the start (m/s) of every free node; dead loads are those of the net."""

    net: Net
    mass: np.ndarray
    velocity: np.ndarray
    events: list = field(default_factory=list)

    def excess(self, y):
        """Length less stress-free length of every segment (m)."""
        x = y[: 3 * len(self.net.free)].reshape(-1, 3)
        return np.linalg.norm(self.net.spans(x), axis=1) - self.net.unstressed

    def follow(self, times, rtol=1e-11, method="DOP853"):
        """Positions of the free nodes at these times (m).

        Ropes that go slack or taut bend the force: at each such moment, found by SciPy's events, the integration stops
        and goes on anew, so that it never steps over a bend. The moments are kept as (time, segment, whether taut).
        """
        n, m = len(self.net.free), len(self.net.ends)
        y = np.concatenate([self.net.xyz[self.net.free].ravel(), self.velocity.ravel()])
        t, found = times[0], [y[: 3 * n].reshape(n, 3)]
        self.events = []
        taut = self.excess(y) > 0.0

        def smooth(_, y):
            """The rates with the set of taut segments of this stretch of time."""
            x = y[: 3 * n].reshape(n, 3)
            d = self.net.spans(x)
            length = np.sqrt(np.einsum("ij,ij->i", d, d))
            q = np.where(taut, self.net.stiffness * (length - self.net.unstressed) / length, 0.0)
            force = self.net.pull - self.net.branch.T @ (q[:, None] * d)
            return np.concatenate([y[3 * n :], (force / self.mass[:, None]).ravel()])

        # A segment that has just passed its bend lies at it within the accuracy of the root: this keeps it off.
        guard = np.zeros(m)

        def bend(_, y):
            return np.min(np.where(taut, 1.0, -1.0) * self.excess(y) + guard)

        bend.terminal, bend.direction = True, -1.0
        for end in times[1:]:
            while t < end:
                part = scipy.integrate.solve_ivp(
                    smooth, (t, end), y, method=method, rtol=rtol, atol=1e-13, max_step=2e-3, events=bend,
                )
                assert part.success, part.message
                t, y = part.t[-1], part.y[:, -1]
                if part.status == 1:
                    which = int(np.argmin(np.where(taut, 1.0, -1.0) * self.excess(y) + guard))
                    taut[which], guard[which] = not taut[which], 1e-11
                    self.events.append((t, which, bool(taut[which])))
            found.append(y[: 3 * n].reshape(n, 3))
        return np.array(found)
