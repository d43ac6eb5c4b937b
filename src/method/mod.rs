//! Published methods, one file each: source, formula, units, validity, published check.
//!
//! A method is ordinary arithmetic on graph handles; the same nodes give numbers, sensitivities and trials.

pub mod abbe_offset;
pub mod air_density;
pub mod air_pressure_effect;
pub mod allan_deviation;
pub mod analysis_of_variance;
pub mod autocorrelation;
pub mod averaging_cycle;
pub mod campaign_mean;
pub mod coil_current;
pub mod combination;
pub mod comparator_sensitivity;
pub mod compensated_voltage;
pub mod consistency;
pub mod constants;
pub mod conventional_mass;
pub mod conversion_1990;
pub mod design_control;
pub mod gravity_epoch;
pub mod gravity_profile;
pub mod gravity_range;
pub mod gravity_site;
pub mod gravity_transfer;
pub mod hydrostatic_volume;
pub mod instrument_correction;
pub mod interferometer_velocity;
pub mod josephson_voltage;
pub mod kibble_mass;
pub mod laser_alignment;
pub mod mass_on_day;
pub mod measurement_model;
pub mod normal_gravity;
pub mod ocean_loading;
pub mod parasitic_motion;
pub mod permanent_tide;
pub mod polar_motion;
pub mod polynomial_fit;
pub mod profile_fit;
pub mod quantum_hall_resistance;
pub mod refractive_index_ciddor;
pub mod refractive_index_edlen;
pub mod residual_gas_buoyancy;
pub mod resistor_line;
pub mod solid_earth_tide;
pub mod sorption_correction;
pub mod statistic;
pub mod straight_line;
pub mod substitution;
pub mod tare_fit;
pub mod tidal_attraction;
pub mod tidal_groups;
pub mod tidal_response;
pub mod tidal_waves;
pub mod type_a_mean;
pub mod volume;
pub mod water_density;
pub mod weighing_cycle;
pub mod weighing_design;

use crate::graph::{Builder, MethodInfo, Quantity, Value};
use crate::quantity::{Decimal, Kind, Unit};

/// A method as the registry knows it.
pub struct Method {
    pub info: MethodInfo,
    /// Published or independently computed values it reproduces.
    pub examples: &'static [WorkedExample],
}

/// One published check, kept as printed and stated once: the test, `validate` and the table in the README use it.
pub struct WorkedExample {
    /// Where the printed value comes from.
    pub source: &'static str,
    /// The given values, in words.
    pub given: &'static str,
    /// What is computed, as quantity/unit.
    pub quantity: &'static str,
    /// The value exactly as printed.
    pub printed: &'static str,
    /// Our value.
    pub found: fn() -> f64,
}

impl WorkedExample {
    /// Half a unit of the last printed digit.
    pub fn tolerance(&self) -> f64 {
        let (mantissa, exponent) = self.printed.split_once('e').unwrap_or((self.printed, "0"));
        let decimals = mantissa.split_once('.').map_or(0, |(_, fraction)| fraction.len()) as i32;
        let exponent: i32 = exponent.parse().unwrap_or(0);
        format!("0.5e{}", exponent - decimals).parse().unwrap_or(0.0)
    }

    /// The printed value as a number.
    pub fn value(&self) -> f64 {
        self.printed.replace('−', "-").parse().unwrap_or(f64::NAN)
    }

    /// Whether our value agrees with the printed one to its last digit.
    pub fn agrees(&self) -> bool {
        let found = (self.found)();
        // The hair covers the binary form of a decimal that ends exactly half-way.
        (found - self.value()).abs() <= self.tolerance() * (1.0 + 1e-9) + f64::EPSILON * found.abs()
    }
}

/// Every method, in order of name.
pub static METHODS: &[&Method] = &[
    &abbe_offset::METHOD,
    &air_density::METHOD,
    &air_pressure_effect::METHOD,
    &allan_deviation::METHOD,
    &analysis_of_variance::METHOD,
    &autocorrelation::METHOD,
    &averaging_cycle::METHOD,
    &campaign_mean::METHOD,
    &coil_current::METHOD,
    &combination::METHOD,
    &comparator_sensitivity::METHOD,
    &compensated_voltage::METHOD,
    &consistency::METHOD,
    &conventional_mass::METHOD,
    &conversion_1990::METHOD,
    &gravity_epoch::METHOD,
    &gravity_profile::METHOD,
    &gravity_transfer::METHOD,
    &hydrostatic_volume::METHOD,
    &instrument_correction::METHOD,
    &interferometer_velocity::METHOD,
    &josephson_voltage::METHOD,
    &kibble_mass::METHOD,
    &laser_alignment::METHOD,
    &mass_on_day::METHOD,
    &measurement_model::METHOD,
    &normal_gravity::METHOD,
    &ocean_loading::METHOD,
    &parasitic_motion::METHOD,
    &permanent_tide::METHOD,
    &polar_motion::METHOD,
    &polynomial_fit::METHOD,
    &profile_fit::METHOD,
    &quantum_hall_resistance::METHOD,
    &refractive_index_ciddor::METHOD,
    &refractive_index_edlen::METHOD,
    &residual_gas_buoyancy::METHOD,
    &resistor_line::METHOD,
    &solid_earth_tide::METHOD,
    &sorption_correction::METHOD,
    &straight_line::METHOD,
    &substitution::METHOD,
    &tare_fit::METHOD,
    &type_a_mean::METHOD,
    &volume::METHOD,
    &water_density::METHOD,
    &weighing_cycle::METHOD,
    &weighing_design::METHOD,
];

/// The mean of values known to be some; not a number of none.
fn mean_or_nan(values: &[f64]) -> f64 {
    crate::numeric::sum::mean(values).unwrap_or(f64::NAN)
}

/// The experimental standard deviation of values known to be two or more; not a number of fewer.
fn deviation_or_nan(values: &[f64]) -> f64 {
    crate::numeric::sum::experimental_standard_deviation(values).unwrap_or(f64::NAN)
}

/// A matrix times a number.
fn scaled(matrix: &[Vec<f64>], factor: f64) -> Vec<Vec<f64>> {
    matrix.iter().map(|row| row.iter().map(|cell| cell * factor).collect()).collect()
}

/// A unit written in the source of a method. An unreadable one would be a fault of ours; the registry's test finds it.
pub fn unit(text: &str) -> Unit {
    Unit::parse(text).unwrap_or_else(|_| Unit::one())
}

/// An exact constant inside a formula, in a unit written as text.
pub fn exact<'g>(builder: &'g Builder, value: f64, unit_text: &str) -> Quantity<'g> {
    let unit = unit(unit_text);
    let value = Decimal::from_f64_shortest(value).map_or(f64::NAN, |decimal| unit.to_si(&decimal));
    builder.exact(Value::Scalar(value), unit.dimension(), Kind::Plain)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn registry_is_sorted_unique_and_complete() {
        let names: Vec<&str> = METHODS.iter().map(|method| method.info.name).collect();
        let mut sorted = names.clone();
        sorted.sort_unstable();
        sorted.dedup();
        assert_eq!(names, sorted);
        for method in METHODS {
            let info = &method.info;
            assert!(!info.source.is_empty() && !info.formula.is_empty() && !info.valid_for.is_empty(), "{}", info.name);
            assert!(!method.examples.is_empty(), "{} has no published check", info.name);
            for (symbol, meaning, text) in info.symbols {
                assert!(!symbol.is_empty() && !meaning.is_empty());
                assert!(Unit::parse(text).is_ok() || text.is_empty(), "{}: unit {text}", info.name);
            }
        }
    }

    #[test]
    fn every_worked_example_agrees() {
        for method in METHODS {
            for example in method.examples {
                let found = (example.found)();
                assert!(
                    example.agrees(),
                    "{}: {} given {}: printed {}, found {found}",
                    method.info.name,
                    example.quantity,
                    example.given,
                    example.printed
                );
            }
        }
    }
}
