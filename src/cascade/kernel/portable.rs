//! Four lanes as an array, which any processor can do.

use super::{LANE_STEP, MAX_LANES, State, Sweep};

type Lanes = [f64; LANE_STEP];

super::sweeps!();

/// `value` in every lane.
fn all(value: f64) -> Lanes {
    [value; LANE_STEP]
}

fn four(lanes: [f64; LANE_STEP]) -> Lanes {
    lanes
}

fn array(lanes: Lanes) -> [f64; LANE_STEP] {
    lanes
}

/// Each lane's value moved to the next lane, the last of `before` to the first.
fn shift([_, _, _, last]: Lanes, [first, second, third, _]: Lanes) -> Lanes {
    [last, first, second, third]
}

fn add(left: Lanes, right: Lanes) -> Lanes {
    std::array::from_fn(|lane| left[lane] + right[lane])
}

fn sub(left: Lanes, right: Lanes) -> Lanes {
    std::array::from_fn(|lane| left[lane] - right[lane])
}

fn mul(left: Lanes, right: Lanes) -> Lanes {
    std::array::from_fn(|lane| left[lane] * right[lane])
}

fn place(lane: usize) -> usize {
    lane
}

fn pick(lanes: Lanes, place: usize) -> f64 {
    lanes[place]
}
