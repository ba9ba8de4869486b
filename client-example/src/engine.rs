//! The engine: one far away, or one inside this program that is spoken to in the same way.

use std::time::Duration;

use ropewalk_api::ropewalk::v1::brief_service_client::BriefServiceClient;
use tonic::transport::{Channel, Endpoint};

use crate::end::{End, Stop};

/// Time to reach an engine.
const REACH: Duration = Duration::from_secs(10);

/// An engine that answers.
#[derive(Debug)]
pub(crate) struct Engine {
    pub(crate) briefs: BriefServiceClient<Channel>,
    #[cfg(feature = "embedded")]
    inside: Option<inside::Inside>,
}

impl Engine {
    /// Reaches the engine at a URL, or starts one.
    ///
    /// # Errors
    /// A [`Stop`] that tells why there is none.
    pub(crate) async fn reach(url: Option<&str>) -> Result<Self, Stop> {
        match url {
            Some(url) => Ok(Self {
                briefs: BriefServiceClient::new(connect(url).await?),
                #[cfg(feature = "embedded")]
                inside: None,
            }),
            #[cfg(feature = "embedded")]
            None => {
                let inside = inside::Inside::start()?;
                let channel = connect(&inside.url()).await?;
                Ok(Self {
                    briefs: BriefServiceClient::new(channel),
                    inside: Some(inside),
                })
            }
            #[cfg(not(feature = "embedded"))]
            None => Err(Stop::new(
                End::EngineAway,
                "this program was built without an engine inside: name one with --engine URL",
            )),
        }
    }

    /// Lets an engine inside this program end.
    pub(crate) async fn leave(self) {
        // The connection must go first: an engine waits for its clients.
        drop(self.briefs);
        #[cfg(feature = "embedded")]
        if let Some(inside) = self.inside {
            inside.stop().await;
        }
    }
}

async fn connect(url: &str) -> Result<Channel, Stop> {
    if url.starts_with("https:") {
        return Err(Stop::new(
            End::BriefHasErrors,
            format!("--engine {url}: this client does not speak TLS; use http://"),
        ));
    }
    let full = if url.contains("://") {
        url.to_owned()
    } else {
        format!("http://{url}")
    };
    let endpoint = Endpoint::from_shared(full)
        .map_err(|error| Stop::new(End::BriefHasErrors, format!("--engine {url}: is not a URL: {error}")))?;
    endpoint.connect_timeout(REACH).connect().await.map_err(|error| {
        let mut words = error.to_string();
        let mut source = std::error::Error::source(&error);
        while let Some(cause) = source {
            words = format!("{words}: {cause}");
            source = cause.source();
        }
        Stop::new(
            End::EngineAway,
            format!(
                "no engine answers at {url} ({words}).\nStart one there (ropewalk-engine --listen HOST:PORT), mend \
                 --engine or ROPEWALK_ENGINE, or leave both out: then one is started inside this program."
            ),
        )
    })
}

#[cfg(feature = "embedded")]
mod inside {
    use std::net::SocketAddr;

    use ropewalk_service::config::Config;
    use ropewalk_service::server;
    use tokio::sync::oneshot;
    use tokio::task::JoinHandle;

    use crate::end::{End, Stop};

    /// An engine on a free port of this machine, for this program alone.
    #[derive(Debug)]
    pub(super) struct Inside {
        address: SocketAddr,
        stop: oneshot::Sender<()>,
        serving: JoinHandle<()>,
    }

    impl Inside {
        pub(super) fn start() -> Result<Self, Stop> {
            let failed = |why: String| {
                Stop::new(
                    End::EngineFailed,
                    format!("the engine inside this program does not start: {why}"),
                )
            };
            let server = server::bind(Config::embedded()).map_err(|error| failed(error.to_string()))?;
            let address = server.local_addr();
            let (stop, stopped) = oneshot::channel::<()>();
            let serving = tokio::spawn(async move {
                // A failing transport shows at the client's end of it.
                let _ = server
                    .serve(async {
                        let _ = stopped.await;
                    })
                    .await;
            });
            Ok(Self { address, stop, serving })
        }

        pub(super) fn url(&self) -> String {
            format!("http://{}", self.address)
        }

        pub(super) async fn stop(self) {
            let _ = self.stop.send(());
            let _ = self.serving.await;
        }
    }
}
