//! From Typst source to the bytes of a PDF.

use super::literal::typst_string;
use super::markup::place_of;
use super::world::PageWorld;
use crate::diagnostic::{Code, Complaint, Problem};
use crate::intake::Place;
use chrono::{DateTime, Datelike, Timelike, Utc};
use std::collections::BTreeMap;
use std::ops::Range;
use typst::WorldExt;
use typst::diag::SourceDiagnostic;
use typst::foundations::{Datetime, Smart};
use typst_layout::PagedDocument;
use typst_pdf::{PdfStandard, PdfStandards, Timestamp};

/// A document ready for the typesetter.
#[derive(Debug, Clone, Default)]
pub struct TypstDocument {
    pub source: String,
    /// Files the source may read, by path without a leading `/`; those ending in `.typ` can be imported.
    pub files: BTreeMap<String, Vec<u8>>,
    /// Files that travel inside the PDF, in this order.
    pub attachments: Vec<Attachment>,
    /// Which part of the source comes from which place of a record, sorted.
    pub spans: Vec<(Range<usize>, Place)>,
}

/// A file inside the PDF.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Attachment {
    /// Flat: without `/` and `\`.
    pub name: String,
    pub bytes: Vec<u8>,
    pub relationship: Relationship,
    pub mime_type: String,
    pub description: String,
}

/// What an attached file is to the pages (the relationships of PDF/A-3).
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Relationship {
    /// The pages were made from it.
    Source,
    /// It holds the data the pages show.
    Data,
    /// It accompanies the pages.
    Supplement,
}

impl Relationship {
    fn word(self) -> &'static str {
        match self {
            Relationship::Source => "source",
            Relationship::Data => "data",
            Relationship::Supplement => "supplement",
        }
    }
}

/// Something the typesetter could not do, or did with a reservation.
#[derive(Debug, Clone, PartialEq)]
pub struct TypesetFault {
    pub problem: Problem,
    /// The place in a record, when the source there comes from one.
    pub place: Option<Place>,
}

impl TypesetFault {
    /// The fault as a complaint.
    pub fn complaint(self) -> Complaint {
        match self.place {
            Some(place) => self.problem.at(place),
            None => self.problem.anywhere(),
        }
    }
}

/// What is fixed about the PDF beside its pages.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct PdfOptions {
    /// Identifies the document, the same whenever it is made again.
    pub identifier: String,
    /// Stands as the time of creation.
    pub timestamp: DateTime<Utc>,
}

/// Finished pages.
pub struct Typeset {
    pages: PagedDocument,
    world: PageWorld,
    spans: Vec<(Range<usize>, Place)>,
    /// What the typesetter remarked although it finished.
    pub remarks: Vec<TypesetFault>,
}

/// Typesets a document.
pub fn typeset(document: &TypstDocument) -> Result<Typeset, Vec<TypesetFault>> {
    let (source, files) = with_attachments(document)?;
    let world = PageWorld::new(source, files);
    let outcome = typst::compile::<PagedDocument>(&world);
    let faults = |list: &[SourceDiagnostic]| list.iter().map(|item| fault(&world, &document.spans, item)).collect();
    let remarks: Vec<TypesetFault> = faults(&outcome.warnings);
    match outcome.output {
        Ok(pages) => Ok(Typeset { pages, spans: document.spans.clone(), remarks, world }),
        Err(errors) => {
            let errors = faults(&errors);
            forget();
            Err(errors)
        }
    }
}

impl Typeset {
    /// How many pages there are.
    pub fn page_count(&self) -> usize {
        self.pages.pages().len()
    }

    /// The document as PDF/A-3a and PDF/UA-1; the same bytes whenever and wherever it is made.
    pub fn pdf(&self, options: &PdfOptions) -> Result<Vec<u8>, Vec<TypesetFault>> {
        let standards = PdfStandards::new(&[PdfStandard::A_3a, PdfStandard::Ua_1]);
        let standards = standards.map_err(|error| vec![plain_fault(error.message().as_ref())])?;
        let settings = typst_pdf::PdfOptions {
            ident: Smart::Custom(options.identifier.clone()),
            creator: Smart::Custom(Some("libripens".into())),
            timestamp: Some(timestamp(options.timestamp)?),
            standards,
            ..Default::default()
        };
        let exported = typst_pdf::pdf(&self.pages, &settings);
        let exported =
            exported.map_err(|errors| errors.iter().map(|item| fault(&self.world, &self.spans, item)).collect());
        forget();
        exported
    }
}

/// Frees what the typesetter remembers for a next run.
fn forget() {
    comemo::evict(0);
}

fn timestamp(time: DateTime<Utc>) -> Result<Timestamp, Vec<TypesetFault>> {
    let second = time.second() as u8;
    let datetime = Datetime::from_ymd_hms(
        time.year(),
        time.month() as u8,
        time.day() as u8,
        time.hour() as u8,
        time.minute() as u8,
        second,
    );
    datetime
        .map(Timestamp::new_utc)
        .ok_or_else(|| vec![plain_fault("the time of the report cannot be written into a PDF")])
}

/// The source with its attachments declared at the end, where they shift no place, and the files they are read from.
#[allow(clippy::type_complexity)]
fn with_attachments(document: &TypstDocument) -> Result<(String, BTreeMap<String, Vec<u8>>), Vec<TypesetFault>> {
    let mut source = document.source.clone();
    let mut files = document.files.clone();
    let mut faults = Vec::new();
    for (index, attachment) in document.attachments.iter().enumerate() {
        if attachment.name.is_empty() || attachment.name.contains(['/', '\\', '\0']) {
            faults.push(plain_fault(&format!("the attachment name {:?} is not flat", attachment.name)));
            continue;
        }
        let path = format!("attached-{index}");
        source.push_str(&format!(
            "\n#pdf.attach({}, read({}, encoding: none), relationship: \"{}\", mime-type: {}, description: {})",
            typst_string(&attachment.name),
            typst_string(&format!("/{path}")),
            attachment.relationship.word(),
            typst_string(&attachment.mime_type),
            typst_string(&attachment.description),
        ));
        files.insert(path, attachment.bytes.clone());
    }
    if faults.is_empty() { Ok((source, files)) } else { Err(faults) }
}

fn plain_fault(message: &str) -> TypesetFault {
    TypesetFault { problem: Problem::new(Code::TypesettingFailed, sentence(message)), place: None }
}

/// The typesetter's word on something, led back to the record where the source knows it.
///
/// A fault raised inside an imported part is placed where the document called that part.
fn fault(world: &PageWorld, spans: &[(Range<usize>, Place)], diagnostic: &SourceDiagnostic) -> TypesetFault {
    let mut problem = Problem::new(Code::TypesettingFailed, sentence(&diagnostic.message));
    problem.hints.extend(diagnostic.hints.iter().map(|hint| sentence(&hint.v)));
    if diagnostic.message.contains("could not be displayed with font") {
        let letters = diagnostic.message.split('"').nth(1).unwrap_or_default().trim_matches('`');
        problem.message = format!("The report's typefaces have no sign for “{letters}”.");
        problem.hints = vec!["Write it in Latin, Greek or Cyrillic letters, or with signs common in print.".into()];
    }
    let own = diagnostic.span.id().is_some_and(|id| world.is_main(id)).then(|| world.range(diagnostic.span)).flatten();
    let called = diagnostic.trace.iter().filter(|point| point.span.id().is_some_and(|id| world.is_main(id)));
    let offset = own.or_else(|| called.filter_map(|point| world.range(point.span)).next()).map(|range| range.start);
    TypesetFault { problem, place: offset.and_then(|offset| place_of(spans, offset)) }
}

/// The message as a sentence of ours: a capital letter and a full stop.
fn sentence(message: &str) -> String {
    let trimmed = message.trim().trim_end_matches('.');
    let mut characters = trimmed.chars();
    let first = characters.next().map(|first| first.to_uppercase().to_string()).unwrap_or_default();
    format!("{first}{}.", characters.as_str())
}
