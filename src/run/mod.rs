//! The room `run`.
