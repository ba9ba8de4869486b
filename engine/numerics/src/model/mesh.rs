//! The smallest meshes of ropes, seen in plan.
//!
//! Ropes are edges of a graph drawn in the plane. Around each node they are in order by angle; who walks along an edge
//! and turns as far left as possible at each node walks around the mesh at the left, counter-clockwise, and around the
//! outside of the whole clockwise. Every directed edge belongs to one such walk.

use nalgebra::Vector2;

use super::NodeId;

/// Sine of the angle, and share of a length, below which a touch counts as a crossing.
const TOUCHES: f64 = 1e-9;
/// Pairs of edges that are looked at in search of crossings: some seconds.
const MOST_PAIRS: u64 = 2_000_000_000;
/// Crossings that are told.
const MOST_CROSSINGS: usize = 1000;

/// What keeps ropes from having meshes that could be told apart in plan. Edges by their position in what was given.
#[derive(Clone, Debug, PartialEq)]
pub enum MeshError {
    /// The ends of an edge lie above each other.
    Upright {
        /// The edge.
        edge: usize,
    },
    /// Two edges cross, touch or cover each other where they have no common node.
    Crossing {
        /// The two.
        edges: [usize; 2],
    },
    /// A mesh meets a node twice, so that it is no simple outline.
    TouchesItself {
        /// The node.
        node: NodeId,
    },
    /// A part of the ropes lies within a mesh of another part, and nothing joins them.
    Nested {
        /// A node of the inner part.
        node: NodeId,
    },
    /// So many edges lie beside each other that their crossings were not all looked for.
    TooMany,
}

/// Meshes, and what bounds none.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Meshes {
    /// Corners of each mesh, counter-clockwise seen from above, the one of least index first; in order of corners.
    pub corners: Vec<Vec<NodeId>>,
    /// Edges that bound no mesh, since they lead nowhere.
    pub loose: Vec<usize>,
}

/// Finds the meshes of `edges` between nodes at `plan` (m), by node index.
///
/// Several edges between the same two nodes count as one. Edges that lead nowhere, such as guys, bound nothing and
/// cross nothing.
///
/// # Errors
/// Every [`MeshError`] found; of crossings the first thousand.
pub fn meshes(edges: &[[NodeId; 2]], plan: &[Vector2<f64>]) -> Result<Meshes, Vec<MeshError>> {
    let bounding = without_loose_ends(edges, plan.len());
    let loose = (0..edges.len()).filter(|edge| !bounding[*edge]).collect();
    let mut kept: Vec<usize> = (0..edges.len()).filter(|edge| bounding[*edge]).collect();
    let pair = |edge: &usize| {
        let [a, b] = edges[*edge];
        (a.min(b), a.max(b))
    };
    kept.sort_by_key(|edge| (pair(edge), *edge));
    kept.dedup_by_key(|edge| pair(edge));
    kept.sort_unstable();

    let errors = crossings(edges, &kept, plan);
    if !errors.is_empty() {
        return Err(errors);
    }
    let walks = walks(edges, &kept, plan);
    let (inner, outer): (Vec<_>, Vec<_>) = walks.into_iter().partition(|walk| area(walk, plan) > 0.0);
    let mut errors = Vec::new();
    for walk in &inner {
        let mut sorted = walk.clone();
        sorted.sort_unstable();
        if let Some(twice) = sorted.windows(2).find(|pair| pair[0] == pair[1]) {
            errors.push(MeshError::TouchesItself { node: twice[0] });
        }
    }
    errors.extend(nested(&inner, &outer, plan));
    if !errors.is_empty() {
        return Err(errors);
    }
    let mut corners: Vec<Vec<NodeId>> = inner.into_iter().map(least_first).collect();
    corners.sort();
    Ok(Meshes { corners, loose })
}

/// Whether each edge is left after those with a free end are taken away, again and again.
fn without_loose_ends(edges: &[[NodeId; 2]], n_nodes: usize) -> Vec<bool> {
    // Different neighbours count, not edges: two ropes side by side bound nothing.
    let mut order: Vec<usize> = (0..edges.len()).collect();
    let pair = |edge: usize| {
        let [a, b] = edges[edge];
        (a.min(b), a.max(b))
    };
    order.sort_by_key(|edge| (pair(*edge), *edge));
    let mut neighbours: Vec<Vec<usize>> = vec![Vec::new(); n_nodes];
    let mut groups: Vec<Vec<usize>> = Vec::new();
    for edge in order {
        match groups.last_mut() {
            Some(group) if pair(group[0]) == pair(edge) => group.push(edge),
            _ => {
                for end in edges[edge] {
                    neighbours[end.index()].push(groups.len());
                }
                groups.push(vec![edge]);
            }
        }
    }
    let mut degree: Vec<usize> = neighbours.iter().map(Vec::len).collect();
    let mut kept = vec![true; groups.len()];
    let mut ends: Vec<usize> = (0..n_nodes).filter(|node| degree[*node] == 1).collect();
    while let Some(node) = ends.pop() {
        let Some(group) = neighbours[node].iter().copied().find(|group| kept[*group]) else {
            continue;
        };
        kept[group] = false;
        for end in edges[groups[group][0]].map(NodeId::index) {
            degree[end] -= 1;
            if degree[end] == 1 {
                ends.push(end);
            }
        }
    }
    let mut bounding = vec![false; edges.len()];
    for (group, kept) in groups.iter().zip(kept) {
        group.iter().for_each(|edge| bounding[*edge] = kept);
    }
    bounding
}

/// Edges that cross, sought by a sweep along x, and edges without length in plan.
fn crossings(edges: &[[NodeId; 2]], kept: &[usize], plan: &[Vector2<f64>]) -> Vec<MeshError> {
    let ends = |edge: usize| edges[edge].map(|node| plan[node.index()]);
    let longest = kept
        .iter()
        .map(|edge| (ends(*edge)[1] - ends(*edge)[0]).norm())
        .fold(0.0, f64::max);
    let mut errors: Vec<MeshError> = kept
        .iter()
        .filter(|edge| (ends(**edge)[1] - ends(**edge)[0]).norm() <= TOUCHES * longest)
        .map(|edge| MeshError::Upright { edge: *edge })
        .collect();
    if !errors.is_empty() {
        return errors;
    }
    let margin = TOUCHES * longest;
    let mut boxes: Vec<(Vector2<f64>, Vector2<f64>, usize)> = kept
        .iter()
        .map(|edge| {
            let [a, b] = ends(*edge);
            (a.inf(&b).add_scalar(-margin), a.sup(&b).add_scalar(margin), *edge)
        })
        .collect();
    boxes.sort_by(|a, b| a.0.x.total_cmp(&b.0.x).then(a.2.cmp(&b.2)));
    let mut pairs = 0_u64;
    let mut active: Vec<usize> = Vec::new();
    for (place, (least, most, edge)) in boxes.iter().enumerate() {
        active.retain(|other| boxes[*other].1.x >= least.x);
        pairs += active.len() as u64;
        if pairs > MOST_PAIRS {
            errors.push(MeshError::TooMany);
            return errors;
        }
        for other in &active {
            let (other_least, other_most, other) = boxes[*other];
            if other_least.y <= most.y && other_most.y >= least.y && cross(edges, plan, *edge, other) {
                let (first, second) = ((*edge).min(other), (*edge).max(other));
                errors.push(MeshError::Crossing { edges: [first, second] });
                if errors.len() == MOST_CROSSINGS {
                    return errors;
                }
            }
        }
        active.push(place);
    }
    errors
}

fn cross(edges: &[[NodeId; 2]], plan: &[Vector2<f64>], first: usize, second: usize) -> bool {
    let at = |node: NodeId| plan[node.index()];
    if let Some(common) = edges[first].into_iter().find(|node| edges[second].contains(node)) {
        let away = |edge: usize| {
            let [a, b] = edges[edge];
            at(if a == common { b } else { a }) - at(common)
        };
        let (a, b) = (away(first), away(second));
        return a.dot(&b) > 0.0 && a.perp(&b).abs() <= TOUCHES * a.norm() * b.norm();
    }
    let ([a, b], [c, d]) = (edges[first].map(at), edges[second].map(at));
    // On which side of a line a point lies: −1, 1, or 0 for on it.
    let side = |from: Vector2<f64>, to: Vector2<f64>, point: Vector2<f64>| {
        let (along, away) = (to - from, point - from);
        let cross = along.perp(&away);
        if cross.abs() <= TOUCHES * along.norm() * along.norm().max(away.norm()) {
            0.0
        } else {
            cross.signum()
        }
    };
    let (c_side, d_side, a_side, b_side) = (side(a, b, c), side(a, b, d), side(c, d, a), side(c, d, b));
    if c_side * d_side > 0.0 || a_side * b_side > 0.0 {
        return false;
    }
    // All in one line: only what lies beside each other along it does not touch, and boxes have told that already,
    // but for slanted ones.
    if c_side == 0.0 && d_side == 0.0 {
        let along = b - a;
        let range = |p: Vector2<f64>| (p - a).dot(&along) / along.norm_squared();
        let (low, high) = (range(c).min(range(d)), range(c).max(range(d)));
        return low <= 1.0 + TOUCHES && high >= -TOUCHES;
    }
    true
}

/// Walks with the left hand at the ropes: nodes of each.
fn walks(edges: &[[NodeId; 2]], kept: &[usize], plan: &[Vector2<f64>]) -> Vec<Vec<NodeId>> {
    // Directed edge 2 k runs along the k-th kept edge, 2 k + 1 against it.
    let from = |directed: usize| edges[kept[directed / 2]][directed % 2];
    let mut around: Vec<Vec<usize>> = vec![Vec::new(); plan.len()];
    for directed in 0..2 * kept.len() {
        around[from(directed).index()].push(directed);
    }
    let mut place = vec![0; 2 * kept.len()];
    for (node, directed) in around.iter_mut().enumerate() {
        let angle = |edge: &usize| {
            let away = plan[from(edge ^ 1).index()] - plan[node];
            away.y.atan2(away.x)
        };
        directed.sort_by(|a, b| angle(a).total_cmp(&angle(b)));
        for (position, edge) in directed.iter().enumerate() {
            place[*edge] = position;
        }
    }
    // At the end of an edge: the next one clockwise from the way back.
    let next = |directed: usize| {
        let back = directed ^ 1;
        let choices = &around[from(back).index()];
        choices[(place[back] + choices.len() - 1) % choices.len()]
    };
    let mut walked = vec![false; 2 * kept.len()];
    let mut walks = Vec::new();
    for start in 0..2 * kept.len() {
        let mut walk = Vec::new();
        let mut directed = start;
        while !walked[directed] {
            walked[directed] = true;
            walk.push(from(directed));
            directed = next(directed);
        }
        if !walk.is_empty() {
            walks.push(walk);
        }
    }
    walks
}

/// Area within an outline (m²), positive where it runs counter-clockwise.
fn area(outline: &[NodeId], plan: &[Vector2<f64>]) -> f64 {
    let first = plan[outline[0].index()];
    let at = |place: usize| plan[outline[place % outline.len()].index()] - first;
    (0..outline.len())
        .map(|place| 0.5 * at(place).perp(&at(place + 1)))
        .sum()
}

/// Parts of the ropes, each by its outside, that lie within a mesh of another part.
fn nested(inner: &[Vec<NodeId>], outer: &[Vec<NodeId>], plan: &[Vector2<f64>]) -> Vec<MeshError> {
    let mut errors = Vec::new();
    if outer.len() < 2 {
        return errors;
    }
    for part in outer {
        let node = *part.iter().min().expect("a walk has nodes");
        let point = plan[node.index()];
        let around = |mesh: &&Vec<NodeId>| {
            let outline: Vec<Vector2<f64>> = mesh.iter().map(|node| plan[node.index()]).collect();
            !mesh.contains(&node) && is_within(&point, &outline)
        };
        // A mesh of the same part meets the outside only along its rim, and no node of the outside lies within it.
        if inner.iter().any(|mesh| around(&mesh)) {
            errors.push(MeshError::Nested { node });
        }
    }
    errors
}

/// Whether a point lies within a closed outline, by counting how often a ray from it towards +x crosses the outline.
#[must_use]
pub fn is_within(point: &Vector2<f64>, outline: &[Vector2<f64>]) -> bool {
    let mut within = false;
    for (place, a) in outline.iter().enumerate() {
        let b = outline[(place + 1) % outline.len()];
        // Half open, so that a corner counts for one of its sides only.
        if (a.y > point.y) != (b.y > point.y) {
            let x = a.x + (point.y - a.y) / (b.y - a.y) * (b.x - a.x);
            within ^= point.x < x;
        }
    }
    within
}

fn least_first(mut corners: Vec<NodeId>) -> Vec<NodeId> {
    let least = (0..corners.len()).min_by_key(|place| corners[*place]).unwrap_or(0);
    corners.rotate_left(least);
    corners
}

#[cfg(test)]
mod tests {
    use super::*;

    fn edges(list: &[[usize; 2]]) -> Vec<[NodeId; 2]> {
        list.iter().map(|ends| ends.map(NodeId::new)).collect()
    }

    fn plan(list: &[[f64; 2]]) -> Vec<Vector2<f64>> {
        list.iter().map(|p| Vector2::from(*p)).collect()
    }

    fn indices(meshes: &Meshes) -> Vec<Vec<usize>> {
        let of = |mesh: &Vec<NodeId>| mesh.iter().map(|n| n.index()).collect();
        meshes.corners.iter().map(of).collect()
    }

    /// Nine nodes in a square grid, 0 to 2 below, and a tail at 8.
    fn grid() -> (Vec<[NodeId; 2]>, Vec<Vector2<f64>>) {
        let mut list = Vec::new();
        for row in 0..3 {
            for column in 0..2 {
                list.push([3 * row + column, 3 * row + column + 1]);
                list.push([3 * column + row, 3 * (column + 1) + row]);
            }
        }
        list.push([8, 9]);
        let mut places: Vec<[f64; 2]> = (0..9_u8).map(|n| [f64::from(n % 3), 1.5 * f64::from(n / 3)]).collect();
        places.push([2.0, 3.0]);
        (edges(&list), plan(&places))
    }

    #[test]
    fn a_grid_has_its_cells_and_a_tail_none() {
        let (edges, plan) = grid();
        let found = meshes(&edges, &plan).expect("a planar net");
        assert_eq!(
            indices(&found),
            [vec![0, 1, 4, 3], vec![1, 2, 5, 4], vec![3, 4, 7, 6], vec![4, 5, 8, 7]]
        );
        assert_eq!(found.loose, [12]);
        let total: f64 = found.corners.iter().map(|mesh| area(mesh, &plan)).sum();
        assert!((total - 6.0).abs() < 1e-14);
    }

    /// Euler: a connected planar graph of V nodes and E edges has E − V + 1 meshes; their areas fill its outline.
    #[test]
    fn a_net_of_triangles_has_as_many_meshes_as_it_must() {
        let n = 9;
        let at = |i: usize, j: usize| i * n + j;
        let (mut list, mut places) = (Vec::new(), Vec::new());
        for i in 0..n {
            for j in 0..n {
                let (x, y) = (i as f64, j as f64);
                // Inner nodes off the grid, so that no two ropes are parallel.
                let inner = i > 0 && j > 0 && i + 1 < n && j + 1 < n;
                let shift = if inner { 0.2 } else { 0.0 };
                places.push([x + shift * (3.7 * x + 1.3 * y).sin(), y + shift * (2.1 * y - x).cos()]);
                if i + 1 < n {
                    list.push([at(i, j), at(i + 1, j)]);
                }
                if j + 1 < n {
                    list.push([at(i, j + 1), at(i, j)]);
                }
                if i + 1 < n && j + 1 < n {
                    list.push([at(i, j), at(i + 1, j + 1)]);
                }
            }
        }
        let (edges, plan) = (edges(&list), plan(&places));
        let found = meshes(&edges, &plan).expect("a planar net");
        assert_eq!(found.corners.len(), edges.len() - n * n + 1);
        assert!(
            found
                .corners
                .iter()
                .all(|mesh| mesh.len() == 3 && area(mesh, &plan) > 0.0)
        );
        let total: f64 = found.corners.iter().map(|mesh| area(mesh, &plan)).sum();
        assert!((total - ((n - 1) * (n - 1)) as f64).abs() < 1e-12);
    }

    #[test]
    fn what_cannot_be_told_apart_is_an_error() {
        let (mut with_diagonals, plan_of_grid) = grid();
        with_diagonals.extend(edges(&[[0, 4], [1, 3]]));
        assert_eq!(
            meshes(&with_diagonals, &plan_of_grid),
            Err(vec![MeshError::Crossing { edges: [13, 14] }])
        );
        // A rope that runs past a node without being clamped to it.
        let (mut past, mut places) = grid();
        places.extend(plan(&[[0.5, 1.5]]));
        past.extend(edges(&[[10, 0], [10, 6]]));
        let errors = meshes(&past, &places).expect_err("it touches the rope below it");
        assert!(errors.iter().all(|error| matches!(error, MeshError::Crossing { .. })));
        // Two nodes above each other.
        let triangle = edges(&[[0, 1], [1, 2], [2, 0]]);
        assert_eq!(
            meshes(&triangle, &plan(&[[0.0, 0.0], [2.0, 1.0], [2.0, 1.0]])),
            Err(vec![MeshError::Upright { edge: 1 }])
        );
        // A ring within a ring.
        let rings = edges(&[[0, 1], [1, 2], [2, 0], [3, 4], [4, 5], [5, 3]]);
        let places = plan(&[[0.0, 0.0], [9.0, 0.0], [0.0, 9.0], [1.0, 1.0], [2.0, 1.0], [1.0, 2.0]]);
        assert_eq!(
            meshes(&rings, &places),
            Err(vec![MeshError::Nested { node: NodeId::new(3) }])
        );
        // The same, joined by one rope: the mesh between them is no simple outline.
        let mut joined = rings;
        joined.extend(edges(&[[0, 3]]));
        let errors = meshes(&joined, &places).expect_err("a mesh around another");
        assert!(
            errors
                .iter()
                .any(|error| matches!(error, MeshError::TouchesItself { .. }))
        );
    }

    #[test]
    fn ropes_side_by_side_are_one_and_guys_may_cross() {
        let list = edges(&[[0, 1], [1, 2], [2, 0], [1, 0], [2, 3], [2, 3]]);
        let places = plan(&[[0.0, 0.0], [1.0, 0.0], [0.5, 1.0], [0.5, -1.0]]);
        let found = meshes(&list, &places).expect("a triangle with a guy below it");
        assert_eq!(indices(&found), [vec![0, 1, 2]]);
        assert_eq!(found.loose, [4, 5]);
    }

    #[test]
    fn points_on_a_common_side_lie_in_one_of_two_outlines() {
        let west = plan(&[[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]]);
        let east = plan(&[[1.0, 0.0], [2.0, 0.0], [2.0, 1.0], [1.0, 1.0]]);
        for y in [0.0, 0.25, 0.9] {
            let point = Vector2::new(1.0, y);
            assert!(is_within(&point, &west) != is_within(&point, &east));
        }
    }
}
