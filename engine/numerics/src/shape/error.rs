//! Why there is no reference state.

use nalgebra::Vector3;
use thiserror::Error;

use super::words::{direction, kilonewtons, list};
use crate::equilibrium::{SolveError, Termination};

/// A force that nothing balances.
#[derive(Clone, Debug, PartialEq)]
pub struct ForceLeft {
    /// The client's id of the node.
    pub node: String,
    /// The force (N).
    pub force: Vector3<f64>,
    /// The neighbour towards which it points best.
    pub towards: Option<String>,
}

/// Why there is no reference state.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum ShapeError {
    /// A rule gives a cable a force that only a strut can bear, or a number that is none.
    #[error(
        "member \"{member}\" is given {what} {value}: a cable needs a finite number not below zero, a length one above"
    )]
    BadRule {
        /// Id of the member.
        member: String,
        /// The quantity.
        what: &'static str,
        /// What was given.
        value: f64,
    },
    /// Two rules for one reach that slides.
    #[error(
        "rope \"{member}\" slides through \"{node}\", and its rule changes there: one tension is on both sides; \
         give both the same rule"
    )]
    MixedReach {
        /// Id of the rope.
        member: String,
        /// Id of the node.
        node: String,
    },
    /// Every member has a given length, but some free nodes have no place to start from.
    #[error(
        "every member has a given unstressed length, so the free nodes need coordinates to start from: {} have none",
        list(nodes, 12)
    )]
    MissingCoordinates {
        /// Ids of the nodes.
        nodes: Vec<String>,
    },
    /// A node is to be held in place but has none.
    #[error(
        "{} are to be held while the shape is found, but have no coordinates",
        list(nodes, 12)
    )]
    HeldWithoutPosition {
        /// Ids of the nodes.
        nodes: Vec<String>,
    },
    /// An action under which the reference state is to be in balance does not act by dead forces.
    #[error(
        "action \"{action}\" has a {what}: the reference state can stand under dead loads only; \
         put the {what} into cases"
    )]
    NotDead {
        /// Id of the action.
        action: String,
        /// The load.
        what: &'static str,
    },
    /// A part of the net on which no member with tension leads to anything that holds it.
    #[error(
        "nothing holds {} in place: members with prestress lead from there to no support, or to too few directions of one",
        list(nodes, 8)
    )]
    NotHeld {
        /// Ids of the nodes.
        nodes: Vec<String>,
    },
    /// Only slack ropes lead to these nodes.
    #[error(
        "only slack ropes lead to {}: their place is not determined; shorten a rope there or give it prestress",
        list(nodes, 8)
    )]
    Loose {
        /// Ids of the nodes.
        nodes: Vec<String>,
    },
    /// The stiffness of the prestress is singular: compressed and tensioned members cancel.
    #[error(
        "the prestress does not fix the place of {}: compression and tension cancel there",
        list(nodes, 6)
    )]
    Singular {
        /// Ids of the nodes that move most, most first.
        nodes: Vec<String>,
    },
    /// A member left to balance ends where nothing is held.
    #[error(
        "member \"{member}\" is left to balance, but ends at \"{node}\", which is neither supported nor in `hold`: \
         hold it or give the member a tension"
    )]
    BalanceNotHeld {
        /// Id of the member.
        member: String,
        /// Id of the node.
        node: String,
    },
    /// No forces of the members left to balance keep the held nodes in place.
    #[error(
        "the members left to balance can not keep the held nodes in place; at best they leave {}: {}",
        forces_left(left),
        if *members == 0 { "no member there is left to balance" } else { "add a member there, or move the node" }
    )]
    BalanceUnsolvable {
        /// Members left to balance.
        members: usize,
        /// What is left at the nodes, largest first.
        left: Vec<ForceLeft>,
    },
    /// A cable left to balance would have to push.
    #[error(
        "to keep the held nodes in place {} would have to push{}: a cable can not; make it a strut, or move its anchor",
        pushing(members),
        if *unique { "" } else { " (forces not unique: give one of the members at that node a tension)" }
    )]
    BalancePushes {
        /// Ids of the cables and their forces (N), negative.
        members: Vec<(String, f64)>,
        /// Whether the forces are the only ones that balance.
        unique: bool,
    },
    /// A target can not stand as it is given.
    #[error("target \"{target}\" can not stand: {why}")]
    BadTarget {
        /// Name of the target.
        target: String,
        /// What is wrong with it.
        why: String,
    },
    /// There are targets, and no force density may change.
    #[error("targets are given, and no rule lets the search change a force density: let some be adjusted")]
    NothingAdjustable,
    /// A target has no value at the shape to start from.
    #[error(
        "target \"{target}\" has no value at the shape that the rules give: its nodes coincide there, or a chord stands \
         upright"
    )]
    NotMeasurable {
        /// Name of the target.
        target: String,
    },
    /// Both ends of a member fall on one point.
    #[error(
        "member \"{member}\" has no length in the shape found: its ends \"{from}\" and \"{to}\" coincide; \
         nodes creep along a rope of equal tension: give it one mean tension, or force densities"
    )]
    NoLength {
        /// Id of the member.
        member: String,
        /// Id of its first node.
        from: String,
        /// Id of its second node.
        to: String,
    },
    /// No unstressed length gives the force.
    #[error(
        "member \"{member}\" with EA {} can not bear {} at any unstressed length: was EA given in another unit?",
        kilonewtons(*axial_stiffness),
        kilonewtons(*axial_force)
    )]
    BeyondStiffness {
        /// Id of the member.
        member: String,
        /// Its axial force (N).
        axial_force: f64,
        /// Its `EA` (N).
        axial_stiffness: f64,
    },
    /// The search ended without balance.
    #[error(
        "no balanced shape after {iterations} iterations: {} is left at \"{node}\" ({termination:?}); if force densities \
         are small beside the weights they carry, raise them",
        kilonewtons(*residual)
    )]
    NotConverged {
        /// Iterations made.
        iterations: u32,
        /// Largest force left (N).
        residual: f64,
        /// Id of the node.
        node: String,
        /// How it ended.
        termination: Termination,
    },
    /// The state that was found does not stand as an elastic net.
    #[error(
        "the shape found is out of balance as an elastic net: {} at \"{node}\" where {} is allowed",
        kilonewtons(*imbalance),
        kilonewtons(*allowed)
    )]
    GateFailed {
        /// Largest imbalance (N).
        imbalance: f64,
        /// What is allowed (N).
        allowed: f64,
        /// Id of the node.
        node: String,
    },
    /// A number of the elastic net is beyond reckoning.
    #[error("the {what} of \"{part}\" is {value:e}: it has to be positive and of a size that can be built")]
    BeyondReckoning {
        /// Id of the member or node.
        part: String,
        /// The quantity.
        what: &'static str,
        /// Its value.
        value: f64,
    },
    /// Members of given length have no equilibrium.
    #[error("members of given length find no equilibrium{}: {source}", at(nodes))]
    Elastic {
        /// What the solver says.
        source: SolveError,
        /// Ids of the nodes concerned.
        nodes: Vec<String>,
    },
    /// The shape balances, but can move freely.
    #[error(
        "nothing holds \"{node}\" along {}: of {} none resists, and prestress does not stiffen it ({stiffness:.0} N/m); \
         spread the members there, or hold \"{node}\" along that direction",
        direction(along),
        list(members, 6)
    )]
    FreeMovement {
        /// Id of the node that moves most.
        node: String,
        /// How it moves (unit).
        along: Vector3<f64>,
        /// Stiffness against the movement (N/m).
        stiffness: f64,
        /// Ids of the members at the node.
        members: Vec<String>,
    },
    /// A number went beyond what can be reckoned with.
    #[error("the numbers of the search went beyond all bounds at \"{node}\": check units of force densities and loads")]
    Unbounded {
        /// Id of the node.
        node: String,
    },
    /// The observer asked to stop.
    #[error("stopped on request")]
    Cancelled,
}

fn at(nodes: &[String]) -> String {
    if nodes.is_empty() {
        String::new()
    } else {
        format!(" at {}", list(nodes, 6))
    }
}

pub(super) fn forces_left(left: &[ForceLeft]) -> String {
    if left.is_empty() {
        return "nothing at any node".to_owned();
    }
    let one = |l: &ForceLeft| match &l.towards {
        Some(node) => format!("{} at \"{}\" (towards \"{node}\")", kilonewtons(l.force.norm()), l.node),
        None => format!(
            "{} at \"{}\" along {}",
            kilonewtons(l.force.norm()),
            l.node,
            direction(&(l.force / l.force.norm()))
        ),
    };
    left.iter().take(3).map(one).collect::<Vec<_>>().join(" and ")
}

fn pushing(members: &[(String, f64)]) -> String {
    let one = |(name, force): &(String, f64)| format!("cable \"{name}\" ({})", kilonewtons(*force));
    members.iter().take(6).map(one).collect::<Vec<_>>().join(" and ")
}
