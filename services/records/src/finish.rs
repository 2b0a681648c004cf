//! What the page writer leaves out: archive metadata, structure, bookmarks, a fixed identity.
//!
//! The result is meant as PDF/A-3b (ISO 19005-3, level B) with structure tags; a higher level is
//! not claimed. Nothing in the file comes from the clock, a counter or the environment.

use lopdf::{Dictionary, Document, Object, ObjectId, Stream, StringFormat, dictionary};
use printpdf::{FontId, Mm, PdfDocument, PdfFont, PdfPage, PdfSaveOptions};
use sha2::{Digest, Sha256};

use crate::RecordError;
use crate::font::Weight;
use crate::page::{HEIGHT, WIDTH, font_id};
use crate::sheet::{Bookmark, Sheet};
use crate::srgb;
use crate::tags::{Child, Tags};

const PROGRAM: &str = "tallystave";

/// What the file says about itself.
pub(crate) struct Meta {
    pub(crate) title: String,
    pub(crate) author: String,
    pub(crate) subject: String,
    /// RFC 3339 with offset.
    pub(crate) drawn_up: String,
}

/// Puts the drawn pages together as a file.
pub(crate) fn finish(sheet: Sheet, meta: &Meta) -> Result<Vec<u8>, RecordError> {
    let Sheet { canvas, bookmarks, .. } = sheet;
    let pdf_date = pdf_date(&meta.drawn_up)?;
    let typeface = canvas.typeface;
    let (pages, tags, used) = canvas.into_parts();

    let mut source = PdfDocument::new(&meta.title);
    for (weight, used) in [Weight::Regular, Weight::Bold].into_iter().zip(&used) {
        // Inserted by hand: `add_font` names fonts from a counter of the process.
        let font = PdfFont::new(typeface.face(weight).reduced(used)?);
        source.resources.fonts.map.insert(FontId(font_id(weight).to_owned()), font);
    }
    source.pages = pages.into_iter().map(|ops| PdfPage::new(Mm(WIDTH), Mm(HEIGHT), ops)).collect();
    let mut document = lower(&source)?;

    let pages: Vec<ObjectId> = document.get_pages().into_values().collect();
    fix_fonts(&mut document)?;
    let structure = add_structure(&mut document, &tags, &pages)?;
    let outline = add_outline(&mut document, &bookmarks, &pages);
    let intent = add_output_intent(&mut document);
    let xmp = add_xmp(&mut document, meta);
    replace_info(&mut document, meta, &pdf_date)?;

    let catalog = document.catalog_mut()?;
    catalog.set("MarkInfo", dictionary! { "Marked" => true });
    catalog.set("StructTreeRoot", structure);
    catalog.set("Lang", Object::string_literal("en"));
    catalog.set("Metadata", xmp);
    catalog.set("OutputIntents", vec![Object::Reference(intent)]);
    catalog.set("ViewerPreferences", dictionary! { "DisplayDocTitle" => true });
    catalog.set("Outlines", outline);
    catalog.set("PageMode", "UseOutlines");

    "1.7".clone_into(&mut document.version);
    let id = Object::String(identity(&document), StringFormat::Hexadecimal);
    document.trailer.set("ID", vec![id.clone(), id]);
    document.compress();
    let mut bytes = Vec::new();
    document.save_modern(&mut bytes)?;
    Ok(bytes)
}

fn lower(source: &PdfDocument) -> Result<Document, RecordError> {
    let options = PdfSaveOptions {
        optimize: false,
        subset_fonts: false,
        secure: true,
        image_optimization: None,
    };
    let mut warnings = Vec::new();
    let document = source.to_lopdf_document(&options, &mut warnings);
    match warnings.first() {
        Some(warning) => Err(RecordError::Pages(format!("{warning:?}"))),
        None => Ok(document),
    }
}

/// An embedded TrueType face needs the map from character to glyph number said aloud (PDF/A).
fn fix_fonts(document: &mut Document) -> Result<(), RecordError> {
    let is_font = |object: &Object| {
        let subtype = object.as_dict().and_then(|font| font.get(b"Subtype"));
        subtype.and_then(Object::as_name).is_ok_and(|name| name == b"Type0")
    };
    for object in document.objects.values_mut().filter(|object| is_font(object)) {
        let descendants = object.as_dict_mut()?.get_mut(b"DescendantFonts")?.as_array_mut()?;
        for face in descendants {
            face.as_dict_mut()?.set("CIDToGIDMap", "Identity");
        }
    }
    Ok(())
}

/// The structure tree, and on each page the way back from content to element.
fn add_structure(
    document: &mut Document,
    tags: &Tags,
    pages: &[ObjectId],
) -> Result<ObjectId, RecordError> {
    let root = document.new_object_id();
    let ids: Vec<ObjectId> = tags.elements.iter().map(|_| document.new_object_id()).collect();
    let mut by_page: Vec<Vec<Object>> = vec![Vec::new(); pages.len()];
    for (index, element) in tags.elements.iter().enumerate() {
        let parent = if index == 0 { root } else { ids[element.parent] };
        let mut entry = dictionary! { "Type" => "StructElem", "S" => element.tag, "P" => parent };
        if let Some(text) = &element.alternative {
            entry.set("Alt", unicode(text));
        }
        match (element.tag, element.columns) {
            ("TH", _) => entry.set("A", dictionary! { "O" => "Table", "Scope" => "Column" }),
            (_, Some(columns)) => {
                entry.set("A", dictionary! { "O" => "Table", "ColSpan" => integer(columns) });
            }
            _ => {}
        }
        let mut children = Vec::new();
        for child in &element.children {
            children.push(match child {
                Child::Element(child) => Object::Reference(ids[*child]),
                Child::Content { page, mark } => {
                    by_page[*page].push(Object::Reference(ids[index]));
                    entry.set("Pg", pages[*page]);
                    Object::Integer(*mark)
                }
            });
        }
        entry.set("K", children);
        document.objects.insert(ids[index], entry.into());
    }
    for (index, page) in pages.iter().enumerate() {
        let page = document.get_object_mut(*page)?.as_dict_mut()?;
        page.set("StructParents", integer(index));
        page.set("Tabs", "S");
        page.remove(b"Annots");
    }
    let numbers: Vec<Object> = by_page
        .into_iter()
        .enumerate()
        .flat_map(|(index, elements)| [integer(index), Object::Array(elements)])
        .collect();
    let parents = document.add_object(dictionary! { "Nums" => numbers });
    let tree = dictionary! {
        "Type" => "StructTreeRoot",
        "K" => vec![Object::Reference(ids[0])],
        "ParentTree" => parents,
        "ParentTreeNextKey" => integer(pages.len()),
    };
    document.objects.insert(root, tree.into());
    Ok(root)
}

/// The table of contents a reader program shows beside the pages.
fn add_outline(document: &mut Document, bookmarks: &[Bookmark], pages: &[ObjectId]) -> ObjectId {
    let root = document.new_object_id();
    let ids: Vec<ObjectId> = bookmarks.iter().map(|_| document.new_object_id()).collect();
    for (index, bookmark) in bookmarks.iter().enumerate() {
        let place = vec![
            Object::Reference(pages[bookmark.page]),
            "XYZ".into(),
            Object::Null,
            Object::Real(bookmark.top),
            Object::Null,
        ];
        let mut entry =
            dictionary! { "Title" => unicode(&bookmark.title), "Parent" => root, "Dest" => place };
        if let Some(&previous) = index.checked_sub(1).and_then(|index| ids.get(index)) {
            entry.set("Prev", previous);
        }
        if let Some(&next) = ids.get(index + 1) {
            entry.set("Next", next);
        }
        document.objects.insert(ids[index], entry.into());
    }
    let mut outline = dictionary! { "Type" => "Outlines", "Count" => integer(ids.len()) };
    if let (Some(&first), Some(&last)) = (ids.first(), ids.last()) {
        outline.set("First", first);
        outline.set("Last", last);
    }
    document.objects.insert(root, outline.into());
    root
}

fn add_output_intent(document: &mut Document) -> ObjectId {
    let profile = document.add_object(Stream::new(dictionary! { "N" => 3 }, srgb::profile()));
    document.add_object(dictionary! {
        "Type" => "OutputIntent",
        "S" => "GTS_PDFA1",
        "OutputConditionIdentifier" => Object::string_literal("sRGB IEC61966-2.1"),
        "Info" => Object::string_literal("sRGB IEC61966-2.1"),
        "DestOutputProfile" => profile,
    })
}

/// Metadata as a packet of its own, uncompressed so that any program finds it.
fn add_xmp(document: &mut Document, meta: &Meta) -> ObjectId {
    let packet = include_str!("metadata.xml")
        .replace("{title}", &xml(&meta.title))
        .replace("{author}", &xml(&meta.author))
        .replace("{subject}", &xml(&meta.subject))
        .replace("{program}", PROGRAM)
        .replace("{date}", &meta.drawn_up);
    let kind = dictionary! { "Type" => "Metadata", "Subtype" => "XML" };
    document.add_object(Stream::new(kind, packet.into_bytes()).with_compression(false))
}

fn replace_info(document: &mut Document, meta: &Meta, date: &str) -> Result<(), RecordError> {
    let info: Dictionary = dictionary! {
        "Title" => unicode(&meta.title),
        "Author" => unicode(&meta.author),
        "Subject" => unicode(&meta.subject),
        "Creator" => unicode(PROGRAM),
        "Producer" => unicode(PROGRAM),
        "CreationDate" => Object::string_literal(date),
        "ModDate" => Object::string_literal(date),
    };
    let id = document.trailer.get(b"Info")?.as_reference()?;
    document.objects.insert(id, info.into());
    Ok(())
}

/// The first 16 bytes of a digest over every object: same content, same identity.
fn identity(document: &Document) -> Vec<u8> {
    let mut hash = Sha256::new();
    for (id, object) in &document.objects {
        hash.update(id.0.to_be_bytes());
        if let Object::Stream(stream) = object {
            hash.update(format!("{:?}", stream.dict));
            hash.update(&stream.content);
        } else {
            hash.update(format!("{object:?}"));
        }
    }
    hash.finalize().iter().take(16).copied().collect()
}

/// `2025-10-07T09:00:00-07:00` as `D:20251007090000-07'00'` (ISO 32000-1, 7.9.4).
fn pdf_date(stamp: &str) -> Result<String, RecordError> {
    let refuse = || RecordError::Stamp(stamp.to_owned());
    let clock = stamp.get(..19).filter(|clock| has_form(clock, "####-##-##T##:##:##"));
    let digits: String = clock.ok_or_else(refuse)?.chars().filter(char::is_ascii_digit).collect();
    let rest = &stamp[19..];
    let fraction = rest.strip_prefix('.').map_or("", |tail| {
        let end = tail.find(|c: char| !c.is_ascii_digit()).unwrap_or(tail.len());
        &rest[..=end]
    });
    let offset = &rest[fraction.len()..];
    match offset {
        "Z" if fraction.len() != 1 => Ok(format!("D:{digits}Z")),
        _ if fraction.len() != 1 && (has_form(offset, "+##:##") || has_form(offset, "-##:##")) => {
            Ok(format!("D:{digits}{}'{}'", &offset[..3], &offset[4..]))
        }
        _ => Err(refuse()),
    }
}

/// Whether a text has the form given, `#` standing for a digit.
fn has_form(text: &str, form: &str) -> bool {
    text.len() == form.len()
        && text.bytes().zip(form.bytes()).all(|(byte, wanted)| match wanted {
            b'#' => byte.is_ascii_digit(),
            _ => byte == wanted,
        })
}

fn integer(count: usize) -> Object {
    Object::Integer(i64::try_from(count).unwrap_or(i64::MAX))
}

/// A text string of the file format: UTF-16 with its byte order mark.
fn unicode(text: &str) -> Object {
    let mut bytes = vec![0xfe, 0xff];
    bytes.extend(text.encode_utf16().flat_map(u16::to_be_bytes));
    Object::String(bytes, StringFormat::Hexadecimal)
}

/// Text for the metadata packet; a control character has no place in XML, a brace would be taken
/// for a place to fill.
fn xml(text: &str) -> String {
    text.chars()
        .map(|c| if c.is_control() { ' ' } else { c })
        .collect::<String>()
        .replace('&', "&amp;")
        .replace('<', "&lt;")
        .replace('>', "&gt;")
        .replace('{', "&#123;")
}

#[cfg(test)]
mod tests {
    use super::pdf_date;

    #[test]
    fn a_time_is_rewritten_in_the_form_of_the_file() {
        let cases = [
            ("2025-10-07T09:00:00-07:00", Some("D:20251007090000-07'00'")),
            ("2025-10-07T16:00:00.123456Z", Some("D:20251007160000Z")),
            ("2025-10-07T16:00:00", None),
            ("2025-10-07T16:00:00.Z", None),
            ("07 Oct 2025", None),
            ("2025-10-07T16:00:0é+01:00", None),
        ];
        for (given, wanted) in cases {
            assert_eq!(pdf_date(given).ok().as_deref(), wanted, "{given}");
        }
    }
}
