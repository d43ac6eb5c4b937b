//! What a report proves by itself.
//!
//! | file       | holds                                                                        |
//! |------------|------------------------------------------------------------------------------|
//! | `pdf_file` | reading a PDF that anybody may have made: attachments, revisions, oddities    |
//! | `audit`    | the checks: attachments against their list, re-reduction, pages set anew      |

pub mod audit;
pub mod pdf_file;

pub use audit::{Audit, Check, Verdict, audit_report, originals};
