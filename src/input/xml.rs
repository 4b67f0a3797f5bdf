//! What every XML file has to keep to before anything is made of it.
//!
//! A parser of XML repeats, for every element, work that grows with how deep the element is nested, how many attributes it
//! has, and how many namespaces are declared around it. Files of GIS programs have a handful of each; a file of a few
//! megabytes that has thousands would take hours. So all three are limited here, in one pass that costs the same for every
//! element, and a document type declaration, which could define entities that expand without end, is refused.

use quick_xml::events::{BytesStart, Event};
use quick_xml::reader::Reader;

use super::InputText;
use crate::problem::Problem;

/// Deepest nesting of elements that is read. Files of GIS programs stay below 20 (common practice).
pub const DEPTH_MAX: usize = 64;

/// Most attributes of one element that are read. GPX and KML define fewer than ten for any element.
pub const ATTRIBUTES_MAX: usize = 64;

/// Most declarations of namespaces in one file that are read. Files with extensions of several makers have about ten
/// (common practice).
pub const NAMESPACES_MAX: usize = 64;

/// Refuses an element with more attributes than are read, or with one that is ill-formed or stands twice.
///
/// # Errors
/// What is wrong, to follow the name of the file.
pub fn check_attributes(start: &BytesStart<'_>) -> Result<(), String> {
    // Counted first and without the search for repeated ones, which compares each with all others.
    if start.attributes().with_checks(false).take(ATTRIBUTES_MAX + 1).count() > ATTRIBUTES_MAX {
        return Err(format!("an element has more than {ATTRIBUTES_MAX} attributes"));
    }
    match start.attributes().find_map(Result::err) {
        Some(error) => Err(format!("is not well-formed XML: {error}")),
        None => Ok(()),
    }
}

/// Line numbers of byte offsets that come in growing order.
#[derive(Debug)]
pub struct Lines<'a> {
    text: &'a str,
    offset: usize,
    line: u64,
}

impl<'a> Lines<'a> {
    /// From the start of a text.
    pub fn new(text: &'a str) -> Self {
        Self { text, offset: 0, line: 1 }
    }

    /// Line, from 1, of an offset; of the last offset when this one is smaller.
    pub fn at(&mut self, offset: usize) -> u64 {
        let to = offset.clamp(self.offset, self.text.len());
        let between = &self.text.as_bytes()[self.offset..to];
        self.line += between.iter().filter(|b| **b == b'\n').count() as u64;
        self.offset = to;
        self.line
    }
}

/// Refuses a text that is not well-formed, or beyond the limits of this module.
///
/// # Errors
/// The first problem, with its line.
pub fn guard(input: &InputText) -> Result<(), Box<Problem>> {
    let mut reader = Reader::from_str(&input.text);
    let mut lines = Lines::new(&input.text);
    let (mut depth, mut namespaces) = (0_usize, 0_usize);
    loop {
        let line = lines.at(reader.buffer_position() as usize);
        let refuse = |what: String, advice: &str| {
            Err(Box::new(Problem::new(&input.name, what).line(line).accepted("plain XML").advice(advice)))
        };
        let event = match reader.read_event() {
            Ok(event) => event,
            Err(error) => {
                let line = lines.at(reader.error_position() as usize);
                let what = format!("is not well-formed XML: {error}");
                return Err(Box::new(Problem::new(&input.name, what).line(line)));
            }
        };
        let is_open = matches!(event, Event::Start(_));
        match &event {
            Event::Start(start) | Event::Empty(start) => {
                if depth >= DEPTH_MAX {
                    return refuse(format!("elements are nested deeper than {DEPTH_MAX}"), "");
                }
                if let Err(what) = check_attributes(start) {
                    return refuse(what, "");
                }
                let mut attributes = start.attributes();
                let declared = attributes.with_checks(false).flatten();
                namespaces += declared.filter(|a| a.key.as_namespace_binding().is_some()).count();
                if namespaces > NAMESPACES_MAX {
                    return refuse(format!("more than {NAMESPACES_MAX} namespaces are declared"), "");
                }
                depth += usize::from(is_open);
            }
            Event::End(_) => depth = depth.saturating_sub(1),
            Event::DocType(_) => {
                return refuse(
                    "has a document type declaration (DTD)".into(),
                    "remove the <!DOCTYPE …>; entities of its own are not read",
                );
            }
            Event::Eof => return Ok(()),
            _ => {}
        }
    }
}
