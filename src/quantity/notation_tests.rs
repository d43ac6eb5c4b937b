//! Every form of the notation, every complaint about it, and garbage.

use super::*;
use crate::diagnostic::{Code, Problem};
use proptest::prelude::*;

fn value(text: &str, kind: Kind) -> StatedValue {
    parse_value(text, kind).unwrap_or_else(|problem| panic!("{text}: {problem:?}"))
}

fn problem(text: &str, kind: Kind) -> Problem {
    match parse_value(text, kind) {
        Ok(value) => panic!("{text} was read as {value:?}"),
        Err(problem) => problem,
    }
}

fn near(found: Option<f64>, expected: f64) {
    assert!(found.is_some_and(|found| (found - expected).abs() <= expected.abs() * 1e-15), "{found:?} {expected}");
}

#[test]
fn a_value_without_uncertainty() {
    let temperature = value("20.134 °C", Kind::Temperature);
    assert_eq!((temperature.value, temperature.decimals), (293.284, 3));
    assert_eq!(temperature.uncertainty, StatedUncertainty::None);
    assert_eq!(temperature.standard_uncertainty(), None);
    assert_eq!(temperature.degrees_of_freedom, f64::INFINITY);
    assert_eq!(temperature.text, "20.134 °C");
    assert_eq!(value("293.284 K", Kind::Temperature).value, 293.284);
    assert_eq!(value("45.3 %", Kind::RelativeHumidity).value, 0.453);
    assert_eq!(value("45.3%", Kind::RelativeHumidity).value, 0.453);
    assert_eq!(value("90 s", Kind::Duration).value, 90.0);
    assert_eq!(value("20 000.5 mg", Kind::Mass).value, 0.0200005);
    assert_eq!(value("\u{2212}5.2 °C", Kind::DewPoint).value, 267.95);
    assert_eq!(value("9.8123456 m/s2", Kind::Plain).unit.text(), "m s⁻²");
    assert_eq!(parse_plain_value("3").map(|value| value.value), Ok(3.0));
    assert_eq!(value("12 nm s-2 hPa-1", Kind::Plain).value, 1.2e-10);
    assert_eq!(value("1.2 kg/(m·s²)", Kind::Pressure).value, 1.2);
}

#[test]
fn standard_uncertainty_in_the_last_digits() {
    let pressure = value("1003.21(5) hPa", Kind::Pressure);
    assert_eq!((pressure.value, pressure.standard_uncertainty()), (100_321.0, Some(5.0)));
    assert_eq!(value("12.3(1.0) mg", Kind::MassDifference).standard_uncertainty(), Some(1e-6));
    assert_eq!(value("420(15) µmol/mol", Kind::AmountFraction).standard_uncertainty(), Some(15e-6));
    assert_eq!(value("-0.012(3) K", Kind::TemperatureDifference).value, -0.012);
    assert_eq!(value("20.134(2) °C", Kind::Temperature).standard_uncertainty(), Some(0.002));
    assert_eq!(value("1.234 56 (12) mg", Kind::Mass).standard_uncertainty(), Some(1.2e-10));
    let volume = value("124.8537(6) cm3", Kind::Volume);
    assert_eq!((volume.value, volume.standard_uncertainty()), (124.8537e-6, Some(0.0006e-6)));
    let expansion = value("45(2)e-6 /K", Kind::CubicExpansion);
    assert_eq!((expansion.value, expansion.standard_uncertainty(), expansion.decimals), (45e-6, Some(2e-6), 6));
    assert_eq!(value("45(2) × 10⁻⁶ K⁻¹", Kind::CubicExpansion).value, 45e-6);
    let bound = parse_plain_value("0.0(5)e-9").unwrap();
    assert_eq!((bound.value, bound.standard_uncertainty()), (0.0, Some(5e-10)));
    let few = value("0.123(12) mg (ν = 8)", Kind::MassDifference);
    assert_eq!((few.standard_uncertainty(), few.degrees_of_freedom), (Some(1.2e-8), 8.0));
    assert_eq!(value("3.0127(100)e-7 /m", Kind::Plain).standard_uncertainty(), Some(1e-9));
}

#[test]
fn nominal_value_plus_deviation() {
    let mass = value("1 kg + 0.123(12) mg", Kind::Mass);
    assert_eq!((mass.value, mass.nominal, mass.deviation), (1.000000123, Some(1.0), Some(1.23e-7)));
    assert_eq!((mass.standard_uncertainty(), mass.decimals), (Some(1.2e-8), 3));
    assert_eq!(mass.unit.text(), "mg");
    assert_eq!(mass.nominal_unit.map(|unit| unit.text()).as_deref(), Some("kg"));
    for minus in ["1 kg - 0.123(12) mg", "1 kg \u{2212} 0.123(12) mg", "1\u{a0}kg\u{a0}\u{2212}\u{a0}0.123(12)\u{a0}mg"]
    {
        assert_eq!(value(minus, Kind::ConventionalMass).value, 0.999999877, "{minus}");
    }
    let certificate = value("1 kg + 0.119 mg ± 0.026 mg (k = 2)", Kind::Mass);
    assert_eq!(certificate.uncertainty, StatedUncertainty::Expanded { expanded: 2.6e-8, coverage_factor: 2.0 });
    let printed = value("1 kg + (0.119 ± 0.026) mg (k = 2)", Kind::Mass);
    assert_eq!((printed.value, printed.uncertainty), (certificate.value, certificate.uncertainty));
    assert_eq!(value("20 °C + 0.134(2) K", Kind::Temperature).value, 293.284);
}

#[test]
fn expanded_uncertainty() {
    let pressure = value("1003.21 hPa ± 0.10 hPa (k = 2)", Kind::Pressure);
    assert_eq!(pressure.uncertainty, StatedUncertainty::Expanded { expanded: 10.0, coverage_factor: 2.0 });
    assert_eq!(pressure.standard_uncertainty(), Some(5.0));
    for text in ["1003.21 hPa ± 0.10 hPa (k = 2.13, ν = 20)", "1003.21 hPa ± 10 Pa (k=2.13; nu=20)"] {
        let few = value(text, Kind::Pressure);
        assert_eq!(few.uncertainty, StatedUncertainty::Expanded { expanded: 10.0, coverage_factor: 2.13 });
        assert_eq!(few.degrees_of_freedom, 20.0);
    }
    assert_eq!(value("1 Pa ± 1 Pa (k = 2, ν = ∞)", Kind::Pressure).degrees_of_freedom, f64::INFINITY);
    let printed = value("(1.234\u{202f}56 ± 0.000\u{202f}24) mg (k = 2)", Kind::MassDifference);
    assert_eq!((printed.value, printed.standard_uncertainty()), (1.23456e-6, Some(1.2e-10)));
    let celsius = value("(20.134 ± 0.010) °C (k = 2)", Kind::Temperature);
    assert_eq!((celsius.value, celsius.standard_uncertainty()), (293.284, Some(0.005)));
    let power = value("(4.50 ± 0.40) × 10⁻⁵ K⁻¹ (k = 2)", Kind::CubicExpansion);
    assert_eq!((power.value, power.standard_uncertainty()), (4.5e-5, Some(2e-6)));
    assert_eq!(parse_plain_value("(1.5 ± 0.2) (k = 2)").map(|value| value.value), Ok(1.5));
}

#[test]
fn half_widths_and_limits() {
    let root = f64::sqrt;
    near(value("20.1 °C ± 0.05 K rectangular", Kind::Temperature).standard_uncertainty(), 0.05 / root(3.0));
    near(value("20.1 °C ± 0.05 K triangular", Kind::Temperature).standard_uncertainty(), 0.05 / root(6.0));
    near(value("20.1 °C ± 0.05 K arcsine", Kind::Temperature).standard_uncertainty(), 0.05 / root(2.0));
    let drift = value("± 0.006 mg rectangular", Kind::MassDifference);
    assert_eq!((drift.value, drift.decimals), (0.0, 3));
    assert_eq!(drift.uncertainty, StatedUncertainty::HalfWidth { half_width: 6e-9, shape: Shape::Rectangular });
    assert_eq!(value("±0.005 K rectangular", Kind::TemperatureDifference).value, 0.0);
    assert_eq!(value("± 0.2 µg rectangular (ν = 50)", Kind::Mass).degrees_of_freedom, 50.0);
    let density = value("1.10 kg/m3 to 1.30 kg/m3 rectangular", Kind::Density);
    assert_eq!((density.value, density.decimals), (1.2, 2));
    let limits = StatedUncertainty::Limits { lower: 1.1, upper: 1.3, shape: Shape::Rectangular };
    assert_eq!(density.uncertainty, limits);
    assert!(density.standard_uncertainty().is_some_and(|u| (u - 0.1 / root(3.0)).abs() < 1e-15));
    assert_eq!(value("19 °C to 21 °C triangular", Kind::Temperature).value, 293.15);
    assert_eq!(parse_plain_value("1 to 3 rectangular").map(|value| value.value), Ok(2.0));
}

#[test]
fn every_wrong_form_has_its_code() {
    use Code::*;
    let rows = [
        ("1003.21", Kind::Pressure, BareNumber),
        ("0.453", Kind::RelativeHumidity, BareNumber),
        ("45e-6", Kind::CubicExpansion, BareNumber),
        ("1 kg + 0.123", Kind::Mass, BareNumber),
        ("1 + 0.123 mg", Kind::Mass, BareNumber),
        ("20.1 °C ± 0.05 (k = 2)", Kind::Temperature, BareNumber),
        ("1.10 to 1.30 kg/m3 rectangular", Kind::Density, BareNumber),
        ("20,134 °C", Kind::Temperature, DecimalComma),
        ("1.2(0,1) mg", Kind::Mass, DecimalComma),
        ("1 mg ± 0.1 mg (k = 2,13)", Kind::Mass, DecimalComma),
        ("1,234.5 mg", Kind::Mass, DecimalComma),
        ("1003.21 mg", Kind::Pressure, DimensionMismatch),
        ("20.1 C", Kind::Temperature, DimensionMismatch),
        ("45 °", Kind::RelativeHumidity, DimensionMismatch),
        ("45 %", Kind::Angle, DimensionMismatch),
        ("1 kg + 0.123 mm", Kind::Mass, DimensionMismatch),
        ("1 kg + 0.123 mm", Kind::Plain, DimensionMismatch),
        ("1 kg ± 2 % rectangular", Kind::Mass, DimensionMismatch),
        ("1 kg to 2 m rectangular", Kind::Plain, DimensionMismatch),
        ("0.5 °C", Kind::TemperatureDifference, KindMismatch),
        ("20.1 °C ± 0.05 °C rectangular", Kind::Temperature, KindMismatch),
        ("20.1 °C ± 0.05 °C rectangular", Kind::Plain, KindMismatch),
        ("20 °C + 0.1 °C", Kind::Temperature, KindMismatch),
        ("1003.21 hPa ± 0.10 hPa", Kind::Pressure, UncertaintyIncomplete),
        ("(1.2 ± 0.1) mg", Kind::Mass, UncertaintyIncomplete),
        ("± 0.006 mg", Kind::Mass, UncertaintyIncomplete),
        ("1.1 mg to 1.2 mg", Kind::Mass, UncertaintyIncomplete),
        ("1 mg ± 0.1 mg (ν = 5)", Kind::Mass, UncertaintyIncomplete),
        ("1.2 ug", Kind::Mass, UnitUnknown),
        ("1.2 hpa", Kind::Pressure, UnitUnknown),
        ("45 %RH", Kind::RelativeHumidity, UnitUnknown),
        ("", Kind::Mass, NotationUnreadable),
        ("mg", Kind::Mass, NotationUnreadable),
        ("nan mg", Kind::Mass, NotationUnreadable),
        ("inf mg", Kind::Mass, NotationUnreadable),
        (".5 mg", Kind::Mass, NotationUnreadable),
        ("5. mg", Kind::Mass, NotationUnreadable),
        ("12 34 mg", Kind::Mass, NotationUnreadable),
        ("1e999 mg", Kind::Mass, NotationUnreadable),
        ("1e-5(2) mg", Kind::Mass, NotationUnreadable),
        ("1.2(1 mg", Kind::Mass, NotationUnreadable),
        ("1.2(1 mg) mg", Kind::Mass, NotationUnreadable),
        ("1.2(0) mg", Kind::Mass, NotationUnreadable),
        ("1.2(1) mg (k = 2)", Kind::Mass, NotationUnreadable),
        ("1.2(1) mg ± 0.1 mg (k = 2)", Kind::Mass, NotationUnreadable),
        ("1.2(1) mg rectangular", Kind::Mass, NotationUnreadable),
        ("1.2 mg (k = 2)", Kind::Mass, NotationUnreadable),
        ("1.2 mg rectangular", Kind::Mass, NotationUnreadable),
        ("1.2 mg ± 0.1 mg uniform", Kind::Mass, NotationUnreadable),
        ("1.2 mg ± 0.1 mg k = 2", Kind::Mass, NotationUnreadable),
        ("1.2 mg ± 0.1 mg (k = 2", Kind::Mass, NotationUnreadable),
        ("1.2 mg ± 0.1 mg (k = 0)", Kind::Mass, NotationUnreadable),
        ("1.2 mg ± 0.1 mg (k = -2)", Kind::Mass, NotationUnreadable),
        ("1.2 mg ± 0.1 mg (k = 2, k = 3)", Kind::Mass, NotationUnreadable),
        ("1.2 mg ± 0.1 mg (p = 95)", Kind::Mass, NotationUnreadable),
        ("1.2 mg ± 0.1 mg (k = 2) rectangular", Kind::Mass, NotationUnreadable),
        ("1.2 mg ± -0.1 mg (k = 2)", Kind::Mass, NotationUnreadable),
        ("1.2 mg ± 0 mg rectangular", Kind::Mass, NotationUnreadable),
        ("1.2 mg +/- 0.1 mg (k = 2)", Kind::Mass, NotationUnreadable),
        ("1.0(1) kg + 0.1 mg", Kind::Mass, NotationUnreadable),
        ("1 kg + -0.1 mg", Kind::Mass, NotationUnreadable),
        ("1.3 mg to 1.2 mg rectangular", Kind::Mass, NotationUnreadable),
        ("1 mg to 2 mg ± 0.1 mg (k = 2)", Kind::Mass, NotationUnreadable),
        ("1 kg + 1 mg to 2 mg rectangular", Kind::Mass, NotationUnreadable),
        ("(1.2 0.1) mg (k = 2)", Kind::Mass, NotationUnreadable),
        ("± 0.05 K rectangular", Kind::Temperature, NotationUnreadable),
        ("20 °C/h", Kind::Plain, NotationUnreadable),
        ("1 2 3", Kind::Plain, NotationUnreadable),
    ];
    for (text, kind, code) in rows {
        let problem = problem(text, kind);
        assert_eq!(problem.code, code, "{text}: {}", problem.message);
        assert!(
            problem
                .range
                .is_some_and(|(start, end)| start <= end && end <= text.len() && text.get(start..end).is_some()),
            "{text}"
        );
    }
}

#[test]
fn messages_say_what_was_found_and_expected() {
    let wrong = problem("1003.21 mg", Kind::Pressure);
    assert_eq!(wrong.message, "the unit mg belongs to a mass; expected a pressure such as hPa");
    assert_eq!(wrong.range, Some((8, 10)));
    let bare = problem("1003.21", Kind::Pressure);
    assert_eq!(bare.message, "the number 1003.21 has no unit; expected a pressure such as hPa");
    assert!(problem("20.1 C", Kind::Temperature).hints.iter().any(|hint| hint.contains("°C")));
    assert!(problem("0.5 °C", Kind::TemperatureDifference).hints.iter().any(|hint| hint == "write K"));
    assert!(problem("2 mg ± 1 ug (k = 2)", Kind::Mass).hints.iter().any(|hint| hint.contains("µg")));
    assert_eq!(problem("20,134 °C", Kind::Temperature).range, Some((0, 6)));
    assert_eq!(problem("2 mg ± 1 ug (k = 2)", Kind::Mass).range, Some((10, 12)));
}

/// Fragments that a value is made of, whole and broken.
fn fragments() -> impl Strategy<Value = String> {
    let pieces = [
        "1",
        "0.123",
        "(12)",
        "(",
        ")",
        "±",
        " ",
        "mg",
        "kg",
        "°C",
        "K",
        "/",
        "k",
        "=",
        "2",
        "ν",
        ",",
        "rectangular",
        "to",
        "+",
        "-",
        "\u{2212}",
        "e-6",
        "× 10⁻⁶",
        "\u{202f}",
        ".",
        "m³",
        "%",
        "∞",
        "e",
        "×",
        "é",
        "10",
    ];
    proptest::collection::vec(proptest::sample::select(pieces.to_vec()), 0..14).prop_map(|pieces| pieces.concat())
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(20_000))]

    #[test]
    fn broken_values_never_panic(text in fragments(), index in 0..Kind::ALL.len()) {
        match parse_value(&text, Kind::ALL[index]) {
            Ok(value) => prop_assert!(value.value.is_finite() && value.standard_uncertainty().is_none_or(|u| u > 0.0)),
            Err(problem) => {
                let range = problem.range.unwrap_or((0, 0));
                prop_assert!(text.get(range.0..range.1).is_some(), "{problem:?}");
            }
        }
    }

    #[test]
    fn garbage_never_panics(text in "\\PC{0,40}") {
        let _ = parse_plain_value(&text);
        let _ = parse_number(&text, &Unit::one());
        let _ = parse_coordinate(&text, Axis::Latitude);
        let _ = Unit::parse(&text);
    }
}
