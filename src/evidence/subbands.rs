//! How a band is divided: into up to 32 sub-bands of equal ratio, none under 10 bins; of a
//! pair that something else filtered, into as many as ten bins each allow.

use super::ranges::Owned;
use crate::spectrum::VARIANCE_BINS;
use std::ops::Range;

/// Most sub-bands of a band.
pub const MOST: usize = 32;

/// Fewest bins of a sub-band (unless the whole band has fewer).
pub const FEWEST_BINS: usize = 10;

/// One sub-band: the stretches of bins it holds, rising and disjoint. Several only
/// where it spans excepted ranges.
pub type SubBand = Vec<Range<usize>>;

/// Divides the bins of a band.
///
/// Edges are logarithmic; where that leaves room for them all, excepted ranges are
/// edges too: the phase turns quickly at a notch, and one delay does not fit both of
/// its sides. A piece between two exceptions with fewer than 10 bins is then left out
/// (it stays unresolved).
pub fn divide(own: &Owned) -> Vec<SubBand> {
    let total = own.bins();
    if total < 2 * FEWEST_BINS {
        return if total == 0 { Vec::new() } else { vec![own.pieces.clone()] };
    }
    let large: Vec<Range<usize>> = own.pieces.iter().filter(|p| p.len() >= FEWEST_BINS).cloned().collect();
    if large.is_empty() || large.len() > MOST / 2 {
        return along(&own.pieces, &edges(&own.pieces, MOST), FEWEST_BINS);
    }
    // One more edge for each exception: together at most MOST sub-bands.
    let edges = edges(&large, MOST + 1 - large.len());
    large.iter().flat_map(|piece| along(std::slice::from_ref(piece), &edges, FEWEST_BINS)).collect()
}

/// Fewest independent values (segments * bins / 2.76) of a sub-band of [`divide_finely`].
/// With ten bins of one segment it would have 3.6, and its error would be known to within
/// a half at best; ten are 28 bins of one segment, 14 of two, 10 from three segments up.
const FEWEST_INDEPENDENT: f64 = 10.0;

/// Divides the bins of a band as finely as ten bins allow, all as wide as each other.
///
/// No design stands behind the rest of a pair: a dip narrower than a sub-band is not
/// seen, so these are as narrow as can be judged, not wider with frequency. Excepted
/// ranges are edges; a piece between two of them with fewer than 10 bins is left out
/// unless all are so small.
pub fn divide_finely(own: &Owned, segments: usize) -> Vec<SubBand> {
    let asked = FEWEST_INDEPENDENT * VARIANCE_BINS / segments.max(1) as f64;
    let fewest = (libm::ceil(asked) as usize).max(FEWEST_BINS);
    let total = own.bins();
    if total < 2 * FEWEST_BINS {
        return if total == 0 { Vec::new() } else { vec![own.pieces.clone()] };
    }
    if own.pieces.iter().all(|piece| piece.len() < FEWEST_BINS) {
        let ends: Vec<usize> = own.pieces.iter().map(|piece| piece.end).collect();
        return along(&own.pieces, &ends, fewest);
    }
    let mut out = Vec::with_capacity(total / fewest + 1);
    for piece in own.pieces.iter().filter(|piece| piece.len() >= FEWEST_BINS) {
        let parts = (piece.len() / fewest).max(1);
        let edge = |part: usize| piece.start + piece.len() * part / parts;
        // A sub-band is a list of stretches, here of one.
        out.extend((0..parts).map(|part| std::iter::once(edge(part)..edge(part + 1)).collect::<SubBand>()));
    }
    out
}

/// The inner edges of `parts` logarithmic parts.
fn edges(pieces: &[Range<usize>], parts: usize) -> Vec<usize> {
    let (Some(first), Some(last)) = (pieces.first(), pieces.last()) else { return Vec::new() };
    let (low, high) = (first.start.max(1) as f64, last.end as f64);
    (1..parts).map(|i| libm::round(low * libm::pow(high / low, i as f64 / parts as f64)) as usize).collect()
}

/// Cuts `pieces` at those `edges` that leave at least `fewest` bins on each side.
fn along(pieces: &[Range<usize>], edges: &[usize], fewest: usize) -> Vec<SubBand> {
    let mut out: Vec<SubBand> = Vec::new();
    let mut open: SubBand = Vec::new();
    let mut left: usize = pieces.iter().map(ExactSizeIterator::len).sum();
    for piece in pieces {
        let mut start = piece.start;
        for &edge in edges.iter().filter(|edge| piece.start < **edge && **edge <= piece.end) {
            let held = open.iter().map(ExactSizeIterator::len).sum::<usize>() + (edge - start);
            if held >= fewest && left >= held + fewest && edge > start {
                open.push(start..edge);
                out.push(std::mem::take(&mut open));
                left -= held;
                start = edge;
            }
        }
        if start < piece.end {
            open.push(start..piece.end);
        }
    }
    if !open.is_empty() {
        out.push(open);
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn owned(cuts: &[usize]) -> Owned {
        let mut pieces = Vec::new();
        let mut at = 5;
        for pair in cuts.chunks(2) {
            let start = at + pair[0];
            let end = start + pair.get(1).copied().unwrap_or(1).max(1);
            pieces.push(start..end);
            at = end + 1;
        }
        Owned { pieces, hidden: 0, beyond: 0 }
    }

    proptest! {
        #[test]
        fn sub_bands_are_disjoint_few_and_not_narrow(cuts in prop::collection::vec(0usize..400, 1..120)) {
            let own = owned(&cuts);
            let parts = divide(&own);
            prop_assert!(parts.len() <= MOST && !parts.is_empty());
            let bins: Vec<usize> = parts.iter().flatten().cloned().flatten().collect();
            prop_assert!(bins.windows(2).all(|pair| pair[0] < pair[1]));
            prop_assert!(bins.iter().all(|bin| own.contains(*bin)));
            for part in &parts {
                let held: usize = part.iter().map(ExactSizeIterator::len).sum();
                prop_assert!(held >= FEWEST_BINS || parts.len() == 1);
            }
            let small: usize = own.pieces.iter().map(ExactSizeIterator::len).filter(|n| *n < FEWEST_BINS).sum();
            prop_assert!(bins.len() + small >= own.bins());
        }
    }

    proptest! {
        #[test]
        fn fine_sub_bands_are_disjoint_and_as_narrow_as_can_be_judged(
            cuts in prop::collection::vec(0usize..400, 1..120),
            segments in 0usize..12,
        ) {
            let own = owned(&cuts);
            let parts = divide_finely(&own, segments);
            prop_assert!(!parts.is_empty());
            let bins: Vec<usize> = parts.iter().flatten().cloned().flatten().collect();
            prop_assert!(bins.windows(2).all(|pair| pair[0] < pair[1]));
            prop_assert!(bins.iter().all(|bin| own.contains(*bin)));
            let fewest = if segments >= 3 { 10 } else { [28, 28, 14][segments] };
            let small = |piece: &&Range<usize>| piece.len() < FEWEST_BINS;
            let all_small = own.pieces.iter().all(|piece| piece.len() < FEWEST_BINS);
            for part in &parts {
                let held: usize = part.iter().map(ExactSizeIterator::len).sum();
                prop_assert!(held >= FEWEST_BINS || parts.len() == 1);
                // Of one piece: narrower than twice what can be judged.
                prop_assert!(part.len() > 1 || held < 2 * fewest || parts.len() == 1, "{} {}", held, fewest);
            }
            let left_out: usize = own.pieces.iter().filter(small).map(ExactSizeIterator::len).sum();
            let missing = if all_small { 0 } else { left_out };
            prop_assert!(bins.len() + missing >= own.bins());
        }
    }

    #[test]
    fn a_wide_band_of_a_pair_has_as_many_sub_bands_as_ten_bins_each_allow() {
        let own = Owned { pieces: std::iter::once(900..60_000).collect(), hidden: 0, beyond: 0 };
        assert_eq!(divide_finely(&own, 11).len(), 5910);
        assert_eq!(divide_finely(&own, 1).len(), 59_100 / 28);
    }

    #[test]
    fn a_wide_band_has_32_logarithmic_sub_bands() {
        let pieces = std::iter::once(1000..64_000).collect();
        let parts = divide(&Owned { pieces, hidden: 0, beyond: 0 });
        assert_eq!(parts.len(), 32);
        for part in &parts {
            // 64^(1/32); half a bin of rounding at either end.
            let ratio = part[0].end as f64 / part[0].start as f64;
            assert!((ratio - 1.138_789).abs() < 1.2e-3, "{part:?}");
        }
    }
}
