//! Gravity at a time between absolute determinations.
//!
//! # Source    linear interpolation; JCGM 100:2008, 5.2 for correlated determinations.
//! # Formula   g(t) = (1 − f) g_1 + f g_2 + d,  f = (t − t_1)/(t_2 − t_1)
//!             u² = (1 − f)² u_1² + f² u_2² + 2 f (1 − f) r u_1 u_2 + u_d²
//!     g_1, g_2  determinations at t_1 and t_2; r correlation, 0.5 to 0.9 with one gravimeter   m/s²
//!     d         departure of the site between them, value zero (water in the ground)          m/s²
//! # Valid for times between the first and the last determination; nothing is extrapolated.

use super::{Method, WorkedExample, exact, unit};
use crate::diagnostic::{Code, Problem};
use crate::graph::{
    Builder, Distribution, InputDraft, MethodInfo, Origin, Quantity, Value, sensitivities, standard_uncertainty,
};
use crate::numeric::interpolate::bracket;
use crate::quantity::Kind;

/// The registry's line.
pub static METHOD: Method = Method {
    info: MethodInfo {
        name: "gravity-epoch",
        title: "Gravity between absolute determinations",
        source: "linear interpolation; JCGM 100:2008, 5.2",
        formula: "g(t) = (1 − f) g_1 + f g_2 + d,  f = (t − t_1)/(t_2 − t_1)",
        symbols: &[
            ("g_1", "earlier determination", "m/s2"),
            ("g_2", "later determination", "m/s2"),
            ("t_1", "time of the earlier determination", "s"),
            ("t_2", "time of the later determination", "s"),
            ("t", "time of use", "s"),
            ("d", "departure of the site from the line, value zero", "m/s2"),
        ],
        valid_for: "times between the first and the last determination",
    },
    examples: &[
        WorkedExample {
            source: "the formulas in 40-digit arithmetic",
            given: "980890123.4(2.1) µGal on 2019-05-14, 980890118.9(2.3) µGal on 2022-05-12, r = 0.7, u_d = 1 µGal; 2020-11-03",
            quantity: "g/µGal − 980890000",
            printed: "121.1829",
            found: || example().0,
        },
        WorkedExample {
            source: "the formulas in 40-digit arithmetic",
            given: "980890123.4(2.1) µGal on 2019-05-14, 980890118.9(2.3) µGal on 2022-05-12, r = 0.7, u_d = 1 µGal; 2020-11-03",
            quantity: "u(g)/µGal",
            printed: "2.260359",
            found: || example().1,
        },
    ],
};

/// A determination with its time in seconds since 1970.
#[derive(Clone, Copy)]
pub struct Determination<'g> {
    pub time: f64,
    pub gravity: Quantity<'g>,
}

/// Gravity at `time` by the determinations, in order of time, and the departure of the site from the line between them.
///
/// A single determination serves its own time only; [`held`] says what to do with it at another.
///
/// # Errors
/// `out_of_validity` outside the span of the determinations; `design_incomplete` for none, or out of order.
pub fn between<'g>(
    determinations: &[Determination<'g>],
    time: f64,
    departure: Quantity<'g>,
) -> Result<Quantity<'g>, Problem> {
    let times: Vec<f64> = determinations.iter().map(|determination| determination.time).collect();
    if times.is_empty() || times.windows(2).any(|pair| pair[0] >= pair[1]) {
        return Err(Problem::new(
            Code::DesignIncomplete,
            format!("Gravity needs determinations at rising times, found {}.", times.len()),
        ));
    }
    let Some((first, second, f)) = bracket(&times, time) else {
        return Err(Problem::new(
            Code::OutOfValidity,
            "The time of use lies outside the span of the gravity determinations, and nothing is extrapolated.",
        )
        .hint("Add a later determination, or state how far the value may have departed since."));
    };
    let (g_1, g_2) = (determinations[first].gravity, determinations[second].gravity);
    // The larger part comes first: at a determination the line is that determination itself.
    let line = match f {
        0.0 => g_1,
        1.0 => g_2,
        _ => (1.0 - f) * g_1 + f * g_2,
    };
    Ok(line + departure)
}

/// A determination used at another time, with a stated departure since.
pub fn held<'g>(determination: Determination<'g>, departure: Quantity<'g>) -> Quantity<'g> {
    determination.gravity + departure
}

/// The example by the graph: value less 980890000 µGal, and standard uncertainty, in µGal.
fn example() -> (f64, f64) {
    let b = Builder::default();
    let input = |path: &str, value: f64, u: f64| {
        let origin = Origin::Constant("worked example");
        let mut draft = InputDraft::new(path, path, path, Kind::Plain, unit("m/s2"), Value::Scalar(value), origin);
        draft.distribution = Distribution::Normal { standard_uncertainty: u };
        b.input(draft)
    };
    let base = exact(&b, 980_890_000e-8, "m/s2");
    let (g_1, g_2) = (input("g_1", 980_890_123.4e-8, 2.1e-8), input("g_2", 980_890_118.9e-8, 2.3e-8));
    let departure = input("d", 0.0, 1e-8);
    let correlated = b.correlate("r", &[g_1.id, g_2.id], vec![vec![1.0, 0.7], vec![0.7, 1.0]]);
    let day = 86_400.0;
    let list = [Determination { time: 0.0, gravity: g_1 }, Determination { time: 1094.0 * day, gravity: g_2 }];
    let (Ok(()), Ok(found)) = (correlated, between(&list, 539.0 * day, departure)) else { return (f64::NAN, f64::NAN) };
    let difference = (found - base).number() * 1e8;
    let graph = b.graph();
    (difference, standard_uncertainty(&graph, &sensitivities(&graph, found.id)) * 1e8)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn nothing_is_extrapolated() {
        let b = Builder::default();
        let g = |value: f64| exact(&b, value, "m/s2");
        let list = [
            Determination { time: 0.0, gravity: g(9.81) },
            Determination { time: 10.0, gravity: g(9.82) },
            Determination { time: 30.0, gravity: g(9.84) },
        ];
        for (time, expected) in [(0.0, 9.81), (10.0, 9.82), (20.0, 9.83), (30.0, 9.84)] {
            let found = between(&list, time, g(0.0)).expect("inside").number();
            assert!((found - expected).abs() < 1e-14, "{time}");
        }
        for time in [-1e-6, 30.000_001, f64::NAN] {
            assert_eq!(between(&list, time, g(0.0)).err().map(|problem| problem.code), Some(Code::OutOfValidity));
        }
        let mixed = [list[1], list[0]];
        assert_eq!(between(&mixed, 5.0, g(0.0)).err().map(|problem| problem.code), Some(Code::DesignIncomplete));
        assert!(between(&[], 5.0, g(0.0)).is_err());
        assert_eq!(held(list[0], g(1e-8)).number(), 9.81 + 1e-8);
    }
}
