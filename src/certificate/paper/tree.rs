//! The document as those meet it who do not see it: headings, paragraphs, tables, in reading order.
//!
//! Leaves are added while pages are painted; the tree is then handed to the writer of the PDF.

use std::num::NonZeroU16;

use krilla::geom::Rect;
use krilla::tagging::{
    BBox, Identifier, ListNumbering, Placement, TableHeaderScope, Tag, TagGroup, TagKind, TagTree,
};

use super::model::Level;

/// A place in the tree.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct NodeId(usize);

/// What a piece is.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Role {
    Division,
    Heading(Level, String),
    Paragraph,
    List,
    Entry,
    Label,
    Body,
    Table,
    Caption,
    Head,
    Rows,
    Row,
    ColumnHead,
    RowHead,
    Cell,
    /// With what stands for it where it is not seen.
    Figure(String),
}

/// The tree while it grows.
pub(super) struct Tree {
    nodes: Vec<Node>,
}

struct Node {
    role: Role,
    children: Vec<Child>,
    place: Option<BBox>,
}

enum Child {
    Node(NodeId),
    Leaf(Identifier),
}

impl Tree {
    /// The root of every tree.
    pub(super) const ROOT: NodeId = NodeId(0);

    pub(super) fn new() -> Self {
        Self { nodes: vec![Node { role: Role::Division, children: Vec::new(), place: None }] }
    }

    /// A new last child of `parent`.
    pub(super) fn add(&mut self, parent: NodeId, role: Role) -> NodeId {
        let id = NodeId(self.nodes.len());
        self.nodes.push(Node { role, children: Vec::new(), place: None });
        if let Some(parent) = self.nodes.get_mut(parent.0) {
            parent.children.push(Child::Node(id));
        }
        id
    }

    /// What was painted on a page belongs to `node`.
    pub(super) fn leaf(&mut self, node: NodeId, leaf: Identifier) {
        if let Some(node) = self.nodes.get_mut(node.0) {
            node.children.push(Child::Leaf(leaf));
        }
    }

    /// Where a figure stands.
    pub(super) fn place(&mut self, node: NodeId, page: usize, rectangle: Rect) {
        if let Some(node) = self.nodes.get_mut(node.0) {
            node.place = Some(BBox::new(page, rectangle));
        }
    }

    /// As the writer of the PDF takes it.
    pub(super) fn finished(&self) -> TagTree {
        let mut tree = TagTree::new();
        if let Some(root) = self.nodes.first() {
            for child in &root.children {
                match child {
                    Child::Node(id) => tree.push(self.group(*id)),
                    Child::Leaf(leaf) => tree.push(*leaf),
                }
            }
        }
        tree
    }

    /// The depth is that of the roles, six at most.
    fn group(&self, id: NodeId) -> TagGroup {
        let Some(node) = self.nodes.get(id.0) else { return TagGroup::new(Tag::NonStruct) };
        let mut group = TagGroup::new(node.role.kind(node.place));
        for child in &node.children {
            match child {
                Child::Node(id) => group.push(self.group(*id)),
                Child::Leaf(leaf) => group.push(*leaf),
            }
        }
        group
    }
}

impl Role {
    fn kind(&self, place: Option<BBox>) -> TagKind {
        match self {
            Self::Division => Tag::Div.into(),
            Self::Heading(level, title) => {
                let level = match level {
                    Level::One => NonZeroU16::MIN,
                    Level::Two => NonZeroU16::MIN.saturating_add(1),
                    Level::Three => NonZeroU16::MIN.saturating_add(2),
                };
                Tag::Hn(level, Some(title.clone())).into()
            }
            Self::Paragraph => Tag::P.into(),
            Self::List => Tag::L(ListNumbering::None).into(),
            Self::Entry => Tag::LI.into(),
            Self::Label => Tag::Lbl.into(),
            Self::Body => Tag::LBody.into(),
            Self::Table => Tag::Table.into(),
            Self::Caption => Tag::Caption.into(),
            Self::Head => Tag::THead.into(),
            Self::Rows => Tag::TBody.into(),
            Self::Row => Tag::TR.into(),
            Self::ColumnHead => Tag::TH(TableHeaderScope::Column).into(),
            Self::RowHead => Tag::TH(TableHeaderScope::Row).into(),
            Self::Cell => Tag::TD.into(),
            Self::Figure(alt) => {
                Tag::Figure(Some(alt.clone())).with_bbox(place).with_placement(Some(Placement::Block)).into()
            }
        }
    }
}
