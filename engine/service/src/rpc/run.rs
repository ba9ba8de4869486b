//! A run: the brief is read, its reference state found, its cases solved in brief order.

use std::collections::VecDeque;
use std::sync::Arc;

use ropewalk_api::ropewalk::v1;
use ropewalk_numerics::brief::{Plan, ReferenceOutcome, Task};
use v1::run_response::Event;

use super::Work;
use super::desk::{Clock, ProgressDesk};
use super::stream::Outbox;
use crate::config::Fault;
use crate::pool::{Panicked, Pending};
use crate::status::Refusal;
use crate::{decode, encode};

/// A brief that has been read and planned.
pub(super) struct Prepared {
    pub(super) work: decode::Work,
    pub(super) plan: Plan,
}

/// Answers `request` into `outbox`.
pub(super) async fn run(work: Work, request: v1::RunRequest, outbox: Outbox<v1::RunResponse>) -> Result<(), Refusal> {
    let clock = Arc::new(Clock::default());
    let only = request.only;
    let begin = move |prepared: &Prepared, findings| {
        let selected = (prepared.work.select(&only)).map_err(|finding| Refusal::BriefHasErrors(vec![finding]))?;
        Ok((head(prepared, &selected.cases, findings), selected))
    };
    let (prepared, (head, selected)) = prepare(&work, request.brief.unwrap_or_default(), begin).await?;
    let decode::Selected { cases, motions } = &selected;
    tracing::info!(
        digest = prepared.work.digest,
        cases = cases.len(),
        motions = motions.len(),
        "run"
    );
    outbox.send(head).await?;

    let desk = Arc::new(ProgressDesk::new(cases.len()));
    let prepared = size(&work, prepared, &desk, &clock, &outbox).await?;
    let (mut tally, reference) = find_reference(&work, &prepared, &desk, &clock, &selected, &outbox).await?;
    if let Some(reference) = reference {
        let solver = Solver {
            work: &work,
            prepared: &prepared,
            reference: &reference,
            desk: &desk,
            clock: &clock,
        };
        solver.solve_in_order(cases, &mut tally, &outbox).await?;
        solver.tell_governing_again(&tally, &outbox).await?;
        solver.follow_in_order(motions, &mut tally, &outbox).await?;
    }

    let about = Arc::clone(&prepared);
    let mut closing = work
        .compute(move || encode::closing(&about.work, &about.plan, tally))
        .await?;
    let timing = v1::Timing {
        total_s: work.call.arrived.elapsed().as_secs_f64(),
        waiting_s: work.waiting.as_secs_f64(),
        computing_s: clock.seconds(),
    };
    // Wall times stand just before the summary, which is the last message.
    let last = closing.len().saturating_sub(1);
    closing.insert(last, event(Event::Timing(timing)));
    outbox.send(closing).await
}

/// Reads and plans a brief on the pool, and there begins with it; errors in it are a refusal, other findings are handed
/// on.
pub(super) async fn prepare<T: Send + 'static>(
    work: &Work,
    brief: v1::Brief,
    begin: impl FnOnce(&Prepared, Vec<v1::Finding>) -> Result<T, Refusal> + Send + 'static,
) -> Result<(Arc<Prepared>, T), Refusal> {
    let limits = work.shared.limits;
    let breaks = work.fault(&Fault::PanicInReading);
    let prepared = work.compute(move || {
        break_on_purpose(breaks);
        let reading = decode::read(brief, &limits);
        let Some(work) = reading.work else {
            return Err(Refusal::BriefHasErrors(reading.findings));
        };
        let plan = Plan::new(work.brief.clone());
        let prepared = Prepared { work, plan };
        let begun = begin(&prepared, reading.findings)?;
        Ok((Arc::new(prepared), begun))
    });
    prepared.await?
}

/// What comes before any result.
fn head(about: &Prepared, cases: &[usize], findings: Vec<v1::Finding>) -> Vec<v1::RunResponse> {
    let started = encode::started(&about.work, &about.plan, cases);
    let tables = encode::id_tables(&about.work, &about.plan, cases);
    std::iter::once(Event::Started(started))
        .chain(tables.into_iter().map(Event::Ids))
        .chain(findings.into_iter().map(Event::Finding))
        .map(event)
        .collect()
}

/// Chooses sections, where the brief asks for it: the work goes on with them.
async fn size(
    work: &Work,
    prepared: Arc<Prepared>,
    desk: &Arc<ProgressDesk>,
    clock: &Arc<Clock>,
    outbox: &Outbox<v1::RunResponse>,
) -> Result<Arc<Prepared>, Refusal> {
    if prepared.work.sizing().is_none() {
        return Ok(prepared);
    }
    let (stop, place) = (work.stop.clone(), Arc::clone(&work.place));
    let (desk_there, clock) = (Arc::clone(desk), Arc::clone(clock));
    let mut pending = work.shared.pool.start(move || {
        let _place = place;
        let observe = &mut |task, report: &_| desk_there.observe(&prepared, task, report, &stop);
        let (work, told) = clock.time(|| encode::sizing(&prepared.work, observe))?;
        let plan = Plan::new(work.brief.clone());
        Some((Arc::new(Prepared { work, plan }), told))
    });
    let answer = desk.relay(&mut pending, outbox, progress).await;
    // Broken off, there is nobody left who waits for the answer.
    let (sized, told) = answer
        .map_err(|panicked| work.internal(panicked))?
        .ok_or(Refusal::ClientLeft)?;
    outbox.send(vec![told]).await?;
    Ok(sized)
}

async fn find_reference(
    work: &Work,
    prepared: &Arc<Prepared>,
    desk: &Arc<ProgressDesk>,
    clock: &Arc<Clock>,
    selected: &decode::Selected,
    outbox: &Outbox<v1::RunResponse>,
) -> Result<(encode::Tally, Option<Arc<ReferenceOutcome>>), Refusal> {
    let breaks = work.fault(&Fault::PanicInReference);
    let (about, stop, desk_there, clock) = (
        Arc::clone(prepared),
        work.stop.clone(),
        Arc::clone(desk),
        Arc::clone(clock),
    );
    let (place, selected) = (Arc::clone(&work.place), selected.clone());
    let mut pending = work.shared.pool.start(move || {
        let _place = place;
        break_on_purpose(breaks);
        let mut history = Vec::new();
        let found = clock.time(|| {
            let observe = &mut |report: &_| desk_there.observe(&about, Task::Reference, report, &stop);
            about.plan.reference_with_history(&mut history, observe)
        });
        let messages = encode::reference(&about.work, &about.plan, &found, &history);
        let tally = encode::Tally::new(&about.plan, &selected.cases, &selected.motions, &found);
        (messages, tally, found.ok().map(Arc::new))
    });
    let answer = desk.relay(&mut pending, outbox, progress).await;
    let (messages, tally, reference) = answer.map_err(|panicked| work.internal(panicked))?;
    outbox.send(messages).await?;
    Ok((tally, reference))
}

/// Works off the cases and motions of a run.
pub(super) struct Solver<'a> {
    pub(super) work: &'a Work,
    pub(super) prepared: &'a Arc<Prepared>,
    pub(super) reference: &'a Arc<ReferenceOutcome>,
    pub(super) desk: &'a Arc<ProgressDesk>,
    pub(super) clock: &'a Arc<Clock>,
}

/// What a case leaves: its messages, and what the summary needs of it.
type CaseAnswer = (Vec<v1::RunResponse>, encode::Noted);

/// Whether an array is told whatever the brief keeps: paths and shapes of modes are asked for by name.
fn is_asked_for_by_name(columns: &v1::Columns) -> bool {
    columns.name.starts_with("path_") || columns.name == "mode_shape"
}

impl Solver<'_> {
    /// The messages of a case without the arrays that the brief does not keep.
    fn kept(&self, case: usize, mut messages: Vec<v1::RunResponse>) -> Vec<v1::RunResponse> {
        if self.prepared.work.kept().is_some_and(|kept| !kept.is_full(case)) {
            let is_kept = |event: &Event| match event {
                Event::Columns(columns) => is_asked_for_by_name(columns),
                _ => true,
            };
            messages.retain(|message| message.event.as_ref().is_none_or(is_kept));
        }
        messages
    }

    /// As many cases at a time as there are threads; none is started before the client has taken the results of those
    /// in front of it, so that a slow reader holds no thread.
    async fn solve_in_order(
        &self,
        cases: &[usize],
        tally: &mut encode::Tally,
        outbox: &Outbox<v1::RunResponse>,
    ) -> Result<(), Refusal> {
        let width = self.work.shared.pool.width();
        let mut next = cases.iter().copied();
        let mut at_work: VecDeque<(usize, Pending<CaseAnswer>)> = VecDeque::with_capacity(width);
        loop {
            let free = width - at_work.len();
            at_work.extend(next.by_ref().take(free).map(|case| (case, self.start(case))));
            let Some((case, mut pending)) = at_work.pop_front() else {
                return Ok(());
            };
            let (messages, noted) = match self.desk.relay(&mut pending, outbox, progress).await {
                Ok(answer) => answer,
                Err(Panicked) => {
                    tracing::error!(position = case, "the engine failed in a case; the others go on");
                    encode::engine_error(&self.prepared.work, &self.prepared.plan, case)
                }
            };
            let effects = tally.add(case, &noted);
            self.desk.one_more_done();
            outbox.send(self.kept(case, messages)).await?;
            for effect in effects {
                let Prepared { work, plan } = &**self.prepared;
                outbox
                    .send(encode::design_effect(work, plan, self.reference, &effect))
                    .await?;
            }
        }
    }

    /// Solves cases that govern a check again where their arrays were left out, and tells these now: to the bit the same.
    async fn tell_governing_again(
        &self,
        tally: &encode::Tally,
        outbox: &Outbox<v1::RunResponse>,
    ) -> Result<(), Refusal> {
        let Some(kept) = self.prepared.work.kept().filter(|kept| kept.governing) else {
            return Ok(());
        };
        for case in tally.governing().into_iter().filter(|case| !kept.is_full(*case)) {
            let mut pending = self.start(case);
            let answer = self.desk.relay(&mut pending, outbox, progress).await;
            let (mut messages, _) = answer.map_err(|panicked| self.work.internal(panicked))?;
            // The rest was told the first time.
            let is_told = |event: &Event| match event {
                Event::Finding(_) | Event::Diagnosis(_) | Event::Modes(_) => true,
                Event::Columns(columns) => is_asked_for_by_name(columns),
                _ => false,
            };
            messages.retain(|message| message.event.as_ref().is_none_or(|event| !is_told(event)));
            if let Some(Event::CaseBegin(begin)) = messages.first_mut().and_then(|first| first.event.as_mut()) {
                begin.again = true;
            }
            outbox.send(messages).await?;
        }
        Ok(())
    }

    fn start(&self, case: usize) -> Pending<CaseAnswer> {
        let name = &self.prepared.plan.brief().cases[case].name;
        let breaks = matches!(&self.work.shared.fault, Some(Fault::PanicInCase(id)) if id == name);
        let (about, reference) = (Arc::clone(self.prepared), Arc::clone(self.reference));
        let (desk, clock) = (Arc::clone(self.desk), Arc::clone(self.clock));
        let (stop, place) = (self.work.stop.clone(), Arc::clone(&self.work.place));
        self.work.shared.pool.start(move || {
            let _place = place;
            break_on_purpose(breaks);
            let (outcome, path) = clock.time(|| {
                let observe = &mut |report: &_| desk.observe(&about, Task::Case(case), report, &stop);
                let outcome = about.plan.case(&reference, case, observe);
                (outcome, about.plan.path(&reference, case, observe))
            });
            let (mut messages, noted) = encode::case(&about.work, &about.plan, &reference, case, &outcome);
            if let Some(path) = path {
                // Arrays of a case lie before its summary.
                let last = messages.len().saturating_sub(1);
                let name = &about.plan.brief().cases[case].name;
                messages.splice(last..last, encode::path(name, &path));
            }
            (messages, noted)
        })
    }
}

pub(super) fn break_on_purpose(breaks: bool) {
    assert!(!breaks, "a fault on purpose");
}

pub(super) fn progress(progress: v1::Progress) -> v1::RunResponse {
    event(Event::Progress(progress))
}

fn event(event: Event) -> v1::RunResponse {
    v1::RunResponse { event: Some(event) }
}
