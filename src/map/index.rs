//! An R-tree over the landmarks' boxes.

use rstar::primitives::{GeomWithData, Rectangle};
use rstar::{AABB, RTree};

use super::Landmark;
use crate::interval::Box2;

/// Finds the landmarks whose boxes meet a query box.
///
/// *Guarantee.* Every landmark whose (outward-rounded) box shares a point with the query is returned.
#[derive(Debug)]
pub struct LandmarkIndex {
    tree: RTree<GeomWithData<Rectangle<[f64; 2]>, u32>>,
}

impl LandmarkIndex {
    /// Builds the index in bulk; landmark numbers are positions in `landmarks`.
    ///
    /// # Panics
    /// With more than 2³² landmarks.
    pub fn new(landmarks: &[Landmark]) -> Self {
        let entries = landmarks
            .iter()
            .enumerate()
            .map(|(number, landmark)| {
                let b = landmark.bounds();
                let number = u32::try_from(number).expect("fewer than 2^32 landmarks");
                GeomWithData::new(
                    Rectangle::from_corners([b.east.lo(), b.north.lo()], [b.east.hi(), b.north.hi()]),
                    number,
                )
            })
            .collect();
        Self { tree: RTree::bulk_load(entries) }
    }

    /// Numbers of the landmarks whose boxes meet `query`, in an order that depends on the map alone.
    pub fn meeting(&self, query: Box2) -> impl Iterator<Item = usize> + '_ {
        let envelope =
            AABB::from_corners([query.east.lo(), query.north.lo()], [query.east.hi(), query.north.hi()]);
        self.tree.locate_in_envelope_intersecting(envelope).map(|entry| entry.data as usize)
    }

    /// Number of landmarks.
    pub fn len(&self) -> usize {
        self.tree.size()
    }

    /// Whether there are no landmarks.
    pub fn is_empty(&self) -> bool {
        self.tree.size() == 0
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::frame::LocalPoint;
    use crate::interval::Interval;

    #[test]
    fn finds_what_a_full_scan_finds() {
        let landmarks: Vec<Landmark> = (0..400u32)
            .map(|i| Landmark {
                id: i.to_string(),
                position: LocalPoint::new(f64::from(i * 7919 % 1000), f64::from(i * 104_729 % 1000)),
                half_width_east_m: f64::from(i % 5),
                half_width_north_m: f64::from(i % 3),
            })
            .collect();
        let index = LandmarkIndex::new(&landmarks);
        for k in 0..200u32 {
            let corner = LocalPoint::new(f64::from(k * 37 % 1000), f64::from(k * 91 % 1000));
            let query = Box2 {
                east: Interval::new(corner.east_m, corner.east_m + 40.0),
                north: Interval::new(corner.north_m, corner.north_m + 25.0),
            };
            let mut found: Vec<usize> = index.meeting(query).collect();
            found.sort_unstable();
            let scanned: Vec<usize> = (0..landmarks.len())
                .filter(|&j| !landmarks[j].bounds().intersection(query).is_empty())
                .collect();
            assert_eq!(found, scanned);
        }
    }
}
