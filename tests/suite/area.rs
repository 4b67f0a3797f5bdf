//! The area map against the plain solver, against simulated dives, and against itself under smaller bounds.

use std::path::Path;

use fixability::assess::{Setup, area, area_grid};
use fixability::dive::{AreaOptions, Dive};
use fixability::frame::LocalPoint;
use fixability::locate::{StraightOutcome, StraightRuns};
use fixability::map::Landmark;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

fn read(path: &str) -> Dive {
    Dive::read(&Path::new(env!("CARGO_MANIFEST_DIR")).join(path)).expect("the dive file is good")
}

fn demo() -> Dive {
    read("demo-data/dive.toml")
}

fn craters() -> Dive {
    read("tests/data/craters/dive.toml")
}

/// Clusters of landmarks over the ground of the demo.
fn clusters(seed: u64) -> Dive {
    let mut dive = demo();
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let (low, high) = ends(&dive.start.search_area);
    let mut centre = low;
    dive.landmarks = (0..500)
        .map(|i| {
            if i % 7 == 0 {
                centre = LocalPoint::new(
                    rng.random_range(low.east_m..high.east_m),
                    rng.random_range(low.north_m..high.north_m),
                );
            }
            Landmark {
                id: i.to_string(),
                position: LocalPoint::new(
                    centre.east_m + rng.random_range(-60.0..60.0),
                    centre.north_m + rng.random_range(-60.0..60.0),
                ),
                half_width_east_m: rng.random_range(0.0..3.0),
                half_width_north_m: rng.random_range(0.0..3.0),
            }
        })
        .collect();
    dive
}

fn ends(corners: &[LocalPoint]) -> (LocalPoint, LocalPoint) {
    let of = |pick: fn(f64, f64) -> f64| {
        corners
            .iter()
            .copied()
            .reduce(|a, b| LocalPoint::new(pick(a.east_m, b.east_m), pick(a.north_m, b.north_m)))
            .expect("an area has corners")
    };
    (of(f64::min), of(f64::max))
}

fn straight_runs<'a>(setup: &'a Setup<'_>, options: &AreaOptions) -> StraightRuns<'a> {
    StraightRuns::new(
        setup.scene(),
        setup.solver(),
        setup.bounds(),
        setup.dive.budget.misses,
        options.longest_run_m,
    )
}

/// Compares blocks of the map with the plain solver until `pairs` runs are compared.
fn compare(dive: &Dive, options: &AreaOptions, pairs: usize, seed: u64) -> [usize; 3] {
    let setup = Setup::new(dive);
    let runs = straight_runs(&setup, options);
    let (grid, cells) = area_grid(&setup, options);
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let mut kinds = [0; 3];
    let mut compared = 0;
    while compared < pairs {
        let heading_rad =
            std::f64::consts::TAU * rng.random_range(0..options.headings) as f64 / options.headings as f64;
        // A block of neighbours, so that they share work, of which some are compared.
        let (column, row) = cells[rng.random_range(0..cells.len())];
        let starts: Vec<LocalPoint> = cells
            .iter()
            .filter(|(c, r)| c.abs_diff(column) < 8 && r.abs_diff(row) < 8)
            .map(|&(c, r)| grid.centre(c, r))
            .collect();
        let outcomes = runs.solve(heading_rad, &starts);
        for _ in 0..20 {
            let k = rng.random_range(0..starts.len());
            let plain = runs.solve_plainly(heading_rad, starts[k]);
            compared += 1;
            kinds[match plain {
                StraightOutcome::Fix(_) => 0,
                StraightOutcome::NoFix { .. } => 1,
                StraightOutcome::Undecided => 2,
            }] += 1;
            if plain != StraightOutcome::Undecided {
                assert_eq!(outcomes[k], plain, "from {:?} on {heading_rad}", starts[k]);
            }
        }
    }
    kinds
}

#[test]
fn the_map_is_that_of_the_plain_solver() {
    let options = AreaOptions { cell_m: 25.0, headings: 16, longest_run_m: 600.0 };
    let wide = AreaOptions { cell_m: 50.0, headings: 12, longest_run_m: 1200.0 };
    for (name, dive, options) in
        [("demo", demo(), options), ("craters", craters(), wide), ("clusters", clusters(5), options)]
    {
        let kinds = compare(&dive, &options, 2000, 11);
        println!("{name}: fixes, none, undecided {kinds:?}");
        assert!(kinds[0] > 100 && kinds[2] == 0, "{name}: {kinds:?}");
    }
}

#[test]
fn a_map_has_its_cells_in_the_search_area() {
    let dive = demo();
    let setup = Setup::new(&dive);
    let options = AreaOptions { cell_m: 200.0, headings: 4, longest_run_m: 600.0 };
    let done = std::sync::atomic::AtomicUsize::new(0);
    let report = area(&setup, &options, &|count| {
        done.fetch_add(count, std::sync::atomic::Ordering::Relaxed);
    });
    assert_eq!(done.into_inner(), report.outcomes.len());
    assert_eq!(report.outcomes.len(), report.cells.len() * 4);
}
