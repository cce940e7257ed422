//! A small generator of pseudo-random numbers, the same on every machine.

/// splitmix64: G. L. Steele, D. Lea, C. H. Flood, "Fast splittable pseudorandom number
/// generators", OOPSLA 2014, with the mixing constants of their reference code.
#[derive(Clone, Debug)]
pub struct Random(u64);

impl Random {
    /// The numbers of one case. Cases do not depend on one another, so that any of them
    /// can be replayed alone.
    pub fn of_case(seed: u64, case: u64) -> Self {
        let mut of_seed = Random(seed);
        let mut of_case = Random(of_seed.next() ^ case);
        Random(of_case.next())
    }

    pub fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }

    /// 0 to `end` - 1; 0 where there is nothing to choose from. (The bias of the remainder
    /// is below 2^-40 for every range used here.)
    pub fn below(&mut self, end: usize) -> usize {
        if end == 0 { 0 } else { (self.next() % end as u64) as usize }
    }

    pub fn one_in(&mut self, n: usize) -> bool {
        self.below(n) == 0
    }

    pub fn pick<T: Clone>(&mut self, of: &[T]) -> T {
        of[self.below(of.len())].clone()
    }

    pub fn byte(&mut self) -> u8 {
        self.next() as u8
    }

    pub fn bytes(&mut self, count: usize) -> Vec<u8> {
        (0..count).map(|_| self.byte()).collect()
    }
}
