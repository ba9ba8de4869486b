//! Force densities for which families have their wanted mean tensions and the shape meets its targets.
//!
//! ```text
//! unknown  y_f = ln |q_f|            so that no rope comes to push
//! wanted   c(y) = 0                  c_f = ln (mean T / wanted) of the families that have one; then the targets, see `rows`
//! step     (Jᵀ J + λ I) δ = −Jᵀ c,   λ = μ |c|²
//! bounds   y_f at a bound whose step leads beyond it stays there
//! ```
//!
//! `J` is exact. With `λ` falling as `|c|²` the end is quadratic, also where what is wanted is not independent. Few
//! unknowns are solved for by orthogonal factors of `J`, many by products with it alone.
//!
//! Where targets leave freedom, the densities change least: among the `y` that meet them as well, the one nearest to
//! that of the rules, `min |y − y_rules|²`, by steps in the null space of `J` and back.
//!
//! # Reference
//! Force densities and their derivatives: Schek 1974. Damping with `|c|²`: Yamashita & Fukushima 2001. Products alone:
//! Paige & Saunders 1982. Steps towards the least change: Barzilai & Borwein 1988.

use nalgebra::{DMatrix, DVector, Vector3};

use super::ShapeError;
use super::lsqr::lsqr;
use super::rows::MET_TARGET;
use super::search::{Point, Search};

/// Deviation of a mean tension from the wanted one at which it is met.
pub(super) const MET: f64 = 1e-10;
/// Deviation below which the search for better force densities ends at once.
const MET_TO_ROUNDING: f64 = 1e-13;
const MAX_STEPS: usize = 200;
/// Longest step of a logarithm: no force density changes by more than a factor of about 7 at once.
const LONGEST_STEP: f64 = 2.0;
/// Singular values of `J` smaller than this share of the largest count as zero.
const RANK: f64 = 1e-8;
/// Unknowns up to which `J` is formed and factorised.
const DENSE: usize = 400;
/// Tolerance of the least squares by products.
const PRODUCTS: f64 = 1e-10;
const MAX_PRODUCTS: usize = 2000;
/// Step of the logarithms at which least squares that cannot be met have settled.
const SETTLED: f64 = 1e-11;
/// Change along the null space, over the change in all, at which the densities are as near the rules' as can be.
const NEAREST: f64 = 1e-9;
const MAX_APPROACHES: usize = 60;

/// What the search for force densities came to.
#[derive(Clone, Debug)]
pub(super) struct Densities {
    pub(super) point: Point,
    /// Force density of each family (N/m).
    pub(super) densities: Vec<f64>,
    /// Mean axial force of each family (N).
    pub(super) means: Vec<f64>,
    /// Weighted deviations: of the families with a wanted tension, then of the targets.
    pub(super) misses: DVector<f64>,
    /// Whether everything wanted is met.
    pub(super) met: bool,
    /// How much of what is wanted can be chosen independently; worked out where some is not met, and `J` is formed.
    pub(super) rank: Option<usize>,
}

/// A shape on the way.
struct Way {
    point: Point,
    densities: Vec<f64>,
    misses: DVector<f64>,
}

impl Search<'_, '_> {
    /// Finds force densities of all families from a start.
    ///
    /// `densities`: to start from (N/m). `start`: positions to start from (m).
    pub(super) fn with_wanted(
        &mut self,
        start: Vec<Vector3<f64>>,
        densities: Vec<f64>,
    ) -> Result<Densities, ShapeError> {
        let n = self.parts.families.len();
        let mut point = self.balanced(start, &densities)?;
        let mut densities = densities;
        let by_targets = !self.rows.list.is_empty() || self.parts.families.iter().any(|f| f.wanted().is_none());
        if n > 0 {
            self.approach(&mut point, &mut densities)?;
        }
        let origin: Vec<f64> = (self.parts.families.iter().zip(&densities))
            .map(|(family, found)| family.given_density().unwrap_or(*found))
            .collect();
        let misses = self.misses(&point);
        self.check_measured(&misses)?;
        let mut way = Way {
            point,
            densities,
            misses,
        };
        self.descend(&mut way, by_targets)?;
        if by_targets && n > 0 && !way.misses.is_empty() {
            self.draw_near(&mut way, &origin)?;
        }
        let met = self.all_met(&way.misses);
        let rank = if met {
            Some(way.misses.len())
        } else if n == 0 {
            Some(0)
        } else if n <= DENSE {
            Some(rank(&self.jacobian(&way.point, &way.densities)?))
        } else {
            None
        };
        Ok(Densities {
            means: self.means(&way.point),
            point: way.point,
            densities: way.densities,
            misses: way.misses,
            met,
            rank,
        })
    }

    /// Goes on from a result with one equation left out.
    pub(super) fn without(&mut self, row: usize, found: &Densities) -> Result<Densities, ShapeError> {
        self.dropped = Some(row);
        let mut way = Way {
            point: found.point.clone(),
            densities: found.densities.clone(),
            misses: self.misses(&found.point),
        };
        let outcome = self.descend(&mut way, true);
        self.dropped = None;
        outcome?;
        let misses = self.misses(&way.point);
        Ok(Densities {
            means: self.means(&way.point),
            met: self.all_met(&misses),
            point: way.point,
            densities: way.densities,
            misses,
            rank: None,
        })
    }

    /// Damped Gauss-Newton until everything is met, or nothing better is found.
    ///
    /// `by_targets`: whether to settle on least squares closely where not everything can be met.
    fn descend(&mut self, way: &mut Way, by_targets: bool) -> Result<(), ShapeError> {
        let mut damping = 1e-3;
        let mut stale = 0;
        let (creep, patience) = if by_targets { (1.0 - 1e-10, 30) } else { (0.98, 8) };
        for _ in 0..MAX_STEPS {
            if way.misses.amax() <= MET_TO_ROUNDING || stale >= patience || way.densities.is_empty() {
                break;
            }
            let size = way.misses.norm();
            let mut improved = false;
            let mut settled = false;
            let step_at = self.step_at(way)?;
            while !improved && damping < 1e12 {
                let step = self.damped_step(way, &step_at, damping * size * size);
                settled = by_targets && step.amax() <= SETTLED;
                let trial = self.stepped(&way.densities, step.as_slice());
                match self.balanced(way.point.positions.clone(), &trial) {
                    Ok(next) => {
                        let next_misses = self.misses(&next);
                        if next_misses.norm() < size {
                            improved = true;
                            // Creeping is not progress: several steps of it end the search.
                            stale = if next_misses.norm() > creep * size {
                                stale + 1
                            } else {
                                0
                            };
                            damping = (damping * 0.2).max(1e-12);
                            *way = Way {
                                point: next,
                                densities: trial,
                                misses: next_misses,
                            };
                            continue;
                        }
                    }
                    Err(ShapeError::Cancelled) => return Err(ShapeError::Cancelled),
                    Err(_) => {}
                }
                if way.misses.amax() <= MET || settled {
                    // Within rounding of the balance no step need improve.
                    break;
                }
                damping *= 5.0;
            }
            if !improved || settled {
                break;
            }
        }
        Ok(())
    }

    /// Changes the densities towards those of the rules, as far as nothing wanted suffers.
    fn draw_near(&mut self, way: &mut Way, origin: &[f64]) -> Result<(), ShapeError> {
        let apart = |densities: &[f64]| {
            DVector::from_iterator(
                densities.len(),
                densities.iter().zip(origin).map(|(q, from)| (from / q).ln()),
            )
        };
        let mut share = 1.0;
        let mut along = self.along_null_space(way, &apart(&way.densities))?;
        for _ in 0..MAX_APPROACHES {
            let distance = apart(&way.densities).norm();
            if along.norm() <= NEAREST * distance.max(1.0) {
                break;
            }
            let held = way.misses.norm();
            let mut nearer = false;
            while !nearer && share > 1e-3 {
                let step = &along * share;
                let trial = self.stepped(&way.densities, step.as_slice());
                let moved = self.balanced(way.point.positions.clone(), &trial);
                if matches!(moved, Err(ShapeError::Cancelled)) {
                    return Err(ShapeError::Cancelled);
                }
                if let Ok(point) = moved {
                    let mut next = Way {
                        misses: self.misses(&point),
                        point,
                        densities: trial,
                    };
                    self.descend(&mut next, true)?;
                    // As good as before, but for rounding.
                    let as_good = next.misses.norm() <= held * (1.0 + 1e-9) || self.all_met(&next.misses);
                    let back = apart(&next.densities);
                    if as_good && back.norm() <= distance * (1.0 + 1e-12) {
                        let next_along = self.along_null_space(&next, &back)?;
                        // At the end the distance no longer tells, but the way that is left still does.
                        if back.norm() < distance * (1.0 - 1e-9) || next_along.norm() < along.norm() {
                            nearer = true;
                            // The next step as the last one found the slope to change (Barzilai & Borwein 1988).
                            let taken = apart(&way.densities) - back;
                            let bend = taken.dot(&(&along - &next_along));
                            share = taken.norm_squared() / bend;
                            share = if bend > 0.0 { share.clamp(0.05, 20.0) } else { 1.0 };
                            (*way, along) = (next, next_along);
                            continue;
                        }
                    }
                }
                share *= 0.5;
            }
            if !nearer {
                break;
            }
        }
        Ok(())
    }

    /// The part of a change of the logarithms that changes nothing wanted, to the first order.
    fn along_null_space(&mut self, way: &Way, change: &DVector<f64>) -> Result<DVector<f64>, ShapeError> {
        let free = self.free(way, Some(change));
        let change = DVector::from_fn(change.len(), |f, _| if free[f] { change[f] } else { 0.0 });
        if way.densities.len() <= DENSE {
            let mut jacobian = self.jacobian(&way.point, &way.densities)?;
            fix(&mut jacobian, &free);
            let svd = jacobian.svd(false, true);
            let directions = svd.v_t.expect("asked for");
            let largest = svd.singular_values.max();
            let mut along = change;
            for (value, direction) in svd.singular_values.iter().zip(directions.row_iter()) {
                if *value > RANK * largest {
                    let direction = direction.transpose();
                    along -= &direction * direction.dot(&along);
                }
            }
            return Ok(along);
        }
        self.factorise(&way.point, &way.densities, 0.0)?;
        let slopes = self.slopes(&way.point);
        let right = self.forward(&way.point, &way.densities, &slopes, change.as_slice());
        let across = self.by_products(way, &slopes, &free, &right, 0.0);
        Ok(change - across)
    }

    /// What steps from a point need: which unknowns may move, and `J` or what its products need.
    fn step_at(&mut self, way: &Way) -> Result<StepAt, ShapeError> {
        if way.densities.len() <= DENSE {
            let mut jacobian = self.jacobian(&way.point, &way.densities)?;
            let gradient = jacobian.transpose() * &way.misses;
            let free = self.free(way, Some(&-gradient));
            fix(&mut jacobian, &free);
            return Ok(StepAt::Dense { jacobian });
        }
        self.factorise(&way.point, &way.densities, 0.0)?;
        let slopes = self.slopes(&way.point);
        let bounded = self.parts.families.iter().any(|f| f.bounds() != (0.0, f64::INFINITY));
        let gradient = bounded.then(|| {
            let gradient = self.backward(&way.point, &way.densities, &slopes, way.misses.as_slice());
            -DVector::from_vec(gradient)
        });
        let free = self.free(way, gradient.as_ref());
        Ok(StepAt::Products { slopes, free })
    }

    fn damped_step(&mut self, way: &Way, at: &StepAt, damping: f64) -> DVector<f64> {
        let step = match at {
            StepAt::Dense { jacobian } => damped_step(jacobian, &way.misses, damping),
            StepAt::Products { slopes, free } => {
                // Trials in between may have factorised for other densities.
                if self.factorise(&way.point, &way.densities, 0.0).is_err() {
                    return DVector::zeros(way.densities.len());
                }
                let right: Vec<f64> = way.misses.iter().map(|c| -c).collect();
                self.by_products(way, slopes, free, &right, damping.sqrt())
            }
        };
        let longest = step.amax();
        if longest > LONGEST_STEP {
            step * (LONGEST_STEP / longest)
        } else {
            step
        }
    }

    fn by_products(
        &mut self,
        way: &Way,
        slopes: &[super::rows::Slope],
        free: &[bool],
        right: &[f64],
        damping: f64,
    ) -> DVector<f64> {
        let search = std::cell::RefCell::new(self);
        let only_free = |mut v: Vec<f64>| {
            v.iter_mut()
                .zip(free)
                .filter(|(_, free)| !**free)
                .for_each(|(v, _)| *v = 0.0);
            v
        };
        let forward = |v: &[f64]| search.borrow_mut().forward(&way.point, &way.densities, slopes, v);
        let backward = |u: &[f64]| only_free(search.borrow_mut().backward(&way.point, &way.densities, slopes, u));
        DVector::from_vec(lsqr(forward, backward, right, damping, PRODUCTS, MAX_PRODUCTS))
    }

    /// Which unknowns may move: not those at a bound beyond which `direction` leads.
    fn free(&self, way: &Way, direction: Option<&DVector<f64>>) -> Vec<bool> {
        let families = self.parts.families.iter().zip(&way.densities).enumerate();
        families
            .map(|(f, (family, q))| {
                let (least, most) = family.bounds();
                let towards = direction.map_or(0.0, |d| d[f]);
                !(q.abs() <= least && towards <= 0.0 && least > 0.0 || q.abs() >= most && towards >= 0.0)
            })
            .collect()
    }

    /// Densities after a step of their logarithms, within their bounds.
    fn stepped(&self, densities: &[f64], step: &[f64]) -> Vec<f64> {
        let families = self.parts.families.iter().zip(densities).zip(step);
        families
            .map(|((family, q), d)| {
                let (least, most) = family.bounds();
                let next = q * d.exp();
                if next.abs() < least || next.abs() > most {
                    next.abs().clamp(least, most).copysign(next)
                } else {
                    next
                }
            })
            .collect()
    }

    /// A few rounds of `q ← q wanted / mean T`: crude, but it can not go astray.
    fn approach(&mut self, point: &mut Point, densities: &mut [f64]) -> Result<(), ShapeError> {
        for _ in 0..6 {
            let misses = self.misses_of_means(point);
            if misses.iter().all(|miss| miss.abs() <= 0.1) {
                break;
            }
            let wanted = self.parts.families.iter().zip(densities.iter_mut());
            let wanted = wanted.filter(|(family, _)| family.wanted().is_some());
            for ((_, q), miss) in wanted.zip(&misses) {
                *q *= (-miss).clamp(-LONGEST_STEP, LONGEST_STEP).exp();
            }
            *point = self.balanced(std::mem::take(&mut point.positions), densities)?;
        }
        Ok(())
    }

    /// Mean axial force of each family (N).
    pub(super) fn means(&self, point: &Point) -> Vec<f64> {
        let mean =
            |segments: &[usize]| segments.iter().map(|e| point.axial_forces[*e]).sum::<f64>() / segments.len() as f64;
        self.parts.families.iter().map(|f| mean(&f.segments)).collect()
    }

    fn misses_of_means(&self, point: &Point) -> Vec<f64> {
        let wanted = self.parts.families.iter().map(|f| f.wanted());
        let means = self.means(point);
        let pairs = means.iter().zip(wanted);
        // The logarithm keeps its sign and digits down to nothing, and stays finite there.
        pairs
            .filter_map(|(mean, wanted)| Some((mean / wanted?).max(1e-30).ln()))
            .collect()
    }

    /// Weighted deviations: of the families with a wanted tension, then of the targets.
    pub(super) fn misses(&self, point: &Point) -> DVector<f64> {
        let mut misses = self.misses_of_means(point);
        misses.extend(self.rows.list.iter().map(|row| self.rows.deviation(point, row)));
        if let Some(row) = self.dropped {
            misses[row] = 0.0;
        }
        DVector::from_vec(misses)
    }

    /// Whether everything wanted is met.
    fn all_met(&self, misses: &DVector<f64>) -> bool {
        let n_means = misses.len() - self.rows.list.len();
        let rows = misses.iter().skip(n_means).zip(&self.rows.list);
        misses.iter().take(n_means).all(|c| c.abs() <= MET)
            && rows.clone().all(|(c, row)| c.abs() <= MET_TARGET * row.weight)
    }

    fn check_measured(&self, misses: &DVector<f64>) -> Result<(), ShapeError> {
        let n_means = misses.len() - self.rows.list.len();
        match misses
            .iter()
            .skip(n_means)
            .zip(&self.rows.list)
            .find(|(c, _)| !c.is_finite())
        {
            Some((_, row)) => Err(ShapeError::NotMeasurable {
                target: self.rows.names[row.target].clone(),
            }),
            None => Ok(()),
        }
    }
}

/// What steps from a point need.
enum StepAt {
    /// `J` with the columns of unknowns that stay set to zero.
    Dense { jacobian: DMatrix<f64> },
    /// Derivatives for its products, and which unknowns may move.
    Products {
        slopes: Vec<super::rows::Slope>,
        free: Vec<bool>,
    },
}

fn fix(jacobian: &mut DMatrix<f64>, free: &[bool]) {
    for (mut column, _) in jacobian.column_iter_mut().zip(free).filter(|(_, free)| !**free) {
        column.fill(0.0);
    }
}

fn damped_step(jacobian: &DMatrix<f64>, misses: &DVector<f64>, damping: f64) -> DVector<f64> {
    let (m, n) = jacobian.shape();
    // Stacked rows instead of Jᵀ J keep the digits of nearly dependent tensions.
    let mut stacked = DMatrix::zeros(m + n, n);
    stacked.rows_mut(0, m).copy_from(jacobian);
    let mut right = DVector::zeros(m + n);
    right.rows_mut(0, m).copy_from(&-misses);
    for k in 0..n {
        stacked[(m + k, k)] = damping.sqrt().max(1e-14);
    }
    let qr = stacked.qr();
    let reduced = qr.q().transpose() * right;
    qr.r()
        .solve_upper_triangular(&reduced)
        .unwrap_or_else(|| DVector::zeros(n))
}

fn rank(jacobian: &DMatrix<f64>) -> usize {
    let values = jacobian.clone().singular_values();
    values.iter().filter(|v| **v > RANK * values.max()).count()
}
