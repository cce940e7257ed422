//! Writes the demo recordings beside this file: `cargo run --release --example demo-audio`.
//!
//! What they hold is described in [`generator`]. The seeds are fixed and the mathematics
//! is the same on every machine, so the committed recordings come out byte for byte.

mod generator;

use std::{fs, io, path::Path};

fn main() -> io::Result<()> {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("demo-audio");
    let files = generator::files().map_err(io::Error::other)?;
    for file in files {
        let path = root.join(file.path);
        if let Some(folder) = path.parent() {
            fs::create_dir_all(folder)?;
        }
        fs::write(path, file.bytes)?;
    }
    Ok(())
}
