//! Formulas in prose: a small set of LaTeX commands, each with Typst source and words for those who cannot see it.

use super::literal::typst_string;
use super::markup::Markup;
use crate::diagnostic::{Code, Problem, nearest};

/// A formula ready for the page.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Formula {
    /// Typst source of an equation element with its alternative text.
    pub source: String,
    /// The formula in words.
    pub words: String,
}

impl From<Formula> for Markup {
    fn from(formula: Formula) -> Self {
        Markup::code(formula.source)
    }
}

/// Reads a formula; `display` sets it on a line of its own.
///
/// # Errors
/// An unknown command, a bracket that is not closed, a character that has no place in a formula. The range of the
/// problem counts bytes of `latex`.
pub fn formula(latex: &str, display: bool) -> Result<Formula, Problem> {
    let mut reader = Reader { text: latex, at: 0, depth: 0 };
    let parts = reader.sequence(None)?;
    if parts.is_empty() {
        return Err(problem("The formula is empty.".into(), 0, latex.len()));
    }
    let words = words(&parts);
    let source = format!("#math.equation(block: {display}, alt: {}, ${}$);", typst_string(&words), typst(&parts));
    let source = if display { source.replace(", $", ", $ ").replace("$);", " $);") } else { source };
    Ok(Formula { source, words })
}

/// One part of a formula.
#[derive(Debug, Clone, PartialEq)]
enum Part {
    /// Typst source of a sign and its word.
    Sign(String, String),
    Number(String),
    /// Upright text.
    Text(String),
    Group(Vec<Part>),
    Fraction(Vec<Part>, Vec<Part>),
    Root(Vec<Part>, Option<Vec<Part>>),
    /// Typst function over an argument, and its word.
    Over(&'static str, &'static str, Vec<Part>),
    Scripts {
        base: Box<Part>,
        below: Option<Vec<Part>>,
        above: Option<Vec<Part>>,
    },
    Fenced(String, Vec<Part>, String),
}

struct Reader<'a> {
    text: &'a str,
    at: usize,
    depth: usize,
}

/// How deep groups may nest.
const DEEPEST: usize = 24;

impl Reader<'_> {
    fn rest(&self) -> &str {
        self.text.get(self.at..).unwrap_or("")
    }

    fn peek(&self) -> Option<char> {
        self.rest().chars().next()
    }

    fn take(&mut self) -> Option<char> {
        let character = self.peek()?;
        self.at += character.len_utf8();
        Some(character)
    }

    fn skip_spaces(&mut self) {
        while self.peek().is_some_and(char::is_whitespace) {
            self.take();
        }
    }

    /// Parts up to the closing mark (`}` or `\right`), which is taken, or the end.
    fn sequence(&mut self, closing: Option<&str>) -> Result<Vec<Part>, Problem> {
        let opened = self.at;
        self.depth += 1;
        if self.depth > DEEPEST {
            return Err(problem("The formula nests too deep.".into(), self.at, self.at));
        }
        let mut parts: Vec<Part> = Vec::new();
        loop {
            self.skip_spaces();
            if let Some(mark) = closing.filter(|mark| self.rest().starts_with(mark)) {
                self.at += mark.len();
                break;
            }
            match self.peek() {
                None if closing.is_none() => break,
                None => {
                    return Err(problem(
                        "A bracket of the formula is never closed.".into(),
                        opened.saturating_sub(1),
                        opened,
                    ));
                }
                Some('^' | '_') => {
                    let part = self.scripts(parts.pop())?;
                    parts.push(part);
                }
                Some(_) => {
                    let part = self.part()?;
                    parts.push(part);
                }
            }
        }
        self.depth -= 1;
        Ok(parts)
    }

    fn scripts(&mut self, base: Option<Part>) -> Result<Part, Problem> {
        let start = self.at;
        let base = Box::new(base.unwrap_or(Part::Group(Vec::new())));
        let (mut below, mut above) = (None, None);
        loop {
            self.skip_spaces();
            let slot = match self.peek() {
                Some('_') => &mut below,
                Some('^') => &mut above,
                _ => break,
            };
            if slot.is_some() {
                return Err(problem(
                    "A sign of the formula has two scripts of the same kind.".into(),
                    start,
                    self.at + 1,
                ));
            }
            self.at += 1;
            *slot = Some(self.argument()?);
        }
        Ok(Part::Scripts { base, below, above })
    }

    /// A group in braces, or one part.
    fn argument(&mut self) -> Result<Vec<Part>, Problem> {
        self.skip_spaces();
        match self.peek() {
            Some('{') => {
                self.at += 1;
                self.sequence(Some("}"))
            }
            Some(digit) if digit.is_ascii_digit() => {
                self.at += 1;
                Ok(vec![Part::Number(digit.to_string())])
            }
            Some('^' | '_' | '}') | None => {
                Err(problem("A command of the formula lacks its argument.".into(), self.at, self.at))
            }
            Some(_) => Ok(vec![self.part()?]),
        }
    }

    fn part(&mut self) -> Result<Part, Problem> {
        let start = self.at;
        let Some(character) = self.take() else {
            return Err(problem("The formula ends too early.".into(), start, start));
        };
        match character {
            '{' => Ok(Part::Group(self.sequence(Some("}"))?)),
            '\\' => self.command(start),
            digit if digit.is_ascii_digit() => Ok(self.number(start)),
            '~' => Ok(sign("space.nobreak", "")),
            '\'' => Ok(sign("prime", "prime")),
            '-' | '−' => Ok(sign("−", "minus")),
            '+' => Ok(sign("+", "plus")),
            '=' => Ok(sign("=", "equals")),
            '<' => Ok(sign("<", "is less than")),
            '>' => Ok(sign(">", "is greater than")),
            '/' => Ok(sign("\\/", "divided by")),
            '(' | ')' | '[' | ']' | ',' | ';' | ':' | '|' | '!' | '.' | '*' => {
                Ok(sign(&format!("\\{character}"), &character.to_string()))
            }
            letter if letter.is_ascii_alphabetic() => Ok(sign(&letter.to_string(), &letter.to_string())),
            letter if GREEK.iter().any(|(_, greek)| *greek == letter) => {
                let word = GREEK.iter().find(|(_, greek)| *greek == letter).map_or("", |(word, _)| word);
                Ok(sign(&letter.to_string(), word.trim_start_matches("var")))
            }
            symbol if SIGNS.iter().any(|(_, source, _)| source.chars().eq([symbol])) => {
                let word =
                    SIGNS.iter().find(|(_, source, _)| source.chars().eq([symbol])).map_or("", |(_, _, word)| word);
                Ok(sign(&symbol.to_string(), word))
            }
            other => Err(problem(format!("The character {other} has no place in a formula."), start, self.at)
                .hint("Write words as \\text{…}.")),
        }
    }

    fn number(&mut self, start: usize) -> Part {
        while self.peek().is_some_and(|next| next.is_ascii_digit())
            || self.peek() == Some('.') && self.rest().chars().nth(1).is_some_and(|next| next.is_ascii_digit())
        {
            self.take();
        }
        Part::Number(self.text.get(start..self.at).unwrap_or("").to_string())
    }

    fn command(&mut self, start: usize) -> Result<Part, Problem> {
        let letters = self.rest().chars().take_while(char::is_ascii_alphabetic).count();
        if letters == 0 {
            return self.marked_character(start);
        }
        let name = self.text.get(self.at..self.at + letters).unwrap_or("").to_string();
        self.at += letters;
        match name.as_str() {
            "frac" | "dfrac" | "tfrac" => Ok(Part::Fraction(self.argument()?, self.argument()?)),
            "sqrt" => {
                let index = self.index()?;
                Ok(Part::Root(self.argument()?, index))
            }
            "mathrm" | "text" | "operatorname" | "textrm" => Ok(Part::Text(self.upright(start)?)),
            "mathbf" | "boldsymbol" => Ok(Part::Over("bold", "", self.argument()?)),
            "left" => self.fenced(start),
            _ => self.named(&name, start),
        }
    }

    fn named(&mut self, name: &str, start: usize) -> Result<Part, Problem> {
        if let Some((_, function, word)) = ACCENTS.iter().find(|(accent, _, _)| *accent == name) {
            return Ok(Part::Over(function, word, self.argument()?));
        }
        if let Some((word, letter)) = GREEK.iter().find(|(word, _)| *word == name) {
            return Ok(sign(&letter.to_string(), word.trim_start_matches("var")));
        }
        if let Some((_, source, word)) = SIGNS.iter().find(|(known, _, _)| *known == name) {
            return Ok(sign(source, word));
        }
        if FUNCTIONS.contains(&name) {
            return Ok(sign(&format!("op({})", typst_string(name)), name));
        }
        let message = format!("The formula command \\{name} is not known here.");
        let unknown = problem(message, start, self.at);
        Err(match nearest(name, known_commands()) {
            Some(near) => unknown.hint(format!("Is \\{near} meant?")),
            None => unknown,
        })
    }

    /// A backslash before a character that is no letter.
    fn marked_character(&mut self, start: usize) -> Result<Part, Problem> {
        match self.take() {
            Some(',' | ':' | ';') => Ok(sign("thin", "")),
            Some(' ') => Ok(sign("space", "")),
            Some('!') => Ok(Part::Group(Vec::new())),
            Some(character @ ('{' | '}' | '%' | '#' | '$' | '_' | '&')) => {
                Ok(sign(&format!("\\{character}"), &character.to_string()))
            }
            Some('|') => Ok(sign("‖", "double bar")),
            other => {
                let found = other.map(String::from).unwrap_or_default();
                Err(problem(format!("The formula command \\{found} is not known here."), start, self.at))
            }
        }
    }

    fn index(&mut self) -> Result<Option<Vec<Part>>, Problem> {
        self.skip_spaces();
        if self.peek() != Some('[') {
            return Ok(None);
        }
        self.at += 1;
        self.sequence(Some("]")).map(Some)
    }

    /// The raw text of a group in braces.
    fn upright(&mut self, start: usize) -> Result<String, Problem> {
        self.skip_spaces();
        let lacking = problem("Upright text in a formula stands in one pair of braces.".into(), start, self.at);
        let Some(inner) = self.rest().strip_prefix('{') else { return Err(lacking) };
        let Some(length) = inner.find('}') else { return Err(lacking) };
        let text = inner.get(..length).unwrap_or("").to_string();
        self.at += length + 2;
        if text.contains(['\\', '{', '$']) {
            return Err(lacking);
        }
        Ok(text)
    }

    fn fenced(&mut self, start: usize) -> Result<Part, Problem> {
        let opening = self.fence(start)?;
        let body = self.sequence(Some("\\right"))?;
        let closing = self.fence(start)?;
        Ok(Part::Fenced(opening, body, closing))
    }

    fn fence(&mut self, start: usize) -> Result<String, Problem> {
        self.skip_spaces();
        let marked = self.peek() == Some('\\');
        if marked {
            self.at += 1;
        }
        match self.take() {
            Some('.') if !marked => Ok(String::new()),
            Some(mark @ ('(' | ')' | '[' | ']' | '|')) if !marked => Ok(mark.to_string()),
            Some(mark @ ('{' | '}')) if marked => Ok(mark.to_string()),
            _ => Err(problem("\\left and \\right need a bracket or a full stop after them.".into(), start, self.at)),
        }
    }
}

fn sign(source: &str, word: &str) -> Part {
    Part::Sign(source.into(), word.into())
}

fn problem(message: String, start: usize, end: usize) -> Problem {
    Problem::new(Code::ProseUnreadable, message).range(start, end)
}

fn known_commands() -> impl Iterator<Item = &'static str> {
    let structures = ["frac", "sqrt", "mathrm", "text", "mathbf", "left", "right"];
    let accents = ACCENTS.iter().map(|(name, _, _)| *name);
    let signs = SIGNS.iter().map(|(name, _, _)| *name);
    structures
        .into_iter()
        .chain(accents)
        .chain(GREEK.iter().map(|(name, _)| *name))
        .chain(signs)
        .chain(FUNCTIONS.iter().copied())
}

/// Typst source of a row of parts.
fn typst(parts: &[Part]) -> String {
    if parts.is_empty() {
        return "\"\"".into();
    }
    parts.iter().map(part_source).collect::<Vec<_>>().join(" ")
}

fn part_source(part: &Part) -> String {
    match part {
        Part::Sign(source, _) => source.clone(),
        Part::Number(digits) => digits.clone(),
        Part::Text(text) => typst_string(text),
        Part::Group(parts) => typst(parts),
        Part::Fraction(above, below) => format!("frac({}, {})", typst(above), typst(below)),
        Part::Root(inner, None) => format!("sqrt({})", typst(inner)),
        Part::Root(inner, Some(index)) => format!("root({}, {})", typst(index), typst(inner)),
        Part::Over(function, _, inner) => format!("{function}({})", typst(inner)),
        Part::Fenced(opening, body, closing) => {
            let mark = |fence: &str| if fence.is_empty() { String::new() } else { format!("\\{fence}") };
            format!("lr({} {} {})", mark(opening), typst(body), mark(closing))
        }
        Part::Scripts { base, below, above } => {
            let script = |name: &str, parts: &Option<Vec<Part>>| {
                parts.as_ref().map(|parts| format!(", {name}: {}", typst(parts))).unwrap_or_default()
            };
            format!("attach({}{}{})", part_source(base), script("b", below), script("t", above))
        }
    }
}

/// A row of parts in words.
fn words(parts: &[Part]) -> String {
    parts.iter().map(part_words).filter(|word| !word.is_empty()).collect::<Vec<_>>().join(" ")
}

fn part_words(part: &Part) -> String {
    match part {
        Part::Sign(_, word) => word.clone(),
        Part::Number(text) | Part::Text(text) => text.trim().to_string(),
        Part::Group(parts) => words(parts),
        Part::Fraction(above, below) => format!("{} over {}", bracketed(above), bracketed(below)),
        Part::Root(inner, None) => format!("square root of {}", bracketed(inner)),
        Part::Root(inner, Some(index)) => format!("root of order {} of {}", words(index), bracketed(inner)),
        Part::Over(_, word, inner) => format!("{} {word}", bracketed(inner)).trim_end().to_string(),
        Part::Fenced(opening, body, closing) => format!("{opening}{}{closing}", words(body)),
        Part::Scripts { base, below, above } => {
            let mut text = part_words(base);
            if let Some(below) = below {
                let from = if matches!(text.as_str(), "sum" | "product" | "integral") { "from" } else { "sub" };
                text.push_str(&format!(" {from} {}", words(below)));
            }
            if let Some(above) = above {
                text.push_str(&power_words(&part_words(base), &words(above)));
            }
            text.trim_start().to_string()
        }
    }
}

fn power_words(base: &str, exponent: &str) -> String {
    match exponent {
        _ if matches!(base, "sum" | "product" | "integral") => format!(" to {exponent}"),
        "2" => " squared".into(),
        "3" => " cubed".into(),
        "prime" | "degrees" => format!(" {exponent}"),
        other => format!(" to the power {other}"),
    }
}

fn bracketed(parts: &[Part]) -> String {
    let text = words(parts);
    if parts.len() > 1 { format!("({text})") } else { text }
}

/// Accents: command, Typst function, word.
const ACCENTS: &[(&str, &str, &str)] = &[
    ("bar", "macron", "bar"),
    ("overline", "overline", "bar"),
    ("hat", "hat", "hat"),
    ("tilde", "tilde", "tilde"),
    ("dot", "dot", "dot"),
    ("ddot", "dot.double", "double dot"),
    ("vec", "arrow", "vector"),
];

/// Named functions, set upright.
const FUNCTIONS: &[&str] = &["ln", "log", "exp", "sin", "cos", "tan", "arcsin", "arccos", "arctan", "min", "max"];

const GREEK: &[(&str, char)] = &[
    ("alpha", 'α'),
    ("beta", 'β'),
    ("gamma", 'γ'),
    ("delta", 'δ'),
    ("epsilon", 'ϵ'),
    ("varepsilon", 'ε'),
    ("zeta", 'ζ'),
    ("eta", 'η'),
    ("theta", 'θ'),
    ("vartheta", 'ϑ'),
    ("iota", 'ι'),
    ("kappa", 'κ'),
    ("lambda", 'λ'),
    ("mu", 'μ'),
    ("nu", 'ν'),
    ("xi", 'ξ'),
    ("pi", 'π'),
    ("rho", 'ρ'),
    ("sigma", 'σ'),
    ("tau", 'τ'),
    ("upsilon", 'υ'),
    ("phi", 'ϕ'),
    ("varphi", 'φ'),
    ("chi", 'χ'),
    ("psi", 'ψ'),
    ("omega", 'ω'),
    ("Gamma", 'Γ'),
    ("Delta", 'Δ'),
    ("Theta", 'Θ'),
    ("Lambda", 'Λ'),
    ("Xi", 'Ξ'),
    ("Pi", 'Π'),
    ("Sigma", 'Σ'),
    ("Phi", 'Φ'),
    ("Psi", 'Ψ'),
    ("Omega", 'Ω'),
];

/// Signs: command, Typst source, word.
const SIGNS: &[(&str, &str, &str)] = &[
    ("cdot", "⋅", "times"),
    ("times", "×", "times"),
    ("pm", "±", "plus or minus"),
    ("mp", "∓", "minus or plus"),
    ("le", "≤", "is at most"),
    ("leq", "≤", "is at most"),
    ("ge", "≥", "is at least"),
    ("geq", "≥", "is at least"),
    ("ne", "≠", "is not equal to"),
    ("neq", "≠", "is not equal to"),
    ("approx", "≈", "is approximately"),
    ("equiv", "≡", "is identical to"),
    ("sim", "∼", "is of the order of"),
    ("propto", "∝", "is proportional to"),
    ("ll", "≪", "is much less than"),
    ("gg", "≫", "is much greater than"),
    ("sum", "∑", "sum"),
    ("prod", "∏", "product"),
    ("int", "∫", "integral"),
    ("partial", "∂", "partial"),
    ("infty", "∞", "infinity"),
    ("to", "→", "to"),
    ("rightarrow", "→", "to"),
    ("circ", "compose", "degrees"),
    ("prime", "prime", "prime"),
    ("dots", "…", "and so on"),
    ("ldots", "…", "and so on"),
    ("cdots", "⋯", "and so on"),
    ("quad", "quad", ""),
    ("qquad", "wide", ""),
    ("ell", "ℓ", "l"),
];

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_formula_reads_as_words() {
        let formula =
            formula(r"m_\mathrm{c} = m \frac{1 - \rho_0/\rho}{1 - \rho_0/\rho_\mathrm{c}}", true).expect("known");
        assert_eq!(
            formula.words,
            "m sub c equals m (1 minus rho sub 0 divided by rho) over (1 minus rho sub 0 divided by rho sub c)"
        );
        assert!(formula.source.contains("attach(m, b: \"c\")"), "{}", formula.source);
    }

    #[test]
    fn scripts_sums_and_roots_have_words() {
        let in_words =
            |latex| formula(latex, false).map(|formula| formula.words).unwrap_or_else(|problem| problem.message);
        assert_eq!(in_words(r"\sum_{i=1}^n x_i^2"), "sum from i equals 1 to n x sub i squared");
        assert_eq!(in_words(r"\sqrt{u_1^2 + u_2^2}"), "square root of (u sub 1 squared plus u sub 2 squared)");
        assert_eq!(in_words(r"\bar{x} \pm 2\,\text{mg}"), "x bar plus or minus 2 mg");
    }

    #[test]
    fn an_unknown_command_is_named() {
        let problem = formula(r"x = \inputt{a}", false).expect_err("unknown");
        assert_eq!(problem.code, Code::ProseUnreadable);
        assert!(problem.message.contains("\\inputt"));
        assert_eq!(problem.range, Some((4, 11)));
        assert_eq!(formula(r"\aproxx", false).expect_err("unknown").hints, vec!["Is \\approx meant?".to_string()]);
        for broken in [r"\frac{a", "a^b^c", r"\left( x", "a^", r"\sqrt[3", "€", "", r"\text{a\b}", "}"] {
            assert!(formula(broken, false).is_err(), "{broken}");
        }
        assert!(formula(&"{".repeat(4000), false).is_err());
    }
}
