//! Errors of a simulated dive, as fractions of their bounds.
//!
//! Every fraction lies in [−1, 1] (or in the unit disc), so a simulated error is within its bound by construction.
//! A source of errors is asked by number (of the leg, of the landmark), never in sequence: results depend on neither
//! the order of the questions nor the number of threads.

use nalgebra::Vector2;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use sha2::{Digest, Sha256};

use crate::dive::ErrorShape;

/// Name of the generator, for outputs.
pub const GENERATOR: &str = "ChaCha8";

/// Errors of one leg, as fractions of the bounds.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct LegErrors {
    /// Of the scale error.
    pub scale: f64,
    /// Of the heading noise.
    pub heading_noise: f64,
    /// Of the drift, in the unit disc (east, north).
    pub drift: Vector2<f64>,
}

/// Errors of one sighting, as fractions of the bounds.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct SightingErrors {
    /// Of the slant-range error.
    pub range: f64,
    /// Of the bearing or beam error.
    pub bearing: f64,
    /// Of the altitude error.
    pub altitude: f64,
    /// Uniform in [0, 1): the landmark is missed when this reaches the detection chance.
    pub chance: f64,
}

/// A detection of something that is not on the map.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct StrayDraw {
    /// Distance along the track, metres.
    pub along_m: f64,
    /// Where in the swath, in [−1, 1]: port or starboard side, or the bearing as a fraction of the half-sector.
    pub across: f64,
    /// Horizontal range, in [0, 1] from the nearest to the farthest.
    pub range: f64,
}

/// A source of errors for one dive.
pub trait Errors {
    /// Offset of the start, in the unit disc, as a fraction of the descent scatter.
    fn start_offset(&self) -> Vector2<f64>;
    /// Heading bias, constant over the dive.
    fn heading_bias(&self) -> f64;
    /// True position of a landmark in its box, each component in [−1, 1].
    fn landmark(&self, number: usize) -> Vector2<f64>;
    /// Whether a landmark is gone throughout the dive, when each is with this chance. Never, unless a source draws it.
    fn is_gone(&self, _number: usize, _chance: f64) -> bool {
        false
    }
    /// Errors of a leg.
    fn leg(&self, number: usize) -> LegErrors;
    /// Errors of a sighting. `way` tells the two ways to see one landmark apart (port or starboard, entering or
    /// leaving).
    fn sighting(&self, landmark: usize, way: usize) -> SightingErrors;
    /// Strays along a track of `length_m`, `per_km` of them per kilometre on average, in order.
    fn strays(&self, per_km: f64, length_m: f64) -> Vec<StrayDraw>;
    /// Two landmarks out of `count`: strays are then placed where the second one's surroundings would be seen if the
    /// vehicle were there instead of at the first. None places strays at random.
    fn decoy(&self, count: usize) -> Option<[usize; 2]>;
}

/// No errors at all: the planned track and the charted map.
#[derive(Clone, Copy, Debug)]
pub(super) struct NoErrors;

impl Errors for NoErrors {
    fn start_offset(&self) -> Vector2<f64> {
        Vector2::zeros()
    }
    fn heading_bias(&self) -> f64 {
        0.0
    }
    fn landmark(&self, _: usize) -> Vector2<f64> {
        Vector2::zeros()
    }
    fn leg(&self, _: usize) -> LegErrors {
        LegErrors::default()
    }
    fn sighting(&self, _: usize, _: usize) -> SightingErrors {
        SightingErrors::default()
    }
    fn strays(&self, _: f64, _: f64) -> Vec<StrayDraw> {
        Vec::new()
    }
    fn decoy(&self, _: usize) -> Option<[usize; 2]> {
        None
    }
}

/// What a stream of random numbers is for. The number is part of the seed; never renumber.
#[derive(Clone, Copy, Debug)]
#[repr(u64)]
enum Purpose {
    Dive = 1,
    Landmark = 2,
    Leg = 3,
    Sighting = 4,
    Stray = 5,
    Decoy = 6,
    Gone = 7,
}

/// Errors drawn from a seeded generator, in one of the shapes of [`ErrorShape`].
///
/// One ChaCha8 key is derived by SHA-256 from the seed, the line's name and the number of the draw; each question
/// reads a stream of its own under that key.
#[derive(Clone, Debug)]
pub struct DrawnErrors {
    shape: ErrorShape,
    key: [u8; 32],
    start_offset: Vector2<f64>,
    heading_bias: f64,
    steady_leg: LegErrors,
    steady_sighting: SightingErrors,
}

impl DrawnErrors {
    /// Errors of dive number `draw` on the line named `line`.
    pub fn new(seed: u64, line: &str, draw: u64, shape: ErrorShape) -> Self {
        let mut hash = Sha256::new();
        hash.update(b"fixability dive errors 1");
        hash.update(seed.to_le_bytes());
        hash.update(draw.to_le_bytes());
        hash.update(line.as_bytes());
        let key = hash.finalize().into();
        let mut errors = Self {
            shape,
            key,
            start_offset: Vector2::zeros(),
            heading_bias: 0.0,
            steady_leg: LegErrors::default(),
            steady_sighting: SightingErrors::default(),
        };
        let mut rng = errors.stream(Purpose::Dive, 0);
        errors.start_offset = errors.in_disc(&mut rng);
        errors.heading_bias = errors.fraction(&mut rng);
        errors.steady_leg = errors.draw_leg(&mut rng);
        errors.steady_sighting = errors.draw_sighting(&mut rng);
        errors
    }

    fn stream(&self, purpose: Purpose, number: u64) -> ChaCha8Rng {
        let mut rng = ChaCha8Rng::from_seed(self.key);
        rng.set_stream((purpose as u64) << 56 | number);
        rng
    }

    /// A fraction in [−1, 1]: uniform, or one of the ends.
    fn fraction(&self, rng: &mut ChaCha8Rng) -> f64 {
        match self.shape {
            ErrorShape::Uniform => rng.random_range(-1.0..=1.0),
            ErrorShape::Corners | ErrorShape::Steady => {
                if rng.random_bool(0.5) {
                    1.0
                } else {
                    -1.0
                }
            }
        }
    }

    /// A vector in the unit disc: uniform, or on the rim.
    fn in_disc(&self, rng: &mut ChaCha8Rng) -> Vector2<f64> {
        let angle: f64 = rng.random_range(0.0..std::f64::consts::TAU);
        let radius = match self.shape {
            ErrorShape::Uniform => rng.random_range(0.0..=1.0f64).sqrt(),
            ErrorShape::Corners | ErrorShape::Steady => 1.0,
        };
        // The factor keeps the rounded vector inside the closed unit disc.
        Vector2::new(libm::sin(angle), libm::cos(angle)) * (radius * (1.0 - 4.0 * f64::EPSILON))
    }

    fn draw_leg(&self, rng: &mut ChaCha8Rng) -> LegErrors {
        LegErrors { scale: self.fraction(rng), heading_noise: self.fraction(rng), drift: self.in_disc(rng) }
    }

    fn draw_sighting(&self, rng: &mut ChaCha8Rng) -> SightingErrors {
        SightingErrors {
            range: self.fraction(rng),
            bearing: self.fraction(rng),
            altitude: self.fraction(rng),
            chance: rng.random_range(0.0..1.0),
        }
    }
}

impl Errors for DrawnErrors {
    fn start_offset(&self) -> Vector2<f64> {
        self.start_offset
    }

    fn heading_bias(&self) -> f64 {
        self.heading_bias
    }

    fn landmark(&self, number: usize) -> Vector2<f64> {
        let mut rng = self.stream(Purpose::Landmark, number as u64);
        Vector2::new(self.fraction(&mut rng), self.fraction(&mut rng))
    }

    fn is_gone(&self, number: usize, chance: f64) -> bool {
        // Not asked for at chance 0, so that dives without it stay as they are.
        chance > 0.0 && self.stream(Purpose::Gone, number as u64).random_range(0.0..1.0) < chance
    }

    fn leg(&self, number: usize) -> LegErrors {
        match self.shape {
            ErrorShape::Steady => self.steady_leg,
            _ => self.draw_leg(&mut self.stream(Purpose::Leg, number as u64)),
        }
    }

    fn sighting(&self, landmark: usize, way: usize) -> SightingErrors {
        let drawn =
            self.draw_sighting(&mut self.stream(Purpose::Sighting, (landmark as u64) << 1 | way as u64));
        match self.shape {
            // Whether a landmark is missed is a matter of chance in every shape.
            ErrorShape::Steady => SightingErrors { chance: drawn.chance, ..self.steady_sighting },
            _ => drawn,
        }
    }

    fn strays(&self, per_km: f64, length_m: f64) -> Vec<StrayDraw> {
        let mut strays = Vec::new();
        if per_km <= 0.0 {
            return strays;
        }
        let mut rng = self.stream(Purpose::Stray, 0);
        let mut along_m = 0.0;
        loop {
            // A Poisson process: exponential gaps of mean 1000 / per_km metres.
            let u: f64 = rng.random_range(0.0..1.0);
            along_m -= libm::log(1.0 - u) * 1000.0 / per_km;
            if along_m >= length_m {
                return strays;
            }
            let (across, range) = (rng.random_range(-1.0..=1.0), rng.random_range(0.0..=1.0));
            strays.push(StrayDraw { along_m, across, range });
        }
    }

    fn decoy(&self, count: usize) -> Option<[usize; 2]> {
        // Strays at random flatter the solver as uniform noise does; the other shapes place them as decoys.
        if self.shape == ErrorShape::Uniform || count < 2 {
            return None;
        }
        let mut rng = self.stream(Purpose::Decoy, 0);
        let first = rng.random_range(0..count);
        Some([first, (first + rng.random_range(1..count)) % count])
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn fractions_are_within_bounds_and_take_the_shape() {
        for shape in [ErrorShape::Uniform, ErrorShape::Corners, ErrorShape::Steady] {
            let errors = DrawnErrors::new(7, "A", 3, shape);
            assert!(errors.start_offset().norm() <= 1.0);
            let legs: Vec<LegErrors> = (0..50).map(|i| errors.leg(i)).collect();
            for leg in &legs {
                assert!(leg.scale.abs() <= 1.0 && leg.heading_noise.abs() <= 1.0 && leg.drift.norm() <= 1.0);
            }
            let ends = legs.iter().filter(|leg| leg.scale.abs() == 1.0).count();
            let alike = legs.iter().all(|leg| *leg == legs[0]);
            match shape {
                ErrorShape::Uniform => assert!(ends == 0 && !alike),
                ErrorShape::Corners => assert!(ends == 50 && !alike),
                ErrorShape::Steady => assert!(ends == 50 && alike),
            }
        }
    }

    #[test]
    fn each_seed_line_and_draw_has_its_own_errors() {
        let bias = |seed, line, draw| DrawnErrors::new(seed, line, draw, ErrorShape::Uniform).heading_bias();
        let all = [bias(1, "A", 0), bias(2, "A", 0), bias(1, "B", 0), bias(1, "A", 1)];
        for (i, a) in all.iter().enumerate() {
            assert!(all[i + 1..].iter().all(|b| a != b));
        }
        assert_eq!(bias(1, "A", 0), all[0]);
    }
}
