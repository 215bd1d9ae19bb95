//! Random numbers for simulations: one seed, one stream a purpose and chunk, the same values on any machine.
//!
//! A simulation is cut into chunks of fixed size and every chunk draws from its own stream. Which thread works on
//! which chunk then has no influence on the result.

mod variates;
mod ziggurat;

use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::{Rng, SeedableRng};
use ziggurat::Tables;

/// Random words fetched at a time.
const BUFFER: usize = 256;

/// A stream of random values that depends only on the seed, the purpose and the chunk number.
///
/// # Method
///
/// ChaCha with eight rounds. The key is the seed with the purpose folded in block by block, each block selecting
/// one of the 2⁶⁴ streams of the key before it; the chunk number selects the stream of the final key. Different
/// purposes or chunks therefore never share values, and every stream holds 2⁶⁷ words.
///
/// # Accuracy
///
/// The distributions are tested in `tests/numerics_solvers/random.rs` with the odds of a false alarm stated there.
///
/// # Sources
///
/// Bernstein (2008), ChaCha, a variant of Salsa20; Goldreich, Goldwasser, Micali (1986), Journal of the ACM 33(4),
/// 792-807, for deriving keys along a path.
///
/// # Example
///
/// ```
/// use sufficit::numerics::random::Stream;
///
/// let mut first = Stream::new([7; 32], "power of the t test", 0);
/// let mut again = Stream::new([7; 32], "power of the t test", 0);
/// assert_eq!(first.normal().to_bits(), again.normal().to_bits());
/// ```
#[derive(Clone)]
pub struct Stream {
    generator: ChaCha8Rng,
    tables: &'static Tables,
    words: [u64; BUFFER],
    used: usize,
}

impl Stream {
    /// Opens the stream of a purpose and chunk.
    pub fn new(seed: [u8; 32], purpose: &str, chunk: u64) -> Self {
        let mut generator = ChaCha8Rng::from_seed(purpose_key(seed, purpose));
        generator.set_stream(chunk);
        Stream { generator, tables: Tables::shared(), words: [0; BUFFER], used: BUFFER }
    }

    /// The next 64 random bits.
    #[inline]
    pub fn bits(&mut self) -> u64 {
        if self.used >= BUFFER {
            self.refill();
        }
        let word = self.words.get(self.used).copied().unwrap_or_default();
        self.used += 1;
        word
    }

    #[cold]
    fn refill(&mut self) {
        let mut bytes = [0; 8 * BUFFER];
        self.generator.fill_bytes(&mut bytes);
        for (word, chunk) in self.words.iter_mut().zip(bytes.as_chunks::<8>().0) {
            *word = u64::from_le_bytes(*chunk);
        }
        self.used = 0;
    }

    /// A value uniform on the open interval (0, 1), a multiple of 2⁻⁵³: neither 0 nor 1 ever comes.
    #[inline]
    pub fn uniform(&mut self) -> f64 {
        const HALF_STEP: f64 = 1.0 / (1u64 << 53) as f64;
        ((self.bits() >> 12 << 1) | 1) as i64 as f64 * HALF_STEP
    }

    /// A whole number uniform on `0..count`, without bias; 0 when `count` is 0.
    ///
    /// # Sources
    ///
    /// Lemire (2019), ACM Transactions on Modeling and Computer Simulation 29(1), article 3.
    #[inline]
    pub fn below(&mut self, count: u64) -> u64 {
        let mut wide = u128::from(self.bits()) * u128::from(count);
        if (wide as u64) < count {
            let threshold = count.wrapping_neg() % count.max(1);
            while (wide as u64) < threshold {
                wide = u128::from(self.bits()) * u128::from(count);
            }
        }
        (wide >> 64) as u64
    }

    /// A standard normal value, by a ziggurat of 256 layers with an exact tail.
    ///
    /// # Sources
    ///
    /// Marsaglia, Tsang (2000), Journal of Statistical Software 5(8). Deviation, after Doornik (2005): the layer
    /// and the position inside it come from different bits of the word.
    #[inline]
    pub fn normal(&mut self) -> f64 {
        let tables = self.tables;
        tables.normal(self)
    }

    /// Fills a slice with standard normal values: the same values as repeated calls of [`Stream::normal`].
    pub fn fill_normal(&mut self, values: &mut [f64]) {
        let tables = self.tables;
        for value in values {
            *value = tables.normal(self);
        }
    }
}

/// Folds the purpose into the seed, eight bytes at a time, its length first so that no purpose continues another.
fn purpose_key(seed: [u8; 32], purpose: &str) -> [u8; 32] {
    let mut key = derived_key(seed, purpose.len() as u64);
    for block in purpose.as_bytes().chunks(8) {
        let mut padded = [0; 8];
        for (to, from) in padded.iter_mut().zip(block) {
            *to = *from;
        }
        key = derived_key(key, u64::from_le_bytes(padded));
    }
    key
}

fn derived_key(key: [u8; 32], block: u64) -> [u8; 32] {
    let mut generator = ChaCha8Rng::from_seed(key);
    generator.set_stream(block);
    let mut derived = [0; 32];
    generator.fill_bytes(&mut derived);
    derived
}
