//! The room `virtual_bench`.
