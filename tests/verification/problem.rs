//! A net with its prestress and loads, put together by hand and solved: every call of the kernel is here.

use std::ops::ControlFlow;
use std::sync::Arc;

use nalgebra::{DMatrix, Vector3};
use ropewalk_numerics::brief::{
    Brief, CaseGiven, CaseOutcome, ModesGiven, Plan, PondingGiven, Prestress, PrestressRule, ReferenceOutcome,
    StateResult, SupportForce,
};
use ropewalk_numerics::check::{Against, CaseDigest, Check, CheckKind, CheckTally, Judgement, Lack};
use ropewalk_numerics::equilibrium::{Settings, Termination};
use ropewalk_numerics::load::{Action, Load};
use ropewalk_numerics::model::{
    CableGiven, CableId, ElasticSupportGiven, Member, Net, NetGiven, NodeGiven, NodeId, PanelGiven, Section, Skin,
    Slide, StrutGiven, StrutId, SupportGiven,
};
use ropewalk_numerics::motion::Modes;
use ropewalk_numerics::shape::{Adjustable, ShapeTarget, Wish};

/// A net in the making.
#[derive(Clone, Debug, Default)]
pub(crate) struct Problem {
    net: NetGiven,
    cable_rules: Vec<PrestressRule>,
    strut_rules: Vec<PrestressRule>,
    mean_tensions: Vec<f64>,
    adjustables: Vec<Adjustable>,
    targets: Vec<ShapeTarget>,
    hold: Vec<NodeId>,
    under: Vec<Load>,
    case: Vec<Load>,
    ponding: Option<PondingGiven>,
    removed: Vec<Member>,
    modes: Option<ModesGiven>,
}

/// What a problem answers.
#[derive(Clone, Debug)]
pub(crate) struct Answer {
    /// The reference state.
    pub(crate) reference: StateResult,
    /// The state under the case's loads; the reference state again if there are none.
    pub(crate) state: StateResult,
}

/// A section of which only the stiffness matters.
pub(crate) fn stiff(axial_stiffness: f64) -> Section {
    Section {
        axial_stiffness,
        mass_per_length: 0.0,
        expansion: 0.0,
        breaking_force: None,
        ..Section::default()
    }
}

impl Problem {
    fn push(&mut self, position: Vector3<f64>, support: Option<SupportGiven>) -> NodeId {
        let id = NodeId::new(self.net.nodes.len());
        self.net.nodes.push(NodeGiven {
            name: format!("n{}", id.index()),
            position: Some(position),
            support,
            attached_mass: 0.0,
        });
        id
    }

    /// A free node.
    pub(crate) fn free(&mut self, x: f64, y: f64, z: f64) -> NodeId {
        self.push(Vector3::new(x, y, z), None)
    }

    /// A node held in all directions.
    pub(crate) fn fixed(&mut self, x: f64, y: f64, z: f64) -> NodeId {
        self.push(Vector3::new(x, y, z), Some(SupportGiven::default()))
    }

    /// A node held in all directions but the given ones.
    pub(crate) fn released(&mut self, position: Vector3<f64>, released: Vec<Vector3<f64>>) -> NodeId {
        self.push(position, Some(SupportGiven { released }))
    }

    /// Holds nodes by a stiffness (N/m), on top of what holds them rigidly.
    pub(crate) fn elastic(&mut self, nodes: Vec<NodeId>, stiffness: DMatrix<f64>) {
        self.net.elastic_supports.push(ElasticSupportGiven { nodes, stiffness });
    }

    /// Attaches a mass (kg) to a node.
    pub(crate) fn attach(&mut self, node: NodeId, mass: f64) {
        self.net.nodes[node.index()].attached_mass = mass;
    }

    /// A rope through nodes, each of its segments with its rule.
    pub(crate) fn cable(&mut self, path: &[NodeId], section: Section, rules: impl IntoIterator<Item = PrestressRule>) {
        let rules: Vec<_> = rules.into_iter().collect();
        assert_eq!(rules.len() + 1, path.len(), "one rule a segment");
        self.net.cables.push(CableGiven {
            name: format!("c{}", self.net.cables.len()),
            path: path.to_vec(),
            sections: vec![section; rules.len()],
            ..CableGiven::default()
        });
        self.cable_rules.extend(rules);
    }

    /// A rope of one segment with its unstressed length (m).
    pub(crate) fn bar(&mut self, from: NodeId, to: NodeId, section: Section, unstressed_length: f64) {
        self.cable(
            &[from, to],
            section,
            [PrestressRule::UnstressedLength(unstressed_length)],
        );
    }

    /// A rope that hangs in a curve between each two of its nodes, with the unstressed length of each piece (m).
    pub(crate) fn hanging(&mut self, path: &[NodeId], section: Section, unstressed_lengths: &[f64]) {
        self.cable(
            path,
            section,
            unstressed_lengths.iter().copied().map(PrestressRule::UnstressedLength),
        );
        self.net.cables.last_mut().expect("just added").hangs = true;
    }

    /// A rope that slides through its inner nodes, with its whole unstressed length (m).
    pub(crate) fn sliding(&mut self, path: &[NodeId], section: Section, friction: f64, unstressed_length: f64) {
        let rules = vec![PrestressRule::UnstressedLength(unstressed_length); path.len() - 1];
        self.cable(path, section, rules);
        let slides = (1..path.len() - 1).map(|place| Slide { place, friction });
        self.net.cables.last_mut().expect("just added").slides = slides.collect();
    }

    /// A strut.
    pub(crate) fn strut(&mut self, foot: NodeId, head: NodeId, section: Section, rule: PrestressRule) {
        self.net.struts.push(StrutGiven {
            name: format!("s{}", self.net.struts.len()),
            ends: [foot, head],
            section,
        });
        self.strut_rules.push(rule);
    }

    /// A rule for a family of segments whose tensions shall have this mean (N).
    pub(crate) fn mean_tension(&mut self, tension: f64) -> PrestressRule {
        self.mean_tensions.push(tension);
        PrestressRule::MeanTension(self.mean_tensions.len() - 1)
    }

    /// A rule for segments whose one force density (N/m) may change so that targets are met.
    pub(crate) fn adjustable(&mut self, density: f64) -> PrestressRule {
        self.adjustables.push(Adjustable {
            density,
            least: 0.0,
            most: f64::INFINITY,
        });
        PrestressRule::Adjustable(self.adjustables.len() - 1)
    }

    /// What the shape is to meet.
    pub(crate) fn target(&mut self, wish: Wish) {
        self.targets.push(ShapeTarget {
            name: self.targets.len().to_string(),
            wish,
            weight: 1.0,
        });
    }

    /// Keeps a free node where it is while the shape is found.
    pub(crate) fn hold(&mut self, node: NodeId) {
        self.hold.push(node);
    }

    /// A skin of panels, each by its corners counter-clockwise seen from its outer side.
    pub(crate) fn skin(&mut self, mass_per_area: f64, panels: &[&[NodeId]]) {
        let first = self.net.panels.len();
        for corners in panels {
            self.net.panels.push(PanelGiven {
                name: format!("p{}", self.net.panels.len()),
                corners: corners.to_vec(),
            });
        }
        self.net.skins.push(Skin {
            name: format!("skin{}", self.net.skins.len()),
            mass_per_area,
            panels: (first..self.net.panels.len()).collect(),
        });
    }

    /// Lets water of this density (kg/m³) gather on skins in the case.
    pub(crate) fn gather_water(&mut self, density: f64, gravity: f64) {
        self.ponding = Some(PondingGiven { density, gravity });
    }

    /// Asks for the lowest natural frequencies of both states.
    pub(crate) fn modes(&mut self, count: usize) {
        self.modes = Some(ModesGiven {
            cases: vec![0],
            count,
            ..ModesGiven::default()
        });
    }

    /// What comes of the case, whether it is an answer or not.
    #[track_caller]
    pub(crate) fn outcome(self) -> CaseOutcome {
        let plan = self.plan();
        let reference = reference(&plan);
        plan.case(&reference, 0, &mut |_| ControlFlow::Continue(()))
    }

    /// A dead load that acts in the reference state and in the case.
    pub(crate) fn always(&mut self, load: Load) {
        self.under.push(load);
    }

    /// A load of the case.
    pub(crate) fn load(&mut self, load: Load) {
        self.case.push(load);
    }

    /// Takes a rope out, in the case.
    pub(crate) fn take_out(&mut self, cable: CableId) {
        self.removed.push(Member::Cable(cable));
    }

    /// A force (N) on one node, in the case.
    pub(crate) fn push_node(&mut self, node: NodeId, x: f64, y: f64, z: f64) {
        self.load(Load::Nodes {
            nodes: vec![node],
            force: Vector3::new(x, y, z),
        });
    }

    /// A panel by its corners.
    pub(crate) fn panel(&mut self, corners: &[NodeId]) {
        self.net.panels.push(PanelGiven {
            name: format!("p{}", self.net.panels.len()),
            corners: corners.to_vec(),
        });
    }

    /// What a check over the whole net says, with the nodes where they were given and with these axial forces (N) and
    /// support forces (N): its only part, or its worst.
    #[track_caller]
    pub(crate) fn judge(
        self,
        kind: CheckKind,
        nodes: &[NodeId],
        axial_forces: &[f64],
        support_forces: &[(NodeId, Vector3<f64>)],
    ) -> Result<Judgement, Lack> {
        let net = Net::new(self.net).expect("the net of a case is valid");
        let positions: Vec<_> = net.nodes().iter().map(|n| n.position.expect("a place")).collect();
        let mut digest = CaseDigest {
            answered: true,
            audited: true,
            axial_forces: axial_forces.to_vec(),
            displacements: vec![Vector3::zeros(); positions.len()],
            positions: positions.clone(),
            support_forces: vec![None; positions.len()],
            ..CaseDigest::default()
        };
        for (node, force) in support_forces {
            digest.support_forces[node.index()] = Some(*force);
        }
        let of_members = !nodes.is_empty() || matches!(kind, CheckKind::Drainage { .. });
        let of_struts = matches!(kind, CheckKind::Buckling { .. });
        let members = |count: usize, wanted: bool| if wanted && !of_members { count } else { 0 };
        let check = Check {
            kind,
            cables: (0..members(net.cables().len(), !of_struts)).map(CableId::new).collect(),
            struts: (0..members(net.struts().len(), of_struts)).map(StrutId::new).collect(),
            nodes: nodes.to_vec(),
            panels: (0..net.panels().len()).collect(),
            cases: vec![0],
        };
        let against = Against {
            net: &net,
            axial_forces,
            positions: &positions,
            bases: &[],
        };
        let mut tally = CheckTally::new(&check, &against);
        tally.add(&check, &against, 0, &digest);
        let result = tally.finish(&check, Vec::new());
        match (result.worst(), result.not_judged.first()) {
            (_, Some((_, lack))) => Err(*lack),
            (Some(worst), None) => Ok(*worst),
            (None, None) => panic!("the check covers nothing"),
        }
    }

    /// Solves to the rounding floor of the input: the published digits are compared, not the tolerance at which a user's
    /// solve may stop.
    ///
    /// The answer has passed the audit, and its loads and support forces add up to nothing, within 1e-6 of the loads
    /// and tensions: what is compared is a state in balance.
    #[track_caller]
    pub(crate) fn solve(self) -> Answer {
        let has_case = !self.case.is_empty() || self.ponding.is_some();
        let plan = self.plan();
        let reference = reference(&plan);
        let state = if has_case {
            case(&plan, &reference)
        } else {
            reference.result.clone()
        };
        in_balance(&reference.result);
        in_balance(&state);
        Answer {
            reference: reference.result,
            state,
        }
    }

    #[track_caller]
    fn plan(self) -> Plan {
        let net = Net::new(self.net).expect("the net of a case is valid");
        let mut rules = self.cable_rules;
        rules.extend(self.strut_rules);
        let actions = [("always", self.under), ("case", self.case)].map(|(name, loads)| Action {
            name: name.to_owned(),
            loads,
        });
        Plan::new(Brief {
            net: Arc::new(net),
            prestress: Prestress {
                rules,
                mean_tensions: self.mean_tensions,
                hold: self.hold,
                under: vec![0],
                adjustables: self.adjustables,
                targets: self.targets,
            },
            actions: actions.to_vec(),
            cases: vec![CaseGiven {
                name: "case".to_owned(),
                factors: vec![(0, 1.0), (1, 1.0)],
                ponding: self.ponding,
                removed: self.removed,
                ..CaseGiven::default()
            }],
            effects: Vec::new(),
            checks: Vec::new(),
            diagnosis: None,
            modes: self.modes,
            motions: Vec::new(),
            envelopes: Vec::new(),
            settings: Settings {
                tolerance: 1e-14,
                ..Settings::default()
            },
        })
    }
}

#[track_caller]
fn reference(plan: &Plan) -> ReferenceOutcome {
    plan.reference(&mut |_| ControlFlow::Continue(()))
        .unwrap_or_else(|error| panic!("no reference state: {error}"))
}

#[track_caller]
fn case(plan: &Plan, reference: &ReferenceOutcome) -> StateResult {
    match plan.case(reference, 0, &mut |_| ControlFlow::Continue(())) {
        CaseOutcome::State { solution, result, .. } => {
            assert_eq!(solution.termination, Termination::Converged);
            *result
        }
        CaseOutcome::None { error, .. } => panic!("no state: {error}"),
    }
}

#[track_caller]
fn in_balance(state: &StateResult) {
    assert!(state.audit.passed, "the audit fails: {:?}", state.audit);
    let largest = state
        .axial_forces
        .iter()
        .fold(state.load_sum.norm(), |a, b| a.max(b.abs()));
    let rest = (state.load_sum + state.support_sum).norm();
    assert!(
        rest <= 1e-6 * largest,
        "loads and support forces leave {rest} N of {largest} N"
    );
}

/// The natural modes of a state: all of them, as a count shows, and orthogonal.
#[track_caller]
pub(crate) fn modes(state: &StateResult) -> &Modes {
    let modes = state.modes.as_deref().expect("modes were asked for");
    let modes = modes.as_ref().unwrap_or_else(|error| panic!("no modes: {error}"));
    assert!(
        modes.is_complete(),
        "{:?} for {} modes",
        modes.counted,
        modes.modes.len()
    );
    assert!(modes.orthogonality < 1e-11, "{}", modes.orthogonality);
    modes
}

/// The force of a support on the net (N).
#[track_caller]
pub(crate) fn support_force(state: &StateResult, node: NodeId) -> &SupportForce {
    state
        .support_forces
        .iter()
        .find(|s| s.node == node)
        .expect("the node is supported")
}
