"""Waves that run along a rope, and spectra, against closed forms and NumPy."""

from math import pi, sqrt

import numpy as np
import pytest
import scipy.special

import motions
import talk
from closed_forms import force_on, node, rope
from motions import AVERAGE, SCHEMES, asked, movement, watch
from report import check
from test_motions import BEAD, bead, brief_of, divisions, follow

LENGTH, PIECES, STIFFNESS, TENSION, MASS = 100.0, 200, 8e6, 20e3, 1.6
PIECE = LENGTH / PIECES
UNSTRESSED = PIECE / (1 + TENSION / STIFFNESS)
# Over the unstressed length S: m u_tt = T u_ss ds/dS, with ds/dS the stretch: (T / (m (1 + strain)))^(1/2).
SPEED = sqrt(TENSION / MASS / (1 + TENSION / STIFFNESS))


def long_rope(actions=(), end=None):
    """A long taut rope along x, its mass that of the rope alone."""
    nodes = [node(f"n{k}", k * PIECE, 0, 0, support={} if k in (0, PIECES) else None) for k in range(PIECES + 1)]
    if end is not None:
        nodes[0] = end
    section = {"id": "rope", "axial_stiffness_n": STIFFNESS, "mass_kg_per_m": MASS}
    path = [entry["id"] for entry in nodes]
    return brief_of(nodes, [rope("s", *path)], {"s": UNSTRESSED}, [section], actions)


def peak(time, u):
    """When a history is largest (s), by the parabola through its largest value and the two beside it."""
    k = int(np.argmax(u))
    a, b, c = u[k - 1 : k + 2]
    return time[k] + 0.5 * (time[1] - time[0]) * (a - c) / (a - 2 * b + c)


def test_speeds_that_are_told(channel):
    motion = follow(channel, long_rope(), [asked("still", AVERAGE, 1e-3, 1e-4, ropes=["s"])])["still"]
    speeds = motion.waves["s"]
    strain = TENSION / STIFFNESS
    for told in (speeds.transverse_least_m_per_s, speeds.transverse_most_m_per_s):
        check("transverse speed (m/s)", "root of T / m of the unstressed rope over its stretch", SPEED, told,
              relative=1e-9)
    check("axial speed (m/s)", "root of EA / m", sqrt(STIFFNESS / MASS), speeds.axial_m_per_s, relative=1e-12)
    check("axial step (s)", "a segment at that speed", UNSTRESSED / sqrt(STIFFNESS / MASS), speeds.axial_step_s,
          relative=1e-9)
    check("transverse step (s)", "a segment at that speed", UNSTRESSED / speeds.transverse_most_m_per_s,
          speeds.transverse_step_s, relative=1e-9)
    field = motion.ropes["s"]
    check("material coordinate (m)", "unstressed length from the start", UNSTRESSED * np.arange(PIECES + 1),
          field.material, relative=1e-9, absolute=1e-9)
    check("stretch", "1 + T / EA", np.full(PIECES, 1 + strain), field.stretch[0], relative=1e-9)
    check("tension (N)", "as prestressed", np.full(PIECES, TENSION), field.tension[0], relative=1e-9)


@pytest.mark.parametrize("name", SCHEMES)
def test_transverse_pulse_arrives(channel, name):
    # A bump let go at rest: two of half its height run apart, each at the root of T / m along the stretched rope.
    width, middle, height = 4.0, 30.0, 1e-3
    x = PIECE * np.arange(1, PIECES)
    bump = height * np.exp(-0.5 * ((x - middle) / width) ** 2)
    start = [{"on": [f"n{k}"], "by_m": [0.0, 0.0, float(u)]} for k, u in enumerate(bump, 1) if u > 1e-12]
    step = 1e-3
    motion = follow(channel, long_rope(), [
        asked("pulse", SCHEMES[name], 0.6, step, ropes=["s"], start={"moved": start}),
    ])["pulse"]
    field, speeds = motion.ropes["s"], motion.waves["s"]
    u = field.position[:, :, 2]
    at = [100, 120, 140, 160]
    way = np.array([field.material[k] - field.material[60] for k in at])
    arrivals = np.array([peak(motion.time, u[:, k]) for k in at])
    # Beads and steps hold back the phase of a wave number k by (k a)^2 / 24 + (k c h)^2 / 12 (central differences hurry it
    # on by half of the latter), which moves the peak of a Gaussian of spread s by three times that at k = 1 / s.
    steps = -1 if name == "explicit" else 2
    parts = divisions(name, motion)
    late = (UNSTRESSED**2 + steps * (SPEED * step / parts) ** 2) / (8 * width**2)
    check(f"{name}: arrivals (s)", "way over the speed of RopeWaves, less what beads and steps hold back",
          way / speeds.transverse_most_m_per_s * (1 + late), arrivals, relative=0.1 * late)
    check(f"{name}: height (m)", "d'Alembert: half of the bump", np.full(4, height / 2), [u[:, k].max() for k in at],
          relative=0.02)


@pytest.mark.parametrize("name", SCHEMES)
def test_axial_front_behind_a_sudden_force(channel, name):
    """A half mass at the end, let go of a part of its force: the chain of Schroedinger 1914 (from memory).

    T_n(t) = T - dF (1 - J_0(z) - 2 sum J_2j(z), j = 1..n),  z = 2 t sqrt(k / m), until the other end answers.
    """
    pulled, released = TENSION, 0.4 * TENSION
    actions = [
        {"id": "pull", "loads": [force_on("n0", -pulled, 0, 0)]},
        {"id": "ease", "loads": [force_on("n0", released, 0, 0)]},
    ]
    given = long_rope(actions, end=node("n0", 0, 0, 0))
    given["prestress"]["under"] = ["pull"]
    speed = sqrt(STIFFNESS / MASS)
    crossing = UNSTRESSED / speed
    runs = {n: crossing / n for n in (10, 20, 40)}
    told = follow(channel, given, [
        asked(f"{n}", SCHEMES[name], 150 * crossing, h, 5 * n, ropes=["s"],
              driven=[{"action": "ease", "constant": 1.0}])
        for n, h in runs.items()
    ])
    time = told["10"].time
    assert np.allclose(time, 5 * crossing * np.arange(31), rtol=1e-9, atol=0)
    z = 2 * time * speed / UNSTRESSED
    even = np.cumsum([scipy.special.jv(0, z)] + [2 * scipy.special.jv(2 * j, z) for j in range(1, PIECES)], axis=0)
    exact = (TENSION - released * (1 - even)).T
    coarse, middle, fine = (told[f"{n}"].ropes["s"].tension for n in runs)
    off = [np.abs(t - exact).max() for t in (coarse, middle, fine)]
    print(f"{name}: largest difference {off} N of {released} N")
    limit = fine + (fine - middle) / 3
    check(f"{name}: tension of every segment (N)", "chain of masses and springs, by Bessel functions (Schroedinger 1914)",
          exact, limit, absolute=np.abs(fine - middle).max())
    motions.check_order(f"{name}: tensions", off)
    # The front itself: in the bead chain half of the fall arrives within two lengths of the front's own spread,
    # (n / 2)^(1/3) segments, behind x / c, and nothing is ahead of it.
    for n in (40, 80, 120):
        t = told["40"].waves["s"]
        arrival = n * UNSTRESSED / t.axial_m_per_s
        spread = (n / 2) ** (1 / 3) * crossing
        early, late = time < arrival - 5 * spread, time > arrival + 2 * spread
        assert np.all(np.abs(limit[early, n] - TENSION) < 1e-3 * released)
        assert np.all(limit[late, n] < TENSION - released / 2)


def test_break_sends_a_front(channel):
    motion = follow(channel, long_rope(), [
        asked("cut", SCHEMES["conserving"], 0.03, 1e-5, 20, ropes=["s"],
              breaks=[{"segment": {"cable": "s", "from": "n0", "to": "n1"}, "at_s": 0.0}]),
    ])["cut"]
    field, speed = motion.ropes["s"], motion.waves["s"].axial_m_per_s
    for n in (20, 60, 100, 140):
        arrival = (field.material[n] - field.material[1]) / speed
        spread = (n / 2) ** (1 / 3) * UNSTRESSED / speed
        early, late = motion.time < arrival - 5 * spread, motion.time > arrival + 2 * spread
        assert early.sum() > 3 or n < 60
        check(f"segment {n} ahead of the front (N)", "x / root(EA / m)", np.full(early.sum(), TENSION),
              field.tension[early, n], relative=1e-3)
        assert np.all(field.tension[late & (motion.time < 0.02), n] < TENSION / 2)
    # Behind the front the rope runs at T / root(EA m) towards the held end.
    k = np.argmin(np.abs(motion.time - 0.02))
    behind = field.velocity[k, 20:60, 0].mean()
    check("speed behind the front (m/s)", "T / root(EA m)", TENSION / sqrt(STIFFNESS * MASS), behind, relative=0.02)
    assert np.all(field.tension >= 0.0), "a rope never pushes"


def test_axial_pulse_of_a_moved_support(channel):
    # The end moves by a bump of 60 segments' crossing time: a pulse of tension of -EA/c times its speed runs along.
    speed = sqrt(STIFFNESS / MASS)
    crossing = UNSTRESSED / speed
    lasts, way = 60 * crossing, 2e-3
    s = np.linspace(0, 1, 601)
    values = s - np.sin(2 * pi * s) / (2 * pi)
    actions = [{"id": "move", "loads": [{"move": {"node": "n0", "by_m": [-way, 0.0, 0.0]}}]}]
    h = crossing / 4
    motion = follow(channel, long_rope(actions), [
        asked("tug", AVERAGE, 190 * crossing, h, ropes=["s"],
              driven=[{"action": "move", "table": {"values": list(values), "every_s": lasts / 600}}]),
    ])["tug"]
    field = motion.ropes["s"]
    at = np.array([20, 60, 100, 140])
    arrivals = [peak(motion.time, field.tension[:, n]) for n in at]
    # The middle of a segment lies half a segment beyond its first node.
    exact = lasts / 2 + (at + 0.5) * UNSTRESSED / motion.waves["s"].axial_m_per_s
    k = 2 * pi / (60 * UNSTRESSED)
    late = ((k * UNSTRESSED) ** 2 + 2 * (k * speed * h) ** 2) / 8
    check("arrivals of the peak (s)", "x / root(EA / m) of RopeWaves", exact, arrivals,
          absolute=late * exact[-1] + h / 4)
    check("height of the pulse (N)", "EA / c times the speed of the end", np.full(4, TENSION + STIFFNESS / speed * 2 * way / lasts),
          [field.tension[:, n].max() for n in at], relative=2e-3 * STIFFNESS / speed * 2 * way / lasts / TENSION)


# Spectra --------------------------------------------------------------------------------------------------------------

def hann_spectrum(samples):
    """Amplitudes of the lines of a series without its mean, under a Hann window and corrected for it."""
    n = len(samples)
    window = 0.5 - 0.5 * np.cos(2 * pi * np.arange(n) / n)
    amplitude = 2 * np.abs(np.fft.rfft(window * (samples - samples.mean()))) / window.sum()
    amplitude[0] /= 2
    if n % 2 == 0:
        amplitude[-1] /= 2
    return amplitude


def test_spectrum_of_a_pluck(channel):
    # Five unequal beads on a string: modes far apart, each to be found in the spectrum.
    xs, masses, tension, stiffness = [0, 2, 3.5, 6, 7.2, 9, 12], [0, 20, 35, 15, 40, 25, 0], 30e3, 1e7
    nodes = [
        node(f"n{k}", x, 0, 0, support={} if m == 0 else {"free": [{"along": [0.0, 0.0, 1.0]}]}, mass=m)
        for k, (x, m) in enumerate(zip(xs, masses, strict=True))
    ]
    cables = [rope(f"c{k}", f"n{k}", f"n{k + 1}") for k in range(6)]
    lengths = {f"c{k}": (xs[k + 1] - xs[k]) / (1 + tension / stiffness) for k in range(6)}
    given = brief_of(nodes, cables, lengths, [{"id": "rope", "axial_stiffness_n": stiffness}])
    given["modes"] = {"about": ["reference"], "count": 5}
    h, count = 2e-3, 8192
    given["motions"] = [asked(
        "pluck", AVERAGE, count * h, h, start={"moved": [{"on": ["n1"], "by_m": [0.0, 0.0, 1e-4]}]},
        watched=watch(u=movement("n1", 0, 0, 1), v={"velocity": {"node": "n3", "along": [0, 0, 2]}},
                      T={"tension": {"cable": "c0", "from": "n0", "to": "n1"}}),
        spectra={"from_s": 100 * h, "up_to_hz": 30.0},
    )]
    run = talk.run(channel, given)
    motion = motions.read(run)["pluck"]
    frequencies = np.array([
        e.modes.mode.frequency_hz for e in run.events
        if e.WhichOneof("event") == "modes" and e.modes.WhichOneof("part") == "mode"
    ])
    assert len(frequencies) == 5
    spectrum = motion.spectra["u"]
    # Steps stretch each period: tan(w h / 2) = omega h / 2 (Hughes; Bathe; from memory).
    stepped = np.arctan(pi * frequencies * h) / (pi * h)
    peaks = sorted(spectrum.peaks, key=lambda p: -p.amplitude)
    assert [p.frequency_hz for p in spectrum.peaks] == [p.frequency_hz for p in peaks], "largest first"
    assert np.diff(stepped).min() > 8 * spectrum.resolution_hz
    found = np.sort([p.frequency_hz for p in peaks[:5]])
    check("peaks of the spectrum (Hz)", "natural frequencies of the same brief, at these steps", stepped, found,
          absolute=0.05 * spectrum.resolution_hz)

    for name, spectrum in motion.spectra.items():
        series = motion.watched[name][motion.time >= 100 * h - 1e-9]
        check(f"{name}: samples", "whole steps from the wanted time on", [len(series)], [spectrum.samples], absolute=1.0)
        series = series[: spectrum.samples]
        n = len(series)
        check(f"{name}: distance of lines (Hz)", "one over the time", 1 / (n * h), spectrum.resolution_hz, relative=1e-9)
        check(f"{name}: mean", "NumPy", series.mean(), spectrum.mean, absolute=1e-12 * np.abs(series).max())
        check(f"{name}: root mean square", "NumPy", series.std(), spectrum.rms, relative=1e-9)
        lines = motion.arrays["spectrum_amplitude"].reshape(-1, 3)[:, list(motion.spectra).index(name)]
        check(f"{name}: lines", "NumPy's FFT under a Hann window", hann_spectrum(series)[: len(lines)], lines,
              absolute=1e-10 * np.abs(series).max())
        assert (len(lines) - 1) * spectrum.resolution_hz <= 30.0 + 1e-9 < len(lines) * spectrum.resolution_hz + 1e-6


@pytest.mark.parametrize("ratio", [0.5, 0.95, 1.0, 1.6])
def test_harmonic_response(channel, ratio):
    brief, omega, stiffening = bead([{"id": "push", "loads": [force_on("m", 0, 1.0, 0)]}])
    damping, n, cycles = 0.05, 100, 50
    forced = ratio * omega
    h = 2 * pi / forced / n
    settle = int(np.ceil(16 / (damping * omega) / (n * h)))  # what the start leaves is below 2e-7
    motion = follow(channel, brief, [
        asked("shaken", AVERAGE, (settle + cycles) * n * h, h, watched=watch(u=movement("m", 0, 1, 0)),
              driven=[{"action": "push", "harmonic": {"amplitude": 1.0, "frequency_hz": forced / (2 * pi)}}],
              damping={"factors": {"mass_per_s": 2 * damping * omega}},
              spectra={"from_s": (settle * n + 1) * h}),
    ])["shaken"]
    # With these steps the force meets the oscillator at (2 / h) tan(forced h / 2): the closed form of the trapezoidal rule.
    seen = 2 / h * np.tan(forced * h / 2) / omega
    dynamic = 1 / sqrt((1 - seen**2) ** 2 + (2 * damping * seen) ** 2)
    static = 1.0 / BEAD["stiffness"]
    late = motion.time > settle * n * h
    amplitude, phase, mean = motions.amplitude_and_phase(motion.time[late], motion.watched["u"][late], forced)
    allowed = 1e-6 + stiffening(static * dynamic) * dynamic
    source = "damped oscillator: 1 / sqrt((1 - r^2)^2 + (2 ratio r)^2) of the static movement"
    check(f"r = {ratio}: amplitude (m)", source, static * dynamic, amplitude, relative=allowed)
    check(f"r = {ratio}: phase (rad)", "-atan2(2 ratio r, 1 - r^2)", -np.arctan2(2 * damping * seen, 1 - seen**2), phase,
          absolute=allowed)
    check(f"r = {ratio}: mean (m)", "none", 0.0, mean, absolute=1e-6 * static)
    highest = motion.spectra["u"].peaks[0]
    # Steps below 1e-3 of their peak: the exact amplitude differs by the elongation of the period alone.
    check(f"r = {ratio}: peak of the spectrum (Hz)", "the forcing frequency", forced / (2 * pi), highest.frequency_hz,
          relative=1e-6)
    check(f"r = {ratio}: amplitude of the peak (m)", source, static * dynamic, highest.amplitude, relative=allowed + 1e-6)
