//! Observed wave groups: the factors and phases that a tidal analysis found, in place of the body model's.
//!
//! # Source    practice of harmonic tidal analysis: one factor and phase a group, within it the ratios of the body model.
//! # Formula   ΔE = Σ_w geo_w {C [δ'_w cos(arg + κ) − δ_w cos arg] + S [δ'_w sin(arg + κ) − δ_w sin arg]},
//!             δ'_w = δ_group δ_w/δ_main
//!     C, S  potential coefficients of the wave, 1e-6 m²/s²;  κ phase lead of the group, rad
//!     δ_w, δ_main  body factors of the wave and of the largest wave of the group

use super::gravity_site::Geocentric;
use super::permanent_tide::POTENTIAL_RADIUS;
use super::tidal_attraction::normal_component;
use super::tidal_response::{Factors, ZONAL};
use super::tidal_waves::{GROUPED, Wave};
use crate::diagnostic::{Code, Problem};
use crate::numeric::astronomy::tidal_argument::{angle, speed};
use crate::numeric::elementary::{cos, powi, sin, sqrt};

/// An observed group of waves.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct WaveGroup {
    /// First frequency of the group, cycles per day.
    pub from: f64,
    /// Last frequency of the group, cycles per day.
    pub to: f64,
    /// Gravimetric factor δ.
    pub factor: f64,
    /// Phase lead κ against the rigid Earth, rad.
    pub phase_lead: f64,
}

/// A wave with what its observed group changes.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct GroupedWave {
    multipliers: [i8; 6],
    /// Effect per potential times the coefficients, m/s².
    cosine: f64,
    sine: f64,
    body: f64,
    observed: f64,
    phase_lead: f64,
}

impl GroupedWave {
    /// What the group adds to the body tide, m/s².
    pub(super) fn departure(&self, arguments: &[f64; 6]) -> f64 {
        let body = angle(&self.multipliers, arguments);
        let observed = body + self.phase_lead;
        self.cosine * (self.observed * cos(observed) - self.body * cos(body))
            + self.sine * (self.observed * sin(observed) - self.body * sin(body))
    }
}

/// Effect on g per unit of a normalised potential coefficient of a wave, 1/m.
pub(super) fn geodetic_coefficient(site: &Geocentric, degree: usize, order: usize) -> f64 {
    let factorial = |n: usize| (1..=n).fold(1.0, |product, k| product * k as f64);
    let twice = if order == 0 { 1.0 } else { 2.0 };
    let below = degree.saturating_sub(order);
    let normal = sqrt(twice * (2 * degree + 1) as f64 * factorial(below) / factorial(degree + order));
    let scale = powi(site.radius / POTENTIAL_RADIUS, degree as i32) / site.radius;
    -normal * scale * normal_component(site, degree, order)
}

/// The waves of the observed groups at a site.
///
/// # Errors
/// `out_of_validity` for groups out of order or without factor.
pub(super) fn grouped_waves(
    site: &Geocentric,
    factors: &Factors,
    groups: &[WaveGroup],
) -> Result<Vec<GroupedWave>, Problem> {
    check(groups)?;
    let per_day = |wave: &Wave| speed(&wave.multipliers) / 15.0;
    let mut found = Vec::new();
    for group in groups {
        let waves: Vec<&Wave> =
            GROUPED.iter().filter(|wave| group.from <= per_day(wave) && per_day(wave) <= group.to).collect();
        let largest = |a: &&&Wave, b: &&&Wave| amplitude(a).total_cmp(&amplitude(b));
        let Some(main) = waves.iter().max_by(largest) else { continue };
        let main = factors.of(main);
        found.extend(waves.iter().map(|wave| grouped(site, factors, wave, group, main)));
    }
    Ok(found)
}

fn amplitude(wave: &Wave) -> f64 {
    sqrt(wave.cosine * wave.cosine + wave.sine * wave.sine)
}

fn grouped(site: &Geocentric, factors: &Factors, wave: &Wave, group: &WaveGroup, main: f64) -> GroupedWave {
    let order = usize::try_from(wave.multipliers[0]).unwrap_or(0);
    let coefficient = geodetic_coefficient(site, wave.degree, order);
    let model = factors.of(wave);
    GroupedWave {
        multipliers: wave.multipliers,
        cosine: coefficient * wave.cosine * 1e-6,
        sine: coefficient * wave.sine * 1e-6,
        body: model + zonal_share(site, factors, wave, coefficient),
        observed: group.factor * model / main,
        phase_lead: group.phase_lead,
    }
}

/// The latitude term of the factor of a long-period wave, in the product form: it stays finite where P_20 vanishes
/// but for the slope of the normal.
fn zonal_share(site: &Geocentric, factors: &Factors, wave: &Wave, coefficient: f64) -> f64 {
    if wave.degree != 2 || wave.multipliers[0] != 0 || coefficient == 0.0 {
        return 0.0;
    }
    let ratio = site.radius / POTENTIAL_RADIUS;
    -sqrt(5.0) * ratio * ratio / site.radius * site.normal_cosine * factors.zonal_product / coefficient
}

fn check(groups: &[WaveGroup]) -> Result<(), Problem> {
    let fault = |message: String| {
        Err(Problem::new(Code::OutOfValidity, message)
            .hint("List the groups as the tidal analysis gives them, by rising frequency in cycles per day."))
    };
    for group in groups {
        if !(group.from >= 0.0 && group.from < group.to) {
            let (from, to) = (group.from, group.to);
            return fault(format!("A wave group runs from {from} to {to} cycles per day; expected a rising span."));
        }
        if !(0.5..=2.0).contains(&group.factor) {
            let (factor, from) = (group.factor, group.from);
            return fault(format!(
                "The wave group from {from} cycles per day has the factor {factor}; expected a factor near {ZONAL}."
            ));
        }
        if group.phase_lead.is_nan() || group.phase_lead.abs() > 0.5 {
            let (lead, from) = (group.phase_lead.to_degrees(), group.from);
            return fault(format!(
                "The wave group from {from} cycles per day leads by {lead}°; expected a few degrees."
            ));
        }
    }
    match groups.windows(2).find(|pair| pair[1].from <= pair[0].to) {
        Some(pair) => fault(format!(
            "The wave group from {} cycles per day begins before the one up to {} ends.",
            pair[1].from, pair[0].to
        )),
        None => Ok(()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::method::gravity_site::Site;

    fn at(latitude: f64) -> (Geocentric, Factors) {
        let site = Site { latitude, longitude: 0.0, height: 0.0 }.geocentric();
        (site, Factors::at(&site))
    }

    /// The factor of the body model and no phase change nothing in a group of one factor.
    #[test]
    fn the_model_s_own_factor_changes_nothing() {
        let (site, factors) = at(0.9);
        let own = WaveGroup { from: 1.470_244, to: 2.451_943, factor: factors.semidiurnal, phase_lead: 0.0 };
        let waves = grouped_waves(&site, &factors, &[own]).expect("groups");
        assert!(waves.len() > 20);
        for wave in waves {
            assert!(wave.departure(&[10.0, 20.0, 30.0, 40.0, 50.0, 60.0]).abs() < 1e-14 * wave.cosine.abs() + 1e-24);
        }
    }

    #[test]
    fn groups_must_rise_and_be_possible() {
        let good = WaveGroup { from: 0.9, to: 1.1, factor: 1.15, phase_lead: 0.0 };
        assert!(check(&[good, WaveGroup { from: 1.8, to: 2.1, ..good }]).is_ok());
        for bad in [
            vec![WaveGroup { from: 1.2, ..good }],
            vec![WaveGroup { factor: 0.4, ..good }],
            vec![WaveGroup { factor: f64::NAN, ..good }],
            vec![WaveGroup { phase_lead: 1.0, ..good }],
            vec![good, WaveGroup { from: 1.1, to: 1.3, ..good }],
        ] {
            assert_eq!(check(&bad).expect_err("refused").code, Code::OutOfValidity);
        }
    }
}
