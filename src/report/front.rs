//! The front matter of a report record, and the particulars it puts on the first page.

use super::change::statement_of_change;
use super::dossier::{Dossier, short_seal};
use super::issue::{Clock, Duty, Issue, ReportKind, Witness, day_of};
use super::markup::Markup;
use super::page::{Page, Signature};
use super::parts;
use super::prose_text::dress;
use crate::block::field::{Field, Shape, check_fields, needed, optional};
use crate::block::realization::MeasuredAt;
use crate::block::{Block, Engine, Fields};
use crate::diagnostic::Complaints;
use crate::graph::NodeId;
use crate::intake::Place;
use crate::record::{Record, Text};
use chrono::{DateTime, NaiveDate};

const METHOD_FIELDS: &[Field] =
    &[needed("id", Shape::Text, "the procedure"), needed("revision", Shape::Text, "its revision")];

const CONTENT_FIELDS: &[Field] = &[
    needed("content", Shape::Choice(&["customer", "items", "condition", "adjusted"]), "what is left out"),
    needed("reason", Shape::Text, "why"),
];

const RUN_FIELDS: &[Field] = &[
    needed("run", Shape::Name, "the run"),
    optional("rule", Shape::Name, "the rule it is left out by"),
    needed("reason", Shape::Text, "why"),
];

const REPORT_FIELDS: &[Field] = &[
    needed("title", Shape::Text, "the title of the report"),
    optional("customer", Shape::Name, "the customer block of the client"),
    optional("items", Shape::Names, "the items calibrated"),
    needed("place", Shape::Text, "where the work was done"),
    needed("method", Shape::Mapping(METHOD_FIELDS), "the procedure with its revision"),
    needed("deviations", Shape::Text, "deviations from the method, or none"),
    needed("results", Shape::Results, "the results the report states"),
    needed("performed_by", Shape::Text, "who did the work, by role"),
    optional("reviewed_by", Shape::Text, "who reviews, by role"),
    optional("authorised_by", Shape::Text, "who authorises, by role"),
    optional("content_left_out", Shape::Mappings(CONTENT_FIELDS), "content the report lacks, with the reason"),
    optional(
        "runs_left_out",
        Shape::Mappings(RUN_FIELDS),
        "runs of the same items the report does not use, with the reason",
    ),
];

const RECORD_FIELDS: &[Field] = &[
    needed("record", Shape::Text, "the record's own identification"),
    needed("date", Shape::Date, "the date of the record"),
    optional("performed_by", Shape::Text, "who wrote it, by role"),
    needed("report", Shape::Mapping(REPORT_FIELDS), "what makes the record a report"),
];

/// The front matter of a report.
pub struct Front {
    pub title: String,
    pub date: NaiveDate,
    pub results: Vec<Text>,
    pub place: Place,
    location: String,
    method: String,
    deviations: String,
    customer: Option<Text>,
    items: Vec<Text>,
    duties: Vec<(&'static str, String)>,
}

impl Front {
    /// Reads the front matter; what is missing is complained of.
    pub fn read(engine: &Engine, record: &Record) -> Option<Front> {
        let node = record.front.as_ref()?;
        let mut complaints = Complaints::default();
        check_fields(node, RECORD_FIELDS, "the report", &mut complaints);
        engine.complain_all(complaints);
        let fields = Fields { node };
        let report = fields.mapping("report")?;
        let method = report.mapping("method");
        let duties =
            [("Performed by", "performed_by"), ("Reviewed by", "reviewed_by"), ("Authorised by", "authorised_by")];
        Some(Front {
            title: report.words("title"),
            date: fields.date("date")?,
            results: report.texts("results"),
            place: report.place_of("title"),
            location: report.words("place"),
            method: method.map_or_else(String::new, |method| {
                format!("{}, revision {}", method.words("id"), method.words("revision"))
            }),
            deviations: report.words("deviations"),
            customer: report.text("customer"),
            items: report.texts("items"),
            duties: duties
                .iter()
                .filter(|(_, field)| report.get(field).is_some())
                .map(|(duty, field)| (*duty, report.words(field)))
                .collect(),
        })
    }

    /// The page of this report with its body.
    pub fn page(
        &self,
        engine: &Engine,
        body: Markup,
        results: &[NodeId],
        dossier: &Dossier,
        issue: Option<&Issue>,
    ) -> Page {
        Page {
            language: "en".into(),
            title: self.full_title(issue),
            laboratory_name: engine.laboratory.name.clone(),
            laboratory_address: engine.laboratory.address.split(',').map(|line| line.trim().to_string()).collect(),
            draft: issue.is_none(),
            number: issue.map(|issue| issue.number.clone()),
            seal: short_seal(&dossier.seal),
            particulars: self.particulars(engine, issue),
            body: full_body(body, issue),
            statements: statements(issue),
            signatures: self.duties.iter().map(|(duty, person)| signature(duty, person, issue)).collect(),
            annex: Some(annex(engine, results, dossier)),
        }
    }

    /// The title, which names what an amendment amends.
    fn full_title(&self, issue: Option<&Issue>) -> String {
        match issue.map(|issue| (issue.kind, issue.of.as_deref())) {
            Some((ReportKind::Amendment, Some(of))) => format!("Amendment to report {of}: {}", self.title),
            _ => self.title.clone(),
        }
    }

    fn particulars(&self, engine: &Engine, issue: Option<&Issue>) -> Vec<(String, Markup)> {
        let mut rows: Vec<(String, Markup)> = Vec::new();
        let mut add = |label: &str, text: String| {
            if !text.is_empty() {
                rows.push((label.into(), Markup::text(&text)));
            }
        };
        if let Some(customer) = self.customer.as_ref().and_then(|name| engine.block(name, &["customer"])) {
            let fields = customer.fields();
            let contact = fields.words("contact");
            let contact = if contact.is_empty() { contact } else { format!(" ({contact})") };
            add("Customer", format!("{}, {}{contact}", fields.words("name"), fields.words("address")));
        }
        for item in self.items.iter().filter_map(|name| engine.block(name, &["item", "mass-standard"])) {
            add("Item", item_words(engine, item));
            add("Condition on receipt", condition_words(item));
        }
        add("Date(s) of calibration", calibration_dates(engine));
        add("Place of calibration", self.location.clone());
        add("Method", self.method.clone());
        add("Deviations from the method", self.deviations.clone());
        add("Date of the record", long_date(self.date));
        if let Some(issue) = issue {
            add("Date of issue", issue.day().map(long_date).unwrap_or_default());
            add("Issued by", issue.issued_by.clone());
            let of = issue.of.clone().unwrap_or_default();
            match issue.kind {
                ReportKind::Original => {}
                ReportKind::Amendment => add("Amendment to", format!("report {of}, valid only together with it")),
                ReportKind::Replacement => add("Replaces", format!("report {of}")),
            }
        }
        rows
    }
}

/// An amendment states what changed alone; a replacement states it before the whole.
fn full_body(body: Markup, issue: Option<&Issue>) -> Markup {
    let Some(issue) = issue else { return body };
    let (Some(change), Some(of)) = (&issue.change, &issue.of) else { return body };
    let mut made = statement_of_change(change, of);
    if issue.kind == ReportKind::Replacement {
        made.push(&body);
    }
    made
}

/// One field of the area of authorisation: of an issued report with who did it and when.
fn signature(duty: &str, person: &str, issue: Option<&Issue>) -> Signature {
    let wanted = match duty {
        "Reviewed by" => Some(Duty::Review),
        "Authorised by" => Some(Duty::Authorisation),
        _ => None,
    };
    let done = issue.and_then(|issue| issue.authorisations.iter().find(|one| Some(one.duty) == wanted));
    Signature {
        duty: duty.into(),
        person: done.map_or_else(|| person.to_string(), |one| one.who.clone()),
        date: done.and_then(|one| day_of(&one.time)).map(long_date).unwrap_or_default(),
    }
}

fn item_words(engine: &Engine, item: &Block) -> String {
    let fields = item.fields();
    let nominal = dress(&fields.words("nominal"), engine.laboratory.style);
    let mut words = vec![format!(
        "{}, nominal value {nominal}",
        fields.text("identification").map_or_else(|| item.label(), |text| text.text)
    )];
    for (name, lead) in [("material", ""), ("maker", "maker: "), ("class", "class ")] {
        let text = fields.words(name);
        if !text.is_empty() {
            words.push(format!("{lead}{text}"));
        }
    }
    words.join("; ")
}

fn condition_words(item: &Block) -> String {
    let fields = item.fields();
    let mut words = Vec::new();
    if let Some(received) = fields.date("received") {
        words.push(format!("{}: received {}", item.label(), long_date(received)));
    }
    let mut add = |text: String| {
        if !text.is_empty() {
            words.push(text.trim_end_matches('.').to_string());
        }
    };
    add(fields.words("condition"));
    match fields.words("adjusted").as_str() {
        "" => {}
        "no" => add("not adjusted".into()),
        done => add(format!("adjusted: {done}")),
    }
    let supplied =
        fields.texts("supplied_by_customer").into_iter().map(|text| text.text.replace('_', " ")).collect::<Vec<_>>();
    if !supplied.is_empty() {
        add(format!("supplied by the customer: {}", supplied.join(", ")));
    }
    words.join("; ")
}

/// First and last day of the weighings used.
pub fn calibration_span(engine: &Engine) -> Option<(NaiveDate, NaiveDate)> {
    let used = engine.used_blocks();
    let weighings = used.iter().filter_map(|name| engine.weighing(name));
    let runs = used.iter().filter_map(|name| engine.found::<MeasuredAt>(name));
    let times: Vec<f64> = weighings
        .flat_map(|comparison| comparison.weighings.iter().map(|weighing| weighing.time).collect::<Vec<_>>())
        .chain(runs.flat_map(|run| [run.start, run.end]))
        .collect();
    let (first, last) =
        (times.iter().copied().fold(f64::INFINITY, f64::min), times.iter().copied().fold(f64::NEG_INFINITY, f64::max));
    let day = |time: f64| DateTime::from_timestamp(time as i64, 0).map(|at| at.date_naive());
    if times.is_empty() { None } else { day(first).zip(day(last)) }
}

fn calibration_dates(engine: &Engine) -> String {
    match calibration_span(engine) {
        Some((first, last)) if first == last => long_date(first),
        Some((first, last)) => format!("{} to {}", long_date(first), long_date(last)),
        None => String::new(),
    }
}

/// A date as `14 May 2041`.
pub fn long_date(date: NaiveDate) -> String {
    date.format("%-d %B %Y").to_string()
}

/// Statements that every report carries.
fn statements(issue: Option<&Issue>) -> Vec<Markup> {
    let always = [
        "The results relate only to the items named above, in the condition in which they were calibrated. This report may be reproduced only in full unless the laboratory agrees in writing.",
        "Everything this report rests on is attached to this file. The seal on each page is the beginning of the SHA-256 digest of the attached list of contents, contents.json. The command libripens audit re-computes every result from the attached readings and sets the pages anew.",
    ];
    always
        .iter()
        .map(|text| Markup::text(text))
        .chain(issue.map(|issue| Markup::text(&register_words(issue))))
        .collect()
}

/// What an issued report says of the register.
fn register_words(issue: &Issue) -> String {
    let clock = match issue.clock {
        Clock::System => "",
        Clock::Set => " The clock of the register was set by hand.",
    };
    let Witness { size, head } = &issue.register;
    format!(
        "Whether this report still holds, or was amended, replaced or withdrawn, the laboratory says on being told its number, {}, and the day. When it was issued the register of the laboratory had {size} entries with the head {head}; a register that no longer has this head was changed afterwards.{clock}",
        issue.number
    )
}

/// Symbols and attached files.
fn annex(engine: &Engine, results: &[NodeId], dossier: &Dossier) -> Markup {
    let mut made = Markup::code("= Annex\n\n== Symbols\n\n");
    made.push(&parts::annex::symbols_table(engine, results));
    if let Some(table) = parts::annex::corrections_table(engine) {
        made.push_code("== Corrections\n\n");
        made.push(&table);
    }
    made.push_code("== Attached files\n\n");
    made.push(&parts::annex::files_table(engine, dossier));
    made
}
