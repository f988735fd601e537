//! Compiles the protobuf files without protoc and generates the Rust types, clients and servers.

use std::error::Error;
use std::path::PathBuf;

const FILES: &[&str] = &[
    "rimeshift/v1/answer.proto",
    "rimeshift/v1/day.proto",
    "rimeshift/v1/day_service.proto",
    "rimeshift/v1/plan.proto",
    "rimeshift/v1/plan_service.proto",
    "rimeshift/v1/policy.proto",
    "rimeshift/v1/traffic_service.proto",
];

fn main() -> Result<(), Box<dyn Error>> {
    println!("cargo:rerun-if-changed=rimeshift");
    let mut compiler = protox::Compiler::new(["."])?;
    compiler.include_imports(true).open_files(FILES)?;
    // Served by reflection, so that generic clients can read the interface.
    let descriptor_file = PathBuf::from(std::env::var("OUT_DIR")?).join("rimeshift_descriptor.bin");
    std::fs::write(descriptor_file, compiler.encode_file_descriptor_set())?;

    // Once more with comments, which become the docs of the generated code.
    compiler.include_source_info(true);
    tonic_prost_build::configure().compile_fds(compiler.file_descriptor_set())?;
    Ok(())
}
