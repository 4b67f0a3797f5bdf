//! Colours of the charts in grey print and as people with a colour-vision deficiency see them.
//!
//! *Simulation.* G. M. Machado, M. M. Oliveira, L. A. F. Fernandes (2009), A physiologically-based model for simulation of
//! color vision deficiency, IEEE Transactions on Visualization and Computer Graphics 15(6), 1291–1298,
//! doi 10.1109/TVCG.2009.113: the matrices of full severity, which act on linear RGB. Their values are those of the Python
//! library `colorspacious` 1.1.2 (`machado_et_al_2009_matrix(kind, 100)`), which takes them from the authors' supplement.
//!
//! *Measure.* CIELAB from the `palette` crate (sRGB, D65), and its CIEDE2000 difference (ISO/CIE 11664-6). Common practice
//! calls 2 a difference that one just sees side by side; classes of a chart have to be told apart across the sheet.

use std::io::Cursor;

use fixability::render::{self, CLASSES, ChartSize, ramp};
use fixability::report::LinesReport;
use palette::color_difference::Ciede2000;
use palette::{FromColor, Lab, LinSrgb, Srgb};

use crate::reports;

type Rgb = [u8; 3];

const ACCENT: Rgb = [190, 30, 45];
const INK: Rgb = [24, 32, 40];
const WHITE: Rgb = [255, 255, 255];

/// Least difference of neighbouring classes, CIEDE2000.
const CLASSES_APART: f64 = 10.0;
/// Least difference in lightness of neighbouring classes, L*: what is left in grey.
const LIGHTNESS_APART: f64 = 10.0;
/// Least difference of the accent from every class, from ink and from paper, CIEDE2000.
const ACCENT_APART: f64 = 10.0;

/// How a picture is seen.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Sight {
    Full,
    Grey,
    Protan,
    Deutan,
    Tritan,
}

impl Sight {
    const ALL: [Self; 5] = [Self::Full, Self::Grey, Self::Protan, Self::Deutan, Self::Tritan];

    fn matrix(self) -> Option<[[f64; 3]; 3]> {
        match self {
            Self::Full | Self::Grey => None,
            Self::Protan => Some([
                [0.152286, 1.052583, -0.204868],
                [0.114503, 0.786281, 0.099216],
                [-0.003882, -0.048116, 1.051998],
            ]),
            Self::Deutan => Some([
                [0.367322, 0.860646, -0.227968],
                [0.280085, 0.672501, 0.047413],
                [-0.011820, 0.042940, 0.968881],
            ]),
            Self::Tritan => Some([
                [1.255528, -0.076749, -0.178779],
                [-0.078411, 0.930809, 0.147602],
                [0.004733, 0.691367, 0.303900],
            ]),
        }
    }

    fn see(self, [r, g, b]: Rgb) -> Rgb {
        if self == Self::Grey {
            // ITU-R BT.601: how a colour is turned into grey by most printers and viewers.
            let grey = (0.299 * f64::from(r) + 0.587 * f64::from(g) + 0.114 * f64::from(b)).round() as u8;
            return [grey; 3];
        }
        let Some(matrix) = self.matrix() else { return [r, g, b] };
        let linear: LinSrgb<f64> = Srgb::new(r, g, b).into_format::<f64>().into_linear();
        let seen = matrix.map(|row| {
            let sum = row[0] * linear.red + row[1] * linear.green + row[2] * linear.blue;
            sum.clamp(0.0, 1.0)
        });
        let shown = Srgb::<u8>::from_linear(LinSrgb::new(seen[0], seen[1], seen[2]));
        [shown.red, shown.green, shown.blue]
    }
}

fn lab([r, g, b]: Rgb) -> Lab<palette::white_point::D65, f64> {
    Lab::from_color(Srgb::new(r, g, b).into_format::<f64>())
}

fn apart(a: Rgb, b: Rgb) -> f64 {
    lab(a).difference(lab(b))
}

/// The classes as they are seen, soonest first.
fn classes(sight: Sight) -> [Rgb; CLASSES] {
    ramp().map(|(r, g, b)| sight.see([r, g, b]))
}

fn assert_ordered_and_apart(seen: &[Rgb], what: &str) {
    for pair in seen.windows(2) {
        let difference = apart(pair[0], pair[1]);
        assert!(difference >= CLASSES_APART, "{what}: {pair:?} differ by {difference}");
        let darker = lab(pair[0]).l - lab(pair[1]).l;
        assert!(darker >= LIGHTNESS_APART, "{what}: {pair:?} darker by {darker}");
    }
}

/// The measure is that of the standard: pairs 1 and 25 of the table of G. Sharma, W. Wu, E. N. Dalal (2005), The CIEDE2000
/// color-difference formula, Color Research and Application 30(1), 21–30. (Values from memory.)
#[test]
fn difference_is_that_of_the_published_pairs() {
    let lab = |l, a, b| Lab::<palette::white_point::D65, f64>::new(l, a, b);
    let first = lab(50.0, 2.6772, -79.7751).difference(lab(50.0, 0.0, -82.7485));
    assert!((first - 2.0425).abs() < 1e-4, "{first}");
    let other = lab(60.2574, -34.0099, 36.2677).difference(lab(60.4626, -34.1751, 39.4387));
    assert!((other - 1.2644).abs() < 1e-4, "{other}");
}

/// Neutral colours stay as they are under every simulation: rows of the matrices sum to 1.
#[test]
fn simulation_leaves_grey_alone() {
    for sight in Sight::ALL {
        for grey in [0, 60, 128, 200, 255] {
            let seen = sight.see([grey; 3]);
            assert!(seen.iter().all(|&channel| channel.abs_diff(grey) <= 1), "{sight:?} {grey} {seen:?}");
        }
    }
    // What the deficiencies are named for: red and green come close for protan and deutan sight, blue and green for tritan.
    let (red, green) = ([200, 60, 40], [110, 120, 40]);
    assert!(apart(Sight::Deutan.see(red), Sight::Deutan.see(green)) < 0.5 * apart(red, green));
    assert!(apart(Sight::Protan.see([170, 120, 60]), Sight::Protan.see([120, 140, 60])) < 10.0);
}

#[test]
fn classes_keep_order_and_distance_for_every_sight() {
    for sight in Sight::ALL {
        let seen = classes(sight);
        assert_ordered_and_apart(&seen, &format!("{sight:?}"));
        assert!(apart(seen[0], WHITE) >= CLASSES_APART, "{sight:?}: the lightest class shows on paper");
        if sight == Sight::Grey {
            continue;
        }
        let accent = sight.see(ACCENT);
        for other in seen.into_iter().chain([sight.see(INK), WHITE]) {
            let difference = apart(accent, other);
            assert!(difference >= ACCENT_APART, "{sight:?}: accent and {other:?} differ by {difference}");
        }
    }
}

/// In grey the accent is told by its place (a thin line between two classes, or across a plot); it must show on paper.
#[test]
fn accent_shows_on_paper_in_grey() {
    assert!(apart(Sight::Grey.see(ACCENT), WHITE) > 30.0);
}

struct Picture {
    width: u32,
    height: u32,
    pixels: Vec<Rgb>,
}

impl Picture {
    fn decode(bytes: &[u8]) -> Self {
        let mut reader = png::Decoder::new(Cursor::new(bytes)).read_info().unwrap();
        let mut buffer = vec![0; reader.output_buffer_size().unwrap()];
        let info = reader.next_frame(&mut buffer).unwrap();
        let pixels = buffer.chunks_exact(3).map(|p| [p[0], p[1], p[2]]).collect();
        Self { width: info.width, height: info.height, pixels }
    }

    fn seen(&self, sight: Sight) -> Self {
        let pixels = self.pixels.iter().map(|&pixel| sight.see(pixel)).collect();
        Self { pixels, ..*self }
    }

    fn encode(&self) -> Vec<u8> {
        let mut bytes = Vec::new();
        let mut encoder = png::Encoder::new(&mut bytes, self.width, self.height);
        encoder.set_color(png::ColorType::Rgb);
        encoder.set_depth(png::BitDepth::Eight);
        let mut writer = encoder.write_header().unwrap();
        writer.write_image_data(&self.pixels.concat()).unwrap();
        writer.finish().unwrap();
        bytes
    }
}

/// One line whose five segments have the five classes.
fn five_classes() -> LinesReport {
    let values = [100.0, 250.0, 400.0, 480.0, 950.0];
    let corners = [reports::at(0.0, 0.0), reports::at(250.0, 0.0)];
    let line = reports::line("A", 1, &corners, |n, _| reports::estimated(Some(values[n]), 0.0));
    reports::report(vec![line], Vec::new())
}

/// The whole way: the chart is drawn, encoded, decoded and converted; what is found where the segments and swatches are
/// keeps order and distance, and no hatch or dots are needed to tell classes apart.
#[test]
fn decoded_chart_keeps_its_classes_for_every_sight() {
    let bytes = render::lines_png(&five_classes(), &ChartSize::default()).unwrap();
    let picture = Picture::decode(&bytes);
    for sight in Sight::ALL {
        let seen = picture.seen(sight);
        let found = ramp().map(|(r, g, b)| {
            let at: Vec<usize> =
                (0..picture.pixels.len()).filter(|&n| picture.pixels[n] == [r, g, b]).collect();
            assert!(at.len() > 2000, "the class is on the chart");
            let first = seen.pixels[at[0]];
            assert!(at.iter().all(|&n| seen.pixels[n] == first));
            first
        });
        assert_ordered_and_apart(&found, &format!("{sight:?}"));
    }
}

/// Writes charts as they are seen, for a person to look at: `FIXABILITY_PICTURES=DIR cargo test --release -- --ignored
/// write_pictures`.
#[test]
#[ignore = "writes pictures for the eye"]
fn write_pictures_of_colours() {
    let dir = std::path::PathBuf::from(std::env::var("FIXABILITY_PICTURES").expect("a folder to write to"));
    std::fs::create_dir_all(&dir).unwrap();
    let report = reports::guaranteed(reports::four_lines());
    let size = ChartSize::default();
    let charts = [
        ("lines", render::lines_png(&report, &size).unwrap()),
        ("profiles", render::profiles_png(&report, &size).unwrap()),
        ("trace", render::trace_png(&reports::trace(9), &size).unwrap()),
    ];
    for (name, bytes) in charts {
        let picture = Picture::decode(&bytes);
        for sight in Sight::ALL {
            let bytes = picture.seen(sight).encode();
            std::fs::write(dir.join(format!("{name}-{sight:?}.png").to_lowercase()), bytes).unwrap();
        }
    }
}
