//! The gRPC interface of Rimeshift, version 1: the types, clients and servers generated from the
//! protobuf files of this crate, and nothing else.
//!
//! The protobuf files are the reference: units, ranges and the order of streamed messages stand in
//! their comments, which are the docs of the generated items too.

/// Package `rimeshift.v1`.
#[expect(
    clippy::large_enum_variant,
    reason = "generated: of a stream's header and rows, rows are nearly all there is"
)]
pub mod v1 {
    tonic::include_proto!("rimeshift.v1");

    /// The compiled protobuf files, as a serialised `google.protobuf.FileDescriptorSet`.
    pub const FILE_DESCRIPTOR_SET: &[u8] =
        tonic::include_file_descriptor_set!("rimeshift_descriptor");
}
