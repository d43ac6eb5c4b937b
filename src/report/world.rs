//! The closed world of the typesetter: one source, a map of files, the faces built into the program.
//!
//! No disk, no packages, no clock: a page depends on nothing but what is handed in.

use std::collections::BTreeMap;
use std::sync::OnceLock;
use typst::diag::{FileError, FileResult};
use typst::foundations::{Bytes, Datetime, Duration};
use typst::syntax::{FileId, RootedPath, Source, VirtualPath, VirtualRoot};
use typst::text::{Font, FontBook};
use typst::utils::LazyHash;
use typst::{Library, LibraryExt, World};

/// The faces built into the program, read once.
struct Faces {
    book: LazyHash<FontBook>,
    fonts: Vec<Font>,
    library: LazyHash<Library>,
}

fn faces() -> &'static Faces {
    static FACES: OnceLock<Faces> = OnceLock::new();
    FACES.get_or_init(|| {
        let fonts: Vec<Font> = typst_assets::fonts().flat_map(|data| Font::iter(Bytes::new(data))).collect();
        Faces { book: LazyHash::new(FontBook::from_fonts(&fonts)), fonts, library: LazyHash::new(Library::default()) }
    })
}

/// Everything one document may see.
pub struct PageWorld {
    main: FileId,
    sources: BTreeMap<String, Source>,
    files: BTreeMap<String, Bytes>,
}

/// The name of the document's own source among the files.
const MAIN: &str = "document.typ";

impl PageWorld {
    /// A world of one document and the files it may read, named by their paths without a leading `/`.
    pub fn new(source: String, files: BTreeMap<String, Vec<u8>>) -> Self {
        let main = virtual_file(MAIN).expect("a plain name can stand in the closed world");
        let mut sources = BTreeMap::from([(MAIN.to_string(), Source::new(main, source))]);
        let mut bytes = BTreeMap::new();
        for (path, content) in files {
            let text = std::str::from_utf8(&content).ok().filter(|_| path.ends_with(".typ") && path != MAIN);
            if let (Some(text), Some(id)) = (text, virtual_file(&path)) {
                sources.insert(path.clone(), Source::new(id, text.to_string()));
            }
            bytes.insert(path, Bytes::new(content));
        }
        Self { main, sources, files: bytes }
    }

    /// Whether a file id is that of the document's own source.
    pub fn is_main(&self, id: FileId) -> bool {
        id == self.main
    }
}

/// The id of a path inside the closed world, if it can stand there.
fn virtual_file(path: &str) -> Option<FileId> {
    Some(RootedPath::new(VirtualRoot::Project, VirtualPath::new(path).ok()?).intern())
}

fn path_of(id: FileId) -> FileResult<&'static str> {
    match id.get().root() {
        VirtualRoot::Project => Ok(id.get().vpath().get_without_slash()),
        VirtualRoot::Package(_) => Err(FileError::NotFound(id.get().vpath().get_without_slash().into())),
    }
}

impl World for PageWorld {
    fn library(&self) -> &LazyHash<Library> {
        &faces().library
    }

    fn book(&self) -> &LazyHash<FontBook> {
        &faces().book
    }

    fn main(&self) -> FileId {
        self.main
    }

    fn source(&self, id: FileId) -> FileResult<Source> {
        let path = path_of(id)?;
        self.sources.get(path).cloned().ok_or_else(|| FileError::NotFound(path.into()))
    }

    fn file(&self, id: FileId) -> FileResult<Bytes> {
        let path = path_of(id)?;
        self.files.get(path).cloned().ok_or_else(|| FileError::NotFound(path.into()))
    }

    fn font(&self, index: usize) -> Option<Font> {
        faces().fonts.get(index).cloned()
    }

    fn today(&self, _offset: Option<Duration>) -> Option<Datetime> {
        None
    }
}
