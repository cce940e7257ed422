//! Parts of reports to test with. The figures are made up.

use bandproof::report::*;
use bandproof::section::Section;
use bandproof::spec::{Band, BeyondHalfRate, Extent, OutputSpec, Phase, Requirement, Spec};

pub fn db(value: f64) -> Option<Db> {
    Db::new(value)
}

pub fn finite(value: f64) -> Finite {
    Finite::new(value).unwrap()
}

pub fn hz(value: f64) -> Hz {
    Hz::new(value).unwrap()
}

pub fn seconds(value: f64) -> Seconds {
    Seconds::new(value).unwrap()
}

pub fn reduce(limit: f64) -> Option<Require> {
    Some(Require::ReduceDb(finite(limit)))
}

/// A spec of single bands.
pub fn spec(bands: &[(&str, Requirement)]) -> Spec {
    Spec {
        phase: Phase::Causal,
        auto: None,
        reference_band: None,
        rate: None,
        title: None,
        beyond_half_rate: BeyondHalfRate::Error,
        output: OutputSpec::default(),
        stages: Vec::new(),
        bands: bands
            .iter()
            .map(|(name, requirement)| Band {
                name: (*name).to_owned(),
                extent: Extent::Range { from_hz: 49.5, to_hz: 50.5 },
                requirement: requirement.clone(),
            })
            .collect(),
    }
}

pub fn band(name: &str, require: Option<Require>, verdict: Option<Verdict>) -> BandEntry {
    BandEntry {
        name: name.to_owned(),
        from_hz: hz(49.5),
        to_hz: hz(50.5),
        require,
        before_dbfs: None,
        before_floor_dbfs: None,
        after_dbfs: None,
        after_floor_dbfs: None,
        measured_attenuation_db: None,
        demonstrable_attenuation_db: None,
        line_hz: None,
        line_before_dbfs: None,
        line_after_dbfs: None,
        gain_min_db: None,
        gain_max_db: None,
        gain_error_db: None,
        resolved: None,
        resolution_hz: None,
        verdict,
        reason_code: None,
        reason: None,
    }
}

pub fn hum() -> BandEntry {
    BandEntry {
        before_dbfs: db(-31.2),
        before_floor_dbfs: db(-104.0),
        after_dbfs: db(-86.0),
        after_floor_dbfs: db(-102.2),
        measured_attenuation_db: db(54.8),
        demonstrable_attenuation_db: db(71.0),
        line_hz: Some(hz(50.02)),
        line_before_dbfs: db(-31.3),
        line_after_dbfs: db(-88.1),
        resolution_hz: Some(hz(0.2)),
        ..band("pump hum x1", reduce(30.0), Some(Verdict::Met))
    }
}

pub fn calls() -> BandEntry {
    BandEntry {
        from_hz: hz(90.0),
        to_hz: hz(6000.0),
        gain_min_db: db(-0.21),
        gain_max_db: db(0.004),
        gain_error_db: db(0.013),
        resolved: Share::new(0.87),
        resolution_hz: Some(hz(0.2)),
        reason_code: Some(ReasonCode::NothingThere),
        reason: Some("nothing in the band stands above its floor".to_owned()),
        ..band("bird calls", Some(Require::KeepDb(finite(0.5))), Some(Verdict::Unproven))
    }
}

pub fn done(path: &str, channels: Vec<Vec<BandEntry>>) -> Recording {
    let channels = channels.into_iter().zip(1..).map(|(bands, channel)| ChannelEntry { channel, bands }).collect();
    Recording {
        path: path.to_owned(),
        status: Status::Done,
        error: None,
        notes: vec!["the data chunk ends 12 bytes before its declared size".to_owned()],
        input: Some(Input {
            sha256: Some("1f".repeat(32)),
            bytes: 5_760_044,
            rate_hz: 48_000,
            channels: 1,
            encoding: "pcm16".to_owned(),
            frames: 2_880_000,
            seconds: Seconds::of_frames(2_880_000, 48_000),
            full_scale_runs: Some(0),
            time_expansion: finite(1.0),
        }),
        output: Some(OutputFile {
            path: path.to_owned(),
            sha256: "2e".repeat(32),
            bytes: 5_760_044,
            encoding: "pcm16".to_owned(),
            peak_dbfs: db(-3.2),
            clipped_samples: 0,
            gain_db: finite(0.0),
        }),
        chunks: vec![ChunkEntry::new(*b"bext", 602, true), ChunkEntry::new(*b"data", 5_760_000, false)],
        spectrum: SpectrumEntry::new(48_000, 480_000, 11, 105_600),
        pair: None,
        channels,
    }
}

/// A recording of `measure`: nothing written, the recording after in its place.
pub fn paired(path: &str, channels: Vec<Vec<BandEntry>>) -> Recording {
    Recording {
        output: None,
        pair: Some(Pair {
            path: path.to_owned(),
            sha256: Some("4c".repeat(32)),
            bytes: 8_640_044,
            encoding: "pcm24".to_owned(),
            frames: 2_880_480,
            full_scale_runs: Some(2),
            delay_frames: Finite::new(1441.25),
            delay_source: Some(DelaySource::Found),
            max_delay_s: Some(seconds(10.0)),
            clock_ppm: Finite::new(-3.5),
            clock_error_ppm: Finite::new(0.02),
            delay_scatter_s: Some(seconds(0.000_002)),
            inverted: Some(true),
            overlap_frames: Some(2_879_039),
            noise_sha256: Some("9e".repeat(32)),
            reference_gain_db: Some(vec![Db::new(-6.02).unwrap(), Db::new(0.25).unwrap()]),
            design_deviation_db: db(-0.034),
            design_deviation_error_db: db(0.009),
            design_deviation_at_hz: Some(hz(4310.5)),
        }),
        ..done(path, channels)
    }
}

fn methods() -> Methods {
    let transition = |pass_hz: f64, stop_hz: f64, width_hz: f64| MethodsTransition {
        pass_hz: Some(hz(pass_hz)),
        pass_db: finite(0.1),
        stop_hz: Some(hz(stop_hz)),
        stop_db: Some(finite(40.0)),
        width_hz: Some(hz(width_hz)),
    };
    Methods {
        sentence: "Recordings were filtered.".to_owned(),
        program: "bandproof 0.1.0".to_owned(),
        applied: true,
        rate_hz: 48_000,
        design: Some("analog prototypes".to_owned()),
        total_order: 2,
        sections: 1,
        passes: 1,
        direction: "forward".to_owned(),
        causal: true,
        phase: "non-linear".to_owned(),
        start_state: Some("steady".to_owned()),
        settling_s: seconds(2.2),
        arithmetic: Some("double precision".to_owned()),
        dither: "triangular-1".to_owned(),
        stages: vec![MethodsStage {
            stage: 1,
            kind: "bandstop".to_owned(),
            family: Some("elliptic".to_owned()),
            order: Some(1),
            total_order: 2,
            sections: 1,
            edge_definition: Some(EdgeDefinition::RippleEnds),
            ripple_db: Some(finite(0.1)),
            stop_db: Some(finite(40.0)),
            lines: vec![MethodsLine {
                line: Some(1),
                edges_hz: vec![hz(48.4), hz(51.6)],
                transitions: vec![transition(48.4, 49.52, 1.12), transition(51.6, 50.43, 1.17)],
            }],
        }],
        bands: vec![MethodsBand {
            name: "pump hum x1".to_owned(),
            from_hz: hz(49.5),
            to_hz: hz(50.5),
            require: reduce(30.0),
            attenuation_db: db(32.9),
            deviation_db: None,
            group_delay_s: None,
        }],
    }
}

fn limit(edge: LimitEdge, at_hz: f64, limit_db: f64, slack_db: f64) -> LimitEntry {
    LimitEntry { edge, at_hz: hz(at_hz), limit_db: finite(limit_db), slack_db: Db::new(slack_db).unwrap() }
}

pub fn design() -> DesignEntry {
    DesignEntry {
        methods: methods(),
        rate_hz: 48_000,
        left_out: vec![LeftOutEntry {
            what: "band \"whine\"".to_owned(),
            reason: "its upper edge of 25000 Hz lies above half the sample rate of 48000 Hz".to_owned(),
        }],
        stages: vec![StageEntry {
            stage: 1,
            line: Some(1),
            kind: "bandstop".to_owned(),
            family: Some("elliptic".to_owned()),
            order: Some(1),
            total_order: 2,
            sections: 1,
            edges_hz: vec![hz(48.4), hz(51.6)],
            ripple_db: Some(finite(0.1)),
            stop_db: Some(finite(40.0)),
            limits: vec![
                limit(LimitEdge::Pass, 48.4, 0.1, 0.0),
                limit(LimitEdge::Pass, 51.6, 0.1, 0.0),
                limit(LimitEdge::Stop, 49.5, 40.0, 0.125),
                limit(LimitEdge::Stop, 50.5, 40.0, 0.25),
            ],
            remarks: vec!["a remark on this stage".to_owned()],
        }],
        sections: vec![Section { b: [1.0, -1.99, 1.0], a: [1.0, -1.98, 0.1 + 0.2] }],
        passes: 1,
        settling_s: seconds(2.2),
        max_pole_radius: finite(0.99987),
        rounding_db: finite(3.1e-9),
        rounding_at_hz: Some(hz(51.6)),
        dither: "triangular-1".to_owned(),
        bands: vec![DesignBand {
            name: "pump hum x1".to_owned(),
            from_hz: hz(49.5),
            to_hz: hz(50.5),
            require: reduce(30.0),
            attenuation_min_db: Db::new(32.9).unwrap(),
            attenuation_max_db: Db::new(180.0).unwrap(),
            reaches_from_hz: Some(hz(49.44)),
            reaches_to_hz: Some(hz(50.52)),
            excepted_hz: hz(0.0),
            group_delay_s: None,
            startup_s: Some(seconds(0.55)),
            shortest_s: Some(seconds(12.2)),
            check: Some(CheckResult::Guaranteed),
            violation: None,
        }],
        witness: Some(WitnessEntry {
            agrees: true,
            bands: vec![WitnessBand {
                name: "pump hum x1".to_owned(),
                attenuation_min_db: db(32.9),
                attenuation_max_db: db(180.0),
            }],
        }),
    }
}

pub fn head() -> Head {
    let run = Run {
        started: "2031-05-02T06:10:00Z".to_owned(),
        seconds: seconds(12.4),
        jobs: 2,
        witness_deviation: Finite::new(3.1e-11),
    };
    let spec = SpecEntry {
        title: Some("Reed bed".to_owned()),
        file_sha256: "3d".repeat(32),
        normalized: serde_json::json!({"title": "Reed bed", "band": [{"name": "pump hum", "reduce_db": 30.0}]}),
    };
    Head { tool_version: "0.1.0".to_owned(), ..Head::new(run, true, spec, vec![design()]) }
}

/// Bytes of a report of `recordings`, written by path whatever their order is here.
pub fn written(spec: &Spec, recordings: &[Recording]) -> Vec<u8> {
    let mut summary = SummaryBuilder::new(spec).unwrap();
    let mut lines = Vec::new();
    for recording in recordings {
        summary.add(recording);
        lines.push((recording.path.clone(), serde_json::to_string(recording).unwrap()));
    }
    lines.sort();
    let (summary, _) = summary.finish(Skipped { dot_underscore: 0, other_files: 3 });
    let mut bytes = Vec::new();
    write_report(&mut bytes, &head(), lines.into_iter().map(|(_, line)| Ok(line)), &summary).unwrap();
    bytes
}
