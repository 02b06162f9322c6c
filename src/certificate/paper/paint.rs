//! Pages painted: the bytes of the PDF.
//!
//! Comes in: pages of strips. Goes out: PDF/A-3A (ISO 19005-3) on PDF 1.7. What stands on every page is an artifact; the
//! same document gives the same bytes, since nothing here asks for the time or for chance.

use krilla::Document as Pdf;
use krilla::SerializeSettings;
use krilla::color::rgb;
use krilla::configure::{Archival, ConfigurationBuilder, ValidationError};
use krilla::destination::XyzDestination;
use krilla::embed::{AssociationKind, EmbeddedFile, MimeType};
use krilla::error::KrillaError;
use krilla::geom::{PathBuilder, Point, Rect, Size, Transform};
use krilla::metadata::{DateTime, Metadata};
use krilla::num::NormalizedF32;
use krilla::outline::{Outline, OutlineNode};
use krilla::page::PageSettings;
use krilla::paint::{Fill, Stroke};
use krilla::surface::Surface;
use krilla::tagging::{Artifact, ArtifactType, ContentTag, SpanTag};
use krilla::text::KrillaGlyph;
use krilla_svg::{SurfaceExt as _, SvgSettings};

use super::faces::Faces;
use super::lines::{Line, broken};
use super::model::{Document, Level, Relationship, Text};
use super::pages::{OnPage, What};
use super::picture::Picture;
use super::problem::Problem;
use super::strip::{Ink, Item, Strip};
use super::style::{Colour, FINE, QUIET, SAND, Sheet};
use super::tree::{NodeId, Tree};

/// What is painted.
pub(super) struct Painting<'a> {
    pub document: &'a Document,
    pub faces: &'a Faces,
    pub strips: &'a [Strip],
    pub heads: &'a [Strip],
    pub pages: &'a [Vec<OnPage>],
    pub tree: Tree,
}

/// Paints all pages.
///
/// # Errors
/// What the writer refuses. The checks before leave nothing for it to refuse, so each is a fault of this program.
pub(super) fn painted(painting: Painting<'_>) -> Result<Vec<u8>, Vec<Problem>> {
    let fault = |what: String| vec![Problem::Conformance(what)];
    let configuration = ConfigurationBuilder::new()
        .with_archival_validator(Archival::A3_A)
        .finish()
        .map_err(|e| fault(format!("{e:?}")))?;
    let settings = SerializeSettings { configuration, ..SerializeSettings::default() };
    let mut painter = Painter { painting, pdf: Pdf::new_with(settings), headings: Vec::new() };
    for page in 0..painter.painting.pages.len() {
        painter.page(page).ok_or_else(|| fault("a page or a rectangle without size".to_owned()))?;
    }
    painter.finish()
}

struct Painter<'a> {
    painting: Painting<'a>,
    pdf: Pdf,
    headings: Vec<Heading>,
}

impl Painter<'_> {
    fn page(&mut self, number: usize) -> Option<()> {
        let Painting { document, faces, strips, heads, pages, tree } = &mut self.painting;
        let sheet = Sheet::of(document.paper);
        let mut page = self.pdf.start_page_with(PageSettings::from_wh(sheet.width, sheet.height)?);
        let mut surface = page.surface();
        let label = format!("page {} of {}", number + 1, pages.len());
        running_head(&mut surface, faces, sheet, &document.running_head, &label)?;
        for on_page in pages.get(number)? {
            let top = sheet.top + on_page.y;
            match on_page.what {
                What::Strip(i) => {
                    let strip = strips.get(i)?;
                    if let Some((level, title)) = &strip.heading {
                        let at = XyzDestination::new(number, Point::from_xy(0.0, (top - 6.0).max(0.0)));
                        self.headings.push((*level, title.clone(), at));
                    }
                    for item in &strip.items {
                        let brush = Brush { faces, left: sheet.side, top, page: number };
                        brush.item(&mut surface, item, Some(tree))?;
                    }
                }
                What::Repeated(i) => {
                    for item in &heads.get(i)?.items {
                        let brush = Brush { faces, left: sheet.side, top, page: number };
                        brush.item(&mut surface, item, None)?;
                    }
                }
            }
        }
        surface.finish();
        page.finish();
        Some(())
    }

    fn finish(self) -> Result<Vec<u8>, Vec<Problem>> {
        let Self { painting, mut pdf, headings } = self;
        let document = painting.document;
        pdf.set_tag_tree(painting.tree.finished().with_lang(Some(document.language.clone())));
        pdf.set_outline(outline(&headings));
        let mut metadata = Metadata::new()
            .title(document.title.clone())
            .language(document.language.clone())
            .creator(document.producer.clone())
            .producer(document.producer.clone())
            .document_id(document.running_head.clone())
            .creation_date(date(&document.date));
        if let Some(author) = &document.author {
            metadata = metadata.authors(vec![author.clone()]);
        }
        pdf.set_metadata(metadata);
        for attachment in &document.attachments {
            let embedded = pdf.embed_file(EmbeddedFile {
                path: attachment.name.clone(),
                mime_type: MimeType::new(&attachment.mime_type),
                description: Some(attachment.description.clone()),
                association_kind: kind(attachment.relationship),
                data: attachment.bytes.clone().into(),
                modification_date: Some(date(&attachment.modified)),
                compress: Some(true),
                location: None,
            });
            if embedded.is_none() {
                return Err(vec![Problem::AttachmentTwice(attachment.name.clone())]);
            }
        }
        pdf.finish().map_err(|refused| match refused {
            KrillaError::Validation(all) => all.into_iter().map(|(one, _)| problem(&one)).collect(),
            other => vec![Problem::Conformance(other.to_string())],
        })
    }
}

/// What pictures bring in is for whoever made them; the rest is set by this program.
fn problem(refused: &ValidationError) -> Problem {
    match refused {
        ValidationError::TooHighQNestingLevel => Problem::InPictures("groups inside one another, too deep"),
        ValidationError::ContainsPostScript(_) => Problem::InPictures("a colour that repeats or turns"),
        other => Problem::Conformance(format!("{other:?}")),
    }
}

/// Number and page, with a hairline under them.
fn running_head(
    surface: &mut Surface<'_>,
    faces: &Faces,
    sheet: Sheet,
    left: &str,
    right: &str,
) -> Option<()> {
    let width = sheet.text_width();
    let line = |text: &str| broken(faces, &Text::plain(text), f32::INFINITY).pop();
    let page = line(right)?;
    let page_width = page.width * FINE.letters;
    surface.start_tagged(ContentTag::Artifact(Artifact::with_kind(ArtifactType::Header)));
    let brush = Brush { faces, left: sheet.side, top: 0.0, page: 0 };
    brush.letters(surface, 0.0, sheet.head, &line(left)?, FINE.letters, QUIET);
    brush.letters(surface, width - page_width, sheet.head, &page, FINE.letters, QUIET);
    brush.fill(surface, Rect::from_xywh(sheet.side, sheet.head + 5.0, width, 0.5)?, SAND);
    surface.end_tagged();
    Some(())
}

/// Paints items of one strip.
struct Brush<'a> {
    faces: &'a Faces,
    left: f32,
    top: f32,
    page: usize,
}

impl Brush<'_> {
    /// Paints an item; without a tree, or where it belongs to nothing, as decoration.
    fn item(&self, surface: &mut Surface<'_>, item: &Item, tree: Option<&mut Tree>) -> Option<()> {
        let (x, y) = (self.left + item.x, self.top + item.y);
        let tag = match (&item.ink, &tree, item.node) {
            (Ink::Letters(..), Some(_), Some(_)) => ContentTag::Span(SpanTag::empty()),
            (Ink::Picture { .. }, Some(_), Some(_)) => ContentTag::Other,
            (Ink::Letters(..), None, _) => {
                ContentTag::Artifact(Artifact::with_kind(ArtifactType::PaginationOther))
            }
            _ => ContentTag::Artifact(Artifact::with_kind(ArtifactType::Layout)),
        };
        let owner: Option<NodeId> = if matches!(tag, ContentTag::Artifact(_)) { None } else { item.node };
        let leaf = surface.start_tagged(tag);
        match &item.ink {
            Ink::Letters(line, letters, colour) => {
                self.letters(surface, item.x, item.y, line, *letters, *colour)
            }
            Ink::Fill { width, height, colour } => {
                self.fill(surface, Rect::from_xywh(x, y, *width, *height)?, *colour);
            }
            Ink::Stroke { dx, dy, width, colour } => {
                let mut path = PathBuilder::new();
                path.move_to(x, y);
                path.line_to(x + dx, y + dy);
                surface.set_fill(None);
                surface.set_stroke(Some(Stroke {
                    paint: paint(*colour).into(),
                    width: *width,
                    ..Stroke::default()
                }));
                surface.draw_path(&path.finish()?);
                surface.set_stroke(None);
            }
            Ink::Picture { picture, width, height } => {
                let size = Size::from_wh(*width, *height)?;
                surface.push_transform(&Transform::from_translate(x, y));
                match picture {
                    Picture::Drawing(tree) => surface.draw_svg(tree, size, SvgSettings::default())?,
                    Picture::Pixels(image) => surface.draw_image(image.clone(), size),
                }
                surface.pop();
            }
        }
        surface.end_tagged();
        if let (Some(tree), Some(node)) = (tree, owner) {
            tree.leaf(node, leaf);
            if let Ink::Picture { width, height, .. } = &item.ink {
                tree.place(node, self.page, Rect::from_xywh(x, y, *width, *height)?);
            }
        }
        Some(())
    }

    fn letters(&self, surface: &mut Surface<'_>, x: f32, y: f32, line: &Line, letters: f32, colour: Colour) {
        surface.set_stroke(None);
        surface.set_fill(Some(fill(colour)));
        for stretch in &line.stretches {
            let glyphs: Vec<KrillaGlyph> = stretch.glyphs.iter().map(|glyph| glyph.to_krilla()).collect();
            let at = Point::from_xy(self.left + x + stretch.x * letters, self.top + y);
            let font = self.faces.font(stretch.bold).clone();
            surface.draw_glyphs(at, &glyphs, font, &stretch.text, letters, false);
        }
    }

    fn fill(&self, surface: &mut Surface<'_>, rectangle: Rect, colour: Colour) {
        let mut path = PathBuilder::new();
        path.push_rect(rectangle);
        if let Some(path) = path.finish() {
            surface.set_stroke(None);
            surface.set_fill(Some(fill(colour)));
            surface.draw_path(&path);
        }
    }
}

fn paint(Colour(red, green, blue): Colour) -> rgb::Color {
    rgb::Color::new(red, green, blue)
}

fn fill(colour: Colour) -> Fill {
    Fill { paint: paint(colour).into(), opacity: NormalizedF32::ONE, ..Fill::default() }
}

/// A heading with where it stands.
type Heading = (Level, String, XyzDestination);

/// Headings as readers list them: each under the nearest one before it of a higher level.
fn outline(headings: &[Heading]) -> Outline {
    let mut outline = Outline::new();
    for node in nodes(headings) {
        outline.push_child(node);
    }
    outline
}

/// As deep as there are levels.
fn nodes(headings: &[Heading]) -> Vec<OutlineNode> {
    let mut nodes = Vec::new();
    let mut rest = headings;
    while let Some(((level, title, at), after)) = rest.split_first() {
        let below = after.iter().position(|(other, ..)| other <= level).unwrap_or(after.len());
        let (below, next) = after.split_at(below);
        let mut node = OutlineNode::new(title.clone(), at.clone()).with_open(true);
        nodes_below(&mut node, below);
        nodes.push(node);
        rest = next;
    }
    nodes
}

fn nodes_below(node: &mut OutlineNode, headings: &[Heading]) {
    for below in nodes(headings) {
        node.push_child(below);
    }
}

fn kind(relationship: Relationship) -> AssociationKind {
    match relationship {
        Relationship::Source => AssociationKind::Source,
        Relationship::Data => AssociationKind::Data,
        Relationship::Alternative => AssociationKind::Alternative,
        Relationship::Supplement => AssociationKind::Supplement,
        Relationship::Unspecified => AssociationKind::Unspecified,
    }
}

/// Years outside 0 to 9999 are held to these.
fn date(at: &chrono::DateTime<chrono::FixedOffset>) -> DateTime {
    use chrono::{Datelike as _, Timelike as _};
    let small = |n: u32| u8::try_from(n).unwrap_or(u8::MAX);
    let minutes = at.offset().local_minus_utc() / 60;
    DateTime::new(u16::try_from(at.year().clamp(0, 9999)).unwrap_or(0))
        .month(small(at.month()))
        .day(small(at.day()))
        .hour(small(at.hour()))
        .minute(small(at.minute()))
        .second(small(at.second()))
        .utc_offset_hour(i8::try_from(minutes / 60).unwrap_or(0))
        .utc_offset_minute(u8::try_from((minutes % 60).unsigned_abs()).unwrap_or(0))
}
