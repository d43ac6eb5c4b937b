//! From records to the graph, on demand.
//!
//! The engine holds the blocks of a laboratory folder and one graph. Asking for a result builds the block that
//! gives it and, before that, every block it rests on; what was not asked for is not built. Complaints gather here.

use super::correction::{self, Corrected, Correction};
use super::given::{Given, distribution_of};
use super::laboratory::Laboratory;
use super::{BlockKind, Fields, KINDS, field::check_fields, find_kind};
use crate::diagnostic::{Code, Complaints, Problem, Severity, nearest};
use crate::graph::{Builder, Distribution, Graph, InputDraft, NodeId, Origin, Quantity, Value};
use crate::intake::{FileId, Intake, IntakeError, Place, Sources};
use crate::quantity::{Kind, Unit};
use crate::record::{MeasurementBlock, Record, Text, parse_date, read_record};
use chrono::NaiveDate;
use std::any::{Any, TypeId};
use std::cell::{Ref, RefCell};
use std::collections::{BTreeMap, BTreeSet};
use std::rc::Rc;
use std::sync::Arc;

/// A block of a known kind, checked against its fields.
pub struct Block {
    pub kind: &'static BlockKind,
    pub raw: MeasurementBlock,
    /// Date of the record the block stands in.
    pub date: Option<NaiveDate>,
    /// Path of the record.
    pub path: String,
    /// Whether its fields are without faults.
    pub sound: bool,
}

impl Block {
    /// The block's name.
    pub fn name(&self) -> &str {
        &self.raw.name.text
    }

    /// The block's fields.
    pub fn fields(&self) -> Fields<'_> {
        Fields { node: &self.raw.body }
    }

    /// What is printed for the block: its label, else its name.
    pub fn label(&self) -> String {
        self.fields().text("label").map_or_else(|| self.name().to_string(), |label| label.text)
    }
}

#[derive(Default)]
struct Progress {
    complaints: Complaints,
    done: BTreeSet<String>,
    open: Vec<String>,
    /// Blocks whose building drew a fault: what they do not give is no second fault.
    failed: BTreeSet<String>,
    /// Names of blocks used so far, in order of first use.
    used: Vec<String>,
    /// Files used so far beside those of the blocks.
    files: BTreeSet<FileId>,
    stated: Vec<(String, f64, f64, Kind, Place)>,
    /// What blocks found beyond their quantities, for the report: one value of each type a block.
    found: BTreeMap<(String, TypeId), Rc<dyn Any>>,
}

/// A laboratory folder read, and the graph built from it so far.
pub struct Engine<'i> {
    pub intake: &'i dyn Intake,
    pub laboratory: Laboratory,
    pub records: Vec<Record>,
    pub builder: Builder,
    campaign: Option<String>,
    corrected: Corrected,
    sources: RefCell<Sources>,
    blocks: BTreeMap<String, Block>,
    progress: RefCell<Progress>,
}

impl<'i> Engine<'i> {
    /// Reads the records that `campaign` sees: its own and the shared ones; all of them when none is named.
    ///
    /// # Errors
    /// When the folder cannot be listed. Faults of single files are complaints.
    pub fn read(intake: &'i dyn Intake, campaign: Option<&str>) -> Result<Engine<'i>, IntakeError> {
        let mut sources = Sources::default();
        let mut complaints = Complaints::default();
        let (mut records, mut found_in) = (Vec::new(), Vec::new());
        for path in intake.list()?.into_iter().filter(|path| is_visible(path, campaign)) {
            let file = sources.add(&path, intake.read(&path)?);
            let (record, found) = read_record(file, &sources);
            found_in.push(found);
            records.push(record);
        }
        let corrected = correction::apply(intake, &records, &sources, campaign, &mut complaints);
        for (path, text) in &corrected.texts {
            let Some(file) = sources.find(path) else { continue };
            sources.replace(file, text.clone());
            if let Some(at) = records.iter().position(|record| record.file == file) {
                (records[at], found_in[at]) = read_record(file, &sources);
            }
        }
        found_in.into_iter().for_each(|found| complaints.extend(found));
        let laboratory =
            match sources.find("laboratory.md").and_then(|file| records.iter().find(|record| record.file == file)) {
                Some(record) => Laboratory::read(record, &mut complaints),
                None => {
                    let problem = Problem::new(Code::FileMissing, "The laboratory folder has no laboratory.md.");
                    complaints.add(problem.hint("`libripens start FOLDER` writes one to begin with.").anywhere());
                    Laboratory::default()
                }
            };
        let blocks = gather(&records, &sources, &mut complaints);
        let progress = Progress { complaints, ..Progress::default() };
        Ok(Engine {
            intake,
            laboratory,
            records,
            builder: Builder::default(),
            campaign: campaign.map(String::from),
            corrected,
            sources: RefCell::new(sources),
            blocks,
            progress: RefCell::new(progress),
        })
    }

    /// The files read so far.
    pub fn sources(&self) -> Ref<'_, Sources> {
        self.sources.borrow()
    }

    /// The graph built so far.
    pub fn graph(&self) -> Ref<'_, Graph> {
        self.builder.graph()
    }

    /// Every block by name.
    pub fn blocks(&self) -> &BTreeMap<String, Block> {
        &self.blocks
    }

    /// All complaints so far, in order of place.
    pub fn complaints(&self) -> Complaints {
        let mut complaints = self.progress.borrow().complaints.clone();
        complaints.sort();
        complaints
    }

    /// Files a problem at a place.
    pub fn complain(&self, problem: Problem, place: Place) {
        self.progress.borrow_mut().complaints.add_at(problem, place);
    }

    /// Files a problem at a place, where it has one.
    pub fn complain_somewhere(&self, problem: Problem, place: Option<Place>) {
        let complaint = match place {
            Some(place) => problem.at(place),
            None => problem.anywhere(),
        };
        self.progress.borrow_mut().complaints.add(complaint);
    }

    /// Files several complaints.
    pub fn complain_all(&self, complaints: Complaints) {
        self.progress.borrow_mut().complaints.extend(complaints);
    }

    /// Keeps the value of a result, or files its problem.
    pub fn keep<T>(&self, result: Result<T, Problem>, place: Place) -> Option<T> {
        result.map_err(|problem| self.complain(problem, place)).ok()
    }

    /// Names of the blocks used so far, in order of first use.
    pub fn used_blocks(&self) -> Vec<String> {
        self.progress.borrow().used.clone()
    }

    /// Paths of the files used so far: records of used blocks, raw data, images.
    pub fn used_files(&self) -> BTreeSet<String> {
        let progress = self.progress.borrow();
        let of_blocks = progress.used.iter().filter_map(|name| self.blocks.get(name)).map(|block| block.path.clone());
        let others =
            progress.files.iter().map(|file| self.sources.borrow().file(*file).path.clone()).collect::<Vec<_>>();
        let mut files: BTreeSet<String> = of_blocks.chain(others).chain(["laboratory.md".to_string()]).collect();
        // What a file is corrected by belongs to it.
        let correcting: Vec<String> = self
            .corrections()
            .iter()
            .filter(|correction| files.contains(&correction.record))
            .map(|correction| correction.stated_in.clone())
            .collect();
        files.extend(correcting);
        files
    }

    /// Reads a file named in a record relative to the record's own folder; a file asked for twice is read once.
    ///
    /// # Errors
    /// `path_outside` or `file_missing`.
    pub fn read_file(&self, named: &str, beside: &str) -> Result<FileId, Problem> {
        let path = resolve(named, beside)?;
        let known = self.sources.borrow().find(&path);
        let file = match known {
            Some(file) => file,
            None => {
                let bytes: Arc<[u8]> = match self.corrected.texts.get(&path) {
                    Some(text) => text.clone(),
                    None => {
                        let read = self.intake.read(&path);
                        read.map_err(|error| missing(named, &path, &error, self.intake))?.into()
                    }
                };
                self.sources.borrow_mut().add(&path, bytes)
            }
        };
        self.progress.borrow_mut().files.insert(file);
        Ok(file)
    }

    /// The corrections applied.
    pub fn corrections(&self) -> &[Correction] {
        &self.corrected.corrections
    }

    /// The corrections that touch a line with this place.
    pub fn corrections_at(&self, place: Place) -> Vec<&Correction> {
        let sources = self.sources.borrow();
        let path = &sources.file(place.file).path;
        let touches = |one: &&Correction| {
            one.record == *path && one.range.0 <= place.end as usize && place.start as usize <= one.range.1
        };
        self.corrections().iter().filter(touches).collect()
    }

    /// The corrections that touch what an origin names, each once.
    pub fn corrections_of(&self, origin: &Origin) -> Vec<&Correction> {
        let mut found: Vec<&Correction> = match origin {
            Origin::Stated(place) | Origin::Reading(place) => self.corrections_at(*place),
            Origin::ReadingList(places) => places.iter().flat_map(|place| self.corrections_at(*place)).collect(),
            Origin::Readings(column) => {
                let sources = self.sources.borrow();
                let file = sources.file(column.file);
                let touches = |one: &&Correction| {
                    one.record == file.path
                        && column.lines.contains(&(file.line_of(one.range.0 as u32) as u32))
                        && one.is_in_column(&file.bytes, &column.column)
                };
                self.corrections().iter().filter(touches).collect()
            }
            _ => Vec::new(),
        };
        let mut seen = BTreeSet::new();
        found.retain(|one| seen.insert(one.name.as_str()));
        found
    }

    /// Whether records of the campaign read may use this file: its own and the shared ones.
    pub fn sees(&self, path: &str) -> bool {
        match (self.campaign.as_deref(), path.strip_prefix("campaigns/")) {
            (Some(campaign), Some(inside)) => inside.split('/').next() == Some(campaign),
            _ => true,
        }
    }

    /// The bytes of a file as they stand in the folder, without marking it as used.
    ///
    /// # Errors
    /// When it cannot be read.
    pub fn original(&self, path: &str) -> Result<Arc<[u8]>, IntakeError> {
        if let Some(bytes) = self.corrected.originals.get(path) {
            return Ok(bytes.clone());
        }
        let sources = self.sources.borrow();
        match sources.find(path) {
            Some(file) => Ok(sources.file(file).bytes.clone()),
            None => Ok(self.intake.read(path)?.into()),
        }
    }

    /// Takes a file in for its places, without marking it as used.
    ///
    /// # Errors
    /// When it cannot be read.
    pub fn take_in(&self, path: &str) -> Result<FileId, IntakeError> {
        let bytes = match self.corrected.texts.get(path) {
            Some(text) => text.clone(),
            None => self.original(path)?,
        };
        Ok(self.sources.borrow_mut().add(path, bytes))
    }

    /// Marks a file as part of what a report rests on.
    pub fn use_file(&self, file: FileId) {
        self.progress.borrow_mut().files.insert(file);
    }

    /// The block with this name, marked as used. A name that refers to nothing, or to another kind, is complained of.
    pub fn block(&self, name: &Text, kinds: &[&str]) -> Option<&Block> {
        let Some(block) = self.blocks.get(&name.text) else {
            let problem = Problem::new(Code::UndefinedReference, format!("No block is named {}.", name.text));
            let fitting = self.blocks.values().filter(|block| kinds.contains(&block.kind.name)).map(Block::name);
            self.complain(
                match nearest(&name.text, fitting) {
                    Some(near) => problem.hint(format!("Did you mean {near}?")),
                    None => problem.hint(format!("A block of the kind {} is expected here.", kinds.join(" or "))),
                },
                name.place,
            );
            return None;
        };
        if !kinds.contains(&block.kind.name) {
            let message = format!(
                "{} is of the kind {}, but {} is expected here.",
                name.text,
                block.kind.name,
                kinds.join(" or ")
            );
            self.progress.borrow_mut().complaints.add(
                Problem::new(Code::KindMismatch, message)
                    .at(name.place)
                    .hint_at("It stands here.", block.raw.name.place),
            );
            return None;
        }
        self.mark_used(block.name());
        if !block.sound {
            self.fail_open();
        }
        block.sound.then_some(block)
    }

    /// Marks a block as part of what results rest on.
    pub fn mark_used(&self, name: &str) {
        let mut progress = self.progress.borrow_mut();
        if !progress.used.iter().any(|used| used == name) {
            progress.used.push(name.to_string());
        }
    }

    /// Builds a block once; a circle is complained of and shown.
    pub fn build(&self, name: &str, asked_at: Place) {
        let Some(block) = self.blocks.get(name) else { return };
        self.mark_used(name);
        {
            let mut progress = self.progress.borrow_mut();
            if let Some(start) = progress.open.iter().position(|open| open == name) {
                let circle =
                    progress.open[start..].iter().map(String::as_str).chain([name]).collect::<Vec<_>>().join(" → ");
                let problem =
                    Problem::new(Code::CircularReference, format!("These blocks need each other's results: {circle}."));
                progress.complaints.add_at(problem.hint("One of them must be given a value of its own."), asked_at);
                return;
            }
            if !block.sound || !progress.done.insert(name.to_string()) {
                return;
            }
            progress.open.push(name.to_string());
        }
        let before = self.count_faults();
        (block.kind.build)(self, block);
        for problem in self.builder.take_problems() {
            self.complain(problem, block.raw.place);
        }
        super::correlation::apply_all(self);
        let failed = self.count_faults() > before;
        let mut progress = self.progress.borrow_mut();
        progress.open.pop();
        if failed {
            progress.failed.insert(name.to_string());
        }
    }

    fn count_faults(&self) -> usize {
        let progress = self.progress.borrow();
        progress.complaints.list.iter().filter(|complaint| complaint.severity == Severity::Fault).count()
    }

    /// Builds every block that computes something.
    pub fn build_all(&self) {
        for (name, block) in &self.blocks {
            self.build(name, block.raw.name.place);
        }
        super::correlation::check_applied(self);
    }

    /// The result with this path; builds the block that gives it. What cannot be had is complained of at `path`.
    pub fn result(&self, path: &Text) -> Option<Quantity<'_>> {
        let name = path.text.split('.').next().unwrap_or_default();
        if !self.blocks.contains_key(name) && self.graph().find(&path.text).is_none() {
            let problem = Problem::new(
                Code::UndefinedReference,
                format!("{} refers to no block: none is named {name}.", path.text),
            );
            self.complain(
                match nearest(name, self.blocks.keys().map(String::as_str)) {
                    Some(near) => problem.hint(format!("Did you mean {near}?")),
                    None => problem,
                },
                path.place,
            );
            return None;
        }
        self.build(name, path.place);
        let found = self.graph().find(&path.text);
        if found.is_none()
            && self.blocks.get(name).is_some_and(|block| block.sound)
            && !self.progress.borrow().open.iter().any(|open| open == name)
        {
            self.complain_unknown_output(path, name);
        }
        let found = found.map(|id| self.builder.at(id)).filter(|quantity| self.graph().value(quantity.id).is_finite());
        if found.is_none() {
            self.fail_open();
        }
        found
    }

    /// What is being built rests on something that was complained of: what it does not give is no second fault.
    fn fail_open(&self) {
        let mut progress = self.progress.borrow_mut();
        let open = progress.open.clone();
        progress.failed.extend(open);
    }

    /// Whether a block could not be computed, or not wholly, for a reason already complained of.
    pub fn has_failed(&self, name: &str) -> bool {
        self.progress.borrow().failed.contains(name) || self.blocks.get(name).is_some_and(|block| !block.sound)
    }

    fn complain_unknown_output(&self, path: &Text, name: &str) {
        // A block that was complained of says nothing twice.
        if self.progress.borrow().failed.contains(name) {
            return;
        }
        let graph = self.graph();
        let prefix = format!("{name}.");
        let outputs: Vec<&str> =
            graph.names.keys().filter(|known| known.starts_with(&prefix)).map(String::as_str).collect();
        let problem = Problem::new(Code::UndefinedReference, format!("{name} gives no result {}.", path.text));
        let problem = match nearest(&path.text, outputs.iter().copied()) {
            Some(near) => problem.hint(format!("Did you mean {near}?")),
            None if outputs.is_empty() => problem,
            None => problem.hint(format!("It gives {}.", outputs.join(", "))),
        };
        drop(graph);
        self.complain(problem, path.place);
    }

    /// The node of a value given in a field: an input under `path`, or the result it refers to.
    pub fn given<'e>(
        &'e self,
        given: &Given,
        path: &str,
        symbol: &str,
        label: &str,
        kind: Kind,
    ) -> Option<Quantity<'e>> {
        match given {
            Given::Reference(reference) => {
                let found = self.result(reference)?;
                if kind != Kind::Plain && found.kind() != kind && found.kind() != Kind::Plain {
                    let message = format!(
                        "{} is {}, but {} is expected here.",
                        reference.text,
                        found.kind().phrase(),
                        kind.phrase()
                    );
                    let hint =
                        "Cite a result of the kind expected; mass and conventional mass are never exchanged by hand.";
                    self.complain(Problem::new(Code::KindMismatch, message).hint(hint), reference.place);
                    return None;
                }
                Some(found)
            }
            Given::Stated { value, place } => {
                let mut draft = InputDraft::new(
                    path,
                    symbol,
                    label,
                    kind,
                    value.unit.clone(),
                    Value::Scalar(value.value),
                    Origin::Stated(*place),
                );
                draft.distribution = distribution_of(value);
                draft.degrees_of_freedom = value.degrees_of_freedom;
                draft.text = Some(value.text.clone());
                self.note_stated(path, &draft, *place);
                Some(self.builder.input(draft))
            }
        }
    }

    /// Warns when the same value and uncertainty stand in two blocks.
    fn note_stated(&self, path: &str, draft: &InputDraft, place: Place) {
        let (value, u) = (draft.value.number(), draft.distribution.standard_uncertainty());
        if value == 0.0 || u == 0.0 {
            return;
        }
        let block = path.split('.').next().unwrap_or_default();
        let mut progress = self.progress.borrow_mut();
        let twin = progress.stated.iter().find(|(other, v, w, kind, at)| {
            *v == value && *w == u && *kind == draft.kind && *at != place && other.split('.').next() != Some(block)
        });
        if let Some((other, .., first)) = twin.cloned() {
            let message =
                format!("{path} and {other} are typed with the same value and uncertainty: one input or two?");
            let problem = Problem::new(Code::SameValueTwice, message)
                .hint(format!("If it is one quantity, write it once and refer to it: `from {other}`. If they are two, a digit more in either says so."));
            progress.complaints.add(problem.at(place).hint_at("The other stands here.", first));
        }
        progress.stated.push((path.to_string(), value, u, draft.kind, place));
    }

    /// An input with an estimate of zero or one that a field gives as a bound; nothing when the field is absent.
    pub fn bound<'e>(
        &'e self,
        fields: Fields<'_>,
        name: &str,
        path: &str,
        symbol: &str,
        label: &str,
        kind: Kind,
    ) -> Option<Quantity<'e>> {
        self.given(&fields.given(name, kind)?, path, symbol, label, kind)
    }

    /// An input made by the program from a stated number, such as half a scale interval.
    #[allow(clippy::too_many_arguments)]
    pub fn derived_input<'e>(
        &'e self,
        path: &str,
        symbol: &str,
        label: &str,
        kind: Kind,
        unit: &Unit,
        distribution: Distribution,
        place: Place,
    ) -> Quantity<'e> {
        let mut draft =
            InputDraft::new(path, symbol, label, kind, unit.clone(), Value::Scalar(0.0), Origin::Stated(place));
        draft.distribution = distribution;
        self.builder.input(draft)
    }

    /// Keeps what a block found beyond its quantities, for other blocks and the report; one value of a type a block.
    pub fn store<T: Any>(&self, name: &str, found: T) {
        self.progress.borrow_mut().found.insert((name.to_string(), TypeId::of::<T>()), Rc::new(found));
    }

    /// What the block of this name stored with [`Engine::store`]; nothing before it was built.
    pub fn found<T: Any>(&self, name: &str) -> Option<Rc<T>> {
        let found = self.progress.borrow().found.get(&(name.to_string(), TypeId::of::<T>())).cloned()?;
        found.downcast().ok()
    }

    /// What a comparison found.
    pub fn weighing(&self, name: &str) -> Option<Rc<super::weighing::Comparison>> {
        self.found(name)
    }

    /// The conditions of an ambient block.
    pub fn conditions(&self, name: &str) -> Option<Rc<super::ambient::Conditions>> {
        self.found(name)
    }

    /// The node behind an id, as a handle.
    pub fn at(&self, id: NodeId) -> Quantity<'_> {
        self.builder.at(id)
    }
}

/// The engine as its blocks borrow it while they build: what they make lives as long as this borrow.
pub(super) fn shorten<'e>(engine: &'e Engine<'_>) -> &'e Engine<'e> {
    engine
}

/// A campaign sees its own records and the shared ones.
fn is_visible(path: &str, campaign: Option<&str>) -> bool {
    if !path.ends_with(".md") {
        return false;
    }
    match path.split('/').collect::<Vec<_>>().as_slice() {
        ["laboratory.md"] => true,
        ["standards" | "instruments", ..] => true,
        ["campaigns", name, ..] => campaign.is_none_or(|wanted| wanted == *name),
        ["templates" | "register", ..] => false,
        _ => true,
    }
}

/// The measurement blocks of all records, each checked against the fields of its kind.
fn gather(records: &[Record], sources: &Sources, complaints: &mut Complaints) -> BTreeMap<String, Block> {
    let mut blocks: BTreeMap<String, Block> = BTreeMap::new();
    for record in records {
        let date = record_date(record, complaints);
        let path = &sources.file(record.file).path;
        for raw in &record.blocks {
            let Some(kind) = find_kind(&raw.kind.text) else {
                complaints.add_at(unknown_kind(&raw.kind.text), raw.kind.place);
                continue;
            };
            if let Some(first) = blocks.get(&raw.name.text) {
                let problem = Problem::new(
                    Code::DuplicateName,
                    format!("Two blocks are named {}; names are unique in the laboratory folder.", raw.name.text),
                );
                complaints.add(problem.at(raw.name.place).hint_at("The first stands here.", first.raw.name.place));
                continue;
            }
            let sound = raw.readable && check_block(kind, raw, complaints);
            let block = Block { kind, raw: raw.clone(), date, path: path.clone(), sound };
            blocks.insert(raw.name.text.clone(), block);
        }
    }
    blocks
}

fn check_block(kind: &'static BlockKind, raw: &MeasurementBlock, complaints: &mut Complaints) -> bool {
    let mut found = Complaints::default();
    let mut body = raw.body.clone();
    // What a block lacks is said at its opening line.
    body.place = Place { end: raw.name.place.end, ..raw.place };
    check_fields(&body, kind.fields, &format!("the {} {}", kind.name, raw.name.text), &mut found);
    if !found.has_faults() {
        (kind.check)(Fields { node: &raw.body }, &mut found);
    }
    let sound = !found.has_faults();
    complaints.extend(found);
    sound
}

fn record_date(record: &Record, complaints: &mut Complaints) -> Option<NaiveDate> {
    let node = record.front.as_ref()?.get("date")?;
    complaints.keep(parse_date(node.as_text().unwrap_or_default()), node.place)
}

fn unknown_kind(found: &str) -> Problem {
    let problem = Problem::new(Code::KindUnknown, format!("No kind of measurement block is called {found}."));
    match nearest(found, KINDS.iter().map(|kind| kind.name)) {
        Some(near) => problem.hint(format!("Did you mean {near}?")),
        None => problem
            .hint(format!("The kinds are {}.", KINDS.iter().map(|kind| kind.name).collect::<Vec<_>>().join(", "))),
    }
}

/// The path of `named` seen from the folder of `beside`, without leaving the laboratory folder.
///
/// # Errors
/// `path_outside`.
pub fn resolve(named: &str, beside: &str) -> Result<String, Problem> {
    let outside = || {
        Problem::new(Code::PathOutside, format!("The path {named} leaves the laboratory folder."))
            .hint("Put the file into the campaign's folder and name it from there.")
    };
    if named.starts_with('/') || named.contains('\\') || named.contains(':') {
        return Err(outside());
    }
    let mut parts: Vec<&str> = beside.split('/').collect();
    parts.pop();
    for part in named.split('/') {
        match part {
            "" | "." => {}
            ".." => {
                parts.pop().ok_or_else(outside)?;
            }
            part => parts.push(part),
        }
    }
    Ok(parts.join("/"))
}

fn missing(named: &str, path: &str, error: &IntakeError, intake: &dyn Intake) -> Problem {
    let code = if matches!(error, IntakeError::Outside(_)) { Code::PathOutside } else { Code::FileMissing };
    let problem = Problem::new(code, format!("The file {named} cannot be read: {error}."));
    let files = intake.list().unwrap_or_default();
    match nearest(path, files.iter().map(String::as_str)) {
        Some(near) if near != path => problem.hint(format!("Did you mean {near}?")),
        _ => problem.hint("The path counts from the folder of the record."),
    }
}
