//! The room `settle`.
