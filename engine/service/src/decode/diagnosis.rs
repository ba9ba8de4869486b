//! What states are to be looked into.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::DiagnosisGiven;

use super::cases::Cases;
use super::findings::{Findings, Path};
use super::numbers::{MODES_OF_STIFFNESS, Of};
use super::resolved::Resolved;

pub(crate) fn read(
    diagnosis: Option<&v1::Diagnosis>,
    cases: &Cases<'_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Option<DiagnosisGiven> {
    let diagnosis = diagnosis?;
    let at = Path::root("diagnosis");
    let about = at.field("about");
    let states = cases.states(&diagnosis.about, &about, findings);
    if diagnosis.about.is_empty() {
        resolved.left_out(&about, "the reference state and all cases");
    }
    let default = DiagnosisGiven::default().stiffnesses;
    let field = at.field("modes_of_stiffness");
    let stiffnesses = match diagnosis.modes_of_stiffness {
        Some(count) => {
            let of = Of::new("diagnosis", "");
            findings.number(&field, of, &MODES_OF_STIFFNESS, f64::from(count))?;
            usize::try_from(count).ok()?
        }
        None => {
            resolved.left_out(&field, default);
            default
        }
    };
    let (reference, cases) = states?;
    Some(DiagnosisGiven {
        reference,
        cases,
        stiffnesses,
    })
}
