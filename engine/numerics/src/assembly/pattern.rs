//! Where a symmetric matrix over the free directions has entries.

use nalgebra_sparse::CsrMatrix;

/// Lower triangle, diagonal included, of a symmetric matrix made of dense blocks, in compressed columns with sorted rows.
///
/// A block belongs to a node: its one to three free directions are coupled alike, so that the elimination order is
/// sought on the small graph of blocks.
#[derive(Clone, Debug)]
pub struct Pattern {
    block_starts: Vec<usize>,
    neighbour_starts: Vec<usize>,
    neighbours: Vec<usize>,
    column_starts: Vec<usize>,
    rows: Vec<usize>,
}

impl Pattern {
    /// Pattern of dense blocks of the given sizes, coupled where `graph` has an entry off its diagonal.
    ///
    /// `graph`: symmetric, one row and column a block; its values do not matter.
    ///
    /// # Panics
    /// If `graph` has not one row a block.
    #[must_use]
    pub fn new(block_sizes: &[usize], graph: &CsrMatrix<f64>) -> Self {
        assert_eq!(graph.nrows(), block_sizes.len(), "one row of the graph for each block");
        let mut block_starts = vec![0];
        for size in block_sizes {
            block_starts.push(block_starts.last().expect("never empty") + size);
        }
        let (mut neighbour_starts, mut neighbours) = (vec![0], Vec::new());
        for (block, row) in graph.row_iter().enumerate() {
            let empty = |b: usize| block_sizes[b] == 0;
            let kept = row.col_indices().iter().copied().filter(|&n| n != block && !empty(n));
            neighbours.extend(kept.filter(|_| !empty(block)));
            neighbour_starts.push(neighbours.len());
        }
        let (mut column_starts, mut rows) = (vec![0], Vec::new());
        for block in 0..block_sizes.len() {
            let (start, end) = (block_starts[block], block_starts[block + 1]);
            for column in start..end {
                rows.extend(column..end);
                for &other in &neighbours[neighbour_starts[block]..neighbour_starts[block + 1]] {
                    if other > block {
                        rows.extend(block_starts[other]..block_starts[other + 1]);
                    }
                }
                column_starts.push(rows.len());
            }
        }
        Self {
            block_starts,
            neighbour_starts,
            neighbours,
            column_starts,
            rows,
        }
    }

    /// Rows and columns of the matrix.
    #[must_use]
    pub fn size(&self) -> usize {
        self.column_starts.len() - 1
    }

    /// Number of stored entries.
    #[must_use]
    pub fn n_entries(&self) -> usize {
        self.rows.len()
    }

    /// Number of blocks, empty ones too.
    #[must_use]
    pub fn n_blocks(&self) -> usize {
        self.block_starts.len() - 1
    }

    /// First row of every block, then the size of the matrix.
    #[must_use]
    pub fn block_starts(&self) -> &[usize] {
        &self.block_starts
    }

    /// Blocks coupled to a block, in rising order, without itself and without empty ones.
    #[must_use]
    pub fn neighbours(&self, block: usize) -> &[usize] {
        &self.neighbours[self.neighbour_starts[block]..self.neighbour_starts[block + 1]]
    }

    /// Where each column starts among the entries, then the number of entries.
    #[must_use]
    pub fn column_starts(&self) -> &[usize] {
        &self.column_starts
    }

    /// Row of every entry.
    #[must_use]
    pub fn rows(&self) -> &[usize] {
        &self.rows
    }

    /// Position of an entry of the lower triangle among the entries.
    #[must_use]
    pub fn position(&self, row: usize, column: usize) -> Option<usize> {
        let range = self.column_starts[column]..self.column_starts[column + 1];
        let offset = self.rows[range.clone()].binary_search(&row).ok()?;
        Some(range.start + offset)
    }

    /// The whole symmetric matrix, both triangles.
    #[cfg(test)]
    pub(crate) fn full_matrix(&self, values: &[f64]) -> nalgebra_sparse::CscMatrix<f64> {
        let mut entries = nalgebra_sparse::CooMatrix::new(self.size(), self.size());
        for column in 0..self.size() {
            let range = self.column_starts[column]..self.column_starts[column + 1];
            for (&row, &value) in self.rows[range.clone()].iter().zip(&values[range]) {
                entries.push(row, column, value);
                if row != column {
                    entries.push(column, row, value);
                }
            }
        }
        nalgebra_sparse::CscMatrix::from(&entries)
    }

    /// Product of the symmetric matrix with a vector.
    pub fn product_into(&self, values: &[f64], vector: &[f64], product: &mut [f64]) {
        product.fill(0.0);
        for column in 0..self.size() {
            let mut sum = 0.0;
            let range = self.column_starts[column]..self.column_starts[column + 1];
            for (&row, &value) in self.rows[range.clone()].iter().zip(&values[range]) {
                sum += value * vector[row];
                if row != column {
                    product[row] += value * vector[column];
                }
            }
            product[column] += sum;
        }
    }
}
