//! The lowest roots of a pencil by shift and invert.
//!
//! ```text
//! A = (K − σ M)⁻¹ M,  σ below every root        A is symmetric in the product xᵀ M y; θ = 1 / (ω² − σ)
//! V ← V, A v_j  made M-orthonormal              band Lanczos from several vectors, every vector against all others
//! H = Vᵀ M A V,  H s = θ s                      Rayleigh–Ritz
//! ```
//! Ericsson & Ruhe 1980; Nour-Omid, Parlett, Ericsson & Jensen 1987 for a mass matrix that is only semidefinite: vectors are
//! `A` times something, so that what has no mass follows the rest. Several starting vectors find multiple roots; that none
//! was missed is proven by a count of pivots in a gap above the roots, and vectors are added until the count is met.

use nalgebra::DMatrix;

use super::modes::{ModesError, Observer, go_on};
use super::pencil::Pencil;
use crate::equilibrium::linear::Factor;

/// Starting vectors.
const WIDTH: usize = 4;
/// What is left of `A x = θ x` over `θ` at which a pair is good enough; the root is as good as the square of that.
const RESIDUAL: f64 = 1e-9;
/// A gap between roots, over the upper one, in which they are counted.
const GAP: f64 = 1e-6;
/// What is left of a vector, over what it was, below which nothing new is in it.
const NOTHING_NEW: f64 = 1e-10;
/// Vectors after which the shift is set by the lowest root met.
const FIRST_VECTORS: usize = 20;

/// A root with its vector.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Pair {
    /// `ω²` (rad²/s²): the Rayleigh quotient of the vector.
    pub(super) root: f64,
    /// Vector over the free directions, `xᵀ M x = 1 kg`.
    pub(super) vector: Vec<f64>,
}

/// Roots counted by the signs of pivots.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Counted {
    /// Where (rad²/s²).
    pub(super) limit: f64,
    /// Roots below.
    pub(super) below: usize,
}

/// What the search came to.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Lowest {
    /// In rising order, up to a gap above the number wanted.
    pub(super) pairs: Vec<Pair>,
    /// The count above the last pair; `None` where pivots left it open.
    pub(super) counted: Option<Counted>,
    /// Shift (rad²/s²).
    pub(super) shift: f64,
    /// Vectors that it took.
    pub(super) vectors: usize,
}

/// The lowest `count` roots of a pencil, and those that can not be told apart from the last of them; fewer where there are
/// fewer.
///
/// `observe` is asked before each factorisation and each vector.
///
/// # Errors
/// [`ModesError::BeyondUse`] where numbers are, [`ModesError::Cancelled`] where `observe` stops it.
pub(super) fn lowest(
    pencil: &Pencil<'_>,
    factor: &mut Factor,
    count: usize,
    observe: Observer<'_>,
) -> Result<Lowest, ModesError> {
    let beyond_use = || ModesError::BeyondUse;
    let first = pencil.shift_below(factor, observe)?;
    let mut search = Search::new(pencil, factor, first);
    while search.done < FIRST_VECTORS && search.step(observe)? {}
    let ritz = search.ritz().ok_or_else(beyond_use)?;
    // Rounding of roots that are zero must not set the shift.
    let rounding = 10.0 * pencil.rounding();
    let least_gap = 1e-3 * pencil.rounding();
    let positive = ritz.roots.iter().copied().find(|root| *root > rounding);
    let wanted = match (ritz.roots.first(), positive) {
        (Some(lowest), Some(positive)) => Some(lowest.min(0.0) - 1e-3 * positive),
        _ => None,
    };
    go_on(observe)?;
    let shift = match wanted.filter(|wanted| pencil.take_shift(factor, *wanted)) {
        Some(wanted) => wanted,
        None if pencil.take_shift(factor, first) => first,
        None => return Err(ModesError::BeyondUse),
    };
    let mut search = Search::new(pencil, factor, shift);
    let most = pencil.size().min(8 * count + 160);
    loop {
        let until = (search.done + search.done / 8 + WIDTH).max(2 * count + WIDTH).min(most);
        while search.done < until && search.step(observe)? {}
        let ritz = search.ritz().ok_or_else(beyond_use)?;
        let (is_all, at_end) = (search.is_exhausted(), search.done >= most);
        let good = ritz.good();
        let gap = ritz.gap(count, if is_all { ritz.roots.len() } else { good }, least_gap);
        let Some((found, limits)) = gap else {
            if at_end || is_all {
                let found = good.min(count);
                return Ok(search.finish(&ritz, found, None));
            }
            continue;
        };
        let mut counted = None;
        for limit in limits {
            go_on(observe)?;
            if let Some(below) = pencil.count_below(search.factor, limit) {
                counted = Some(Counted { limit, below });
                break;
            }
        }
        go_on(observe)?;
        if !pencil.take_shift(search.factor, shift) {
            return Err(ModesError::BeyondUse);
        }
        let is_complete = counted.is_none_or(|counted| counted.below == found);
        if is_complete || at_end || is_all {
            return Ok(search.finish(&ritz, found, counted));
        }
        search.add_other();
    }
}

/// Rayleigh–Ritz pairs in rising order of the roots.
struct Ritz {
    roots: Vec<f64>,
    coefficients: DMatrix<f64>,
    residuals: Vec<f64>,
}

impl Ritz {
    /// How many of the lowest are good enough.
    fn good(&self) -> usize {
        self.residuals
            .iter()
            .take_while(|residual| **residual <= RESIDUAL)
            .count()
    }

    /// The least number of roots, `count` or more of the `usable` ones, above which there is a gap, and places in it for
    /// counting, the best first. All roots there are: the place is above the last.
    fn gap(&self, count: usize, usable: usize, least: f64) -> Option<(usize, Vec<f64>)> {
        let places = |low: f64, high: f64| {
            [0.5, 0.501, 0.499, 0.53, 0.47]
                .map(|share| low + share * (high - low))
                .to_vec()
        };
        for found in count.max(1)..=usable {
            let low = self.roots[found - 1];
            match self.roots.get(found) {
                Some(high) if high - low > GAP * high.abs() + least => return Some((found, places(low, *high))),
                Some(_) => {}
                None => return Some((found, places(low, low + low.abs().max(f64::MIN_POSITIVE)))),
            }
        }
        let all = self.roots.len();
        let last = self.roots.last().filter(|_| usable == all && all < count)?;
        Some((all, places(*last, last + last.abs().max(f64::MIN_POSITIVE))))
    }
}

struct Search<'a, 'b> {
    pencil: &'a Pencil<'b>,
    factor: &'a mut Factor,
    shift: f64,
    /// `V` and `M V`.
    basis: Vec<Vec<f64>>,
    images: Vec<Vec<f64>>,
    /// Column `j`: products of all basis vectors there were with `A v_j`.
    columns: Vec<Vec<f64>>,
    /// Basis vectors that `A` was applied to.
    done: usize,
    seed: u64,
    /// Whether nothing new is left anywhere.
    exhausted: bool,
}

impl<'a, 'b> Search<'a, 'b> {
    /// `factor` holds `K − σ M`.
    fn new(pencil: &'a Pencil<'b>, factor: &'a mut Factor, shift: f64) -> Self {
        let mut search = Self {
            pencil,
            factor,
            shift,
            basis: Vec::new(),
            images: Vec::new(),
            columns: Vec::new(),
            done: 0,
            seed: 0x9e37_79b9_7f4a_7c15,
            exhausted: false,
        };
        for _ in 0..WIDTH {
            search.add_other();
        }
        search
    }

    fn is_exhausted(&self) -> bool {
        self.exhausted && self.done == self.basis.len()
    }

    fn mass_times(&self, vector: &[f64]) -> Vec<f64> {
        let mut image = vec![0.0; vector.len()];
        self.pencil.pattern.product_into(&self.pencil.mass, vector, &mut image);
        image
    }

    /// `A` times the vector with this image.
    fn invert(&mut self, image: &[f64]) -> Vec<f64> {
        let mut vector = image.to_vec();
        self.factor.solve_in_place(&mut vector);
        vector
    }

    /// Takes what is along the basis out of a vector, twice, and returns it: products with the basis.
    fn orthogonalise(&self, vector: &mut [f64]) -> Vec<f64> {
        let mut products = vec![0.0; self.basis.len()];
        for _ in 0..2 {
            for ((v, image), product) in self.basis.iter().zip(&self.images).zip(&mut products) {
                let along = dot(image, vector);
                *product += along;
                vector.iter_mut().zip(v).for_each(|(x, v)| *x -= along * v);
            }
        }
        products
    }

    /// Adds what is left of a vector to the basis; returns its length in the product with `M`.
    fn add(&mut self, mut vector: Vec<f64>, before: f64) -> Option<f64> {
        let image = self.mass_times(&vector);
        let norm = dot(&vector, &image).max(0.0).sqrt();
        if !(norm > NOTHING_NEW * before && norm.is_finite()) {
            return None;
        }
        vector.iter_mut().for_each(|x| *x /= norm);
        // Once more: dividing by a small number lets rounding grow.
        self.orthogonalise(&mut vector);
        let image = self.mass_times(&vector);
        let unit = dot(&vector, &image).max(0.0).sqrt();
        self.basis.push(vector.into_iter().map(|x| x / unit).collect());
        self.images.push(image.into_iter().map(|x| x / unit).collect());
        Some(norm)
    }

    /// Adds a vector without any pattern, as far as it is new.
    fn add_other(&mut self) {
        let mut vector: Vec<f64> = (0..self.pencil.size()).map(|_| self.any_number()).collect();
        let image = self.mass_times(&vector);
        vector = self.invert(&image);
        let before = self.length(&vector);
        self.orthogonalise(&mut vector);
        self.exhausted = self.add(vector, before).is_none();
    }

    fn length(&self, vector: &[f64]) -> f64 {
        dot(vector, &self.mass_times(vector)).max(0.0).sqrt()
    }

    /// Numbers of −1 to 1, the same in every run (Marsaglia 2003).
    fn any_number(&mut self) -> f64 {
        self.seed ^= self.seed << 13;
        self.seed ^= self.seed >> 7;
        self.seed ^= self.seed << 17;
        let upper = u32::try_from(self.seed >> 32).expect("32 bits are left");
        f64::from(upper) / f64::from(u32::MAX) * 2.0 - 1.0
    }

    /// Applies `A` to the next basis vector; `false` where there is none.
    fn step(&mut self, observe: Observer<'_>) -> Result<bool, ModesError> {
        go_on(observe)?;
        if self.done == self.basis.len() {
            if !self.exhausted {
                self.add_other();
            }
            if self.done == self.basis.len() {
                return Ok(false);
            }
        }
        let image = self.images[self.done].clone();
        let mut vector = self.invert(&image);
        let before = self.length(&vector);
        let mut products = self.orthogonalise(&mut vector);
        if let Some(norm) = self.add(vector, before) {
            products.push(norm);
        }
        self.columns.push(products);
        self.done += 1;
        Ok(true)
    }

    fn ritz(&self) -> Option<Ritz> {
        let n = self.done;
        let entry = |i: usize, j: usize| self.columns[j].get(i).copied().unwrap_or(0.0);
        let small = DMatrix::from_fn(n, n, |i, j| 0.5 * (entry(i, j) + entry(j, i)));
        if small.iter().any(|entry| !entry.is_finite()) {
            return None;
        }
        let eigen = small.symmetric_eigen();
        let mut order: Vec<usize> = (0..n).filter(|i| eigen.eigenvalues[*i] > 0.0).collect();
        order.sort_by(|a, b| eigen.eigenvalues[*b].total_cmp(&eigen.eigenvalues[*a]));
        let coefficients = DMatrix::from_fn(n, order.len(), |i, j| eigen.eigenvectors[(i, order[j])]);
        let residuals = (0..order.len())
            .map(|k| {
                let left = |i: usize| (0..n).map(|j| entry(i, j) * coefficients[(j, k)]).sum::<f64>();
                let square: f64 = (n..self.basis.len()).map(|i| left(i).powi(2)).sum();
                square.sqrt() / eigen.eigenvalues[order[k]]
            })
            .collect();
        let roots = order
            .iter()
            .map(|i| self.shift + eigen.eigenvalues[*i].recip())
            .collect();
        Some(Ritz {
            roots,
            coefficients,
            residuals,
        })
    }

    /// The first `found` pairs: once more `A`, then Rayleigh–Ritz among them with `K` itself.
    fn finish(mut self, ritz: &Ritz, found: usize, counted: Option<Counted>) -> Lowest {
        let (vectors, size) = (self.done, self.pencil.size());
        let mut fine = Vec::with_capacity(found);
        for k in 0..found {
            let mut image = vec![0.0; size];
            for (j, of_basis) in self.images.iter().take(vectors).enumerate() {
                let share = ritz.coefficients[(j, k)];
                image.iter_mut().zip(of_basis).for_each(|(x, y)| *x += share * y);
            }
            fine.push(self.invert(&image));
        }
        self.basis.clear();
        self.images.clear();
        for mut vector in fine {
            let before = self.length(&vector);
            self.orthogonalise(&mut vector);
            self.add(vector, before);
        }
        let found = self.basis.len();
        let stiff: Vec<Vec<f64>> = (self.basis.iter())
            .map(|x| {
                let mut image = vec![0.0; size];
                self.pencil.pattern.product_into(&self.pencil.stiffness, x, &mut image);
                image
            })
            .collect();
        let product = |i: usize, j: usize| dot(&self.basis[i], &stiff[j]);
        let small = DMatrix::from_fn(found, found, |i, j| 0.5 * (product(i, j) + product(j, i)));
        let eigen = small.symmetric_eigen();
        let mut order: Vec<usize> = (0..found).collect();
        order.sort_by(|a, b| eigen.eigenvalues[*a].total_cmp(&eigen.eigenvalues[*b]));
        let pairs = (order.iter())
            .map(|k| {
                let mut vector = vec![0.0; size];
                for (j, v) in self.basis.iter().enumerate() {
                    let share = eigen.eigenvectors[(j, *k)];
                    vector.iter_mut().zip(v).for_each(|(x, y)| *x += share * y);
                }
                Pair {
                    root: eigen.eigenvalues[*k],
                    vector,
                }
            })
            .collect();
        Lowest {
            pairs,
            counted,
            shift: self.shift,
            vectors,
        }
    }
}

pub(super) fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}
