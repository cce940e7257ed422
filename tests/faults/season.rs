//! A small season of recordings, the outputs it comes to, and what must hold of a folder
//! of outputs at any moment.

use super::fixtures::{Bench, hum_and_noise, wav16};
use serde_json::Value;
use sha2::{Digest, Sha256};
use std::collections::BTreeMap;
use std::fs;
use std::path::Path;
use std::process::{Child, Command, Stdio};
use std::time::SystemTime;

/// So many sections that small recordings keep a run busy for a third of a second, and so
/// many bands that the report takes a while to write.
const SPEC: &str = r#"
[[stage]]
kind = "bandstop"
family = "elliptic"
order = 2
center_hz = 50
width_hz = 8
harmonics = 30
ripple_db = 0.1
stop_db = 40

[[band]]
name = "hum"
center_hz = 50
span_hz = 4
harmonics = 30
reduce_db = 3
"#;

/// The names of files while they are written, and of the journal.
pub fn is_passing(name: &str) -> bool {
    let name = name.rsplit('/').next().unwrap_or(name);
    (name.starts_with(".bandproof-") && name.ends_with(".part")) || name == ".bandproof-journal"
}

/// How a folder of outputs is made.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Way {
    TwoThreads,
    OneThread,
    WithTable,
    WithPackage,
    WithBag,
}

impl Way {
    pub const ALL: [Way; 5] = [Way::TwoThreads, Way::OneThread, Way::WithTable, Way::WithPackage, Way::WithBag];

    /// OUT, which a bag wants to be its folder `data`.
    pub fn out(self) -> &'static str {
        if self == Way::WithBag { "out/data" } else { "out" }
    }

    pub fn arguments(self) -> &'static [&'static str] {
        match self {
            Way::TwoThreads => &["--jobs", "2"],
            Way::OneThread => &["--jobs", "1"],
            Way::WithTable => &["--jobs", "2", "--csv", "out/figures.csv"],
            Way::WithPackage => &["--jobs", "2", "--emit", "datapackage"],
            Way::WithBag => &["--jobs", "2", "--emit", "bagit"],
        }
    }
}

/// Inputs of mixed lengths and depths of folders, and one that fails.
pub struct Season {
    pub bench: Bench,
    inputs: Vec<(String, Vec<u8>, SystemTime)>,
}

/// A folder of outputs without what differs between two runs.
pub type Outputs = BTreeMap<String, Vec<u8>>;

impl Season {
    /// An empty folder with the season's spec.
    pub fn bench() -> Bench {
        Bench::new(SPEC)
    }

    pub fn new() -> Self {
        let bench = Season::bench();
        for index in 0..12_u32 {
            let seconds = [3.0, 40.0, 7.0, 110.0][index as usize % 4];
            let samples = hum_and_noise(8000, seconds + f64::from(index), 0.3, u64::from(index) + 1);
            let folder = ["", "station-a/", "station-b/east/"][index as usize % 3];
            bench.input(&format!("{folder}{index:02}.wav"), &wav16(8000, 1, &samples));
        }
        Season::of(bench)
    }

    /// Recordings of the caller's choice, and one that fails.
    pub fn of(bench: Bench) -> Self {
        bench.input("station-a/broken.wav", b"RIFF");
        // A time that no copy made just now would have.
        let past = SystemTime::UNIX_EPOCH + std::time::Duration::from_secs(1_700_000_000);
        for (name, _) in bench.tree("in") {
            let file = fs::File::options().write(true).open(bench.path("in").join(name)).unwrap();
            file.set_modified(past).unwrap();
        }
        let inputs = inputs(&bench);
        Season { bench, inputs }
    }

    /// A run in the background.
    pub fn start(&self, way: Way) -> Child {
        self.command(way).stdout(Stdio::null()).stderr(Stdio::null()).spawn().unwrap()
    }

    /// The command of a run.
    pub fn command(&self, way: Way) -> Command {
        let mut command = Command::new(assert_cmd::cargo::cargo_bin!("bandproof"));
        command.args(["filter", "spec.toml", "in", way.out()]).args(way.arguments());
        command.current_dir(self.bench.path("")).stdin(Stdio::null());
        command
    }

    /// A run to its end, which must be that of one failed recording.
    pub fn run(&self, way: Way, what: &str) {
        let output = self.command(way).output().unwrap();
        let complaints = String::from_utf8_lossy(&output.stderr);
        assert_eq!(output.status.code(), Some(3), "{what}: {complaints}");
        assert_eq!(complaints.lines().count(), 1, "{what}: {complaints}");
    }

    /// The outputs of a run that nothing disturbed.
    pub fn undisturbed(&self, way: Way) -> Outputs {
        self.clear();
        self.run(way, "undisturbed");
        let outputs = outputs(&self.bench.path("out"));
        assert!(outputs.keys().all(|name| !is_passing(name)), "{:?}", outputs.keys());
        outputs
    }

    /// Takes OUT away.
    pub fn clear(&self) {
        if self.bench.path("out").exists() {
            fs::remove_dir_all(self.bench.path("out")).unwrap();
        }
    }

    /// Inputs are what they were, to the byte and the modification time.
    pub fn assert_inputs_untouched(&self, what: &str) {
        assert!(inputs(&self.bench) == self.inputs, "{what}: an input was touched");
    }

    /// Whatever has a final name in OUT is that file of `whole`.
    pub fn assert_no_wrong_file(&self, whole: &Outputs, what: &str) {
        for (name, bytes) in outputs(&self.bench.path("out")) {
            if !is_passing(&name) {
                assert!(whole.get(&name) == Some(&bytes), "{what}: {name} has its name and is not what it should be");
            }
        }
    }

    /// OUT holds `whole` and nothing else.
    pub fn assert_complete(&self, whole: &Outputs, what: &str) {
        let found = outputs(&self.bench.path("out"));
        assert_eq!(found.keys().collect::<Vec<_>>(), whole.keys().collect::<Vec<_>>(), "{what}");
        self.assert_no_wrong_file(whole, what);
        for (name, _, modified) in &self.inputs {
            for out in ["out", "out/data"] {
                if let Ok(metadata) = self.bench.path(out).join(name).metadata() {
                    assert_eq!(metadata.modified().unwrap(), *modified, "{what}: {name}");
                }
            }
        }
    }
}

fn inputs(bench: &Bench) -> Vec<(String, Vec<u8>, SystemTime)> {
    let modified = |name: &str| bench.path("in").join(name).metadata().unwrap().modified().unwrap();
    bench.tree("in").into_iter().map(|(name, bytes)| (name.clone(), bytes, modified(&name))).collect()
}

/// Every file below OUT; report and descriptor without what is of one run alone. A run may
/// be going on: what goes away meanwhile is not there.
pub fn outputs(out: &Path) -> Outputs {
    let entries = walkdir::WalkDir::new(out).into_iter().filter_map(Result::ok);
    let read = |entry: walkdir::DirEntry| {
        let name = entry.path().strip_prefix(out).unwrap().to_string_lossy().into_owned();
        Some((name, fs::read(entry.path()).ok()?))
    };
    let mut files: Outputs = entries.filter(|entry| !entry.file_type().is_dir()).filter_map(read).collect();
    let raw = files.clone();
    for (name, bytes) in &mut files {
        match name.as_str() {
            "bandproof-report.json" | "data/bandproof-report.json" => *bytes = without_run(bytes),
            "datapackage.json" => *bytes = without_report(bytes, raw.get("bandproof-report.json")),
            "bag-info.txt" => *bytes = without_oxum(bytes, &raw),
            "manifest-sha256.txt" | "tagmanifest-sha256.txt" => *bytes = true_names(bytes, &raw),
            _ => {}
        }
    }
    files
}

/// The names in a bag's manifest, whose hashes must be those of the files.
fn true_names(manifest: &[u8], raw: &Outputs) -> Vec<u8> {
    let lines = std::str::from_utf8(manifest).unwrap().lines();
    let name = |line: &str| {
        let (listed, name) = line.split_once("  ").unwrap();
        let bytes = raw.get(name).unwrap_or_else(|| panic!("a bag lists {name}, which is not there"));
        assert_eq!(listed, hash(bytes), "{name} is not what a bag says");
        format!("{name}\n")
    };
    lines.map(name).collect::<String>().into_bytes()
}

/// A bag's own figures without the length of its payload, which must be true.
fn without_oxum(info: &[u8], raw: &Outputs) -> Vec<u8> {
    let payload = raw.iter().filter(|(name, _)| name.starts_with("data/") && !is_passing(name));
    let (files, bytes) = payload.fold((0, 0), |(files, all), (_, bytes)| (files + 1, all + bytes.len()));
    let text = std::str::from_utf8(info).unwrap();
    let oxum = format!("Payload-Oxum: {bytes}.{files}\n");
    assert!(text.contains(&oxum), "{text} does not say {oxum}");
    text.replace(&oxum, "").into_bytes()
}

/// A report's JSON, which must be whole, without `run`.
pub fn without_run(report: &[u8]) -> Vec<u8> {
    let mut report: Value = serde_json::from_slice(report).expect("a report under its name is whole");
    report.as_object_mut().unwrap().remove("run").unwrap();
    serde_json::to_vec(&report).unwrap()
}

/// A descriptor without its time and the report's hash, which must be that of the report.
fn without_report(descriptor: &[u8], report: Option<&Vec<u8>>) -> Vec<u8> {
    let mut descriptor: Value = serde_json::from_slice(descriptor).expect("a descriptor under its name is whole");
    descriptor.as_object_mut().unwrap().remove("created").unwrap();
    let resources = descriptor["resources"].as_array_mut().unwrap();
    let entry = resources.iter_mut().find(|resource| resource["path"] == "bandproof-report.json").unwrap();
    let report = report.expect("a report was there before its descriptor");
    let expected = (format!("sha256:{}", hash(report)).into(), report.len().into());
    assert_eq!((entry["hash"].take(), entry["bytes"].take()), expected);
    serde_json::to_vec(&descriptor).unwrap()
}

fn hash(bytes: &[u8]) -> String {
    Sha256::digest(bytes).iter().map(|byte| format!("{byte:02x}")).collect()
}
