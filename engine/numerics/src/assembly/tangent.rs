//! The tangent: every segment's block written straight to its place.

use nalgebra::{Matrix3, Vector3};

use super::Structure;
use super::structure::Shape;
use crate::model::NodeId;

impl Structure {
    /// Sum of `Cᵀ B C` over the segments, in the free directions; allocates nothing.
    ///
    /// `blocks`: one symmetric block a segment (N/m): derivative of the force on its second end by its chord.
    /// `values`: one place for each entry of [`Structure::pattern`]; what was there is overwritten.
    pub fn tangent_into(&self, blocks: &[Matrix3<f64>], values: &mut [f64]) {
        values.fill(0.0);
        let starts = self.pattern().column_starts();
        for (block, coupling) in blocks.iter().zip(&self.couplings) {
            let nodes = [coupling.column_node, coupling.row_node].map(|n| NodeId::new(n as usize));
            match coupling.shape {
                Shape::BothFree => {
                    let b = block.as_slice();
                    for node in nodes {
                        // The diagonal block is the head of its columns: rows c..3 in column c.
                        let first = self.dofs().first(node);
                        let p = [starts[first], starts[first + 1], starts[first + 2]];
                        values[p[0]] += b[0];
                        values[p[0] + 1] += b[1];
                        values[p[0] + 2] += b[2];
                        values[p[1]] += b[4];
                        values[p[1] + 1] += b[5];
                        values[p[2]] += b[8];
                    }
                    for (column, position) in coupling.positions.iter().enumerate() {
                        for row in 0..3 {
                            values[position + row] -= b[3 * column + row];
                        }
                    }
                }
                Shape::Mixed => {
                    let [columns, rows] = nodes.map(|node| self.dofs().directions(node));
                    for (node, free) in nodes.into_iter().zip([columns, rows]) {
                        let first = self.dofs().first(node);
                        for (c, along_c) in free.iter().enumerate() {
                            let along = block * along_c;
                            for (r, along_r) in free.iter().enumerate().skip(c) {
                                values[starts[first + c] + r - c] += along_r.dot(&along);
                            }
                        }
                    }
                    for (along_c, position) in columns.iter().zip(coupling.positions) {
                        let along: Vector3<f64> = block * along_c;
                        for (r, along_r) in rows.iter().enumerate() {
                            values[position + r] -= along_r.dot(&along);
                        }
                    }
                }
            }
        }
    }

    /// Adds the stiffness of all elastic supports.
    pub fn add_elastic_supports(&self, values: &mut [f64]) {
        for (position, value) in &self.elastic {
            values[*position] += value;
        }
    }
}
