//! The file: what another reader finds in it, and how it gets to its place.

use crate::support::{shipped, spectrum};
use bandproof::excite::file::{Placing, check, save};
use bandproof::excite::{ExciteError, Plan};
use sha2::{Digest as _, Sha256};
use std::cell::{Cell, RefCell};
use std::fs;
use std::io::{self, Cursor, Seek, SeekFrom, Write};
use std::path::{Path, PathBuf};

fn plan(seconds: f64) -> Plan {
    Plan::new(&shipped("notch-997.toml"), 44_100, seconds).unwrap()
}

fn placing() -> Placing<'static> {
    Placing { spec_path: None, replace: false, go_on: &|| true, temporary: &|_| () }
}

/// All names in a folder.
fn names(folder: &Path) -> Vec<String> {
    let entries = fs::read_dir(folder).unwrap();
    entries.map(|entry| entry.unwrap().file_name().into_string().unwrap()).collect()
}

#[test]
fn hound_reads_back_what_was_planned() {
    // 2.00001 s are 88200.4 frames.
    for (seconds, frames) in [(2.0, 88_200), (2.00001, 88_200), (2.00003, 88_202)] {
        let plan = plan(seconds);
        let mut file = Cursor::new(Vec::new());
        plan.write(&mut file).unwrap();
        let mut reader = hound::WavReader::new(Cursor::new(file.into_inner())).unwrap();
        let spec = reader.spec();
        assert_eq!((spec.channels, spec.sample_rate, spec.bits_per_sample), (1, 44_100, 24));
        assert_eq!(spec.sample_format, hound::SampleFormat::Int);
        assert_eq!(reader.duration(), frames);
        let read: Vec<i32> = reader.samples().collect::<Result<_, _>>().unwrap();
        assert_eq!(read, plan.samples().collect::<Vec<_>>());
    }
}

#[test]
fn the_programs_own_reader_agrees() {
    let plan = plan(4.0);
    let mut file = Cursor::new(Vec::new());
    plan.write(&mut file).unwrap();
    let mut reader = bandproof::wave::Reader::open(Cursor::new(file.into_inner())).unwrap();
    assert_eq!((reader.header().frames, reader.header().rate_hz), (plan.frames, 44_100));
    let mut planes = vec![Vec::new()];
    while reader.read(1000, &mut planes).unwrap() > 0 {}
    assert_eq!(planes[0], crate::support::samples(&plan));
    // And there is sound in it.
    assert!(spectrum(&planes[0], 4096).sxx.iter().sum::<f64>() > 1e-3);
}

#[test]
fn equal_plans_give_equal_files_and_others_do_not() {
    let bytes = |plan: &Plan| {
        let mut file = Cursor::new(Vec::new());
        plan.write(&mut file).unwrap();
        file.into_inner()
    };
    assert_eq!(bytes(&plan(3.0)), bytes(&plan(3.0)));
    assert_ne!(bytes(&plan(3.0)), bytes(&plan(3.1)));
    let mut renamed = shipped("notch-997.toml");
    renamed.title = None;
    // Only bands, rate and length count.
    renamed.stages.pop();
    assert_eq!(bytes(&plan(3.0)), bytes(&Plan::new(&renamed, 44_100, 3.0).unwrap()));
}

#[test]
fn a_saved_file_is_whole_and_alone_in_its_folder() {
    let folder = tempfile::tempdir().unwrap();
    let target = folder.path().join("excite.wav");
    let plan = plan(2.0);
    let temporary = RefCell::new(PathBuf::new());
    let told = |path: &Path| *temporary.borrow_mut() = path.to_path_buf();
    let saved = save(&plan, &target, &Placing { temporary: &told, ..placing() }).unwrap();
    assert_eq!(names(folder.path()), ["excite.wav"]);
    assert_eq!(temporary.borrow().parent(), Some(folder.path()));
    let bytes = fs::read(&target).unwrap();
    let hash: String = Sha256::digest(&bytes).iter().map(|byte| format!("{byte:02x}")).collect();
    assert_eq!((saved.bytes, saved.sha256), (bytes.len() as u64, hash));
    assert_eq!(saved.written, plan.write(Cursor::new(Vec::new())).unwrap());
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt;
        let other = folder.path().join("other");
        fs::write(&other, "").unwrap();
        let mode = |path: &Path| path.metadata().unwrap().permissions().mode();
        assert_eq!(mode(&target), mode(&other), "as any new file");
    }
}

#[test]
fn what_is_there_stays_unless_it_may_be_replaced() {
    let folder = tempfile::tempdir().unwrap();
    let target = folder.path().join("excite.wav");
    fs::write(&target, "precious").unwrap();
    let error = save(&plan(2.0), &target, &placing()).unwrap_err();
    assert!(matches!(error, ExciteError::Exists(_)) && error.is_refusal(), "{error}");
    assert!(error.to_string().contains("--replace"), "{error}");
    assert_eq!(fs::read(&target).unwrap(), b"precious");
    save(&plan(2.0), &target, &Placing { replace: true, ..placing() }).unwrap();
    assert_eq!(names(folder.path()), ["excite.wav"]);
    assert!(hound::WavReader::open(&target).is_ok());
}

#[test]
fn the_spec_is_never_written_over() {
    let folder = tempfile::tempdir().unwrap();
    let spec = folder.path().join("spec.toml");
    fs::write(&spec, "").unwrap();
    let linked = folder.path().join("spec.wav");
    fs::hard_link(&spec, &linked).unwrap();
    let placing = Placing { spec_path: Some(&spec), replace: true, ..placing() };
    let error = check(&linked, &placing).unwrap_err();
    assert!(matches!(error, ExciteError::TouchesSpec { .. }) && error.is_refusal(), "{error}");
    // Another file in the same folder is free.
    check(&folder.path().join("other.wav"), &placing).unwrap();
}

#[test]
fn only_the_name_of_a_recording_will_do() {
    let folder = tempfile::tempdir().unwrap();
    for (name, good) in [("a.wav", true), ("A.WAV", true), ("a.flac", false), ("wav", false), ("a.wav.txt", false)] {
        let result = check(&folder.path().join(name), &placing());
        assert_eq!(result.is_ok(), good, "{name}: {result:?}");
        if let Err(error) = result {
            assert!(error.is_refusal() && error.to_string().contains(".wav"), "{error}");
        }
    }
    let inside = folder.path().join("folder.wav");
    fs::create_dir(&inside).unwrap();
    let error = check(&inside, &Placing { replace: true, ..placing() }).unwrap_err();
    assert!(matches!(error, ExciteError::NotAFile(_)), "{error}");
}

#[test]
fn a_folder_that_is_not_there_is_told_without_a_temporary_name() {
    let folder = tempfile::tempdir().unwrap();
    let error = save(&plan(2.0), &folder.path().join("no/excite.wav"), &placing()).unwrap_err();
    assert!(error.is_refusal(), "{error}");
    assert!(error.to_string().contains("no such folder") && !error.to_string().contains(".part"), "{error}");
}

#[test]
fn an_interrupted_file_leaves_nothing() {
    let folder = tempfile::tempdir().unwrap();
    let asked = Cell::new(0);
    let go_on = || {
        asked.set(asked.get() + 1);
        asked.get() < 2
    };
    let error = save(&plan(4.0), &folder.path().join("a.wav"), &Placing { go_on: &go_on, ..placing() }).unwrap_err();
    assert!(matches!(error, ExciteError::Interrupted(_)) && !error.is_refusal(), "{error}");
    assert_eq!(asked.get(), 2);
    assert_eq!(names(folder.path()), Vec::<String>::new());
}

/// A disk that is full after so many bytes; the sizes in the header, written last, count too.
struct Full {
    inner: Cursor<Vec<u8>>,
    left: usize,
}

impl Write for Full {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        if bytes.len() > self.left {
            return Err(io::Error::new(io::ErrorKind::StorageFull, "full"));
        }
        self.left -= bytes.len();
        self.inner.write(bytes)
    }

    fn flush(&mut self) -> io::Result<()> {
        self.inner.flush()
    }
}

impl Seek for Full {
    fn seek(&mut self, to: SeekFrom) -> io::Result<u64> {
        self.inner.seek(to)
    }
}

#[test]
fn no_write_error_is_lost() {
    let plan = plan(1.0);
    let mut file = Cursor::new(Vec::new());
    plan.write(&mut file).unwrap();
    let whole = file.into_inner().len();
    // Header, first samples, last samples, and the sizes of the header at the end.
    for left in [0, 40, 100, whole - 1, whole, whole + 4] {
        let error = plan.write(Full { inner: Cursor::new(Vec::new()), left }).unwrap_err();
        assert_eq!(error.kind(), io::ErrorKind::StorageFull, "after {left} bytes");
    }
    plan.write(Full { inner: Cursor::new(Vec::new()), left: whole + 8 }).unwrap();
}
