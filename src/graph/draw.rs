//! Draws of inputs about their estimates, a row of trials at a time.
//!
//! # Source   JCGM 101:2008, 6.4; joint draws 6.4.8 and 6.4.9.

use super::node::*;
use crate::diagnostic::Problem;
use crate::numeric::linear::covariance_factor;
use crate::numeric::stream::{Key, Stream};
use crate::numeric::tabulated::{Gamma, StudentT};
use crate::numeric::{self, sampler};

/// An input drawn by itself.
pub(super) struct Draw<'g> {
    input: &'g Input,
    pub key: Key,
    /// Its row in the working memory.
    pub row: usize,
    table: Option<StudentT>,
}

/// What a row of draws of this input is multiplied by and added to: those of the plainest distributions are drawn in
/// standard form, so that the scaling becomes part of the sums they enter.
pub(super) fn scaling(graph: &Graph, number: u32) -> (f64, f64) {
    let input = &graph.inputs[number as usize];
    let scale = match input.distribution {
        _ if graph.correlated.iter().any(|group| group.position(number).is_some()) => 1.0,
        Distribution::Normal { standard_uncertainty } => standard_uncertainty,
        Distribution::StudentT { scale } => scale,
        Distribution::Rectangular { half_width } => half_width,
        _ => 1.0,
    };
    (graph.number(input.node), scale)
}

impl<'g> Draw<'g> {
    pub fn new(graph: &'g Graph, number: u32, row: usize) -> Self {
        let input = &graph.inputs[number as usize];
        let path = graph.node(input.node).name.as_ref().map_or("", |name| name.path.as_str());
        let is_t =
            matches!(input.distribution, Distribution::StudentT { .. }) && has_variance(input.degrees_of_freedom);
        let table = if is_t { StudentT::new(input.degrees_of_freedom) } else { None };
        Self { input, key: Key::new(path), row, table }
    }

    /// Draws in the form that [`scaling`] expects.
    pub fn fill(&self, stream: &mut Stream, row: &mut [f64]) {
        match self.input.distribution {
            Distribution::Normal { .. } => stream.fill_normal(row),
            Distribution::StudentT { .. } => self.fill_t(stream, row),
            Distribution::Rectangular { .. } => {
                stream.fill_uniform(row);
                row.iter_mut().for_each(|value| *value = 2.0 * *value - 1.0);
            }
            _ => row.iter_mut().for_each(|value| *value = departure(self.input, stream)),
        }
    }

    /// Where the t has no variance, the normal distribution takes its place.
    fn fill_t(&self, stream: &mut Stream, row: &mut [f64]) {
        let freedom = self.input.degrees_of_freedom;
        if let Some(table) = &self.table {
            stream.fill_normal(row);
            row.iter_mut().for_each(|value| *value = table.at(*value));
        } else if has_variance(freedom) {
            row.fill_with(|| numeric::distribution::student_t_quantile(stream.uniform(), freedom));
        } else {
            stream.fill_normal(row);
        }
    }
}

fn has_variance(degrees_of_freedom: f64) -> bool {
    degrees_of_freedom > 2.0
}

/// One draw of an input about its estimate (JCGM 101, 6.4).
fn departure(input: &Input, stream: &mut Stream) -> f64 {
    match input.distribution {
        Distribution::Exact => 0.0,
        Distribution::Normal { standard_uncertainty: scale } | Distribution::StudentT { scale } => {
            scale * stream.normal()
        }
        Distribution::Rectangular { half_width } => half_width * (2.0 * stream.uniform() - 1.0),
        Distribution::Triangular { half_width } => half_width * (stream.uniform() + stream.uniform() - 1.0),
        Distribution::RectangularInexact { half_width, inexactness } => {
            sampler::rectangular_inexact_limits(-half_width, half_width, inexactness, stream.uniform())
        }
        Distribution::Trapezoidal { half_width, beta } => {
            sampler::trapezoidal(-half_width, half_width, beta, stream.uniform())
        }
        Distribution::Exponential { mean } => sampler::exponential(mean, stream.uniform()) - mean,
        Distribution::Gamma { shape, rate } => sampler::gamma(shape, rate, stream.uniform()) - shape / rate,
        Distribution::Arcsine { half_width } => {
            half_width * numeric::elementary::sin(std::f64::consts::TAU * stream.uniform())
        }
    }
}

/// Joint draws about zero: multivariate t (JCGM 101, 6.4.9.2), or multivariate normal where the degrees of freedom are
/// infinite or so few that the t has no variance.
pub(super) struct JointDraw {
    root: Vec<Vec<f64>>,
    /// Degrees of freedom of a t, with a table of the gamma distribution of half as many.
    t: Option<(f64, Option<Gamma>)>,
}

impl JointDraw {
    /// # Errors
    /// When the covariance is impossible.
    pub fn new(covariance: &[Vec<f64>], degrees_of_freedom: f64) -> Result<JointDraw, Problem> {
        let is_t = has_variance(degrees_of_freedom) && degrees_of_freedom.is_finite();
        let t = is_t.then(|| (degrees_of_freedom, Gamma::new(degrees_of_freedom / 2.0)));
        Ok(JointDraw { root: covariance_factor(covariance)?, t })
    }

    /// Calls `put` with trial, member and draw. A trial takes one draw for the scale of a t, then one for each member.
    pub fn fill(&self, stream: &mut Stream, trials: usize, mut put: impl FnMut(usize, usize, f64)) {
        if self.root.is_empty() {
            return;
        }
        let first = usize::from(self.t.is_some());
        let width = first + self.root.len();
        let mut uniform = vec![0.0; trials * width];
        stream.fill_uniform(&mut uniform);
        let mut normal = uniform.clone();
        numeric::normal::quantiles_in_place(&mut normal);
        for trial in 0..trials {
            let start = trial * width;
            let scale = self.scale(uniform[start], normal[start]);
            let normals = &normal[start + first..start + width];
            for (member, root) in self.root.iter().enumerate() {
                put(trial, member, scale * root.iter().zip(normals).map(|(cell, normal)| cell * normal).sum::<f64>());
            }
        }
    }

    /// √(ν/χ²), which turns normal draws into t draws; 1 for normal ones.
    fn scale(&self, uniform: f64, normal: f64) -> f64 {
        let Some((freedom, table)) = &self.t else { return 1.0 };
        let half_chi_square = match table {
            Some(table) => table.at(normal),
            None => numeric::gamma::gamma_quantile(freedom / 2.0, uniform),
        };
        (freedom / (2.0 * half_chi_square)).sqrt()
    }
}
