//! Propagation of distributions by Monte Carlo, in blocks of trials.
//!
//! # Source   JCGM 101:2008, clauses 6 and 7; JCGM 102:2011 for several measurands in one run.
//!
//! Scalars are drawn and evaluated trial by trial. A number taken from columns (a sum, a row, an estimator's
//! output) answers the scalars that shape its columns through its linear response at the estimates, so that the
//! cost of a trial does not grow with the rows; [`linearity_departure`] checks that response by evaluating the
//! graph anew. Random streams are keyed by input path and block: a new input leaves all other draws as they were,
//! and blocks may run on any number of threads.

use super::draw::{Draw, JointDraw, scaling};
use super::evaluate::evaluate_displaced;
use super::interval::{Distributed, distributed};
use super::node::*;
use super::sensitivity::{Sensitivities, linear_response};
use super::tape::{CHUNK, Register, Row, Tape};
use super::value::Value;
use crate::diagnostic::Problem;
use crate::numeric::linear::covariance_factor;
use crate::numeric::stream::{Key, Stream};
use rayon::prelude::*;
use std::collections::{BTreeMap, BTreeSet};

/// Trials in one block; sums are taken block by block in order, so the bits do not depend on threads.
pub const BLOCK: usize = 1024;

/// A run of trials over any number of measurands.
#[derive(Debug, Clone)]
pub struct Trials {
    /// `values[measurand][trial]`, in coherent SI units.
    pub values: Vec<Vec<f64>>,
}

impl Trials {
    /// Estimate, standard uncertainty and intervals of measurand number `index`.
    pub fn summary(&self, index: usize, coverage_probability: f64) -> Distributed {
        distributed(&mut self.values[index].clone(), coverage_probability)
    }
}

/// Draws `trials` joint values of the measurands.
///
/// # Errors
/// When a covariance on the way is impossible.
pub fn propagate_distributions(graph: &Graph, measurands: &[NodeId], trials: usize) -> Result<Trials, Problem> {
    Ok(Sampler::new(graph, measurands)?.trials(0, trials))
}

/// Draws joint values of measurands, any part of the sequence of trials at a time.
pub struct Sampler<'g> {
    plan: Plan<'g>,
    measurands: usize,
}

impl<'g> Sampler<'g> {
    /// Prepares the draws of these measurands.
    ///
    /// # Errors
    /// When a covariance on the way is impossible.
    pub fn new(graph: &'g Graph, measurands: &[NodeId]) -> Result<Self, Problem> {
        Ok(Self { plan: Plan::new(graph, measurands)?, measurands: measurands.len() })
    }

    /// The trials from block `first` on, a block being [`BLOCK`] trials.
    pub fn trials(&self, first: u64, trials: usize) -> Trials {
        let mut values = vec![vec![0.0; trials]; self.measurands];
        let mut blocks: Vec<Vec<&mut [f64]>> = (0..trials.div_ceil(BLOCK)).map(|_| Vec::new()).collect();
        for measurand in &mut values {
            measurand.chunks_mut(BLOCK).zip(&mut blocks).for_each(|(chunk, block)| block.push(chunk));
        }
        blocks.into_par_iter().enumerate().for_each_init(
            || self.plan.memory(),
            |rows, (block, mut values)| self.plan.block(first + block as u64, rows, &mut values),
        );
        Trials { values }
    }
}

/// How far the linear response of `boundary` departs from the graph evaluated anew, when every scalar that shapes
/// its columns is displaced by its standard uncertainty; relative to the largest such change.
///
/// # Errors
/// Those of an estimator that cannot work with the displaced columns.
pub fn linearity_departure(graph: &Graph, boundary: NodeId) -> Result<f64, Problem> {
    let (response, _) = linear_response(graph, boundary);
    let (mut worst, mut largest) = (0.0f64, 0.0f64);
    for (scalar, weight) in response {
        let Some(input) = graph.input(scalar) else { continue };
        let step = input.distribution.standard_uncertainty();
        if step == 0.0 {
            continue;
        }
        let displaced = BTreeMap::from([(scalar, Value::Scalar(graph.number(scalar) + step))]);
        let moved =
            evaluate_displaced(graph, &displaced, boundary)?[boundary.index()].number() - graph.number(boundary);
        worst = worst.max((moved - weight * step).abs());
        largest = largest.max(moved.abs());
    }
    Ok(if largest > 0.0 { worst / largest } else { 0.0 })
}

/// What is drawn and evaluated in every trial.
struct Plan<'g> {
    graph: &'g Graph,
    tape: Tape,
    draws: Vec<Draw<'g>>,
    groups: Vec<GroupDraw>,
    noise: Noise,
    noise_rows: Vec<Register>,
}

impl<'g> Plan<'g> {
    fn new(graph: &'g Graph, measurands: &[NodeId]) -> Result<Self, Problem> {
        let (needed, responses) = survey(graph, measurands);
        let noise = Noise::new(graph, responses.iter().map(|(id, (_, below))| (*id, &below.inputs)))?;
        let mut tape = Tape::new(uses(graph, &needed, &responses, measurands));
        let noise_rows: Vec<Register> = noise.nodes.iter().map(|_| tape.reserve()).collect();
        let mut draws = Vec::new();
        for id in &needed {
            if let Some((scalars, _)) = responses.get(id) {
                let weights: Vec<(NodeId, f64, f64)> =
                    scalars.iter().map(|(scalar, weight)| (*scalar, *weight, graph.number(*scalar))).collect();
                let own: Vec<(Register, f64)> =
                    noise.number_of(*id).map(|number| (noise_rows[number], 1.0)).into_iter().collect();
                tape.respond(*id, graph.number(*id), &weights, &own);
                continue;
            }
            match &graph.node(*id).op {
                Op::Input(number) if !graph.inputs[*number as usize].distribution.is_exact() => {
                    let register = tape.reserve();
                    let (centre, scale) = scaling(graph, *number);
                    tape.bind(*id, centre, scale, register);
                    draws.push((*number, register));
                }
                Op::Input(_) | Op::Constant(_) => tape.fix(*id, graph.number(*id)),
                _ => tape.add(graph, *id),
            }
        }
        tape.ask(measurands);
        tape.settle();
        let (singles, groups) = split_groups(graph, draws)?;
        let draws =
            singles.into_iter().map(|(number, register)| Draw::new(graph, number, tape.row_of(register))).collect();
        Ok(Self { graph, tape, draws, groups, noise, noise_rows })
    }

    /// The working memory of one thread.
    fn memory(&self) -> Vec<Row> {
        vec![[0.0; CHUNK]; self.tape.rows()]
    }

    /// The measurands in the trials of one block, written where they belong.
    fn block(&self, block: u64, rows: &mut [Row], values: &mut [&mut [f64]]) {
        let length = values.first().map_or(0, |values| values.len());
        let mut streams: Vec<Stream> = self.draws.iter().map(|draw| draw.key.stream(block)).collect();
        let mut group_streams: Vec<Stream> = self.groups.iter().map(|group| group.key.stream(block)).collect();
        let noise = self.noise.draw(self.graph, block, length);
        for start in (0..length).step_by(CHUNK) {
            let count = CHUNK.min(length - start);
            for (draw, stream) in self.draws.iter().zip(&mut streams) {
                draw.fill(stream, &mut rows[draw.row][..count]);
            }
            for (group, stream) in self.groups.iter().zip(&mut group_streams) {
                group.fill(self.graph, stream, rows, count, |register| self.tape.row_of(register));
            }
            for (register, row) in self.noise_rows.iter().zip(&noise) {
                rows[self.tape.row_of(*register)][..count].copy_from_slice(&row[start..start + count]);
            }
            self.tape.run(rows, count);
            for (measurand, into) in values.iter_mut().enumerate() {
                self.tape.read(measurand, rows, &mut into[start..start + count]);
            }
        }
    }
}

/// The joint draw of correlated inputs: multivariate normal, or multivariate t with the fewest degrees of freedom
/// among them (JCGM 101, 6.4.8 and 6.4.9).
struct GroupDraw {
    key: Key,
    /// Inputs by number with their rows; those not needed are drawn all the same, so that streams stay in step.
    members: Vec<(u32, Option<Register>)>,
    joint: JointDraw,
}

/// Inputs drawn singly, by number with their rows.
type SingleDraws = Vec<(u32, Register)>;

/// Takes correlated inputs out of the single draws.
fn split_groups(graph: &Graph, draws: SingleDraws) -> Result<(SingleDraws, Vec<GroupDraw>), Problem> {
    let mut groups = Vec::new();
    for group in &graph.correlated {
        let register = |input: &u32| draws.iter().find(|(number, _)| number == input).map(|(_, register)| *register);
        let members: Vec<(u32, Option<Register>)> =
            group.inputs.iter().map(|input| (*input, register(input))).collect();
        if members.iter().any(|(_, register)| register.is_some()) {
            let freedoms = group.inputs.iter().map(|input| graph.inputs[*input as usize].degrees_of_freedom);
            groups.push(GroupDraw {
                key: Key::new(&group.path),
                members,
                joint: JointDraw::new(&group.coefficients, freedoms.fold(f64::INFINITY, f64::min))?,
            });
        }
    }
    let single = |number: &u32| graph.correlated.iter().all(|group| group.position(*number).is_none());
    Ok((draws.into_iter().filter(|(number, _)| single(number)).collect(), groups))
}

impl GroupDraw {
    fn fill(
        &self,
        graph: &Graph,
        stream: &mut Stream,
        rows: &mut [Row],
        count: usize,
        row_of: impl Fn(Register) -> usize,
    ) {
        self.joint.fill(stream, count, |trial, member, drawn| {
            let (number, Some(register)) = &self.members[member] else { return };
            let uncertainty = graph.inputs[*number as usize].distribution.standard_uncertainty();
            rows[row_of(*register)][trial] = uncertainty * drawn;
        });
    }
}

/// Linear responses by node: weights of scalars, and what lies below.
type Responses = BTreeMap<NodeId, (BTreeMap<NodeId, f64>, Sensitivities)>;

/// How often each scalar is used.
fn uses(
    graph: &Graph,
    needed: &BTreeSet<NodeId>,
    responses: &Responses,
    measurands: &[NodeId],
) -> BTreeMap<NodeId, usize> {
    let mut uses = BTreeMap::new();
    let mut count = |id: NodeId| *uses.entry(id).or_insert(0) += 1;
    measurands.iter().copied().for_each(&mut count);
    for id in needed {
        match responses.get(id) {
            Some((scalars, _)) => scalars.keys().copied().for_each(&mut count),
            None => graph.node(*id).op.operands().into_iter().for_each(&mut count),
        }
    }
    uses
}

/// The scalars that the measurands need, in order, and the responses of those taken from columns.
fn survey(graph: &Graph, measurands: &[NodeId]) -> (BTreeSet<NodeId>, Responses) {
    let mut needed = BTreeSet::new();
    let mut responses = BTreeMap::new();
    let mut waiting: Vec<NodeId> = measurands.to_vec();
    while let Some(id) = waiting.pop() {
        if !needed.insert(id) {
            continue;
        }
        if is_boundary(graph, id) {
            let (scalars, below) = linear_response(graph, id);
            waiting.extend(scalars.keys().copied());
            responses.insert(id, (scalars, below));
        } else {
            waiting.extend(graph.node(id).op.operands());
        }
    }
    (needed, responses)
}

fn is_boundary(graph: &Graph, id: NodeId) -> bool {
    matches!(graph.node(id).op, Op::Sum(_) | Op::Row(..) | Op::Output(..))
}

/// Noise of numbers taken from columns: per-row uncertainty of readings (one joint normal over all of them), and
/// the scatter seen by estimators (a joint t each).
struct Noise {
    nodes: Vec<NodeId>,
    columns_root: Vec<Vec<f64>>,
    estimators: BTreeMap<u32, (Key, JointDraw)>,
}

impl Noise {
    fn new<'a>(
        graph: &Graph,
        below: impl Iterator<Item = (NodeId, &'a BTreeMap<u32, Vec<f64>>)>,
    ) -> Result<Self, Problem> {
        let taken: Vec<(NodeId, NoisyColumns)> = below.map(|(id, inputs)| (id, noisy_columns(graph, inputs))).collect();
        let kept: Vec<_> = taken
            .into_iter()
            .filter(|(id, columns)| !columns.is_empty() || matches!(graph.node(*id).op, Op::Output(..)))
            .collect();
        let covariance: Vec<Vec<f64>> =
            kept.iter().map(|(_, a)| kept.iter().map(|(_, b)| shared_variance(a, b)).collect()).collect();
        let nodes: Vec<NodeId> = kept.iter().map(|(id, _)| *id).collect();
        let estimators: BTreeSet<u32> = nodes.iter().filter_map(|id| output_of(graph, *id).map(|(e, _)| e)).collect();
        let scatter = |number: &u32| {
            let node = &graph.estimators[*number as usize];
            let joint = JointDraw::new(&node.estimate.own_covariance, node.estimate.degrees_of_freedom)?;
            Ok((*number, (Key::new(&node.path), joint)))
        };
        let estimators = estimators.iter().map(scatter).collect::<Result<_, Problem>>()?;
        Ok(Self { nodes, columns_root: covariance_factor(&covariance)?, estimators })
    }

    fn number_of(&self, id: NodeId) -> Option<usize> {
        self.nodes.iter().position(|node| *node == id)
    }

    fn draw(&self, graph: &Graph, block: u64, length: usize) -> Vec<Vec<f64>> {
        let mut noise = self.column_noise(block, length);
        for (&estimator, (key, joint)) in &self.estimators {
            let rows: Vec<(usize, usize)> = (0..self.nodes.len())
                .filter_map(|row| Some((row, output_of(graph, self.nodes[row])?)))
                .filter_map(|(row, (of, output))| (of == estimator).then_some((row, output)))
                .collect();
            joint.fill(&mut key.stream(block), length, |trial, member, drawn| {
                for (row, _) in rows.iter().filter(|(_, output)| *output == member) {
                    noise[*row][trial] += drawn;
                }
            });
        }
        noise
    }

    fn column_noise(&self, block: u64, length: usize) -> Vec<Vec<f64>> {
        let mut noise = vec![vec![0.0; length]; self.nodes.len()];
        for column in 0..self.nodes.len() {
            if self.columns_root.iter().all(|row| row[column] == 0.0) {
                continue;
            }
            let mut stream = Stream::new(&format!("columns of readings {column}"), block);
            let mut drawn = vec![0.0; length];
            stream.fill_normal(&mut drawn);
            for (row, root) in noise.iter_mut().zip(&self.columns_root) {
                row.iter_mut().zip(&drawn).for_each(|(value, drawn)| *value += root[column] * drawn);
            }
        }
        noise
    }
}

fn output_of(graph: &Graph, id: NodeId) -> Option<(u32, usize)> {
    match graph.node(id).op {
        Op::Output(estimator, output) => Some((estimator.0, output as usize)),
        _ => None,
    }
}

/// Weights of noisy columns, by number of the input.
type NoisyColumns = Vec<(u32, Vec<f64>)>;

/// Weights times standard uncertainty, row by row, of the columns that carry a per-row uncertainty.
fn noisy_columns(graph: &Graph, inputs: &BTreeMap<u32, Vec<f64>>) -> NoisyColumns {
    inputs
        .iter()
        .filter_map(|(number, weights)| {
            let input = &graph.inputs[*number as usize];
            let uncertainty = input.distribution.standard_uncertainty();
            let column = graph.value(input.node).length().is_some();
            (column && uncertainty > 0.0)
                .then(|| (*number, weights.iter().map(|weight| weight * uncertainty).collect()))
        })
        .collect()
}

fn shared_variance(a: &[(u32, Vec<f64>)], b: &[(u32, Vec<f64>)]) -> f64 {
    let pairs = a
        .iter()
        .filter_map(|(number, left)| b.iter().find(|(other, _)| other == number).map(|(_, right)| (left, right)));
    pairs.map(|(left, right)| left.iter().zip(right).map(|(l, r)| l * r).sum::<f64>()).sum()
}
