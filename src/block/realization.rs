//! The result of a campaign: determinations of one artefact by a primary method, combined.

use super::engine::{Block, Engine, shorten};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::weight::Weight;
use super::{BlockKind, Output};
use crate::diagnostic::{Code, Complaints, Problem};
use crate::graph::{Basis, Quantity, Sensitivities, sensitivities, standard_uncertainty, unshared_variances};
use crate::intake::Place;
use crate::method::campaign_mean::{self, Between, CampaignMean};
use crate::method::statistic::{Statistic, brief};
use crate::method::{consistency, unit};
use crate::quantity::{Dimension, Kind, print_standard};
use crate::record::Text;
use std::sync::Arc;

const EXCLUDED_FIELDS: &[Field] = &[
    needed("result", Shape::Text, "the result left out, such as D7.mass"),
    optional("rule", Shape::Name, "the rule it was left out by"),
    optional("reason", Shape::Text, "why, in words"),
];

const METHOD_FIELDS: &[Field] = &[
    needed("primary", Shape::Choice(&["Kibble balance", "X-ray crystal density"]), "the primary method"),
    optional("description", Shape::Text, "where the apparatus and its budget are described, reviewed by peers"),
    optional("stability", Shape::Text, "the evidence of long-term stability"),
];

const MEASURAND_FIELDS: &[Field] = &[
    needed("state", Shape::Choice(&["vacuum", "air"]), "what surrounds the artefact"),
    optional("temperature", Shape::Value(Kind::Temperature), "the temperature the result holds at"),
    optional("pressure", Shape::Value(Kind::Pressure), "the pressure it was realized at"),
    optional("after", Shape::Text, "time after cleaning or pumping down"),
];

const EVENT_FIELDS: &[Field] =
    &[needed("date", Shape::Date, "the day"), needed("event", Shape::Text, "cleaning, transport, change of pressure")];

const CHECK_FIELDS: &[Field] = &[
    needed("check", Shape::Text, "what was checked"),
    needed("date", Shape::Date, "the day of the check"),
    optional("due", Shape::Date, "the day until which it holds"),
    needed("found", Shape::Text, "what was found"),
];

const EARLIER_FIELDS: &[Field] = &[
    needed("mass", Shape::Value(Kind::Mass), "the earlier result of the same experiment"),
    needed("date", Shape::Date, "its date"),
    needed("correlation", Shape::Number, "its correlation coefficient with the present result"),
    optional("source", Shape::Text, "where it was reported"),
];

const DISSEMINATION_FIELDS: &[Field] = &[
    needed("basis", Shape::Text, "the unit basis used for dissemination"),
    needed("shift", Shape::Value(Kind::MassDifference), "value on that basis less the realized value"),
    optional("source", Shape::Text, "where the basis is laid down"),
];

const DRIFT_FIELDS: &[Field] = &[
    needed("to", Shape::Date, "the day the standard is used"),
    needed("change", Shape::Value(Kind::MassDifference), "its change since the realization"),
    optional("source", Shape::Text, "what the change rests on"),
];

const BLIND_FIELDS: &[Field] = &[
    needed("held_by", Shape::Text, "who held the offset, by role"),
    needed("opened", Shape::Date, "the day it was opened"),
    needed("changed_afterwards", Shape::Text, "what was changed afterwards, or nothing"),
];

const SUBMITTED_FIELDS: &[Field] = &[
    needed("date", Shape::Date, "the day the value was handed in"),
    needed("mass", Shape::Value(Kind::Mass), "the value as handed in, with its standard uncertainty"),
    optional("to", Shape::Text, "to whom, by role"),
];

const LEFT_OUT_FIELDS: &[Field] = &[
    needed("row", Shape::Text, "the row of the list of contents, such as R19"),
    needed("reason", Shape::Text, "why it does not apply"),
];

const INDEPENDENT_FIELDS: &[Field] = &[
    needed("mass", Shape::Value(Kind::Mass), "the mass of the artefact from another source"),
    optional("source", Shape::Text, "where it comes from"),
];

/// The result of a campaign.
pub static KIND: BlockKind = BlockKind {
    name: "realization",
    meaning: "determinations of one artefact by a primary method, combined into the result of a campaign",
    fields: &[
        optional("label", Shape::Text, "what is printed for it"),
        needed("artefact", Shape::Name, "the mass standard"),
        needed("determinations", Shape::Results, "every result of the campaign, such as D1.mass"),
        optional("excluded", Shape::Mappings(EXCLUDED_FIELDS), "results left out, with rule and reason"),
        needed(
            "combination",
            Shape::Choice(&["equal weights", "own uncertainties", "Paule-Mandel", "DerSimonian-Laird"]),
            "how the determinations are weighted",
        ),
        optional("rejection_rule", Shape::Name, "the rule for leaving out runs, dated before them"),
        needed("method", Shape::Mapping(METHOD_FIELDS), "the primary method"),
        needed("measurand", Shape::Mapping(MEASURAND_FIELDS), "the conditions the result holds under"),
        optional("basis", Shape::Text, "the name of the unit basis of the result; own realization unless written"),
        optional("auxiliary", Shape::Results, "inputs of the kind mass that are no reference, such as a tare"),
        optional("history", Shape::Mappings(EVENT_FIELDS), "what happened to the artefact"),
        optional("maintenance", Shape::Mappings(CHECK_FIELDS), "checks between realizations"),
        optional("independent_mass", Shape::Mapping(INDEPENDENT_FIELDS), "for the consistency of h"),
        optional("earlier_result", Shape::Mapping(EARLIER_FIELDS), "the result of the realization before"),
        optional("drift", Shape::Mapping(DRIFT_FIELDS), "change of the standard between realization and use"),
        optional("dissemination", Shape::Mapping(DISSEMINATION_FIELDS), "the basis on which the value is handed on"),
        optional("blind_offset", Shape::Mapping(BLIND_FIELDS), "an offset hidden during the analysis"),
        optional("submitted", Shape::Mapping(SUBMITTED_FIELDS), "the value handed in to a comparison; it is frozen"),
        optional("archive", Shape::Text, "where the data are kept"),
        optional("handling", Shape::Text, "notes on safety and transport that travel with the artefact"),
        optional("left_out", Shape::Mappings(LEFT_OUT_FIELDS), "rows of contents that do not apply, with reason"),
    ],
    outputs: &[
        Output { path: "mass", meaning: "mass of the artefact, mean of the determinations used", unit: "kg" },
        Output { path: "relative_deviation", meaning: "departure from the nominal mass, relative", unit: "1" },
        Output { path: "with_excluded.mass", meaning: "the same with the excluded determinations kept", unit: "kg" },
        Output { path: "chi_square", meaning: "chi-square of the determinations used", unit: "1" },
        Output { path: "birge_ratio", meaning: "Birge ratio of the determinations used", unit: "1" },
        Output { path: "between", meaning: "standard deviation between determinations", unit: "µg" },
        Output { path: "trend", meaning: "slope of the determinations over time", unit: "µg d⁻¹" },
        Output { path: "planck_ratio_departure", meaning: "ratio of the h found to the exact h, less one", unit: "1" },
        Output { path: "planck_ratio_e_n", meaning: "its E_n with k = 2", unit: "1" },
        Output { path: "change", meaning: "result less the earlier result", unit: "µg" },
        Output { path: "change_e_n", meaning: "its E_n with k = 2, correlation included", unit: "1" },
        Output { path: "mass_in_use", meaning: "mass on the day of use, drift included", unit: "kg" },
        Output { path: "disseminated_mass", meaning: "mass on the basis used for dissemination", unit: "kg" },
    ],
    check,
    build: |engine, block| {
        let _ = Work::start(shorten(engine), block).and_then(Work::finish);
    },
};

fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    for left_out in fields.mappings("excluded") {
        if left_out.get("rule").is_none() || left_out.words("reason").trim().is_empty() {
            let message = format!("{} is left out without a rule and a reason.", left_out.words("result"));
            let problem = Problem::new(Code::ExclusionWithoutReason, message);
            complaints.add_at(
                problem.hint("Write `rule:` with the name of a rule dated before the run, and `reason:`."),
                left_out.place(),
            );
        }
    }
    if let Some(earlier) = fields.mapping("earlier_result")
        && earlier.number("correlation").is_some_and(|r| r.abs() > 1.0)
    {
        let problem = Problem::new(Code::CorrelationImpossible, "A correlation coefficient lies between −1 and 1.");
        complaints
            .add_at(problem.hint("Take it from the shared lines of both budgets."), earlier.place_of("correlation"));
    }
}

/// When something was measured, in seconds since 1970; stored by the blocks that measure.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MeasuredAt {
    pub start: f64,
    pub end: f64,
}

/// One determination of a campaign, as the report lists it.
#[derive(Debug, Clone, PartialEq)]
pub struct Determined {
    pub path: String,
    pub at: MeasuredAt,
    pub value: f64,
    /// From what it shares with no other determination.
    pub own_uncertainty: f64,
    pub standard_uncertainty: f64,
    /// Rule and reason, where it was left out.
    pub excluded: Option<(String, String)>,
    pub weight: f64,
    pub performed_by: String,
}

/// What a campaign found beyond its quantities.
#[derive(Debug, Clone, PartialEq)]
pub struct Campaign {
    pub determinations: Vec<Determined>,
    pub decisions: Vec<(String, String)>,
    /// Degrees of freedom and probability of chi-square.
    pub agreement: Option<(f64, f64)>,
}

struct Run<'e> {
    path: Text,
    mass: Quantity<'e>,
    at: MeasuredAt,
    excluded: Option<(String, String)>,
}

struct Work<'e> {
    engine: &'e Engine<'e>,
    block: &'e Block,
    weight: Weight<'e>,
    runs: Vec<Run<'e>>,
    between: Between,
    basis: Basis,
}

impl<'e> Work<'e> {
    fn start(engine: &'e Engine<'e>, block: &'e Block) -> Option<Work<'e>> {
        let fields = block.fields();
        let weight = Weight::find(engine, &fields.text("artefact")?)?;
        let mut runs = Vec::new();
        let paths = fields.texts("determinations");
        for path in &paths {
            runs.push(Run {
                mass: engine.result(path)?,
                at: measured_at(engine, path),
                excluded: None,
                path: path.clone(),
            });
        }
        let mut work = Work {
            engine,
            block,
            weight,
            runs,
            between: match fields.words("combination").as_str() {
                "equal weights" => Between::EqualWeights,
                "own uncertainties" => Between::None,
                "Paule-Mandel" => Between::PauleMandel,
                _ => Between::DerSimonianLaird,
            },
            basis: fields.text("basis").map_or_else(|| "own realization".into(), |basis| basis.text).into(),
        };
        work.mark_excluded(fields)?;
        work.check_complete(&paths);
        work.check_checks(fields);
        Some(work)
    }

    fn mark_excluded(&mut self, fields: Fields<'_>) -> Option<()> {
        for left_out in fields.mappings("excluded") {
            let result = left_out.text("result")?;
            let rule = left_out.text("rule")?;
            let block = self.engine.block(&rule, &["rule"])?;
            let reason = left_out.words("reason");
            match self.runs.iter_mut().find(|run| run.path.text == result.text) {
                Some(run) => {
                    let judged = block.fields().date("date");
                    let day = super::raw_data::epoch() + chrono::Duration::seconds(run.at.start as i64);
                    if judged.is_some_and(|laid_down| laid_down > day.date_naive()) {
                        let message = format!("The rule {} is dated after the run it leaves out.", rule.text);
                        let problem = Problem::new(Code::RuleDated, message);
                        self.engine.complain(
                            problem.hint(
                                "A run is judged by a rule laid down before it; keep the run, or say so in the text.",
                            ),
                            rule.place,
                        );
                    }
                    run.excluded = Some((format!("{}: {}", rule.text, block.fields().words("text")), reason));
                }
                None => {
                    let message = format!("{} is left out, but it is not among the determinations.", result.text);
                    let problem = Problem::new(Code::UndefinedReference, message);
                    self.engine.complain(
                        problem.hint("List every run under `determinations:`, also those left out."),
                        result.place,
                    );
                    return None;
                }
            }
        }
        Some(())
    }

    /// Every determination of the artefact in the campaign's folder is to be listed.
    fn check_complete(&self, listed: &[Text]) {
        let folder = |path: &str| path.rsplit_once('/').map_or(String::new(), |(folder, _)| folder.to_string());
        let here = folder(&self.block.path);
        for other in self.engine.blocks().values().filter(|other| other.kind.name == "determination") {
            let is_listed = listed.iter().any(|path| path.text.split('.').next() == Some(other.name()));
            if !is_listed && folder(&other.path) == here {
                let message = format!(
                    "The campaign has the determination {}, but {} does not list it.",
                    other.name(),
                    self.block.name()
                );
                let problem = Problem::new(Code::RunUnlisted, message)
                    .hint("List it under `determinations:`; if it is not used, name it under `excluded:` with rule and reason.");
                self.engine.complain(problem, self.block.fields().place_of("determinations"));
            }
        }
    }

    /// A check between realizations that had run out on the first day is said.
    fn check_checks(&self, fields: Fields<'_>) {
        let first = self.runs.iter().map(|run| run.at.start).fold(f64::INFINITY, f64::min);
        if !first.is_finite() {
            return;
        }
        let day = (super::raw_data::epoch() + chrono::Duration::seconds(first as i64)).date_naive();
        for done in fields.mappings("maintenance") {
            if done.date("due").is_some_and(|due| due < day) {
                let message =
                    format!("The check “{}” had run out on {day}, the first day of the campaign.", done.words("check"));
                let problem = Problem::new(Code::CheckOverdue, message);
                self.engine.complain(
                    problem.hint("Enter the newer check, or say in the report why the old one holds."),
                    done.place_of("due"),
                );
            }
        }
    }

    fn finish(self) -> Option<()> {
        let used: Vec<usize> = (0..self.runs.len()).filter(|index| self.runs[*index].excluded.is_none()).collect();
        let all: Vec<usize> = (0..self.runs.len()).collect();
        let sweeps = self.sweeps();
        let (mean, found) = self.mean(&used, &sweeps, "between")?;
        let mass = self.name_mass(mean);
        self.check_primary(mass)?;
        if used.len() < all.len() {
            let (kept, _) = self.mean(&all, &sweeps, "with_excluded.between")?;
            let _scope = self.engine.builder.scope(self.block.name(), Some(&campaign_mean::METHOD.info));
            let label = format!("mass of {}, with the determinations left out kept", self.weight.block.label());
            self.settled(kept).result(
                "with_excluded.mass",
                &format!("m_{},all", self.weight.block.name()),
                &label,
                &unit("kg"),
            );
        }
        self.describe(&used, &sweeps, &found);
        self.beyond(mass);
        self.check_submitted(mass);
        Some(())
    }

    fn sweeps(&self) -> Vec<Sensitivities> {
        let graph = self.engine.graph();
        self.runs.iter().map(|run| sensitivities(&graph, run.mass.id)).collect()
    }

    /// The mean of some of the runs.
    fn mean(
        &self,
        which: &[usize],
        sweeps: &[Sensitivities],
        own: &str,
    ) -> Option<(Quantity<'e>, campaign_mean::Found)> {
        let of: Vec<Sensitivities> = which.iter().map(|index| sweeps[*index].clone()).collect();
        let variances = unshared_variances(&self.engine.graph(), &of);
        let masses: Vec<Quantity<'e>> = which.iter().map(|index| self.runs[*index].mass).collect();
        let days = which.iter().map(|index| (self.runs[*index].at.start / 86_400.0).floor() as i64).collect();
        let rule = CampaignMean { variances, days, between: self.between };
        let place = self.block.fields().place_of("determinations");
        let column = Quantity::stack(&masses)?;
        let found = self.engine.keep(rule.find(&column.rows()), place)?;
        let made = self.engine.builder.estimator(
            Arc::new(rule),
            &[column],
            &[(column.dimension(), Kind::Mass)],
            &format!("{}.{own}", self.block.name()),
            "variation between determinations",
        );
        let mean = *self.engine.keep(made, place)?.first()?;
        Some((mean, found))
    }

    /// The state of the determinations and the basis of the realization.
    fn settled(&self, mean: Quantity<'e>) -> Quantity<'e> {
        let state = self.runs.iter().find_map(|run| run.mass.state());
        mean.in_state(state).on_basis(Some(self.basis.clone()))
    }

    fn name_mass(&self, mean: Quantity<'e>) -> Quantity<'e> {
        let _scope = self.engine.builder.scope(self.block.name(), Some(&campaign_mean::METHOD.info));
        let (label, name) = (self.weight.block.label(), self.weight.block.name());
        let mass = self.settled(mean).result("mass", &format!("m_{name}"), &format!("mass of {label}"), &unit("kg"));
        if let Some(nominal) = self.weight.nominal() {
            let nominal = nominal.number();
            let departure = (mass.as_kind(Kind::Plain)
                / self.engine.builder.exact(crate::graph::Value::Scalar(nominal), mass.dimension(), Kind::Plain))
                - 1.0;
            departure.result(
                "relative_deviation",
                "δ",
                &format!("relative departure of {label} from its nominal mass"),
                &unit("1"),
            );
        }
        mass
    }

    /// A primary method rests on no mass: one that has weight in the result is refused unless it is declared.
    fn check_primary(&self, mass: Quantity<'e>) -> Option<()> {
        let declared = self.block.fields().texts("auxiliary");
        let weighty: Vec<(String, f64, Option<Place>)> = {
            let graph = self.engine.graph();
            let sweep = sensitivities(&graph, mass.id);
            let weight = |number: &u32, slopes: &Vec<f64>| {
                let input = &graph.inputs[*number as usize];
                let node = graph.node(input.node);
                let c = slopes.iter().map(|c| c.abs()).fold(0.0, f64::max);
                let place = if let crate::graph::Origin::Stated(place) = node.origin { Some(place) } else { None };
                (node.kind == Kind::Mass && c > LEAST_WEIGHT)
                    .then(|| (node.name.as_ref().map_or_else(String::new, |name| name.path.clone()), c, place))
            };
            sweep.inputs.iter().filter_map(|(number, slopes)| weight(number, slopes)).collect()
        };
        let mut sound = Some(());
        for (path, c, place) in weighty {
            if declared.iter().any(|auxiliary| auxiliary.text == path) {
                continue;
            }
            let message = format!(
                "{path} is a mass with the sensitivity coefficient {} in the result; a primary method rests on no mass.",
                brief(c)
            );
            let problem = Problem::new(Code::MassInPrimary, message);
            let problem = problem.hint(format!(
                "Declare it as `auxiliary: [{path}]` if it is no reference; otherwise the method is not primary."
            ));
            self.engine.complain(problem, place.unwrap_or(self.block.raw.name.place));
            sound = None;
        }
        sound
    }

    /// Agreement, variation and trend.
    fn describe(&self, used: &[usize], sweeps: &[Sensitivities], found: &campaign_mean::Found) {
        let of: Vec<Sensitivities> = used.iter().map(|index| sweeps[*index].clone()).collect();
        let variances = unshared_variances(&self.engine.graph(), &of);
        let values: Vec<f64> = used.iter().map(|index| self.runs[*index].mass.number()).collect();
        let covariance: Vec<Vec<f64>> = (0..values.len())
            .map(|i| (0..values.len()).map(|j| if i == j { variances[i] } else { 0.0 }).collect())
            .collect();
        let agreement = consistency::consistency(&values, &covariance).ok().filter(|_| values.len() > 1);
        let masses: Vec<Quantity<'e>> = used.iter().map(|index| self.runs[*index].mass).collect();
        let Some(column) = Quantity::stack(&masses) else { return };
        let place = self.block.raw.name.place;
        if let Some(agreement) = &agreement {
            let slope = self.trend(used, &variances);
            let (chi, birge, tau) = (agreement.chi_square, agreement.birge_ratio, found.between);
            let described = Statistic::new(4, move |_| vec![chi, birge, tau, slope.0])
                .with_uncertainties(vec![0.0, 0.0, 0.0, slope.1]);
            let number = (Dimension::ONE, Kind::Plain);
            let outputs = [
                number,
                number,
                (unit("kg").dimension(), Kind::MassDifference),
                (unit("kg/s").dimension(), Kind::Plain),
            ];
            let path = format!("{}.description", self.block.name());
            let made = self.engine.builder.estimator(Arc::new(described), &[column], &outputs, &path, "description");
            let Some(list) = self.engine.keep(made, place) else { return };
            let _scope = self.engine.builder.scope(self.block.name(), Some(&consistency::METHOD.info));
            list[0].result("chi_square", "χ²", "chi-square of the determinations", &unit("1"));
            list[1].result("birge_ratio", "R_B", "Birge ratio of the determinations", &unit("1"));
            list[2].result("between", "τ", "standard deviation between determinations", &unit("µg"));
            list[3].result("trend", "b", "slope of the determinations over time", &unit("µg/d"));
        }
        let graph = self.engine.graph();
        let of_all = unshared_variances(&graph, sweeps);
        let listed = |(index, run): (usize, &Run<'_>)| Determined {
            path: run.path.text.clone(),
            at: run.at,
            value: run.mass.number(),
            own_uncertainty: of_all[index].sqrt(),
            standard_uncertainty: standard_uncertainty(&graph, &sweeps[index]),
            excluded: run.excluded.clone(),
            weight: used.iter().position(|used| *used == index).map_or(0.0, |place| found.weights[place]),
            performed_by: performed_by(self.engine, &run.path),
        };
        let campaign = Campaign {
            determinations: self.runs.iter().enumerate().map(listed).collect(),
            decisions: found
                .decisions
                .iter()
                .map(|decision| (decision.what.clone(), decision.decided.clone()))
                .collect(),
            agreement: agreement.map(|found| (found.degrees_of_freedom, found.probability)),
        };
        drop(graph);
        self.engine.store(self.block.name(), campaign);
    }

    /// Slope over time with its standard uncertainty, in kg/s, weighted by the determinations' own uncertainties.
    fn trend(&self, used: &[usize], variances: &[f64]) -> (f64, f64) {
        let times: Vec<f64> = used.iter().map(|index| self.runs[*index].at.start).collect();
        let first = self.runs[used[0]].mass.number();
        let values: Vec<f64> = used.iter().map(|index| self.runs[*index].mass.number() - first).collect();
        let weights: Vec<f64> = variances.iter().map(|variance| variances[0] / variance).collect();
        let mean =
            |list: &[f64]| crate::numeric::sum::dot(list, &weights) / crate::numeric::sum::sum(weights.iter().copied());
        let (t_0, y_0) = (mean(&times), mean(&values));
        let s_tt = crate::numeric::sum::sum(times.iter().zip(&weights).map(|(t, w)| w * (t - t_0) * (t - t_0)));
        if s_tt <= 0.0 {
            return (0.0, 0.0);
        }
        let s_ty = crate::numeric::sum::sum(
            times.iter().zip(&values).zip(&weights).map(|((t, y), w)| w * (t - t_0) * (y - y_0)),
        );
        (s_ty / s_tt, (variances[0] / s_tt).sqrt())
    }

    /// Consistency of h, earlier result, drift, dissemination.
    fn beyond(&self, mass: Quantity<'e>) {
        let (fields, name) = (self.block.fields(), self.block.name());
        if let Some(independent) = fields.mapping("independent_mass") {
            let _ = self.planck_ratio(mass, independent);
        }
        if let Some(earlier) = fields.mapping("earlier_result") {
            let _ = self.change(mass, earlier);
        }
        let mut in_use = mass;
        if let Some(drift) = fields.mapping("drift")
            && let Some(change) = self.stated(
                drift,
                "change",
                "drift",
                "Δm_drift",
                "change of the standard since the realization",
                Kind::MassDifference,
            )
        {
            let _scope = self.engine.builder.scope(name, Some(&campaign_mean::METHOD.info));
            let label = format!("mass of {} in use", self.weight.block.label());
            in_use = (mass + change).result("mass_in_use", "m_use", &label, &unit("kg"));
        }
        if let Some(dissemination) = fields.mapping("dissemination")
            && let Some(shift) = self.stated(
                dissemination,
                "shift",
                "basis_shift",
                "Δm_basis",
                "value on the basis of dissemination less the realized value",
                Kind::MassDifference,
            )
        {
            let basis: Basis = dissemination.words("basis").into();
            let basis_label = self.engine.laboratory.basis_label(&basis).to_string();
            let _scope = self.engine.builder.scope(name, Some(&campaign_mean::METHOD.info));
            let label = format!("mass of {} on the basis {basis_label}", self.weight.block.label());
            (in_use + shift).on_basis(Some(basis)).result("disseminated_mass", "m_diss", &label, &unit("kg"));
        }
    }

    fn stated(
        &self,
        fields: Fields<'_>,
        field: &str,
        path: &str,
        symbol: &str,
        label: &str,
        kind: Kind,
    ) -> Option<Quantity<'e>> {
        let given = fields.given(field, kind)?;
        self.engine.given(&given, &format!("{}.{path}", self.block.name()), symbol, label, kind)
    }

    fn planck_ratio(&self, mass: Quantity<'e>, fields: Fields<'_>) -> Option<()> {
        let independent = self.stated(
            fields,
            "mass",
            "independent_mass",
            "m_ind",
            "mass of the artefact from another source",
            Kind::Mass,
        )?;
        let departure = independent.as_kind(Kind::Plain).in_state(None).on_basis(None)
            / mass.as_kind(Kind::Plain).in_state(None).on_basis(None)
            - 1.0;
        let e_n = self.e_n(departure, "planck_ratio_description", 0.0)?;
        let _scope = self.engine.builder.scope(self.block.name(), Some(&campaign_mean::METHOD.info));
        departure.result(
            "planck_ratio_departure",
            "h_meas/h − 1",
            "ratio of the h found to the exact h, less one",
            &unit("1"),
        );
        e_n.result("planck_ratio_e_n", "E_n", "E_n of the ratio of the h found to the exact h, k = 2", &unit("1"));
        Some(())
    }

    fn change(&self, mass: Quantity<'e>, fields: Fields<'_>) -> Option<()> {
        let earlier = self.stated(
            fields,
            "mass",
            "earlier_mass",
            "m_earlier",
            "earlier result of the same experiment",
            Kind::Mass,
        )?;
        let change = mass - earlier.in_state(mass.state()).on_basis(Some(self.basis.clone()));
        let r = fields.number("correlation").unwrap_or(0.0);
        let shared = {
            let graph = self.engine.graph();
            let u = |of: Quantity<'_>| standard_uncertainty(&graph, &sensitivities(&graph, of.id));
            2.0 * r * u(mass) * u(earlier)
        };
        let e_n = self.e_n(change, "change_description", shared)?;
        let _scope = self.engine.builder.scope(self.block.name(), Some(&campaign_mean::METHOD.info));
        change.result("change", "Δm", "result less the earlier result of the same experiment", &unit("µg"));
        e_n.result("change_e_n", "E_n", "E_n of the change, k = 2, correlation included", &unit("1"));
        Some(())
    }

    /// |d|/(2 u) with u² = u²(d) − `shared`.
    fn e_n(&self, difference: Quantity<'e>, path: &str, shared: f64) -> Option<Quantity<'e>> {
        let variance = {
            let graph = self.engine.graph();
            let u = standard_uncertainty(&graph, &sensitivities(&graph, difference.id));
            u * u - shared
        };
        let rule = Statistic::new(1, move |columns| {
            let d = columns.first().and_then(|column| column.first()).copied().unwrap_or(f64::NAN);
            vec![d.abs() / (2.0 * variance.max(0.0).sqrt())]
        });
        let path = format!("{}.{path}", self.block.name());
        let made = self.engine.builder.estimator(
            Arc::new(rule),
            &[difference],
            &[(Dimension::ONE, Kind::Plain)],
            &path,
            "E_n",
        );
        self.engine.keep(made, self.block.raw.name.place)?.first().copied()
    }

    /// A value handed in is frozen: a later result that prints otherwise is said.
    fn check_submitted(&self, mass: Quantity<'e>) {
        let Some(submitted) = self.block.fields().mapping("submitted") else { return };
        let Some(super::given::Given::Stated { value, place }) = submitted.given("mass", Kind::Mass) else { return };
        let u = {
            let graph = self.engine.graph();
            standard_uncertainty(&graph, &sensitivities(&graph, mass.id))
        };
        let handed_in = value.standard_uncertainty().unwrap_or(0.0);
        let printed = |value: f64, u: f64| print_standard(value, u, &unit("kg")).ok();
        if printed(mass.number(), u) != printed(value.value, handed_in) {
            let message = format!(
                "The result departs by {} µg, and its uncertainty by {} µg, from the value handed in on {}.",
                brief((mass.number() - value.value) * 1e9),
                brief((u - handed_in) * 1e9),
                submitted.words("date")
            );
            let problem = Problem::new(Code::SubmittedValueChanged, message);
            self.engine.complain(
                problem.hint("A value handed in is not replaced silently: keep the record as it was, or report the change as an amendment with its reason."),
                place,
            );
        }
    }
}

/// A mass with a smaller sensitivity coefficient has no weight in the result.
const LEAST_WEIGHT: f64 = 1e-4;

/// When a result was measured: as its block says, else noon of its record's date.
fn measured_at(engine: &Engine, path: &Text) -> MeasuredAt {
    let name = path.text.split('.').next().unwrap_or_default();
    if let Some(found) = engine.found::<MeasuredAt>(name) {
        return *found;
    }
    let date = engine.blocks().get(name).and_then(|block| block.date);
    let noon = date.and_then(|date| date.and_hms_opt(12, 0, 0)).map_or(0.0, |at| at.and_utc().timestamp() as f64);
    MeasuredAt { start: noon, end: noon }
}

/// Who performed a run: the role named in its record's front matter.
fn performed_by(engine: &Engine, path: &Text) -> String {
    let name = path.text.split('.').next().unwrap_or_default();
    let Some(block) = engine.blocks().get(name) else { return String::new() };
    let sources = engine.sources();
    let record = engine.records.iter().find(|record| sources.file(record.file).path == block.path);
    let role = record.and_then(|record| record.front.as_ref()?.get("performed_by")?.as_text().map(str::to_string));
    role.unwrap_or_default()
}
