//! libripens
pub mod block;
pub mod diagnostic;
pub mod graph;
pub mod intake;
pub mod method;
pub mod numeric;
pub mod quantity;
pub mod record;
