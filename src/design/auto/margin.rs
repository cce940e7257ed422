//! What every requirement holds with to spare, so that neither rounding nor a small edit of
//! the written stages breaks it.

/// Part of `keep_db` that is left over: everything a keep band loses stays within 95 % of it.
pub const KEEP_SPARE: f64 = 0.05;

/// Part of `reduce_db` that is left over: a reduce band falls by 102 % of it.
pub const REDUCE_SPARE: f64 = 0.02;

/// What a keep band may lose, dB.
pub fn keep_limit_db(keep_db: f64) -> f64 {
    (1.0 - KEEP_SPARE) * keep_db
}

/// What a reduce band must fall by, dB.
pub fn reduce_need_db(reduce_db: f64) -> f64 {
    (1.0 + REDUCE_SPARE) * reduce_db
}
