//! Targets as equations: what each comes to at a shape, and how that answers to movements and force densities.
//!
//! ```text
//! tension, length, radius      c = ln (found / wanted)
//! equal lengths                c = ln (l_next / l)              of each two of the segments, one after the other
//! coordinate, surface          c = (found − wanted) / s         s = a hundredth of the extent of the net
//! sag                          c = (found − wanted) / max(|wanted|, s)
//! ```
//!
//! Every deviation is so a share of what is wanted, and a weight multiplies it.

use nalgebra::Vector3;

use super::given::{SagMeasure, ShapeTarget, Wish};
use super::parts::{Part, Parts};
use super::search::Point;
use super::sensitivity::less_rope;
use super::surface::Surface;
use super::{Prestress, ShapeError};
use crate::model::{Net, NodeId, SegmentId};

/// Deviation of a target, as a share, at which it is met.
pub(super) const MET_TARGET: f64 = 1e-9;

/// One equation.
#[derive(Clone, Debug)]
pub(super) struct Row {
    /// Index of its target.
    pub(super) target: usize,
    pub(super) weight: f64,
    pub(super) measure: Measure,
}

/// What is measured, and what it is to be.
#[derive(Clone, Debug)]
pub(super) enum Measure {
    Tension {
        segments: Vec<usize>,
        wanted: f64,
    },
    Length {
        segments: Vec<usize>,
        wanted: f64,
    },
    UnstressedLength {
        segments: Vec<usize>,
        wanted: f64,
    },
    Coordinate {
        node: usize,
        axis: usize,
        wanted: f64,
    },
    Sag {
        node: usize,
        chord: [usize; 2],
        wanted: f64,
        measure: SagMeasure,
    },
    Equal {
        segments: [usize; 2],
    },
    Radius {
        nodes: [usize; 3],
        wanted: f64,
    },
    Height {
        node: usize,
        surface: usize,
    },
}

/// Derivatives of a deviation.
#[derive(Clone, Debug, Default)]
pub(super) struct Slope {
    /// By the position of a node (1/m).
    pub(super) moves: Vec<(usize, Vector3<f64>)>,
    /// By the logarithm of the force density of a segment, at the shape as it is.
    pub(super) densities: Vec<(usize, f64)>,
}

/// All targets of a brief.
#[derive(Clone, Debug, Default)]
pub(super) struct Rows {
    pub(super) list: Vec<Row>,
    /// Names of the targets.
    pub(super) names: Vec<String>,
    surfaces: Vec<Surface>,
    /// Deviation of a place that counts as one (m).
    scale: f64,
}

impl Rows {
    /// Writes the targets as equations.
    pub(super) fn new(net: &Net, parts: &Parts, prestress: &Prestress) -> Result<Self, ShapeError> {
        let given = || net.nodes().iter().filter_map(|node| node.position);
        let (least, most) = given().fold((Vector3::repeat(f64::MAX), Vector3::repeat(f64::MIN)), |(a, b), x| {
            (a.inf(&x), b.sup(&x))
        });
        let mut rows = Self {
            names: prestress.targets.iter().map(|target| target.name.clone()).collect(),
            scale: 1e-2 * (most - least).norm().max(f64::MIN_POSITIVE),
            ..Self::default()
        };
        for (index, target) in prestress.targets.iter().enumerate() {
            rows.add(net, parts, index, target)?;
        }
        Ok(rows)
    }

    fn add(&mut self, net: &Net, parts: &Parts, index: usize, target: &ShapeTarget) -> Result<(), ShapeError> {
        let bad = |why: String| ShapeError::BadTarget {
            target: target.name.clone(),
            why,
        };
        if !(target.weight > 0.0 && target.weight.is_finite()) {
            return Err(bad(format!("its weight is {}", target.weight)));
        }
        let plain = |segments: &[SegmentId]| -> Vec<usize> { segments.iter().map(|s| s.index()).collect() };
        let positive = |value: f64, what: &str| {
            if value > 0.0 && value.is_finite() {
                Ok(value)
            } else {
                Err(bad(format!("the wanted {what} is {value}: it has to be positive")))
            }
        };
        let not_balanced = |segments: &[SegmentId]| {
            let balanced = segments.iter().find(|s| parts.of[s.index()] == Part::Balance);
            balanced.map_or(Ok(()), |s| {
                Err(bad(format!(
                    "\"{}\" is left to balance, so that its force can not be wanted as well",
                    net.member_name(*s)
                )))
            })
        };
        let mut push = |measure| {
            self.list.push(Row {
                target: index,
                weight: target.weight,
                measure,
            });
        };
        match &target.wish {
            Wish::Tension { segments, tension } => {
                not_balanced(segments)?;
                let pushes = segments.iter().find(|s| tension * parts.sign(s.index()) <= 0.0);
                if let Some(s) = pushes.filter(|_| *tension != 0.0 && tension.is_finite()) {
                    let way = if *tension > 0.0 { "pulls" } else { "pushes" };
                    return Err(bad(format!(
                        "a force that {way} is wanted of \"{}\", and its rule has the other sign",
                        net.member_name(*s)
                    )));
                }
                positive(tension.abs(), "tension (N)")?;
                push(Measure::Tension {
                    segments: plain(segments),
                    wanted: *tension,
                });
            }
            Wish::Length { segments, length } => push(Measure::Length {
                segments: plain(segments),
                wanted: positive(*length, "length (m)")?,
            }),
            Wish::UnstressedLength { segments, length } => {
                not_balanced(segments)?;
                push(Measure::UnstressedLength {
                    segments: plain(segments),
                    wanted: positive(*length, "unstressed length (m)")?,
                });
            }
            Wish::Coordinate { node, axis, value } => push(Measure::Coordinate {
                node: node.index(),
                axis: *axis,
                wanted: *value,
            }),
            Wish::Sag {
                node,
                chord,
                sag,
                measure,
            } => push(Measure::Sag {
                node: node.index(),
                chord: chord.map(NodeId::index),
                wanted: *sag,
                measure: *measure,
            }),
            Wish::EqualLengths { segments } => {
                for pair in segments.windows(2) {
                    push(Measure::Equal {
                        segments: [pair[0].index(), pair[1].index()],
                    });
                }
            }
            Wish::Radius { nodes, radius } => push(Measure::Radius {
                nodes: nodes.map(NodeId::index),
                wanted: positive(*radius, "radius (m)")?,
            }),
            Wish::Surface { nodes, points } => {
                let surface = Surface::new(points).ok_or_else(|| {
                    bad("its points give no surface over plan: three or more, not on one line, are needed".to_owned())
                })?;
                for node in nodes {
                    push(Measure::Height {
                        node: node.index(),
                        surface: self.surfaces.len(),
                    });
                }
                self.surfaces.push(surface);
            }
        }
        Ok(())
    }

    /// What is found and what is wanted, in the unit of the measure.
    pub(super) fn found_and_wanted(&self, point: &Point, measure: &Measure) -> (f64, f64) {
        let x = |node: usize| point.positions[node];
        match measure {
            Measure::Tension { segments, wanted } => {
                let sum: f64 = segments.iter().map(|e| point.axial_forces[*e]).sum();
                (sum / segments.len() as f64, *wanted)
            }
            Measure::Length { segments, wanted } => (segments.iter().map(|e| point.lengths[*e]).sum(), *wanted),
            Measure::UnstressedLength { segments, wanted } => {
                (segments.iter().map(|e| point.unstressed[*e]).sum(), *wanted)
            }
            Measure::Coordinate { node, axis, wanted } => (x(*node)[*axis], *wanted),
            Measure::Sag {
                node,
                chord: [a, b],
                wanted,
                measure,
            } => (Sag::new([x(*a), x(*b)], x(*node), *measure).value, *wanted),
            Measure::Equal { segments: [a, b] } => (point.lengths[*b], point.lengths[*a]),
            Measure::Radius { nodes, wanted } => (radius(nodes.map(x)).0, *wanted),
            Measure::Height { node, surface } => (x(*node).z, self.surfaces[*surface].height(x(*node).xy()).0),
        }
    }

    /// Deviation as a share, without its weight.
    pub(super) fn share(&self, measure: &Measure, found: f64, wanted: f64) -> f64 {
        match measure {
            Measure::Coordinate { .. } | Measure::Height { .. } => (found - wanted) / self.scale,
            Measure::Sag { .. } => (found - wanted) / wanted.abs().max(self.scale),
            // The logarithm keeps its sign and digits down to nothing, and stays finite there.
            _ => (found / wanted).clamp(1e-30, 1e30).ln(),
        }
    }

    /// Weighted deviation.
    pub(super) fn deviation(&self, point: &Point, row: &Row) -> f64 {
        let (found, wanted) = self.found_and_wanted(point, &row.measure);
        row.weight * self.share(&row.measure, found, wanted)
    }

    /// Derivatives of the weighted deviation.
    pub(super) fn slope(&self, net: &Net, parts: &Parts, point: &Point, row: &Row) -> Slope {
        let mut slope = Slope::default();
        let x = |node: usize| point.positions[node];
        let w = row.weight;
        match &row.measure {
            Measure::Tension { segments, .. } => {
                let sum: f64 = segments.iter().map(|e| point.axial_forces[*e]).sum();
                for &e in segments {
                    let axial = point.axial_forces[e];
                    match parts.of[e] {
                        part if parts.slide(e).is_some() => {
                            slope.tighter(net, parts, point, e, w / sum);
                            if matches!(part, Part::Density(_) | Part::Family(_)) {
                                slope.densities.push((e, w * axial / sum));
                            }
                        }
                        Part::Elastic(bar) if bar.is_taut(point.lengths[e]) => {
                            slope.longer(net, point, e, w * bar.stiffness / sum);
                        }
                        Part::Elastic(_) | Part::Balance => {}
                        Part::Density(_) | Part::Family(_) => {
                            slope.longer(net, point, e, w * axial / (sum * point.lengths[e]));
                            slope.densities.push((e, w * axial / sum));
                        }
                    }
                }
            }
            Measure::Length { segments, .. } => {
                let sum: f64 = segments.iter().map(|e| point.lengths[*e]).sum();
                segments.iter().for_each(|e| slope.longer(net, point, *e, w / sum));
            }
            Measure::UnstressedLength { segments, .. } => {
                let sum: f64 = segments.iter().map(|e| point.unstressed[*e]).sum();
                for &e in segments {
                    let by_density = matches!(parts.of[e], Part::Density(_) | Part::Family(_));
                    if parts.slide(e).is_some() {
                        let share = point.unstressed[e] / point.lengths[e];
                        slope.longer(net, point, e, w * share / sum);
                        slope.tighter(net, parts, point, e, -w * less_rope(net, point, e) / sum);
                        if by_density {
                            slope
                                .densities
                                .push((e, -w * point.unstressed[e] * (1.0 - share) / sum));
                        }
                    } else if by_density {
                        // L0 = l / (1 + q l / EA): dL0/dl = (L0/l)², dL0/d ln q = −L0 (1 − L0/l).
                        let share = point.unstressed[e] / point.lengths[e];
                        slope.longer(net, point, e, w * share * share / sum);
                        slope
                            .densities
                            .push((e, -w * point.unstressed[e] * (1.0 - share) / sum));
                    }
                }
            }
            Measure::Coordinate { node, axis, .. } => {
                slope.moves.push((*node, Vector3::ith(*axis, w / self.scale)));
            }
            Measure::Sag {
                node,
                chord: [a, b],
                wanted,
                measure,
            } => {
                let sag = Sag::new([x(*a), x(*b)], x(*node), *measure);
                let by = w / wanted.abs().max(self.scale);
                slope.moves.push((*node, sag.by_node * by));
                slope.moves.push((*a, sag.by_chord[0] * by));
                slope.moves.push((*b, sag.by_chord[1] * by));
            }
            Measure::Equal { segments: [a, b] } => {
                slope.longer(net, point, *b, w / point.lengths[*b]);
                slope.longer(net, point, *a, -w / point.lengths[*a]);
            }
            Measure::Radius { nodes, .. } => {
                let (_, by) = radius(nodes.map(x));
                slope
                    .moves
                    .extend(nodes.iter().zip(by).map(|(node, by)| (*node, by * w)));
            }
            Measure::Height { node, surface } => {
                let (_, along) = self.surfaces[*surface].height(x(*node).xy());
                let by = Vector3::new(-along.x, -along.y, 1.0) * (w / self.scale);
                slope.moves.push((*node, by));
            }
        }
        slope
    }
}

impl Slope {
    /// Adds a derivative by the tension of the reach of a segment that slides.
    fn tighter(&mut self, net: &Net, parts: &Parts, point: &Point, segment: usize, by: f64) {
        if let Some(slide) = parts.slide(segment) {
            let segments = parts.slides[slide].segments.clone();
            for (e, slope) in segments.zip(&point.slide_slopes[slide]) {
                self.longer(net, point, e, by * slope);
            }
        }
    }

    /// Adds a derivative by the length of a segment.
    pub(super) fn longer(&mut self, net: &Net, point: &Point, segment: usize, by: f64) {
        let [i, j] = net.segments()[segment].ends.map(NodeId::index);
        if point.lengths[segment] > 0.0 {
            let n = point.chords[segment] * (by / point.lengths[segment]);
            self.moves.push((i, -n));
            self.moves.push((j, n));
        }
    }
}

/// A sag and its derivatives.
struct Sag {
    value: f64,
    by_node: Vector3<f64>,
    by_chord: [Vector3<f64>; 2],
}

impl Sag {
    fn new([a, b]: [Vector3<f64>; 2], x: Vector3<f64>, measure: SagMeasure) -> Self {
        let (r, u) = (x - a, b - a);
        match measure {
            SagMeasure::Vertical => {
                // sag = a_z + τ u_z − x_z,  τ = r·u / u·u in plan
                let (r, plan) = (r.xy(), u.xy());
                let square = plan.norm_squared();
                let along = r.dot(&plan) / square;
                let by_r = plan * (u.z / square);
                let by_u = (r - plan * (2.0 * along)) * (u.z / square);
                let vector = |p: nalgebra::Vector2<f64>, z: f64| Vector3::new(p.x, p.y, z);
                Self {
                    value: along * u.z - r_z(&x, &a),
                    by_node: vector(by_r, -1.0),
                    by_chord: [vector(-by_r - by_u, 1.0 - along), vector(by_u, along)],
                }
            }
            SagMeasure::Normal => {
                // y = (I − e eᵀ) r,  e = u/|u|;  d|y| = (y/|y|)·(dx − (1−τ) da − τ db)
                let along = r.dot(&u) / u.norm_squared();
                let y = r - u * along;
                let value = y.norm();
                // On the chord no direction is given: down is as good as any, and off the chord.
                let direction = if value > 0.0 {
                    y / value
                } else {
                    let e = u / u.norm();
                    let down = e * e.z - Vector3::z();
                    down.try_normalize(0.0).unwrap_or(Vector3::x())
                };
                Self {
                    value,
                    by_node: direction,
                    by_chord: [direction * (along - 1.0), direction * -along],
                }
            }
        }
    }
}

fn r_z(x: &Vector3<f64>, a: &Vector3<f64>) -> f64 {
    x.z - a.z
}

/// Radius of the circle through three points, and the derivatives of its logarithm by them.
///
/// ```text
/// R = |b−a| |c−b| |a−c| / (2 |w|),   w = (b−a) × (c−a)
/// ```
///
/// Points on one line have an infinite radius, and derivatives as if they were a little beside it.
fn radius([a, b, c]: [Vector3<f64>; 3]) -> (f64, [Vector3<f64>; 3]) {
    let (p, q) = (b - a, c - a);
    let w = p.cross(&q);
    let sides = [p, c - b, q];
    let product: f64 = sides.iter().map(|s| s.norm()).product();
    let value = product / (2.0 * w.norm());
    // Far below what any coordinate resolves; keeps the quotient finite.
    let square = w.norm_squared().max(1e-24 * product.powf(4.0 / 3.0));
    let [by_p, by_bc, by_q] = sides.map(|s| s / s.norm_squared());
    let by_p = by_p - q.cross(&w) / square;
    let by_q = by_q - w.cross(&p) / square;
    (value, [-by_p - by_q, by_p - by_bc, by_q + by_bc])
}
