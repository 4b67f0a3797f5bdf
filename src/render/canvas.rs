//! Paints a scene into an RGB buffer in memory and encodes it as PNG.
//!
//! Everything is painted at twice the size and averaged, so that edges are smooth on every shape alike.

use plotters::prelude::{BitMapBackend, DrawingBackend, RGBColor, TextStyle};

use super::colours::{Rgb, WHITE};
use super::scene::{Item, Px, Rect, Scene};
use super::{ChartSize, RenderError, text};

/// Sub-pixels per pixel in each direction.
const FINE: usize = 2;
/// Metres in an inch.
const INCH_M: f64 = 0.0254;

type Backend<'a> = BitMapBackend<'a>;
type Drawn = Result<(), RenderError>;

/// Paints `scene` on white and returns the PNG file's bytes.
pub(super) fn paint(scene: &Scene, size: &ChartSize) -> Result<Vec<u8>, RenderError> {
    let (width, height) = (size.width_px as usize, size.height_px as usize);
    let mut fine = vec![255_u8; width * FINE * height * FINE * 3];
    {
        let mut backend = Backend::with_buffer(&mut fine, ((width * FINE) as u32, (height * FINE) as u32));
        for item in &scene.items {
            draw(&mut backend, item)?;
        }
        backend.present().map_err(drawing)?;
    }
    encode(&averaged(&fine, width, height), size)
}

fn draw(backend: &mut Backend<'_>, item: &Item) -> Drawn {
    match item {
        Item::Polygon { points, fill } => polygon(backend, points, *fill),
        Item::Fill { rect, fill } => rectangle(backend, rect, *fill),
        Item::Stroke { points, width, colour } => stroke(backend, points, *width, *colour),
        Item::Disc { centre, radius, fill } => disc(backend, *centre, *radius, *fill),
        Item::Text { left, baseline, text, font, colour } => {
            let description = font.description(FINE as f64);
            // The library sets the baseline half a line under the anchor.
            let top = fine_px(*baseline) - description.get_size() / 2.0;
            let colour = colour_of(*colour);
            let style = TextStyle::from(description).color(&colour);
            backend
                .draw_text(&text::drawn(text), &style, (round(fine_px(*left)), round(top)))
                .map_err(drawing)
        }
    }
}

fn polygon(backend: &mut Backend<'_>, points: &[Px], fill: Rgb) -> Drawn {
    if points.is_empty() {
        return Ok(());
    }
    let corners: Vec<(i32, i32)> =
        points.iter().map(|&(x, y)| (round(fine_px(x)), round(fine_px(y)))).collect();
    backend.fill_polygon(corners, &colour_of(fill)).map_err(drawing)
}

fn rectangle(backend: &mut Backend<'_>, rect: &Rect, fill: Rgb) -> Drawn {
    let corner = |x: f64, y: f64| (round(x) * FINE as i32, round(y) * FINE as i32);
    let (upper_left, mut lower_right) = (corner(rect.left, rect.top), corner(rect.right, rect.bottom));
    // A rectangle thinner than a pixel still shows.
    lower_right.0 = lower_right.0.max(upper_left.0 + FINE as i32);
    lower_right.1 = lower_right.1.max(upper_left.1 + FINE as i32);
    backend.draw_rect(upper_left, lower_right, &colour_of(fill), true).map_err(drawing)
}

fn stroke(backend: &mut Backend<'_>, points: &[Px], width: f64, colour: Rgb) -> Drawn {
    for pair in points.windows(2) {
        let ((x0, y0), (x1, y1)) = (pair[0], pair[1]);
        let length = libm::hypot(x1 - x0, y1 - y0);
        if length == 0.0 {
            continue;
        }
        let (nx, ny) = (-(y1 - y0) / length * width / 2.0, (x1 - x0) / length * width / 2.0);
        let quad = [(x0 + nx, y0 + ny), (x1 + nx, y1 + ny), (x1 - nx, y1 - ny), (x0 - nx, y0 - ny)];
        polygon(backend, &quad, colour)?;
    }
    if width > 2.0 && points.len() > 2 {
        for &joint in &points[1..points.len() - 1] {
            disc(backend, joint, width / 2.0, colour)?;
        }
    }
    Ok(())
}

fn disc(backend: &mut Backend<'_>, (x, y): Px, radius: f64, fill: Rgb) -> Drawn {
    let centre = (round(fine_px(x)), round(fine_px(y)));
    backend.draw_circle(centre, round(fine_px(radius)) as u32, &colour_of(fill), true).map_err(drawing)
}

/// Mean of each square of sub-pixels.
fn averaged(fine: &[u8], width: usize, height: usize) -> Vec<u8> {
    let row = width * FINE * 3;
    let mut mean = Vec::with_capacity(width * height * 3);
    for y in 0..height {
        for x in 0..width {
            for channel in 0..3 {
                let mut sum = 0_u32;
                for dy in 0..FINE {
                    for dx in 0..FINE {
                        sum += u32::from(fine[(y * FINE + dy) * row + (x * FINE + dx) * 3 + channel]);
                    }
                }
                let squares = (FINE * FINE) as u32;
                mean.push(((sum + squares / 2) / squares) as u8);
            }
        }
    }
    mean
}

fn encode(pixels: &[u8], size: &ChartSize) -> Result<Vec<u8>, RenderError> {
    let mut bytes = Vec::new();
    let mut encoder = png::Encoder::new(&mut bytes, size.width_px, size.height_px);
    encoder.set_color(png::ColorType::Rgb);
    encoder.set_depth(png::BitDepth::Eight);
    let per_metre = libm::round(f64::from(size.dpi) / INCH_M) as u32;
    encoder.set_pixel_dims(Some(png::PixelDimensions {
        xppu: per_metre,
        yppu: per_metre,
        unit: png::Unit::Meter,
    }));
    let mut writer = encoder.write_header().map_err(encoding)?;
    writer.write_image_data(pixels).map_err(encoding)?;
    writer.finish().map_err(encoding)?;
    Ok(bytes)
}

fn fine_px(px: f64) -> f64 {
    px * FINE as f64
}

fn round(px: f64) -> i32 {
    libm::round(px) as i32
}

fn colour_of((r, g, b): Rgb) -> RGBColor {
    RGBColor(r, g, b)
}

fn drawing(error: impl std::fmt::Display) -> RenderError {
    RenderError::Drawing(error.to_string())
}

fn encoding(error: png::EncodingError) -> RenderError {
    RenderError::Encoding(error.to_string())
}

/// Paper is white: the buffer starts as 255 everywhere.
const _: () = assert!(WHITE.0 == 255 && WHITE.1 == 255 && WHITE.2 == 255);

#[cfg(test)]
mod tests {
    use super::*;
    use crate::render::text::{Font, width};

    /// What is measured is what is drawn: no ink of a text lies outside the rectangle the layout reserves for it.
    #[test]
    fn ink_stays_inside_the_measured_rectangle() {
        let size = ChartSize { width_px: 900, height_px: 80, dpi: 150 };
        for bold in [false, true] {
            for em_px in [15.0, 19.0, 34.0] {
                let font = Font { em_px, bold };
                for text in [
                    "Ågjpqy ÉÑŮ (fjord) 0123 …",
                    "Линия Йй Ёё щ",
                    "Γραμμή ΐ ΰ",
                    "ấ ệ ặ ņ ç",
                    "WWW AVA To. |lij|",
                    "測線一 測線二",
                    "קו אחד 12 (א)",
                    "خط المسح ٣",
                    "e\u{301}n\u{303}o\u{308}\u{323} Z\u{30c}",
                    "🌊 ⚓ boat",
                ] {
                    let mut scene = Scene::default();
                    let rect = scene.text((20.0, 20.0), text, font, (0, 0, 0));
                    assert!((rect.width() - width(text, font)).abs() < 1e-9);
                    let bytes = paint(&scene, &size).unwrap();
                    let mut reader = png::Decoder::new(std::io::Cursor::new(bytes)).read_info().unwrap();
                    let mut pixels = vec![0; reader.output_buffer_size().unwrap()];
                    reader.next_frame(&mut pixels).unwrap();
                    let inked = pixels.chunks(3).enumerate().filter(|(_, pixel)| pixel[0] < 200);
                    let mut count = 0;
                    for (index, _) in inked {
                        let (x, y) = ((index % 900) as f64, (index / 900) as f64);
                        assert!(rect.grown(0.5).holds((x + 0.5, y + 0.5)), "{text} {em_px}: ink at {x}, {y}");
                        count += 1;
                    }
                    assert!(count > 100, "{text} is drawn");
                }
            }
        }
    }
}
