//! Sparse symmetric systems: order and analyse once, factorise and solve often.
//!
//! The only file that knows the library behind it. What was learnt about it: the supernodal form has to be forced, its
//! own choice is three times slower on small nets; threads inside a factorisation make it slower; a custom order has to
//! be postordered.

use std::fmt;
use std::sync::Arc;

use faer::dyn_stack::{MemBuffer, MemStack, StackReq};
use faer::linalg::cholesky::ldlt::factor::{LdltError, LdltRegularization};
use faer::linalg::cholesky::llt::factor::{LltError, LltRegularization};
use faer::sparse::linalg::SymbolicSupernodalParams;
use faer::sparse::linalg::amd;
use faer::sparse::linalg::cholesky::{simplicial, supernodal};
use faer::sparse::{SparseColMatRef, SymbolicSparseColMatRef};
use faer::{Conj, MatMut, Par, Spec};
use thiserror::Error;

use crate::assembly::Pattern;

/// Why a matrix could not be factorised.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Error)]
pub enum FactorError {
    /// A pivot is not positive (Cholesky) or vanishes (LDLᵀ).
    #[error("the pivot of free direction {dof} is not usable")]
    Pivot {
        /// The free direction.
        dof: usize,
    },
    /// An entry of the matrix is not finite.
    #[error("an entry of the matrix is not finite")]
    NotFinite,
}

/// Signs of the pivots: by Sylvester's law of inertia those of the eigenvalues.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Inertia {
    /// Negative pivots.
    pub negative: usize,
    /// Smallest pivot by size.
    pub smallest: f64,
    /// Largest pivot, or product `l² d` that elimination took from one, by size: far above the entries of the matrix, signs
    /// of pivots are not certain.
    pub largest: f64,
}

/// Elimination order and structure of the factor of one pattern; shared between threads.
pub struct Symbolic {
    size: usize,
    order: Vec<usize>,
    column_starts: Vec<usize>,
    rows: Vec<usize>,
    sources: Vec<usize>,
    factor: supernodal::SymbolicSupernodalCholesky<usize>,
}

impl fmt::Debug for Symbolic {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct("Symbolic")
            .field("size", &self.size)
            .field("entries", &self.rows.len())
            .field("factor_entries", &self.factor.len_val())
            .finish_non_exhaustive()
    }
}

impl Symbolic {
    /// Orders the blocks of a pattern by approximate minimum degree and analyses the factor.
    ///
    /// # Panics
    /// If memory runs out.
    #[must_use]
    pub fn new(pattern: &Pattern) -> Self {
        let order = elimination_order(pattern);
        let size = order.len();
        let mut place = vec![0; size];
        for (new, &old) in order.iter().enumerate() {
            place[old] = new;
        }
        let mut entries = Vec::with_capacity(pattern.n_entries());
        for column in 0..size {
            for source in pattern.column_starts()[column]..pattern.column_starts()[column + 1] {
                let (a, b) = (place[pattern.rows()[source]], place[column]);
                entries.push((a.min(b), a.max(b), source));
            }
        }
        entries.sort_unstable();
        let column_starts = starts(size, entries.iter().map(|e| e.0));
        let rows: Vec<usize> = entries.iter().map(|e| e.1).collect();
        let sources = entries.iter().map(|e| e.2).collect();
        let factor = analyse(size, &column_starts, &rows);
        Self {
            size,
            order,
            column_starts,
            rows,
            sources,
            factor,
        }
    }

    /// Rows and columns of the matrix.
    #[must_use]
    pub fn size(&self) -> usize {
        self.size
    }

    /// Stored entries of the factor.
    #[must_use]
    pub fn n_factor_entries(&self) -> usize {
        self.factor.len_val()
    }

    fn matrix<'a>(&'a self, values: &'a [f64]) -> SparseColMatRef<'a, usize, f64> {
        let symbolic =
            SymbolicSparseColMatRef::new_checked(self.size, self.size, &self.column_starts, None, &self.rows);
        SparseColMatRef::new(symbolic, values)
    }
}

fn starts(size: usize, sorted: impl Iterator<Item = usize>) -> Vec<usize> {
    let mut starts = vec![0; size + 1];
    for column in sorted {
        starts[column + 1] += 1;
    }
    for column in 0..size {
        starts[column + 1] += starts[column];
    }
    starts
}

fn analyse(size: usize, column_starts: &[usize], rows: &[usize]) -> supernodal::SymbolicSupernodalCholesky<usize> {
    // The analysis reads the upper triangle, the factorisation the lower one.
    let mut upper: Vec<(usize, usize)> = Vec::with_capacity(rows.len());
    for column in 0..size {
        upper.extend(
            rows[column_starts[column]..column_starts[column + 1]]
                .iter()
                .map(|&row| (row, column)),
        );
    }
    upper.sort_unstable();
    let upper_starts = starts(size, upper.iter().map(|e| e.0));
    let upper_rows: Vec<usize> = upper.iter().map(|e| e.1).collect();
    let upper = SymbolicSparseColMatRef::new_checked(size, size, &upper_starts, None, &upper_rows);
    let mut memory = MemBuffer::new(StackReq::any_of(&[
        simplicial::prefactorize_symbolic_cholesky_scratch::<usize>(size, rows.len()),
        supernodal::factorize_supernodal_symbolic_cholesky_scratch::<usize>(size),
    ]));
    let stack = MemStack::new(&mut memory);
    let (mut tree, mut counts) = (vec![0_isize; size], vec![0_usize; size]);
    let tree = simplicial::prefactorize_symbolic_cholesky(&mut tree, &mut counts, upper, stack);
    supernodal::factorize_supernodal_symbolic_cholesky(upper, tree, &counts, stack, SymbolicSupernodalParams::default())
        .expect("the factor of a net fits memory and index range")
}

/// Rows in elimination order: blocks by minimum degree, postordered along the elimination tree.
fn elimination_order(pattern: &Pattern) -> Vec<usize> {
    let block_starts = pattern.block_starts();
    let blocks: Vec<usize> = (0..pattern.n_blocks())
        .filter(|&b| block_starts[b] < block_starts[b + 1])
        .collect();
    let mut number = vec![usize::MAX; pattern.n_blocks()];
    for (new, &block) in blocks.iter().enumerate() {
        number[block] = new;
    }
    let (mut graph_starts, mut graph_rows) = (vec![0], Vec::new());
    for &block in &blocks {
        graph_rows.extend(pattern.neighbours(block).iter().map(|&n| number[n]));
        graph_starts.push(graph_rows.len());
    }
    let n = blocks.len();
    let graph = SymbolicSparseColMatRef::new_checked(n, n, &graph_starts, None, &graph_rows);
    let (mut degree_order, mut place) = (vec![0_usize; n], vec![0_usize; n]);
    let mut memory = MemBuffer::new(amd::order_scratch::<usize>(n, graph_rows.len()));
    amd::order(
        &mut degree_order,
        &mut place,
        graph,
        amd::Control::default(),
        MemStack::new(&mut memory),
    )
    .expect("the graph of a net fits memory and index range");
    let mut order = Vec::with_capacity(pattern.size());
    for position in postorder(&degree_order, &place, |block| {
        &graph_rows[graph_starts[block]..graph_starts[block + 1]]
    }) {
        let block = blocks[degree_order[position]];
        order.extend(block_starts[block]..block_starts[block + 1]);
    }
    order
}

/// Postorder of the elimination tree of a graph whose vertices are eliminated in `order` (Liu 1990).
fn postorder<'a>(order: &[usize], place: &[usize], neighbours: impl Fn(usize) -> &'a [usize]) -> Vec<usize> {
    const NONE: usize = usize::MAX;
    let n = order.len();
    let (mut parent, mut ancestor) = (vec![NONE; n], vec![NONE; n]);
    for (k, &vertex) in order.iter().enumerate() {
        for &other in neighbours(vertex) {
            let mut i = place[other];
            // Path compression keeps the climb short.
            while i < k {
                let next = ancestor[i];
                ancestor[i] = k;
                if next == NONE {
                    parent[i] = k;
                    break;
                }
                i = next;
            }
        }
    }
    let (mut first_child, mut next_sibling) = (vec![NONE; n], vec![NONE; n]);
    let mut roots = Vec::new();
    for k in (0..n).rev() {
        match parent[k] {
            NONE => roots.push(k),
            p => {
                next_sibling[k] = first_child[p];
                first_child[p] = k;
            }
        }
    }
    let mut post = Vec::with_capacity(n);
    let mut stack = roots;
    while let Some(&top) = stack.last() {
        match first_child[top] {
            NONE => {
                post.push(top);
                stack.pop();
            }
            child => {
                first_child[top] = next_sibling[child];
                stack.push(child);
            }
        }
    }
    post
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Held {
    Nothing,
    Cholesky,
    Ldlt,
}

/// Numbers of one factorisation, with the room to make the next; one for each worker.
pub struct Factor {
    symbolic: Arc<Symbolic>,
    matrix: Vec<f64>,
    values: Vec<f64>,
    right_hand_sides: Vec<f64>,
    memory: MemBuffer,
    held: Held,
}

impl fmt::Debug for Factor {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct("Factor")
            .field("symbolic", &self.symbolic)
            .field("held", &self.held)
            .finish_non_exhaustive()
    }
}

impl Factor {
    /// Room for factorisations of one pattern.
    #[must_use]
    pub fn new(symbolic: Arc<Symbolic>) -> Self {
        let structure = &symbolic.factor;
        let request = StackReq::any_of(&[
            supernodal::factorize_supernodal_numeric_llt_scratch::<usize, f64>(structure, Par::Seq, Spec::default()),
            supernodal::factorize_supernodal_numeric_ldlt_scratch::<usize, f64>(structure, Par::Seq, Spec::default()),
            structure.solve_in_place_scratch::<f64>(1, Par::Seq),
        ]);
        Self {
            matrix: vec![0.0; symbolic.rows.len()],
            values: vec![0.0; structure.len_val()],
            right_hand_sides: Vec::new(),
            memory: MemBuffer::new(request),
            held: Held::Nothing,
            symbolic,
        }
    }

    /// Factorises a positive definite matrix.
    ///
    /// `values`: lower triangle by the entries of the pattern.
    ///
    /// # Errors
    /// [`FactorError::Pivot`] if the matrix is not positive definite.
    pub fn cholesky(&mut self, values: &[f64]) -> Result<(), FactorError> {
        self.take(values)?;
        let outcome = supernodal::factorize_supernodal_numeric_llt(
            &mut self.values,
            self.symbolic.matrix(&self.matrix),
            LltRegularization::default(),
            &self.symbolic.factor,
            Par::Seq,
            MemStack::new(&mut self.memory),
            Spec::default(),
        );
        match outcome {
            Ok(_) => {
                self.held = Held::Cholesky;
                Ok(())
            }
            Err(LltError::NonPositivePivot { index }) => Err(self.pivot(index)),
        }
    }

    /// Factorises a matrix that need not be definite and counts its negative pivots.
    ///
    /// There is no pivoting: look at [`Inertia::smallest`] before trusting a solution.
    ///
    /// # Errors
    /// [`FactorError::Pivot`] if a pivot vanishes.
    pub fn ldlt(&mut self, values: &[f64]) -> Result<Inertia, FactorError> {
        self.take(values)?;
        let outcome = supernodal::factorize_supernodal_numeric_ldlt(
            &mut self.values,
            self.symbolic.matrix(&self.matrix),
            LdltRegularization::default(),
            &self.symbolic.factor,
            Par::Seq,
            MemStack::new(&mut self.memory),
            Spec::default(),
        );
        if let Err(LdltError::ZeroPivot { index }) = outcome {
            return Err(self.pivot(index));
        }
        let factor = supernodal::SupernodalLdltRef::new(&self.symbolic.factor, &self.values);
        let mut inertia = Inertia {
            negative: 0,
            smallest: f64::INFINITY,
            largest: 0.0,
        };
        for s in 0..self.symbolic.factor.n_supernodes() {
            let block = factor.supernode(s).val();
            for j in 0..block.ncols() {
                let pivot = block[(j, j)];
                if !pivot.is_finite() {
                    return Err(FactorError::NotFinite);
                }
                inertia.negative += usize::from(pivot < 0.0);
                if pivot.abs() < inertia.smallest.abs() {
                    inertia.smallest = pivot;
                }
                let below = (j + 1..block.nrows())
                    .map(|i| block[(i, j)].powi(2))
                    .fold(1.0, f64::max);
                inertia.largest = inertia.largest.max(below * pivot.abs());
            }
        }
        self.held = Held::Ldlt;
        Ok(inertia)
    }

    /// Solves for `n` right-hand sides, one after the other in `right_hand_sides`, and leaves the solutions there.
    ///
    /// # Panics
    /// If nothing is factorised or the sizes do not fit.
    pub fn solve_in_place(&mut self, right_hand_sides: &mut [f64]) {
        assert_ne!(self.held, Held::Nothing, "factorise before solving");
        let size = self.symbolic.size;
        if size == 0 {
            return;
        }
        assert_eq!(right_hand_sides.len() % size, 0, "whole right-hand sides");
        let n = right_hand_sides.len() / size;
        let needed = self.symbolic.factor.solve_in_place_scratch::<f64>(n, Par::Seq);
        if needed.unaligned_bytes_required() > self.memory.len() {
            self.memory = MemBuffer::new(needed);
        }
        self.right_hand_sides.resize(right_hand_sides.len(), 0.0);
        for (given, permuted) in right_hand_sides
            .chunks_exact(size)
            .zip(self.right_hand_sides.chunks_exact_mut(size))
        {
            for (value, &source) in permuted.iter_mut().zip(&self.symbolic.order) {
                *value = given[source];
            }
        }
        let unknowns = MatMut::from_column_major_slice_mut(&mut self.right_hand_sides, size, n);
        let stack = MemStack::new(&mut self.memory);
        let structure = &self.symbolic.factor;
        match self.held {
            Held::Cholesky => supernodal::SupernodalLltRef::new(structure, &self.values).solve_in_place_with_conj(
                Conj::No,
                unknowns,
                Par::Seq,
                stack,
            ),
            _ => supernodal::SupernodalLdltRef::new(structure, &self.values).solve_in_place_with_conj(
                Conj::No,
                unknowns,
                Par::Seq,
                stack,
            ),
        }
        for (solution, permuted) in right_hand_sides
            .chunks_exact_mut(size)
            .zip(self.right_hand_sides.chunks_exact(size))
        {
            for (value, &target) in permuted.iter().zip(&self.symbolic.order) {
                solution[target] = *value;
            }
        }
    }

    fn take(&mut self, values: &[f64]) -> Result<(), FactorError> {
        self.held = Held::Nothing;
        let mut finite = true;
        for (entry, &source) in self.matrix.iter_mut().zip(&self.symbolic.sources) {
            *entry = values[source];
            finite &= entry.is_finite();
        }
        if finite { Ok(()) } else { Err(FactorError::NotFinite) }
    }

    fn pivot(&self, index: usize) -> FactorError {
        FactorError::Pivot {
            dof: self.symbolic.order[index],
        }
    }
}

#[cfg(test)]
mod tests;
