//! The contract of Ropewalk as Rust types: generated from the `.proto` files beside this one, nothing added.
//!
//! The comments in `ropewalk/v1/*.proto` are the manual.

/// Package `ropewalk`.
pub mod ropewalk {
    /// Package `ropewalk.v1`.
    #[allow(
        missing_docs,
        missing_debug_implementations,
        unreachable_pub,
        clippy::all,
        clippy::doc_markdown,
        rustdoc::all,
        reason = "generated code"
    )]
    pub mod v1 {
        tonic::include_proto!("ropewalk.v1");
    }
}

/// The contract as an encoded `google.protobuf.FileDescriptorSet`, comments included.
pub const FILE_DESCRIPTOR_SET: &[u8] = include_bytes!(concat!(env!("OUT_DIR"), "/descriptors.bin"));
