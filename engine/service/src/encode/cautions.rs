//! Cautions that every client must show.

use ropewalk_numerics::brief::Caution;

/// Cautions that hold for every result.
#[must_use]
pub fn cautions() -> Vec<String> {
    [
        "This result is an aid. The local code with its national annex and a licensed engineer decide.",
        "The checks are simple limits set in the brief; they apply no edition of a standard. State beside them which code and \
         edition the limits follow.",
        "Rope data (stiffness, mass, breaking force) must come from the supplier's certificate or tests; values from tables \
         are first estimates.",
        "Nonlinear results must not be added or scaled: every combination is a case of its own from the same unstressed \
         lengths.",
        "Not covered: fatigue, wind and vibration, fire, corrosion, terminations, foundations, glass and cladding, seismic \
         action.",
    ]
    .map(str::to_owned)
    .to_vec()
}

/// Cautions of a run: those of every result, then its own.
pub(super) fn of_run(own: &[Caution]) -> Vec<String> {
    let own = own.iter().map(|caution| clipped(&caution.to_string()));
    cautions().into_iter().chain(own).collect()
}

fn clipped(text: &str) -> String {
    /// Characters of one caution; lists of ids may be long.
    const LONGEST: usize = 2000;
    if text.chars().count() <= LONGEST {
        return text.to_owned();
    }
    let head: String = text.chars().take(LONGEST).collect();
    format!("{head} ...")
}
