//! The solver's recursion written plainly for any set of edge directions, without outward rounding: what other shapes
//! of cells would give. For measurement only.

use fixability::detect::LogEvent;
use fixability::locate::Bounds;
use fixability::map::Landmark;

use crate::scanline::P;

/// A convex cell: its reaches, and its corners.
#[derive(Clone)]
struct Cell {
    reach: Vec<f64>,
    corners: Vec<P>,
}

/// Unit edge directions.
pub struct Template {
    directions: Vec<P>,
}

impl Template {
    /// From directions of any length.
    pub fn new(directions: impl IntoIterator<Item = P>) -> Self {
        let unit = |d: P| [d[0] / d[0].hypot(d[1]), d[1] / d[0].hypot(d[1])];
        Self { directions: directions.into_iter().map(unit).collect() }
    }

    /// `count` directions at equal angles, the first one along `heading_rad`.
    pub fn turned_to(heading_rad: f64, count: u32) -> Self {
        Self::new((0..count).map(|k| {
            let angle = heading_rad + std::f64::consts::TAU * f64::from(k) / f64::from(count);
            [angle.sin(), angle.cos()]
        }))
    }

    fn polar(&self, rho: (f64, f64), theta: (f64, f64)) -> Vec<f64> {
        self.directions
            .iter()
            .map(|d| {
                let bearing = d[0].atan2(d[1]);
                let half = 0.5 * (theta.1 - theta.0);
                let off = (0.5 * (theta.0 + theta.1) - bearing).rem_euclid(std::f64::consts::TAU);
                let off = off.min(std::f64::consts::TAU - off);
                let cos = (off - half).max(0.0).cos();
                if cos >= 0.0 { rho.1 * cos } else { rho.0 * cos }
            })
            .collect()
    }

    fn cell(&self, reach: Vec<f64>) -> Option<Cell> {
        let size = 4.0 * reach.iter().fold(1.0f64, |most, r| most.max(r.abs()));
        let mut corners: Vec<P> = vec![[-size, -size], [size, -size], [size, size], [-size, size]];
        for (d, &h) in self.directions.iter().zip(&reach) {
            let excess = |p: &P| d[0] * p[0] + d[1] * p[1] - h;
            let mut kept = Vec::with_capacity(corners.len() + 1);
            for (i, a) in corners.iter().enumerate() {
                let b = &corners[(i + 1) % corners.len()];
                let (ea, eb) = (excess(a), excess(b));
                if ea <= 0.0 {
                    kept.push(*a);
                }
                if (ea < 0.0 && eb > 0.0) || (ea > 0.0 && eb < 0.0) {
                    let t = ea / (ea - eb);
                    kept.push([a[0] + t * (b[0] - a[0]), a[1] + t * (b[1] - a[1])]);
                }
            }
            corners = kept;
        }
        let support = |d: &P| corners.iter().fold(f64::NEG_INFINITY, |m, p| m.max(d[0] * p[0] + d[1] * p[1]));
        let reach = self.directions.iter().map(support).collect();
        (!corners.is_empty()).then_some(Cell { reach, corners })
    }

    /// Cells after the last event, as corners in metres from `origin`.
    pub fn solve(&self, landmarks: &[Landmark], bounds: &Bounds, log: &[LogEvent], origin: P) -> Vec<Vec<P>> {
        let bias = bounds.dead_reckoning.heading_bias_rad;
        let width = 2.0 * bias / bounds.heading_slices as f64;
        (0..bounds.heading_slices)
            .flat_map(|k| {
                let lo = -bias + k as f64 * width;
                self.solve_slice(landmarks, bounds, log, origin, (lo, lo + width))
            })
            .collect()
    }

    fn solve_slice(
        &self,
        landmarks: &[Landmark],
        bounds: &Bounds,
        log: &[LogEvent],
        origin: P,
        bias: (f64, f64),
    ) -> Vec<Vec<P>> {
        let mut cells: Option<Vec<Cell>> = None;
        for event in log {
            let look = self.look(event, bounds, bias);
            let vantages: Vec<Cell> = landmarks
                .iter()
                .filter_map(|l| {
                    let at = [l.position.east_m - origin[0], l.position.north_m - origin[1]];
                    let boxed = self.directions.iter().map(|d| {
                        d[0] * at[0]
                            + d[1] * at[1]
                            + d[0].abs() * l.half_width_east_m
                            + d[1].abs() * l.half_width_north_m
                    });
                    self.cell(boxed.zip(&look).map(|(a, b)| a + b).collect())
                })
                .collect();
            cells = Some(match cells {
                None => vantages,
                Some(before) => {
                    let travel = self.travel(event, bounds, bias);
                    let mut after = Vec::new();
                    for cell in before {
                        let moved: Vec<f64> = cell.reach.iter().zip(&travel).map(|(a, b)| a + b).collect();
                        for v in &vantages {
                            let is_apart = (0..moved.len()).any(|i| {
                                let opposite = (i + moved.len() / 2) % moved.len();
                                moved[i] < -v.reach[opposite]
                            });
                            if !is_apart {
                                after.extend(
                                    self.cell(moved.iter().zip(&v.reach).map(|(a, b)| a.min(*b)).collect()),
                                );
                            }
                        }
                    }
                    after
                }
            });
        }
        cells.unwrap_or_default().into_iter().map(|cell| cell.corners).collect()
    }

    fn travel(&self, event: &LogEvent, bounds: &Bounds, bias: (f64, f64)) -> Vec<f64> {
        let dr = bounds.dead_reckoning;
        let mut total = vec![0.0; self.directions.len()];
        for piece in &event.travel {
            let (l, h) = (piece.length_m, piece.heading_rad);
            let patch = self.polar(
                (l * (1.0 - dr.scale_error), l * (1.0 + dr.scale_error)),
                (h + bias.0 - dr.heading_noise_rad, h + bias.1 + dr.heading_noise_rad),
            );
            for (sum, more) in total.iter_mut().zip(patch) {
                *sum += more + piece.duration_s * dr.drift_mps;
            }
        }
        total
    }

    fn look(&self, event: &LogEvent, bounds: &Bounds, bias: (f64, f64)) -> Vec<f64> {
        let sonar = bounds.sonar;
        let y = event.sighting.expect("a sighting");
        let lo = ((y.slant_range_m - sonar.range_error_m) / (1.0 + sonar.range_error_fraction)).max(0.0);
        let hi = (y.slant_range_m + sonar.range_error_m) / (1.0 - sonar.range_error_fraction);
        let low = (sonar.altitude_m - sonar.altitude_error_m).max(0.0);
        let high = sonar.altitude_m + sonar.altitude_error_m;
        let rho = ((lo * lo - high * high).max(0.0).sqrt(), (hi * hi - low * low).max(0.0).sqrt());
        let middle = y.heading_rad + y.relative_bearing_rad + std::f64::consts::PI;
        let half = sonar.bearing_error_rad + bounds.dead_reckoning.heading_noise_rad;
        self.polar(rho, (middle + bias.0 - half, middle + bias.1 + half))
    }
}
