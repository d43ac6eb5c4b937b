//! Trials until the results are stable to a stated number of significant digits.
//!
//! # Source   JCGM 101:2008, 7.9.4.
//! # Formula  sequences of M trials; after h of them, s_y = s(y^(1) … y^(h)) / √h, likewise for u, y_low, y_high;
//!            stop when 2 s ≤ δ for all four, δ being the numerical tolerance of u to n digits.

use super::interval::{Distributed, distributed, numerical_tolerance};
use super::monte_carlo::{BLOCK, Sampler, Trials};
use super::node::*;
use crate::diagnostic::Problem;
use crate::numeric::sum::experimental_standard_deviation;

/// Trials in a sequence: the least the clause allows, 10⁴, rounded up to whole blocks.
const SEQUENCE: usize = 10 * BLOCK;

/// How an adaptive run ended.
#[derive(Debug, Clone)]
pub struct Adaptive {
    pub trials: Trials,
    pub sequences: usize,
    /// The numerical tolerance of each measurand.
    pub tolerances: Vec<f64>,
    /// Whether all results became stable before the most trials allowed.
    pub is_stable: bool,
}

/// Runs sequences of trials until estimate, standard uncertainty and both ends of the symmetric interval of every
/// measurand are stable to `digits` significant digits of u, or `most` trials are made.
///
/// # Errors
/// When a covariance on the way is impossible.
pub fn propagate_until_stable(
    graph: &Graph,
    measurands: &[NodeId],
    probability: f64,
    digits: usize,
    most: usize,
) -> Result<Adaptive, Problem> {
    let sampler = Sampler::new(graph, measurands)?;
    let mut all = Trials { values: vec![Vec::new(); measurands.len()] };
    let mut summaries: Vec<Vec<Distributed>> = vec![Vec::new(); measurands.len()];
    let least = SEQUENCE.max((100.0 / (1.0 - probability)).ceil() as usize).div_ceil(BLOCK) * BLOCK;
    let mut sequences = 0;
    loop {
        let made = sampler.trials((sequences * least / BLOCK) as u64, least);
        sequences += 1;
        for (index, mut values) in made.values.into_iter().enumerate() {
            all.values[index].extend_from_slice(&values);
            summaries[index].push(distributed(&mut values, probability));
        }
        let tolerances: Vec<f64> = summaries
            .iter()
            .map(|list| numerical_tolerance(mean_of(list, |one| one.standard_uncertainty), digits))
            .collect();
        let is_stable =
            sequences > 1 && summaries.iter().zip(&tolerances).all(|(list, tolerance)| stable(list, *tolerance));
        if is_stable || (sequences + 1) * least > most {
            return Ok(Adaptive { trials: all, sequences, tolerances, is_stable });
        }
    }
}

fn mean_of(list: &[Distributed], of: impl Fn(&Distributed) -> f64) -> f64 {
    list.iter().map(of).sum::<f64>() / list.len().max(1) as f64
}

fn stable(list: &[Distributed], tolerance: f64) -> bool {
    let scatter = |of: fn(&Distributed) -> f64| {
        let values: Vec<f64> = list.iter().map(of).collect();
        experimental_standard_deviation(&values).unwrap_or(f64::INFINITY) / (values.len() as f64).sqrt()
    };
    let figures: [fn(&Distributed) -> f64; 4] =
        [|one| one.estimate, |one| one.standard_uncertainty, |one| one.symmetric.0, |one| one.symmetric.1];
    figures.into_iter().all(|figure| 2.0 * scatter(figure) <= tolerance)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::graph::{Builder, Distribution, InputDraft, Value};
    use crate::quantity::{Kind, Unit};

    fn sum_of_four(distribution: Distribution) -> (Graph, NodeId) {
        let builder = Builder::default();
        let made = (0..4).map(|index| {
            let origin = Origin::Assumed("test");
            let mut draft =
                InputDraft::new(&format!("x{index}"), "x", "x", Kind::Plain, Unit::one(), Value::Scalar(0.0), origin);
            draft.distribution = distribution;
            builder.input(draft)
        });
        let id = made.reduce(|sum, next| sum + next).expect("four").id;
        (builder.finish().0, id)
    }

    #[test]
    fn four_gaussians_and_four_rectangles_of_the_guide() {
        // JCGM 101:2008, 9.2.2 and 9.2.3: u = 2.00; ends ±3.92 and ±3.88.
        let rectangle = Distribution::Rectangular { half_width: 3f64.sqrt() };
        for (distribution, end) in [(Distribution::Normal { standard_uncertainty: 1.0 }, 3.92), (rectangle, 3.88)] {
            let (graph, id) = sum_of_four(distribution);
            let run = propagate_until_stable(&graph, &[id], 0.95, 2, 4_000_000).expect("runs");
            let found = run.trials.summary(0, 0.95);
            assert!(run.is_stable && run.sequences > 1, "{} sequences", run.sequences);
            assert_eq!(run.tolerances, [0.05]);
            // Stability is judged from few sequences, so an end may be off by a little more than the tolerance.
            assert!((found.standard_uncertainty - 2.0).abs() < 0.05, "{found:?}");
            assert!((found.symmetric.1 - end).abs() < 0.1 && (found.symmetric.0 + end).abs() < 0.1, "{found:?}");
        }
    }

    #[test]
    fn a_run_without_stability_says_so() {
        let (graph, id) = sum_of_four(Distribution::Normal { standard_uncertainty: 1.0 });
        let run = propagate_until_stable(&graph, &[id], 0.95, 4, 30_000).expect("runs");
        assert!(!run.is_stable);
    }
}
