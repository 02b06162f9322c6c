//! A plot as a PNG picture.
//!
//! Comes in: the text of an SVG picture and a scale. Goes out: the bytes of a PNG file, the same on every machine:
//! texts are set in the bundled DejaVu Sans, never in a font of the machine, and nothing outside the text is read.
//! Left out: pictures within the picture.

use std::sync::Arc;

use resvg::tiny_skia::{Pixmap, Transform};
use resvg::usvg::{ImageHrefResolver, Options, Tree, fontdb};

/// Longest side of a picture in pixels.
const LONGEST_SIDE: f32 = 16_000.0;
/// Most pixels of a picture; each takes four bytes while it is painted.
const MOST_PIXELS: f32 = 64e6;

/// Why no picture was made.
#[derive(Debug, thiserror::Error)]
pub enum PngError {
    /// The text is no SVG picture.
    #[error("the plot is not an SVG picture that can be painted: draw it again")]
    Svg(#[from] resvg::usvg::Error),
    /// A scale that is no positive number.
    #[error("a picture cannot be painted {0} times its size: give a scale above 0")]
    Scale(f32),
    /// Too many pixels, or none.
    #[error(
        "a picture of {width:.0} by {height:.0} pixels is outside what is painted (1 to {LONGEST_SIDE:.0} pixels a side, \
         {most:.0} million in all): choose another size", most = MOST_PIXELS / 1e6
    )]
    Size {
        /// Width asked for, in pixels.
        width: f32,
        /// Height asked for, in pixels.
        height: f32,
    },
    /// The bytes could not be packed.
    #[error("the painted picture could not be packed as PNG: {0}")]
    Encoding(String),
}

/// Paints an SVG picture, `scale` pixels for each of its own, and packs it as PNG.
///
/// The ground is the one the SVG draws; where it draws none, the picture is transparent.
///
/// # Errors
/// A text that is no SVG picture; a scale that is not finite or not above 0; a picture with a side under 1 or over
/// 16 000 pixels, or over 64 million pixels in all.
pub fn render(svg: &str, scale: f32) -> Result<Vec<u8>, PngError> {
    if !(scale.is_finite() && scale > 0.0) {
        return Err(PngError::Scale(scale));
    }
    let tree = Tree::from_str(svg, &options())?;
    let (width, height) = ((tree.size().width() * scale).ceil(), (tree.size().height() * scale).ceil());
    let sides = 1.0..=LONGEST_SIDE;
    let too_large = || PngError::Size { width, height };
    if !sides.contains(&width) || !sides.contains(&height) || width * height > MOST_PIXELS {
        return Err(too_large());
    }
    let mut pixels = Pixmap::new(width as u32, height as u32).ok_or_else(too_large)?;
    resvg::render(&tree, Transform::from_scale(scale, scale), &mut pixels.as_mut());
    pixels.encode_png().map_err(|e| PngError::Encoding(e.to_string()))
}

/// The bundled fonts and nothing of the machine.
fn options() -> Options<'static> {
    let mut fonts = fontdb::Database::new();
    for face in [dejavu::sans::regular(), dejavu::sans::bold()] {
        fonts.load_font_source(fontdb::Source::Binary(Arc::new(face)));
    }
    Options {
        font_family: "DejaVu Sans".to_owned(),
        fontdb: Arc::new(fonts),
        image_href_resolver: ImageHrefResolver {
            resolve_data: Box::new(|_, _, _| None),
            resolve_string: Box::new(|_, _| None),
        },
        ..Options::default()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn square(side: &str) -> String {
        format!("<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"{side}\" height=\"{side}\"/>")
    }

    #[test]
    fn absurd_sizes_and_scales_are_refused_by_name() {
        for scale in [0.0, -1.0, f32::NAN, f32::INFINITY] {
            assert!(matches!(render(&square("10"), scale), Err(PngError::Scale(_))), "{scale}");
        }
        for (side, scale) in [("10", 1e-3), ("10", 1e6), ("9000", 1.0), ("17000", 1.0)] {
            let refused = render(&square(side), scale);
            if scale < 1.0 {
                // A picture of less than a pixel is one pixel.
                assert!(refused.is_ok());
            } else {
                assert!(matches!(refused, Err(PngError::Size { .. })), "{side} {scale}");
            }
        }
    }

    #[test]
    fn what_is_no_svg_is_refused() {
        for text in ["", "<html/>", "<svg", "PNG"] {
            assert!(matches!(render(text, 1.0), Err(PngError::Svg(_))), "{text}");
        }
    }

    #[test]
    fn nothing_outside_the_text_is_read() {
        let svg = "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"4\" height=\"4\">\
                   <image href=\"/etc/hostname\" width=\"4\" height=\"4\"/></svg>";
        let blank = render(&square("4"), 1.0).unwrap();
        assert_eq!(render(svg, 1.0).unwrap(), blank);
    }
}
