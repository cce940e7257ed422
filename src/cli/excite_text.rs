//! What an excitation holds, for people and as JSON.

use super::WIDTH;
use super::color::{Palette, Style};
use super::summary_text::required;
use super::table::{Table, wrapped};
use super::units::{bytes, seconds, trimmed};
use bandproof::excite::file::Saved;
use bandproof::excite::{BandLevel, GENERATOR_NAME, PartLevel, Plan};
use bandproof::report::{Db, Hz, NotFinite, Require, Seconds};
use bandproof::spec::{Spec, SpecFile};
use serde_json::{Value, json};
use std::path::Path;

/// The recording as one JSON document.
///
/// # Errors
/// A figure that JSON can't hold.
pub fn document(file: &Path, spec: &SpecFile, plan: &Plan, saved: &Saved) -> Result<Value, NotFinite> {
    let bands = plan.bands.iter().map(band).collect::<Result<Vec<_>, _>>()?;
    let left_out: Vec<_> = plan.left_out.iter().map(|one| json!({"what": one.what, "reason": one.reason})).collect();
    let parts = parts(plan, saved)
        .into_iter()
        .map(|part| {
            Ok(json!({
                "part": part.name,
                "from_s": Seconds::try_from(part.from_s)?,
                "to_s": Seconds::try_from(part.to_s)?,
                "from_hz": Hz::try_from(part.from_hz)?,
                "to_hz": Hz::try_from(part.to_hz)?,
                "peak_dbfs": Db::try_from(part.peak_dbfs())?,
                "level_dbfs": Db::try_from(part.level_dbfs())?,
            }))
        })
        .collect::<Result<Vec<_>, NotFinite>>()?;
    Ok(json!({
        "file": file.to_string_lossy(),
        "bytes": saved.bytes,
        "sha256": saved.sha256,
        "spec": {"title": spec.spec.title, "file_sha256": spec.file_sha256},
        "generator": GENERATOR_NAME,
        "rate_hz": plan.rate_hz,
        "channels": 1,
        "encoding": "pcm24",
        "frames": plan.frames,
        "seconds": Seconds::try_from(plan.seconds())?,
        "parts": parts,
        "left_out": left_out,
        "bands": bands,
        "every_band_s": Seconds::try_from(plan.needs.every_band_s)?,
        "device_noise_s": Seconds::try_from(plan.needs.device_noise_s)?,
        "notes": plan.notes,
    }))
}

fn band(band: &BandLevel) -> Result<Value, NotFinite> {
    let db = |value: Option<f64>| value.map(Db::try_from).transpose();
    Ok(json!({
        "name": band.band.name,
        "from_hz": Hz::try_from(band.band.line.from_hz)?,
        "to_hz": Hz::try_from(band.band.line.to_hz)?,
        "require": Require::new(&band.band.requirement)?,
        "level_dbfs": Db::try_from(band.level_dbfs)?,
        "noise_dbfs": Db::try_from(band.noise_dbfs)?,
        "required_attenuation_db": db(band.required_db)?,
        "demonstrable_16_bit_db": db(band.shown_16_bit_db)?,
        "demonstrable_24_bit_db": db(band.shown_24_bit_db)?,
        // Capped where the stages let nothing at all through.
        "own_stages_attenuation_db": db(band.own_stages_db.map(capped))?,
        "shortest_s": band.shortest_s.map(Seconds::try_from).transpose()?,
    }))
}

fn capped(db: f64) -> f64 {
    db.min(bandproof::design::check::CAP_DB)
}

/// A part with what was written.
struct Shown {
    name: &'static str,
    from_s: f64,
    to_s: f64,
    from_hz: f64,
    to_hz: f64,
    level: PartLevel,
}

impl Shown {
    fn peak_dbfs(&self) -> f64 {
        20.0 * libm::log10(self.level.peak)
    }

    fn level_dbfs(&self) -> f64 {
        10.0 * libm::log10(2.0 * self.level.mean_square)
    }
}

fn parts(plan: &Plan, saved: &Saved) -> [Shown; 2] {
    let half_hz = f64::from(plan.rate_hz) / 2.0;
    let turn_s = plan.sweep.seconds();
    [
        Shown {
            name: "sweep",
            from_s: 0.0,
            to_s: turn_s,
            from_hz: plan.sweep.from_hz,
            to_hz: plan.sweep.to_hz,
            level: saved.written.sweep,
        },
        Shown {
            name: "pink noise",
            from_s: turn_s,
            to_s: plan.seconds(),
            from_hz: plan.pink.lowest_hz(),
            to_hz: half_hz,
            level: saved.written.noise,
        },
    ]
}

/// The recording for people.
pub fn text(file: &Path, spec_path: &Path, spec: &Spec, plan: &Plan, saved: &Saved, palette: Palette) -> String {
    let title = spec.title.as_ref().map_or(String::new(), |title| format!("{title}, "));
    let mut text = wrapped(&format!("Excitation for: {title}{}", spec_path.display()), 0, 2, WIDTH);
    let what = format!(
        "Written: {}, {} at {} Hz, mono, 24 bit, {}",
        file.display(),
        seconds(plan.seconds()),
        plan.rate_hz,
        bytes(saved.bytes)
    );
    text.push_str(&wrapped(&what, 0, 2, WIDTH));
    if !plan.left_out.is_empty() {
        text.push_str(&format!("\n{}\n", palette.paint(Style::Heading, "Left out at this rate")));
        for one in &plan.left_out {
            text.push_str(&wrapped(&format!("{}: {}", one.what, one.reason), 2, 6, WIDTH));
        }
    }
    text.push('\n');
    text.push_str(&part_table(plan, saved).render(palette, 0, WIDTH));
    let note = format!(
        "The sweep rises by an octave every {}. Every octave holds the same level, in either part. Level 0 dBFS is a \
         full-scale sine.",
        seconds(plan.sweep.octave_s())
    );
    text.push_str(&wrapped(&note, 0, 0, WIDTH));
    text.push('\n');
    text.push_str(&band_table(&plan.bands).render(palette, 0, WIDTH));
    text.push_str(&wrapped(&about_bands(plan), 0, 0, WIDTH));
    if !plan.notes.is_empty() {
        text.push_str(&format!("\n{}\n", palette.paint(Style::Open, "Before you measure")));
        for note in &plan.notes {
            text.push_str(&wrapped(note, 2, 6, WIDTH));
        }
    }
    text
}

/// What the table of bands shows, and what the length is enough for.
fn about_bands(plan: &Plan) -> String {
    let device = if plan.bands.iter().any(|band| band.own_stages_db.is_some()) {
        "like the spec's stages"
    } else {
        "whose stops are a little wider than the bands"
    };
    // Whole tenths, rounded up, so that what is read off is enough.
    let from = |needed_s: f64| seconds((needed_s * 10.0).ceil() / 10.0);
    format!(
        "Level: over the whole recording. 16 bit, 24 bit: the largest attenuation that can be shown where a device {device} \
         is recorded so; noise of its own comes on top. Every band can be judged from {} on, and what the device adds can \
         be told from what it lets through from {} on.",
        from(plan.needs.every_band_s),
        from(plan.needs.device_noise_s)
    )
}

fn part_table(plan: &Plan, saved: &Saved) -> Table {
    let mut table = Table::new([
        ("Part", false),
        ("from s", true),
        ("to s", true),
        ("from Hz", true),
        ("to Hz", true),
        ("peak dBFS", true),
        ("level dBFS", true),
    ]);
    for part in parts(plan, saved) {
        let cells = [
            part.name.to_owned(),
            trimmed(part.from_s, 3),
            trimmed(part.to_s, 3),
            trimmed(part.from_hz, 3),
            trimmed(part.to_hz, 3),
            format!("{:.2}", part.peak_dbfs()),
            format!("{:.2}", part.level_dbfs()),
        ];
        table.row(cells.map(plain));
    }
    table
}

fn band_table(bands: &[BandLevel]) -> Table {
    let mut table = Table::new([
        ("Band", false),
        ("from Hz", true),
        ("to Hz", true),
        ("level dBFS", true),
        ("required", false),
        ("16 bit dB", true),
        ("24 bit dB", true),
    ]);
    for band in bands {
        // A requirement is a plain number of a checked spec.
        let require = Require::new(&band.band.requirement).unwrap_or_default();
        let shown = |shown_db: Option<f64>| match (shown_db, band.required_db) {
            (Some(shown_db), Some(required_db)) if shown_db < required_db => (format!("{shown_db:.0}"), Style::Bad),
            (Some(shown_db), _) => plain(format!("{shown_db:.0}")),
            (None, _) => plain("-".to_owned()),
        };
        table.row([
            plain(band.band.name.clone()),
            plain(trimmed(band.band.line.from_hz, 3)),
            plain(trimmed(band.band.line.to_hz, 3)),
            plain(format!("{:.1}", band.level_dbfs)),
            plain(required(require)),
            shown(band.shown_16_bit_db),
            shown(band.shown_24_bit_db),
        ]);
    }
    table
}

fn plain(text: String) -> (String, Style) {
    (text, Style::Plain)
}
