//! Which roots of a list are one another's conjugates.

use super::transfer::{Coefficient, Root};

/// For each of `roots` the index of its conjugate in the list, each of which is that of one
/// root only: its own for a root on the real axis, `None` for one off it that has none.
///
/// From the first root on each is paired with the nearest that can be its conjugate and is
/// not taken: within half a unit of the last digits given, since both were rounded to them.
pub fn conjugates(roots: &[Root]) -> Vec<Option<usize>> {
    let real = |(index, root): (usize, &Root)| (root.im.value == 0.0).then_some(index);
    let mut mates: Vec<Option<usize>> = roots.iter().enumerate().map(real).collect();
    for (index, root) in roots.iter().enumerate() {
        if mates[index].is_some() {
            continue;
        }
        let candidates = (index + 1..roots.len()).filter(|&other| mates[other].is_none());
        let nearest = candidates
            .filter(|&other| is_conjugate(root, &roots[other]))
            .min_by(|&a, &b| distance(root, &roots[a]).total_cmp(&distance(root, &roots[b])));
        if let Some(other) = nearest {
            (mates[index], mates[other]) = (Some(other), Some(index));
        }
    }
    mates
}

/// Whether two roots are conjugates within half a unit of their last given digits.
fn is_conjugate(root: &Root, other: &Root) -> bool {
    let is_near = |a: Coefficient, b: f64, unit: f64| {
        // The difference itself is rounded.
        (a.value - b).abs() <= 0.5 * a.unit.max(unit) + f64::EPSILON * a.value.abs()
    };
    let is_across = (root.im.value > 0.0) != (other.im.value > 0.0);
    is_across && is_near(root.re, other.re.value, other.re.unit) && is_near(root.im, -other.im.value, other.im.unit)
}

/// How far a root is from the conjugate of another, along both axes.
fn distance(root: &Root, other: &Root) -> f64 {
    (root.re.value - other.re.value).abs() + (root.im.value + other.im.value).abs()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn each_root_has_one_mate_and_the_nearest_comes_first() {
        let c = |value: f64| Coefficient { value, unit: 0.1 };
        let root = |re: f64, im: f64| Root { re: c(re), im: c(im) };
        let roots = [root(0.5, 0.2), root(0.3, 0.0), root(0.5, -0.25), root(0.5, -0.2), root(0.5, 0.2), root(0.9, 0.4)];
        assert_eq!(conjugates(&roots), [Some(3), Some(1), Some(4), Some(0), Some(2), None]);
    }
}
