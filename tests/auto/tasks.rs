//! Invented band tasks as they come up in the field, in the words of a spec file.

use bandproof::spec::{self, Auto, Spec, SpecSyntax};

/// A band task.
#[derive(Clone, Copy, Debug)]
pub struct Task {
    /// What it is about.
    pub name: &'static str,
    /// Sample rates, Hz.
    pub rates_hz: &'static [u32],
    /// Top of the spec file.
    pub head: &'static str,
    /// Bands: name, from and to in Hz, requirement.
    pub bands: &'static [(&'static str, f64, f64, Ask)],
    /// Rows: name, center, span, number of lines, dB.
    pub rows: &'static [(&'static str, f64, f64, u32, f64)],
    /// Whether it is filtered forward and backward.
    pub zero: bool,
    /// Sections that a careful person takes by hand, with the filters named; nothing where
    /// nobody tried.
    pub by_hand: Option<u32>,
}

/// A requirement, dB.
#[derive(Clone, Copy, Debug)]
pub enum Ask {
    Reduce(f64),
    Keep(f64),
    /// Keep, but for every band that is reduced inside.
    KeepExcept(f64, &'static [&'static str]),
}

use Ask::{Keep, KeepExcept, Reduce};

impl Task {
    /// The spec, with its cascade to be found.
    pub fn spec(&self) -> Spec {
        let mut text = self.head.to_owned();
        for (name, from_hz, to_hz, ask) in self.bands {
            let ask = match ask {
                Reduce(db) => format!("reduce_db = {db}"),
                Keep(db) => format!("keep_db = {db}"),
                KeepExcept(db, names) => format!("keep_db = {db}\nexcept = {names:?}"),
            };
            text += &format!("[[band]]\nname = {name:?}\nfrom_hz = {from_hz}\nto_hz = {to_hz}\n{ask}\n");
        }
        for (name, center_hz, span_hz, harmonics, db) in self.rows {
            text += &format!(
                "[[band]]\nname = {name:?}\ncenter_hz = {center_hz}\nspan_hz = {span_hz}\nharmonics = {harmonics}\n\
                 reduce_db = {db}\n"
            );
        }
        let mut spec = spec::parse(text.as_bytes(), SpecSyntax::Toml, self.name).unwrap();
        spec.auto = Some(Auto::default());
        if self.zero {
            spec.phase = spec::Phase::Zero;
        }
        spec
    }
}

const PLAIN: Task = Task { name: "", rates_hz: &[48_000], head: "", bands: &[], rows: &[], zero: false, by_hand: None };

/// All of them.
pub const TASKS: &[Task] = &[
    // Elliptic high-pass of order 4 by hand: 0.5 dB at 90 Hz, 40 dB at 40 Hz.
    Task {
        name: "rumble below calls",
        bands: &[("rumble", 0.0, 40.0, Reduce(40.0)), ("calls", 90.0, 6000.0, Keep(0.5))],
        by_hand: Some(2),
        ..PLAIN
    },
    // Chebyshev II or elliptic of order 6.
    Task {
        name: "deep rumble close to calls",
        bands: &[("rumble", 0.0, 60.0, Reduce(80.0)), ("calls", 90.0, 6000.0, Keep(0.1))],
        by_hand: Some(4),
        ..PLAIN
    },
    Task {
        name: "whine above calls",
        bands: &[("calls", 100.0, 6000.0, Keep(0.5)), ("whine", 15_700.0, 15_900.0, Reduce(40.0))],
        by_hand: Some(2),
        ..PLAIN
    },
    // Two notches a line: one alone is too shallow, or takes more than it may.
    Task {
        name: "hum row with exceptions",
        bands: &[("calls", 90.0, 6000.0, KeepExcept(0.5, &["hum"]))],
        rows: &[("hum", 100.0, 0.2, 5, 20.0)],
        by_hand: Some(10),
        ..PLAIN
    },
    // An elliptic stop of order 3 a line.
    Task {
        name: "wide hum row with exceptions",
        bands: &[("calls", 70.0, 6000.0, KeepExcept(0.5, &["hum"]))],
        rows: &[("hum", 100.0, 1.0, 4, 30.0)],
        by_hand: Some(12),
        ..PLAIN
    },
    Task {
        name: "reed bed: rumble, hum and whine",
        bands: &[
            ("rumble", 0.0, 30.0, Reduce(30.0)),
            ("calls", 120.0, 6000.0, KeepExcept(0.5, &["hum"])),
            ("whine", 15_750.0, 15_850.0, Reduce(30.0)),
        ],
        rows: &[("hum", 50.0, 0.4, 8, 25.0)],
        by_hand: Some(18),
        ..PLAIN
    },
    Task {
        name: "a band between two noises",
        bands: &[
            ("surf", 0.0, 300.0, Reduce(50.0)),
            ("song", 500.0, 4000.0, Keep(0.3)),
            ("insects", 6000.0, 20_000.0, Reduce(50.0)),
        ],
        by_hand: Some(7),
        ..PLAIN
    },
    Task {
        name: "narrow gap below",
        bands: &[("pump", 0.0, 95.0, Reduce(50.0)), ("boom", 100.0, 200.0, Keep(0.5))],
        by_hand: Some(5),
        ..PLAIN
    },
    Task {
        name: "line between two kept bands",
        bands: &[
            ("low", 20.0, 900.0, Keep(0.2)),
            ("tone", 990.0, 1010.0, Reduce(50.0)),
            ("high", 1100.0, 10_000.0, Keep(0.2)),
        ],
        by_hand: Some(3),
        ..PLAIN
    },
    Task {
        name: "a tenth of a decibel",
        bands: &[("rumble", 0.0, 50.0, Reduce(60.0)), ("calls", 100.0, 10_000.0, Keep(0.1))],
        by_hand: Some(3),
        ..PLAIN
    },
    Task {
        name: "low rate",
        rates_hz: &[2000],
        bands: &[("whale", 15.0, 120.0, Keep(0.5)), ("ship", 200.0, 900.0, Reduce(40.0))],
        by_hand: Some(3),
        ..PLAIN
    },
    Task {
        name: "high rate",
        rates_hz: &[384_000],
        bands: &[("sonic", 0.0, 15_000.0, Reduce(60.0)), ("bats", 20_000.0, 120_000.0, Keep(0.5))],
        by_hand: Some(4),
        ..PLAIN
    },
    Task {
        name: "rumble and a weak line beside it",
        bands: &[
            ("rumble", 0.0, 20.0, Reduce(60.0)),
            ("belt", 44.0, 46.0, Reduce(10.0)),
            ("calls", 60.0, 6000.0, Keep(0.5)),
        ],
        by_hand: Some(4),
        ..PLAIN
    },
    Task {
        name: "zero phase rumble",
        bands: &[("rumble", 0.0, 40.0, Reduce(60.0)), ("calls", 90.0, 6000.0, Keep(0.5))],
        zero: true,
        by_hand: Some(2),
        ..PLAIN
    },
    Task {
        name: "zero phase tone",
        bands: &[
            ("low", 20.0, 900.0, Keep(0.2)),
            ("tone", 990.0, 1010.0, Reduce(50.0)),
            ("high", 1100.0, 10_000.0, Keep(0.2)),
        ],
        zero: true,
        by_hand: Some(2),
        ..PLAIN
    },
    Task {
        name: "two rates, one near its end",
        rates_hz: &[16_000, 48_000],
        bands: &[("calls", 100.0, 5000.0, Keep(0.5)), ("hiss", 7000.0, 7900.0, Reduce(50.0))],
        by_hand: Some(3),
        ..PLAIN
    },
    Task {
        name: "whine that only fits the higher rate",
        rates_hz: &[22_050, 96_000],
        head: "beyond_half_rate = \"leave-out\"\n",
        bands: &[
            ("rumble", 0.0, 25.0, Reduce(40.0)),
            ("calls", 80.0, 9000.0, Keep(0.3)),
            ("whine", 15_700.0, 15_900.0, Reduce(45.0)),
        ],
        by_hand: Some(4),
        ..PLAIN
    },
    Task {
        name: "two tones in one gap",
        bands: &[
            ("low", 50.0, 800.0, Keep(0.3)),
            ("tone a", 990.0, 1000.0, Reduce(40.0)),
            ("tone b", 1300.0, 1310.0, Reduce(30.0)),
            ("high", 1600.0, 9000.0, Keep(0.3)),
        ],
        by_hand: Some(4),
        ..PLAIN
    },
    Task {
        name: "one tone with exception",
        bands: &[("tone", 996.0, 998.0, Reduce(27.0)), ("all", 100.0, 20_000.0, KeepExcept(0.3, &["tone"]))],
        by_hand: Some(2),
        ..PLAIN
    },
    Task {
        name: "line under calls at 50 Hz",
        bands: &[("mains", 49.5, 50.5, Reduce(40.0)), ("calls", 70.0, 8000.0, Keep(0.2))],
        by_hand: Some(2),
        ..PLAIN
    },
    Task {
        name: "rough keep, little reduction",
        bands: &[("wind", 0.0, 100.0, Reduce(12.0)), ("speech", 300.0, 3400.0, Keep(1.0))],
        by_hand: Some(1),
        ..PLAIN
    },
    Task {
        name: "speech between wind and hiss",
        rates_hz: &[8000],
        bands: &[
            ("wind", 0.0, 100.0, Reduce(30.0)),
            ("speech", 250.0, 3000.0, Keep(1.0)),
            ("hiss", 3600.0, 4000.0, Reduce(30.0)),
        ],
        by_hand: Some(4),
        ..PLAIN
    },
    Task {
        name: "two kept bands and noise all around",
        bands: &[
            ("surf", 0.0, 200.0, Reduce(40.0)),
            ("bittern", 300.0, 500.0, Keep(0.5)),
            ("engine", 800.0, 1000.0, Reduce(40.0)),
            ("warbler", 1800.0, 6000.0, Keep(0.5)),
            ("crickets", 9000.0, 20_000.0, Reduce(40.0)),
        ],
        by_hand: Some(9),
        ..PLAIN
    },
];
