//! The register opened for writing.

use super::chain::{REGISTER, Register};
use super::entry::{Act, Entry};
use super::store::Store;
use super::verify::Damage;
use crate::diagnostic::{Code, Problem};
use crate::report::dossier::sha256;

/// The register with the door it is written through.
pub struct Ledger<'s> {
    pub store: &'s dyn Store,
    pub register: Register,
}

impl<'s> Ledger<'s> {
    /// Reads the register and brings to its end what a process left off between entry and archive.
    ///
    /// # Errors
    /// `register_damaged`: nothing is added to a register that does not hold together.
    pub fn open(store: &'s dyn Store) -> Result<Ledger<'s>, Problem> {
        let bytes = store.read(REGISTER)?.unwrap_or_default();
        let register = Register::read(&bytes).map_err(|damages| damaged(&damages))?;
        let ledger = Ledger { store, register };
        ledger.finish_archive()?;
        Ok(ledger)
    }

    /// Adds one entry; it is on disk when this returns.
    ///
    /// # Errors
    /// `clock_behind`, `register_unwritable`.
    pub fn enter(&mut self, act: Act, who: &str, why: &str) -> Result<Entry, Problem> {
        self.enter_all(vec![(act, who.into(), why.into())]).map(|mut entries| entries.remove(0))
    }

    /// Adds several entries, all or none.
    ///
    /// # Errors
    /// `clock_behind`, `register_unwritable`.
    pub fn enter_all(&mut self, acts: Vec<(Act, String, String)>) -> Result<Vec<Entry>, Problem> {
        let mut longer = self.register.clone();
        let stamp = self.store.now();
        let mut entries = Vec::new();
        for (act, who, why) in acts {
            entries.push(longer.add(act, &who, &why, stamp)?.clone());
        }
        self.store.write(REGISTER, &longer.bytes())?;
        self.register = longer;
        Ok(entries)
    }

    /// The last issued report may have been entered without its PDF having taken its name yet.
    fn finish_archive(&self) -> Result<(), Problem> {
        let last = self.register.entries.iter().rev().find_map(|entry| match &entry.act {
            Act::Issued(issued) => Some(issued),
            _ => None,
        });
        let Some(issued) = last else { return Ok(()) };
        if self.store.read(&archive_path(&issued.number))?.is_some() {
            return Ok(());
        }
        let staged = staged_path(&issued.number);
        if self.store.read(&staged)?.is_some_and(|bytes| sha256(&bytes) == issued.pdf) {
            self.store.rename(&staged, &archive_path(&issued.number))?;
        }
        Ok(())
    }
}

/// Where the PDF of an issued report is kept.
pub fn archive_path(number: &str) -> String {
    format!("register/reports/{number}.pdf")
}

/// Where the PDF of a report waits until its entry is made.
pub fn staged_path(number: &str) -> String {
    format!("register/reports/.{number}.pdf")
}

/// Where the copy of a lodged file is kept.
pub fn original_path(sha256: &str) -> String {
    format!("register/originals/{sha256}")
}

/// The damage of a register as one problem.
pub fn damaged(damages: &[Damage]) -> Problem {
    let says = damages.first().map_or("The register cannot be read.", |damage| damage.says.as_str());
    let more = match damages.len() {
        0 | 1 => String::new(),
        count => format!(" {} more faults follow from it or stand beside it.", count - 1),
    };
    Problem::new(Code::RegisterDamaged, format!("{says}{more}")).hint(
        "Nothing is added to a damaged register. Put back the last copy that is whole; `libripens register --verify` names every fault.",
    )
}
