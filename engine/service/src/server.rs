//! The server: layers and services put together, from binding to the end of the drain.

use std::io;
use std::net::SocketAddr;
use std::sync::Arc;
use std::time::Duration;

use http::{HeaderName, HeaderValue, Method};
use ropewalk_api::ropewalk::v1::brief_service_server::{BriefServiceServer, SERVICE_NAME as BRIEF_SERVICE};
use ropewalk_api::ropewalk::v1::server_service_server::{SERVICE_NAME as SERVER_SERVICE, ServerServiceServer};
use thiserror::Error;
use tokio_util::sync::CancellationToken;
use tonic::transport::server::TcpIncoming;
use tonic_health::ServingStatus;
use tonic_health::server::{HealthReporter, health_reporter};
use tonic_web::GrpcWebLayer;
use tower_http::cors::{AllowHeaders, AllowOrigin, CorsLayer};

use crate::admission::Admission;
use crate::call::{CallLayer, REQUEST_ID};
use crate::config::{Config, ConfigError};
use crate::pool::Pool;
use crate::rpc::{BriefApi, ServerApi, Shared, Streams};
use crate::strict::StrictLayer;

/// Windows of flow control, of a stream and of a connection (bytes): what a slow reader may cost.
const STREAM_WINDOW: u32 = 1 << 20;
const CONNECTION_WINDOW: u32 = 4 << 20;

/// Calls at a time on one connection.
const STREAMS_PER_CONNECTION: u32 = 256;

/// Headers of a call (bytes).
const HEADERS: u32 = 16 << 10;

/// Time for endings to reach their clients, after the last call has ended.
const FAREWELL: Duration = Duration::from_secs(1);

/// An engine that has taken its address and can serve.
#[derive(Debug)]
pub struct Server {
    config: Config,
    incoming: TcpIncoming,
    local_addr: SocketAddr,
    pool: Arc<Pool>,
}

/// Why an engine cannot start.
#[derive(Debug, Error)]
pub enum StartError {
    /// A setting cannot be.
    #[error(transparent)]
    Config(#[from] ConfigError),
    /// The threads that compute do not start.
    #[error("cannot start {threads} threads to compute: {source}")]
    Threads {
        /// So many were wanted.
        threads: usize,
        /// Why not.
        source: rayon::ThreadPoolBuildError,
    },
    /// The address cannot be had.
    #[error("cannot listen on {listen}: {source}")]
    Listen {
        /// The address.
        listen: SocketAddr,
        /// Why not.
        source: io::Error,
    },
}

/// Why a server stopped serving.
#[derive(Debug, Error)]
#[error("the server failed")]
pub struct ServeError(#[from] tonic::transport::Error);

/// Checks the settings and takes the address. Within a runtime only.
///
/// # Errors
/// [`StartError`].
pub fn bind(config: Config) -> Result<Server, StartError> {
    config.check()?;
    let threads = config.threads();
    let pool = Pool::new(threads).map_err(|source| StartError::Threads { threads, source })?;
    let listen = config.listen;
    let cannot_listen = |source| StartError::Listen { listen, source };
    let incoming = TcpIncoming::bind(listen)
        .map_err(cannot_listen)?
        .with_nodelay(Some(true));
    let local_addr = incoming.local_addr().map_err(cannot_listen)?;
    Ok(Server {
        config,
        incoming,
        local_addr,
        pool: Arc::new(pool),
    })
}

impl Server {
    /// The address that it listens on.
    #[must_use]
    pub fn local_addr(&self) -> SocketAddr {
        self.local_addr
    }

    /// Serves until `shutdown`, then drains: new calls are refused, running ones get their time, and then end.
    ///
    /// # Errors
    /// [`ServeError`] if the transport fails.
    pub async fn serve(self, shutdown: impl Future<Output = ()>) -> Result<(), ServeError> {
        let Self {
            config, incoming, pool, ..
        } = self;
        let (draining, closing, closed) = (
            CancellationToken::new(),
            CancellationToken::new(),
            CancellationToken::new(),
        );
        let shared = Arc::new(Shared {
            pool: Arc::clone(&pool),
            admission: Admission::new(config.running, config.waiting),
            limits: config.limits(),
            closing: closing.clone(),
            streams: Streams::default(),
            fault: config.fault.clone(),
        });
        let receive = Duration::from_secs(config.receive_seconds);
        let limit = config.limits().request_bytes;
        let brief = BriefServiceServer::new(BriefApi(Arc::clone(&shared))).max_decoding_message_size(limit);
        let (health, health_service) = health_reporter();
        let serving = tonic::transport::Server::builder()
            .accept_http1(true)
            .initial_stream_window_size(STREAM_WINDOW)
            .initial_connection_window_size(CONNECTION_WINDOW)
            .max_concurrent_streams(STREAMS_PER_CONNECTION)
            .http2_max_header_list_size(HEADERS)
            .http2_keepalive_interval(Some(Duration::from_secs(config.keepalive_seconds)))
            .http2_keepalive_timeout(Some(Duration::from_secs(config.keepalive_timeout_seconds)))
            // From the outside in.
            .layer(cors(&config.web_origins))
            .layer(GrpcWebLayer::new())
            .layer(CallLayer::new(config.max_call(), draining.clone()))
            .layer(StrictLayer::new(pool, limit, config.requests_held, receive))
            .add_service(health_service)
            .add_service(reflection().build_v1().expect("our own descriptors can be read"))
            .add_service(reflection().build_v1alpha().expect("our own descriptors can be read"))
            .add_service(ServerServiceServer::new(ServerApi::new(&config)))
            .add_service(brief)
            .serve_with_incoming_shutdown(incoming, closed.cancelled());
        tokio::pin!(serving);

        tell_health(&health, ServingStatus::Serving).await;
        tokio::select! {
            served = &mut serving => return Ok(served?),
            () = shutdown => {}
        }

        tell_health(&health, ServingStatus::NotServing).await;
        draining.cancel();
        tracing::info!(seconds = config.drain_seconds, "draining");
        let drained = tokio::time::timeout(Duration::from_secs(config.drain_seconds), shared.streams.none());
        tokio::select! {
            served = &mut serving => return Ok(served?),
            outcome = drained => if outcome.is_err() {
                tracing::warn!("calls are still running: ending them");
            }
        }
        closing.cancel();
        closed.cancel();
        // Idle connections, and clients that do not read, do not hold up the end.
        match tokio::time::timeout(FAREWELL, serving).await {
            Ok(served) => Ok(served?),
            Err(_) => Ok(()),
        }
    }
}

async fn tell_health(health: &HealthReporter, status: ServingStatus) {
    // The empty name stands for the server as a whole.
    for service in ["", BRIEF_SERVICE, SERVER_SERVICE] {
        health.set_service_status(service, status).await;
    }
}

fn reflection() -> tonic_reflection::server::Builder<'static> {
    tonic_reflection::server::Builder::configure()
        .register_encoded_file_descriptor_set(ropewalk_api::FILE_DESCRIPTOR_SET)
        .register_encoded_file_descriptor_set(tonic_health::pb::FILE_DESCRIPTOR_SET)
}

/// What a browser may do: call from these origins, and read how a call ended.
fn cors(origins: &[String]) -> CorsLayer {
    let origins = if origins.iter().any(|origin| origin == "*") {
        AllowOrigin::any()
    } else {
        AllowOrigin::list(origins.iter().filter_map(|origin| HeaderValue::from_str(origin).ok()))
    };
    let told = ["grpc-status", "grpc-message", "grpc-status-details-bin", REQUEST_ID];
    CorsLayer::new()
        .allow_origin(origins)
        .allow_methods([Method::POST])
        .allow_headers(AllowHeaders::mirror_request())
        .expose_headers(told.map(HeaderName::from_static))
        .max_age(Duration::from_secs(600))
}
