//! Text in one compiled-in family: measuring, cutting and wrapping with the font that is drawn.
//!
//! The type is DejaVu Sans from the `dejavu` crate, so pictures are the same on every machine and no system font is
//! looked up. It has Latin, Greek, Cyrillic, Hebrew and Arabic letters; a letter that it does not have is drawn as an
//! empty box. Text that runs from right to left is put in the order in which it is drawn (Unicode Standard Annex 9);
//! letters are not joined.

use std::borrow::Cow;
use std::sync::{Once, OnceLock};

use ab_glyph::{Font as _, FontRef};
use plotters::style::{FontDesc, FontFamily, FontStyle, register_font};

use unicode_bidi::{BidiClass, BidiInfo, Level, bidi_class};
use unicode_normalization::UnicodeNormalization as _;
use unicode_normalization::char::is_combining_mark;

use super::scene::{Px, Rect};

/// Name under which the family is registered with the drawing library.
const FAMILY: &str = "fixability-sans";
/// Height of the font's line (ascent and descent) over its em, from the font's own tables: (1901 + 483) / 2048.
/// The drawing library takes the former as the size, people speak of the latter.
const LINE_PER_EM: f64 = 2384.0 / 2048.0;
/// Highest ink of Latin, Greek and Cyrillic letters with one accent above the baseline, in em. (A capital with two
/// accents, one on the other, reaches 0.06 em further.)
const ASCENT_EM: f64 = 1.02;
/// Lowest ink of the same letters under the baseline, in em.
const DESCENT_EM: f64 = 0.3;
/// How far an accent of its own may reach beyond the end of a line, in em.
const ACCENT_EM: f64 = 0.4;
/// Distance of baselines in a block, in em.
const LEADING_EM: f64 = 1.34;
/// A space at which no line is broken.
const NO_BREAK: char = '\u{a0}';
/// Start and end of text that is ordered by itself (first strong isolate, pop directional isolate).
const ISOLATE: char = '\u{2068}';
const ISOLATE_END: char = '\u{2069}';
/// Units that stay with their number.
const UNITS: [&str; 4] = ["m", "m/s", "km²", "%"];
/// What stands for text that was cut.
const ELLIPSIS: char = '…';

/// A size and weight of the one family.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Font {
    pub(super) em_px: f64,
    pub(super) bold: bool,
}

impl Font {
    pub(super) fn ascent_px(self) -> f64 {
        self.em_px * ASCENT_EM
    }

    pub(super) fn height_px(self) -> f64 {
        self.em_px * (ASCENT_EM + DESCENT_EM)
    }

    pub(super) fn line_px(self) -> f64 {
        self.em_px * LEADING_EM
    }

    /// The drawing library's description of this font at `magnification`.
    pub(super) fn description(self, magnification: f64) -> FontDesc<'static> {
        register();
        let style = if self.bold { FontStyle::Bold } else { FontStyle::Normal };
        FontDesc::new(FontFamily::Name(FAMILY), self.em_px * LINE_PER_EM * magnification, style)
    }
}

fn register() {
    static ONCE: Once = Once::new();
    ONCE.call_once(|| {
        for (style, bytes) in
            [(FontStyle::Normal, dejavu::sans::regular()), (FontStyle::Bold, dejavu::sans::bold())]
        {
            if register_font(FAMILY, style, bytes).is_err() {
                unreachable!("the compiled-in font is a sound TrueType file");
            }
        }
    });
}

/// Width of `text`, pixels, rounded up to the next half.
pub(super) fn width(text: &str, font: Font) -> f64 {
    // The library cuts its measure to whole pixels; measuring at four times the size keeps the loss under a quarter.
    let (quarter_px, _) = font.description(4.0).box_size(&drawn(text)).expect("the font is registered");
    // Accents of their own have no width and reach beyond their letter.
    let accents = if text.chars().any(is_combining_mark) { ACCENT_EM * font.em_px } else { 0.0 };
    f64::from(quarter_px) / 4.0 + 0.5 + accents
}

/// The rectangle `text` fills when its upper left corner is at `(left, top)`.
pub(super) fn rect_at((left, top): Px, text: &str, font: Font) -> Rect {
    Rect::new(left, top, left + width(text, font), top + font.height_px())
}

/// `text` with its letters in the order in which they are drawn, from left to right, without what only steers them.
pub(super) fn drawn(text: &str) -> Cow<'_, str> {
    if text.is_ascii() || !text.chars().any(runs_left) {
        return Cow::Borrowed(text);
    }
    // Sentences of the charts run from left to right; a name within is isolated (see `printable`).
    let info = BidiInfo::new(text, Some(Level::ltr()));
    let lines = info.paragraphs.iter().map(|part| info.reorder_line(part, part.range.clone()));
    Cow::Owned(lines.map(|line| without_steering(&line)).collect())
}

/// Whether a letter belongs to a script that runs from right to left.
fn runs_left(c: char) -> bool {
    matches!(bidi_class(c), BidiClass::R | BidiClass::AL)
}

/// `text` without the characters that have no ink.
pub(super) fn without_steering(text: &str) -> String {
    text.chars().filter(|&c| !only_steers(c)).collect()
}

/// Whether the type has every letter of `text`.
pub(super) fn has_every_letter(text: &str) -> bool {
    static REGULAR: OnceLock<Option<FontRef<'static>>> = OnceLock::new();
    let regular = REGULAR.get_or_init(|| FontRef::try_from_slice(dejavu::sans::regular()).ok());
    // Glyph 0 is the box that stands for a letter that is missing.
    regular.as_ref().is_some_and(|font| text.chars().all(|c| only_steers(c) || font.glyph_id(c).0 != 0))
}

/// Whether a character has no ink and only steers how others are set: directions, joiners, soft hyphens.
fn only_steers(c: char) -> bool {
    matches!(c, '\u{ad}' | '\u{61c}' | '\u{200b}'..='\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2060}'..='\u{206f}' | '\u{feff}')
}

/// A name as it can be drawn on one line: control characters and runs of white space become one space, and characters
/// without ink are left out. A name with letters that run from right to left is isolated and kept on one line, so that
/// it does not turn the numbers beside it around.
pub(super) fn printable(name: &str) -> String {
    // A letter and its accent become one letter where there is one: the type sets accents of their own badly.
    let inked = name.nfc().filter(|&c| !only_steers(c));
    let spaced: String = inked.map(|c| if c.is_control() { ' ' } else { c }).collect();
    let words: Vec<&str> = spaced.split_whitespace().collect();
    if spaced.chars().any(runs_left) {
        format!("{ISOLATE}{}{ISOLATE_END}", words.join(&NO_BREAK.to_string()))
    } else {
        words.join(" ")
    }
}

/// `text` if it is at most `room` pixels wide, else as much of it as fits with an ellipsis, so that the cut shows.
pub(super) fn fit(text: &str, font: Font, room: f64) -> String {
    if width(text, font) <= room {
        return text.to_owned();
    }
    let ends: Vec<usize> = text.char_indices().map(|(index, _)| index).collect();
    let cut = |count: usize| format!("{}{ELLIPSIS}", text[..ends[count]].trim_end());
    let fitting =
        ends.partition_point(|&end| width(&format!("{}{ELLIPSIS}", text[..end].trim_end()), font) <= room);
    cut(fitting.saturating_sub(1))
}

/// Breaks `text` at spaces into lines of at most `room` pixels, at most `most` of them; a line that cannot hold what
/// is left ends in an ellipsis.
pub(super) fn wrap(text: &str, font: Font, room: f64, most: usize) -> Vec<String> {
    // A number stays with its unit.
    let mut pieces: Vec<String> = Vec::new();
    for word in text.split(' ') {
        let is_unit = UNITS.contains(&word.trim_end_matches([',', ';', '.', ')']));
        match pieces.last_mut() {
            Some(number) if is_unit && number.ends_with(|c: char| c.is_ascii_digit()) => {
                number.push(NO_BREAK);
                number.push_str(word);
            }
            _ => pieces.push(word.to_owned()),
        }
    }
    wrap_pieces(pieces.iter().map(String::as_str), " ", font, room, most)
}

/// As [`wrap`], but breaks only between `pieces`, joined by `glue` on a line.
pub(super) fn wrap_pieces<'a>(
    pieces: impl Iterator<Item = &'a str>,
    glue: &str,
    font: Font,
    room: f64,
    most: usize,
) -> Vec<String> {
    let mut lines: Vec<String> = Vec::new();
    for piece in pieces {
        let joined = lines.last().map(|line| format!("{line}{glue}{piece}"));
        match joined {
            Some(joined) if lines.len() >= most || width(&joined, font) <= room => {
                if let Some(line) = lines.last_mut() {
                    *line = joined;
                }
            }
            _ => lines.push(piece.to_owned()),
        }
    }
    lines.iter().map(|line| fit(line, font, room)).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Numbers beside a name from right to left keep their order and their side (Unicode Standard Annex 9, isolates), and
    /// a cut shows at the end of the name, which is its left.
    #[test]
    fn names_from_right_to_left_leave_their_neighbours_alone() {
        let name = printable("\u{202e}קו 13");
        assert_eq!(drawn(&format!("told by {name}, 40 m on")), "told by 13\u{a0}וק, 40 m on");
        assert_eq!(drawn(&format!("{name}  ·  issued 2026")), "13\u{a0}וק  ·  issued 2026");
        let font = Font { em_px: 16.0, bold: false };
        let long = fit(&printable(&"קו ".repeat(40)), font, 100.0);
        assert!(long.ends_with(ELLIPSIS) && drawn(&long).starts_with(ELLIPSIS), "{:?}", drawn(&long));
        assert!(width(&long, font) <= 100.0);
    }

    #[test]
    fn accents_are_composed_and_what_has_no_ink_is_left_out() {
        assert_eq!(printable("e\u{301}\tn\u{303}\u{200b}\n x"), "é ñ x");
        assert!(has_every_letter("Å é Ж β קו خط") && !has_every_letter("測線"));
    }
}
