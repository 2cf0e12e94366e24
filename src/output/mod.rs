//! From a result to text, JSON or CSV: one result, one table, many writers.
