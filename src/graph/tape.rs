//! Scalars of the graph as a tape of operations on rows of trials.
//!
//! Only scalars that depend on something uncertain are on the tape; all others are numbers in it. Runs of sums,
//! differences and products with numbers are gathered into one weighted sum, up to where a sum has several users. Rows
//! are short enough to stay in the processor's first cache, loops run without branches, and no fused multiply-add is used, so that the bits are the same
//! on every machine.

use super::node::*;
use super::value::apply_scalar;
use std::collections::BTreeMap;

/// Trials worked on at a time.
pub(super) const CHUNK: usize = 128;

/// A row of the working memory.
pub(super) type Row = [f64; CHUNK];

/// A row of trials in the working memory.
pub(super) type Register = usize;

/// One operation on rows.
#[derive(Debug, Clone)]
enum Step {
    /// constant + Σ weight × row
    Weighted {
        to: Register,
        constant: f64,
        terms: Vec<(Register, f64)>,
    },
    Product {
        to: Register,
        a: Register,
        b: Register,
    },
    Ratio {
        to: Register,
        a: Register,
        b: Register,
    },
    /// number / row
    Reciprocal {
        to: Register,
        number: f64,
        b: Register,
    },
    Square {
        to: Register,
        a: Register,
    },
    Single {
        to: Register,
        op: Op,
        a: Register,
    },
}

impl Step {
    fn writes(&self) -> Register {
        match self {
            Step::Weighted { to, .. }
            | Step::Product { to, .. }
            | Step::Ratio { to, .. }
            | Step::Reciprocal { to, .. }
            | Step::Square { to, .. }
            | Step::Single { to, .. } => *to,
        }
    }

    fn reads(&self, mut visit: impl FnMut(Register)) {
        match self {
            Step::Weighted { terms, .. } => terms.iter().for_each(|(register, _)| visit(*register)),
            Step::Product { a, b, .. } | Step::Ratio { a, b, .. } => {
                visit(*a);
                visit(*b);
            }
            Step::Reciprocal { b: a, .. } | Step::Square { a, .. } | Step::Single { a, .. } => visit(*a),
        }
    }

    fn move_to(&mut self, places: &[usize]) {
        let shift = |register: &mut Register| *register = places[*register];
        match self {
            Step::Weighted { to, terms, .. } => {
                shift(to);
                terms.iter_mut().for_each(|(register, _)| shift(register));
            }
            Step::Product { to, a, b } | Step::Ratio { to, a, b } => [to, a, b].into_iter().for_each(shift),
            Step::Reciprocal { to, b: a, .. } | Step::Square { to, a } | Step::Single { to, a, .. } => {
                [to, a].into_iter().for_each(shift);
            }
        }
    }
}

/// A scalar as a weighted sum of rows, not yet worked out.
#[derive(Debug, Clone)]
struct Form {
    constant: f64,
    terms: Vec<(Register, f64)>,
}

impl Form {
    fn number(constant: f64) -> Form {
        Form { constant, terms: Vec::new() }
    }

    fn row(register: Register) -> Form {
        Form { constant: 0.0, terms: vec![(register, 1.0)] }
    }

    /// constant + weight × row
    fn scaled(constant: f64, register: Register, weight: f64) -> Form {
        Form { constant, terms: vec![(register, weight)] }
    }

    fn plus(&self, other: &Form, sign: f64) -> Form {
        let mut terms: BTreeMap<Register, f64> = self.terms.iter().copied().collect();
        for (register, weight) in &other.terms {
            *terms.entry(*register).or_insert(0.0) += sign * weight;
        }
        Form { constant: self.constant + sign * other.constant, terms: terms.into_iter().collect() }
    }

    fn times(&self, factor: f64) -> Form {
        Form {
            constant: self.constant * factor,
            terms: self.terms.iter().map(|(register, weight)| (*register, weight * factor)).collect(),
        }
    }

    fn is_number(&self) -> bool {
        self.terms.is_empty()
    }
}

/// The longest weighted sum carried on before it is worked out once.
const LONGEST_SUM: usize = 8;

/// The tape of some measurands.
#[derive(Debug, Default)]
pub(super) struct Tape {
    steps: Vec<Step>,
    registers: usize,
    /// Row of each register, once settled.
    places: Vec<usize>,
    rows: usize,
    forms: BTreeMap<NodeId, Form>,
    /// How often each scalar is used.
    uses: BTreeMap<NodeId, usize>,
    /// Registers of the measurands, or the number of one that nothing uncertain reaches.
    outputs: Vec<Result<Register, f64>>,
}

impl Tape {
    /// An empty tape, told how often each scalar will be used.
    pub fn new(uses: BTreeMap<NodeId, usize>) -> Tape {
        Tape { uses, ..Tape::default() }
    }

    /// A row that the caller fills: an input's draws, a response's noise.
    pub fn reserve(&mut self) -> Register {
        self.registers += 1;
        self.registers - 1
    }

    /// How many rows the working memory needs.
    pub fn rows(&self) -> usize {
        self.rows
    }

    /// The row of the working memory that a reserved register has from the beginning.
    pub fn row_of(&self, register: Register) -> usize {
        self.places.get(register).copied().unwrap_or(0)
    }

    /// Gives every register a row; a row is used again when nothing reads it any more.
    pub fn settle(&mut self) {
        let kept = self.outputs.iter().flatten().copied();
        let mut last_use = vec![0; self.registers];
        for (index, step) in self.steps.iter().enumerate() {
            step.reads(|register| last_use[register] = index + 1);
        }
        kept.for_each(|register| last_use[register] = usize::MAX);
        let written: std::collections::BTreeSet<Register> = self.steps.iter().map(Step::writes).collect();
        self.places = vec![usize::MAX; self.registers];
        let mut free = Vec::new();
        let mut rows = 0;
        let mut take = |free: &mut Vec<usize>| {
            free.pop().unwrap_or_else(|| {
                rows += 1;
                rows - 1
            })
        };
        for register in (0..self.registers).filter(|register| !written.contains(register)) {
            self.places[register] = take(&mut free);
        }
        for index in 0..self.steps.len() {
            let to = self.steps[index].writes();
            self.places[to] = take(&mut free);
            self.steps[index].reads(|register| {
                // A register read twice by one step is freed once.
                if last_use[register] == index + 1 {
                    last_use[register] = 0;
                    free.push(self.places[register]);
                }
            });
        }
        let places = &self.places;
        self.steps.iter_mut().for_each(|step| step.move_to(places));
        for register in self.outputs.iter_mut().flatten() {
            *register = places[*register];
        }
        self.rows = rows;
    }

    /// The scalar `id` is centre + scale × the row `register`.
    pub fn bind(&mut self, id: NodeId, centre: f64, scale: f64, register: Register) {
        self.forms.insert(id, Form::scaled(centre, register, scale));
    }

    /// The scalar `id` never changes.
    pub fn fix(&mut self, id: NodeId, number: f64) {
        self.forms.insert(id, Form::number(number));
    }

    /// The scalar `id` answers other scalars linearly about their estimates, with rows of noise added.
    pub fn respond(&mut self, id: NodeId, estimate: f64, weights: &[(NodeId, f64, f64)], noise: &[(Register, f64)]) {
        let mut form = Form { constant: estimate, terms: noise.to_vec() };
        for (scalar, weight, centre) in weights {
            let departure = self.form(*scalar).plus(&Form::number(*centre), -1.0);
            form = form.plus(&departure.times(*weight), 1.0);
        }
        self.keep(id, form);
    }

    /// Adds a scalar operation; operands must be there.
    pub fn add(&mut self, graph: &Graph, id: NodeId) {
        let form = match &graph.node(id).op {
            Op::Add(a, b) => self.form(*a).plus(&self.form(*b), 1.0),
            Op::Subtract(a, b) => self.form(*a).plus(&self.form(*b), -1.0),
            Op::Negate(a) => self.form(*a).times(-1.0),
            Op::Power(a, 1) => self.form(*a),
            Op::Multiply(a, b) => self.product(*a, *b),
            Op::Divide(a, b) => self.ratio(*a, *b),
            Op::Power(a, 2) => self.single(*a, |to, a| Step::Square { to, a }, |x| x * x),
            op => {
                let operand = op.operands().first().copied().unwrap_or(id);
                let op = op.clone();
                let number = op.clone();
                self.single(operand, |to, a| Step::Single { to, op, a }, |x| apply_scalar(&number, x))
            }
        };
        self.keep(id, form);
    }

    /// Which scalars are asked for.
    pub fn ask(&mut self, measurands: &[NodeId]) {
        for id in measurands {
            let form = self.form(*id);
            let output = if form.is_number() { Err(form.constant) } else { Ok(self.work_out(&form)) };
            self.outputs.push(output);
        }
    }

    fn form(&self, id: NodeId) -> Form {
        self.forms.get(&id).cloned().unwrap_or_else(|| Form::number(f64::NAN))
    }

    /// Sums used several times are worked out once for all their users, and so are long ones.
    fn keep(&mut self, id: NodeId, form: Form) {
        let is_shared = self.uses.get(&id).is_some_and(|uses| *uses > 1);
        let most = if is_shared { 1 } else { LONGEST_SUM };
        let form = if form.terms.len() > most { Form::row(self.work_out(&form)) } else { form };
        self.forms.insert(id, form);
    }

    fn work_out(&mut self, form: &Form) -> Register {
        if let [(register, weight)] = form.terms.as_slice()
            && *weight == 1.0
            && form.constant == 0.0
        {
            return *register;
        }
        let to = self.reserve();
        self.steps.push(Step::Weighted { to, constant: form.constant, terms: form.terms.clone() });
        to
    }

    fn product(&mut self, a: NodeId, b: NodeId) -> Form {
        let (left, right) = (self.form(a), self.form(b));
        if left.is_number() {
            return right.times(left.constant);
        }
        if right.is_number() {
            return left.times(right.constant);
        }
        let (a, b) = (self.shared(a), self.shared(b));
        let to = self.reserve();
        self.steps.push(if a == b { Step::Square { to, a } } else { Step::Product { to, a, b } });
        Form::row(to)
    }

    fn ratio(&mut self, a: NodeId, b: NodeId) -> Form {
        let (left, right) = (self.form(a), self.form(b));
        if right.is_number() {
            return left.times(1.0 / right.constant);
        }
        let b = self.shared(b);
        let to;
        if left.is_number() {
            to = self.reserve();
            self.steps.push(Step::Reciprocal { to, number: left.constant, b });
        } else {
            let a = self.shared(a);
            to = self.reserve();
            self.steps.push(Step::Ratio { to, a, b });
        }
        Form::row(to)
    }

    fn single(
        &mut self,
        a: NodeId,
        step: impl FnOnce(Register, Register) -> Step,
        number: impl FnOnce(f64) -> f64,
    ) -> Form {
        let form = self.form(a);
        if form.is_number() {
            return Form::number(number(form.constant));
        }
        let a = self.shared(a);
        let to = self.reserve();
        self.steps.push(step(to, a));
        Form::row(to)
    }

    /// The row of a scalar, worked out once for all its users.
    fn shared(&mut self, id: NodeId) -> Register {
        let register = self.work_out(&self.form(id));
        self.forms.insert(id, Form::row(register));
        register
    }

    /// Runs the tape over the first `length` trials of every row.
    ///
    /// The same loops are compiled for wider registers too and chosen by what the processor has; each operation is
    /// rounded by itself in all of them, so the bits are the same.
    pub fn run(&self, rows: &mut [Row], length: usize) {
        let steps = self.steps.as_slice();
        crate::numeric::wide::widest!(run_steps(steps: &[Step], rows: &mut [Row], length: usize));
    }

    /// Copies a measurand's trials out of the working memory.
    pub fn read(&self, measurand: usize, rows: &[Row], into: &mut [f64]) {
        match self.outputs.get(measurand) {
            Some(Ok(register)) => into.copy_from_slice(&rows[*register][..into.len()]),
            Some(Err(number)) => into.fill(*number),
            None => into.fill(f64::NAN),
        }
    }
}

#[inline(always)]
fn run_steps(steps: &[Step], rows: &mut [Row], length: usize) {
    for step in steps {
        match step {
            Step::Weighted { to, constant, terms } => weighted(rows, *to, *constant, terms),
            Step::Product { to, a, b } => binary(rows, *to, *a, *b, |a, b| a * b),
            Step::Ratio { to, a, b } => binary(rows, *to, *a, *b, |a, b| a / b),
            Step::Reciprocal { to, number, b } => unary(rows, *to, *b, CHUNK, |b| number / b),
            Step::Square { to, a } => unary(rows, *to, *a, CHUNK, |a| a * a),
            Step::Single { to, op, a } => unary(rows, *to, *a, length, |a| apply_scalar(op, a)),
        }
    }
}

#[inline(always)]
fn binary(rows: &mut [Row], to: usize, a: usize, b: usize, f: impl Fn(f64, f64) -> f64) {
    // The rows of one step are distinct: a square is a step of its own, and a row is taken before any is freed.
    if let Ok([to, a, b]) = rows.get_disjoint_mut([to, a, b]) {
        for index in 0..CHUNK {
            to[index] = f(a[index], b[index]);
        }
    }
}

#[inline(always)]
fn unary(rows: &mut [Row], to: usize, a: usize, length: usize, f: impl Fn(f64) -> f64) {
    if let Ok([to, a]) = rows.get_disjoint_mut([to, a]) {
        for (to, a) in to[..length].iter_mut().zip(&a[..length]) {
            *to = f(*a);
        }
    }
}

/// Three terms a pass, so that most sums need one.
#[inline(always)]
fn weighted(rows: &mut [Row], to: usize, constant: f64, terms: &[(Register, f64)]) {
    let (first, others) = terms.split_at(terms.len().min(3));
    add_terms(rows, to, |_| constant, first);
    for terms in others.chunks(3) {
        add_terms(rows, to, |sum| sum, terms);
    }
}

#[inline(always)]
fn add_terms(rows: &mut [Row], to: usize, start: impl Fn(f64) -> f64, terms: &[(Register, f64)]) {
    match *terms {
        [(a, p)] => {
            if let Ok([to, a]) = rows.get_disjoint_mut([to, a]) {
                for index in 0..CHUNK {
                    to[index] = start(to[index]) + p * a[index];
                }
            }
        }
        [(a, p), (b, q)] => {
            if let Ok([to, a, b]) = rows.get_disjoint_mut([to, a, b]) {
                for index in 0..CHUNK {
                    to[index] = start(to[index]) + p * a[index] + q * b[index];
                }
            }
        }
        [(a, p), (b, q), (c, r)] => {
            if let Ok([to, a, b, c]) = rows.get_disjoint_mut([to, a, b, c]) {
                for index in 0..CHUNK {
                    to[index] = start(to[index]) + p * a[index] + q * b[index] + r * c[index];
                }
            }
        }
        _ => {}
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn wide_registers_change_no_bits() {
        let terms = |count: usize| (0..count).map(|row| (row, 0.1 + row as f64)).collect();
        let steps = [
            Step::Weighted { to: 9, constant: 0.3, terms: terms(1) },
            Step::Weighted { to: 10, constant: 0.0, terms: terms(2) },
            Step::Weighted { to: 11, constant: -7.0, terms: terms(8) },
            Step::Product { to: 12, a: 9, b: 10 },
            Step::Ratio { to: 13, a: 11, b: 12 },
            Step::Reciprocal { to: 14, number: 3.0, b: 13 },
            Step::Square { to: 15, a: 14 },
            Step::Single { to: 16, op: Op::SquareRoot(NodeId(0)), a: 15 },
        ];
        let row = |seed: usize| std::array::from_fn(|trial| 1.0 / (1 + seed * CHUNK + trial) as f64);
        let (mut narrow, mut wide): (Vec<Row>, Vec<Row>) = ((0..17).map(row).collect(), (0..17).map(row).collect());
        run_steps(&steps, &mut narrow, CHUNK);
        Tape { steps: steps.into(), ..Tape::default() }.run(&mut wide, CHUNK);
        assert_eq!(narrow, wide);
        let by_hand =
            -7.0 + (0..8).fold(0.0, |sum, register| sum + (0.1 + f64::from(register)) * narrow[register as usize][5]);
        assert!((narrow[11][5] - by_hand).abs() < 1e-14, "{} and not {by_hand}", narrow[11][5]);
    }
}
