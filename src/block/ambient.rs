//! Ambient conditions: logged temperature, pressure, humidity, corrected and interpolated to the weighings.

use super::engine::{Block, Engine, shorten};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::instrument::{Instrument, kinds_of};
use super::raw_data::{RawData, epoch};
use super::{BlockKind, Output};
use crate::diagnostic::{Code, Complaints, Problem};
use crate::graph::{Distribution, InputDraft, NodeId, Origin, Quantity, Value};
use crate::intake::Place;
use crate::method::air_density::{self, Air, Humidity};
use crate::method::unit;
use crate::numeric::interpolate::bracket;
use crate::quantity::{Kind, Unit};
use crate::record::{Node, Text, seconds_since};

const READING_FIELDS: &[Field] = &[
    needed("time", Shape::Instant, "the time of the reading"),
    optional("temperature", Shape::Value(Kind::Temperature), "air temperature"),
    optional("pressure", Shape::Value(Kind::Pressure), "air pressure"),
    optional("humidity", Shape::Value(Kind::RelativeHumidity), "relative humidity"),
    optional("dew_point", Shape::Value(Kind::DewPoint), "dew point"),
    optional("carbon_dioxide", Shape::Value(Kind::AmountFraction), "mole fraction of carbon dioxide"),
];

/// Logged conditions.
pub static KIND: BlockKind = BlockKind {
    name: "ambient",
    meaning: "logged ambient conditions",
    fields: &[
        needed("thermometer", Shape::Name, "the instrument for air temperature"),
        needed("barometer", Shape::Name, "the instrument for air pressure"),
        optional("hygrometer", Shape::Name, "the instrument for relative humidity"),
        optional("dew_point_meter", Shape::Name, "the instrument for the dew point"),
        optional(
            "carbon_dioxide",
            Shape::Value(Kind::AmountFraction),
            "mole fraction of carbon dioxide for the whole log",
        ),
        optional("carbon_dioxide_meter", Shape::Name, "the instrument for carbon dioxide, read with the others"),
        optional("readings", Shape::Mappings(READING_FIELDS), "the log, written here"),
        optional(
            "data",
            Shape::Name,
            "the log, as raw data with the columns time, temperature, pressure, humidity or dew_point",
        ),
    ],
    outputs: &[
        Output { path: "temperature", meaning: "air temperature, corrected, at the times of the log", unit: "°C" },
        Output { path: "pressure", meaning: "air pressure, corrected, at the times of the log", unit: "hPa" },
        Output { path: "humidity", meaning: "relative humidity, corrected, at the times of the log", unit: "%" },
        Output { path: "dew_point", meaning: "dew point, corrected, at the times of the log", unit: "°C" },
        Output { path: "carbon_dioxide", meaning: "mole fraction of carbon dioxide", unit: "µmol/mol" },
        Output { path: "density", meaning: "air density at the times of the log", unit: "kg m⁻³" },
    ],
    check,
    build: |engine, block| {
        LoggedAir::build(shorten(engine), block, block.raw.name.place);
    },
};

fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    let place = fields.place();
    if fields.get("readings").is_some() == fields.get("data").is_some() {
        let problem = Problem::new(Code::FieldMissing, "Conditions need either readings or data.");
        complaints
            .add_at(problem.hint("Write the log as `readings:` here, or name a raw-data block as `data:`."), place);
    }
    if fields.get("hygrometer").is_some() == fields.get("dew_point_meter").is_some() {
        let problem = Problem::new(Code::FieldMissing, "Conditions need either a hygrometer or a dew_point_meter.");
        complaints.add_at(problem, place);
    }
    for reading in fields.mappings("readings") {
        for name in ["temperature", "pressure", "humidity", "dew_point", "carbon_dioxide"] {
            let (kind, _) = kinds_of(name);
            if let Some(super::given::Given::Stated { value, place }) = reading.given(name, kind)
                && value.standard_uncertainty().is_some()
            {
                let problem = Problem::new(
                    Code::DoubleUncertainty,
                    format!("The reading {} carries its own uncertainty beside that of its instrument.", value.text),
                );
                complaints.add_at(
                    problem.hint(
                        "Write the indication alone; correction, resolution and drift stand with the instrument.",
                    ),
                    place,
                );
            }
        }
    }
}

/// What a report shows of the conditions.
#[derive(Debug, Clone, PartialEq)]
pub struct Conditions {
    /// Seconds since 1970.
    pub times: Vec<f64>,
    /// Quantity word, symbol, unit, and its corrected column.
    pub columns: Vec<(&'static str, &'static str, Unit, NodeId)>,
    pub carbon_dioxide: NodeId,
    pub density: NodeId,
}

/// Corrected conditions at the times of the log.
#[derive(Clone)]
pub struct LoggedAir<'e> {
    engine: &'e Engine<'e>,
    name: String,
    times: Vec<f64>,
    temperature: Quantity<'e>,
    pressure: Quantity<'e>,
    moisture: Quantity<'e>,
    is_dew_point: bool,
    carbon_dioxide: Quantity<'e>,
    carbon_dioxide_is_logged: bool,
}

/// Where the readings come from.
enum Log<'e> {
    Written(Vec<Fields<'e>>),
    File(RawData),
}

impl<'e> LoggedAir<'e> {
    /// The conditions of the ambient block with this name.
    pub fn find(engine: &'e Engine<'e>, name: &Text, used_at: Place) -> Option<Self> {
        let block = engine.block(name, &["ambient"])?;
        engine.build(block.name(), name.place);
        Self::build(engine, block, used_at)
    }

    fn build(engine: &'e Engine<'e>, block: &'e Block, used_at: Place) -> Option<Self> {
        let fields = block.fields();
        let log = match fields.text("data") {
            Some(data) => Log::File(RawData::find(engine, &data)?),
            None => Log::Written(fields.mappings("readings")),
        };
        let times = log.times(engine)?;
        check_times(engine, &log, &times, block)?;
        let day = chrono::DateTime::from_timestamp(times.first().copied()? as i64, 0)?.date_naive();
        let is_dew_point = fields.get("dew_point_meter").is_some();
        let column = |field: &str, measures: &'static str| -> Option<Quantity<'e>> {
            let instrument = Instrument::find(engine, &fields.text(field)?, measures)?;
            let indications = log.indications(engine, block.name(), instrument, measures, field)?;
            let corrected = instrument.corrected(indications, day, used_at)?;
            Some(name_column(engine, block, corrected, measures))
        };
        let (temperature, pressure) = (column("thermometer", "temperature"), column("barometer", "pressure"));
        let moisture =
            if is_dew_point { column("dew_point_meter", "dew_point") } else { column("hygrometer", "humidity") };
        let logged = fields.get("carbon_dioxide_meter").is_some();
        let carbon_dioxide = if logged {
            column("carbon_dioxide_meter", "carbon_dioxide")
        } else {
            stated_carbon_dioxide(engine, block)
        };
        let air = Self {
            engine,
            name: block.name().into(),
            times,
            temperature: temperature?,
            pressure: pressure?,
            moisture: moisture?,
            is_dew_point,
            carbon_dioxide: carbon_dioxide?,
            carbon_dioxide_is_logged: logged,
        };
        air.check_validity(&log)?;
        air.store();
        Some(air)
    }

    fn check_validity(&self, log: &Log<'_>) -> Option<()> {
        match air_density::check_validity(&self.temperature.rows(), &self.pressure.rows()) {
            Ok(()) => Some(()),
            Err((row, problem)) => {
                self.engine.complain(problem, log.place(self.engine, row, ""));
                None
            }
        }
    }

    /// Density over the log, and the columns a report shows.
    fn store(&self) {
        let path = format!("{}.density", self.name);
        let known = self.engine.graph().find(&path);
        let density = match known {
            Some(known) => self.engine.at(known),
            None => {
                let _scope = self.engine.builder.scope(&self.name, Some(&air_density::METHOD.info));
                let density = air_density::density(&self.engine.builder, self.air());
                density.result("density", "ρ_a", "air density at the times of the log", &unit("kg/m3"))
            }
        };
        let moisture: (&'static str, &'static str, Unit) =
            if self.is_dew_point { ("dew point", "t_d", unit("°C")) } else { ("relative humidity", "h_r", unit("%")) };
        let conditions = Conditions {
            times: self.times.clone(),
            columns: vec![
                ("air temperature", "t", unit("°C"), self.temperature.id),
                ("air pressure", "p", unit("hPa"), self.pressure.id),
                (moisture.0, moisture.1, moisture.2, self.moisture.id),
            ],
            carbon_dioxide: self.carbon_dioxide.id,
            density: density.id,
        };
        self.engine.store(&self.name, conditions);
    }

    fn air(&self) -> Air<'e> {
        Air {
            temperature: self.temperature,
            pressure: self.pressure,
            humidity: if self.is_dew_point {
                Humidity::DewPoint(self.moisture)
            } else {
                Humidity::Relative(self.moisture)
            },
            carbon_dioxide: self.carbon_dioxide,
        }
    }

    /// The conditions at other times (s since 1970), by linear interpolation; times outside the log are refused.
    pub fn at(&self, times: &[f64], places: impl Fn(usize) -> Place) -> Option<Air<'e>> {
        let mut weights = Vec::with_capacity(times.len());
        for (row, time) in times.iter().enumerate() {
            match bracket(&self.times, *time) {
                Some((first, second, weight)) if first == second || weight == 0.0 => {
                    weights.push(vec![(first as u32, 1.0)])
                }
                Some((first, second, weight)) => {
                    weights.push(vec![(first as u32, 1.0 - weight), (second as u32, weight)])
                }
                None => {
                    self.engine.complain(self.out_of_span(*time), places(row));
                    return None;
                }
            }
        }
        let mix = |quantity: Quantity<'e>| quantity.mix(weights.clone());
        let air = self.air();
        Some(Air {
            temperature: mix(air.temperature),
            pressure: mix(air.pressure),
            humidity: match air.humidity {
                Humidity::DewPoint(dew) => Humidity::DewPoint(mix(dew)),
                Humidity::Relative(h) => Humidity::Relative(mix(h)),
            },
            carbon_dioxide: if self.carbon_dioxide_is_logged { mix(air.carbon_dioxide) } else { air.carbon_dioxide },
        })
    }

    fn out_of_span(&self, time: f64) -> Problem {
        let (first, last) = (self.times.first().copied().unwrap_or(0.0), self.times.last().copied().unwrap_or(0.0));
        let message = format!(
            "Conditions are needed at {}, but {} was logged from {} to {}.",
            clock(time),
            self.name,
            clock(first),
            clock(last)
        );
        Problem::new(Code::ConditionsOutOfSpan, message)
            .hint("Enter the readings that enclose the weighing; conditions are not carried beyond the log.")
    }
}

impl Log<'_> {
    fn times(&self, engine: &Engine) -> Option<Vec<f64>> {
        match self {
            Log::File(raw) => raw.times(engine),
            Log::Written(readings) => {
                readings.iter().map(|reading| Some(seconds_since(epoch(), reading.instant("time")?))).collect()
            }
        }
    }

    /// The place of a reading: of one of its fields, or of its row.
    fn place(&self, engine: &Engine, row: usize, field: &str) -> Place {
        match self {
            Log::File(raw) => raw.line(engine, row),
            Log::Written(readings) => {
                readings.get(row).map_or(Place::new(crate::intake::FileId(0), 0, 0), |reading| reading.place_of(field))
            }
        }
    }

    /// The indications of one instrument as an input, each inside the instrument's range.
    fn indications<'e>(
        &self,
        engine: &'e Engine<'e>,
        block: &str,
        instrument: Instrument<'e>,
        measures: &str,
        field: &str,
    ) -> Option<Quantity<'e>> {
        let (kind, _) = kinds_of(measures);
        let path = format!("{block}.{measures}_indications");
        let label = format!("indications of {}", instrument.block.label());
        let symbol = symbol_of(measures);
        let made = match self {
            Log::File(raw) => raw.input(engine, measures, &path, symbol, &label, kind, instrument.resolution())?,
            Log::Written(readings) => {
                let mut rows = Vec::new();
                let mut places = Vec::new();
                for reading in readings {
                    let Some(node) = reading.get(measures) else {
                        let problem = Problem::new(
                            Code::FieldMissing,
                            format!("The reading lacks {measures}, which the {field} gives."),
                        );
                        engine.complain(problem, reading.place());
                        return None;
                    };
                    rows.push(stated_number(node, kind)?);
                    places.push(node.place);
                }
                let mut draft = InputDraft::new(
                    &path,
                    symbol,
                    &label,
                    kind,
                    unit(shown_unit(measures)),
                    Value::column(rows),
                    Origin::ReadingList(places.into()),
                );
                draft.distribution = instrument.resolution();
                engine.builder.input(draft)
            }
        };
        if let Some((from, to)) = instrument.range() {
            let outside = made.rows().iter().position(|value| !(from..=to).contains(value));
            if let Some(row) = outside {
                let shown = unit(shown_unit(measures));
                let show = |value: f64| format!("{} {}", (shown.from_si(value) * 1e6).round() / 1e6, shown.text());
                let message = format!(
                    "The reading {} lies outside the range {} to {} of {}.",
                    show(made.rows()[row]),
                    show(from),
                    show(to),
                    instrument.block.label()
                );
                engine.complain(
                    Problem::new(Code::OutOfRange, message).hint("Check the reading for a slip of digits or unit."),
                    self.place(engine, row, measures),
                );
                return None;
            }
        }
        Some(made)
    }
}

fn stated_number(node: &Node, kind: Kind) -> Option<f64> {
    match super::given::read_given(node, kind, "reading").ok()? {
        super::given::Given::Stated { value, .. } => Some(value.value),
        super::given::Given::Reference(_) => None,
    }
}

/// Refuses a log whose times do not rise.
fn check_times(engine: &Engine, log: &Log<'_>, times: &[f64], block: &Block) -> Option<()> {
    if let Some(row) = times.windows(2).position(|pair| pair[0] >= pair[1]) {
        let message =
            format!("The log of {} steps back: {} follows {}.", block.name(), clock(times[row + 1]), clock(times[row]));
        engine.complain(
            Problem::new(Code::TimeUnreadable, message).hint("Put the readings in order of time, each time once."),
            log.place(engine, row + 1, "time"),
        );
        return None;
    }
    Some(())
}

fn stated_carbon_dioxide<'e>(engine: &'e Engine<'e>, block: &Block) -> Option<Quantity<'e>> {
    let path = format!("{}.carbon_dioxide", block.name());
    let label = "mole fraction of carbon dioxide";
    if let Some(given) = block.fields().given("carbon_dioxide", Kind::AmountFraction) {
        return engine.given(&given, &path, "x_CO₂", label, Kind::AmountFraction);
    }
    engine.builder.assume(
        format!("{}: carbon dioxide 400 µmol/mol, taken between 350 µmol/mol and 450 µmol/mol (rectangular), because none is recorded", block.name()),
        Some(block.raw.name.place),
    );
    let origin = Origin::Assumed("mole fraction of carbon dioxide not recorded");
    let mut draft =
        InputDraft::new(&path, "x_CO₂", label, Kind::AmountFraction, unit("µmol/mol"), Value::Scalar(400e-6), origin);
    draft.distribution = Distribution::Rectangular { half_width: 50e-6 };
    Some(engine.builder.input(draft))
}

fn name_column<'e>(engine: &'e Engine<'e>, block: &Block, corrected: Quantity<'e>, measures: &str) -> Quantity<'e> {
    let path = format!("{}.{measures}", block.name());
    let known = engine.graph().find(&path);
    if let Some(known) = known {
        return engine.at(known);
    }
    let _scope = engine.builder.scope(block.name(), Some(&crate::method::instrument_correction::METHOD.info));
    let label = format!("{}, corrected, at the times of the log", measures.replace('_', " "));
    corrected.result(measures, symbol_of(measures), &label, &unit(shown_unit(measures)))
}

fn symbol_of(measures: &str) -> &'static str {
    match measures {
        "temperature" => "t",
        "pressure" => "p",
        "humidity" => "h_r",
        "dew_point" => "t_d",
        _ => "x_CO₂",
    }
}

fn shown_unit(measures: &str) -> &'static str {
    match measures {
        "temperature" | "dew_point" => "°C",
        "pressure" => "hPa",
        "humidity" => "%",
        _ => "µmol/mol",
    }
}

/// A time in seconds since 1970 as text.
pub fn clock(time: f64) -> String {
    let whole = time.floor();
    chrono::DateTime::from_timestamp(whole as i64, ((time - whole) * 1e9) as u32)
        .map_or_else(|| format!("{time} s"), |at| at.format("%Y-%m-%dT%H:%M:%SZ").to_string())
}
