//! Terhardt's threshold in quiet (1979) as quoted by J. Beauchamp on the
//! auditory.org list, 2014.

use modal_core::hearing::terhardt_threshold_db;

use crate::{Source, check};

pub(crate) fn source() -> Source {
    let checks = [
        (100.0, 22.953),
        (1_000.0, 3.369),
        (3_300.0, -4.981),
        (10_000.0, 10.577),
    ]
    .into_iter()
    .map(|(hz, stated)| {
        check(
            format!("threshold at {hz} Hz"),
            terhardt_threshold_db(hz),
            stated,
            1e-3,
        )
    })
    .collect();
    Source::weak("Terhardt 1979, as quoted on a list", checks)
}
