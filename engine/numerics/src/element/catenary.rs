//! A rope that hangs between two nodes under a constant dead load per length: the elastic catenary.

use nalgebra::{Matrix2, Matrix3, Vector2, Vector3};

use super::Bar;
use crate::model::AxialLaw;

/// A hanging rope as the equations see it.
///
/// The load acts on unstressed length at the reference temperature, the force on the length that temperature leaves free
/// of stress. In the stress-free coordinate `X`, from 0 to `a`, the rope is an elastic catenary of stiffness `EA` under
/// the load `w = |load| L0 / a`, so that a change of temperature alters `a` and leaves the total load `|load| L0` as it
/// is. "Up" is against the load, whatever its direction.
///
/// ```text
/// force in the rope       v(X) = v + w X up,   T = |v|           v at the first node, into the rope
/// shape                   dx/dX = (1 + T/EA) v/T
/// chord                   d(v) = ∫ dx/dX dX = grad Cc,   Cc(v) = ∫ |v| + |v|²/(2 EA) dX      convex
/// ```
///
/// The force for a given chord is found by Newton on the convex `Cc(v) − v·d` with a line search on its slope.
///
/// # Reference
/// Irvine 1981; start values after Jayaraman & Knudson 1981.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Catenary {
    /// `EA` (N), positive.
    pub axial_stiffness: f64,
    /// `L0`: length at the reference temperature without force (m), positive.
    pub unstressed_length: f64,
    /// `a = L0 (1 + α ΔT)`: length without force at the present temperature (m), positive.
    pub stress_free_length: f64,
    /// Dead load per unstressed length (N/m); zero makes the rope a straight bar.
    pub load: Vector3<f64>,
}

/// A catenary in balance between two nodes.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Hanging {
    /// Force of the rope on its first node (N).
    pub start: Vector3<f64>,
    /// Force of the rope on its second node (N); with `start` it sums up to the load on the rope.
    pub end: Vector3<f64>,
    /// Derivative of `start` by the chord (N/m), symmetric and positive semi-definite; that of `end` is its negative.
    ///
    /// A rope folded in the line of its load (both nodes on one such line, shorter apart than the rope) has no stiffness
    /// across it, but only as a limit: it grows with the inverse logarithm of the movement. There the secant over a
    /// movement of a millionth of the rope's length is given in its place.
    pub stiffness: Matrix3<f64>,
    /// Tension at the first node (N).
    pub tension_start: f64,
    /// Tension at the second node (N).
    pub tension_end: f64,
    /// Lowest tension along the rope (N).
    pub tension_least: f64,
    /// Length of the curve (m).
    pub length: f64,
    /// Strain energy `∫ T²/(2 EA) dX` (J).
    pub strain_energy: f64,
    /// Strain energy less the work of the load on the rope, the first node at the origin (J):
    /// `v·d − load·d L0 − Cc(v)`. Convex in the positions of both nodes.
    pub potential: f64,
    /// `∫ dX / T` (m/N): the rope's flexibility across it is `a/EA` more. Infinite where a fold has no tension.
    pub slenderness: f64,
    /// Newton steps taken.
    pub iterations: u32,
    /// Whether the ends meet within `1e-11 a`.
    pub converged: bool,
    rope: Catenary,
    frame: Frame,
    /// Forces at the first node over `EA`: across the load, and up.
    h: f64,
    va: f64,
    chord: Vector3<f64>,
}

/// Plane of the rope.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Frame {
    plan: Vector3<f64>,
    up: Vector3<f64>,
}

/// Loads below this share of `EA` leave no trace in double precision.
const NO_LOAD: f64 = 1e-60;
/// Distances across the load below this share of the length count as none.
const NO_SPAN: f64 = 1e-150;
/// Newton steps allowed.
const MOST_STEPS: u32 = 100;
/// Ends that meet within this share of the length are good (rounding does not let them get nearer in every rope).
const MEETS: f64 = 1e-11;
/// Share of a Newton step below which it is not shortened any more.
const SHORTEST: f64 = 1e-12;
/// Share of the length over which the stiffness across a fold is taken.
const FOLD_STEP: f64 = 1e-6;

/// Gauss's rule with eight points: places, on both sides of the middle, and weights (Abramowitz & Stegun 1964).
const GAUSS: [(f64, f64); 4] = [
    (0.183_434_642_495_649_8, 0.362_683_783_378_362),
    (0.525_532_409_916_329, 0.313_706_645_877_887_3),
    (0.796_666_477_413_626_7, 0.222_381_034_453_374_5),
    (0.960_289_856_497_536_3, 0.101_228_536_290_376_3),
];

/// Where a rope of unit length, unit `EA` and load `omega` ends, and its flexibility; `share` of the rope is laid.
#[derive(Clone, Copy, Debug)]
struct Laid {
    dh: f64,
    dz: f64,
    /// `∫ dX / T`.
    j: f64,
    ta: f64,
    tb: f64,
    vb: f64,
}

impl Catenary {
    /// The rope between two nodes.
    ///
    /// `chord`: from the first node to the second (m). `guess`: a force at the first node to begin with (N), such as that
    /// of a neighbouring chord.
    #[must_use]
    pub fn at(&self, chord: &Vector3<f64>, guess: Option<&Vector3<f64>>) -> Hanging {
        let (ea, a) = (self.axial_stiffness, self.stress_free_length);
        let omega = self.load.norm() * (self.unstressed_length / ea);
        if omega < NO_LOAD {
            return self.straight(chord);
        }
        let up = -self.load.normalize();
        let rise = chord.dot(&up);
        let across = chord - up * rise;
        // Twice is enough: what the first projection leaves along the load is rounding.
        let across = across - up * across.dot(&up);
        let span = across.norm();
        let plan = if span > NO_SPAN * a {
            across / span
        } else {
            any_across(&up)
        };
        let frame = Frame { plan, up };
        let (lh, dz) = (span / a, rise / a);
        let guess = guess.map(|v| Vector2::new(v.dot(&plan), v.dot(&up)) / ea);
        let (h, va, iterations) = if lh <= NO_SPAN {
            (0.0, vertical(omega, dz), 0)
        } else {
            invert(omega, lh, dz, guess)
        };
        let laid = lay(omega, h, va, 1.0);
        let missed = (laid.dh - if lh <= NO_SPAN { 0.0 } else { lh }).hypot(laid.dz - dz);
        let start = ea * (plan * h + up * va);
        let (ta, tb, vb) = (laid.ta, laid.tb, laid.vb);
        let tension_integral = tension_integral(h, va, &laid);
        let square_integral = h * h + (va * va + va * vb + vb * vb) / 3.0;
        let conjugate = tension_integral + 0.5 * square_integral;
        Hanging {
            start,
            end: self.load * self.unstressed_length - start,
            stiffness: stiffness(omega, h, va, dz, &frame) * (ea / a),
            tension_start: ea * ta,
            tension_end: ea * tb,
            tension_least: ea * if va * vb < 0.0 { h } else { ta.min(tb) },
            length: a * (1.0 + tension_integral),
            strain_energy: 0.5 * ea * a * square_integral,
            potential: ea * a * (h * lh + (va + omega) * dz - conjugate),
            slenderness: laid.j * a / ea,
            iterations,
            converged: missed <= MEETS * 1.0_f64.max(lh.hypot(dz)),
            rope: *self,
            frame,
            h,
            va,
            chord: *chord,
        }
    }

    fn straight(&self, chord: &Vector3<f64>) -> Hanging {
        let bar = Bar {
            stiffness: self.axial_stiffness / self.stress_free_length,
            stress_free_length: self.stress_free_length,
            law: AxialLaw::TensionOnly,
        };
        let length = chord.norm();
        let tension = bar.axial_force(length);
        let start = if tension > 0.0 {
            chord * (tension / length)
        } else {
            Vector3::zeros()
        };
        Hanging {
            start,
            end: -start,
            stiffness: bar.stiffness_block(chord),
            tension_start: tension,
            tension_end: tension,
            tension_least: tension,
            length: length.max(self.stress_free_length),
            strain_energy: bar.energy(length),
            potential: bar.energy(length),
            slenderness: self.stress_free_length / tension,
            iterations: 0,
            converged: true,
            rope: *self,
            frame: Frame {
                plan: Vector3::x(),
                up: Vector3::z(),
            },
            h: 0.0,
            va: 0.0,
            chord: *chord,
        }
    }
}

impl Hanging {
    /// Where the rope is at a material coordinate, from its first node (m).
    ///
    /// `unstressed`: distance from the first node along the rope before it was stressed, 0 to `L0` (m). A rope without
    /// load has no shape of its own where it is slack; it is laid along the chord.
    #[must_use]
    pub fn point(&self, unstressed: f64) -> Vector3<f64> {
        let share = (unstressed / self.rope.unstressed_length).clamp(0.0, 1.0);
        let omega = self.omega();
        if omega < NO_LOAD {
            return self.chord * share;
        }
        let laid = lay(omega, self.h, self.va, share);
        (self.frame.plan * laid.dh + self.frame.up * laid.dz) * self.rope.stress_free_length
    }

    /// Largest distance of the rope from its chord, measured along the load (m).
    ///
    /// Where both nodes lie on one line along the load: how far the rope reaches beyond both of them.
    #[must_use]
    pub fn sag(&self) -> f64 {
        let omega = self.omega();
        if omega < NO_LOAD {
            return 0.0;
        }
        let a = self.rope.stress_free_length;
        let rise = self.chord.dot(&self.frame.up) / a;
        let span = (self.chord / a - self.frame.up * rise).norm();
        if self.h <= 0.0 {
            let lowest = lay(omega, 0.0, self.va, (-self.va / omega).clamp(0.0, 1.0)).dz;
            return a * (rise.min(0.0) - lowest).max(0.0);
        }
        // Farthest where the rope runs parallel to its chord.
        let share = ((self.h * rise / span - self.va) / omega).clamp(0.0, 1.0);
        let laid = lay(omega, self.h, self.va, share);
        a * (rise / span * laid.dh - laid.dz).max(0.0)
    }

    /// Gap between the rope's chord and a force at its first node that is `beyond` (N) that of the chord (J): the energy of
    /// the chord plus the conjugate energy of the force less their product, zero or more.
    ///
    /// ```text
    /// Cc(v + δ) − Cc(v) − δ·d = ∫ |δ|²/(2 EA) + (|v(X) + δ| − |v(X)| − δ·n(X)) dX
    /// ```
    ///
    /// The second term is integrated by Gauss's rule in panels over the angle of the rope, in which it is smooth for small
    /// `δ`; where `δ` is as large as the force in the rope its error is a hundredth of the gap at most.
    #[must_use]
    pub fn gap(&self, beyond: &Vector3<f64>) -> f64 {
        let (ea, a, omega) = (self.rope.axial_stiffness, self.rope.stress_free_length, self.omega());
        let size = beyond.norm();
        if omega < NO_LOAD || size == 0.0 {
            return size * size * a / (2.0 * ea);
        }
        let delta = beyond / ea;
        // A fold has a point without force; any smooth coordinate serves as well there.
        let h = self.h.max(0.5 * size / ea).max(1e-9 * omega);
        let vb = self.va + omega;
        let (ta, tb) = (h.hypot(self.va), h.hypot(vb));
        let (first, whole) = ((self.va / h).asinh(), angle(h, self.va, vb, ta, tb, omega));
        let mut lifted = 0.0;
        // Where the rope folds its direction jumps.
        let folds = self.va < 0.0 && vb > 0.0;
        let stretches = if folds {
            [(first, -first), (0.0, first + whole)]
        } else {
            [(first, whole), (first, 0.0)]
        };
        for (from, wide) in stretches {
            let n_panels = wide.ceil().clamp(1.0, 100.0);
            let mut panel = 0.0;
            while panel < n_panels && wide > 0.0 {
                for (place, weight) in GAUSS {
                    for side in [-1.0, 1.0] {
                        let psi = from + wide * (panel + 0.5 * (1.0 + side * place)) / n_panels;
                        let force = self.frame.plan * self.h + self.frame.up * (h * psi.sinh());
                        lifted += 0.5 * weight * lift(&force, &delta) * h * psi.cosh() * (wide / n_panels) / omega;
                    }
                }
                panel += 1.0;
            }
        }
        ea * a * (0.5 * delta.norm_squared() + lifted)
    }

    fn omega(&self) -> f64 {
        self.rope.load.norm() * (self.rope.unstressed_length / self.rope.axial_stiffness)
    }
}

/// Any unit vector across another.
fn any_across(up: &Vector3<f64>) -> Vector3<f64> {
    let mut axis = Vector3::zeros();
    axis[up.iamin()] = 1.0;
    (axis - up * up.dot(&axis)).normalize()
}

/// `asinh(vb/h) − asinh(va/h)`, `vb − va = step > 0`, without a difference of like numbers.
fn angle(h: f64, va: f64, vb: f64, ta: f64, tb: f64, step: f64) -> f64 {
    let grown = |low: f64, sum: f64, t_low: f64| (step * (1.0 + sum / (ta + tb)) / (low + t_low)).ln_1p();
    if va >= 0.0 {
        grown(va, va + vb, ta)
    } else if vb <= 0.0 {
        grown(-vb, -(va + vb), tb)
    } else {
        (vb / h).asinh() + (-va / h).asinh()
    }
}

fn lay(omega: f64, h: f64, va: f64, share: f64) -> Laid {
    let step = omega * share;
    let vb = va + step;
    let (ta, tb) = (h.hypot(va), h.hypot(vb));
    let j = angle(h, va, vb, ta, tb, step) / omega;
    // Half the sum of the rises over the sum of the tensions; both vanish where nothing is laid.
    let rise = if ta + tb > 0.0 { (va + vb) / (ta + tb) } else { 0.0 };
    Laid {
        dh: if h > 0.0 { h * (share + j) } else { 0.0 },
        dz: share * (0.5 * (va + vb) + rise),
        j,
        ta,
        tb,
        vb,
    }
}

/// `|v + δ| − |v| − δ·n`, `n` the direction of `v`; zero or more.
fn lift(v: &Vector3<f64>, delta: &Vector3<f64>) -> f64 {
    let tension = v.norm();
    let n = if tension > 0.0 { v / tension } else { Vector3::zeros() };
    let more = delta.dot(&n);
    let (in_line, across) = (tension + more, (delta - n * more).norm());
    let with = in_line.hypot(across);
    if in_line > 0.0 {
        across * (across / (with + in_line))
    } else {
        with - in_line
    }
}

/// `∫ T dX`, every term positive.
fn tension_integral(h: f64, va: f64, laid: &Laid) -> f64 {
    let (sum, rise) = (laid.ta + laid.tb, va + laid.vb);
    let curved = if h > 0.0 { 0.5 * h * h * laid.j } else { 0.0 };
    0.25 * (sum + rise * (rise / sum)) + curved
}

/// Flexibility in the plane, `(h, z)`.
fn flexibility(omega: f64, h: f64, va: f64, laid: &Laid) -> Matrix2<f64> {
    let Laid { j, ta, tb, vb, .. } = *laid;
    let s = if va * vb <= 0.0 {
        (vb / tb - va / ta) / omega
    } else {
        (h / ta) * (h / tb) * ((va + vb) / (vb * ta + va * tb))
    };
    let hz = -(h / ta) / tb * ((va + vb) / (ta + tb));
    Matrix2::new(1.0 + j - s, hz, hz, 1.0 + s)
}

/// Stiffness of the scaled rope.
fn stiffness(omega: f64, h: f64, va: f64, dz: f64, frame: &Frame) -> Matrix3<f64> {
    let Frame { plan, up } = frame;
    let side = plan.cross(up);
    let laid = lay(omega, h, va, 1.0);
    if h == 0.0 {
        let folded = va < 0.0 && laid.vb > 0.0;
        let (across, along) = if !folded && laid.j.is_finite() {
            (1.0 / (1.0 + laid.j), 1.0)
        } else {
            let (pull, _, _) = invert(omega, FOLD_STEP, dz, None);
            let along = if folded { 1.0 / (1.0 + 2.0 / omega) } else { 1.0 };
            (pull / FOLD_STEP, along)
        };
        return super::axial_block(along, across, up);
    }
    let f = flexibility(omega, h, va, &laid);
    let determinant = f[(0, 0)] * f[(1, 1)] - f[(0, 1)] * f[(0, 1)];
    let hz = -f[(0, 1)] / determinant;
    let mut k = plan * plan.transpose() * (f[(1, 1)] / determinant);
    k += (plan * up.transpose() + up * plan.transpose()) * hz;
    k += up * up.transpose() * (f[(0, 0)] / determinant);
    k + side * side.transpose() / (1.0 + laid.j)
}

/// Force up at the first node of a rope with both nodes on one line along its load.
fn vertical(omega: f64, dz: f64) -> f64 {
    let unfolded = 1.0 + 0.5 * omega;
    if dz >= unfolded {
        dz - unfolded
    } else if dz <= -unfolded {
        dz + 1.0 - 0.5 * omega
    } else {
        -0.5 * omega * (1.0 - dz / unfolded)
    }
}

/// Where to begin: an inextensible catenary where the rope is long, else a taut parabola.
fn begin(omega: f64, lh: f64, dz: f64) -> Vector2<f64> {
    let chord = lh.hypot(dz);
    let cos = lh / chord;
    // T − ε − (ω cos)²/(24 T²) is concave and has one positive root, to which Newton climbs from below.
    let strain = chord - 1.0;
    let pull = (omega * cos).powi(2) / 24.0;
    let mut tension = if strain >= 0.0 {
        strain.max(pull.cbrt())
    } else {
        (0.5 * pull).cbrt().min((-0.5 * pull / strain).sqrt())
    };
    for _ in 0..8 {
        let square = tension * tension;
        let error = tension - strain - pull / square;
        tension -= error / (1.0 + 2.0 * pull / (square * tension));
    }
    let taut = Vector2::new(tension * cos, tension * dz / chord - 0.5 * omega);
    // Half the angle of the inextensible rope: sinh q / q = slack.
    let slack = ((1.0 - dz) * (1.0 + dz)).max(0.0).sqrt() / lh;
    if slack <= 1.02 {
        return taut;
    }
    let mut q = if slack < 3.0 {
        (6.0 * (slack - 1.0)).sqrt()
    } else {
        (2.0 * slack).ln() + 1.0
    };
    for _ in 0..6 {
        // On the logarithm, which no size of the angle overflows: ln sinh q = q + ln((1 − e^−2q)/2).
        let error = q + (-(-2.0 * q).exp_m1() / 2.0).ln() - q.ln() - slack.ln();
        q = (q - error / (1.0 / q.tanh() - 1.0 / q)).max(1e-3);
    }
    Vector2::new(0.5 * omega * lh / q, 0.5 * omega * (dz / q.tanh() - 1.0))
}

/// Force at the first node of the scaled rope for a chord with `lh > 0`: across the load, up, and the steps taken.
fn invert(omega: f64, lh: f64, dz: f64, guess: Option<Vector2<f64>>) -> (f64, f64, u32) {
    let wanted = Vector2::new(lh, dz);
    let missed = |v: &Vector2<f64>| {
        let laid = lay(omega, v.x, v.y, 1.0);
        (Vector2::new(laid.dh, laid.dz) - wanted, laid)
    };
    let mut v = begin(omega, lh, dz);
    let (mut gradient, mut laid) = missed(&v);
    if let Some(other) = guess.filter(|g| g.x > 0.0 && g.iter().all(|c| c.is_finite())) {
        let (miss, at) = missed(&other);
        if miss.norm() < gradient.norm() {
            (v, gradient, laid) = (other, miss, at);
        }
    }
    let good = MEETS * 1.0_f64.max(wanted.norm());
    let mut steps = 0;
    while steps < MOST_STEPS {
        let f = flexibility(omega, v.x, v.y, &laid);
        let determinant = f[(0, 0)] * f[(1, 1)] - f[(0, 1)] * f[(0, 1)];
        let step = -Vector2::new(
            f[(1, 1)] * gradient.x - f[(0, 1)] * gradient.y,
            f[(0, 0)] * gradient.y - f[(0, 1)] * gradient.x,
        ) / determinant;
        if !(step.x.is_finite() && step.y.is_finite()) {
            break;
        }
        let slope = -gradient.dot(&step);
        let mut t = 1.0;
        let (next, at, moved) = loop {
            let moved = v + t * step;
            if moved.x >= 0.02 * v.x || t < SHORTEST {
                let (next, at) = missed(&moved);
                if next.dot(&step) <= 0.9 * slope.abs() || t < SHORTEST {
                    break (next, at, moved);
                }
            }
            t *= 0.5;
        };
        steps += 1;
        let settled = gradient.norm() <= good;
        if settled && next.norm() >= gradient.norm() {
            break;
        }
        let quick = next.norm() <= 0.1 * gradient.norm();
        (v, gradient, laid) = (moved, next, at);
        if settled && !quick {
            break;
        }
    }
    (v.x, v.y, steps)
}

#[cfg(test)]
mod tests;
