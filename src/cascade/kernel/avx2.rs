//! Four lanes as an AVX2 vector.
//!
//! The compiler makes such vectors of arrays too, but of these loops now whole ones,
//! now halves and pieces, at up to twice the time.

use super::{LANE_STEP, MAX_LANES, State, Sweep};
use std::arch::x86_64::*;

type Lanes = __m256d;

super::sweeps!(#[target_feature(enable = "avx2")]);

/// `value` in every lane.
#[target_feature(enable = "avx2")]
#[inline]
fn all(value: f64) -> Lanes {
    _mm256_set1_pd(value)
}

#[target_feature(enable = "avx2")]
#[inline]
fn four([first, second, third, last]: [f64; LANE_STEP]) -> Lanes {
    _mm256_setr_pd(first, second, third, last)
}

#[target_feature(enable = "avx2")]
#[inline]
fn array(lanes: Lanes) -> [f64; LANE_STEP] {
    // The compiler makes a single store of this.
    let [low, high] = [_mm256_castpd256_pd128(lanes), _mm256_extractf128_pd::<1>(lanes)];
    let [second, last] = [_mm_unpackhi_pd(low, low), _mm_unpackhi_pd(high, high)];
    [_mm_cvtsd_f64(low), _mm_cvtsd_f64(second), _mm_cvtsd_f64(high), _mm_cvtsd_f64(last)]
}

/// Each lane's value moved to the next lane, the last of `before` to the first.
#[target_feature(enable = "avx2")]
#[inline]
fn shift(before: Lanes, lanes: Lanes) -> Lanes {
    // The upper half of the first with the lower of the second, then of each half of
    // the two the upper with the lower value.
    let middle = _mm256_permute2f128_pd::<0x21>(before, lanes);
    _mm256_shuffle_pd::<0b0101>(middle, lanes)
}

#[target_feature(enable = "avx2")]
#[inline]
fn add(left: Lanes, right: Lanes) -> Lanes {
    _mm256_add_pd(left, right)
}

#[target_feature(enable = "avx2")]
#[inline]
fn sub(left: Lanes, right: Lanes) -> Lanes {
    _mm256_sub_pd(left, right)
}

#[target_feature(enable = "avx2")]
#[inline]
fn mul(left: Lanes, right: Lanes) -> Lanes {
    _mm256_mul_pd(left, right)
}

/// What brings `lane` to the front: the numbers of its two halves.
#[target_feature(enable = "avx2")]
#[inline]
fn place(lane: usize) -> __m256i {
    let half = 2 * lane as i32;
    _mm256_setr_epi32(half, half + 1, 0, 0, 0, 0, 0, 0)
}

#[target_feature(enable = "avx2")]
#[inline]
fn pick(lanes: Lanes, place: __m256i) -> f64 {
    let moved = _mm256_permutevar8x32_epi32(_mm256_castpd_si256(lanes), place);
    _mm256_cvtsd_f64(_mm256_castsi256_pd(moved))
}
