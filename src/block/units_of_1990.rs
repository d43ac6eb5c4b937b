//! Certificates in the electric units of 1990: refused, unless their conversion to the SI is stated.

use super::engine::{Block, Engine};
use super::field::Shape;
use super::fields::Fields;
use crate::diagnostic::{Code, Complaints, Problem};

/// The units a certificate of a voltage or resistance can be written in.
pub const BASIS_SHAPE: Shape = Shape::Choice(&["SI", "1990"]);
/// The conversion that can be stated.
pub const CONVERSION_SHAPE: Shape = Shape::Choice(&["1990 to SI"]);

/// Whether the certificate is in the units of 1990.
pub fn is_of_1990(calibration: Fields<'_>) -> bool {
    calibration.words("basis") == "1990"
}

/// Refuses a value of 1990 without its conversion, and a conversion of a value in the SI.
pub fn check_basis(calibration: Fields<'_>, complaints: &mut Complaints) {
    let converted = calibration.get("conversion").is_some();
    if is_of_1990(calibration) == converted {
        return;
    }
    let certificate = calibration.words("certificate");
    if converted {
        let message = format!("The certificate {certificate} is in the SI, but a conversion from 1990 is stated.");
        let problem = Problem::new(Code::ElectricBasis, message);
        complaints.add_at(
            problem.hint("Write `basis: 1990` if it is in the conventional units, else leave the conversion out."),
            calibration.place_of("conversion"),
        );
        return;
    }
    let message =
        format!("The certificate {certificate} is in the electric units of 1990, which ended on 20 May 2019.");
    let problem = Problem::new(Code::ElectricBasis, message).hint(
        "Write `conversion: 1990 to SI` to apply the exact factor (voltages grow by 1.06665e-7, resistances by 1.7794e-8), or enter a certificate in the SI.",
    );
    complaints.add_at(problem, calibration.place_of("basis"));
}

/// Lists the conversion beside the results.
pub fn note_conversion(engine: &Engine, block: &Block, calibration: Fields<'_>) {
    engine.builder.assume(
        format!(
            "{}: certificate {} is in the electric units of 1990 and was carried to the SI by the exact factor, as stated in its record",
            block.name(),
            calibration.words("certificate")
        ),
        Some(calibration.place_of("conversion")),
    );
}
