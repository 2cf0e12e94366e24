//! Questions asked of a solved network. Pure: input to result, no printing, no files.

pub mod flow;
pub mod loadability;
pub mod summary;
