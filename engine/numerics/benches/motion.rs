//! Time of a motion of a large net, printed as one line of JSON for each size and scheme.
//!
//! ```text
//! cargo bench -p ropewalk-numerics --bench motion -- 30 60        sizes n: n × n free nodes
//! ```
//! The net of the bench `newton` with 40 kg/m², hit at once by a share of its snow: 1000 steps of 10 ms. One thread.
#![allow(clippy::print_stdout, reason = "printing is what it is for")]
#![allow(clippy::disallowed_types, reason = "a bench reads the clock")]

mod saddle;

use std::ops::ControlFlow;
use std::sync::Arc;
use std::time::Instant;

use nalgebra::Vector3;
use ropewalk_numerics::equilibrium::Analysis;
use ropewalk_numerics::load::Case;
use ropewalk_numerics::model::{Net, NodeId, ReferenceState};
use ropewalk_numerics::motion::MassGiven;
use ropewalk_numerics::motion::transient::{Damping, Driven, Ending, Frames, History, Motion, Scheme, run};
use saddle::{SPAN, case, processor_seconds, rim_net, shape};

const MASS: f64 = 40.0;
const STEP: f64 = 0.01;
const STEPS: f64 = 1000.0;
/// Share of the snow: with a fifth all ropes stay taut, with all of it they snatch.
const SHARES: [f64; 2] = [0.2, 1.0];

fn follow(n: usize, scheme: Scheme, share: f64) {
    let net = Arc::new(Net::new(rim_net(n)).expect("a valid net"));
    let analysis = Arc::new(Analysis::new(Arc::clone(&net)));
    let positions = shape(&analysis);
    let snow = case(&net, &positions, n);
    let rest = Case {
        nodal_forces: vec![Vector3::zeros(); positions.len()],
        ..snow.clone()
    };
    let h = SPAN / (n + 1) as f64;
    let free = (0..positions.len())
        .map(NodeId::new)
        .filter(|node| net.support_of(*node).is_none());
    let motion = Motion {
        reference: Arc::new(ReferenceState {
            positions: positions.clone(),
            unstressed_lengths: snow.unstressed_lengths.clone(),
            axial_forces: vec![0.0; net.segments().len()],
        }),
        positions,
        velocities: Vec::new(),
        masses: MassGiven {
            nodes: free.map(|node| (node, MASS * h * h)).collect(),
            ..MassGiven::default()
        },
        case: rest,
        driven: vec![Driven::Case {
            case: Box::new(snow),
            history: History::Step {
                at: 0.0,
                before: 0.0,
                after: share,
            },
        }],
        breaks: Vec::new(),
        damping: Damping::default(),
        scheme,
        duration: STEPS * STEP,
        step: STEP,
        frames: Frames::default(),
        watched: Vec::new(),
        spectra: None,
        settled: None,
    };
    let motion = Arc::new(motion);
    let (start, before) = (Instant::now(), processor_seconds());
    let outcome = run(&analysis, &motion, &mut |_| ControlFlow::Continue(())).expect("a motion");
    let (wall, processor) = (start.elapsed().as_secs_f64(), processor_seconds() - before);
    assert_eq!(outcome.ending, Ending::Done);
    println!(
        "{{\"n\": {n}, \"dof\": {}, \"scheme\": \"{}\", \"snow\": {share}, \"steps\": {}, \"iterations\": {}, \
         \"factorisations\": {}, \"snatches\": {}, \"energy_error\": {:.1e}, \"seconds\": {{\"wall\": {wall:.3}, \
         \"cpu\": {processor:.2}}}}}",
        analysis.structure().n_dofs(),
        match scheme {
            Scheme::Conserving { .. } => "conserving",
            _ => "generalised-alpha",
        },
        outcome.steps,
        outcome.iterations,
        outcome.factorisations,
        outcome.events.snatches,
        outcome.largest_error / outcome.largest_kinetic,
    );
}

fn main() {
    let sizes: Vec<usize> = std::env::args().filter_map(|a| a.parse().ok()).collect();
    let averaged = Scheme::GeneralisedAlpha {
        spectral_radius: 0.8,
        error: None,
    };
    for n in if sizes.is_empty() { vec![10, 30] } else { sizes } {
        for scheme in [averaged, Scheme::Conserving { error: None }] {
            SHARES.iter().for_each(|share| follow(n, scheme, *share));
        }
    }
}
