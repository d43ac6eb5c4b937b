//! What `laboratory.md` settles for every campaign.

use super::field::{Field, Shape, check_fields, needed, optional};
use super::fields::Fields;
use super::given::Given;
use crate::diagnostic::{Code, Complaints, Problem};
use crate::graph::{DegreesOfFreedomRule, Settings};
use crate::quantity::{Kind, Style};
use crate::record::Record;

const BASIS_FIELDS: &[Field] = &[
    needed("id", Shape::Text, "the name used as `basis:` of a mass"),
    needed("label", Shape::Text, "the basis in words"),
];

const FIELDS: &[Field] = &[
    needed("format", Shape::Number, "the format of the records, 1"),
    needed("name", Shape::Text, "the laboratory's name"),
    needed("address", Shape::Text, "the laboratory's address"),
    optional(
        "coverage_probability",
        Shape::AnyValue,
        "coverage probability of expanded uncertainties, such as 95.45 %",
    ),
    optional("decimal_marker", Shape::Choice(&["point", "comma"]), "decimal marker in reports"),
    optional(
        "degrees_of_freedom",
        Shape::Choice(&["truncated", "as computed"]),
        "how effective degrees of freedom enter the coverage factor",
    ),
    optional("number_prefix", Shape::Text, "what stands before the number of an issued report, such as NI-"),
    optional(
        "performer_may_authorise",
        Shape::Choice(&["yes", "no"]),
        "whether who performed the work may review or authorise the report; no unless stated",
    ),
    optional("trials", Shape::Number, "number of Monte Carlo trials where a report asks for them"),
    optional("unit_bases", Shape::Mappings(BASIS_FIELDS), "the unit bases masses may refer to"),
];

/// The laboratory and its settings.
#[derive(Debug, Clone, PartialEq)]
pub struct Laboratory {
    pub name: String,
    pub address: String,
    pub settings: Settings,
    pub style: Style,
    /// Monte Carlo trials where a report asks for them.
    pub trials: usize,
    /// What stands before the number of an issued report.
    pub number_prefix: String,
    /// Whether who performed the work may also review or authorise the report.
    pub performer_may_authorise: bool,
    /// Name and label of each unit basis.
    pub unit_bases: Vec<(String, String)>,
    /// Values used that `laboratory.md` does not state.
    pub assumed: Vec<String>,
}

/// Trials where the laboratory states no number.
const DEFAULT_TRIALS: usize = 200_000;

impl Default for Laboratory {
    fn default() -> Self {
        Self {
            name: String::new(),
            address: String::new(),
            settings: Settings::new(0.9545, DegreesOfFreedomRule::Truncated),
            style: Style::POINT,
            trials: DEFAULT_TRIALS,
            number_prefix: String::new(),
            performer_may_authorise: false,
            unit_bases: Vec::new(),
            assumed: Vec::new(),
        }
    }
}

impl Laboratory {
    /// Reads the front matter of `laboratory.md`.
    pub fn read(record: &Record, complaints: &mut Complaints) -> Laboratory {
        let Some(front) = &record.front else {
            let problem = Problem::new(
                Code::RecordUnreadable,
                "laboratory.md has no front matter, so the laboratory has no name.",
            );
            complaints.add_at(
                problem.hint("Begin the file with `---`, `format: 1`, `name:`, `address:`, `---`."),
                record.body,
            );
            return Laboratory::default();
        };
        check_fields(front, FIELDS, "laboratory.md", complaints);
        let fields = Fields { node: front };
        if let Some(format) = fields.number("format").filter(|format| *format != 1.0) {
            let message = format!("These records are in format {format}; this program reads format 1.");
            complaints.add_at(
                Problem::new(Code::FormatUnsupported, message)
                    .hint("Use the version of the program the folder was written for."),
                fields.place_of("format"),
            );
        }
        let mut laboratory =
            Laboratory { name: fields.words("name"), address: fields.words("address"), ..Laboratory::default() };
        laboratory.take_settings(fields, complaints);
        laboratory.take_rules(fields, complaints);
        laboratory
    }

    fn take_settings(&mut self, fields: Fields<'_>, complaints: &mut Complaints) {
        let rule = match fields.words("degrees_of_freedom").as_str() {
            "as computed" => DegreesOfFreedomRule::AsComputed,
            stated => {
                if stated.is_empty() {
                    self.assumed.push(
                        "effective degrees of freedom are truncated to a whole number for the coverage factor".into(),
                    );
                }
                DegreesOfFreedomRule::Truncated
            }
        };
        let probability = match fields.given("coverage_probability", Kind::Plain) {
            Some(Given::Stated { value, place }) if !(0.5..1.0).contains(&value.value) => {
                let message = format!("A coverage probability of {} is not between 50 % and 100 %.", value.text);
                complaints.add_at(Problem::new(Code::OutOfRange, message), place);
                0.9545
            }
            Some(Given::Stated { value, .. }) => value.value,
            _ => {
                self.assumed.push("coverage probability 95.45 %".into());
                0.9545
            }
        };
        self.settings = Settings::new(probability, rule);
        self.style = if fields.words("decimal_marker") == "comma" { Style::COMMA } else { Style::POINT };
        if let Some(trials) = fields.number("trials") {
            if !(1e4..=1e8).contains(&trials) || trials.fract() != 0.0 {
                let message = format!("{trials} Monte Carlo trials are not a whole number from 10 000 to 100 000 000.");
                complaints.add_at(Problem::new(Code::OutOfRange, message), fields.place_of("trials"));
            } else {
                self.trials = trials as usize;
            }
        }
        self.unit_bases =
            fields.mappings("unit_bases").iter().map(|basis| (basis.words("id"), basis.words("label"))).collect();
    }

    fn take_rules(&mut self, fields: Fields<'_>, complaints: &mut Complaints) {
        self.performer_may_authorise = fields.words("performer_may_authorise") == "yes";
        let prefix = fields.words("number_prefix");
        let fits = |c: char| c.is_ascii_alphanumeric() || matches!(c, '-' | '_');
        if prefix.chars().all(fits) && prefix.len() <= 24 {
            self.number_prefix = prefix;
        } else {
            let message = format!("“{prefix}” cannot stand before a report number.");
            let problem = Problem::new(Code::NameInvalid, message);
            let hint = "At most 24 letters, digits, hyphens and underscores: the number is also the name of a file.";
            complaints.add_at(problem.hint(hint), fields.place_of("number_prefix"));
        }
    }

    /// The label of a unit basis; its name where it has none.
    pub fn basis_label<'a>(&'a self, id: &'a str) -> &'a str {
        self.unit_bases.iter().find(|(known, _)| known == id).map_or(id, |(_, label)| label)
    }
}
