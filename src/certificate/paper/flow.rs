//! Blocks turned into strips, one after another.
//!
//! Comes in: a document whose texts were checked. Goes out: strips with their places in the reading order, and the
//! tables that are too wide. Nothing here knows where a page ends.

use super::faces::Faces;
use super::lines::{Line, broken};
use super::model::{
    Block, Document, Figure, Level, Notice, Pair, Paper, Sentence, Signature, Standing, Table, Text,
};
use super::picture::Picture;
use super::problem::Problem;
use super::strip::{Cell, Ink, Item, Keep, RowSpace, Strip, baseline, kept, row, without_lone_lines};
use super::style::{
    AROUND, BELOW_HEADING, BETWEEN, BODY, BRICK, CAPTION, Colour, FINE, INK, MEASURE, NAME, QUIET, SAND,
    STATEMENT, Sheet, Size, VERDICT, above_heading, heading,
};
use super::table;
use super::tree::{NodeId, Role, Tree};

/// Points in a millimetre: 72 to an inch of 25.4 mm.
const POINTS_PER_MM: f32 = 72.0 / 25.4;
/// Box a logo is scaled into.
const LOGO: (f32, f32) = (150.0, 54.0);
/// A piece taller than this share of a page is cut rather than pushed to the next one.
const TALL: f32 = 0.4;
/// Share of a page's height a figure may take, so that its heading and caption stand with it.
const TALLEST_FIGURE: f32 = 0.82;
/// Share of the width that names before values may take.
const KEYS: f32 = 0.42;

/// Strips, and what belongs to them.
pub(super) struct Flow<'a> {
    faces: &'a Faces,
    sheet: Sheet,
    accent: Colour,
    pub tree: Tree,
    pub strips: Vec<Strip>,
    /// Heads of tables, repeated on each page.
    pub heads: Vec<Strip>,
    pub problems: Vec<Problem>,
    /// Space before the next strip.
    gap: f32,
    fresh_page: bool,
    tables: usize,
    figures: std::vec::IntoIter<Option<Picture>>,
}

impl<'a> Flow<'a> {
    /// Sets all of a document; `figures` are its figures in order, `None` where one cannot be read.
    pub(super) fn of(
        document: &Document,
        faces: &'a Faces,
        accent: Colour,
        logo: Option<Picture>,
        figures: Vec<Option<Picture>>,
    ) -> Self {
        let mut flow = Self {
            faces,
            sheet: Sheet::of(document.paper),
            accent,
            tree: Tree::new(),
            strips: Vec::new(),
            heads: Vec::new(),
            problems: Vec::new(),
            gap: 0.0,
            fresh_page: false,
            tables: 0,
            figures: figures.into_iter(),
        };
        flow.letterhead(document, logo);
        flow.blocks(&document.blocks);
        flow.end(&document.end);
        flow
    }

    fn blocks(&mut self, blocks: &[Block]) {
        for block in blocks {
            self.block(block);
        }
    }

    fn block(&mut self, block: &Block) {
        match block {
            Block::Heading(level, text) => self.heading(*level, text),
            Block::Paragraph(text) => self.paragraph(text, BODY, INK, BETWEEN),
            Block::FinePrint(text) => self.paragraph(text, FINE, QUIET, BETWEEN * 0.7),
            Block::List(points) => self.list(points),
            Block::Pairs { pairs, two_columns } => self.pairs(pairs, *two_columns && self.sheet.is_wide()),
            Block::Table(table) => self.table(table),
            Block::Figure(figure) => self.figure(figure),
            Block::Notice(notice) => self.notice(notice),
            Block::Sentence(sentence) => self.sentence(sentence),
            Block::Signatures(signatures) => self.signatures(signatures),
            Block::Together(blocks) => {
                let start = self.strips.len();
                self.blocks(blocks);
                kept(self.strips.get_mut(start..).unwrap_or_default(), Keep::Wanted);
            }
            Block::WithNext(block) => {
                self.block(block);
                if let Some(last) = self.strips.last_mut() {
                    last.keep = Keep::Needed;
                }
            }
            Block::PageBreak => self.fresh_page = true,
        }
    }

    /// Width of running text.
    fn measure(&self, size: Size) -> f32 {
        self.sheet.text_width().min(MEASURE * size.letters)
    }

    fn tallest(&self) -> f32 {
        self.sheet.text_height() * TALL
    }

    fn space(&mut self, space: f32) {
        self.gap = self.gap.max(space);
    }

    fn push(&mut self, mut strip: Strip) {
        strip.before += std::mem::take(&mut self.gap);
        strip.fresh_page |= std::mem::take(&mut self.fresh_page);
        self.strips.push(strip);
    }

    fn push_all(&mut self, strips: Vec<Strip>) {
        for strip in strips {
            self.push(strip);
        }
    }

    fn lines(&self, text: &Text, size: Size, width: f32) -> Vec<Line> {
        // A hundredth of a point more, so that a text measured for a width also fits into it.
        broken(self.faces, text, (width + 0.01) / size.letters)
    }

    /// One strip for each line, moved to the right by `x`.
    fn line_strips(
        &self,
        text: &Text,
        size: Size,
        colour: Colour,
        x: f32,
        width: f32,
        node: NodeId,
    ) -> Vec<Strip> {
        let cells = [Cell {
            x,
            lines: self.lines(text, size, width - x).into_iter().map(|line| (0.0, line)).collect(),
            size,
            colour,
            node,
        }];
        let mut strips = row(&cells, RowSpace { above: 0.0, below: 0.0, tallest: 0.0 });
        without_lone_lines(&mut strips);
        strips
    }

    fn paragraph(&mut self, text: &Text, size: Size, colour: Colour, between: f32) {
        self.space(between);
        let node = self.tree.add(Tree::ROOT, Role::Paragraph);
        let strips = self.line_strips(text, size, colour, 0.0, self.measure(size), node);
        self.push_all(strips);
        self.space(between);
    }

    fn heading(&mut self, level: Level, text: &str) {
        self.space(above_heading(level));
        let size = heading(level);
        let node = self.tree.add(Tree::ROOT, Role::Heading(level, text.to_owned()));
        let mut strips = self.line_strips(&Text::bold(text), size, INK, 0.0, self.sheet.text_width(), node);
        for strip in &mut strips {
            strip.keep = Keep::Needed;
        }
        if let Some(first) = strips.first_mut() {
            first.heading = Some((level, text.to_owned()));
        }
        self.push_all(strips);
        self.gap = if level == Level::One { 2.0 * BELOW_HEADING } else { BELOW_HEADING };
    }

    fn list(&mut self, points: &[Text]) {
        self.space(BETWEEN);
        let list = self.tree.add(Tree::ROOT, Role::List);
        for point in points {
            let entry = self.tree.add(list, Role::Entry);
            let (label, body) = (self.tree.add(entry, Role::Label), self.tree.add(entry, Role::Body));
            let mut strips = self.line_strips(point, BODY, INK, 12.0, self.measure(BODY), body);
            if let Some(first) = strips.first_mut() {
                let dash = self.lines(&"–".into(), BODY, 12.0).pop().unwrap_or_default();
                let ink = Ink::Letters(dash, BODY.letters, QUIET);
                first.items.insert(0, Item { x: 0.0, y: baseline(0.0, BODY), node: Some(label), ink });
            }
            self.push_all(strips);
            self.space(BETWEEN * 0.4);
        }
        self.space(BETWEEN);
    }

    fn pairs(&mut self, pairs: &[Pair], two_columns: bool) {
        self.space(BETWEEN);
        let list = self.tree.add(Tree::ROOT, Role::List);
        let gutter = 22.0;
        let half = (self.sheet.text_width() - gutter) / 2.0;
        let (columns, width) = if two_columns { (2, half) } else { (1, self.sheet.text_width()) };
        let per_column = pairs.len().div_ceil(columns);
        let mut set: Vec<Vec<Cell>> = Vec::new();
        for (i, column) in pairs.chunks(per_column.max(1)).enumerate() {
            let widest = column.iter().map(|pair| self.faces.width(&pair.key, false)).fold(0.0, f32::max);
            let keys = (widest * CAPTION.letters).min(width * KEYS);
            let x = i as f32 * (width + gutter);
            for (at, pair) in column.iter().enumerate() {
                let entry = self.tree.add(list, Role::Entry);
                let (label, body) = (self.tree.add(entry, Role::Label), self.tree.add(entry, Role::Body));
                let of = |text: &Text, size: Size, colour, x, width, node| Cell {
                    x,
                    lines: self.lines(text, size, width).into_iter().map(|line| (0.0, line)).collect(),
                    size,
                    colour,
                    node,
                };
                let values = (width - keys - 12.0).min(MEASURE * BODY.letters);
                let cells = [
                    of(&pair.key.as_str().into(), CAPTION, QUIET, x, keys, label),
                    of(&pair.value, BODY, INK, x + keys + 12.0, values, body),
                ];
                if set.len() <= at {
                    set.push(Vec::new());
                }
                if let Some(row) = set.get_mut(at) {
                    row.extend(cells);
                }
            }
        }
        let space = RowSpace { above: 0.7, below: 0.7, tallest: self.tallest() };
        let count = set.len();
        for (i, cells) in set.iter().enumerate() {
            let mut strips = row(cells, space);
            if (i == 0 || i + 2 == count)
                && count > 1
                && let Some(last) = strips.last_mut()
            {
                last.keep = Keep::Needed;
            }
            self.push_all(strips);
        }
        self.space(BETWEEN);
    }

    fn table(&mut self, table: &Table) {
        self.tables += 1;
        self.space(AROUND * 0.8);
        let node = self.tree.add(Tree::ROOT, Role::Table);
        if let Some(caption) = &table.caption {
            let child = self.tree.add(node, Role::Caption);
            let mut strips = self.line_strips(caption, CAPTION, QUIET, 0.0, self.measure(CAPTION), child);
            strips.iter_mut().for_each(|strip| strip.keep = Keep::Needed);
            self.push_all(strips);
            self.gap = 4.0;
        }
        let (room, tallest) = (self.sheet.text_width(), self.tallest());
        match table::set(self.faces, &mut self.tree, node, table, room, tallest) {
            Ok(mut set) => {
                let number = self.heads.len();
                self.heads.push(set.head.clone());
                self.push(set.head);
                set.rows.iter_mut().for_each(|strip| strip.head = Some(number));
                self.push_all(set.rows);
            }
            Err(needs) => self.problems.push(Problem::TooWide {
                place: format!("table {}", self.tables),
                needs_mm: needs / POINTS_PER_MM,
                room_mm: room / POINTS_PER_MM,
            }),
        }
        self.space(AROUND);
    }

    fn figure(&mut self, figure: &Figure) {
        let Some(picture) = self.figures.next().flatten() else { return };
        self.space(AROUND * 0.7);
        let node = self.tree.add(Tree::ROOT, Role::Figure(figure.alt.clone()));
        let wanted = self.sheet.text_width() * figure.width.clamp(0.01, 1.0);
        let proportion = picture.proportion().max(1e-3);
        let height = (wanted / proportion).min(self.sheet.text_height() * TALLEST_FIGURE);
        let width = height * proportion;
        let ink = Ink::Picture { picture, width, height };
        let keep = if figure.caption.is_some() { Keep::Needed } else { Keep::Free };
        self.push(Strip {
            height,
            keep,
            items: vec![Item { x: 0.0, y: 0.0, node: Some(node), ink }],
            ..Strip::default()
        });
        if let Some(caption) = &figure.caption {
            self.gap = 3.0;
            let node = self.tree.add(Tree::ROOT, Role::Paragraph);
            let strips = self.line_strips(caption, CAPTION, QUIET, 0.0, self.measure(CAPTION), node);
            self.push_all(strips);
        }
        self.space(AROUND);
    }

    fn notice(&mut self, notice: &Notice) {
        self.space(AROUND * 0.8);
        let division = self.tree.add(Tree::ROOT, Role::Division);
        let mut strips = Vec::new();
        for (i, paragraph) in notice.paragraphs.iter().enumerate() {
            let mut text = paragraph.clone();
            if i == 0 && !notice.label.is_empty() {
                let label = Text::bold(format!("{}. ", notice.label));
                text.0.splice(0..0, label.0);
            }
            let node = self.tree.add(division, Role::Paragraph);
            let mut lines = self.line_strips(&text, BODY, INK, 12.0, self.measure(BODY), node);
            if i > 0
                && let Some(first) = lines.first_mut()
            {
                // The bar goes on, so the space is inside the strip.
                let space = BETWEEN * 0.6;
                first.height += space;
                first.items.iter_mut().for_each(|item| item.y += space);
            }
            strips.append(&mut lines);
        }
        kept(&mut strips, Keep::Wanted);
        for strip in &mut strips {
            let bar = Ink::Fill { width: 2.4, height: strip.height, colour: BRICK };
            strip.items.insert(0, Item { x: 0.0, y: 0.0, node: None, ink: bar });
        }
        self.push_all(strips);
        self.space(AROUND * 0.8);
    }

    fn sentence(&mut self, sentence: &Sentence) {
        self.space(AROUND);
        let node = self.tree.add(Tree::ROOT, Role::Paragraph);
        let width = self.sheet.text_width();
        let mut strips = self.line_strips(&sentence.statement, STATEMENT, INK, 0.0, width, node);
        if let Some(verdict) = &sentence.verdict {
            let node = self.tree.add(Tree::ROOT, Role::Paragraph);
            let mut lines = self.line_strips(&verdict.words, VERDICT, INK, 38.0, width, node);
            if let Some(first) = lines.first_mut() {
                first.before = 5.0;
                let middle = VERDICT.lines / 2.0;
                first.items.extend(sign(verdict.standing, middle));
            }
            strips.append(&mut lines);
        }
        kept(&mut strips, Keep::Wanted);
        self.push_all(strips);
        self.space(AROUND);
    }

    fn signatures(&mut self, signatures: &[Signature]) {
        self.space(AROUND);
        let columns = if self.sheet.text_width() > 300.0 { 2 } else { 1 };
        let gutter = 30.0;
        let width = (self.sheet.text_width() - gutter * (columns as f32 - 1.0)) / columns as f32;
        for pair in signatures.chunks(columns) {
            // Room to sign, then the rule.
            let mut strip = Strip { height: 38.0, keep: Keep::Needed, ..Strip::default() };
            let mut cells = Vec::new();
            for (i, signature) in pair.iter().enumerate() {
                let x = i as f32 * (width + gutter);
                let rule = Ink::Fill { width, height: 0.6, colour: INK };
                strip.items.push(Item { x, y: strip.height - 2.0, node: None, ink: rule });
                let node = self.tree.add(Tree::ROOT, Role::Paragraph);
                let mut lines = self.lines(&signature.role.as_str().into(), CAPTION, width);
                if let Some(name) = &signature.name {
                    lines.extend(self.lines(&Text::bold(name.as_str()), CAPTION, width));
                }
                for detail in &signature.details {
                    lines.extend(self.lines(&detail.as_str().into(), CAPTION, width));
                }
                let lines = lines.into_iter().map(|line| (0.0, line)).collect();
                cells.push(Cell { x, lines, size: CAPTION, colour: INK, node });
            }
            self.push(strip);
            let strips = row(&cells, RowSpace { above: 1.0, below: 4.0, tallest: self.tallest() });
            self.push_all(strips);
            self.space(BETWEEN);
        }
        self.space(AROUND);
    }

    /// Name and address on the left, the logo on the right, a rule under both.
    fn letterhead(&mut self, document: &Document, logo: Option<Picture>) {
        let Some(letterhead) = &document.letterhead else { return };
        let width = self.sheet.text_width();
        let box_width = if document.paper == Paper::A5 { LOGO.0 * 0.7 } else { LOGO.0 };
        let mut strips = Vec::new();
        let mut beside = width;
        let mut picture_height = 0.0;
        let mut picture_item = None;
        if let (Some(picture), Some(of)) = (logo, &letterhead.logo) {
            let proportion = picture.proportion().clamp(1e-3, 1e3);
            let wide = box_width.min(LOGO.1 * proportion);
            picture_height = wide / proportion;
            beside = width - wide - 18.0;
            let ink = Ink::Picture { picture, width: wide, height: picture_height };
            let node = self.tree.add(Tree::ROOT, Role::Figure(of.alt.clone()));
            picture_item = Some(Item { x: width - wide, y: 0.0, node: Some(node), ink });
        }
        let node = self.tree.add(Tree::ROOT, Role::Paragraph);
        strips.append(&mut self.line_strips(
            &Text::bold(letterhead.name.as_str()),
            NAME,
            INK,
            0.0,
            beside,
            node,
        ));
        for line in &letterhead.address {
            let node = self.tree.add(Tree::ROOT, Role::Paragraph);
            strips.append(&mut self.line_strips(&line.as_str().into(), CAPTION, QUIET, 0.0, beside, node));
        }
        let text_height: f32 = strips.iter().map(|strip| strip.height).sum();
        if let (Some(item), Some(first)) = (picture_item, strips.first_mut()) {
            first.items.push(item);
        }
        let rule = Strip {
            before: (picture_height - text_height).max(0.0) + 7.0,
            height: 1.2,
            items: vec![Item {
                x: 0.0,
                y: 0.0,
                node: None,
                ink: Ink::Fill { width, height: 1.2, colour: self.accent },
            }],
            ..Strip::default()
        };
        strips.push(rule);
        kept(&mut strips, Keep::Wanted);
        self.push_all(strips);
        self.space(AROUND);
    }

    /// The marked end, between two short strokes, never alone on a page.
    fn end(&mut self, text: &str) {
        self.space(AROUND * 1.5);
        if let Some(last) = self.strips.last_mut() {
            last.keep = Keep::Needed;
        }
        let node = self.tree.add(Tree::ROOT, Role::Paragraph);
        let mut strips = self.line_strips(&text.into(), FINE, QUIET, 30.0, self.sheet.text_width(), node);
        if let Some(first) = strips.first_mut() {
            let stroke = Ink::Fill { width: 22.0, height: 0.8, colour: SAND };
            first.items.push(Item { x: 0.0, y: FINE.lines / 2.0 - 0.6, node: None, ink: stroke });
        }
        self.push_all(strips);
    }
}

/// The level line: whole, broken in the middle, or crossed.
fn sign(standing: Standing, y: f32) -> Vec<Item> {
    let (length, width) = (26.0, 2.2);
    let stroke = |x: f32, y: f32, dx: f32, dy: f32| Item {
        x,
        y,
        node: None,
        ink: Ink::Stroke { dx, dy, width, colour: INK },
    };
    match standing {
        Standing::Holds => vec![stroke(0.0, y, length, 0.0)],
        Standing::Undecided => vec![stroke(0.0, y, 9.0, 0.0), stroke(length - 9.0, y, 9.0, 0.0)],
        Standing::DoesNotHold => {
            vec![stroke(0.0, y, length, 0.0), stroke(length / 2.0 - 4.5, y + 5.0, 9.0, -10.0)]
        }
    }
}
