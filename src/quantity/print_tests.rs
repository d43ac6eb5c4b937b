//! Printed texts, and that they read back.

use super::*;
use crate::diagnostic::Problem;
use proptest::prelude::*;

fn unit(text: &str) -> Unit {
    Unit::parse(text).unwrap()
}

/// Printed text with its spaces made ordinary, for reading.
fn readable(printed: Result<String, Problem>) -> String {
    printed.unwrap().replace(['\u{202f}', '\u{a0}'], " ")
}

fn standard(value: f64, uncertainty: f64, symbol: &str) -> String {
    let unit = unit(symbol);
    readable(print_standard(unit.to_si_f64(value), unit.difference_to_si(uncertainty), &unit))
}

fn expanded(value: f64, uncertainty: f64, symbol: &str) -> String {
    let unit = unit(symbol);
    readable(print_expanded(unit.to_si_f64(value), unit.difference_to_si(uncertainty), &unit))
}

#[test]
fn both_forms_of_every_rounding() {
    let rows = [
        (1.23456, 0.00012, "1.234 56(12) mg", "(1.234 56 ± 0.000 12) mg"),
        (0.9999999875, 0.000000024, "0.999 999 988(24) mg", "(0.999 999 988 ± 0.000 000 024) mg"),
        (100.02147, 0.0996, "100.02(10) mg", "(100.02 ± 0.10) mg"),
        (12.3451, 0.995, "12.3(1.0) mg", "(12.3 ± 1.0) mg"),
        (-0.0004, 0.05, "0.000(50) mg", "(0.000 ± 0.050) mg"),
        (12.345, 0.0105, "12.345(10) mg", "(12.345 ± 0.010) mg"),
        (12.345, 0.0115, "12.345(12) mg", "(12.345 ± 0.012) mg"),
        (10.05762, 0.027, "10.058(27) mg", "(10.058 ± 0.027) mg"),
        (432.10, 1.26, "432.1(1.3) mg", "(432.1 ± 1.3) mg"),
        (-12345.6, 12.0, "−12 346(12) mg", "(−12 346 ± 12) mg"),
        (1234.5, 12.0, "1234(12) mg", "(1234 ± 12) mg"),
    ];
    for (value, uncertainty, parentheses, brackets) in rows {
        assert_eq!(standard(value, uncertainty, "mg"), parentheses);
        assert_eq!(expanded(value, uncertainty, "mg"), brackets);
    }
    let refused = print_standard(1.234567, 0.001234, &unit("mg"));
    assert!(refused.is_err_and(|problem| problem.hints.iter().any(|hint| hint.contains("larger prefix"))));
}

#[test]
fn units_powers_and_styles() {
    assert_eq!(standard(20.134, 0.012, "°C"), "20.134(12) °C");
    assert_eq!(standard(45.3, 1.2, "%"), "45.3(1.2) %");
    assert_eq!(standard(0.0, 5e-10, "1"), "0.0(5.0) × 10⁻¹⁰");
    assert_eq!(standard(4.5e-5, 2e-6, "/K"), "4.50(20) × 10⁻⁵ K⁻¹");
    assert_eq!(standard(0.999999987, 2.4e-8, "1"), "0.999 999 987(24)");
    assert_eq!(standard(1234567.0, 1234.0, "1"), "1.2346(12) × 10⁶");
    assert_eq!(standard(47.312, 0.012, "°"), "47.312(12)°");
    assert_eq!(standard(1.1834, 0.0012, "kg/m3"), "1.1834(12) kg m⁻³");
    assert_eq!(readable(Style::COMMA.standard(1234567.8, 0.12, &Unit::one())), "1 234 567,80(12)");
    assert_eq!(Style::PLAIN.standard(-0.0123456789, 1.2e-8, &unit("kg")).as_deref(), Ok("-0.012345679(12) kg"));
    assert_eq!(readable(print_value(293.284, &unit("°C"), 3)), "20.134 °C");
    assert_eq!(readable(print_value(1e-3, &unit("dm3"), 1)), "1.0 dm³");
    assert_eq!(readable(Style::POINT.difference(2.4e-8, &unit("mg"), 2)), "0.024 mg");
    assert_eq!(readable(Style::POINT.difference(2.4e-12, &Unit::one(), 2)), "2.4 × 10⁻¹²");
}

#[test]
fn nominal_plus_deviation() {
    let mg = unit("mg");
    assert_eq!(readable(print_deviation("1 kg", 1.23e-7, 1.2e-8, &mg)), "1 kg + 0.123(12) mg");
    assert_eq!(readable(print_deviation("1 kg", -1.23e-7, 1.2e-8, &mg)), "1 kg − 0.123(12) mg");
    assert_eq!(readable(print_deviation("1 kg", -1e-12, 1.2e-8, &mg)), "1 kg + 0.000(12) mg");
    let expanded = Style::POINT.expanded_deviation("1 kg", -1.23e-7, 2.4e-8, &mg);
    assert_eq!(readable(expanded), "1 kg − (0.123 ± 0.024) mg");
}

#[test]
fn a_unit_is_found_that_prints() {
    let text = |uncertainty: f64, symbol: &str| choose_unit(uncertainty, &unit(symbol)).text();
    assert_eq!(text(1.2e-8, "mg"), "mg");
    assert_eq!(text(1.2e-8, "kg"), "mg");
    assert_eq!(text(0.0012, "mg"), "g");
    assert_eq!(text(99.6e-6, "mg"), "g");
    assert_eq!(text(6e-10, "cm3"), "cm³");
    assert_eq!(text(1e-9, "1"), "");
    assert_eq!(text(0.0, "mg"), "mg");
    assert_eq!(text(f64::NAN, "mg"), "mg");
}

#[test]
fn nothing_infinite_is_printed() {
    assert!(print_standard(f64::NAN, 1.0, &unit("mg")).is_err());
    assert!(print_standard(1.0, 0.0, &unit("mg")).is_err());
    assert!(print_value(f64::INFINITY, &unit("mg"), 3).is_err());
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(10_000))]

    #[test]
    fn a_chosen_unit_never_refuses(value in -1e12..1e12f64, mantissa in 1.0..10.0f64, power in -28..25i32, index in 0..8usize) {
        let symbol = ["mg", "kg", "cm3", "°C", "1", "hPa", "kg/m3", "m/s2"][index];
        let uncertainty = Decimal::parse(&format!("{mantissa}e{power}")).unwrap().to_f64();
        let unit = choose_unit(uncertainty, &unit(symbol));
        let printed = print_standard(value, uncertainty, &unit);
        prop_assert!(printed.is_ok(), "{printed:?} {unit}");
    }

    #[test]
    fn what_is_printed_reads_back_and_prints_the_same(
        value in -1e4..1e4f64, mantissa in 1.0..10.0f64, power in -9..2i32, index in 0..7usize, grouped in any::<bool>(),
    ) {
        let unit = unit(["mg", "°C", "1", "hPa", "g/cm3", "°", "%"][index]);
        let uncertainty = Decimal::parse(&format!("{mantissa}e{power}")).unwrap().to_f64();
        let style = Style { marker: Marker::Point, grouped };
        let (value, uncertainty) = (unit.to_si_f64(value), unit.difference_to_si(uncertainty));
        if let Ok(printed) = style.standard(value, uncertainty, &unit) {
            let read = parse_plain_value(&printed).map_err(|problem| TestCaseError::fail(format!("{printed}: {problem:?}")))?;
            let StatedUncertainty::Standard { u } = read.uncertainty else { return Err(TestCaseError::fail(printed)) };
            prop_assert_eq!(style.standard(read.value, u, &unit).unwrap(), printed);
        }
        if let Ok(printed) = style.expanded(value, uncertainty, &unit) {
            let read = parse_plain_value(&format!("{printed} (k = 2)")).unwrap();
            let StatedUncertainty::Expanded { expanded, .. } = read.uncertainty else { return Err(TestCaseError::fail(printed)) };
            prop_assert_eq!(style.expanded(read.value, expanded, &unit).unwrap(), printed);
        }
    }

    #[test]
    fn a_printed_deviation_reads_back(deviation in -1e-4..1e-4f64, mantissa in 1.0..10.0f64, power in -12..-6i32) {
        let mg = unit("mg");
        let uncertainty = Decimal::parse(&format!("{mantissa}e{power}")).unwrap().to_f64();
        let printed = print_deviation("1 kg", deviation, uncertainty, &mg).unwrap();
        let read = parse_value(&printed, Kind::Mass).unwrap();
        let again = print_deviation("1 kg", read.deviation.unwrap(), read.standard_uncertainty().unwrap(), &mg).unwrap();
        prop_assert_eq!(again, printed);
    }
}
