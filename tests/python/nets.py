"""Two nets of more than a hundred free nodes of which many segments go slack under their load."""

import numpy as np

from independent import Net, by_cone_program, polish


def _grid(rows, columns, place):
    """A grid without corners: nodes, held rim, segments along both directions (none in the rim)."""
    number, xyz, held = {}, [], []
    for i in range(rows):
        for j in range(columns):
            rim_i, rim_j = i in (0, rows - 1), j in (0, columns - 1)
            if rim_i and rim_j:
                continue
            number[i, j] = len(xyz)
            xyz.append(place(i, j))
            held.append(rim_i or rim_j)
    ends = [
        (number[i, j], number[i + di, j + dj])
        for i in range(rows)
        for j in range(columns)
        for di, dj in ((1, 0), (0, 1))
        if (i, j) in number
        and (i + di, j + dj) in number
        and not (held[number[i, j]] and held[number[i + di, j + dj]])
    ]
    return np.array(xyz, dtype=float), np.array(held), np.array(ends)


def saddle_under_half_snow():
    """Prestressed saddle, 11 x 11 free nodes, heavy snow on one half and uplift on the other."""

    def place(i, j):
        u, w = 2 * i / 12 - 1, 2 * j / 12 - 1
        return 24 * i / 12, 24 * j / 12, 2.4 * (u * u - w * w)

    xyz, held, ends = _grid(13, 13, place)
    length = np.linalg.norm(xyz[ends[:, 1]] - xyz[ends[:, 0]], axis=1)
    loads = np.zeros_like(xyz)
    loads[:, 2] = np.where(xyz[:, 0] < 12.0, -9000.0, 2500.0)
    loads[held] = 0.0
    return Net(xyz, held, ends, length / 1.0015, np.full(len(ends), 5e6), loads)


def slack_hammock():
    """Flat grid, 12 x 10 free nodes: ropes up to 20 % too long one way and up to 4 % the other, loads askew."""
    xyz, held, ends = _grid(14, 12, lambda i, j: (1.5 * i, 1.5 * j, 0.0))
    length = np.linalg.norm(xyz[ends[:, 1]] - xyz[ends[:, 0]], axis=1)
    # A sine with an irrational step: irregular, and the same on every machine.
    irregular = np.sin(12.9898 * np.arange(1, len(ends) + 1))
    along_x = np.abs(xyz[ends[:, 1], 0] - xyz[ends[:, 0], 0]) > 0.5
    excess = np.where(along_x, 0.1 + 0.1 * irregular, 0.02 + 0.02 * irregular)
    stiffness = 2e6 * (1.5 + np.cos(7.233 * np.arange(1, len(ends) + 1)))
    loads = np.zeros_like(xyz)
    loads[:, 2] = -1500.0 * (1.2 + np.sin(3.7 * xyz[:, 0] + 1.9 * xyz[:, 1]))
    loads[:, 0] = 300.0 * np.cos(2.3 * xyz[:, 1])
    loads[held] = 0.0
    return Net(xyz, held, ends, length * (1.0 + excess), stiffness, loads)


def thrown(speed, strain):
    """Saddle of 3 x 3 free nodes of 8 kg, prestrained, thrown: ropes go slack and snatch. With masses and velocities."""
    xyz, held, ends = _grid(5, 5, lambda i, j: (2.0 * i, 2.0 * j, 0.15 * ((i - 2) ** 2 - (j - 2) ** 2)))
    length = np.linalg.norm(xyz[ends[:, 1]] - xyz[ends[:, 0]], axis=1)
    loads = np.zeros_like(xyz)
    loads[~held, 2] = -50.0
    net = Net(xyz, held, ends, length / (1.0 + strain), np.full(len(ends), 2e5), loads)
    xyz[net.free] = polish(net, *by_cone_program(net))[0]
    k = np.arange(len(net.free))
    velocity = speed * np.column_stack([0.2 * np.cos(k), 0.2 * np.sin(2 * k), np.sin(1 + 3 * k)])
    return net, np.full(len(k), 8.0), velocity
