//! Numbers and units at the rim: text to numbers, degrees to radians, and how lengths and angles are written.

use time::Date;
use time::format_description::well_known::Iso8601;

/// Why a text is not a number that can be used.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct NumberFault {
    /// What is wrong, to follow the quoted text.
    pub what: &'static str,
    /// What to do; empty when obvious.
    pub advice: &'static str,
}

/// Reads a finite number written with a decimal point, or with a decimal comma when that was declared.
///
/// A comma that was not declared is refused and never guessed: `1,234` may be 1.234 or 1234.
///
/// # Errors
/// Empty text, text that is no number, `nan`, `inf`, and a number too large to hold.
pub fn parse_number(text: &str, decimal_comma: bool) -> Result<f64, NumberFault> {
    let fault = |what, advice| Err(NumberFault { what, advice });
    let trimmed = text.trim();
    if trimmed.is_empty() {
        return fault("is empty", "");
    }
    let has_comma = trimmed.contains(',');
    if has_comma && !decimal_comma {
        return fault(
            "is not a number; a comma is not read as a decimal sign unless declared",
            "if it is one, set decimal_comma = true; else remove it",
        );
    }
    if decimal_comma && trimmed.contains('.') {
        return fault(
            "has a point although decimal_comma = true is set",
            "write every number with a decimal comma and without thousands marks",
        );
    }
    let number = if has_comma { trimmed.replacen(',', ".", 1).parse::<f64>() } else { trimmed.parse() };
    match number {
        Ok(x) if x.is_finite() => Ok(x),
        Ok(_) => fault("is not a finite number", ""),
        Err(_) => fault("is not a number", ""),
    }
}

/// Which way an angle in degrees, minutes and seconds may point.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Axis {
    /// Latitude: N or S.
    Latitude,
    /// Longitude: E or W.
    Longitude,
}

/// Reads an angle in decimal degrees, or in degrees, minutes and seconds where that is unmistakable: with a degree sign,
/// as in `52°39'27.2531"N`, `52° 39.454' N` or `-1°43'04"`.
///
/// # Errors
/// As [`parse_number`]; minutes or seconds of 60 and more; a letter of the other axis; a sign together with a letter.
pub fn parse_angle_deg(text: &str, axis: Axis, decimal_comma: bool) -> Result<f64, NumberFault> {
    let trimmed = text.trim();
    if !trimmed.contains('°') {
        return parse_number(trimmed, decimal_comma);
    }
    let fault = |what| Err(NumberFault { what, advice: "write it as 52.657570 or 52°39'27.25\"N" });
    let (positive, negative) = match axis {
        Axis::Latitude => ('N', 'S'),
        Axis::Longitude => ('E', 'W'),
    };
    let mut body = trimmed.to_owned();
    let mut letter = None;
    if let Some(last) = body.chars().last().filter(|c| c.is_ascii_alphabetic()) {
        let upper = last.to_ascii_uppercase();
        if upper != positive && upper != negative {
            return fault("ends in a letter of the other axis or of none");
        }
        letter = Some(upper);
        body.pop();
    }
    let body = body.trim();
    let (sign, body) = match body.strip_prefix('-').or_else(|| body.strip_prefix('−')) {
        Some(rest) => (-1.0, rest),
        None => (1.0, body.strip_prefix('+').unwrap_or(body)),
    };
    if sign < 0.0 && letter.is_some() {
        return fault("has both a sign and a letter");
    }
    let normal = body.replace(['′', '’'], "'").replace(['″', '”'], "\"").replace("''", "\"");
    let (degrees, rest) = normal.split_once('°').unwrap_or((normal.as_str(), ""));
    let (minutes, rest) = rest.split_once('\'').unwrap_or(("", rest));
    let (seconds, rest) = rest.split_once('"').unwrap_or(("", rest));
    if !rest.trim().is_empty() {
        return fault("is not an angle");
    }
    let part = |t: &str, limit: f64| -> Option<f64> {
        let t = t.trim();
        if t.is_empty() {
            return Some(0.0);
        }
        if t.starts_with(['-', '+']) {
            return None;
        }
        parse_number(t, decimal_comma).ok().filter(|x| (0.0..limit).contains(x))
    };
    if degrees.trim().is_empty() {
        return fault("is not an angle");
    }
    match (part(degrees, 361.0), part(minutes, 60.0), part(seconds, 60.0)) {
        (Some(d), Some(m), Some(s)) => {
            let value = sign * (d + m / 60.0 + s / 3600.0);
            Ok(if letter == Some(negative) { -value } else { value })
        }
        _ => fault("is not an angle (minutes and seconds are below 60)"),
    }
}

/// A length for people: metres below 10 km, kilometres beyond.
pub fn length_words(metres: f64) -> String {
    match metres.abs() {
        m if m < 10.0 => format!("{metres:.2} m"),
        m if m < 10_000.0 => format!("{metres:.0} m"),
        m if m < 100_000.0 => format!("{:.1} km", metres / 1000.0),
        _ => format!("{:.0} km", metres / 1000.0),
    }
}

/// A direction for people: three digits, clockwise from north.
pub fn bearing_words(rad: f64) -> String {
    let deg = rad.to_degrees().rem_euclid(360.0).round() % 360.0;
    format!("{deg:03.0}°")
}

/// A geographic position for people.
pub fn position_words(lat_deg: f64, lon_deg: f64) -> String {
    let lon = (lon_deg + 180.0).rem_euclid(360.0) - 180.0;
    let ns = if lat_deg < 0.0 { "south" } else { "north" };
    let ew = if lon < 0.0 { "west" } else { "east" };
    format!("{:.6}° {ns}, {:.6}° {ew}", lat_deg.abs(), lon.abs())
}

/// `1 landmark`, `2 landmarks`.
pub fn count_words(n: usize, one: &str) -> String {
    if n == 1 { format!("1 {one}") } else { format!("{n} {one}s") }
}

/// A date of the calendar as year-month-day (ISO 8601-1, extended format).
pub fn parse_date(text: &str) -> Option<Date> {
    // The standard also has week and ordinal dates; the form in the message is the only one accepted.
    let is_plain = text.len() == 10
        && text
            .bytes()
            .enumerate()
            .all(|(i, b)| if i == 4 || i == 7 { b == b'-' } else { b.is_ascii_digit() });
    if is_plain { Date::parse(text, &Iso8601::DATE).ok() } else { None }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_finite_and_commas_declared() {
        assert_eq!(parse_number(" 12.5 ", false), Ok(12.5));
        assert_eq!(parse_number("12,5", true), Ok(12.5));
        for bad in ["nan", "inf", "-Infinity", "1e999", "12.x", "", "1,234", "0x10"] {
            assert!(parse_number(bad, false).is_err(), "{bad}");
        }
        for bad in ["1.234", "1,234,5", "1.234,5"] {
            assert!(parse_number(bad, true).is_err(), "{bad}");
        }
    }

    #[test]
    fn angles_in_degrees_minutes_and_seconds() {
        // The value is that of the Ordnance Survey guide's worked example, 52°39′27.2531″N.
        let deg = parse_angle_deg("52°39'27.2531\"N", Axis::Latitude, false).unwrap();
        assert!((deg - (52.0 + 39.0 / 60.0 + 27.2531 / 3600.0)).abs() < 1e-13);
        assert_eq!(parse_angle_deg("1°30′ W", Axis::Longitude, false), Ok(-1.5));
        assert_eq!(parse_angle_deg("-0°30'", Axis::Longitude, false), Ok(-0.5));
        assert_eq!(parse_angle_deg("7.25", Axis::Longitude, false), Ok(7.25));
        for bad in ["1°60'N", "1°30'E", "-1°N", "°", "1°2'3\"4N", "1°nan'"] {
            assert!(parse_angle_deg(bad, Axis::Latitude, false).is_err(), "{bad}");
        }
    }
}
