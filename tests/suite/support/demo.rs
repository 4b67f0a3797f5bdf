//! Generator of the files in `demo-data/`: an invented place and survey, drawn from a named seed.
//!
//! *Frame.* Positions are made in WGS 84 / UTM zone 31N (EPSG:32631), metres from the south-west corner of the site,
//! and written as WGS 84 latitude and longitude with 8 decimals (about a millimetre).

use proj4rs::Proj;
use proj4rs::adaptors::transform_xy;
use rand_chacha::ChaCha20Rng;
use rand_chacha::rand_core::{Rng, SeedableRng};

/// Seed of the generator (ChaCha with 20 rounds; the number fills the first eight bytes of the key).
pub const DEMO_SEED: u64 = 37;

/// South-west corner of the site, metres east and north. South of 56° N, where the zones are regular.
const CORNER_M: [f64; 2] = [512_000.0, 6_171_000.0];

/// Size of the site east and north, metres.
const SITE_M: [f64; 2] = [2600.0, 2000.0];

/// Rocks scattered over the site, besides the two regular structures.
const ROCKS: usize = 368;

/// Least distance between two rocks, metres. Boxes of half-width 3 m do not overlap beyond 3·2·√2 = 8.5 m.
const APART_M: f64 = 9.0;

/// Half-widths of the landmark boxes run between these, metres.
const HALF_WIDTH_M: [f64; 2] = [1.0, 3.0];

/// A position in metres from the corner of the site.
type Offset = [f64; 2];

/// The candidate lines: name, then waypoints.
const LINES: [(&str, &[Offset]); 4] = [
    ("A", &[[90.0, 1480.0], [900.0, 1640.0], [1700.0, 1500.0], [2380.0, 1650.0]]),
    ("B", &[[2480.0, 540.0], [1500.0, 270.0], [180.0, 430.0]]),
    ("C", &[[120.0, 880.0], [1098.0, 1088.0], [2420.0, 949.0]]),
    ("D", &[[120.0, 220.0], [1904.0, 1826.0]]),
];

/// The row of evenly spaced objects beside the first leg of line C.
const ROW_OBJECTS: usize = 20;
const ROW_SPACING_M: f64 = 40.0;
const ROW_BEGINS_M: f64 = 60.0;
const ROW_TO_STARBOARD_M: f64 = 32.0;

/// The grid of mooring blocks about the second leg of line C, which runs between two of its rows.
const GRID_ALONG: usize = 7;
const GRID_ACROSS: usize = 6;
const GRID_SPACING_M: f64 = 70.0;
const GRID_BEGINS_M: f64 = 180.0;
const GRID_FIRST_TO_STARBOARD_M: f64 = -105.0;

/// One object of the survey.
struct Object {
    id: String,
    kind: &'static str,
    at: Offset,
}

/// Uniform numbers made from the generator's bits alone, so that no library's sampling rule enters the files.
struct Draw(ChaCha20Rng);

impl Draw {
    fn new() -> Self {
        let mut key = [0; 32];
        key[..8].copy_from_slice(&DEMO_SEED.to_le_bytes());
        Self(ChaCha20Rng::from_seed(key))
    }

    /// Uniform in [0, 1): the upper 53 bits as a fraction.
    fn unit(&mut self) -> f64 {
        (self.0.next_u64() >> 11) as f64 * 2f64.powi(-53)
    }

    fn between(&mut self, lo: f64, hi: f64) -> f64 {
        lo + (hi - lo) * self.unit()
    }
}

/// The files of `demo-data/`: name and text.
pub fn files() -> Vec<(&'static str, String)> {
    let mut draw = Draw::new();
    let mut objects = rocks(&mut draw);
    objects.extend(row());
    objects.extend(grid());
    vec![
        ("landmarks.csv", landmarks_csv(&objects, &mut draw)),
        ("lines.csv", lines_csv()),
        ("dive.toml", include_str!("demo_dive.toml").to_owned()),
        ("SOURCE.md", source(objects.len())),
    ]
}

/// Point at `along_m` on the leg that starts at `from` towards `to`, `starboard_m` to the right of it.
fn beside_leg(from: Offset, to: Offset, along_m: f64, starboard_m: f64) -> Offset {
    let length = distance(from, to);
    let [e, n] = [(to[0] - from[0]) / length, (to[1] - from[1]) / length];
    [from[0] + along_m * e + starboard_m * n, from[1] + along_m * n - starboard_m * e]
}

fn distance(a: Offset, b: Offset) -> f64 {
    libm::hypot(b[0] - a[0], b[1] - a[1])
}

fn row() -> Vec<Object> {
    let line_c = LINES[2].1;
    (0..ROW_OBJECTS)
        .map(|i| Object {
            id: format!("T{:02}", i + 1),
            kind: "row object",
            at: beside_leg(line_c[0], line_c[1], ROW_BEGINS_M + ROW_SPACING_M * i as f64, ROW_TO_STARBOARD_M),
        })
        .collect()
}

fn grid() -> Vec<Object> {
    let line_c = LINES[2].1;
    let mut blocks = Vec::new();
    for i in 0..GRID_ALONG {
        for j in 0..GRID_ACROSS {
            let along = GRID_BEGINS_M + GRID_SPACING_M * i as f64;
            let starboard = GRID_FIRST_TO_STARBOARD_M + GRID_SPACING_M * j as f64;
            blocks.push(Object {
                id: format!("M-{}-{}", i + 1, j + 1),
                kind: "mooring block",
                at: beside_leg(line_c[1], line_c[2], along, starboard),
            });
        }
    }
    blocks
}

/// Share of the rocks that would lie at `p` that are kept: how the ground varies over the site.
fn abundance(p: Offset) -> f64 {
    let line_c = LINES[2].1;
    let regular: Vec<Offset> = row().into_iter().chain(grid()).map(|o| o.at).collect();
    let near_structure = regular.iter().any(|q| distance(p, *q) < 100.0);
    let near_line_c = line_c.windows(2).any(|leg| to_leg(p, leg[0], leg[1]) < 90.0);
    let in_hollow = libm::hypot((p[0] - 1750.0) / 640.0, (p[1] - 380.0) / 320.0) < 1.0;
    if near_structure {
        0.0
    } else if near_line_c {
        0.25
    } else if in_hollow {
        0.02
    } else if p[1] > 1290.0 {
        0.9
    } else {
        0.7
    }
}

/// Distance from `p` to the leg from `a` to `b`.
fn to_leg(p: Offset, a: Offset, b: Offset) -> f64 {
    let length = distance(a, b);
    let along = ((p[0] - a[0]) * (b[0] - a[0]) + (p[1] - a[1]) * (b[1] - a[1])) / length;
    distance(p, beside_leg(a, b, along.clamp(0.0, length), 0.0))
}

/// Rocks singly and in groups of up to four, numbered from west to east.
fn rocks(draw: &mut Draw) -> Vec<Object> {
    let mut found: Vec<Offset> = Vec::new();
    while found.len() < ROCKS {
        let centre = [draw.between(0.0, SITE_M[0]), draw.between(0.0, SITE_M[1])];
        if draw.unit() >= abundance(centre) {
            continue;
        }
        // Half of the rocks that are drawn stand alone; the others have one to three companions.
        let companions = if draw.unit() < 0.5 { 0 } else { 1 + (draw.unit() * 3.0) as usize };
        let mut group = vec![centre];
        for _ in 0..companions {
            let (turn, far) = (draw.between(0.0, std::f64::consts::TAU), draw.between(APART_M, 30.0));
            group.push([centre[0] + far * libm::sin(turn), centre[1] + far * libm::cos(turn)]);
        }
        for rock in group {
            let on_site = (0..2).all(|axis| (0.0..=SITE_M[axis]).contains(&rock[axis]));
            let clear = found.iter().all(|other| distance(rock, *other) >= APART_M);
            if on_site && clear && abundance(rock) > 0.0 && found.len() < ROCKS {
                found.push(rock);
            }
        }
    }
    found.sort_by(|a, b| a[0].total_cmp(&b[0]));
    found
        .into_iter()
        .enumerate()
        .map(|(i, at)| Object { id: format!("R{:03}", i + 1), kind: "rock", at })
        .collect()
}

/// WGS 84 latitude and longitude of a position on the site, as text with 8 decimals.
fn lat_lon(at: Offset) -> [String; 2] {
    let grid = Proj::from_epsg_code(32631).expect("UTM zone 31N is in the table");
    let geographic = Proj::from_epsg_code(4326).expect("WGS 84 is in the table");
    let (lon, lat) = transform_xy(&grid, &geographic, CORNER_M[0] + at[0], CORNER_M[1] + at[1])
        .expect("the site lies inside the zone");
    [format!("{:.8}", lat.to_degrees()), format!("{:.8}", lon.to_degrees())]
}

fn landmarks_csv(objects: &[Object], draw: &mut Draw) -> String {
    let mut text = String::from("id,lat,lon,uncertainty_m,kind\n");
    for Object { id, kind, at } in objects {
        let [lat, lon] = lat_lon(*at);
        let half_width_m = draw.between(HALF_WIDTH_M[0], HALF_WIDTH_M[1]);
        text += &format!("{id},{lat},{lon},{half_width_m:.1},{kind}\n");
    }
    text
}

fn lines_csv() -> String {
    let mut text = String::from("line,lat,lon\n");
    for (name, waypoints) in LINES {
        for waypoint in waypoints {
            let [lat, lon] = lat_lon(*waypoint);
            text += &format!("{name},{lat},{lon}\n");
        }
    }
    text
}

fn source(landmarks: usize) -> String {
    format!(
        "\
# Demo data: Kittle Deep (invented)

No such place, survey or vehicle exists. Every number here comes from the generator in
`tests/suite/support/demo.rs`: ChaCha with 20 rounds, seed {DEMO_SEED}. The test `demo` compares these files, byte for
byte, with what the generator makes; to write them anew, run

    FIXABILITY_WRITE_DEMO=1 cargo test --release --test suite demo

* `landmarks.csv`: {landmarks} landmarks on 2.6 km by 2.0 km: {ROCKS} rocks (R…), a row of {ROW_OBJECTS} objects
  {ROW_SPACING_M} m apart (T…), and {GRID_ALONG} by {GRID_ACROSS} mooring blocks {GRID_SPACING_M} m apart (M-…). The true
  position lies within `uncertainty_m` of the charted one, east and north.
* `lines.csv`: four candidate lines, A to D, by their waypoints.
* `dive.toml`: names the files, the vehicle, the sonar, the error bounds and what is asked.

Coordinates are WGS 84 latitude and longitude (EPSG:4326) with 8 decimals. The site was laid out in UTM zone 31N
(EPSG:32631), 512 000 to 514 600 m east and 6 171 000 to 6 173 000 m north.

Licence: that of the project.
"
    )
}
