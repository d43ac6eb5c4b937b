//! A PDF read back: its attachments and what a report of ours never contains.
//!
//! The file may come from anywhere. Nothing in it is trusted, every size is bounded, and presence proves nothing:
//! callers compare hashes.

use crate::diagnostic::{Code, Problem};
use lopdf::{Dictionary, Document, LoadOptions, Object, ObjectId};
use std::collections::{BTreeMap, BTreeSet};

/// What a PDF holds besides its pages.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct PdfFile {
    /// Attached files by their names.
    pub attachments: BTreeMap<String, Vec<u8>>,
    /// 1 for a file as first written, one more for each change appended to it.
    pub revisions: usize,
    pub pages: usize,
    /// Scripts or actions that run by themselves, start programs or send data.
    pub scripts: bool,
    /// Fields to be filled in.
    pub forms: bool,
    /// Layers that a viewer can show or hide.
    pub optional_content: bool,
    /// Annotations that are no links: notes, stamps, overlays.
    pub other_annotations: bool,
    /// Bytes that follow the end mark of the file.
    pub trailing_bytes: bool,
}

/// The largest file read, in bytes.
const LARGEST_FILE: usize = 1 << 30;
/// The most that all attachments together may unpack to, in bytes.
const LARGEST_CONTENT: usize = 512 << 20;
/// The most that one internal stream may unpack to while the file is opened, in bytes.
const LARGEST_STREAM: usize = 64 << 20;
const DEEPEST_TREE: usize = 8;
const MOST_ATTACHMENTS: usize = 10_000;

/// Reads a PDF.
///
/// # Errors
/// `pdf_unreadable` for a file that is damaged, encrypted or too large, and for attachments that cannot be told apart.
pub fn read_pdf(bytes: &[u8]) -> Result<PdfFile, Problem> {
    if bytes.len() > LARGEST_FILE {
        return Err(unreadable("it is larger than 1 GiB"));
    }
    let options = LoadOptions { strict: true, max_decompressed_size: Some(LARGEST_STREAM), ..LoadOptions::default() };
    let document = Document::load_mem_with_options(bytes, options).map_err(|error| unreadable(&error.to_string()))?;
    if document.is_encrypted() || document.was_encrypted() {
        return Err(unreadable("it is encrypted"));
    }
    let mut file = PdfFile {
        attachments: attachments(&document)?,
        revisions: document.revision_count().max(end_marks(bytes)),
        pages: document.page_iter().count(),
        trailing_bytes: has_trailing_bytes(bytes),
        ..PdfFile::default()
    };
    for object in document.objects.values() {
        look_at(object, &mut file);
    }
    Ok(file)
}

fn unreadable(reason: &str) -> Problem {
    Problem::new(Code::PdfUnreadable, format!("The PDF cannot be read back: {}.", reason.trim_end_matches('.')))
}

/// How often the file ends: `startxref`, a number and the end mark on lines of their own.
fn end_marks(bytes: &[u8]) -> usize {
    let lines = bytes.split(|byte| matches!(byte, b'\n' | b'\r')).filter(|line| !line.is_empty());
    let (mut before, mut last): (&[u8], &[u8]) = (b"", b"");
    let mut count = 0;
    for line in lines {
        if line.starts_with(b"%%EOF") && before == b"startxref" && last.iter().all(u8::is_ascii_digit) {
            count += 1;
        }
        (before, last) = (last, line);
    }
    count
}

fn has_trailing_bytes(bytes: &[u8]) -> bool {
    let mark = b"%%EOF";
    let last = bytes.windows(mark.len()).rposition(|window| window == mark);
    last.and_then(|start| bytes.get(start + mark.len()..)).is_some_and(|rest| !rest.iter().all(u8::is_ascii_whitespace))
}

/// Sets the marks of what stands in an object, however deep.
fn look_at(object: &Object, file: &mut PdfFile) {
    let mut open = vec![object];
    while let Some(object) = open.pop() {
        match object {
            Object::Array(items) => open.extend(items),
            Object::Dictionary(dictionary) => {
                look_at_dictionary(dictionary, file);
                open.extend(dictionary.iter().map(|(_, value)| value));
            }
            Object::Stream(stream) => {
                look_at_dictionary(&stream.dict, file);
                open.extend(stream.dict.iter().map(|(_, value)| value));
            }
            _ => {}
        }
    }
}

fn look_at_dictionary(dictionary: &Dictionary, file: &mut PdfFile) {
    let has = |key: &[u8]| dictionary.has(key);
    let name = |key: &[u8]| dictionary.get(key).ok().and_then(|value| value.as_name().ok()).unwrap_or(b"");
    let running =
        [&b"JavaScript"[..], b"Launch", b"SubmitForm", b"ImportData", b"Rendition", b"Movie", b"Sound", b"GoToR"];
    file.scripts |=
        has(b"JS") || has(b"JavaScript") || has(b"AA") || has(b"RichMediaContent") || running.contains(&name(b"S"));
    file.forms |= has(b"AcroForm") || has(b"XFA");
    file.optional_content |= has(b"OCProperties") || has(b"OCG") || has(b"OCGs") || name(b"Type") == b"OCG";
    file.other_annotations |= has(b"Rect") && has(b"Subtype") && name(b"Subtype") != b"Link";
}

fn attachments(document: &Document) -> Result<BTreeMap<String, Vec<u8>>, Problem> {
    let mut reader = Attachments { document, seen: BTreeSet::new(), budget: LARGEST_CONTENT, found: BTreeMap::new() };
    let catalog = document.catalog().map_err(|error| unreadable(&error.to_string()))?;
    if let Some(tree) = reader.dictionary(catalog, b"Names").and_then(|names| names.get(b"EmbeddedFiles").ok()) {
        reader.branch(tree, 0)?;
    }
    Ok(reader.found)
}

struct Attachments<'a> {
    document: &'a Document,
    seen: BTreeSet<ObjectId>,
    /// How much may still be unpacked.
    budget: usize,
    found: BTreeMap<String, Vec<u8>>,
}

impl<'a> Attachments<'a> {
    fn dictionary(&self, holder: &'a Dictionary, key: &[u8]) -> Option<&'a Dictionary> {
        let (_, object) = self.document.dereference(holder.get(key).ok()?).ok()?;
        object.as_dict().ok()
    }

    fn array(&self, holder: &'a Dictionary, key: &[u8]) -> &'a [Object] {
        let object = holder.get(key).ok().and_then(|object| self.document.dereference(object).ok());
        object.and_then(|(_, object)| object.as_array().ok()).map_or(&[], Vec::as_slice)
    }

    fn branch(&mut self, branch: &'a Object, depth: usize) -> Result<(), Problem> {
        let (id, branch) = self.document.dereference(branch).map_err(|error| unreadable(&error.to_string()))?;
        if depth > DEEPEST_TREE || id.is_some_and(|id| !self.seen.insert(id)) {
            return Err(unreadable("its list of attachments has no end"));
        }
        let Ok(branch) = branch.as_dict() else { return Err(unreadable("its list of attachments is damaged")) };
        for pair in self.array(branch, b"Names").chunks(2) {
            if let [_, file] = pair {
                self.attachment(file)?;
            }
        }
        self.array(branch, b"Kids").iter().try_for_each(|kid| self.branch(kid, depth + 1))
    }

    fn attachment(&mut self, file: &'a Object) -> Result<(), Problem> {
        let damaged = || unreadable("the entry of an attachment is damaged");
        let (_, file) = self.document.dereference(file).map_err(|_| damaged())?;
        let file = file.as_dict().map_err(|_| damaged())?;
        let text = |key: &[u8]| {
            let (_, object) = self.document.dereference(file.get(key).ok()?).ok()?;
            object.as_str().ok().and_then(name_text)
        };
        let name = text(b"UF").or_else(|| text(b"F")).ok_or_else(damaged)?;
        if name.is_empty() || name == "." || name == ".." || name.contains(['/', '\\', '\0']) {
            return Err(unreadable(&format!("the name of the attachment {name:?} is no plain file name")));
        }
        let streams = self.dictionary(file, b"EF").ok_or_else(damaged)?;
        let stream = streams.get(b"UF").or_else(|_| streams.get(b"F")).map_err(|_| damaged())?;
        let (_, stream) = self.document.dereference(stream).map_err(|_| damaged())?;
        let stream = stream.as_stream().map_err(|_| damaged())?;
        let content = stream
            .decompressed_content_with_limit(self.budget)
            .map_err(|error| unreadable(&format!("the attachment {name} cannot be unpacked ({error})")))?;
        self.budget = self.budget.saturating_sub(content.len());
        if self.found.len() >= MOST_ATTACHMENTS {
            return Err(unreadable("it has more than 10 000 attachments"));
        }
        match self.found.insert(name.clone(), content) {
            Some(_) => Err(unreadable(&format!("two attachments have the name {name}"))),
            None => Ok(()),
        }
    }
}

/// A text string of a PDF: UTF-16 with its mark, UTF-8 with its mark, or plain ASCII.
fn name_text(bytes: &[u8]) -> Option<String> {
    if let Some(utf16) = bytes.strip_prefix(&[0xfe, 0xff]) {
        let units: Vec<u16> = utf16.chunks_exact(2).map(|pair| u16::from_be_bytes([pair[0], pair[1]])).collect();
        return String::from_utf16(&units).ok().filter(|_| utf16.len() % 2 == 0);
    }
    let bytes = bytes.strip_prefix(&[0xef, 0xbb, 0xbf]).unwrap_or(bytes);
    String::from_utf8(bytes.to_vec()).ok()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::typeset::{Attachment, PdfOptions, Relationship, TypstDocument, typeset};

    fn sample() -> Vec<u8> {
        let attachment = |name: &str, bytes: &[u8]| Attachment {
            name: name.into(),
            bytes: bytes.to_vec(),
            relationship: Relationship::Data,
            mime_type: "text/csv".into(),
            description: "raw data".into(),
        };
        let document = TypstDocument {
            source: "#set document(title: \"T\")\nA page. #link(\"https://example.org\")[A link.]".into(),
            attachments: vec![attachment("µ weighings.csv", b"1,2\n%%EOF\n"), attachment("b.json", &[b'x'; 4000])],
            ..TypstDocument::default()
        };
        let options = PdfOptions { identifier: "seal".into(), timestamp: chrono::DateTime::UNIX_EPOCH };
        let pages = typeset(&document).unwrap_or_else(|faults| panic!("{faults:?}"));
        pages.pdf(&options).expect("exports")
    }

    #[test]
    fn our_own_file_reads_back() {
        let file = read_pdf(&sample()).expect("reads");
        assert_eq!(file.attachments.keys().collect::<Vec<_>>(), ["b.json", "µ weighings.csv"]);
        assert_eq!(file.attachments["µ weighings.csv"], b"1,2\n%%EOF\n");
        assert_eq!((file.pages, file.revisions), (1, 1));
        assert!(
            !(file.scripts || file.forms || file.optional_content || file.other_annotations || file.trailing_bytes)
        );
    }

    #[test]
    fn additions_are_seen() {
        let mut document = Document::load_mem(&sample()).expect("loads");
        let page = document.page_iter().next().expect("a page");
        let note = lopdf::dictionary! { "Type" => "Annot", "Subtype" => "Stamp", "Rect" => vec![0.into(), 0.into(), 9.into(), 9.into()] };
        let note = document.add_object(note);
        document.get_dictionary_mut(page).expect("a page").set("Annots", vec![note.into()]);
        document.add_object(lopdf::dictionary! { "S" => "JavaScript", "JS" => Object::string_literal("app.alert(1)") });
        document.catalog_mut().expect("a catalog").set("AcroForm", Dictionary::new());
        document.catalog_mut().expect("a catalog").set("OCProperties", Dictionary::new());
        let mut bytes = Vec::new();
        document.save_to(&mut bytes).expect("saves");
        bytes.extend(b"\nmore");
        let file = read_pdf(&bytes).expect("reads");
        assert!(file.scripts && file.forms && file.optional_content && file.other_annotations && file.trailing_bytes);
    }

    #[test]
    fn an_appended_revision_counts() {
        let original = sample();
        let mut update =
            lopdf::IncrementalDocument::create_from(original.clone(), Document::load_mem(&original).expect("loads"));
        update.new_document.add_object(Object::string_literal("later"));
        let mut bytes = Vec::new();
        update.save_to(&mut bytes).expect("saves");
        assert!(read_pdf(&bytes).map_or(true, |file| file.revisions == 2));
    }

    #[test]
    fn mutated_files_never_panic() {
        let original = sample();
        let mut state = 0x2545_f491_4f6c_dd1d_u64;
        let mut random = move |below: usize| {
            state ^= state << 13;
            state ^= state >> 7;
            state ^= state << 17;
            (state % below.max(1) as u64) as usize
        };
        for round in 0..3000 {
            let mut bytes = original.clone();
            for _ in 0..1 + random(6) {
                let (from, to, length) = (random(bytes.len()), random(bytes.len()), random(60));
                match round % 3 {
                    0 => bytes[from] = random(256) as u8,
                    1 => drop(bytes.drain(from..(from + length).min(bytes.len()))),
                    _ => {
                        let piece = bytes[from..(from + length).min(bytes.len())].to_vec();
                        bytes.splice(to..to, piece);
                    }
                }
            }
            let _ = read_pdf(&bytes);
        }
    }
}
