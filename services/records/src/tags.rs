//! The structure of a document: which drawn content is a heading, a paragraph, a table cell.
//!
//! It lets a reader program speak the record in order and a search tell a table from a note.

/// One element of the structure.
pub(crate) struct Element {
    pub(crate) tag: &'static str,
    pub(crate) parent: usize,
    pub(crate) children: Vec<Child>,
    /// What a figure shows, in words.
    pub(crate) alternative: Option<String>,
    /// How many columns a cell covers, if more than one.
    pub(crate) columns: Option<usize>,
}

/// What an element holds.
pub(crate) enum Child {
    Element(usize),
    /// Marked content number `mark` on `page`.
    Content {
        page: usize,
        mark: i64,
    },
}

/// The tree of elements; the first is the document.
pub(crate) struct Tags {
    pub(crate) elements: Vec<Element>,
    open: Vec<usize>,
    next_mark: Vec<i64>,
}

impl Tags {
    pub(crate) fn new() -> Self {
        let document = Element {
            tag: "Document",
            parent: 0,
            children: Vec::new(),
            alternative: None,
            columns: None,
        };
        Self { elements: vec![document], open: vec![0], next_mark: Vec::new() }
    }

    /// Opens an element that will hold others.
    pub(crate) fn open(&mut self, tag: &'static str) -> usize {
        let element = self.elements.len();
        let parent = self.open.last().copied().unwrap_or_default();
        self.elements.push(Element {
            tag,
            parent,
            children: Vec::new(),
            alternative: None,
            columns: None,
        });
        self.elements[parent].children.push(Child::Element(element));
        self.open.push(element);
        element
    }

    pub(crate) fn close(&mut self) {
        if self.open.len() > 1 {
            self.open.pop();
        }
    }

    /// A new element with its own content on `page`: its place in the tree, and its mark.
    pub(crate) fn leaf(&mut self, tag: &'static str, page: usize) -> (usize, i64) {
        let element = self.open(tag);
        self.close();
        if self.next_mark.len() <= page {
            self.next_mark.resize(page + 1, 0);
        }
        let mark = self.next_mark[page];
        self.next_mark[page] += 1;
        self.elements[element].children.push(Child::Content { page, mark });
        (element, mark)
    }
}
