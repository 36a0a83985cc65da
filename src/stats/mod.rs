//! The room `stats`.
