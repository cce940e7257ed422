//! What a dry run found, for people and as JSON.

use super::color::{Palette, Style};
use super::exit::Exit;
use super::table::{Table, wrapped};
use super::units::{counted, seconds};
use super::{WIDTH, design_found, design_text};
use bandproof::job::{DryRun, FilterJob, Outcome, PlannedRecording};
use bandproof::report::SpecEntry;
use serde_json::{Value, json};
use std::path::Path;

/// A dry run ends as the run would: with a failure where a recording can't be processed.
pub fn exit(plan: &DryRun) -> Exit {
    if plan.recordings.iter().any(|recording| recording.fails) { Exit::Failed } else { Exit::Done }
}

/// The plan as one JSON document.
pub fn document(job: &FilterJob, outcome: &Outcome, plan: &DryRun) -> serde_json::Result<Value> {
    let recordings: Vec<_> = plan.recordings.iter().map(planned).collect();
    let mut document = json!({
        "dry_run": true,
        "scanned": job.scan,
        "spec": serde_json::to_value(SpecEntry::new(&plan.spec)?)?,
        "designs": serde_json::to_value(&outcome.designs)?,
        "recordings": recordings,
    });
    if let Some(found) = &outcome.found {
        document["found"] = design_found::document(found)?;
    }
    Ok(document)
}

fn planned(recording: &PlannedRecording) -> Value {
    json!({
        "path": recording.path,
        "output": recording.output,
        "rate_hz": recording.rate_hz,
        "frames": recording.frames,
        "problem": recording.problem,
        "fails": recording.fails,
        "kept": recording.kept,
    })
}

/// The plan for people.
pub fn text(job: &FilterJob, outcome: &Outcome, plan: &DryRun, palette: Palette) -> String {
    let mut text = outcome.found.as_ref().map_or_else(String::new, |found| design_found::text(found, palette) + "\n");
    text.extend(outcome.designs.iter().map(|design| design_text::text(design, palette)));
    // Paths stand last, where a long one stays whole and can be copied.
    let mut table = Table::new([("Rate Hz", true), ("length", true), ("recording", false)]);
    for recording in plan.recordings.iter().filter(|recording| !recording.fails && !recording.kept) {
        let length = match (recording.frames, recording.rate_hz) {
            (Some(frames), Some(rate_hz)) if rate_hz > 0 => seconds(frames as f64 / f64::from(rate_hz)),
            _ => "-".to_owned(),
        };
        let rate = recording.rate_hz.map_or("-".to_owned(), |rate_hz| rate_hz.to_string());
        let mirrored = Path::new(&recording.output).ends_with(&recording.path);
        let path =
            if !mirrored { format!("{} as {}", recording.path, recording.output) } else { recording.path.clone() };
        table.row([rate, length, path].map(|cell| (cell, Style::Plain)));
    }
    text.push_str(&table.render(palette, 0, WIDTH));

    let problems: Vec<_> =
        plan.recordings.iter().filter_map(|one| one.problem.as_ref().map(|problem| (&one.path, problem))).collect();
    if !problems.is_empty() {
        text.push_str(&format!("\n{}\n", palette.paint(Style::Bad, "Would fail or overload")));
        for (path, problem) in &problems {
            text.push_str(&wrapped(&format!("{path}: {problem}"), 2, 6, WIDTH));
        }
    }
    let good = plan.recordings.iter().filter(|recording| !recording.fails && !recording.kept).count() as u64;
    let kept = match outcome.kept {
        0 => String::new(),
        kept => format!(", {} kept from an earlier run", counted(kept, "output")),
    };
    let looked = if job.scan { "every recording was read" } else { "only headers were read, --scan reads all" };
    let looked = if outcome.complete { looked } else { "interrupted, some were not looked at" };
    let end = format!("Dry run, nothing written: {} would be filtered{kept}; {looked}.", counted(good, "recording"));
    text + "\n" + &wrapped(&end, 0, 0, WIDTH)
}

#[cfg(test)]
mod tests {
    use super::*;
    use bandproof::report::{DesignEntry, Skipped, SummaryBuilder};
    use bandproof::spec::{SpecFile, SpecSyntax};

    fn planned(path: &str, problem: Option<&str>) -> PlannedRecording {
        PlannedRecording {
            path: path.to_owned(),
            output: format!("quiet/{path}"),
            rate_hz: problem.is_none().then_some(48_000),
            frames: problem.is_none().then_some(2_880_000),
            problem: problem.map(str::to_owned),
            fails: problem.is_some(),
            kept: false,
        }
    }

    fn case(problem: Option<&str>) -> (FilterJob, Outcome, DryRun) {
        let bytes = b"[[band]]\nname = \"calls\"\nfrom_hz = 1000\nto_hz = 2000\nkeep_db = 1\n";
        let spec = bandproof::spec::parse(bytes, SpecSyntax::Toml, "calls.toml").unwrap();
        let design = bandproof::design::design(&spec, 48_000).unwrap();
        let (summary, highlights) = SummaryBuilder::new(&spec).unwrap().finish(Skipped::default());
        let job = FilterJob {
            spec: SpecFile { spec, file_sha256: "00".repeat(32) },
            spec_path: None,
            input: "raw".into(),
            output: "quiet".into(),
            report: None,
            table: None,
            emit: None,
            replace: false,
            include: Vec::new(),
            exclude: Vec::new(),
            jobs: 1,
            dry_run: true,
            scan: false,
        };
        let outcome = Outcome {
            summary,
            highlights,
            found: None,
            designs: vec![DesignEntry::new(&design, "triangular-1", None).unwrap()],
            report_path: None,
            table_path: None,
            package: Vec::new(),
            seconds: 0.1,
            bytes_read: 0,
            complete: true,
            kept: 0,
            not_done: 0,
            dry: None,
        };
        let plan = DryRun {
            spec: job.spec.clone(),
            recordings: vec![planned("pier-1/0001.wav", None), planned("pier-2/0001.wav", problem)],
        };
        (job, outcome, plan)
    }

    #[test]
    fn a_plan_looks_like_this() {
        let (job, outcome, plan) = case(Some("it holds no frames (empty)"));
        let text = text(&job, &outcome, &plan, Palette::OFF);
        assert_eq!(text, include_str!("../../tests/cli/snapshots/plan.txt"), "\n{text}");
        assert!(text.lines().all(|line| line.chars().count() <= WIDTH));
    }

    #[test]
    fn a_plan_ends_as_its_run_would() {
        assert_eq!(exit(&case(None).2), Exit::Done);
        assert_eq!(exit(&case(Some("it is damaged")).2), Exit::Failed);
        let mut clips = case(Some("12 samples would be saturated at full scale")).2;
        clips.recordings[1].fails = false;
        assert_eq!(exit(&clips), Exit::Done, "overload = \"clip\" asks for it");
    }

    #[test]
    fn a_plan_as_json_says_that_nothing_was_done() {
        let (job, outcome, plan) = case(Some("it is damaged"));
        let document = document(&job, &outcome, &plan).unwrap();
        assert_eq!(document["dry_run"], true);
        assert_eq!(document["recordings"][0]["frames"], 2_880_000);
        assert_eq!(document["recordings"][1]["problem"], "it is damaged");
        assert_eq!(document["designs"][0]["rate_hz"], 48_000);
    }
}
