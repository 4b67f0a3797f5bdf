//! KML ([`OGC_KML`]): placemarks one by one, with their lines, so that a bad one is named and the others are still read.
//!
//! *What is read.* `Point` and `LineString` of every `Placemark` in any nesting of folders, alone or inside `MultiGeometry`;
//! `name`, the `id` attribute, and `ExtendedData`. Positions are always WGS 84, longitude first; altitudes are passed over.
//! Names of elements count without their prefix. Styles, views and times are passed over; other geometry is counted.
//!
//! *What is refused.* A document type declaration (so there are no entities to expand), any other root than `kml`, another
//! encoding than UTF-8, and elements nested deeper than [`DEPTH_MAX`] or with more attributes than [`super::xml::ATTRIBUTES_MAX`].
//!
//! [`OGC_KML`]: crate::bibliography::OGC_KML

use quick_xml::XmlVersion;
use quick_xml::events::{BytesStart, Event};
use quick_xml::reader::Reader;

use super::InputText;
use super::kml_text::{Located, tuples};
use super::xml::{DEPTH_MAX, Lines, check_attributes};
use crate::problem::{Findings, Problem, ProblemList};

pub use super::kml_text::Tuple;

/// The placemarks of a file.
#[derive(Debug, Default)]
pub struct Placemarks {
    /// In file order.
    pub list: Vec<Placemark>,
    /// Links to other files, which are not followed.
    pub links: usize,
}

/// One placemark.
#[derive(Debug, Default)]
pub struct Placemark {
    /// Number in the file, from 1.
    pub number: usize,
    /// Line of its opening tag.
    pub line: u64,
    /// Its `id` attribute.
    pub id: Option<String>,
    /// Its `name`.
    pub name: Option<String>,
    /// Its `ExtendedData`.
    pub data: Vec<Datum>,
    /// Points and lines, in file order.
    pub shapes: Vec<Shape>,
    /// Polygons, models and tracks.
    pub others: usize,
}

/// A named value.
#[derive(Clone, Debug, PartialEq)]
pub struct Datum {
    /// Line of its text, or of the placemark when it is empty.
    pub line: u64,
    /// Name as written.
    pub name: String,
    /// Value without surrounding blanks.
    pub text: String,
}

/// A point or a line.
#[derive(Debug)]
pub struct Shape {
    /// Whether it is a `Point`; otherwise a `LineString`.
    pub is_point: bool,
    /// Line of its opening tag.
    pub line: u64,
    /// Its positions: exactly one for a point without problems.
    pub tuples: Vec<Tuple>,
    /// What is wrong with it.
    pub problems: ProblemList,
}

impl Placemark {
    /// `placemark 3`.
    pub fn place(&self) -> String {
        format!("placemark {}", self.number)
    }
}

/// Splits a file into placemarks. None, with a finding, when it is no KML or ill-formed.
pub fn read(input: &InputText, findings: &mut Findings) -> Option<Placemarks> {
    let mut parser = Parser::new(input);
    match parser.run() {
        Ok(()) => Some(parser.found),
        Err(problem) => {
            findings.problem(*problem);
            None
        }
    }
}

/// Says what of a file is not read when points (else lines) are wanted: other geometry, placemarks without any, links.
pub fn report_unused(input: &InputText, found: &Placemarks, points: bool, findings: &mut Findings) {
    let shapes = found.list.iter().flat_map(|placemark| &placemark.shapes);
    let unwanted = shapes.filter(|shape| shape.is_point != points).count();
    let others: usize = found.list.iter().map(|placemark| placemark.others).sum();
    let is_bare = |placemark: &&Placemark| placemark.shapes.is_empty() && placemark.others == 0;
    let bare = found.list.iter().filter(is_bare).count();
    for (count, what) in [
        (unwanted, if points { "LineString" } else { "Point" }),
        (others, "Polygon, Model or Track"),
        (bare, "placemark without geometry"),
        (found.links, "NetworkLink"),
    ] {
        if count > 0 {
            let wanted = if points { "landmarks are Points" } else { "lines are LineStrings" };
            findings.inform(Some(&input.name), format!("not used: {count} × {what}; {wanted}"));
        }
    }
}

/// What the text that comes now belongs to.
enum Target {
    Name,
    Coordinates,
    Datum(String),
}

struct Parser<'a> {
    input: &'a InputText,
    found: Placemarks,
    /// Local names of the open elements.
    open: Vec<String>,
    has_root: bool,
    current: Option<Placemark>,
    shape: Option<(Shape, Located)>,
    /// Depth at which a target began, what it is, its text.
    target: Option<(usize, Target, Located)>,
    /// Depth at which geometry that is not used began.
    skipped: Option<usize>,
    /// Name of the open `Data` element.
    data_name: Option<String>,
    lines: Lines<'a>,
}

type Refused = Box<Problem>;

impl<'a> Parser<'a> {
    fn new(input: &'a InputText) -> Self {
        Self {
            input,
            found: Placemarks::default(),
            open: Vec::new(),
            has_root: false,
            current: None,
            shape: None,
            target: None,
            skipped: None,
            data_name: None,
            lines: Lines::new(&input.text),
        }
    }

    fn refuse(&self, line: u64, what: impl Into<String>) -> Refused {
        Box::new(Problem::new(&self.input.name, what).line(line).accepted("KML 2.2 or 2.3 as UTF-8 text"))
    }

    fn run(&mut self) -> Result<(), Refused> {
        let mut reader = Reader::from_str(&self.input.text);
        loop {
            let line = self.lines.at(reader.buffer_position() as usize);
            let event = match reader.read_event() {
                Ok(event) => event,
                Err(error) => {
                    let line = self.lines.at(reader.error_position() as usize);
                    return Err(self.refuse(line, format!("is not well-formed XML: {error}")));
                }
            };
            match event {
                Event::Start(start) => self.start(&start, line)?,
                Event::Empty(start) => {
                    self.start(&start, line)?;
                    self.end();
                }
                Event::End(_) => self.end(),
                Event::Text(text) => self.text(&text.xml10_content(), line),
                Event::CData(text) => self.text(&text.xml10_content(), line),
                Event::GeneralRef(reference) => {
                    let text = match reference.resolve_char_ref() {
                        Ok(Some(c)) => c.to_string(),
                        Ok(None) => {
                            let name = reference.xml10_content();
                            let Some(text) = quick_xml::escape::resolve_predefined_entity(&name) else {
                                return Err(self.refuse(line, format!("&{name}; is not declared in XML")));
                            };
                            text.to_owned()
                        }
                        Err(error) => {
                            return Err(self.refuse(line, format!("is not well-formed XML: {error}")));
                        }
                    };
                    self.text(&text, line);
                }
                Event::Decl(declaration) => {
                    if let Some(Ok(encoding)) = declaration.encoding()
                        && !["utf-8", "utf8", "us-ascii"].contains(&encoding.to_ascii_lowercase().as_str())
                    {
                        let mut problem = self.refuse(line, format!("says that it is encoded in {encoding}"));
                        problem.advice = "save the file as UTF-8".into();
                        return Err(problem);
                    }
                }
                Event::DocType(_) => {
                    let mut problem = self.refuse(line, "has a document type declaration (DTD)");
                    problem.advice = "remove the <!DOCTYPE …>; entities of its own are not read".into();
                    return Err(problem);
                }
                Event::Comment(_) | Event::PI(_) => {}
                Event::Eof => break,
            }
        }
        let line = self.lines.at(self.input.text.len());
        if let Some(name) = self.open.last() {
            return Err(self.refuse(line, format!("ends inside the element {name}: the file is cut off")));
        }
        if !self.has_root {
            return Err(self.refuse(line, "has no element kml"));
        }
        Ok(())
    }

    fn start(&mut self, start: &BytesStart<'_>, line: u64) -> Result<(), Refused> {
        let name = start.local_name().as_ref().to_owned();
        if self.open.is_empty() {
            if self.has_root || name != "kml" {
                return Err(self.refuse(line, format!("has the root element {name}, not kml")));
            }
            self.has_root = true;
        }
        if let Err(what) = check_attributes(start) {
            return Err(self.refuse(line, what));
        }
        if self.open.len() >= DEPTH_MAX {
            return Err(self.refuse(line, format!("elements are nested deeper than {DEPTH_MAX}")));
        }
        let inside = |name: &str| self.open.last().is_some_and(|parent| parent == name);
        let depth = self.open.len();
        match name.as_str() {
            _ if self.skipped.is_some() || self.target.is_some() => {}
            "NetworkLink" => self.found.links += 1,
            "Placemark" => {
                if self.current.is_some() {
                    return Err(self.refuse(line, "has a Placemark inside a Placemark"));
                }
                let id = self.attribute(start, "id", line)?;
                let number = self.found.list.len() + 1;
                self.current = Some(Placemark { number, line, id, ..Placemark::default() });
            }
            _ if self.current.is_none() => {}
            "name" if inside("Placemark") => self.target = Some((depth, Target::Name, Located::default())),
            "Data" if inside("ExtendedData") => self.data_name = self.attribute(start, "name", line)?,
            "value" if inside("Data") => {
                if let Some(name) = self.data_name.clone() {
                    self.target = Some((depth, Target::Datum(name), Located::default()));
                }
            }
            "SimpleData" if inside("SchemaData") => {
                if let Some(name) = self.attribute(start, "name", line)? {
                    self.target = Some((depth, Target::Datum(name), Located::default()));
                }
            }
            "Point" | "LineString" if self.shape.is_none() => {
                let is_point = name == "Point";
                let shape = Shape { is_point, line, tuples: Vec::new(), problems: ProblemList::default() };
                self.shape = Some((shape, Located::default()));
            }
            "coordinates" if self.shape.is_some() => {
                self.target = Some((depth, Target::Coordinates, Located::default()));
            }
            "Polygon" | "LinearRing" | "Model" | "Track" | "MultiTrack" => {
                self.skipped = Some(depth);
                if let Some(placemark) = &mut self.current {
                    placemark.others += 1;
                }
            }
            _ => {}
        }
        self.open.push(name);
        Ok(())
    }

    fn attribute(&self, start: &BytesStart<'_>, name: &str, line: u64) -> Result<Option<String>, Refused> {
        let refuse =
            |error: &dyn std::fmt::Display| self.refuse(line, format!("is not well-formed XML: {error}"));
        let Some(attribute) = start.try_get_attribute(name).map_err(|error| refuse(&error))? else {
            return Ok(None);
        };
        let value = attribute.normalized_value(XmlVersion::Implicit1_0).map_err(|error| refuse(&error))?;
        Ok(Some(value.trim().to_owned()).filter(|value| !value.is_empty()))
    }

    fn text(&mut self, text: &str, line: u64) {
        if let Some((_, _, located)) = &mut self.target {
            located.push(text, line);
        }
    }

    fn end(&mut self) {
        let Some(name) = self.open.pop() else { return };
        let depth = self.open.len();
        if self.skipped == Some(depth) {
            self.skipped = None;
        }
        if let Some((_, target, text)) = self.target.take_if(|(start, _, _)| *start == depth) {
            self.take(target, text);
        }
        if self.skipped.is_some() || self.target.is_some() {
            return;
        }
        match name.as_str() {
            "Data" => self.data_name = None,
            "Point" | "LineString" => {
                if let (Some((shape, text)), Some(placemark)) = (self.shape.take(), &mut self.current) {
                    placemark.shapes.push(finished(self.input, placemark.place(), shape, &text));
                }
            }
            "Placemark" => self.found.list.extend(self.current.take()),
            _ => {}
        }
    }

    fn take(&mut self, target: Target, text: Located) {
        let Some(placemark) = &mut self.current else { return };
        match target {
            Target::Name => placemark.name = text.words(),
            Target::Datum(name) => placemark.data.push(Datum {
                line: text.line().unwrap_or(placemark.line),
                name,
                text: text.words().unwrap_or_default(),
            }),
            Target::Coordinates => {
                if let Some((_, coordinates)) = &mut self.shape {
                    coordinates.append(&text);
                }
            }
        }
    }
}

/// The shape with its positions read.
fn finished(input: &InputText, place: String, mut shape: Shape, text: &Located) -> Shape {
    shape.tuples = tuples(input, &place, text, &mut shape.problems);
    if shape.problems.is_empty() {
        let count = shape.tuples.len();
        let kind = if shape.is_point { "Point" } else { "LineString" };
        if count == 0 || (shape.is_point && count > 1) {
            let what =
                if count == 0 { "has no coordinates".into() } else { format!("has {count} positions") };
            shape.problems.push(
                Problem::new(&input.name, format!("the {kind} {what}"))
                    .line(shape.line)
                    .place(place)
                    .accepted(if shape.is_point {
                        "one tuple longitude,latitude"
                    } else {
                        "two or more tuples"
                    }),
            );
        }
    }
    shape
}
