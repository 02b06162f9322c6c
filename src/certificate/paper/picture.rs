//! Pictures: drawings in SVG, logos in SVG or PNG.
//!
//! Comes in: bytes somebody supplied. Goes out: a picture that can be set and has a size, or why not. Nothing outside
//! the bytes is read. Letters that would vanish without a word (a family that is not bundled) are counted: the letters
//! the XML holds against the letters that were laid out.

use std::collections::HashSet;
use std::sync::Arc;

use krilla::image::{BitsPerComponent, CustomImage, Image, ImageColorspace};
use resvg::tiny_skia::Pixmap;
use resvg::usvg::{Group, ImageHrefResolver, Node, Options, Tree, fontdb, roxmltree};

use super::characters::{Fault, refused};
use super::problem::PictureFault;

/// Most pixels of a picture that is read; each takes four bytes meanwhile.
const MOST_PIXELS: u64 = 25_000_000;
/// Longest side of a picture in the document, in pixels: 600 dots an inch over the logo's box.
const LONGEST_SIDE: u32 = 1_300;
/// Most bytes of a drawing; those of a plot are a hundredth of it.
const MOST_SVG_BYTES: usize = 8 << 20;

/// Most elements of a drawing, and most of them that repeat others: together some fifty million at the worst.
const MOST_ELEMENTS: usize = 100_000;
const MOST_USES: usize = 500;

/// A picture that can be set.
#[derive(Clone)]
pub(super) enum Picture {
    /// Lines, surfaces and letters.
    Drawing(Arc<Tree>),
    /// Pixels.
    Pixels(Image),
}

impl Picture {
    /// Width over height.
    pub(super) fn proportion(&self) -> f32 {
        match self {
            Self::Drawing(tree) => tree.size().width() / tree.size().height(),
            Self::Pixels(image) => {
                let (width, height) = image.size();
                width as f32 / height.max(1) as f32
            }
        }
    }
}

/// Reads pictures with the bundled fonts; the fonts are loaded with the first drawing.
pub(super) struct Pictures {
    options: Option<Options<'static>>,
}

impl Pictures {
    pub(super) fn new() -> Self {
        Self { options: None }
    }

    /// A logo, whichever of the two it is.
    pub(super) fn logo(&mut self, bytes: &[u8]) -> Result<Picture, PictureFault> {
        if bytes.starts_with(b"\x89PNG\r\n\x1a\n") {
            return png(bytes);
        }
        match std::str::from_utf8(bytes) {
            Ok(text) if text.trim_start_matches(['\u{FEFF}', ' ', '\n', '\r', '\t']).starts_with('<') => {
                self.drawing(text)
            }
            _ => Err(PictureFault::Format),
        }
    }

    /// A drawing.
    pub(super) fn drawing(&mut self, svg: &str) -> Result<Picture, PictureFault> {
        let damaged = |why: String| PictureFault::Damaged(why.chars().filter(|c| !c.is_control()).collect());
        if svg.len() > MOST_SVG_BYTES {
            return Err(damaged(format!("over {} MB of text", MOST_SVG_BYTES >> 20)));
        }
        let xml = roxmltree::Document::parse(svg).map_err(|e| damaged(e.to_string()))?;
        let has = |name| xml.descendants().any(|node| node.is_element() && node.tag_name().name() == name);
        for (name, what) in [
            ("image", "a picture of pixels"),
            ("feImage", "a picture of pixels"),
            ("foreignObject", "a foreign object"),
        ] {
            if has(name) {
                return Err(PictureFault::Pixels(what));
            }
        }
        if !stays_small(&xml) {
            return Err(damaged("it repeats itself without end".to_owned()));
        }
        let options = self.options.get_or_insert_with(options);
        let tree = Tree::from_xmltree(&xml, options).map_err(|e| damaged(e.to_string()))?;
        if !tree.filters().is_empty() {
            return Err(PictureFault::Pixels("a filter effect"));
        }
        letters_are_all_there(&xml, &tree)?;
        Ok(Picture::Drawing(Arc::new(tree)))
    }
}

/// Whether a drawing unfolds to a bounded number of elements: those it holds, and what its `use` elements repeat, which
/// may not repeat anything in turn.
fn stays_small(xml: &roxmltree::Document<'_>) -> bool {
    let is_use = |node: &roxmltree::Node<'_, '_>| node.tag_name().name() == "use";
    let elements = xml.descendants().filter(roxmltree::Node::is_element).count();
    let uses: Vec<_> = xml.descendants().filter(is_use).collect();
    let repeated: HashSet<&str> = uses
        .iter()
        .flat_map(|node| node.attributes())
        .filter(|attribute| attribute.name() == "href")
        .filter_map(|attribute| attribute.value().strip_prefix('#'))
        .collect();
    let nested = uses
        .iter()
        .any(|node| node.ancestors().any(|n| n.attribute("id").is_some_and(|id| repeated.contains(id))));
    elements <= MOST_ELEMENTS && uses.len() <= MOST_USES && !nested
}

/// The bundled fonts and nothing of the machine.
fn options() -> Options<'static> {
    let mut fonts = fontdb::Database::new();
    for face in [dejavu::sans::regular(), dejavu::sans::bold()] {
        fonts.load_font_source(fontdb::Source::Binary(Arc::new(face)));
    }
    fonts.set_sans_serif_family("DejaVu Sans");
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

/// Compares the letters of the XML with those that were laid out, text by text in the order of both.
fn letters_are_all_there(xml: &roxmltree::Document<'_>, tree: &Tree) -> Result<(), PictureFault> {
    let mut written = Vec::new();
    for text in xml.descendants().filter(|node| node.is_element() && node.tag_name().name() == "text") {
        let letters = text.descendants().filter(|node| node.is_text() && !is_aside(node));
        let said: String = letters.filter_map(|node| node.text()).collect();
        if let Some(fault) =
            refused(&said).into_iter().find(|fault| !matches!(fault, Fault::Control('\n' | '\r' | '\t')))
        {
            return Err(PictureFault::Character(fault));
        }
        written.push(said);
    }
    let mut drawn = String::new();
    drawn_letters(tree.root(), &mut drawn)?;
    let all = written.iter().flat_map(|text| text.chars()).filter(|c| !c.is_whitespace()).count();
    let shown = drawn.chars().filter(|c| !c.is_whitespace()).count();
    if shown >= all {
        return Ok(());
    }
    // The first text whose letters do not come next is the first that lost some.
    let mut rest: &str = &drawn;
    let first = written.iter().find(|text| {
        let letters: String = text.chars().filter(|c| !c.is_whitespace()).collect();
        match rest.strip_prefix(letters.as_str()) {
            Some(after) => {
                rest = after;
                false
            }
            None => true,
        }
    });
    let first = first.map(|text| text.split_whitespace().collect::<Vec<_>>().join(" ")).unwrap_or_default();
    Err(PictureFault::TextVanishes { lost: all - shown, all, first: first.chars().take(30).collect() })
}

/// What an element says when pointed at is not drawn.
fn is_aside(node: &roxmltree::Node<'_, '_>) -> bool {
    node.ancestors().any(|n| matches!(n.tag_name().name(), "title" | "desc"))
}

fn drawn_letters(group: &Group, drawn: &mut String) -> Result<(), PictureFault> {
    for node in group.children() {
        match node {
            Node::Group(group) => drawn_letters(group, drawn)?,
            Node::Text(text) => {
                for span in text.layouted().iter().filter(|span| span.visible) {
                    for glyph in &span.positioned_glyphs {
                        if glyph.id.0 == 0 {
                            let missing = glyph.text.chars().next().unwrap_or(char::REPLACEMENT_CHARACTER);
                            return Err(PictureFault::Character(Fault::Missing(missing)));
                        }
                        drawn.extend(glyph.text.chars().filter(|c| !c.is_whitespace()));
                    }
                }
            }
            Node::Path(_) | Node::Image(_) => {}
        }
    }
    Ok(())
}

/// A PNG as pixels; where it has more of them than print shows, squares of them become one.
fn png(bytes: &[u8]) -> Result<Picture, PictureFault> {
    let (width, height) =
        png_size(bytes).ok_or_else(|| PictureFault::Damaged("its head is cut off".to_owned()))?;
    if u64::from(width) * u64::from(height) > MOST_PIXELS {
        return Err(PictureFault::TooLarge { width, height });
    }
    let pixels = Pixmap::decode_png(bytes).map_err(|e| PictureFault::Damaged(e.to_string()))?;
    let square = pixels.width().max(pixels.height()).div_ceil(LONGEST_SIDE).max(1);
    let image = Arc::new(Raster::shrunk(&pixels, square));
    Image::from_custom(RasterImage(image), false).map(Picture::Pixels).map_err(PictureFault::Damaged)
}

/// Width and height in the `IHDR` chunk, which is the first (W3C PNG, third edition, 11.2.1).
fn png_size(bytes: &[u8]) -> Option<(u32, u32)> {
    let number = |at: usize| Some(u32::from_be_bytes(bytes.get(at..at + 4)?.try_into().ok()?));
    (bytes.get(12..16)? == b"IHDR").then_some((number(16)?, number(20)?))
}

#[derive(Hash)]
struct Raster {
    width: u32,
    height: u32,
    colour: Vec<u8>,
    alpha: Option<Vec<u8>>,
}

impl Raster {
    /// Each pixel the mean of a square of pixels, weighted by how opaque they are.
    fn shrunk(from: &Pixmap, square: u32) -> Self {
        let (width, height) = (from.width().div_ceil(square), from.height().div_ceil(square));
        let mut colour = Vec::with_capacity(width as usize * height as usize * 3);
        let mut alpha = Vec::with_capacity(width as usize * height as usize);
        for row in 0..height {
            for column in 0..width {
                let (mut sum, mut count) = ([0_u32; 4], 0_u32);
                for y in row * square..((row + 1) * square).min(from.height()) {
                    for x in column * square..((column + 1) * square).min(from.width()) {
                        if let Some(p) = from.pixel(x, y) {
                            for (sum, part) in sum.iter_mut().zip([p.red(), p.green(), p.blue(), p.alpha()]) {
                                *sum += u32::from(part);
                            }
                            count += 1;
                        }
                    }
                }
                let [red, green, blue, opaque] = sum;
                // Colours are stored multiplied by their opacity.
                let part = |sum: u32| {
                    u8::try_from((sum * 255 + opaque / 2).checked_div(opaque).unwrap_or(0)).unwrap_or(255)
                };
                colour.extend([part(red), part(green), part(blue)]);
                alpha.push(u8::try_from((opaque + count / 2).checked_div(count).unwrap_or(0)).unwrap_or(255));
            }
        }
        let alpha = alpha.iter().any(|a| *a != 255).then_some(alpha);
        Self { width, height, colour, alpha }
    }
}

#[derive(Hash, Clone)]
struct RasterImage(Arc<Raster>);

impl CustomImage for RasterImage {
    fn color_channel(&self) -> &[u8] {
        &self.0.colour
    }

    fn alpha_channel(&self) -> Option<&[u8]> {
        self.0.alpha.as_deref()
    }

    fn bits_per_component(&self) -> BitsPerComponent {
        BitsPerComponent::Eight
    }

    fn size(&self) -> (u32, u32) {
        (self.0.width, self.0.height)
    }

    fn icc_profile(&self) -> Option<&[u8]> {
        None
    }

    fn color_space(&self) -> ImageColorspace {
        ImageColorspace::Rgb
    }
}
