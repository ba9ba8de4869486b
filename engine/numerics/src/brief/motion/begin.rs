//! How a motion begins.

use std::ops::ControlFlow;
use std::sync::Arc;

use nalgebra::Vector3;

use super::begun::{Compared, Divided, MotionBegun, Whole};
use super::refused::Names;
use super::{DrivenWhat, MotionGiven, MotionNotBegun, Watched};
use crate::brief::cause::{Stop, cause_of_error, cause_of_stop};
use crate::brief::state::{Bare, state_result};
use crate::brief::{Brief, CaseOutcome, Plan, ReferenceOutcome};
use crate::equilibrium::{
    Analysis, IterationReport, LoadSteps, Settings, Solution, SolveError, Termination, audit, solve,
};
use crate::load::Case;
use crate::model::{Member, SegmentId};
use crate::motion::transient::{
    Break, Damping, Driven, Frames, Motion, MotionError, Running, Settled, outlook, settled_case,
};
use crate::motion::{About, Division, nodal_masses};

type Watch<'a> = &'a mut dyn FnMut(&IterationReport) -> ControlFlow<()>;

/// An answered state of the net as given.
#[derive(Clone, Debug)]
struct Found {
    /// What it carries.
    case: Case,
    positions: Vec<Vector3<f64>>,
    axial_forces: Vec<f64>,
    /// Force of every segment on its first and its second node (N).
    pulls: Vec<[Vector3<f64>; 2]>,
}

/// The net that moves and the state it starts from.
struct Stage {
    analysis: Analysis,
    division: Option<Arc<Division>>,
    case: Case,
    positions: Vec<Vector3<f64>>,
    divided: Option<Divided>,
}

impl Stage {
    /// A case of the net as given, on the net that moves.
    fn turned(&self, case: Case) -> Case {
        match &self.division {
            Some(division) => division.case(&case),
            None => case,
        }
    }

    /// Vectors of nodes of the net as given, on the net that moves.
    fn by_node(&self, nodal: Vec<Vector3<f64>>) -> Vec<Vector3<f64>> {
        match &self.division {
            Some(division) => division.by_node(&nodal),
            None => nodal,
        }
    }

    /// Segments of the net that moves, for some of the net as given.
    fn pieces(&self, segments: &[SegmentId]) -> Vec<SegmentId> {
        match &self.division {
            Some(division) => (segments.iter())
                .flat_map(|segment| division.pieces(*segment).map(SegmentId::new))
                .collect(),
            None => segments.to_vec(),
        }
    }
}

impl Plan {
    /// Makes a motion ready: finds the state that it starts from, with the same bits as the case has; divides hanging ropes
    /// and brings the net to balance anew; finds what peaks are compared with. Nothing moves yet.
    ///
    /// Water that gathers on skins in the state at the start stays on the nodes as a load, without mass.
    ///
    /// # Errors
    /// [`MotionNotBegun`], in the client's ids.
    pub fn motion(
        &self,
        reference: &ReferenceOutcome,
        index: usize,
        observe: &mut dyn FnMut(&IterationReport) -> ControlFlow<()>,
    ) -> Result<MotionBegun, MotionNotBegun> {
        let brief = self.brief();
        let given = &brief.motions[index];
        self.refuse_sliding()?;
        let found = self.state_of(reference, given.from, observe)?;
        self.refuse_breaks(given, &found.case)?;
        let stage = self.stage(given, &found, observe)?;
        let names = Names {
            brief,
            division: stage.division.as_deref(),
        };
        let refuse = |error: &MotionError| names.refusal(index, error);

        let mut positions = match given.start.shape_of {
            Some(case) if Some(case) != given.from => {
                let shape = self.state_of(reference, Some(case), observe)?;
                match &stage.division {
                    Some(division) => division.positions(&shape.case, &shape.positions),
                    None => shape.positions,
                }
            }
            _ => stage.positions.clone(),
        };
        let moved = stage.by_node(self.nodal_sum(&given.start.moved));
        positions
            .iter_mut()
            .zip(&moved)
            .for_each(|(position, by)| *position += by);
        let velocities = match given.start.velocities.is_empty() {
            true => Vec::new(),
            false => stage.by_node(self.nodal_sum(&given.start.velocities)),
        };
        let moving = stage.division.as_ref().map_or_else(
            || reference.state.clone(),
            |division| division.reference(&reference.case, &reference.state),
        );
        let mut motion = Motion {
            reference: Arc::new(moving),
            positions,
            velocities,
            masses: match &stage.division {
                Some(division) => division.masses(&given.masses),
                None => given.masses.clone(),
            },
            driven: self.driven(reference, given, &stage),
            breaks: (given.breaks.iter())
                .map(|given| Break {
                    segments: stage.pieces(&given.segments),
                    when: given.when,
                    release: given.release,
                })
                .collect(),
            damping: damping(given, &stage),
            scheme: given.scheme,
            duration: given.duration,
            step: given.step,
            frames: Frames {
                stride: given.frames.stride,
                nodes: given.frames.nodes.clone(),
                cables: given.frames.cables.clone(),
            },
            watched: given.watched.iter().map(|watched| turned(watched, &stage)).collect(),
            spectra: given.spectra,
            settled: None,
            case: stage.case.clone(),
        };
        let masses = self.masses(&stage, &motion);
        let shared = Arc::new(motion);
        let told = outlook(&stage.analysis, &shared).map_err(|error| match error {
            MotionError::NoMass { .. } => {
                let dofs = stage.analysis.structure().dofs();
                let can_move = (0..dofs.len()).map(|dof| dofs.node(dof));
                let mut bare: Vec<_> = can_move.filter(|node| masses[node.index()] <= 0.0).collect();
                bare.dedup();
                names.no_mass(bare.into_iter())
            }
            other => refuse(&other),
        })?;
        motion = Arc::unwrap_or_clone(shared);
        let (settled, compared) = self.compared(reference, given, &stage, &motion, observe)?;
        motion.settled.clone_from(&settled);

        let dofs = stage.analysis.structure().dofs();
        let free = (0..masses.len()).filter(|node| !dofs.directions(crate::model::NodeId::new(*node)).is_empty());
        let moving_mass = free.map(|node| masses[node]).sum();
        let motion = Arc::new(motion);
        let running = Running::begin(Arc::new(stage.analysis.clone()), Arc::clone(&motion));
        Ok(MotionBegun {
            running: running.map_err(|error| refuse(&error))?,
            outlook: told,
            moving_mass,
            compared,
            divided: stage.divided,
            whole: Whole {
                net: Arc::clone(&brief.net),
                division: stage.division,
                motion,
            },
        })
    }

    fn refuse_sliding(&self) -> Result<(), MotionNotBegun> {
        let net = &self.brief().net;
        let sliding = net.reaches().iter().filter(|reach| reach.slides());
        let mut cables: Vec<String> = sliding
            .map(|reach| net.cables()[reach.cable.index()].name.clone())
            .collect();
        cables.dedup();
        if cables.is_empty() {
            Ok(())
        } else {
            Err(MotionNotBegun::Slides { cables })
        }
    }

    fn refuse_breaks(&self, given: &MotionGiven, case: &Case) -> Result<(), MotionNotBegun> {
        let gone = (given.breaks.iter())
            .flat_map(|given| &given.segments)
            .find(|segment| case.removed[segment.index()]);
        match gone {
            Some(segment) => Err(MotionNotBegun::NotThere {
                member: self.brief().net.member_name(*segment).to_owned(),
            }),
            None => Ok(()),
        }
    }

    /// A state with an answer; `None`: the reference state.
    fn state_of(
        &self,
        reference: &ReferenceOutcome,
        state: Option<usize>,
        observe: Watch<'_>,
    ) -> Result<Found, MotionNotBegun> {
        let no_state = |cause: Option<crate::brief::Cause>| MotionNotBegun::NoState {
            state,
            name: state.map_or_else(String::new, |case| self.brief().cases[case].name.clone()),
            cause: cause.map(Box::new),
        };
        let Some(case) = state else {
            if !reference.result.audit.passed {
                return Err(no_state(None));
            }
            return Ok(Found {
                case: reference.case.clone(),
                positions: reference.state.positions.clone(),
                axial_forces: reference.state.axial_forces.clone(),
                pulls: reference.result.pulls.clone(),
            });
        };
        let (outcome, carried) = self.answer(reference, case, false, observe);
        let is_answered = outcome.is_answered();
        match outcome {
            CaseOutcome::State { solution, .. } if solution.termination == Termination::Cancelled => {
                Err(MotionNotBegun::Cancelled)
            }
            CaseOutcome::State { result, .. } if is_answered && result.audit.passed => Ok(Found {
                case: carried,
                positions: result.positions,
                axial_forces: result.axial_forces,
                pulls: result.pulls,
            }),
            CaseOutcome::State { cause, .. } => Err(no_state(cause)),
            CaseOutcome::None { cause, .. } => Err(no_state(Some(cause))),
        }
    }

    /// Divides hanging ropes of a state and brings it to balance anew; nothing is done where nothing hangs.
    fn stage(&self, given: &MotionGiven, found: &Found, observe: Watch<'_>) -> Result<Stage, MotionNotBegun> {
        let Brief { net, settings, .. } = self.brief();
        let Some(division) = Division::new(net, &found.case.removed, given.pieces_of_hanging) else {
            return Ok(Stage {
                analysis: self.analysis().clone(),
                division: None,
                case: found.case.clone(),
                positions: found.positions.clone(),
                divided: None,
            });
        };
        let analysis = Analysis::new(Arc::clone(division.net()));
        let case = division.case(&found.case);
        let start = division.positions(&found.case, &found.positions);
        let solved = at_rest(&analysis, &case, &start, settings, observe);
        let solution = solved.map_err(|not| match not {
            NotAtRest::Cancelled => MotionNotBegun::Cancelled,
            not => {
                let mut cables: Vec<String> = (net.cables().iter())
                    .filter(|cable| cable.segments.clone().any(|e| net.segments()[e].hangs))
                    .map(|cable| cable.name.clone())
                    .collect();
                cables.dedup();
                MotionNotBegun::NotDivided {
                    cables,
                    pieces: given.pieces_of_hanging,
                    why: not.in_words().to_owned(),
                }
            }
        })?;
        let moved = found.positions.iter().zip(&solution.positions);
        let divided = Divided {
            segments: division.n_divided(),
            moved: moved.map(|(before, after)| (after - before).norm()).fold(0.0, f64::max),
            tension: tension_by_division(&division, found, &case, &solution),
        };
        Ok(Stage {
            analysis,
            division: Some(Arc::new(division)),
            case,
            positions: solution.positions,
            divided: Some(divided),
        })
    }

    /// One vector a node, those of a node named twice summed up.
    fn nodal_sum(&self, given: &[(crate::model::NodeId, Vector3<f64>)]) -> Vec<Vector3<f64>> {
        let mut nodal = vec![Vector3::zeros(); self.brief().net.nodes().len()];
        for (node, vector) in given {
            nodal[node.index()] += vector;
        }
        nodal
    }

    fn driven(&self, reference: &ReferenceOutcome, given: &MotionGiven, stage: &Stage) -> Vec<Driven> {
        let Brief {
            net, actions, cases, ..
        } = self.brief();
        // What the state lacks bears no driven load.
        let removed: &[Member] = given.from.map_or(&[], |case| &cases[case].removed);
        let driven = given.driven.iter().map(|driven| match &driven.what {
            DrivenWhat::Action(action) => {
                let mut case = Case::changed(net, &reference.state, actions, &[(*action, 1.0)], removed, 0.0);
                case.removed.fill(false);
                Driven::Case {
                    case: Box::new(stage.turned(case)),
                    history: driven.history.clone(),
                }
            }
            DrivenWhat::Wind {
                coefficients,
                density,
                along,
            } => Driven::Wind {
                coefficients: coefficients.clone(),
                density: *density,
                along: *along,
                speed: driven.history.clone(),
            },
        });
        driven.collect()
    }

    /// Mass of every node of the net that moves (kg), air left out.
    fn masses(&self, stage: &Stage, motion: &Motion) -> Vec<f64> {
        let structure = stage.analysis.structure();
        let lying: Vec<f64> = (structure.net().segments().iter())
            .map(|segment| motion.case.unstressed_lengths[segment.length])
            .collect();
        let about = About {
            case: &motion.case,
            positions: &motion.positions,
            reference: &motion.reference.positions,
            axial_forces: &[],
            lying: &lying,
        };
        let without_air = crate::motion::MassGiven {
            air: 0.0,
            ..motion.masses.clone()
        };
        nodal_masses(structure, &without_air, &about)
    }

    /// What peaks are compared with.
    fn compared(
        &self,
        reference: &ReferenceOutcome,
        given: &MotionGiven,
        stage: &Stage,
        motion: &Motion,
        observe: Watch<'_>,
    ) -> Result<(Option<Settled>, Compared), MotionNotBegun> {
        if let Some(case) = given.compare_with {
            return match self.state_of(reference, Some(case), observe) {
                Ok(found) => {
                    let settled = match &stage.division {
                        Some(division) => Settled {
                            positions: division.positions(&found.case, &found.positions),
                            axial_forces: division.by_piece(&found.axial_forces),
                        },
                        None => Settled {
                            positions: found.positions,
                            axial_forces: found.axial_forces,
                        },
                    };
                    Ok((Some(settled), Compared::Case(case)))
                }
                Err(MotionNotBegun::Cancelled) => Err(MotionNotBegun::Cancelled),
                Err(why) => Ok((None, Compared::Nothing { why: why.to_string() })),
            };
        }
        let net = stage.analysis.structure().net();
        let mut case = settled_case(net, motion);
        // Points of a hanging rope that is gone have nothing to hold them, and do not matter.
        let mut is_held = vec![false; net.nodes().len()];
        for (segment, removed) in net.segments().iter().zip(&case.removed) {
            segment.ends.iter().for_each(|end| is_held[end.index()] |= !removed);
        }
        for force in (self.brief().net.nodes().len()..is_held.len()).filter(|point| !is_held[*point]) {
            case.nodal_forces[force] = Vector3::zeros();
        }
        let settings = &self.brief().settings;
        match at_rest(&stage.analysis, &case, &stage.positions, settings, observe) {
            Ok(solution) => {
                let settled = Settled {
                    positions: solution.positions,
                    axial_forces: solution.axial_forces,
                };
                Ok((Some(settled), Compared::Settled))
            }
            Err(NotAtRest::Cancelled) => Err(MotionNotBegun::Cancelled),
            Err(not) => {
                let cause = match stage.division {
                    None => self.cause(reference, &case, &not),
                    Some(_) => None,
                };
                let why = cause.map_or_else(|| not.in_words().to_owned(), |cause| cause.to_string());
                let why = format!("what acts at the end has no answer at rest: {why}");
                Ok((None, Compared::Nothing { why }))
            }
        }
    }

    /// Why the net as given is not at rest under `case`.
    fn cause(&self, reference: &ReferenceOutcome, case: &Case, not: &NotAtRest) -> Option<crate::brief::Cause> {
        let Brief { net, settings, .. } = self.brief();
        match not {
            NotAtRest::None(error) => Some(cause_of_error(net, case, &reference.state.positions, error)),
            NotAtRest::Stopped(solution) => {
                let bare = Bare {
                    positions: &solution.positions,
                    axial_forces: &solution.axial_forces,
                    members: &solution.members,
                    loose_nodes: &solution.loose_nodes,
                };
                let carried = case.scaled(&reference.state.unstressed_lengths, solution.load_factor);
                let result = state_result(net, &carried, &reference.state.positions, &bare);
                Some(cause_of_stop(
                    net,
                    &Stop {
                        reference: &reference.state,
                        case,
                        solution,
                        result: &result,
                        limit: settings.max_iterations,
                    },
                ))
            }
            NotAtRest::Cancelled | NotAtRest::NotConfirmed => None,
        }
    }
}

/// Why there is no state at rest.
enum NotAtRest {
    Cancelled,
    None(SolveError),
    Stopped(Box<Solution>),
    NotConfirmed,
}

impl NotAtRest {
    fn in_words(&self) -> &'static str {
        match self {
            Self::Cancelled => "stopped on request",
            Self::None(SolveError::Loading(_)) => "its numbers are beyond use",
            Self::None(SolveError::NotHeld { .. }) => "nothing holds a part of it along its load",
            Self::None(SolveError::FreeMovement { .. }) => "it can move freely",
            Self::Stopped(solution) if solution.termination == Termination::IterationLimit => {
                "the allowed iterations were used up"
            }
            Self::Stopped(solution) if solution.termination == Termination::RunsAway => "it ran away from its place",
            Self::Stopped(_) => "no more headway was made",
            Self::NotConfirmed => "an independent routine does not confirm its state",
        }
    }
}

/// The state of plain bars under a case, confirmed by the audit.
fn at_rest(
    analysis: &Analysis,
    case: &Case,
    start: &[Vector3<f64>],
    settings: &Settings,
    observe: Watch<'_>,
) -> Result<Solution, NotAtRest> {
    let settings = Settings {
        load_steps: LoadSteps::FullFirst,
        ..*settings
    };
    let solution = solve(analysis, case, start, &case.unstressed_lengths, &settings, observe);
    let solution = solution.map_err(NotAtRest::None)?;
    match solution.termination {
        Termination::Converged => {}
        Termination::Cancelled => return Err(NotAtRest::Cancelled),
        _ => return Err(NotAtRest::Stopped(Box::new(solution))),
    }
    let net = analysis.structure().net();
    if audit::audit(net, case, &solution.positions, &solution.axial_forces).passed {
        Ok(solution)
    } else {
        Err(NotAtRest::NotConfirmed)
    }
}

/// Largest difference of a tension at a node of the net as given (N).
fn tension_by_division(division: &Division, found: &Found, case: &Case, solution: &Solution) -> f64 {
    let net = division.net();
    let whole = division.whole();
    let mut largest: f64 = 0.0;
    for (index, segment) in whole.segments().iter().enumerate() {
        let pieces = division.pieces(SegmentId::new(index));
        // Half of the load of a piece stands at the node.
        let length = case.unstressed_lengths[net.segments()[pieces.start].length];
        let half = found.case.segments[index].per_length * (0.5 * length);
        for (end, piece) in [pieces.start, pieces.end - 1].into_iter().enumerate() {
            let (before, after) = (found.pulls[index][end], solution.members.pulls[piece][end]);
            let after = if segment.hangs { after + half } else { after };
            largest = largest.max((after.norm() - before.norm()).abs());
        }
    }
    largest
}

fn damping(given: &MotionGiven, stage: &Stage) -> Damping {
    let segments = stage.analysis.structure().net().segments();
    let given = &given.damping;
    let mut dashpots = Vec::new();
    if !given.segments.is_empty() {
        dashpots = vec![0.0; segments.len()];
    }
    for (segment, force) in &given.segments {
        for piece in stage.pieces(&[*segment]) {
            let length = stage.case.unstressed_lengths[segments[piece.index()].length];
            dashpots[piece.index()] += force / length;
        }
    }
    Damping {
        mass: given.mass,
        stiffness: given.stiffness,
        segments: dashpots,
    }
}

/// A watched quantity on the net that moves: of a divided segment the largest of its pieces.
fn turned(watched: &Watched, stage: &Stage) -> Watched {
    match watched {
        Watched::AxialForce { segment } => match stage.pieces(&[*segment]).as_slice() {
            [one] => Watched::AxialForce { segment: *one },
            several => Watched::LargestForce {
                segments: several.to_vec(),
            },
        },
        Watched::LargestForce { segments } => Watched::LargestForce {
            segments: stage.pieces(segments),
        },
        other => other.clone(),
    }
}
