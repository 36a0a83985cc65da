//! The room `cli`.
