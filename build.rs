//! Compiles the contract with a compiler written in Rust, so that cargo alone is needed.

use std::path::{Path, PathBuf};
use std::{env, fs, io};

use prost::Message as _;

fn main() -> Result<(), Box<dyn std::error::Error>> {
    println!("cargo:rerun-if-changed=proto");
    let mut files = Vec::new();
    collect(Path::new("proto"), &mut files)?;
    // The order of a directory listing is not defined; the descriptor set must not depend on it.
    files.sort();
    for file in &files {
        println!("cargo:rerun-if-changed={}", file.display());
    }

    let descriptors = protox::compile(&files, ["proto"])?;
    let out = PathBuf::from(env::var("OUT_DIR")?);
    fs::write(out.join("descriptors.bin"), descriptors.encode_to_vec())?;
    tonic_prost_build::configure()
        // Sorted maps: a message is encoded the same way every time.
        .btree_map(".")
        .compile_fds(descriptors)?;
    Ok(())
}

fn collect(folder: &Path, files: &mut Vec<PathBuf>) -> io::Result<()> {
    for entry in fs::read_dir(folder)? {
        let path = entry?.path();
        if path.is_dir() {
            collect(&path, files)?;
        } else if path.extension().is_some_and(|extension| extension == "proto") {
            files.push(path);
        }
    }
    Ok(())
}
