//! Powers, levels and the rounding of figures.

/// Figures below this level, in dBFS, are not given: below it arithmetic, not the
/// recording, speaks.
pub const LOWEST_DBFS: f64 = -200.0;

/// 10 log10 of a power ratio; minus infinity for 0.
pub fn ratio_db(ratio: f64) -> f64 {
    10.0 * libm::log10(ratio)
}

/// The power ratio of `db`.
pub fn ratio(db: f64) -> f64 {
    libm::pow(10.0, db / 10.0)
}

/// Rounds a figure to the 0.001 the report shows, without negative zero.
pub fn rounded(figure: f64) -> f64 {
    (figure * 1000.0).round() / 1000.0 + 0.0
}

/// Level of a mean square against a full-scale sine (mean square 0.5), rounded;
/// `None` below [`LOWEST_DBFS`].
pub fn level_dbfs(mean_square: f64) -> Option<f64> {
    let dbfs = ratio_db(2.0 * mean_square);
    (dbfs.is_finite() && dbfs >= LOWEST_DBFS).then(|| rounded(dbfs))
}

/// Power, relative to a full-scale sine, of a level as shown; 0 where none is shown.
pub fn shown_power(dbfs: Option<f64>) -> f64 {
    dbfs.map_or(0.0, ratio)
}

/// A power ratio in dB, rounded; `None` unless finite.
pub fn shown_ratio_db(of: f64, to: f64) -> Option<f64> {
    let db = ratio_db(of / to);
    db.is_finite().then(|| rounded(db))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_full_scale_sine_is_0_dbfs_and_silence_has_no_level() {
        assert_eq!(level_dbfs(0.5), Some(0.0));
        assert_eq!(level_dbfs(0.5e-20), Some(-200.0));
        assert_eq!(level_dbfs(0.499e-20), None);
        assert_eq!(level_dbfs(0.0), None);
        assert_eq!(level_dbfs(f64::NAN), None);
    }

    #[test]
    fn rounding_leaves_no_negative_zero() {
        assert!(rounded(-0.0001).is_sign_positive());
        assert_eq!(rounded(-97.21349), -97.213);
    }
}
