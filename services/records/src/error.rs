//! What can go wrong between a record and its pages.

/// Why a record could not be printed.
#[derive(Debug, thiserror::Error)]
pub enum RecordError {
    /// The record's typeface has no sign for this character, and the caller asked for exact text.
    #[error("the typeface has no sign for {character:?} (U+{:04X})", u32::from(*.character))]
    MissingGlyph {
        /// The first such character met.
        character: char,
    },
    /// The time of drawing up is not an RFC 3339 time with its offset.
    #[error("not an RFC 3339 time: {0:?}")]
    Stamp(String),
    /// The embedded typeface could not be read.
    #[error("the embedded typeface cannot be read")]
    Typeface,
    /// The page writer reported something that would leave the file incomplete.
    #[error("the page writer warns: {0}")]
    Pages(String),
    /// The finished document could not be put together.
    #[error("the document cannot be put together")]
    Document(#[from] lopdf::Error),
    /// The finished document could not be written out.
    #[error("the document cannot be written")]
    Write(#[from] std::io::Error),
}
