//! A bootstrap particle filter for the same question: unknown start, unknown identities, the same error bounds.
//!
//! Gordon, Salmond, Smith, "Novel approach to nonlinear/non-Gaussian Bayesian state estimation", IEE Proceedings F 140
//! (2), 1993, 107–113: particles drawn from the prior, moved by the motion model, weighted by the likelihood,
//! resampled at every measurement, roughened afterwards. Resampling is systematic (one random number for all), which
//! is kinder than the paper's multinomial one.
//! Tried on 12 dives over 10³ landmarks: edges of 0.25, 1 and 2 bounds, of which 0.25 lost the truth most often and the
//! others are kept; roughening of at most 1, 2 and 3 m, which made little difference.
//!
//! - *Prior*: uniform over the search area and over the interval of the heading bias. A particle is a position and a
//!   bias.
//! - *Motion*: each straight piece of the report, with a scale error and a heading noise drawn uniformly within their
//!   bounds.
//! - *Likelihood* of a detection without identity: the sum over landmarks near the expected position of k(along) ·
//!   k(across), where along and across are the misfit in range and at right angles to it, in units of their bounds
//!   (range error, altitude error, beam error, heading noise, the landmark's box), and k(u) is 1 inside the bounds and
//!   falls off outside as a Gaussian of [`Filter::edge`] bounds, to nothing at three of these. (Bounded errors have a
//!   likelihood of 1 or 0; a soft edge keeps particles alive that lie near, where roughening may bring them nearer. A
//!   wide one helps a cloud that is too thin, a narrow one finds the place sooner: both are run.)
//! - *Roughening*: the paper's K·E·N^(−1/d) with K = 0.2 and d = 3, E the range of a component, but at most
//!   [`ROUGHENING_MAX_M`]: the range of a cloud with many modes spans the whole field and says nothing about one of
//!   them.
//! - *Estimate*: the mean of the particles in the most crowded 3 × 3 block of squares as wide as the fix size.

use std::collections::HashMap;
use std::f64::consts::TAU;

use fixability::detect::LogEvent;
use fixability::frame::LocalPoint;
use fixability::interval::{Interval, larger, smaller};
use fixability::map::Landmark;
use fixability::vehicle::horizontal_range;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

use crate::scenes::RandomScene;

/// K of the paper.
const ROUGHENING_K: f64 = 0.2;
/// Most that a position is roughened, metres (standard deviation).
const ROUGHENING_MAX_M: f64 = 1.0;
/// Side of the squares of the landmarks' grid, metres.
const GRID_M: f64 = 25.0;

/// The landmarks in squares, row by row.
pub struct Grid {
    columns: usize,
    rows: usize,
    begin: Vec<u32>,
    landmarks: Vec<[f64; 3]>,
}

impl Grid {
    /// Of a field from (0, 0) to (side, side).
    pub fn new(landmarks: &[Landmark], side_m: f64) -> Self {
        let columns = (side_m / GRID_M).ceil() as usize;
        let square = |p: LocalPoint| {
            let line = |x: f64| ((x / GRID_M) as usize).min(columns - 1);
            line(p.north_m) * columns + line(p.east_m)
        };
        let mut begin = vec![0u32; columns * columns + 1];
        for landmark in landmarks {
            begin[square(landmark.position) + 1] += 1;
        }
        for i in 1..begin.len() {
            begin[i] += begin[i - 1];
        }
        let mut next = begin.clone();
        let mut sorted = vec![[0.0; 3]; landmarks.len()];
        for landmark in landmarks {
            let at = &mut next[square(landmark.position)];
            let half_m = 0.5 * (landmark.half_width_east_m + landmark.half_width_north_m);
            sorted[*at as usize] = [landmark.position.east_m, landmark.position.north_m, half_m];
            *at += 1;
        }
        Self { columns, rows: columns, begin, landmarks: sorted }
    }

    fn near(&self, east_m: f64, north_m: f64, reach_m: f64) -> impl Iterator<Item = &[f64; 3]> {
        let line = |x: f64, count: usize| ((x / GRID_M) as usize).min(count - 1);
        let (first, last) = (line(east_m - reach_m, self.columns), line(east_m + reach_m, self.columns));
        let rows = line(north_m - reach_m, self.rows)..=line(north_m + reach_m, self.rows);
        rows.flat_map(move |row| {
            let begin = self.begin[row * self.columns + first] as usize;
            let end = self.begin[row * self.columns + last + 1] as usize;
            &self.landmarks[begin..end]
        })
    }
}

#[derive(Clone, Copy)]
struct Particle {
    east_m: f64,
    north_m: f64,
    bias_rad: f64,
}

/// A cloud of particles that follows a log.
pub struct Filter<'a> {
    scene: &'a RandomScene,
    grid: &'a Grid,
    rng: ChaCha8Rng,
    particles: Vec<Particle>,
    resampled: Vec<Particle>,
    weights: Vec<f64>,
    /// Width of the soft edge of the likelihood, bounds.
    edge: f64,
}

impl<'a> Filter<'a> {
    /// `count` particles all over the field, with a likelihood of this `edge`.
    pub fn new(
        scene: &'a RandomScene,
        grid: &'a Grid,
        side_m: f64,
        count: usize,
        edge: f64,
        seed: u64,
    ) -> Self {
        let mut rng = ChaCha8Rng::seed_from_u64(seed);
        let bias = scene.bounds.dead_reckoning.heading_bias_rad;
        let particles = (0..count)
            .map(|_| Particle {
                east_m: side_m * rng.random::<f64>(),
                north_m: side_m * rng.random::<f64>(),
                bias_rad: bias * (2.0 * rng.random::<f64>() - 1.0),
            })
            .collect();
        Self {
            scene,
            grid,
            rng,
            particles,
            resampled: Vec::with_capacity(count),
            weights: vec![0.0; count],
            edge,
        }
    }

    /// Follows one event of the log. Returns whether any particle explains it; when none does, nothing is left to resample
    /// from and the filter has lost its way.
    pub fn follow(&mut self, event: &LogEvent) -> bool {
        let dead_reckoning = &self.scene.bounds.dead_reckoning;
        let rng = &mut self.rng;
        for piece in &event.travel {
            for p in &mut self.particles {
                let mut within = |bound: f64| bound * (2.0 * rng.random::<f64>() - 1.0);
                let length_m = piece.length_m * (1.0 + within(dead_reckoning.scale_error));
                let heading = piece.heading_rad + p.bias_rad + within(dead_reckoning.heading_noise_rad);
                let (sin, cos) = heading.sin_cos();
                p.east_m += length_m * sin;
                p.north_m += length_m * cos;
            }
        }
        let Some(sighting) = event.sighting else { return true };
        let sonar = &self.scene.bounds.sonar;
        let slant = (Interval::point(sighting.slant_range_m) + Interval::around(0.0, sonar.range_error_m))
            / Interval::around(1.0, sonar.range_error_fraction);
        let slant = slant.intersection(Interval::new(0.0, f64::INFINITY));
        let rho = horizontal_range(slant, Interval::around(sonar.altitude_m, sonar.altitude_error_m));
        let range_m = 0.5 * (rho.lo() + rho.hi());
        let along_m = 0.5 * (rho.hi() - rho.lo());
        let across_m = range_m * (sonar.bearing_error_rad + dead_reckoning.heading_noise_rad);
        let pointing = sighting.heading_rad + sighting.relative_bearing_rad;
        let edge = self.edge;
        let cut = 1.0 + 3.0 * edge;
        let kernel = |misfit: f64| {
            let beyond = (misfit.abs() - 1.0) / edge;
            if beyond <= 0.0 { 1.0 } else { (-0.5 * beyond * beyond).exp() }
        };
        let mut total = 0.0;
        for (p, weight) in self.particles.iter().zip(&mut self.weights) {
            let (sin, cos) = (pointing + p.bias_rad).sin_cos();
            let (east_m, north_m) = (p.east_m + range_m * sin, p.north_m + range_m * cos);
            *weight = 0.0;
            // Boxes of the field are ± 2 m; the reach holds the corners of the cut.
            let reach_m = cut * (along_m + 2.0).hypot(across_m + 2.0);
            for &[e, n, half_m] in self.grid.near(east_m, north_m, reach_m) {
                let (e, n) = (e - east_m, n - north_m);
                let along = (e * sin + n * cos) / (along_m + half_m);
                let across = (e * cos - n * sin) / (across_m + half_m);
                if along.abs() <= cut && across.abs() <= cut {
                    *weight += kernel(along) * kernel(across);
                }
            }
            total += *weight;
        }
        if total <= 0.0 {
            return false;
        }
        self.resample(total);
        true
    }

    /// Systematic resampling, then roughening.
    fn resample(&mut self, total: f64) {
        let count = self.particles.len();
        let step = total / count as f64;
        let mut at = step * self.rng.random::<f64>();
        let mut sum = 0.0;
        self.resampled.clear();
        for (p, weight) in self.particles.iter().zip(&self.weights) {
            sum += weight;
            while at < sum && self.resampled.len() < count {
                self.resampled.push(*p);
                at += step;
            }
        }
        // Rounding of the sum may leave the last one out.
        while self.resampled.len() < count {
            self.resampled.push(self.resampled[self.resampled.len() - 1]);
        }
        std::mem::swap(&mut self.particles, &mut self.resampled);
        let share = ROUGHENING_K * (count as f64).powf(-1.0 / 3.0);
        let spread = |of: fn(&Particle) -> f64| {
            let ends = (f64::INFINITY, f64::NEG_INFINITY);
            let (lo, hi) =
                self.particles.iter().map(of).fold(ends, |(lo, hi), x| (smaller(lo, x), larger(hi, x)));
            share * (hi - lo)
        };
        let east_m = smaller(spread(|p| p.east_m), ROUGHENING_MAX_M);
        let north_m = smaller(spread(|p| p.north_m), ROUGHENING_MAX_M);
        let bias_rad = spread(|p| p.bias_rad);
        let bound = self.scene.bounds.dead_reckoning.heading_bias_rad;
        for p in &mut self.particles {
            // Two independent Gaussian numbers (Box and Muller 1958); the bias gets a uniform one of the same deviation.
            let radius = (-2.0 * (1.0 - self.rng.random::<f64>()).ln()).sqrt();
            let (sin, cos) = (TAU * self.rng.random::<f64>()).sin_cos();
            p.east_m += east_m * radius * cos;
            p.north_m += north_m * radius * sin;
            let uniform = 3f64.sqrt() * (2.0 * self.rng.random::<f64>() - 1.0);
            p.bias_rad = (p.bias_rad + bias_rad * uniform).clamp(-bound, bound);
        }
    }

    /// Where most particles are, and the share of all within `fix_size_m` of it.
    pub fn estimate(&self, fix_size_m: f64) -> (LocalPoint, f64) {
        let square =
            |p: &Particle| ((p.east_m / fix_size_m).floor() as i64, (p.north_m / fix_size_m).floor() as i64);
        let mut squares: HashMap<(i64, i64), [f64; 3]> = HashMap::new();
        for p in &self.particles {
            let sums = squares.entry(square(p)).or_default();
            *sums = [sums[0] + 1.0, sums[1] + p.east_m, sums[2] + p.north_m];
        }
        let mut best = ([0.0f64; 3], (0, 0));
        for &(column, row) in squares.keys() {
            let mut sums = [0.0; 3];
            for east in -1..=1 {
                for north in -1..=1 {
                    if let Some(more) = squares.get(&(column + east, row + north)) {
                        sums = [sums[0] + more[0], sums[1] + more[1], sums[2] + more[2]];
                    }
                }
            }
            // Ties by square, so that the order of the table does not enter.
            if sums[0] > best.0[0] || (sums[0] == best.0[0] && (column, row) < best.1) {
                best = (sums, (column, row));
            }
        }
        let [count, east, north] = best.0;
        let at = LocalPoint::new(east / count, north / count);
        (at, self.share_near(at, fix_size_m))
    }

    /// The share of the particles within `reach_m` of a position.
    pub fn share_near(&self, at: LocalPoint, reach_m: f64) -> f64 {
        let near = |p: &&Particle| (p.east_m - at.east_m).hypot(p.north_m - at.north_m) <= reach_m;
        self.particles.iter().filter(near).count() as f64 / self.particles.len() as f64
    }
}
