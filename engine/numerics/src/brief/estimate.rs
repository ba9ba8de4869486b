//! What a brief will cost, before it is run.

use super::Brief;
use crate::equilibrium::Analysis;

/// Factorisations that a case takes, as a rule: 5 to 20.
const FACTORISATIONS_PER_CASE: f64 = 12.0;
/// Floating-point operations a second in a factorisation on one thread, from measurements on a common server.
const FACTOR_RATE: f64 = 12e9;
/// Seconds a stored entry of the factor takes in two substitutions, bound by memory.
const SOLVE_SECONDS_PER_ENTRY: f64 = 3e-9;
/// Factorisations that natural modes of a state take: shifts, counts.
const FACTORISATIONS_OF_MODES: f64 = 6.0;
/// Seconds a segment takes to assemble.
const ASSEMBLY_SECONDS_PER_SEGMENT: f64 = 1e-7;

/// Size of the work, roughly.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Estimate {
    /// Free directions.
    pub unknowns: usize,
    /// Cases, and the reference state.
    pub states: usize,
    /// Stored entries of the factor.
    pub factor_entries: usize,
    /// Floating-point operations of one factorisation.
    pub factor_operations: f64,
    /// Seconds on one thread; right within a factor of three or so.
    pub seconds: f64,
    /// Bytes of full results of all states.
    pub result_bytes: u64,
}

impl Estimate {
    pub(super) fn new(brief: &Brief, analysis: &Analysis) -> Self {
        let net = &brief.net;
        let unknowns = analysis.structure().n_dofs();
        let factor_entries = analysis.symbolic().n_factor_entries();
        let (n, entries) = (unknowns.max(1) as f64, factor_entries as f64);
        // Columns of equal length would need entries² / n; those of nets are longest at the end, hence the larger factor.
        let factor_operations = 4.0 * entries * entries / n;
        let iteration = factor_operations / FACTOR_RATE
            + entries * SOLVE_SECONDS_PER_ENTRY
            + net.segments().len() as f64 * ASSEMBLY_SECONDS_PER_SEGMENT;
        let states = brief.cases.len() + 1;
        let supported = net.supports().len() + net.elastic_supports().iter().map(|e| e.nodes().len()).sum::<usize>();
        let on_paths: u32 = brief
            .cases
            .iter()
            .filter_map(|case| case.path)
            .map(|path| path.steps + 1)
            .sum();
        // Positions and displacements; four numbers and a flag a segment; unstressed lengths; support forces; two a panel.
        let numbers =
            6 * net.nodes().len() + 4 * net.segments().len() + net.n_lengths() + 9 * supported + 2 * net.panels().len();
        let (mut of_modes, mut shapes) = (0.0, 0);
        if let Some(modes) = &brief.modes {
            let states = modes.cases.len() + usize::from(modes.reference);
            let vectors = 3.0 * modes.count as f64 + 40.0;
            let steps = vectors * (entries * SOLVE_SECONDS_PER_ENTRY + vectors * n * 4e-9);
            of_modes = states as f64 * (FACTORISATIONS_OF_MODES * factor_operations / FACTOR_RATE + steps);
            shapes = states * modes.count * 24 * net.nodes().len();
        }
        Self {
            unknowns,
            states,
            factor_entries,
            factor_operations,
            seconds: of_modes + iteration * FACTORISATIONS_PER_CASE * (states as f64 + f64::from(on_paths)),
            result_bytes: (states * (8 * numbers + net.segments().len()) + shapes) as u64,
        }
    }
}
