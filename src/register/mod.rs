//! What a report proves by itself.
