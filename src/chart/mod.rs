//! The room `chart`.
