//! ISO 226:2003 (formula (1) and table of the final draft): the contour of
//! 40 phon.

use modal_core::hearing::{iso_226_contour_db, iso_226_threshold_db};

use crate::{Source, check};

pub(crate) fn source() -> Source {
    let mut checks: Vec<_> = [(100.0, 64.3711), (1_000.0, 40.0100), (4_000.0, 36.6492)]
        .into_iter()
        .map(|(hz, stated)| {
            let computed = iso_226_contour_db(hz, 40.0).expect("within the table");
            check(format!("40 phon at {hz} Hz"), computed, stated, 1e-3)
        })
        .collect();
    for (hz, stated) in [(20.0, 78.5), (630.0, 3.0), (12_500.0, 12.3)] {
        let computed = iso_226_threshold_db(hz).expect("within the table");
        checks.push(check(
            format!("threshold at {hz} Hz"),
            computed,
            stated,
            1e-12,
        ));
    }
    Source::new("ISO 226:2003", checks)
}
