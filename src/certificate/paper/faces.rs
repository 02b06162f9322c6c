//! The bundled faces: shaping of text, and what they lack.
//!
//! Comes in: a text without line breaks. Goes out: its glyphs with their advances in ems and the characters each stands
//! for. Kerning and the placing of marks are the font's own; ligatures are off, so that a word may break anywhere.
//! Figures are tabular, as the font has them.

use std::cell::RefCell;
use std::collections::HashMap;
use std::ops::Range;
use std::rc::Rc;

use krilla::text::{Font, GlyphId, KrillaGlyph};
use rustybuzz::ttf_parser::Tag;
use rustybuzz::{Direction, Face as Shaper, Feature, Script, ShapePlan, UnicodeBuffer};

use super::characters::{Fault, refused};

/// The faces.
pub(super) struct Faces {
    regular: Face,
    bold: Face,
    shaped: RefCell<Shaped>,
}

/// Words with their weights, shaped once each.
type Shaped = HashMap<(bool, String), Rc<[Glyph]>>;

struct Face {
    shaper: Shaper<'static>,
    font: Font,
    units_per_em: f32,
    plans: RefCell<Vec<(Script, Rc<ShapePlan>)>>,
}

/// A glyph; lengths in ems.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Glyph {
    pub id: u32,
    pub advance: f32,
    pub x_offset: f32,
    pub y_offset: f32,
    /// The characters it stands for, as bytes of the text; glyphs of one cluster share them.
    pub characters: Range<usize>,
}

impl Glyph {
    /// The same glyph in a text where its own begins at `start`.
    pub(super) fn shifted(&self, start: usize) -> Self {
        Self { characters: self.characters.start + start..self.characters.end + start, ..self.clone() }
    }

    /// As the writer of the PDF takes it.
    pub(super) fn to_krilla(&self) -> KrillaGlyph {
        KrillaGlyph::new(
            GlyphId::new(self.id),
            self.advance,
            self.x_offset,
            self.y_offset,
            0.0,
            self.characters.clone(),
            None,
        )
    }
}

impl Faces {
    /// Nothing only if the bundled font itself could not be read.
    pub(super) fn new() -> Option<Self> {
        Some(Self {
            regular: Face::new(dejavu::sans_condensed::regular())?,
            bold: Face::new(dejavu::sans_condensed::bold())?,
            shaped: RefCell::default(),
        })
    }

    pub(super) fn font(&self, bold: bool) -> &Font {
        &self.face(bold).font
    }

    /// The glyphs of a text from left to right.
    pub(super) fn shape(&self, text: &str, bold: bool) -> Rc<[Glyph]> {
        let key = (bold, text.to_owned());
        if let Some(glyphs) = self.shaped.borrow().get(&key) {
            return Rc::clone(glyphs);
        }
        let glyphs: Rc<[Glyph]> = self.face(bold).shape(text).into();
        self.shaped.borrow_mut().insert(key, Rc::clone(&glyphs));
        glyphs
    }

    /// Width of a text on one line, in ems.
    pub(super) fn width(&self, text: &str, bold: bool) -> f32 {
        self.shape(text, bold).iter().map(|glyph| glyph.advance).sum()
    }

    /// What in the text cannot be printed, each character once.
    pub(super) fn faults(&self, text: &str, bold: bool) -> Vec<Fault> {
        let mut faults = refused(text);
        let already: Vec<char> = faults.iter().map(|fault| fault.character()).collect();
        for word in text.split(' ') {
            for glyph in self.shape(word, bold).iter().filter(|glyph| glyph.id == 0) {
                let missing = word.get(glyph.characters.clone()).unwrap_or_default();
                for c in missing.chars().filter(|c| !already.contains(c) && !self.has(*c, bold)) {
                    let fault = Fault::Missing(c);
                    if !faults.contains(&fault) {
                        faults.push(fault);
                    }
                }
            }
        }
        faults
    }

    fn has(&self, c: char, bold: bool) -> bool {
        self.face(bold).shaper.glyph_index(c).is_some()
    }

    fn face(&self, bold: bool) -> &Face {
        if bold { &self.bold } else { &self.regular }
    }
}

impl Face {
    fn new(bytes: &'static [u8]) -> Option<Self> {
        let shaper = Shaper::from_slice(bytes, 0)?;
        let units_per_em = f32::from(u16::try_from(shaper.units_per_em()).ok()?);
        Some(Self { shaper, font: Font::new(bytes.into(), 0)?, units_per_em, plans: RefCell::default() })
    }

    fn shape(&self, text: &str) -> Vec<Glyph> {
        let mut buffer = UnicodeBuffer::new();
        buffer.push_str(text);
        buffer.guess_segment_properties();
        buffer.set_direction(Direction::LeftToRight);
        let plan = self.plan(buffer.script());
        let output = rustybuzz::shape_with_plan(&self.shaper, &plan, buffer);
        let starts: Vec<usize> = output.glyph_infos().iter().map(|info| info.cluster as usize).collect();
        let ems = |units: i32| units as f32 / self.units_per_em;
        let mut glyphs = Vec::with_capacity(starts.len());
        let mut end = text.len();
        let mut next = text.len();
        for ((info, position), start) in
            output.glyph_infos().iter().zip(output.glyph_positions()).zip(&starts).rev()
        {
            if *start != next {
                (end, next) = (next, *start);
            }
            glyphs.push(Glyph {
                id: info.glyph_id,
                advance: ems(position.x_advance),
                x_offset: ems(position.x_offset),
                y_offset: ems(position.y_offset),
                characters: *start..end,
            });
        }
        glyphs.reverse();
        glyphs
    }

    /// How texts of a script are shaped; made once for each script, since making one takes longer than using it.
    fn plan(&self, script: Script) -> Rc<ShapePlan> {
        if let Some((_, plan)) = self.plans.borrow().iter().find(|(of, _)| *of == script) {
            return Rc::clone(plan);
        }
        let off = |name| Feature::new(Tag::from_bytes(name), 0, ..);
        let features = [off(b"liga"), off(b"clig"), off(b"dlig")];
        let plan =
            Rc::new(ShapePlan::new(&self.shaper, Direction::LeftToRight, Some(script), None, &features));
        self.plans.borrow_mut().push((script, Rc::clone(&plan)));
        plan
    }
}
