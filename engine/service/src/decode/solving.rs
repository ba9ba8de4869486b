//! How states are solved for.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::equilibrium::{LoadSteps, Settings};

use super::findings::{Findings, Path};
use super::numbers::{ITERATIONS, LOAD_STEPS, Of, TOLERANCE};
use super::resolved::Resolved;

pub(crate) fn read(solving: Option<&v1::Solving>, findings: &mut Findings, resolved: &mut Resolved) -> Settings {
    let mut settings = Settings::default();
    let of = Of::new("solving", "");
    let at = Path::root("solving");
    match solving.and_then(|solving| solving.load_steps) {
        Some(steps) => {
            if findings
                .number(&at.field("load_steps"), of, &LOAD_STEPS, f64::from(steps))
                .is_some()
            {
                settings.load_steps = LoadSteps::Equal(steps);
            }
        }
        None => resolved.left_out(&at.field("load_steps"), "the full load first"),
    }
    match solving.and_then(|solving| solving.tolerance) {
        Some(tolerance) => {
            if let Some(tolerance) = findings.number(&at.field("tolerance"), of, &TOLERANCE, tolerance) {
                settings.tolerance = tolerance;
            }
        }
        None => resolved.left_out(&at.field("tolerance"), format!("{:e}", settings.tolerance)),
    }
    match solving.and_then(|solving| solving.max_iterations) {
        Some(iterations) => {
            let field = at.field("max_iterations");
            if findings
                .number(&field, of, &ITERATIONS, f64::from(iterations))
                .is_some()
            {
                settings.max_iterations = iterations;
            }
        }
        None => resolved.left_out(&at.field("max_iterations"), settings.max_iterations),
    }
    // The encoder reads it from the message: it changes what is told, not what is found.
    if solving.and_then(|solving| solving.energies).is_none() {
        resolved.left_out(&at.field("energies"), false);
    }
    settings
}
