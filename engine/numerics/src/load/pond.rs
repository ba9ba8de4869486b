//! Water that stands on a skin: closed depressions of the surface, filled to where they spill.
//!
//! The surface is that of the panels' triangles, corners and means (see [`crate::model::fan`]). Water leaves over its rim.
//! The level to which water can stand at a vertex is the lowest pass on any way from there to the rim; on triangles the
//! ways along their sides are enough, since every pass lies at a vertex. A flood from the rim that always goes on where it
//! is lowest finds all levels at once (Barnes, Lehman & Mulla 2014):
//!
//! ```text
//! w(v) = max(z(v), min over neighbours of w)          depth = w − z
//! ```
//!
//! Vertices under water beside each other have the same level: they are one pond. Over each triangle the water is a wedge
//! `max(0, w − z)` with `z` linear; its volume goes to the three vertices by its centre, so that force and moment are
//! kept, and what comes to a mean goes to all corners of its panel alike.

use std::cmp::{Ordering, Reverse};
use std::collections::BinaryHeap;

use nalgebra::{Vector2, Vector3};

use crate::model::{Net, NodeId, fan};

/// Depth below which nothing counts as water (m).
const SHALLOW: f64 = 1e-9;
/// Area on plan over area below which a panel is upright and holds no water.
const UPRIGHT: f64 = 1e-6;

/// Where something lies on the surface.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Place {
    /// At a node.
    Node(NodeId),
    /// At the mean of a panel's corners, by the index of the panel.
    Panel(usize),
}

/// Water that stands in one depression.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pond {
    /// Where it is deepest.
    pub deepest: Place,
    /// That place (m).
    pub position: Vector3<f64>,
    /// Depth there (m).
    pub depth: f64,
    /// Level of its surface (m).
    pub level: f64,
    /// Volume (m³).
    pub volume: f64,
    /// Area of its surface (m²).
    pub area: f64,
}

/// All ponds on a net.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Ponds {
    /// The ponds, largest volume first.
    pub ponds: Vec<Pond>,
    /// Volume that bears on each node (m³).
    pub nodal_volumes: Vec<f64>,
}

impl Ponds {
    /// Fills every depression of the surface at `positions` (m) to where it spills.
    #[must_use]
    pub fn fill(net: &Net, positions: &[Vector3<f64>]) -> Self {
        let terrain = Terrain::new(net, positions);
        let levels = terrain.levels();
        let pond_of = terrain.ponds_of(&levels);
        let mut ponds: Vec<Pond> = Vec::new();
        for (vertex, pond) in pond_of.iter().enumerate() {
            let Some(pond) = *pond else { continue };
            let (place, position) = terrain.vertices[vertex];
            let depth = levels[vertex] - position.z;
            let here = Pond {
                deepest: place,
                position,
                depth,
                level: levels[vertex],
                volume: 0.0,
                area: 0.0,
            };
            match ponds.get_mut(pond) {
                Some(known) if known.depth >= depth => {}
                Some(known) => *known = here,
                None => ponds.push(here),
            }
        }
        let mut volumes = vec![0.0; terrain.vertices.len()];
        for triangle in &terrain.triangles {
            let Some(pond) = triangle.iter().find_map(|vertex| pond_of[*vertex]) else {
                continue;
            };
            let corners = triangle.map(|vertex| terrain.vertices[vertex].1);
            let wedge = Wedge::new(&corners, ponds[pond].level);
            ponds[pond].volume += wedge.volumes.iter().sum::<f64>();
            ponds[pond].area += wedge.area;
            for (vertex, volume) in triangle.iter().zip(wedge.volumes) {
                volumes[*vertex] += volume;
            }
        }
        let mut nodal_volumes = vec![0.0; net.nodes().len()];
        for ((place, _), volume) in terrain.vertices.iter().zip(volumes) {
            match place {
                Place::Node(node) => nodal_volumes[node.index()] += volume,
                Place::Panel(panel) => {
                    let corners = &net.panels()[*panel].corners;
                    let share = volume / corners.len() as f64;
                    corners.iter().for_each(|corner| nodal_volumes[corner.index()] += share);
                }
            }
        }
        ponds.sort_by(|a, b| b.volume.total_cmp(&a.volume));
        Self { ponds, nodal_volumes }
    }

    /// Volume of all of them (m³).
    #[must_use]
    pub fn volume(&self) -> f64 {
        self.ponds.iter().map(|pond| pond.volume).sum()
    }
}

/// The surface as triangles.
struct Terrain {
    vertices: Vec<(Place, Vector3<f64>)>,
    triangles: Vec<[usize; 3]>,
    neighbours: Vec<Vec<usize>>,
    /// Vertices on the rim.
    is_rim: Vec<bool>,
}

impl Terrain {
    fn new(net: &Net, positions: &[Vector3<f64>]) -> Self {
        let mut terrain = Self {
            vertices: Vec::new(),
            triangles: Vec::new(),
            neighbours: Vec::new(),
            is_rim: Vec::new(),
        };
        let mut of_node = vec![None; net.nodes().len()];
        for (index, panel) in net.panels().iter().enumerate() {
            let corners = panel.places(positions);
            if fan::signed_area_on_plan(&corners).abs() <= UPRIGHT * fan::area(&corners) {
                continue;
            }
            let mean = corners.iter().sum::<Vector3<f64>>() / corners.len() as f64;
            let middle = terrain.vertices.len();
            terrain.vertices.push((Place::Panel(index), mean));
            let around: Vec<usize> = panel
                .corners
                .iter()
                .map(|corner| {
                    *of_node[corner.index()].get_or_insert_with(|| {
                        terrain.vertices.push((Place::Node(*corner), positions[corner.index()]));
                        terrain.vertices.len() - 1
                    })
                })
                .collect();
            for (k, corner) in around.iter().enumerate() {
                terrain
                    .triangles
                    .push([*corner, around[(k + 1) % around.len()], middle]);
            }
        }
        let mut sides: Vec<(usize, usize)> = (terrain.triangles.iter())
            .flat_map(|[a, b, c]| [(a, b), (b, c), (c, a)].map(|(a, b)| (*a.min(b), *a.max(b))))
            .collect();
        sides.sort_unstable();
        terrain.neighbours = vec![Vec::new(); terrain.vertices.len()];
        terrain.is_rim = vec![false; terrain.vertices.len()];
        for side in sides.chunk_by(|a, b| a == b) {
            let (a, b) = side[0];
            terrain.neighbours[a].push(b);
            terrain.neighbours[b].push(a);
            // One triangle at a side: water runs off. More than two: layers, of which none is known to be the upper one.
            if side.len() != 2 {
                terrain.is_rim[a] = true;
                terrain.is_rim[b] = true;
            }
        }
        terrain
    }

    /// Level of standing water at each vertex (m): its own height where there is none.
    fn levels(&self) -> Vec<f64> {
        let mut levels: Vec<f64> = self.vertices.iter().map(|(_, position)| position.z).collect();
        let mut reached = self.is_rim.clone();
        let mut front: BinaryHeap<Reverse<Height>> = (0..levels.len())
            .filter(|vertex| self.is_rim[*vertex])
            .map(|vertex| Reverse(Height(levels[vertex], vertex)))
            .collect();
        while let Some(Reverse(Height(level, vertex))) = front.pop() {
            for neighbour in &self.neighbours[vertex] {
                if !reached[*neighbour] {
                    reached[*neighbour] = true;
                    levels[*neighbour] = levels[*neighbour].max(level);
                    front.push(Reverse(Height(levels[*neighbour], *neighbour)));
                }
            }
        }
        levels
    }

    /// The pond of each vertex under water, numbered in the order in which vertices meet them.
    fn ponds_of(&self, levels: &[f64]) -> Vec<Option<usize>> {
        let is_wet = |vertex: usize| levels[vertex] - self.vertices[vertex].1.z > SHALLOW;
        let mut ponds = vec![None; levels.len()];
        let mut number = 0;
        for start in 0..levels.len() {
            if !is_wet(start) || ponds[start].is_some() {
                continue;
            }
            ponds[start] = Some(number);
            let mut waiting = vec![start];
            while let Some(vertex) = waiting.pop() {
                for neighbour in &self.neighbours[vertex] {
                    if is_wet(*neighbour) && ponds[*neighbour].is_none() {
                        ponds[*neighbour] = Some(number);
                        waiting.push(*neighbour);
                    }
                }
            }
            number += 1;
        }
        ponds
    }
}

/// A height and the vertex that has it.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Height(f64, usize);

impl Eq for Height {}

impl Ord for Height {
    fn cmp(&self, other: &Self) -> Ordering {
        self.0.total_cmp(&other.0).then(self.1.cmp(&other.1))
    }
}

impl PartialOrd for Height {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}

/// Water over one triangle.
struct Wedge {
    /// Volume that bears on each vertex (m³).
    volumes: [f64; 3],
    /// Area of its surface (m²).
    area: f64,
}

impl Wedge {
    /// `∫ λ_i d dA` over the part of the triangle where the depth `d` is positive, `λ_i` linear, 1 at vertex `i`.
    fn new(corners: &[Vector3<f64>; 3], level: f64) -> Self {
        let depths = corners.map(|corner| level - corner.z);
        // The part under water, by its corners in λ.
        let mut wet: Vec<[f64; 3]> = Vec::with_capacity(4);
        for i in 0..3 {
            let j = (i + 1) % 3;
            if depths[i] > 0.0 {
                let mut at = [0.0; 3];
                at[i] = 1.0;
                wet.push(at);
            }
            if (depths[i] > 0.0) != (depths[j] > 0.0) {
                let along = depths[i] / (depths[i] - depths[j]);
                let mut at = [0.0; 3];
                at[i] = 1.0 - along;
                at[j] = along;
                wet.push(at);
            }
        }
        let mut wedge = Self {
            volumes: [0.0; 3],
            area: 0.0,
        };
        let plan = |at: &[f64; 3]| -> Vector2<f64> { (0..3).map(|i| corners[i].xy() * at[i]).sum() };
        let depth = |at: &[f64; 3]| -> f64 { (0..3).map(|i| depths[i] * at[i]).sum::<f64>().max(0.0) };
        for k in 2..wet.len() {
            let part = [wet[0], wet[k - 1], wet[k]];
            let [a, b, c] = part.each_ref().map(plan);
            let area = 0.5 * (b - a).perp(&(c - a)).abs();
            let deep = part.each_ref().map(depth);
            let sum: f64 = deep.iter().sum();
            wedge.area += area;
            // ∫ μ_p μ_q = A/12 (1 + δ_pq) with the linear functions μ of the part.
            for (at, own) in part.iter().zip(deep) {
                let bears = area / 12.0 * (sum + own);
                for (volume, share) in wedge.volumes.iter_mut().zip(at) {
                    *volume += share * bears;
                }
            }
        }
        wedge
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::PanelGiven;
    use crate::test_nets::{Sketch, section};

    fn net(nodes: &[(&str, [f64; 3])], panels: &[&str]) -> Net {
        let mut sketch = Sketch::default();
        for (name, position) in nodes {
            sketch.held(name, *position);
        }
        sketch.cable("rope", section(1e6, 0.0), &format!("{} {}", nodes[0].0, nodes[1].0));
        for path in panels {
            let corners = path.split(' ').map(|name| sketch.id(name)).collect();
            sketch.given.panels.push(PanelGiven {
                name: (*path).to_owned(),
                corners,
            });
        }
        sketch.net()
    }

    fn fill(net: &Net) -> Ponds {
        let positions: Vec<_> = net.nodes().iter().filter_map(|n| n.position).collect();
        Ponds::fill(net, &positions)
    }

    /// A pyramid upside down, its rim level: a third of base times height; a sixth of base times height bears on the tip.
    #[test]
    fn a_pyramid_holds_a_third_of_its_box() {
        let net = net(
            &[
                ("a", [0.0, 0.0, 1.0]),
                ("b", [4.0, 0.0, 1.0]),
                ("c", [4.0, 3.0, 1.0]),
                ("d", [0.0, 3.0, 1.0]),
                ("tip", [1.5, 1.0, 0.4]),
            ],
            &["a b tip", "b c tip", "c d tip", "d a tip"],
        );
        let ponds = fill(&net);
        assert_eq!(ponds.ponds.len(), 1);
        let pond = ponds.ponds[0];
        assert!((pond.volume - 12.0 * 0.6 / 3.0).abs() < 1e-14 && (pond.area - 12.0).abs() < 1e-14);
        assert!((pond.depth - 0.6).abs() < 1e-15 && pond.deepest == Place::Node(NodeId::new(4)));
        assert!((ponds.nodal_volumes[4] - 12.0 * 0.6 / 6.0).abs() < 1e-14);
        assert!((ponds.nodal_volumes.iter().sum::<f64>() - pond.volume).abs() < 1e-14);
    }

    /// One corner of the rim is lower: the water stands to there only, similar to the full pyramid, and what it bears on
    /// nodes has the moment of its volume: the centroid of the tip's pyramid of water.
    #[test]
    fn water_spills_over_the_lowest_place_of_the_rim() {
        // A square of 4 m around its middle; the corner a lies at 0.5, the others at 1, the tip at 0.
        let net = net(
            &[
                ("a", [-2.0, -2.0, 0.5]),
                ("b", [2.0, -2.0, 1.0]),
                ("c", [2.0, 2.0, 1.0]),
                ("d", [-2.0, 2.0, 1.0]),
                ("tip", [0.0, 0.0, 0.0]),
            ],
            &["a b tip", "b c tip", "c d tip", "d a tip"],
        );
        let ponds = fill(&net);
        let pond = ponds.ponds[0];
        assert!((pond.level - 0.5).abs() < 1e-15);
        // The line at level 0.5 runs through the middles of the spokes to b, c, d and through a: its outline in plan.
        let outline = [[-2.0, -2.0], [1.0, -1.0], [1.0, 1.0], [-1.0, 1.0]];
        let area: f64 = (0..4)
            .map(|k| {
                let ([x, y], [u, v]) = (outline[k], outline[(k + 1) % 4]);
                0.5 * (x * v - u * y)
            })
            .sum();
        assert!((pond.area - area).abs() < 1e-14);
        // A cone over that outline down to the tip, 0.5 deep.
        assert!((pond.volume - area * 0.5 / 3.0).abs() < 1e-14);
        let positions: Vec<_> = net.nodes().iter().filter_map(|n| n.position).collect();
        let moment: Vector3<f64> = positions.iter().zip(&ponds.nodal_volumes).map(|(x, v)| x * *v).sum();
        // The cone's centre of volume lies three quarters of the way from the tip to the centroid of its outline.
        let mut centroid = Vector2::zeros();
        for k in 0..4 {
            let (p, q) = (Vector2::from(outline[k]), Vector2::from(outline[(k + 1) % 4]));
            centroid += (p + q) * (p.perp(&q) / (6.0 * area));
        }
        assert!((moment.xy() - centroid * (0.75 * pond.volume)).norm() < 1e-14);
    }

    #[test]
    fn two_hollows_are_two_ponds_and_a_slope_is_none() {
        let hollow = |first: f64, second: f64| {
            net(
                &[
                    ("a", [0.0, 0.0, 1.0]),
                    ("b", [2.0, 0.0, 1.0]),
                    ("c", [4.0, 0.0, 1.0]),
                    ("d", [4.0, 2.0, 1.0]),
                    ("e", [2.0, 2.0, 1.0]),
                    ("f", [0.0, 2.0, 1.0]),
                    ("west", [1.0, 1.0, first]),
                    ("east", [3.0, 1.0, second]),
                ],
                &[
                    "a b west", "b e west", "e f west", "f a west", "b c east", "c d east", "d e east", "e b east",
                ],
            )
        };
        let ponds = fill(&hollow(0.4, 0.7));
        let volumes: Vec<f64> = ponds.ponds.iter().map(|pond| pond.volume).collect();
        assert_eq!(volumes.len(), 2);
        assert!((volumes[0] - 0.8).abs() < 1e-14 && (volumes[1] - 0.4).abs() < 1e-14);
        assert!(fill(&hollow(1.3, 1.0)).ponds.is_empty());
    }

    /// A flat panel whose middle is pressed down by nothing holds nothing; a saddle drains over its low sides.
    #[test]
    fn a_saddle_drains() {
        let saddle = net(
            &[
                ("a", [0.0, 0.0, 2.0]),
                ("b", [4.0, 0.0, 0.0]),
                ("c", [4.0, 4.0, 2.0]),
                ("d", [0.0, 4.0, 0.0]),
            ],
            &["a b c d"],
        );
        assert!(fill(&saddle).ponds.is_empty());
        assert_eq!(fill(&saddle).volume(), 0.0);
    }
}
