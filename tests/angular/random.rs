//! Random numbers with a fixed, printed seed.

/// A linear congruential generator (Knuth, MMIX constants), high bits out.
pub struct Random {
    state: u64,
}

impl Random {
    pub fn new(seed: u64) -> Self {
        Random { state: seed.wrapping_mul(0x9e37_79b9_7f4a_7c15).wrapping_add(1) }
    }

    pub fn below(&mut self, n: u64) -> u64 {
        self.state = self.state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (self.state >> 33) % n
    }

    pub fn between(&mut self, low: i32, high: i32) -> i32 {
        let width = u64::try_from(high - low + 1).expect("low <= high");
        low + i32::try_from(self.below(width)).expect("small")
    }

    pub fn pick<T: Clone>(&mut self, from: &[T]) -> T {
        let n = u64::try_from(from.len()).expect("small");
        from[usize::try_from(self.below(n)).expect("small")].clone()
    }
}

/// How many cases to run: `usual` times `KETWORK_CASES`, a factor.
pub fn cases(usual: u64) -> u64 {
    let factor = std::env::var("KETWORK_CASES").ok().and_then(|text| text.parse::<f64>().ok()).unwrap_or(1.0);
    let scaled = usual as f64 * factor;
    (scaled as u64).max(1)
}
