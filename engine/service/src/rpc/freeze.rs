//! A freeze: the brief is read, its reference state found, and written into the brief.

use std::sync::Arc;

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::Task;

use super::Work;
use super::desk::{Clock, ProgressDesk};
use super::run::{break_on_purpose, prepare};
use super::stream::Outbox;
use crate::config::Fault;
use crate::encode;
use crate::status::Refusal;

/// Answers `request` into `outbox`.
pub(super) async fn freeze(
    work: Work,
    request: v1::FreezeRequest,
    outbox: Outbox<v1::FreezeResponse>,
) -> Result<(), Refusal> {
    let (prepared, ()) = prepare(&work, request.brief.unwrap_or_default(), |prepared, _| {
        prepared
            .work
            .refuse_to_freeze()
            .map_or(Ok(()), |finding| Err(Refusal::BriefHasErrors(vec![finding])))
    })
    .await?;
    tracing::info!(digest = prepared.work.digest, "freeze");
    let desk = Arc::new(ProgressDesk::new(0));
    let breaks = work.fault(&Fault::PanicInReference);
    let (place, stop, reports) = (Arc::clone(&work.place), work.stop.clone(), Arc::clone(&desk));
    let mut pending = work.shared.pool.start(move || {
        let _place = place;
        break_on_purpose(breaks);
        let observe = &mut |report: &_| reports.observe(&prepared, Task::Reference, report, &stop);
        let found = Clock::default().time(|| prepared.plan.reference(observe));
        encode::freeze(&prepared.work, &prepared.plan, &found)
    });
    let answer = desk.relay(&mut pending, &outbox, progress).await;
    let parts = answer.map_err(|panicked| work.internal(panicked))?;
    outbox.send(parts.map_err(Refusal::NoReferenceState)?).await
}

fn progress(progress: v1::Progress) -> v1::FreezeResponse {
    v1::FreezeResponse {
        part: Some(v1::freeze_response::Part::Progress(progress)),
    }
}
