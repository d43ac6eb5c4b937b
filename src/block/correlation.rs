//! Stated correlation between inputs: a certificate's matrix.

use super::engine::{Block, Engine};
use super::field::{Field, Shape, needed, optional};
use super::fields::Fields;
use super::{BlockKind, no_build};
use crate::diagnostic::{Code, Complaints, Problem};
use crate::graph::NodeId;
use crate::record::Node;

const PAIR_FIELDS: &[Field] = &[
    needed("a", Shape::Text, "the path of one input"),
    needed("b", Shape::Text, "the path of the other"),
    needed("r", Shape::Number, "their correlation coefficient, from −1 to 1"),
];

/// Stated correlation.
pub static KIND: BlockKind = BlockKind {
    name: "correlation",
    meaning: "stated correlation coefficients between inputs",
    fields: &[
        needed("between", Shape::Results, "the paths of the inputs"),
        optional("coefficients", Shape::Grid, "the matrix of coefficients, row by row"),
        optional("pairs", Shape::Mappings(PAIR_FIELDS), "coefficients of single pairs; all others are zero"),
        optional("source", Shape::Text, "where they come from"),
    ],
    outputs: &[],
    check,
    build: no_build,
};

fn check(fields: Fields<'_>, complaints: &mut Complaints) {
    if fields.get("coefficients").is_some() == fields.get("pairs").is_some() {
        let problem = Problem::new(Code::FieldMissing, "A correlation needs either coefficients or pairs.");
        complaints.add_at(problem.hint("Write `pairs: [{a: …, b: …, r: 0.5}]`."), fields.place());
        return;
    }
    let place = fields.get("coefficients").or_else(|| fields.get("pairs")).map_or(fields.place(), |node| node.place);
    let verdict = matrix(fields).and_then(|matrix| crate::numeric::linear::covariance_factor(&matrix).map(|_| ()));
    complaints.keep(verdict.map_err(|problem| Problem { range: None, ..problem }), place);
}

/// The matrix of coefficients.
fn matrix(fields: Fields<'_>) -> Result<Vec<Vec<f64>>, Problem> {
    let paths = fields.texts("between");
    let size = paths.len();
    let impossible = |message: String| {
        Problem::new(Code::CorrelationImpossible, message).hint("Take the coefficients from the certificate again.")
    };
    if let Some(rows) = fields.get("coefficients").and_then(Node::as_list) {
        let read = |node: &Node| super::field::number(node.as_text().unwrap_or_default());
        let matrix: Vec<Vec<f64>> = rows
            .iter()
            .map(|row| row.as_list().unwrap_or_default().iter().map(read).collect())
            .collect::<Result<_, _>>()?;
        if matrix.len() != size || matrix.iter().any(|row| row.len() != size) {
            return Err(impossible(format!(
                "The matrix must have {size} rows of {size} coefficients, one for each input."
            )));
        }
        for (i, row) in matrix.iter().enumerate() {
            for (j, cell) in row.iter().enumerate() {
                let expected = if i == j { 1.0 } else { matrix[j][i] };
                if *cell != expected {
                    let names = (&paths[i].text, &paths[j].text);
                    return Err(impossible(match i == j {
                        true => format!("{} must correlate with itself by 1, not {cell}.", names.0),
                        false => format!("{} and {} have two coefficients, {cell} and {expected}.", names.0, names.1),
                    }));
                }
            }
        }
        return Ok(matrix);
    }
    let mut matrix: Vec<Vec<f64>> =
        (0..size).map(|i| (0..size).map(|j| f64::from(u8::from(i == j))).collect()).collect();
    for pair in fields.mappings("pairs") {
        let at = |name: &str| {
            let path = pair.words(name);
            paths
                .iter()
                .position(|known| known.text == path)
                .ok_or_else(|| impossible(format!("{path} is not listed in between.")))
        };
        let (i, j, r) = (at("a")?, at("b")?, pair.number("r").unwrap_or(f64::NAN));
        if i == j || !(-1.0..=1.0).contains(&r) {
            return Err(impossible(format!(
                "The coefficient {r} of {} and {} is not possible.",
                pair.words("a"),
                pair.words("b")
            )));
        }
        (matrix[i][j], matrix[j][i]) = (r, r);
    }
    Ok(matrix)
}

/// Applies every correlation whose inputs are all in the graph.
pub fn apply_all(engine: &Engine) {
    for block in engine.blocks().values().filter(|block| block.kind.name == KIND.name && block.sound) {
        apply(engine, block);
    }
}

fn apply(engine: &Engine, block: &Block) -> Option<()> {
    let fields = block.fields();
    let known = engine.graph().correlated.iter().any(|group| group.path == block.name());
    let nodes: Vec<NodeId> =
        fields.texts("between").iter().map(|path| engine.graph().find(&path.text)).collect::<Option<_>>()?;
    if known {
        return None;
    }
    engine.mark_used(block.name());
    let matrix = matrix(fields).ok()?;
    engine.keep(engine.builder.correlate(block.name(), &nodes, matrix), fields.place_of("between"));
    Some(())
}

/// Complains of a correlation that could never be applied, after everything was built.
pub fn check_applied(engine: &Engine) {
    for block in engine.blocks().values().filter(|block| block.kind.name == KIND.name && block.sound) {
        for path in block.fields().texts("between") {
            if engine.graph().find(&path.text).is_none() {
                let problem =
                    Problem::new(Code::UndefinedReference, format!("{} is no input of any block.", path.text));
                let graph = engine.graph();
                let near =
                    crate::diagnostic::nearest(&path.text, graph.names.keys().map(String::as_str)).map(String::from);
                drop(graph);
                engine.complain(
                    near.map_or(problem.clone(), |near| problem.hint(format!("Did you mean {near}?"))),
                    path.place,
                );
            }
        }
    }
}
