//! A piece of rope that slides through nodes: several segments, one unstressed length.
//!
//! ```text
//! T_e = c_e N,    Σ l_e / (θ_e (1 + c_e N / EA_e)) = L0,    N = 0 while Σ l_e / θ_e ≤ L0
//! ```
//! Without friction all `c_e` are 1: one tension. Where stiffness and temperature are the same all along, the energy stays
//! convex (the least over all ways to share the length out of one that is convex in lengths and shares together); where they
//! change, equal tensions are not those of least energy, and no convexity is claimed. Where it slips against friction, `c` falls or
//! rises by `exp(μ θ)` from node to node (Euler–Eytelwein) and there is no energy any more.

/// A sliding piece as the equations see it; `c`, `θ` and `EA` a segment.
#[derive(Clone, Debug, PartialEq)]
pub struct Sliding {
    /// First of its segments.
    pub first: usize,
    /// Axial stiffness of every segment (N).
    pub axial_stiffness: Vec<f64>,
    /// Thermal stretch `θ = 1 + α ΔT` of every segment (–).
    pub expansion: Vec<f64>,
    /// `c`: tension of every segment over that of the piece (–).
    pub factors: Vec<f64>,
    /// `L0`: unstressed length of the piece at the reference temperature (m).
    pub unstressed_length: f64,
}

/// Newton steps for `N`; it is convex and monotone, five are usual.
const MOST_STEPS: usize = 60;

impl Sliding {
    /// Its segments.
    #[must_use]
    pub fn segments(&self) -> std::ops::Range<usize> {
        self.first..self.first + self.factors.len()
    }

    /// Whether it slips against friction somewhere: then its tensions differ.
    #[must_use]
    pub fn slips(&self) -> bool {
        self.factors.iter().any(|factor| *factor != 1.0)
    }

    /// Tension `N` of the piece (N) at the given lengths of its segments (m); zero while it is slack.
    #[must_use]
    pub fn tension(&self, lengths: &[f64]) -> f64 {
        let over = |n: f64| self.needed(lengths, n) - self.unstressed_length;
        if over(0.0) <= 0.0 {
            return 0.0;
        }
        // The needed length falls with N and is convex in it, so that Newton from the left never overshoots.
        let mut n = 0.0;
        for _ in 0..MOST_STEPS {
            let (excess, slope) = (over(n), self.needed_slope(lengths, n));
            let next = n + excess / slope;
            if next <= n || !next.is_finite() {
                break;
            }
            n = next;
        }
        n
    }

    /// Change of `N` with the length of every segment, `∂N/∂l_e` (N/m), at tension `n` (N).
    pub fn slopes_into(&self, lengths: &[f64], n: f64, slopes: &mut [f64]) {
        let whole = self.needed_slope(lengths, n);
        for (e, slope) in slopes.iter_mut().enumerate() {
            *slope = 1.0 / (self.stretch(e, n) * whole);
        }
    }

    /// Unstressed length that lies in every segment (m); while slack, shared in proportion to the lengths.
    pub fn shares_into(&self, lengths: &[f64], n: f64, shares: &mut [f64]) {
        for (e, share) in shares.iter_mut().enumerate() {
            *share = lengths[e] / self.stretch(e, n);
        }
        let total: f64 = shares.iter().sum();
        // Equal but for rounding where it is taut.
        let scale = if total > 0.0 {
            self.unstressed_length / total
        } else {
            0.0
        };
        for share in shares.iter_mut() {
            *share *= scale;
        }
    }

    /// Strain energy at tension `n` (J).
    #[must_use]
    pub fn energy(&self, lengths: &[f64], n: f64) -> f64 {
        (0..lengths.len())
            .map(|e| {
                let force = self.factors[e] * n;
                force * force / (2.0 * self.axial_stiffness[e]) * lengths[e] / (1.0 + force / self.axial_stiffness[e])
            })
            .sum()
    }

    /// Stress-free length beyond the lengths of the segments (m); negative while it is taut.
    #[must_use]
    pub fn lack(&self, lengths: &[f64]) -> f64 {
        self.unstressed_length - self.needed(lengths, 0.0)
    }

    fn stretch(&self, e: usize, n: f64) -> f64 {
        self.expansion[e] * (1.0 + self.factors[e] * n / self.axial_stiffness[e])
    }

    /// Unstressed length that the lengths need at tension `n` (m).
    fn needed(&self, lengths: &[f64], n: f64) -> f64 {
        lengths.iter().enumerate().map(|(e, l)| l / self.stretch(e, n)).sum()
    }

    /// `−∂ needed / ∂ N` (m/N).
    fn needed_slope(&self, lengths: &[f64], n: f64) -> f64 {
        (lengths.iter().enumerate())
            .map(|(e, l)| {
                let stretch = self.stretch(e, n);
                l * self.expansion[e] * self.factors[e] / (self.axial_stiffness[e] * stretch * stretch)
            })
            .sum()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn piece(factors: [f64; 3]) -> Sliding {
        Sliding {
            first: 0,
            axial_stiffness: vec![1e6, 1e6, 2e6],
            expansion: vec![1.0, 1.0003, 0.9998],
            factors: factors.to_vec(),
            unstressed_length: 9.6,
        }
    }

    #[test]
    fn slopes_against_differences_and_shares_fill_the_length() {
        let lengths = [3.2, 3.15, 3.5];
        for factors in [[1.0; 3], [1.0, 1.17, 0.9]] {
            let piece = piece(factors);
            let n = piece.tension(&lengths);
            let mut slopes = [0.0; 3];
            piece.slopes_into(&lengths, n, &mut slopes);
            for e in 0..3 {
                let moved = |h: f64| {
                    let mut lengths = lengths;
                    lengths[e] += h;
                    piece.tension(&lengths)
                };
                let difference = (moved(1e-5) - moved(-1e-5)) / 2e-5;
                assert!((difference - slopes[e]).abs() < 1e-6 * slopes[e]);
            }
            let mut shares = [0.0; 3];
            piece.shares_into(&lengths, n, &mut shares);
            assert!((shares.iter().sum::<f64>() - 9.6).abs() < 1e-12);
            for e in 0..3 {
                let law = piece.axial_stiffness[e] * (lengths[e] / (shares[e] * piece.expansion[e]) - 1.0);
                assert!((law - factors[e] * n).abs() < 1e-6 * n);
            }
        }
    }

    /// The same rope without friction and with one stiffness: `N = EA (Σ l / L0 − 1)`. Numbers: own reckoning in
    /// another language.
    #[test]
    fn one_stiffness_is_one_long_spring() {
        let mut piece = piece([1.0; 3]);
        piece.axial_stiffness = vec![1e6; 3];
        piece.expansion = vec![1.0; 3];
        let points =
            [[0.0, 0.0, 0.0], [3.0, 0.5, -1.0], [6.0, -0.2, -1.4], [9.0, 0.0, 0.5]].map(nalgebra::Vector3::from);
        let lengths: Vec<f64> = points.windows(2).map(|p| (p[1] - p[0]).norm()).collect();
        assert!((piece.tension(&lengths) - 27571.9668).abs() < 1e-4);
        piece.unstressed_length = 10.0;
        assert_eq!(piece.tension(&lengths), 0.0);
    }
}
