//! What the page template is given.

use super::markup::Markup;
use minijinja::{Value, context};

/// The values of a report's pages. Every field is a variable of the template under the same name.
#[derive(Debug, Clone, Default)]
pub struct Page {
    /// The language of the text, as in BCP 47: `en`.
    pub language: String,
    pub title: String,
    pub laboratory_name: String,
    /// The address, a line each.
    pub laboratory_address: Vec<String>,
    /// `draft` while the report is not issued: every page then says so.
    pub draft: bool,
    /// The report number; a draft has none.
    pub number: Option<String>,
    /// The seal, shortened for print.
    pub seal: String,
    /// Label and content of the front table, in order.
    pub particulars: Vec<(String, Markup)>,
    pub body: Markup,
    /// Fixed statements under the results.
    pub statements: Vec<Markup>,
    /// Who performed, reviewed and authorised.
    pub signatures: Vec<Signature>,
    /// What follows on new pages after the signatures.
    pub annex: Option<Markup>,
}

/// One field of the area of authorisation.
#[derive(Debug, Clone, Default)]
pub struct Signature {
    /// `Performed by`, `Reviewed by`, `Authorised by`.
    pub duty: String,
    /// The person's role; empty while open.
    pub person: String,
    /// The date, in print form; empty while open.
    pub date: String,
}

impl Page {
    /// The variables of the template.
    pub fn values(&self) -> Value {
        let markup = |markup: &Markup| Value::from_object(markup.clone());
        let particulars: Vec<Value> = self
            .particulars
            .iter()
            .map(|(label, content)| Value::from(vec![Value::from(label.as_str()), markup(content)]))
            .collect();
        let signatures: Vec<Value> = self
            .signatures
            .iter()
            .map(|field| context! { duty => &field.duty, person => &field.person, date => &field.date })
            .collect();
        context! {
            language => self.language.as_str(),
            title => self.title.as_str(),
            laboratory_name => self.laboratory_name.as_str(),
            laboratory_address => &self.laboratory_address,
            draft => self.draft,
            number => self.number.as_deref(),
            seal => self.seal.as_str(),
            particulars => particulars,
            body => markup(&self.body),
            statements => self.statements.iter().map(markup).collect::<Vec<_>>(),
            signatures => signatures,
            annex => self.annex.as_ref().map(markup),
        }
    }
}
