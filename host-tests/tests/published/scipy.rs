//! The discrete sine transform of SciPy 1.17.1 (`scipy.fft.dst`, type 1), run
//! once by us: an independent, general-purpose library.

use modal_core::excitation::{Between, Of, Sampled};
use modal_core::{ConstantT60, Excitation, ModeSeries, PointPluck, StringSpec};

use crate::{Check, Source, check};

pub(crate) fn source() -> Source {
    let mut checks: Vec<Check> = Vec::new();
    let string = StringSpec::new(1.0, 100.0, 1.0e-2, 0.0).expect("a string");
    let series = ModeSeries::new(string, ConstantT60::new(10.0).expect("a T60"));
    let coefficient = |start: &dyn Excitation, n| {
        let mode = series.mode(n).expect("a mode");
        start.mode(&mode, series.string()).displacement
    };

    let samples = [1.0, 2.0, 3.0, 4.0, 3.0, 2.0, 1.0];
    let stated = [
        26.274_142_369_088_178,
        0.0,
        -3.239_828_808_843_550_5,
        0.0,
        1.446_462_692_171_69,
        0.0,
        -1.039_566_129_896_581_3,
    ];
    let sampled = Sampled::new(&samples, Of::Displacement, Between::BandLimited).expect("samples");
    for (n, stated) in (1..).zip(stated) {
        // SciPy's transform is N = 8 times the coefficient.
        let computed = 8.0 * coefficient(&sampled, n);
        checks.push(check(
            format!("dst of seven samples, {n}"),
            computed,
            stated,
            1e-13,
        ));
    }

    // A triangle with its corner at 13/64, sampled 64 times.
    let place = 13.0 / 64.0;
    let samples: Vec<f64> = (1..64)
        .map(|j| f64::from(j) / 64.0)
        .map(|x| (x / place).min((1.0 - x) / (1.0 - place)))
        .collect();
    let plain = Sampled::new(&samples, Of::Displacement, Between::BandLimited).expect("samples");
    let straight = Sampled::new(&samples, Of::Displacement, Between::Straight).expect("samples");
    let pluck = PointPluck::new(place, 0.1).expect("a pluck");
    for (n, transform, exact) in [
        (1, 0.745_917_798_258, 0.745_768_031_772),
        (2, 0.299_743_924_055, 0.299_503_249_928),
    ] {
        checks.push(check(
            "dst of a triangle",
            coefficient(&plain, n),
            transform,
            1e-12,
        ));
        checks.push(check(
            "with straight lines",
            coefficient(&straight, n),
            exact,
            1e-12,
        ));
        checks.push(check(
            "the triangle",
            10.0 * coefficient(&pluck, n),
            exact,
            1e-12,
        ));
    }
    Source::new("SciPy 1.17.1, discrete sine transform", checks)
}
