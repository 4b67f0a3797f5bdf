//! Turns sound files into broken ones: not random bytes alone, which no reader looks at twice, but words of the format put
//! where they do not belong, numbers that have broken programs, and pieces cut, swapped, nested and repeated.

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

use super::corpus::{NUMBERS, seeds, words};
use super::{Format, Way};

/// Longest case in the ordinary course, bytes.
const LONG: usize = 32 << 10;
/// Length to which a piece is sometimes repeated, bytes.
const INFLATED: usize = 512 << 10;
/// One case in this many is inflated.
const INFLATE_ONE_IN: u32 = 4000;

/// A case by its number: always the same.
pub fn case(format: Format, seed: u64, number: u64) -> (Vec<u8>, Way) {
    let mut rng = ChaCha8Rng::seed_from_u64(seed ^ number.wrapping_mul(0x9E37_79B9_7F4A_7C15));
    let sources = seeds(format);
    let mut bytes = pick(&mut rng, &sources).to_vec();
    for _ in 0..rng.random_range(1..=6) {
        change(&mut bytes, format, &sources, &mut rng);
        bytes.truncate(LONG);
    }
    if rng.random_ratio(1, INFLATE_ONE_IN) {
        inflate(&mut bytes, format, &mut rng);
    }
    let roles: &[&str] = match format {
        Format::Csv | Format::Kml => &["landmarks", "lines"],
        Format::GeoJson => &["landmarks", "lines", "search_area", "complete"],
        Format::Gpx => &["lines"],
        Format::Toml => &["itself"],
    };
    let way = Way {
        crs: rng.random_range(0..3),
        decimal_comma: rng.random_bool(0.2),
        skip_bad_rows: rng.random_bool(0.3),
        in_dive: rng.random_bool(0.25).then(|| *pick(&mut rng, roles)),
    };
    (bytes, way)
}

fn pick<'a, T>(rng: &mut ChaCha8Rng, from: &'a [T]) -> &'a T {
    &from[rng.random_range(0..from.len())]
}

/// A place and a short stretch from there.
fn stretch(bytes: &[u8], most: usize, rng: &mut ChaCha8Rng) -> (usize, usize) {
    let start = rng.random_range(0..=bytes.len());
    let end = (start + rng.random_range(0..=most)).min(bytes.len());
    (start, end)
}

/// The words of a text, as ranges: letters, digits and what numbers are made of hang together.
fn tokens(bytes: &[u8], wanted: impl Fn(&[u8]) -> bool) -> Vec<(usize, usize)> {
    let inside = |b: u8| b.is_ascii_alphanumeric() || matches!(b, b'_' | b'.' | b'-' | b'+');
    let mut found = Vec::new();
    let mut start = None;
    for (i, b) in bytes.iter().copied().chain([b' ']).enumerate() {
        match (inside(b), start) {
            (true, None) => start = Some(i),
            (false, Some(s)) => {
                if wanted(&bytes[s..i]) {
                    found.push((s, i));
                }
                start = None;
            }
            _ => {}
        }
    }
    found
}

fn is_number(word: &[u8]) -> bool {
    word.iter().any(u8::is_ascii_digit) && !word.iter().any(|b| b.is_ascii_alphabetic() && *b != b'e')
}

fn lines(bytes: &[u8]) -> Vec<Vec<u8>> {
    bytes.split_inclusive(|b| *b == b'\n').map(<[u8]>::to_vec).collect()
}

fn change(bytes: &mut Vec<u8>, format: Format, sources: &[&[u8]], rng: &mut ChaCha8Rng) {
    match rng.random_range(0..18) {
        0 => {
            if let Some(i) = (!bytes.is_empty()).then(|| rng.random_range(0..bytes.len())) {
                bytes[i] = rng.random();
            }
        }
        1 => {
            let (start, end) = stretch(bytes, 40, rng);
            bytes.drain(start..end);
        }
        2 => {
            let (start, end) = stretch(bytes, 200, rng);
            let piece = bytes[start..end].repeat(rng.random_range(1..40));
            bytes.splice(end..end, piece);
        }
        3 => bytes.truncate(rng.random_range(0..=bytes.len())),
        4 | 5 => {
            let word = pick(rng, words(format));
            let at = rng.random_range(0..=bytes.len());
            bytes.splice(at..at, word.bytes());
        }
        6 | 7 => {
            let found = tokens(bytes, is_number);
            if !found.is_empty() {
                let (start, end) = *pick(rng, &found);
                bytes.splice(start..end, pick(rng, NUMBERS).bytes());
            }
        }
        8 => {
            let found = tokens(bytes, |_| true);
            if !found.is_empty() {
                let (start, end) = *pick(rng, &found);
                bytes.splice(start..end, pick(rng, words(format)).bytes());
            }
        }
        9 => {
            // A piece of another sound file, from one of its words on.
            let other = pick(rng, sources);
            let found = tokens(other, |_| true);
            let (from, _) = *pick(rng, &found);
            let to = (from + rng.random_range(0..300)).min(other.len());
            let at = rng.random_range(0..=bytes.len());
            bytes.splice(at..at, other[from..to].iter().copied());
        }
        10 => nest(bytes, format, rng),
        11 => {
            let mut all = lines(bytes);
            if all.len() > 1 {
                let (a, b) = (rng.random_range(0..all.len()), rng.random_range(0..all.len()));
                all.swap(a, b);
                *bytes = all.concat();
            }
        }
        12 => {
            let all = lines(bytes);
            if !all.is_empty() {
                let line = pick(rng, &all).repeat(rng.random_range(1..60));
                bytes.extend(line);
            }
        }
        13 => {
            let at = rng.random_range(0..=bytes.len());
            let broken: &[&[u8]] = &[
                b"\xFF",
                b"\xC0\x80",
                b"\xED\xA0\x80",
                b"\xF4\x90\x80\x80",
                b"\xC3",
                b"\0",
                b"\x1B[2J",
                b"\x7F",
                b"\xEF\xBB\xBF",
                b"\xFF\xFE",
                b"\xE2\x80\xAE",
                b"\xC2\xA0",
                b"\xE2\x80\xA8",
                b"\x1A",
                b"PK\x03\x04",
            ];
            bytes.splice(at..at, pick(rng, broken).iter().copied());
        }
        14 => {
            let at = rng.random_range(0..=bytes.len());
            let b = *pick(rng, b"9a \"[{<,;=.0-&'\n");
            let count = *pick(rng, &[10, 100, 1000, 10_000]);
            bytes.splice(at..at, std::iter::repeat_n(b, count));
        }
        15 => {
            let marks: Vec<usize> = bytes
                .iter()
                .enumerate()
                .filter(|(_, b)| !b.is_ascii_alphanumeric() && !b.is_ascii_whitespace())
                .map(|(i, _)| i)
                .collect();
            if !marks.is_empty() {
                let i = *pick(rng, &marks);
                if rng.random() {
                    bytes.remove(i);
                } else {
                    bytes[i] = *pick(rng, b"\"',;:=<>[]{}()/\\&#.!?-+\t\r\n");
                }
            }
        }
        16 => {
            // The same word in another place: duplicate keys, names and identifiers.
            let found = tokens(bytes, |_| true);
            if found.len() > 1 {
                let (from, to) = (*pick(rng, &found), *pick(rng, &found));
                let word = bytes[from.0..from.1].to_vec();
                bytes.splice(to.0..to.1, word);
            }
        }
        _ => {
            let (start, end) = stretch(bytes, 200, rng);
            let piece: Vec<u8> = bytes.drain(start..end).collect();
            let at = rng.random_range(0..=bytes.len());
            bytes.splice(at..at, piece);
        }
    }
}

/// What opens and closes a level in a format.
fn brackets(format: Format, rng: &mut ChaCha8Rng) -> (&'static str, &'static str) {
    match format {
        Format::Csv => ("\"", "\""),
        Format::GeoJson => *pick(
            rng,
            &[("[", "]"), ("{\"a\":", "}"), ("{\"type\":\"GeometryCollection\",\"geometries\":[", "]}")],
        ),
        Format::Gpx => {
            *pick(rng, &[("<extensions>", "</extensions>"), ("<a>", "</a>"), ("<b c=\"d\">", "</b>")])
        }
        Format::Kml => {
            *pick(rng, &[("<Folder>", "</Folder>"), ("<MultiGeometry>", "</MultiGeometry>"), ("<a>", "</a>")])
        }
        Format::Toml => *pick(rng, &[("[", "]"), ("{a=", "}"), ("a.", "b"), ("[[", "]]")]),
    }
}

fn nest(bytes: &mut Vec<u8>, format: Format, rng: &mut ChaCha8Rng) {
    let (open, close) = brackets(format, rng);
    let depth = *pick(rng, &[1, 2, 5, 30, 70, 130, 1000]);
    let (start, end) = stretch(bytes, 300, rng);
    if rng.random_bool(0.8) {
        bytes.splice(end..end, close.repeat(depth).into_bytes());
    }
    bytes.splice(start..start, open.repeat(depth).into_bytes());
}

/// Repeats a piece, or a word of the format, very often.
fn inflate(bytes: &mut Vec<u8>, format: Format, rng: &mut ChaCha8Rng) {
    let (start, end) = stretch(bytes, 60, rng);
    let mut piece = bytes[start..end].to_vec();
    if piece.is_empty() || rng.random_bool(0.3) {
        piece = pick(rng, words(format)).as_bytes().to_vec();
    }
    let times = INFLATED / piece.len();
    bytes.splice(end..end, piece.repeat(times));
}
