//! A small linear congruential generator, so that the town is the same on every machine and in every year.

/// Knuth's MMIX constants (The Art of Computer Programming, volume 2, section 3.3.4).
pub struct Lcg(u64);

impl Lcg {
    /// A generator that starts from `seed`.
    pub fn new(seed: u64) -> Self {
        let mut lcg = Lcg(seed);
        for _ in 0..8 {
            lcg.unit();
        }
        lcg
    }

    /// From 0 up to, but not, 1.
    pub fn unit(&mut self) -> f64 {
        self.0 = self
            .0
            .wrapping_mul(6_364_136_223_846_793_005)
            .wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 33) as f64 / (1u64 << 31) as f64
    }

    /// From `low` up to, but not, `high`.
    pub fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.unit()
    }

    /// A whole number below `count`.
    pub fn below(&mut self, count: usize) -> usize {
        (self.unit() * count as f64) as usize
    }

    /// True in `share` of the calls.
    pub fn chance(&mut self, share: f64) -> bool {
        self.unit() < share
    }
}
