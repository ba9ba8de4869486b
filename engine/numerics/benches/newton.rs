//! Time of a full Newton solve of a large net, printed as one line of JSON for each size.
//!
//! ```text
//! cargo bench -p ropewalk-numerics --bench newton -- 32 100        sizes n: n × n free nodes
//! ```
//! The net: a square of 60 m, rim on the saddle z = 6 (x² − y²) / 30², shape of equal force densities, ropes of
//! 20 MN a metre of width prestressed with 25 kN a metre, snow of 0.9 kN/m² on one half and half of that on the other,
//! in four equal steps, each to a residual of 1e−8 of the largest nodal load. One thread. Forces here are in N.
#![allow(clippy::print_stdout, reason = "printing is what it is for")]
#![allow(clippy::disallowed_types, reason = "a bench reads the clock")]

mod saddle;

use std::ops::ControlFlow;
use std::sync::Arc;
use std::time::Instant;

use nalgebra::{Matrix3, Vector3};
use ropewalk_numerics::assembly::{Loading, Response, Structure};
use ropewalk_numerics::equilibrium::{Analysis, LoadSteps, Settings, Termination, Yardstick, certificate, solve};
use ropewalk_numerics::model::Net;
use saddle::{case, processor_seconds, rim_net, shape};

const REPEATS: usize = 5;

fn median(mut times: Vec<f64>) -> f64 {
    times.sort_by(f64::total_cmp);
    times[times.len() / 2]
}

fn timed(mut work: impl FnMut()) -> f64 {
    median(
        (0..REPEATS)
            .map(|_| {
                let start = Instant::now();
                work();
                start.elapsed().as_secs_f64()
            })
            .collect(),
    )
}

fn run(n: usize, load_steps: LoadSteps) {
    let net = Arc::new(Net::new(rim_net(n)).expect("a valid net"));
    let setup = timed(|| drop(Analysis::new(Arc::clone(&net))));
    let analysis = Analysis::new(Arc::clone(&net));
    let positions = shape(&analysis);
    let case = case(&net, &positions, n);
    let settings = Settings {
        load_steps,
        tolerance: 1e-8,
        yardstick: Yardstick::Load,
        ..Settings::default()
    };
    let mut watch = |_: &_| ControlFlow::Continue(());
    let mut solved = || {
        solve(
            &analysis,
            &case,
            &positions,
            &case.unstressed_lengths,
            &settings,
            &mut watch,
        )
    };
    let before = processor_seconds();
    let wall = timed(|| drop(solved()));
    let processor = (processor_seconds() - before) / REPEATS as f64;
    let solution = solved().expect("a held net");
    assert_eq!(solution.termination, Termination::Converged);

    let structure = analysis.structure();
    let loading = Loading::new(structure, &case, &case.unstressed_lengths, 1.0).expect("a fitting case");
    let mut response = Response::new(structure);
    let mut values = vec![0.0; structure.pattern().n_entries()];
    let mut blocks = vec![Matrix3::zeros(); net.segments().len()];
    let assembly = timed(|| assemble(structure, &loading, &positions, &mut response, &mut blocks, &mut values));
    let mut factor = analysis.new_factor();
    let factorise = timed(|| factor.cholesky(&values).expect("a held net"));
    let mut step = response.residual.clone();
    let solving = timed(|| factor.solve_in_place(&mut step));

    let at = certificate::State {
        positions: &solution.positions,
        axial_forces: &solution.axial_forces,
        members: &solution.members,
    };
    let certify = || certificate::certificate(&analysis, &case, &at).expect("a fitting case");
    let certifying = timed(|| drop(certify()));
    let proven = certify().map_or(f64::NAN, |c| c.largest_force_bound());

    let moved = |(x, start): (&Vector3<f64>, &Vector3<f64>)| (x - start).amax();
    let largest = solution.positions.iter().zip(&positions).map(moved).fold(0.0, f64::max);
    let slack = solution.axial_forces.iter().filter(|t| **t == 0.0).count();
    let steps = solution.history.last().map_or(0, |r| r.load_step);
    let iterations: Vec<usize> = (1..=steps)
        .map(|s| solution.history.iter().filter(|r| r.load_step == s).count() - 1)
        .collect();
    println!(
        "{{\"n\": {n}, \"dof\": {}, \"iterations\": {iterations:?}, \"factorisations\": {}, \"umax\": {largest:.17}, \
         \"slack\": {slack}, \"forces_within\": {proven:.1e}, \"seconds\": {{\"analysis\": {setup:.5}, \"one_assembly\": {assembly:.5}, \
         \"one_factorisation\": {factorise:.5}, \"one_solve\": {solving:.5}, \"certificate\": {certifying:.5}, \"wall\": {wall:.5}, \
         \"cpu\": {processor:.3}}}}}",
        structure.n_dofs(),
        solution.factorisations,
    );
}

fn assemble(
    structure: &Structure,
    loading: &Loading,
    positions: &[Vector3<f64>],
    response: &mut Response,
    blocks: &mut [Matrix3<f64>],
    values: &mut [f64],
) {
    structure.response_into(loading, positions, response);
    for ((block, bar), chord) in blocks.iter_mut().zip(&loading.bars).zip(&response.chords) {
        *block = bar.stiffness_block(chord);
    }
    structure.tangent_into(blocks, values);
}

fn main() {
    let sizes: Vec<usize> = std::env::args().filter_map(|a| a.parse().ok()).collect();
    for n in if sizes.is_empty() { vec![10, 32, 100] } else { sizes } {
        run(n, LoadSteps::Equal(4));
        run(n, LoadSteps::FullFirst);
    }
}
