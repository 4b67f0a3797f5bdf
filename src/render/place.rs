//! Places for labels inside a map frame: candidates are tried against what is already taken.

use super::scene::{Px, Rect};

/// Candidate directions around a point.
const DIRECTIONS: usize = 16;
/// Candidate distances from the point, as multiples of the gap.
const RINGS: [f64; 4] = [1.0, 2.5, 4.5, 7.0];
/// Labels on this ring and beyond need a leader to be understood.
const LED_FROM_RING: usize = 2;
/// How much a covered landmark weighs against a place further down the list of candidates.
const COVERED_WEIGHT: f64 = 4.0;

/// What labels must not touch.
pub(super) struct Taken {
    /// Labels stay inside.
    pub(super) within: Rect,
    /// Labels, arrows and furniture.
    pub(super) rects: Vec<Rect>,
    /// Leaders from labels to their lines.
    pub(super) leaders: Vec<(Px, Px)>,
    /// Centre lines of drawn tracks.
    corridors: Vec<(Px, Px)>,
    /// Half the width of the corridors.
    half_width: f64,
    /// Landmarks: better left uncovered.
    pub(super) dots: Vec<Px>,
}

impl Taken {
    pub(super) fn new(within: Rect, half_width: f64) -> Self {
        Self {
            within,
            rects: Vec::new(),
            leaders: Vec::new(),
            corridors: Vec::new(),
            half_width,
            dots: Vec::new(),
        }
    }

    /// Takes the corridor along `points`. Points closer than half the corridor are skipped; the corridor is kept wide
    /// enough to hold them.
    pub(super) fn add_corridor(&mut self, points: &[Px]) {
        let Some(&first) = points.first() else { return };
        let mut from = first;
        for (index, &to) in points.iter().enumerate().skip(1) {
            let last = index + 1 == points.len();
            if last || libm::hypot(to.0 - from.0, to.1 - from.1) >= self.half_width / 2.0 {
                self.corridors.push((from, to));
                from = to;
            }
        }
    }

    /// Whether `rect` is free of everything that must not be covered.
    pub(super) fn is_free(&self, rect: &Rect) -> bool {
        let reach = rect.grown(self.half_width * 1.5);
        self.within.contains(rect)
            && !self.rects.iter().any(|taken| taken.overlaps(rect))
            && !self.leaders.iter().any(|&(p, q)| rect.clip_segment(p, q).is_some())
            && !self.corridors.iter().any(|&(p, q)| reach.clip_segment(p, q).is_some())
    }

    fn covered(&self, rect: &Rect) -> usize {
        self.dots.iter().filter(|&&dot| rect.holds(dot)).count()
    }

    /// The best free place for a label of this size near `point`, `away` first, and the leader it needs when it is too
    /// far to be understood without. None when the frame is full.
    pub(super) fn label(
        &self,
        point: Px,
        away: Px,
        gap: f64,
        (width, height): (f64, f64),
    ) -> Option<(Rect, Option<(Px, Px)>)> {
        let heading = libm::atan2(away.1, away.0);
        let near = RINGS.iter().enumerate().flat_map(|(ring, multiple)| {
            (0..DIRECTIONS).map(move |turn| {
                // 0, +1, −1, +2, −2, … steps off the wanted direction.
                let steps = turn.div_ceil(2) as f64 * if turn % 2 == 0 { -1.0 } else { 1.0 };
                let angle = heading + steps * std::f64::consts::TAU / DIRECTIONS as f64;
                let (x, y) = (libm::cos(angle), libm::sin(angle));
                let reach = gap * multiple;
                let centre = (point.0 + x * reach + x * width / 2.0, point.1 + y * reach + y * height / 2.0);
                (Rect::centred(centre, width, height), ring, turn)
            })
        });
        let best = near
            .filter(|(rect, ..)| self.is_free(rect))
            .map(|(rect, ring, turn)| {
                let cost = ring as f64 * 6.0 + turn as f64 * 0.5;
                (rect, ring, cost + COVERED_WEIGHT * self.covered(&rect) as f64)
            })
            .min_by(|a, b| a.2.total_cmp(&b.2));
        match best {
            Some((rect, ring, _)) if ring >= LED_FROM_RING => Some((rect, self.leader(point, &rect))),
            Some((rect, ..)) => Some((rect, None)),
            None => self.anywhere(point, (width, height)),
        }
    }

    /// The free place nearest to `point`, on a raster over the frame, with its leader.
    fn anywhere(&self, point: Px, (width, height): (f64, f64)) -> Option<(Rect, Option<(Px, Px)>)> {
        let columns = (self.within.width() / (width / 2.0)) as usize;
        let rows = (self.within.height() / height) as usize;
        let places = (0..rows).flat_map(|row| {
            (0..columns).map(move |column| {
                let left = self.within.left + column as f64 * width / 2.0 + 1.0;
                let top = self.within.top + row as f64 * height + 1.0;
                Rect::new(left, top, left + width, top + height)
            })
        });
        let cost = |rect: &Rect| {
            let (x, y) = rect.centre();
            libm::hypot(x - point.0, y - point.1) + 40.0 * self.covered(rect) as f64
        };
        places
            .filter(|rect| self.is_free(rect))
            .filter_map(|rect| Some((rect, self.leader(point, &rect)?)))
            .min_by(|(a, _), (b, _)| cost(a).total_cmp(&cost(b)))
            .map(|(rect, leader)| (rect, Some(leader)))
    }

    /// The straight leader from `point` to the edge of `rect`, unless it would run over a label.
    fn leader(&self, point: Px, rect: &Rect) -> Option<(Px, Px)> {
        let (edge, _) = rect.clip_segment(point, rect.centre())?;
        let hit = |taken: &Rect| !taken.holds(point) && taken.clip_segment(point, edge).is_some();
        (!self.rects.iter().any(hit)).then_some((point, edge))
    }
}
