//! What was done with records and reports, entered so that nothing can be taken back unseen; and what a report proves.
//!
//! | file        | holds                                                                        |
//! |-------------|------------------------------------------------------------------------------|
//! | `canonical` | one way to write an entry                                                     |
//! | `entry`     | what an entry says                                                            |
//! | `tree`      | heads of the register and proofs between them (RFC 6962)                      |
//! | `chain`     | [`Register`]: entries, each holding the hash of the one before                |
//! | `verify`    | what is wrong with a register, named by its cause                             |
//! | `store`     | [`Store`]: the writing door                                                   |
//! | `ledger`    | [`Ledger`]: the register opened for writing                                   |
//! | `state`     | issued reports and how they stand                                             |
//! | `kept`      | kept originals and archived reports against their entries                     |
//! | `authorise` | review and authorisation of one seal                                           |
//! | `requirements` | what must be there before a report is issued                                |
//! | `issuing`   | number, seal, pages without DRAFT, entry, archive                              |
//! | `difference` | what changed between two lists of results                                      |
//! | `consequences` | which issued reports the present records would change, and by how much      |
//! | `people`    | who may do what, on which day                                                  |
//! | `lodge`     | entering records and raw data as made; whether they were changed since        |
//! | `pdf_file`  | reading a PDF that anybody may have made: attachments, revisions, oddities    |
//! | `present`   | a report against the laboratory's register and records as they are now        |
//! | `audit`     | the checks: attachments against their list, re-reduction, pages set anew      |

pub mod audit;
pub mod authorise;
pub mod canonical;
pub mod chain;
pub mod consequences;
pub mod difference;
pub mod entry;
pub mod issuing;
pub mod kept;
pub mod ledger;
pub mod lodge;
pub mod pdf_file;
pub mod people;
pub mod present;
pub mod requirements;
pub mod state;
pub mod store;
pub mod tree;
pub mod verify;

pub use audit::{Audit, Check, Verdict, audit_against, audit_report, originals};
pub use chain::{REGISTER, Register};
pub use ledger::Ledger;
pub use lodge::check_lodged;
pub use present::Against;
pub use store::Store;
