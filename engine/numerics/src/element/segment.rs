//! A straight segment: energy, axial force, force density and stiffness.

use nalgebra::{Matrix3, Vector3};

use crate::model::AxialLaw;

/// A straight segment as the equations see it, whatever it is made of.
///
/// ```text
/// a = L0 (1 + α ΔT),   k = EA / a
/// T = k (l − a)                       strut
/// T = k max(0, l − a)                 rope: slack when l ≤ a, exactly
/// ```
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Bar {
    /// `k`: force for unit elongation (N/m); zero for a segment that is taken out.
    pub stiffness: f64,
    /// `a`: length without force at the present temperature (m), positive.
    pub stress_free_length: f64,
    /// Whether it resists shortening.
    pub law: AxialLaw,
}

impl Bar {
    /// A segment of given section, length and temperature.
    ///
    /// `axial_stiffness`: `EA` (N). `unstressed_length`: `L0` at the reference temperature (m).
    /// `thermal_strain`: `α ΔT` (–).
    #[must_use]
    pub fn new(law: AxialLaw, axial_stiffness: f64, unstressed_length: f64, thermal_strain: f64) -> Self {
        let stress_free_length = unstressed_length * (1.0 + thermal_strain);
        Self {
            stiffness: axial_stiffness / stress_free_length,
            stress_free_length,
            law,
        }
    }

    /// A segment that is taken out: it bears nothing at any length.
    #[must_use]
    pub fn absent() -> Self {
        Self {
            stiffness: 0.0,
            stress_free_length: 1.0,
            law: AxialLaw::TensionOnly,
        }
    }

    /// Whether the segment is part of the net.
    #[must_use]
    pub fn is_present(&self) -> bool {
        self.stiffness > 0.0
    }

    /// Whether a change of `length` (m) changes the axial force.
    #[must_use]
    pub fn is_taut(&self, length: f64) -> bool {
        self.is_present() && (self.law == AxialLaw::TwoWay || length > self.stress_free_length)
    }

    /// Axial force `T` (N) at `length` (m), tension positive.
    #[must_use]
    pub fn axial_force(&self, length: f64) -> f64 {
        let elongation = length - self.stress_free_length;
        match self.law {
            // A rope carries no compression: up to its stress-free length it hangs slack.
            AxialLaw::TensionOnly => self.stiffness * elongation.max(0.0),
            AxialLaw::TwoWay => self.stiffness * elongation,
        }
    }

    /// Strain energy `T² / (2 k)` (J) at `length` (m).
    #[must_use]
    pub fn energy(&self, length: f64) -> f64 {
        let elongation = length - self.stress_free_length;
        let borne = match self.law {
            AxialLaw::TensionOnly => elongation.max(0.0),
            AxialLaw::TwoWay => elongation,
        };
        0.5 * self.stiffness * borne * borne
    }

    /// Stiffness of the second end against the first (N/m): derivative of the force `T n` by the chord `d`.
    ///
    /// ```text
    /// K = k n nᵀ + (T / l) (I − n nᵀ)   taut,   zero while slack
    /// ```
    ///
    /// `chord`: from the first end to the second (m).
    #[must_use]
    pub fn stiffness_block(&self, chord: &Vector3<f64>) -> Matrix3<f64> {
        let length = chord.norm();
        if !self.is_taut(length) {
            return Matrix3::zeros();
        }
        if length == 0.0 {
            // Only a strut can be taut without length; its direction is lost, so it resists alike all round.
            return Matrix3::from_diagonal_element(self.stiffness);
        }
        axial_block(self.stiffness, self.axial_force(length) / length, &(chord / length))
    }
}

/// `along n nᵀ + across (I − n nᵀ)`: stiffness of `along` (N/m) in the unit direction `n` and `across` beside it.
#[must_use]
pub(crate) fn axial_block(along: f64, across: f64, n: &Vector3<f64>) -> Matrix3<f64> {
    let c = along - across;
    let (x, y, z) = (c * n.x, c * n.y, c * n.z);
    let (xy, xz, yz) = (x * n.y, x * n.z, y * n.z);
    Matrix3::new(
        x * n.x + across,
        xy,
        xz,
        xy,
        y * n.y + across,
        yz,
        xz,
        yz,
        z * n.z + across,
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Central difference of `f` at 0, with the fourth-order rule.
    fn difference(f: impl Fn(f64) -> f64, h: f64) -> f64 {
        (8.0 * (f(h) - f(-h)) - (f(2.0 * h) - f(-2.0 * h))) / (12.0 * h)
    }

    fn bars() -> Vec<(Bar, Vector3<f64>)> {
        let d = Vector3::new(3.0, 4.0, 3.4);
        vec![
            (Bar::new(AxialLaw::TensionOnly, 2.4e6, 5.955335, 12e-6 * 25.0), d),
            (Bar::new(AxialLaw::TensionOnly, 2.4e6, 6.2, 0.0), d),
            (Bar::new(AxialLaw::TwoWay, 2.4e6, 6.2, 0.0), d),
            (Bar::new(AxialLaw::TensionOnly, 800.0, 1.0, 0.0), d),
        ]
    }

    #[test]
    fn force_is_the_slope_of_the_energy_and_stiffness_the_slope_of_the_force() {
        for (bar, d) in bars() {
            let force = |chord: Vector3<f64>| chord * (bar.axial_force(chord.norm()) / chord.norm());
            let k = bar.stiffness_block(&d);
            for axis in 0..3 {
                let moved = |h: f64| {
                    let mut chord = d;
                    chord[axis] += h;
                    chord
                };
                let slope = difference(|h| bar.energy(moved(h).norm()), 1e-3);
                assert!((slope - force(d)[axis]).abs() <= 1e-8 * force(d).norm().max(1e-30));
                for row in 0..3 {
                    let slope = difference(|h| force(moved(h))[row], 1e-3);
                    assert!((slope - k[(row, axis)]).abs() <= 1e-8 * k.amax().max(1e-30));
                }
            }
        }
    }

    /// Numbers of our own reckoning in another language, double precision.
    #[test]
    fn segment_of_known_force_and_stiffness() {
        let bar = Bar::new(AxialLaw::TensionOnly, 2.4e6, 5.955335, 12e-6 * 25.0);
        let d = Vector3::new(3.0, 4.0, 3.4);
        assert!((bar.axial_force(d.norm()) - 36003.286940).abs() < 1e-6);
        assert!((bar.stiffness_block(&d)[(0, 0)] - 103665.642242).abs() < 1e-6);
    }

    #[test]
    fn a_rope_at_its_stress_free_length_is_slack() {
        let bar = Bar::new(AxialLaw::TensionOnly, 1e6, 2.0, 0.0);
        assert!(!bar.is_taut(2.0));
        assert!(bar.is_taut(2.0 + 1e-15));
        assert_eq!(bar.axial_force(2.0), 0.0);
        assert_eq!(bar.stiffness_block(&Vector3::new(2.0, 0.0, 0.0)), Matrix3::zeros());
    }
}
