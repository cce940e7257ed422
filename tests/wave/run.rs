//! Runs recordings through reader and writer in memory.

use std::io::Cursor;

use bandproof::wave::{Changes, Header, InputFigures, Reader, SampleFormat, WaveError, Writer, WrittenFigures};
use sha2::{Digest, Sha256};

#[derive(Debug)]
pub struct Copied {
    pub header: Header,
    pub input: InputFigures,
    pub output: Vec<u8>,
    pub written: WrittenFigures,
}

pub fn sha256(bytes: &[u8]) -> String {
    Sha256::digest(bytes).iter().map(|b| format!("{b:02x}")).collect()
}

/// Decodes and encodes again in blocks of `block` frames, each sample passed through
/// `change` in between. Hashes and lengths are held against the bytes themselves.
pub fn copy_with(
    file: &[u8],
    format: Option<SampleFormat>,
    block: usize,
    change: impl Fn(f64) -> f64,
) -> Result<Copied, WaveError> {
    let format = match format {
        Some(format) => format,
        None => Reader::open(Cursor::new(file))?.header().format,
    };
    copy_changed(file, &Changes::samples(format), block, change)
}

/// The same with whatever else is to change.
pub fn copy_changed(
    file: &[u8],
    changes: &Changes,
    block: usize,
    change: impl Fn(f64) -> f64,
) -> Result<Copied, WaveError> {
    let mut reader = Reader::open(Cursor::new(file))?;
    let header = reader.header().clone();
    let mut writer = Writer::begin(Vec::new(), &mut reader, changes)?;
    let mut planes = vec![Vec::new(); usize::from(header.channels)];
    loop {
        planes.iter_mut().for_each(Vec::clear);
        if reader.read(block, &mut planes)? == 0 {
            break;
        }
        planes.iter_mut().flatten().for_each(|x| *x = change(*x));
        writer.write(&planes)?;
    }
    let input = reader.finish()?;
    let (output, written) = writer.finish(&mut reader)?;
    assert_eq!(input.sha256, sha256(file));
    assert_eq!(input.bytes, file.len() as u64);
    assert_eq!(written.sha256, sha256(&output));
    assert_eq!(written.bytes, output.len() as u64);
    assert_eq!(written.chunks.len(), header.chunks.len());
    Ok(Copied { header, input, output, written })
}

/// The identity.
pub fn copy(file: &[u8]) -> Result<Copied, WaveError> {
    copy_with(file, None, 1000, |x| x)
}

/// All samples of a recording.
pub fn samples(file: &[u8]) -> Result<Vec<Vec<f64>>, WaveError> {
    let mut reader = Reader::open(Cursor::new(file))?;
    let mut planes = vec![Vec::new(); usize::from(reader.header().channels)];
    while reader.read(4096, &mut planes)? > 0 {}
    Ok(planes)
}

/// The error of a file that must not open or read.
pub fn error(file: &[u8]) -> String {
    match copy(file) {
        Ok(copied) => panic!("{:?} was readable", copied.header),
        Err(error) => error.to_string(),
    }
}
