//! What reading a brief told.

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::Plan;

use super::closing::Counts;
use super::head::sizes;
use super::parts::{count, split};
use crate::decode::Reading;

/// The report, in parts: findings, values, cases, totals.
#[must_use]
pub fn check_report(reading: Reading) -> Vec<v1::CheckResponse> {
    let mut counts = Counts::default();
    reading.findings.iter().for_each(|finding| counts.add(finding));
    let n_cases = reading.cases.len();
    let mut totals = v1::CheckTotals {
        findings: counts.messages(),
        digest: reading.digest,
        cases: count(n_cases),
        ..v1::CheckTotals::default()
    };
    if let Some(work) = reading.work {
        let plan = Plan::new(work.brief);
        let estimate = plan.estimate();
        totals.seconds = estimate.seconds;
        totals.bytes = estimate.result_bytes;
        totals.motions = count(estimate.motions);
        totals.motion_steps = estimate.motion_steps;
        totals.sizes = Some(sizes(&plan, n_cases));
    }
    let findings = split(reading.findings).into_iter().map(|findings| v1::CheckResponse {
        findings,
        ..v1::CheckResponse::default()
    });
    let resolved = split(reading.resolved).into_iter().map(|resolved| v1::CheckResponse {
        resolved,
        ..v1::CheckResponse::default()
    });
    let cases = split(reading.cases).into_iter().map(|cases| v1::CheckResponse {
        cases,
        ..v1::CheckResponse::default()
    });
    let last = v1::CheckResponse {
        totals: Some(totals),
        ..v1::CheckResponse::default()
    };
    findings.chain(resolved).chain(cases).chain([last]).collect()
}
