//! Strips laid on pages.
//!
//! Comes in: strips from the top down. Goes out: which of them stand where on which page. Strips that want to stay
//! together do so if a page holds them all, those that need to even where a page does not hold the larger group. A head
//! of a table is repeated on top of each page its rows go on to.

use super::strip::{Keep, Strip};

/// A strip on a page.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct OnPage {
    pub what: What,
    /// Its top, from the top of the text.
    pub y: f32,
}

/// Which strip.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum What {
    /// By its number.
    Strip(usize),
    /// A head once more, by its number.
    Repeated(usize),
}

/// Lays strips on pages of a height; at least one page.
pub(super) fn laid(strips: &[Strip], heads: &[Strip], height: f32) -> Vec<Vec<OnPage>> {
    let mut layer = Layer { strips, heads, height, pages: vec![Vec::new()], y: 0.0 };
    layer.group(0, strips.len(), Keep::Wanted);
    layer.pages
}

struct Layer<'a> {
    strips: &'a [Strip],
    heads: &'a [Strip],
    height: f32,
    pages: Vec<Vec<OnPage>>,
    y: f32,
}

impl Layer<'_> {
    /// Lays strips `from..to`, not parting those that are kept at least as firmly as `keep`.
    fn group(&mut self, from: usize, to: usize, keep: Keep) {
        let mut start = from;
        while start < to {
            let mut end = start + 1;
            while end < to
                && self.strips.get(end - 1).is_some_and(|strip| strip.keep >= keep)
                && !self.strips.get(end).is_some_and(|strip| strip.fresh_page)
            {
                end += 1;
            }
            if self.strips.get(start).is_some_and(|strip| strip.fresh_page) {
                self.next_page();
            }
            let needed = self.needed(start, end);
            if self.fits(start, needed) {
                self.put(start, end);
            } else if self.fits_on_fresh(start, needed) {
                self.next_page();
                self.put(start, end);
            } else if end - start > 1 {
                match keep {
                    Keep::Wanted => self.group(start, end, Keep::Needed),
                    Keep::Free | Keep::Needed => (start..end).for_each(|i| self.alone(i)),
                }
            } else {
                self.alone(start);
            }
            start = end;
        }
    }

    /// A strip that may be parted from its neighbours.
    fn alone(&mut self, strip: usize) {
        if !self.fits(strip, self.needed(strip, strip + 1)) {
            self.next_page();
        }
        self.put(strip, strip + 1);
    }

    /// Height of strips without the space before the first.
    fn needed(&self, from: usize, to: usize) -> f32 {
        let strips = self.strips.get(from..to).unwrap_or_default();
        let height: f32 = strips.iter().map(|strip| strip.height).sum();
        height + strips.iter().skip(1).map(|strip| strip.before).sum::<f32>()
    }

    fn fits(&self, first: usize, needed: f32) -> bool {
        self.y + self.above(first) + needed <= self.height
    }

    /// Space before a strip where it would come now: none on top of a page, unless a head comes first.
    fn above(&self, strip: usize) -> f32 {
        let strip = self.strips.get(strip);
        if self.is_fresh() {
            self.head_of(strip).map_or(0.0, |(_, head)| head.height)
        } else {
            strip.map_or(0.0, |strip| strip.before)
        }
    }

    fn fits_on_fresh(&self, first: usize, needed: f32) -> bool {
        let head = self.head_of(self.strips.get(first)).map_or(0.0, |(_, head)| head.height);
        !self.is_fresh() && head + needed <= self.height
    }

    fn head_of(&self, strip: Option<&Strip>) -> Option<(usize, &Strip)> {
        let number = strip?.head?;
        Some((number, self.heads.get(number)?))
    }

    fn is_fresh(&self) -> bool {
        self.pages.last().is_none_or(Vec::is_empty)
    }

    fn next_page(&mut self) {
        if !self.is_fresh() {
            self.pages.push(Vec::new());
            self.y = 0.0;
        }
    }

    fn put(&mut self, from: usize, to: usize) {
        for i in from..to {
            let Some(strip) = self.strips.get(i) else { continue };
            if self.is_fresh() {
                if let Some((number, height)) = self.head_of(Some(strip)).map(|(n, head)| (n, head.height)) {
                    self.place(What::Repeated(number), height);
                }
            } else {
                self.y += strip.before;
            }
            self.place(What::Strip(i), strip.height);
        }
    }

    fn place(&mut self, what: What, height: f32) {
        let y = self.y;
        if let Some(page) = self.pages.last_mut() {
            page.push(OnPage { what, y });
        }
        self.y += height;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn strip(height: f32, keep: Keep) -> Strip {
        Strip { height, keep, before: 1.0, ..Strip::default() }
    }

    /// Numbers of the strips page by page; a repeated head is 1000.
    fn numbers(strips: &[Strip], heads: &[Strip]) -> Vec<Vec<usize>> {
        let pages = laid(strips, heads, 10.0);
        for page in &pages {
            for (this, next) in page.iter().zip(page.iter().skip(1)) {
                assert!(next.y > this.y, "{page:?}");
            }
        }
        let number = |on: &OnPage| match on.what {
            What::Strip(i) => i,
            What::Repeated(_) => 1000,
        };
        pages.iter().map(|page| page.iter().map(number).collect()).collect()
    }

    #[test]
    fn a_heading_goes_with_its_text() {
        let strips = [strip(7.0, Keep::Free), strip(1.0, Keep::Needed), strip(2.0, Keep::Free)];
        assert_eq!(numbers(&strips, &[]), [vec![0], vec![1, 2]]);
    }

    #[test]
    fn a_group_larger_than_a_page_is_parted_where_it_hurts_least() {
        let mut strips: Vec<Strip> = (0..9).map(|_| strip(2.0, Keep::Wanted)).collect();
        strips[2].keep = Keep::Needed;
        strips[8].keep = Keep::Free;
        // Three of them with the space between fill 8 of 10; the third needs the fourth.
        assert_eq!(numbers(&strips, &[]), [vec![0, 1], vec![2, 3, 4], vec![5, 6, 7], vec![8]]);
    }

    #[test]
    fn a_head_is_repeated_and_takes_its_room() {
        let head = strip(2.0, Keep::Needed);
        let mut strips = vec![head.clone()];
        strips.extend((0..5).map(|_| Strip { head: Some(0), before: 0.0, ..strip(3.0, Keep::Free) }));
        assert_eq!(numbers(&strips, &[head]), [vec![0, 1, 2], vec![1000, 3, 4], vec![1000, 5]]);
    }

    #[test]
    fn what_is_taller_than_a_page_gets_one_and_ends_nothing() {
        let strips = [strip(1.0, Keep::Needed), strip(20.0, Keep::Needed), strip(1.0, Keep::Free)];
        assert_eq!(numbers(&strips, &[]), [vec![0], vec![1], vec![2]]);
        assert_eq!(numbers(&[], &[]), [Vec::<usize>::new()]);
    }

    #[test]
    fn a_fresh_page_is_begun_once() {
        let fresh = Strip { fresh_page: true, ..strip(1.0, Keep::Needed) };
        let strips = [fresh.clone(), fresh, strip(1.0, Keep::Free)];
        assert_eq!(numbers(&strips, &[]), [vec![0], vec![1, 2]]);
    }
}
