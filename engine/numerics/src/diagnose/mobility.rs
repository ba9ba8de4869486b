//! What can move without stretching any member, and what can be tight without any load.
//!
//! ```text
//! B d = e        elongations e of b members by a movement d of n free directions;   Bᵀ t = p their balance
//! r = rank B     s = b − r states of self-stress, Bᵀ t = 0;   m = n − r mechanisms, B d = 0
//! dᵀ K_G d > 0   prestress stiffens the mechanism d,   K_G = Σ (N / l)(I − n nᵀ)
//! ```
//! Calladine 1978; Pellegrino & Calladine 1986. Prestress stiffens all mechanisms only if it stiffens each of their combinations, so that
//! the question is put to the eigenvalues of `K_G` on the space of mechanisms.
//!
//! A rope that slides over nodes is one member over all of its segments, friction left out. A hanging rope counts as
//! straight between its nodes. Each direction in which an elastic support resists counts as a member, too.

use nalgebra::{DMatrix, DVector, Vector3};

use super::echelon::localise;
use crate::assembly::{Loading, Structure};
use crate::equilibrium::{Analysis, eigen, linear, stability};
use crate::model::{AxialLaw, Net, NodeId, SegmentId};

/// Rows or columns of the equilibrium matrix up to which its singular values are found in full.
pub const DENSE_UP_TO: usize = 400;
/// Singular values below this share of the largest are zero: positions are given to no more digits than that.
const ZERO_DENSE: f64 = 1e-8;
/// The same where only the squares are at hand, whose rounding hides more.
const ZERO_SPARSE: f64 = 1e-6;
/// Stiffness from prestress below this share of the largest force density is none.
const STIFFENS_DENSE: f64 = 1e-9;
/// The same on the sparse way, where mechanisms are told from stretching by a penalty of [`PENALTY`].
const STIFFENS_SPARSE: f64 = 1e-6;
/// Stretching stiffness over the largest force density.
const PENALTY: f64 = 1e9;
/// Mechanisms and states of self-stress that the sparse way lists.
const LISTED_SPARSE: usize = 8;
/// Forces below this share of the largest are left out of a list.
const NO_FORCE: f64 = 1e-6;

/// How it was found.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum MobilityWay {
    /// All singular values and vectors of the equilibrium matrix.
    Dense,
    /// Signs of pivots for the numbers, and the least eigenpairs of sparse matrices for what is listed.
    Sparse,
}

/// A mechanism: a movement that stretches no member to first order.
#[derive(Clone, Debug, PartialEq)]
pub struct Mechanism {
    /// Nodes that move, most first, with their movement over the largest one (–).
    pub movements: Vec<(NodeId, Vector3<f64>)>,
    /// `dᵀ K_G d / dᵀ d` (N/m): what prestress brings against it.
    pub stiffness: f64,
    /// Whether that counts as more than nothing.
    pub stiffened: bool,
}

/// A state of self-stress: forces that balance each other without load.
#[derive(Clone, Debug, PartialEq)]
pub struct SelfStress {
    /// Segments with a force, largest first, with it over the largest one (–), tension positive.
    pub forces: Vec<(SegmentId, f64)>,
    /// Whether elastic supports bear a part of it.
    pub with_supports: bool,
}

/// What the geometry of a state allows.
#[derive(Clone, Debug, PartialEq)]
pub struct Mobility {
    /// How it was found.
    pub way: MobilityWay,
    /// Members `b`: reaches and struts, and directions of elastic supports.
    pub members: usize,
    /// Free directions `n`.
    pub directions: usize,
    /// Rank `r` of the equilibrium matrix.
    pub rank: usize,
    /// States of self-stress `s`.
    pub n_self_stresses: usize,
    /// Mechanisms `m`.
    pub n_mechanisms: usize,
    /// Independent mechanisms that prestress does not stiffen.
    pub n_not_stiffened: usize,
    /// Singular values below this share of the largest counted as zero (–).
    pub zero_below: f64,
    /// The least singular value that counted, over the largest (–); the dense way only.
    pub least_kept: Option<f64>,
    /// Mechanisms, those that prestress does not stiffen first, then by rising stiffness. The dense way lists all of
    /// them, the sparse way the first ones.
    pub mechanisms: Vec<Mechanism>,
    /// States of self-stress. The sparse way lists them only where they are few.
    pub self_stresses: Vec<SelfStress>,
}

/// Which members are looked at.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Members {
    /// All that are there, slack ropes like taut ones.
    All,
    /// Struts and ropes with a force.
    Taut,
}

/// Finds what can move and what can be tight in a state; `None` where its numbers are beyond use.
///
/// `positions`: one a node (m). `axial_forces`: one a segment (N), of the same state.
#[must_use]
pub fn mobility(
    analysis: &Analysis,
    loading: &Loading,
    positions: &[Vector3<f64>],
    axial_forces: &[f64],
    members: Members,
) -> Option<Mobility> {
    let geometry = Geometry::new(analysis.structure(), loading, positions, axial_forces, members)?;
    if geometry.rows.len().max(geometry.n_directions()) <= DENSE_UP_TO {
        dense(&geometry)
    } else {
        sparse(&geometry, analysis)
    }
}

/// A row of `B`: the elongation of a member by a unit of each free direction.
struct Row {
    entries: Vec<(usize, f64)>,
    /// Segments of the member; none for an elastic support.
    segments: std::ops::Range<usize>,
}

/// The equilibrium matrix with what prestress brings.
struct Geometry<'a> {
    structure: &'a Structure,
    rows: Vec<Row>,
    /// `K_G` by the entries of the pattern (N/m).
    stiffening: Vec<f64>,
    /// Largest `|N| / l` (N/m).
    largest_density: f64,
}

impl<'a> Geometry<'a> {
    fn new(
        structure: &'a Structure,
        loading: &Loading,
        positions: &[Vector3<f64>],
        axial_forces: &[f64],
        members: Members,
    ) -> Option<Self> {
        let net = structure.net();
        let counts = |segment: usize| {
            // Ropes that slide or hang have no bars.
            loading.unstressed_lengths[segment] > 0.0
                && (members == Members::All
                    || net.segments()[segment].law == AxialLaw::TwoWay
                    || axial_forces[segment] > 0.0)
        };
        let mut rows = Vec::new();
        for segments in reaches(net) {
            let counted = segments.clone().filter(|segment| counts(*segment));
            let entries = row_of(structure, positions, counted)?;
            // Without a chord there is no direction in which the member could be stretched.
            if !entries.is_empty() || segments.clone().any(counts) {
                rows.push(Row { entries, segments });
            }
        }
        rows.extend(elastic_rows(structure));

        let mut largest_density: f64 = 0.0;
        let mut blocks = Vec::with_capacity(net.segments().len());
        for (segment, force) in net.segments().iter().zip(axial_forces) {
            let chord = positions[segment.ends[1].index()] - positions[segment.ends[0].index()];
            let length = chord.norm();
            let density = if length > 0.0 { force / length } else { 0.0 };
            largest_density = largest_density.max(density.abs());
            let n = chord.try_normalize(0.0).unwrap_or_else(Vector3::zeros);
            blocks.push(nalgebra::Matrix3::from_diagonal_element(density) - n * n.transpose() * density);
        }
        let mut stiffening = vec![0.0; structure.pattern().n_entries()];
        structure.tangent_into(&blocks, &mut stiffening);
        let finite = stiffening.iter().all(|v| v.is_finite());
        finite.then_some(Self {
            structure,
            rows,
            stiffening,
            largest_density,
        })
    }

    fn n_directions(&self) -> usize {
        self.structure.n_dofs()
    }

    fn mechanism(&self, movement: &[f64], stiffens_above: f64) -> Option<Mechanism> {
        let mut product = vec![0.0; movement.len()];
        self.structure
            .pattern()
            .product_into(&self.stiffening, movement, &mut product);
        let size: f64 = movement.iter().map(|d| d * d).sum();
        let stiffness = movement.iter().zip(&product).map(|(d, p)| d * p).sum::<f64>() / size;
        let movements = stability::moving_nodes(self.structure, movement);
        (!movements.is_empty()).then_some(Mechanism {
            movements,
            stiffness,
            stiffened: stiffness > stiffens_above,
        })
    }

    fn self_stress(&self, forces: &[f64]) -> Option<SelfStress> {
        let members = largest_first(forces.iter().map(|force| force.abs()));
        let largest = forces[*members.first()?];
        // Tension in the largest reads better than compression, where either would do.
        let of_members = members.iter().map(|row| (&self.rows[*row], forces[*row] / largest));
        let in_net = of_members.clone().filter(|(row, _)| !row.segments.is_empty());
        Some(SelfStress {
            forces: in_net
                .flat_map(|(row, force)| row.segments.clone().map(move |s| (SegmentId::new(s), force)))
                .collect(),
            with_supports: of_members.clone().any(|(row, _)| row.segments.is_empty()),
        })
    }
}

/// Segments of every reach, then of every strut.
fn reaches(net: &Net) -> impl Iterator<Item = std::ops::Range<usize>> + '_ {
    let struts = net.struts().iter().map(|strut| strut.segment.index());
    (net.reaches().iter().map(|reach| reach.segments.clone())).chain(struts.map(|segment| segment..segment + 1))
}

/// The elongation of some segments together; `None` if a position is not finite.
fn row_of(
    structure: &Structure,
    positions: &[Vector3<f64>],
    segments: impl Iterator<Item = usize>,
) -> Option<Vec<(usize, f64)>> {
    let mut entries: Vec<(usize, f64)> = Vec::new();
    for index in segments {
        let [i, j] = structure.net().segments()[index].ends;
        let chord = positions[j.index()] - positions[i.index()];
        if !chord.iter().all(|c| c.is_finite()) {
            return None;
        }
        let n = chord.try_normalize(0.0).unwrap_or_else(Vector3::zeros);
        for (node, along) in [(i, -n), (j, n)] {
            let first = structure.dofs().first(node);
            for (offset, free) in structure.dofs().directions(node).iter().enumerate() {
                match entries.iter_mut().find(|(dof, _)| *dof == first + offset) {
                    Some((_, value)) => *value += free.dot(&along),
                    None => entries.push((first + offset, free.dot(&along))),
                }
            }
        }
    }
    Some(entries)
}

/// A row for each direction in which an elastic support resists, weighed by the root of its share of the stiffest one.
fn elastic_rows(structure: &Structure) -> Vec<Row> {
    let mut rows = Vec::new();
    for elastic in structure.net().elastic_supports() {
        let eigen = elastic.stiffness().clone().symmetric_eigen();
        let largest = eigen.eigenvalues.max();
        for (value, vector) in eigen.eigenvalues.iter().zip(eigen.eigenvectors.column_iter()) {
            if *value <= 1e-12 * largest {
                continue;
            }
            let mut entries = Vec::new();
            for (place, node) in elastic.nodes().iter().enumerate() {
                let along: Vector3<f64> = vector.fixed_rows::<3>(3 * place).into_owned();
                let first = structure.dofs().first(*node);
                for (offset, free) in structure.dofs().directions(*node).iter().enumerate() {
                    entries.push((first + offset, free.dot(&along)));
                }
            }
            rows.push(Row {
                entries,
                segments: 0..0,
            });
        }
    }
    rows
}

/// Indices of sizes that are not small beside the largest, largest first, in order where they are equal.
fn largest_first(sizes: impl Iterator<Item = f64>) -> Vec<usize> {
    let sizes: Vec<f64> = sizes.collect();
    let largest = sizes.iter().copied().fold(0.0, f64::max);
    let mut order: Vec<usize> = (0..sizes.len()).filter(|i| sizes[*i] > NO_FORCE * largest).collect();
    // Sizes that differ by rounding only are told in order of their index.
    let step = |i: usize| (sizes[i] / largest * 1e6).round();
    order.sort_by(|a, b| step(*b).total_cmp(&step(*a)).then(a.cmp(b)));
    order
}

fn dense(geometry: &Geometry<'_>) -> Option<Mobility> {
    let (b, n) = (geometry.rows.len(), geometry.n_directions());
    let mut matrix = DMatrix::zeros(b, n);
    for (row, member) in geometry.rows.iter().enumerate() {
        for (column, value) in &member.entries {
            matrix[(row, *column)] = *value;
        }
    }
    let (values, mechanisms) = null_space(&matrix)?;
    let (_, self_stresses) = null_space(&matrix.transpose())?;
    let rank = n - mechanisms.ncols();
    let stiffens_above = STIFFENS_DENSE * geometry.largest_density;

    // The mechanisms that prestress does not stiffen, and the others: each space with nodes as few as may be.
    let mut product = DMatrix::zeros(n, mechanisms.ncols());
    for (d, kd) in mechanisms.column_iter().zip(product.column_iter_mut()) {
        let (mut kd, pattern) = (kd, geometry.structure.pattern());
        pattern.product_into(&geometry.stiffening, d.as_slice(), kd.as_mut_slice());
    }
    let projected = mechanisms.transpose() * product;
    // An empty matrix has no decomposition.
    let (stiffnesses, combinations) = if projected.is_empty() {
        (DVector::zeros(0), projected)
    } else {
        let eigen = (0.5 * (&projected + projected.transpose())).symmetric_eigen();
        (eigen.eigenvalues, eigen.eigenvectors)
    };
    let mut told = Vec::new();
    let mut n_not_stiffened = 0;
    for stiffened in [false, true] {
        let vectors = (stiffnesses.iter().zip(combinations.column_iter()))
            .filter(|(value, _)| (**value > stiffens_above) == stiffened)
            .map(|(_, vector)| (&mechanisms * vector).iter().copied().collect())
            .collect::<Vec<Vec<f64>>>();
        if !stiffened {
            n_not_stiffened = vectors.len();
        }
        let mut group: Vec<Mechanism> = (localise(vectors).iter())
            .filter_map(|d| geometry.mechanism(d, stiffens_above))
            .collect();
        group.iter_mut().for_each(|mechanism| mechanism.stiffened = stiffened);
        group.sort_by(|a, b| {
            let step = |m: &Mechanism| (m.stiffness / stiffens_above.max(f64::MIN_POSITIVE)).round();
            step(a)
                .total_cmp(&step(b))
                .then(a.movements[0].0.cmp(&b.movements[0].0))
        });
        told.extend(group);
    }
    let stressed = self_stresses
        .column_iter()
        .map(|t| t.iter().copied().collect())
        .collect();
    Some(Mobility {
        way: MobilityWay::Dense,
        members: b,
        directions: n,
        rank,
        n_self_stresses: b - rank,
        n_mechanisms: n - rank,
        n_not_stiffened,
        zero_below: ZERO_DENSE,
        least_kept: (rank > 0).then(|| values[rank - 1] / values[0]),
        mechanisms: told,
        self_stresses: (localise(stressed).iter())
            .filter_map(|t| geometry.self_stress(t))
            .collect(),
    })
}

/// Singular values of a matrix, largest first, and an orthonormal basis of what it maps to zero.
fn null_space(matrix: &DMatrix<f64>) -> Option<(Vec<f64>, DMatrix<f64>)> {
    let (rows, columns) = matrix.shape();
    if columns == 0 {
        return Some((Vec::new(), DMatrix::zeros(0, 0)));
    }
    // Rows of zeros change no singular value but one of zero, and bring the whole of V.
    let mut tall = DMatrix::zeros(rows.max(columns), columns);
    tall.rows_mut(0, rows).copy_from(matrix);
    let svd = tall.try_svd(false, true, f64::EPSILON, 10_000)?;
    let across = svd.v_t?;
    let mut order: Vec<usize> = (0..columns).collect();
    order.sort_by(|a, b| svd.singular_values[*b].total_cmp(&svd.singular_values[*a]));
    let values: Vec<f64> = order.iter().map(|i| svd.singular_values[*i]).collect();
    let zero = ZERO_DENSE * values[0];
    let free: Vec<DVector<f64>> = (order.iter().zip(&values))
        .filter(|(_, value)| **value <= zero)
        .map(|(i, _)| across.row(*i).transpose())
        .collect();
    let basis = if free.is_empty() {
        DMatrix::zeros(columns, 0)
    } else {
        DMatrix::from_columns(&free)
    };
    Some((values, basis))
}

fn sparse(geometry: &Geometry<'_>, analysis: &Analysis) -> Option<Mobility> {
    let (b, n) = (geometry.rows.len(), geometry.n_directions());
    let pattern = geometry.structure.pattern();
    let mut factor = analysis.new_factor();
    let mut stretching = vec![0.0; pattern.n_entries()];
    for row in &geometry.rows {
        for (i, u) in &row.entries {
            for (j, v) in &row.entries {
                // A support that couples nodes has directions that couple more of them than all of it does.
                if i >= j
                    && let Some(place) = pattern.position(*i, *j)
                {
                    stretching[place] += u * v;
                }
            }
        }
    }
    let zero = ZERO_SPARSE * ZERO_SPARSE * eigen::largest_on_diagonal(pattern, &stretching);
    let n_mechanisms = eigen::count_below(pattern, &mut factor, &stretching, zero)?;
    let rank = n - n_mechanisms;
    let n_self_stresses = b.checked_sub(rank)?;

    let density = if geometry.largest_density > 0.0 {
        geometry.largest_density
    } else {
        1.0
    };
    let stiffens_above = STIFFENS_SPARSE * density;
    let penalised: Vec<f64> = (stretching.iter().zip(&geometry.stiffening))
        .map(|(stretch, stiffen)| PENALTY * density * stretch + stiffen)
        .collect();
    let n_not_stiffened = eigen::count_below(pattern, &mut factor, &penalised, stiffens_above)?.min(n_mechanisms);
    let listed = n_mechanisms.min(LISTED_SPARSE);
    let pairs = eigen::least(pattern, &mut factor, &penalised, listed);
    let mut vectors: Vec<Vec<f64>> = pairs.into_iter().map(|pair| pair.vector).collect();
    onto_null_space(pattern, &mut factor, &stretching, zero, &mut vectors)?;
    let few = n_not_stiffened.min(vectors.len());
    let stiffened = vectors.split_off(few);
    // All that prestress does not stiffen are here: then they can be told by few nodes each.
    let free = if few == n_not_stiffened {
        localise(vectors)
    } else {
        vectors
    };
    let mechanisms = free
        .iter()
        .chain(&stiffened)
        .filter_map(|d| geometry.mechanism(d, stiffens_above))
        .collect();

    Some(Mobility {
        way: MobilityWay::Sparse,
        members: b,
        directions: n,
        rank,
        n_self_stresses,
        n_mechanisms,
        n_not_stiffened,
        zero_below: ZERO_SPARSE,
        least_kept: None,
        mechanisms,
        self_stresses: if n_self_stresses <= LISTED_SPARSE {
            few_self_stresses(geometry, n_self_stresses)?
        } else {
            Vec::new()
        },
    })
}

/// Takes out of each vector what the matrix does not map to zero.
fn onto_null_space(
    pattern: &crate::assembly::Pattern,
    factor: &mut linear::Factor,
    values: &[f64],
    zero: f64,
    vectors: &mut [Vec<f64>],
) -> Option<()> {
    if vectors.is_empty() {
        return Some(());
    }
    let mut shifted = values.to_vec();
    for row in 0..pattern.size() {
        shifted[pattern.column_starts()[row]] += zero;
    }
    factor.cholesky(&shifted).ok()?;
    for vector in vectors {
        // A part along an eigenvalue λ is left with its share zero / (zero + λ) each time.
        for _ in 0..3 {
            factor.solve_in_place(vector);
            let norm = vector.iter().map(|v| v * v).sum::<f64>().sqrt();
            vector.iter_mut().for_each(|v| *v /= norm);
        }
    }
    Some(())
}

/// All states of self-stress, where they are few: the null space of `B Bᵀ`.
fn few_self_stresses(geometry: &Geometry<'_>, count: usize) -> Option<Vec<SelfStress>> {
    if count == 0 {
        return Some(Vec::new());
    }
    let (b, n) = (geometry.rows.len(), geometry.n_directions());
    let mut matrix = nalgebra_sparse::CooMatrix::new(b, n);
    for (row, member) in geometry.rows.iter().enumerate() {
        member
            .entries
            .iter()
            .for_each(|(column, value)| matrix.push(row, *column, *value));
    }
    let matrix = nalgebra_sparse::CsrMatrix::from(&matrix);
    let square = &matrix * matrix.transpose();
    let pattern = crate::assembly::Pattern::new(&vec![1; b], &square);
    let mut values = vec![0.0; pattern.n_entries()];
    for (row, column, value) in square.triplet_iter() {
        if row >= column {
            values[pattern.position(row, column)?] = *value;
        }
    }
    let mut factor = linear::Factor::new(std::sync::Arc::new(linear::Symbolic::new(&pattern)));
    let zero = ZERO_SPARSE * ZERO_SPARSE * eigen::largest_on_diagonal(&pattern, &values);
    let pairs = eigen::least(&pattern, &mut factor, &values, count);
    let mut vectors: Vec<Vec<f64>> = pairs.into_iter().map(|pair| pair.vector).collect();
    onto_null_space(&pattern, &mut factor, &values, zero, &mut vectors)?;
    Some(
        (localise(vectors).iter())
            .filter_map(|t| geometry.self_stress(t))
            .collect(),
    )
}
