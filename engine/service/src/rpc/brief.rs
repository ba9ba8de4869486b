//! `BriefService`.

use std::sync::Arc;

use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::brief_service_server::BriefService;
use tonic::{Request, Response, Status};

use super::stream::{Answer, Outbox};
use super::{Shared, Work, answer, freeze, run};
use crate::call::Call;
use crate::config::Fault;
use crate::status::Refusal;
use crate::strict::HeldMemory;
use crate::{decode, encode};

/// Answers briefs.
#[derive(Clone, Debug)]
pub struct BriefApi(pub Arc<Shared>);

#[tonic::async_trait]
impl BriefService for BriefApi {
    type CheckStream = Answer<v1::CheckResponse>;
    type RunStream = Answer<v1::RunResponse>;
    type FreezeStream = Answer<v1::FreezeResponse>;

    async fn check(&self, request: Request<v1::CheckRequest>) -> Result<Response<Self::CheckStream>, Status> {
        let (head, message) = split(request);
        answer(&self.0, head, |work, outbox| check(work, message, outbox)).await
    }

    async fn run(&self, request: Request<v1::RunRequest>) -> Result<Response<Self::RunStream>, Status> {
        let (head, message) = split(request);
        answer(&self.0, head, |work, outbox| run::run(work, message, outbox)).await
    }

    async fn freeze(&self, request: Request<v1::FreezeRequest>) -> Result<Response<Self::FreezeStream>, Status> {
        let (head, message) = split(request);
        answer(&self.0, head, |work, outbox| freeze::freeze(work, message, outbox)).await
    }
}

async fn check(work: Work, request: v1::CheckRequest, outbox: Outbox<v1::CheckResponse>) -> Result<(), Refusal> {
    let limits = work.shared.limits;
    let breaks = work.fault(&Fault::PanicInReading);
    let report = work.compute(move || {
        run::break_on_purpose(breaks);
        encode::check_report(decode::read(request.brief.unwrap_or_default(), &limits))
    });
    outbox.send(report.await?).await
}

/// What the layers found out, and the message.
fn split<Message>(mut request: Request<Message>) -> ((Call, Option<HeldMemory>), Message) {
    let extensions = request.extensions_mut();
    let call = extensions.remove::<Call>().expect("the layer of calls is in front");
    let memory = extensions.remove::<HeldMemory>();
    ((call, memory), request.into_inner())
}
