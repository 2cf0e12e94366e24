//! Questions asked of a solved network. Pure: input to result, no printing, no files.

pub mod allocation;
pub mod construction;
pub mod flow;
pub mod line;
pub mod loadability;
pub mod start;
pub mod summary;
