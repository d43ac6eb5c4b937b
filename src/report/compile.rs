//! From a report record to a PDF with its dossier.

use super::dossier::{Dossier, ISSUE, issue_attachment};
use super::expression::{Evaluator, Request, answer, failed_block, gap, named_result, prepare};
use super::front::Front;
use super::issue::Issue;
use super::markup::Markup;
use super::prose::{Insert, Inserted, Prose, path_in_folder, typeset_prose};
use super::template::Templates;
use super::typeset::{PdfOptions, TypstDocument, typeset};
use crate::block::Engine;
use crate::diagnostic::{Code, Complaints, Problem};
use crate::graph::NodeId;
use crate::intake::Place;
use crate::record::{Expression, Record, blank_expressions};
use std::collections::BTreeMap;

/// A report made.
pub struct Report {
    pub pdf: Vec<u8>,
    pub pages: usize,
    pub dossier: Dossier,
    /// Of an issued report, what is attached beside the dossier.
    pub issue: Option<Issue>,
}

impl Report {
    /// Every attached file by name: the dossier, and of an issued report its issue.
    pub fn attached(&self) -> BTreeMap<String, Vec<u8>> {
        let mut files = self.dossier.files.clone();
        files.extend(self.issue.iter().map(|issue| (ISSUE.to_string(), issue.bytes())));
        files
    }
}

/// The records that are reports, by path.
pub fn report_records(engine: &Engine) -> Vec<String> {
    let is_report = |record: &&Record| record.front.as_ref().is_some_and(|front| front.get("report").is_some());
    engine.records.iter().filter(is_report).map(|record| engine.sources().file(record.file).path.clone()).collect()
}

/// Files the complaints of every report record, without typesetting.
pub fn examine_reports(engine: &Engine) {
    for path in report_records(engine) {
        Writing::new(engine, &path).map(|mut writing| writing.body());
    }
}

/// What a report record becomes before the typesetter: pages in Typst with all they need, and the dossier.
pub struct Manuscript {
    pub document: TypstDocument,
    pub options: PdfOptions,
    pub dossier: Dossier,
}

/// Makes the report of the record at `path` as a draft. Complaints are with the engine; where nothing can be made of
/// the record there is no report.
pub fn make_report(engine: &Engine, path: &str) -> Option<Report> {
    let manuscript = write_report(engine, path)?;
    let (pdf, pages) = print(engine, &manuscript)?;
    Some(Report { pdf, pages, dossier: manuscript.dossier, issue: None })
}

/// Makes the report of the record at `path` as issued. `issue` is asked once the dossier is known; where it gives
/// nothing, nothing is made.
pub fn make_issued(
    engine: &Engine,
    path: &str,
    issue: &mut dyn FnMut(&Dossier) -> Option<Issue>,
) -> Option<(Report, Issue)> {
    let mut kept = None;
    let manuscript = write_with(engine, path, &mut |dossier| {
        kept = issue(dossier);
        kept.clone().map(Some)
    })?;
    let (pdf, pages) = print(engine, &manuscript)?;
    Some((Report { pdf, pages, dossier: manuscript.dossier, issue: kept.clone() }, kept?))
}

/// Writes the report of the record at `path` out as Typst, up to the door of the typesetter.
pub fn write_report(engine: &Engine, path: &str) -> Option<Manuscript> {
    write_with(engine, path, &mut |_| Some(None))
}

/// Writes a report out; `issue` gives nothing to stop, no issue for a draft, or the issue.
fn write_with(
    engine: &Engine,
    path: &str,
    issue: &mut dyn FnMut(&Dossier) -> Option<Option<Issue>>,
) -> Option<Manuscript> {
    let mut writing = Writing::new(engine, path)?;
    let body = writing.body();
    let templates = templates(engine)?;
    let mut extra = writing.images.clone();
    extra.insert(Templates::REPORT_PATH.into(), templates.report.clone().into_bytes());
    extra.insert(Templates::PARTS_PATH.into(), templates.parts.clone().into_bytes());
    let dossier = Dossier::new(engine, path, &extra);
    let issue = issue(&dossier)?;
    let page = writing.front.page(engine, body, &writing.results, &dossier, issue.as_ref());
    let place = writing.front.place;
    let rendered = engine.keep(templates.render(&page.values()), place)?;
    let mut files = templates.files();
    files.extend(writing.images.iter().map(|(path, bytes)| (path.clone(), bytes.clone())));
    let mut attachments = dossier.attachments();
    attachments.extend(issue.as_ref().map(issue_attachment));
    let document = TypstDocument { source: rendered.source, files, attachments, spans: rendered.spans };
    let options = pdf_options(&writing.front, &dossier, issue.as_ref())?;
    Some(Manuscript { document, options, dossier })
}

fn pdf_options(front: &Front, dossier: &Dossier, issue: Option<&Issue>) -> Option<PdfOptions> {
    let of_record = front.date.and_hms_opt(0, 0, 0)?.and_utc();
    Some(match issue {
        None => PdfOptions { identifier: dossier.seal.clone(), timestamp: of_record },
        Some(issue) => PdfOptions {
            identifier: format!("{} {}", dossier.seal, issue.number),
            timestamp: issue.time.parse().unwrap_or(of_record),
        },
    })
}

fn print(engine: &Engine, manuscript: &Manuscript) -> Option<(Vec<u8>, usize)> {
    let refuse = |faults: Vec<super::typeset::TypesetFault>| {
        engine.complain_all(Complaints { list: faults.into_iter().map(|fault| fault.complaint()).collect() });
    };
    let typeset = typeset(&manuscript.document).map_err(refuse).ok()?;
    let pdf = typeset.pdf(&manuscript.options).map_err(refuse).ok()?;
    Some((pdf, typeset.page_count()))
}

/// The laboratory's own templates where it has them, else those of the program.
fn templates(engine: &Engine) -> Option<Templates> {
    let mut templates = Templates::built_in();
    for (path, slot) in [(Templates::REPORT_PATH, &mut templates.report), (Templates::PARTS_PATH, &mut templates.parts)]
    {
        if let Ok(bytes) = engine.intake.read(path) {
            match String::from_utf8(bytes) {
                Ok(text) => *slot = text,
                Err(_) => {
                    let problem = Problem::new(Code::TemplateFaulty, format!("The template {path} is no UTF-8 text."));
                    engine.complain_all(Complaints { list: vec![problem.anywhere()] });
                    return None;
                }
            }
        }
    }
    Some(templates)
}

/// A report record being written out.
struct Writing<'e> {
    engine: &'e Engine<'e>,
    front: Front,
    record: &'e Record,
    folder: String,
    results: Vec<NodeId>,
    images: BTreeMap<String, Vec<u8>>,
    /// Blocks that could not be computed, once for each gap they leave in the prose.
    gaps: Vec<String>,
}

impl<'e> Writing<'e> {
    fn new(engine: &'e Engine<'e>, path: &str) -> Option<Writing<'e>> {
        let file = engine.sources().find(path)?;
        let record = engine.records.iter().find(|record| record.file == file)?;
        engine.use_file(file);
        let front = Front::read(engine, record)?;
        let folder = path.rsplit_once('/').map_or("", |(folder, _)| folder).to_string();
        Some(Writing { engine, front, record, folder, results: Vec::new(), images: BTreeMap::new(), gaps: Vec::new() })
    }

    /// The prose with everything it cites.
    fn body(&mut self) -> Markup {
        let engine = self.engine;
        self.results = self.front.results.iter().filter_map(|path| named_result(engine, path)).collect();
        let text = engine.sources().text(self.record.body).into_owned();
        let (blanked, expressions, problems) = blank_expressions(&text);
        for problem in problems {
            engine.complain(problem, self.record.body);
        }
        let requests = self.requests(&expressions);
        let leave_out: Vec<Place> = self.record.blocks.iter().map(|block| block.place).collect();
        let prose = Prose {
            blanked: &blanked,
            expressions: &expressions,
            body: self.record.body,
            leave_out: &leave_out,
            top_level: 1,
        };
        let mut complaints = Complaints::default();
        let mut answers = Answers { writing: self, requests };
        let markup = typeset_prose(&prose, &mut answers, &mut complaints);
        engine.complain_all(complaints);
        self.complain_of_gaps();
        markup
    }

    /// One complaint for all gaps whose causes were complained of.
    fn complain_of_gaps(&self) {
        let mut blocks = self.gaps.clone();
        blocks.sort();
        blocks.dedup();
        if blocks.is_empty() {
            return;
        }
        let message = format!(
            "{} places of the report stay marked gaps, because {} could not be computed.",
            self.gaps.len(),
            blocks.join(", ")
        );
        let problem = Problem::new(Code::FigureMissing, message).hint("The causes are among the other complaints.");
        self.engine.complain(problem, self.front.place);
    }

    /// Evaluates all expressions and builds what they need, so that parts that speak of everything used are complete.
    fn requests(&self, expressions: &[Expression]) -> Vec<(String, Place, Option<Request>)> {
        let evaluator = Evaluator::new(self.engine);
        let evaluate = |expression: &Expression| {
            let place = self.record.body.within(expression.inner.start, expression.inner.end);
            let request = self.engine.keep(evaluator.request(&expression.text), place);
            if let Some(request) = &request {
                prepare(self.engine, request, place);
            }
            (expression.text.clone(), place, request)
        };
        expressions.iter().map(evaluate).collect()
    }
}

/// Answers what the prose asks for.
struct Answers<'w, 'e> {
    writing: &'w mut Writing<'e>,
    requests: Vec<(String, Place, Option<Request>)>,
}

impl Insert for Answers<'_, '_> {
    fn expression(&mut self, index: usize) -> Inserted {
        let Some((text, place, request)) = self.requests.get(index) else { return gap("") };
        let engine = self.writing.engine;
        let Some(request) = request else { return gap(text) };
        match answer(engine, request, &self.writing.results) {
            Ok(inserted) => inserted,
            Err(problem) => {
                match failed_block(engine, request) {
                    Some(block) => self.writing.gaps.push(block),
                    None => engine.complain(problem, *place),
                }
                gap(text)
            }
        }
    }

    fn image(&mut self, path: &str) -> Result<String, Problem> {
        let full = path_in_folder(&self.writing.folder, path)?;
        let bytes = self.writing.engine.intake.read(&full).map_err(|error| {
            Problem::new(Code::FileMissing, format!("The image {path} cannot be read: {error}."))
                .hint("The path counts from the folder of the record.")
        })?;
        self.writing.images.insert(full.clone(), bytes);
        Ok(full)
    }
}
