//! What the integers are measured against: closed forms in plain `f64`,
//! written again from the published formulas without any code of `modal-core`,
//! and the measures that compare the two.

pub mod measure;
pub mod performance;
pub mod reference;
pub mod timeline;
pub mod tolerance;
