//! Who may do what, on which day.

use crate::block::Engine;
use crate::diagnostic::{Code, Problem, nearest};
use chrono::NaiveDate;

/// A person block.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Person {
    pub name: String,
    pub role: String,
    pub activities: Vec<String>,
    pub from: Option<NaiveDate>,
    pub to: Option<NaiveDate>,
}

impl Person {
    /// Whether the authorisation holds on a day.
    pub fn is_authorised_on(&self, day: NaiveDate) -> bool {
        self.from.is_some_and(|from| from <= day) && self.to.is_none_or(|to| day <= to)
    }

    /// Whether the person may do this.
    pub fn may(&self, activity: &str) -> bool {
        self.activities.iter().any(|own| own == activity)
    }
}

/// The people of a laboratory folder, in order of name.
pub fn people(engine: &Engine) -> Vec<Person> {
    let persons = engine.blocks().values().filter(|block| block.kind.name == "person" && block.sound);
    let read = |block: &crate::block::Block| {
        let fields = block.fields();
        Person {
            name: block.name().to_string(),
            role: fields.words("role"),
            activities: fields.texts("activities").into_iter().map(|text| text.text).collect(),
            from: fields.date("from"),
            to: fields.date("to"),
        }
    };
    persons.map(read).collect()
}

/// The person who acts as `who`, a role or the name of a person block, authorised on `day` and, where one is named,
/// for an activity.
///
/// # Errors
/// `person_unauthorised`.
pub fn acting(engine: &Engine, who: &str, activity: Option<&str>, day: NaiveDate) -> Result<Person, Problem> {
    let people = people(engine);
    let named: Vec<&Person> = people.iter().filter(|person| person.role == who || person.name == who).collect();
    let refuse = |message: String| Problem::new(Code::PersonUnauthorised, message);
    if named.is_empty() {
        let problem = refuse(format!("No person block has the role “{who}”."));
        return Err(match nearest(who, people.iter().map(|person| person.role.as_str())) {
            Some(near) => problem.hint(format!("Did you mean “{near}”?")),
            None => problem.hint("A `person` block states the role, its activities and the days of its authorisation."),
        });
    }
    let Some(present) = named.iter().find(|person| person.is_authorised_on(day)) else {
        let first = named[0];
        let until = first.to.map(|to| format!(" to {to}")).unwrap_or_default();
        let from = first.from.map(|from| from.to_string()).unwrap_or_default();
        return Err(refuse(format!("The {who} is authorised from {from}{until}, but today is {day}."))
            .hint("Another person acts, or the authorisation is extended in the `person` block."));
    };
    let able = named.iter().find(|person| person.is_authorised_on(day) && activity.is_none_or(|one| person.may(one)));
    able.map(|person| (*person).clone()).ok_or_else(|| {
        let message = format!(
            "The {who} is authorised for {}, not for {}.",
            present.activities.join(", "),
            activity.unwrap_or_default()
        );
        let able = people.iter().find(|one| one.is_authorised_on(day) && activity.is_none_or(|what| one.may(what)));
        match able {
            Some(able) => refuse(message).hint(format!("The {} is authorised for it.", able.role)),
            None => refuse(message).hint("Nobody is authorised for it on this day: a `person` block must say who is."),
        }
    })
}
