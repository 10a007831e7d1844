//! Random inputs for the property tests, from the bounds of `modal-core`.
