//! `start`: a laboratory folder, or a campaign inside one, to begin with.

use super::disk::{today, write_whole};
use super::folder::Folder;
use super::{Outcome, Stopped, terminal};
use crate::block::{Block, Engine};
use chrono::{Days, NaiveDate};
use serde::Serialize;
use std::path::{Path, PathBuf};

/// Writes a laboratory folder with a small complete example: a standard, instruments, a weighing and its report, dated
/// today. The records say in a sentence what each field means; put your own values in their place.
///
/// With --campaign, writes one more campaign into an existing laboratory folder, weighing with the standard and the
/// instruments it has. Nothing that exists is ever written over.
#[derive(Debug, clap::Args)]
pub struct Start {
    /// The folder to write; with --campaign, the laboratory folder (default: the one you are in)
    #[arg(required_unless_present = "campaign")]
    folder: Option<PathBuf>,
    /// Write a campaign of this name into an existing laboratory folder
    #[arg(long, value_name = "NAME")]
    campaign: Option<String>,
}

impl Start {
    /// Runs the command.
    pub fn run(self) -> Result<Outcome, Stopped> {
        let folder = self.folder.unwrap_or_else(|| PathBuf::from("."));
        match self.campaign {
            Some(name) => start_campaign(&folder, &name),
            None => start_laboratory(&folder),
        }
    }
}

fn start_laboratory(root: &Path) -> Result<Outcome, Stopped> {
    refuse_inside_a_laboratory(root)?;
    let words = Words::of_example(today());
    let mut sheets = campaign_sheets("first", &words)?;
    sheets.extend(shared_sheets(&words)?);
    write_all(root, &sheets)?;
    let shown = root.display();
    terminal::print(&format!(
        "A laboratory folder to begin with:\n{}\nNext:\n  libripens examine {shown}\n  libripens reduce {shown}\n  libripens report {shown}/campaigns/first/report.md\n",
        list(root, &sheets)
    ));
    Ok(Outcome::AllWell)
}

fn start_campaign(place: &Path, name: &str) -> Result<Outcome, Stopped> {
    let plain = |c: char| c.is_ascii_alphanumeric() || c == '-' || c == '_';
    if name.is_empty() || !name.chars().all(plain) {
        return Err(Stopped(format!(
            "a campaign cannot be called {name:?}: its folder's name is made of letters, digits, - and _"
        )));
    }
    let folder = Folder::find(place)?;
    if folder.root.join("campaigns").join(name).symlink_metadata().is_ok() {
        return Err(Stopped(format!("there is a campaign {name} already; nothing was written")));
    }
    let engine = Engine::read(&folder.disk, None).map_err(Stopped::because)?;
    let words = Words::of_laboratory(&engine, today())?;
    let sheets = campaign_sheets(name, &words)?;
    write_all(&folder.root, &sheets)?;
    terminal::print(&format!(
        "A campaign to begin with; its indications and conditions are an example, put your own in their place:\n{}\nNext:\n  libripens examine {}\n",
        list(&folder.root, &sheets),
        folder.root.join("campaigns").join(name).display()
    ));
    Ok(Outcome::AllWell)
}

fn refuse_inside_a_laboratory(root: &Path) -> Result<(), Stopped> {
    if root.join("laboratory.md").symlink_metadata().is_ok() {
        return Err(Stopped(format!(
            "{} is a laboratory folder already; nothing was written (--campaign NAME adds a campaign to it)",
            root.display()
        )));
    }
    let full = std::path::absolute(root).map_err(Stopped::because)?;
    match full.ancestors().skip(1).find(|folder| folder.join("laboratory.md").is_file()) {
        Some(outer) => Err(Stopped(format!(
            "{} lies inside the laboratory folder {}; nothing was written",
            root.display(),
            outer.display()
        ))),
        None => Ok(()),
    }
}

/// What the example calls things, and its dates.
struct Words {
    today: NaiveDate,
    /// The number that makes the campaign's names unique.
    number: usize,
    standard: String,
    nominal: String,
    has_height: bool,
    comparator: String,
    thermometer: String,
    barometer: String,
    hygrometer: String,
}

impl Words {
    fn of_example(today: NaiveDate) -> Words {
        Words {
            today,
            number: 1,
            standard: "K1".into(),
            nominal: "1 kg".into(),
            has_height: true,
            comparator: "M1".into(),
            thermometer: "T1".into(),
            barometer: "B1".into(),
            hygrometer: "H1".into(),
        }
    }

    /// The names of the first standard, comparator and instruments of an existing laboratory folder.
    fn of_laboratory(engine: &Engine, today: NaiveDate) -> Result<Words, Stopped> {
        let first = |kind: &str, measures: &str| -> Result<&Block, Stopped> {
            let fits = |block: &&Block| block.kind.name == kind && block.fields().words("measures") == measures;
            let words = if measures.is_empty() { kind.to_string() } else { format!("instrument for {measures}") };
            engine.blocks().values().find(fits).ok_or_else(|| {
                Stopped(format!("the laboratory folder has no {words} for a campaign to weigh with; enter it first, nothing was written"))
            })
        };
        let standard = first("mass-standard", "")?;
        Ok(Words {
            today,
            number: free_number(engine),
            standard: standard.name().into(),
            nominal: standard.fields().words("nominal"),
            has_height: standard.fields().get("mass_centre_height").is_some(),
            comparator: first("comparator", "")?.name().into(),
            thermometer: first("instrument", "temperature")?.name().into(),
            barometer: first("instrument", "pressure")?.name().into(),
            hygrometer: first("instrument", "humidity")?.name().into(),
        })
    }

    fn campaign_names(number: usize) -> [String; 4] {
        ["CLIENT", "S", "A", "W"].map(|letter| format!("{letter}{number}"))
    }

    fn days_ago(&self, days: u64) -> NaiveDate {
        self.today.checked_sub_days(Days::new(days)).unwrap_or(self.today)
    }

    fn days_ahead(&self, days: u64) -> NaiveDate {
        self.today.checked_add_days(Days::new(days)).unwrap_or(self.today)
    }

    /// A template with every word in its place.
    fn fill(&self, template: &str) -> String {
        let [client, item, ambient, comparison] = Words::campaign_names(self.number);
        let height = if self.has_height { "mass_centre_height: 27.@DIGIT@(10) mm\n" } else { "" };
        let words = [
            ("@HEIGHT@", height.into()),
            // Two campaigns with the very same values would rightly be asked whether these are one input or two.
            ("@DIGIT@", ((self.number - 1) % 10).to_string()),
            ("@LABORATORY@", LABORATORY_NAME.to_string()),
            ("@TODAY@", self.today.to_string()),
            ("@BEFORE@", self.days_ago(7).to_string()),
            ("@CERTIFIED@", self.days_ago(60).to_string()),
            ("@INSTRUMENT_DUE@", self.days_ahead(305).to_string()),
            ("@STANDARD_DUE@", self.days_ahead(670).to_string()),
            ("@LONG_AGO@", self.days_ago(365).to_string()),
            ("@NUMBER@", self.number.to_string()),
            ("@CLIENT@", client),
            ("@ITEM@", item),
            ("@AMBIENT@", ambient),
            ("@COMPARISON@", comparison),
            ("@STANDARD@", self.standard.clone()),
            ("@NOMINAL@", self.nominal.clone()),
            ("@COMPARATOR@", self.comparator.clone()),
            ("@THERMOMETER@", self.thermometer.clone()),
            ("@BAROMETER@", self.barometer.clone()),
            ("@HYGROMETER@", self.hygrometer.clone()),
        ];
        words.iter().fold(template.to_string(), |text, (word, meaning)| text.replace(word, meaning))
    }
}

/// The smallest number that leaves every name of a new campaign free.
fn free_number(engine: &Engine) -> usize {
    let taken = |number: &usize| Words::campaign_names(*number).iter().any(|name| engine.blocks().contains_key(name));
    (1..).find(|number| !taken(number)).unwrap_or(1)
}

const LABORATORY_NAME: &str = "Name of the laboratory";

#[derive(Serialize)]
struct LaboratoryFront {
    format: u32,
    name: &'static str,
    address: &'static str,
    coverage_probability: &'static str,
    decimal_marker: &'static str,
    degrees_of_freedom: &'static str,
    unit_bases: Vec<UnitBasis>,
}

#[derive(Serialize)]
struct UnitBasis {
    id: &'static str,
    label: &'static str,
}

#[derive(Serialize)]
struct RecordFront {
    record: String,
    date: NaiveDate,
    performed_by: &'static str,
    #[serde(skip_serializing_if = "Option::is_none")]
    report: Option<ReportFront>,
}

#[derive(Serialize)]
struct ReportFront {
    title: &'static str,
    customer: String,
    items: Vec<String>,
    place: &'static str,
    method: MethodFront,
    deviations: &'static str,
    results: Vec<String>,
    performed_by: &'static str,
    reviewed_by: &'static str,
    authorised_by: &'static str,
}

#[derive(Serialize)]
struct MethodFront {
    id: &'static str,
    revision: &'static str,
}

/// One file to be written: its path seen from the root, and its text.
type Sheet = (String, String);

fn sheet(path: &str, front: &impl Serialize, body: &str, words: &Words) -> Result<Sheet, Stopped> {
    let front = serde_yaml::to_string(front).map_err(Stopped::because)?;
    Ok((path.into(), format!("---\n{front}---\n\n{}", words.fill(body))))
}

fn record_sheet(path: &str, record: &str, body: &str, words: &Words) -> Result<Sheet, Stopped> {
    let front =
        RecordFront { record: record.into(), date: words.today, performed_by: "duty metrologist", report: None };
    sheet(path, &front, body, words)
}

/// What all campaigns share; `laboratory.md` last, for it makes the folder a laboratory folder.
fn shared_sheets(words: &Words) -> Result<Vec<Sheet>, Stopped> {
    let front = LaboratoryFront {
        format: 1,
        name: LABORATORY_NAME,
        address: "Street, town",
        coverage_probability: "95.45 %",
        decimal_marker: "point",
        degrees_of_freedom: "truncated",
        unit_bases: vec![UnitBasis {
            id: "consensus_1",
            label: "consensus value of the kilogram named in the certificate",
        }],
    };
    Ok(vec![
        record_sheet("standards/k1.md", "STD-K1", include_str!("scaffold/standard.md"), words)?,
        record_sheet("instruments/m1.md", "INS-M1", include_str!("scaffold/comparator.md"), words)?,
        record_sheet("instruments/room.md", "INS-ROOM", include_str!("scaffold/instruments.md"), words)?,
        record_sheet("people-and-rules.md", "LAB-01", include_str!("scaffold/people-and-rules.md"), words)?,
        sheet("laboratory.md", &front, include_str!("scaffold/laboratory.md"), words)?,
    ])
}

fn campaign_sheets(name: &str, words: &Words) -> Result<Vec<Sheet>, Stopped> {
    let path = |file: &str| format!("campaigns/{name}/{file}");
    let record = |number: u32| format!("{name}-{number:02}");
    let report = RecordFront {
        record: record(3),
        date: words.today,
        performed_by: "duty metrologist",
        report: Some(report_front(words)),
    };
    Ok(vec![
        record_sheet(&path("order.md"), &record(1), include_str!("scaffold/order.md"), words)?,
        record_sheet(&path("weighing.md"), &record(2), include_str!("scaffold/weighing.md"), words)?,
        sheet(&path("report.md"), &report, include_str!("scaffold/report.md"), words)?,
    ])
}

fn report_front(words: &Words) -> ReportFront {
    let [client, item, _, comparison] = Words::campaign_names(words.number);
    ReportFront {
        title: "Calibration of a mass standard",
        customer: client,
        items: vec![item],
        place: "Place of the weighing",
        method: MethodFront { id: "Name of the procedure", revision: "1" },
        deviations: "none",
        results: ["mass", "conventional_mass"].map(|result| format!("{comparison}.{result}")).to_vec(),
        performed_by: "duty metrologist",
        reviewed_by: "second metrologist",
        authorised_by: "technical manager",
    }
}

/// Writes every sheet or none: what exists is refused before anything is written, and a failure takes back what was.
fn write_all(root: &Path, sheets: &[Sheet]) -> Result<(), Stopped> {
    for (path, _) in sheets {
        let full = root.join(path);
        if full.symlink_metadata().is_ok() {
            return Err(Stopped(format!("{} exists already; nothing was written", full.display())));
        }
    }
    let mut written: Vec<PathBuf> = Vec::new();
    for (path, text) in sheets {
        let full = root.join(path);
        if let Err(stopped) = write_one(&full, text) {
            for file in written {
                let _ = std::fs::remove_file(file);
            }
            return Err(stopped);
        }
        written.push(full);
    }
    Ok(())
}

fn write_one(path: &Path, text: &str) -> Result<(), Stopped> {
    if let Some(folder) = path.parent() {
        std::fs::create_dir_all(folder)
            .map_err(|error| Stopped(format!("the folder {} cannot be made: {error}", folder.display())))?;
    }
    write_whole(path, text.as_bytes())
}

fn list(root: &Path, sheets: &[Sheet]) -> String {
    sheets.iter().map(|(path, _)| format!("  {}\n", root.join(path).display())).collect()
}
