//! The curve of a hanging rope by quadrature: another way than the closed form of the element.
//!
//! ```text
//! v(s) = v0 − w s,    dx/ds = (θ + |v| / EA θ) v / |v|,    s from 0 to L0
//! ```

/// A rope between two points.
pub(super) struct Rope {
    /// `EA` (N).
    pub(super) axial_stiffness: f64,
    /// `L0` (m).
    pub(super) unstressed: f64,
    /// `1 + α ΔT` (–).
    pub(super) expanded: f64,
    /// Load per unstressed length (N/m).
    pub(super) load: [f64; 3],
}

/// Nodes and weights of the Gauss–Legendre rule with ten points on (−1, 1), positive half.
const GAUSS: [(f64, f64); 5] = [
    (0.148_874_338_981_631_22, 0.295_524_224_714_752_87),
    (0.433_395_394_129_247_2, 0.269_266_719_309_996_36),
    (0.679_409_568_299_024_4, 0.219_086_362_515_982_04),
    (0.865_063_366_688_984_5, 0.149_451_349_150_580_6),
    (0.973_906_528_517_171_7, 0.066_671_344_308_688_14),
];
/// Pieces on either side of the point of least force, each half as long as the one farther out.
const PIECES: i32 = 40;

/// Where the rope ends, from its first end, if it pulls there with `start` (N).
pub(super) fn end_of(rope: &Rope, start: [f64; 3]) -> [f64; 3] {
    let square = |a: [f64; 3]| a[0] * a[0] + a[1] * a[1] + a[2] * a[2];
    let weight = square(rope.load);
    let along = start[0] * rope.load[0] + start[1] * rope.load[1] + start[2] * rope.load[2];
    // The direction turns fastest where the force is least.
    let least = if weight > 0.0 {
        (along / weight).clamp(0.0, rope.unstressed)
    } else {
        0.0
    };
    let mut end = [0.0; 3];
    for side in [-least, rope.unstressed - least] {
        let mut outer = side;
        for piece in 0..PIECES {
            let inner = if piece + 1 == PIECES { 0.0 } else { 0.5 * outer };
            let (middle, half) = (least + 0.5 * (outer + inner), 0.5 * (outer - inner));
            for (node, share) in GAUSS {
                for s in [middle - half * node, middle + half * node] {
                    let force = [0, 1, 2].map(|axis| start[axis] - rope.load[axis] * s);
                    let size = square(force).sqrt();
                    if size > 0.0 {
                        // The stress-free length and the stretch of it: EA acts on the length as it is warm.
                        let step = rope.expanded * (1.0 + size / rope.axial_stiffness) / size;
                        for axis in 0..3 {
                            end[axis] += share * half.abs() * step * force[axis];
                        }
                    }
                }
            }
            outer = inner;
        }
    }
    end
}
