//! The benchmark's kernels as a WebAssembly module for Node.js: `scripts/bench` builds it in a crate of its own.

use stageleaf_math::{model::Model, network::lu::Lu, stage::Stage};

#[path = "kernels.rs"]
mod kernels;

include!(env!("BENCH_VALUES"));

struct Bench {
    model: &'static Model<'static>,
    lu: Lu,
    frequencies: Vec<f64>,
}

fn bench() -> &'static Bench {
    static BENCH: std::sync::OnceLock<usize> = std::sync::OnceLock::new();
    let made = *BENCH.get_or_init(|| {
        let value = |name: &str| VALUES.iter().find(|(n, _)| *n == name).map_or(f64::NAN, |v| v.1);
        let stage: &'static Stage = Box::leak(Box::new(kernels::stage(&value)));
        let model: &'static Model<'static> = Box::leak(Box::new(Model::compile(stage)));
        let (from, to, points) = GRID;
        let frequencies = (0..points).map(|i| from * libm::pow(to / from, f64::from(i) / f64::from(points - 1))).collect();
        let solution: &'static _ = Box::leak(Box::new(stageleaf_math::solution::Solution::new(model, model.parameters.nominal(), None)));
        let lu = Lu::compile(solution, from, to).expect("the circuit has no short");
        core::ptr::from_ref(Box::leak(Box::new(Bench { model, lu, frequencies }))) as usize
    });
    // One thread, leaked for good.
    unsafe { &*(made as *const Bench) }
}

#[unsafe(no_mangle)]
pub extern "C" fn polynomials() -> f64 {
    let bench = bench();
    kernels::polynomials(bench.model, &bench.frequencies)
}

#[unsafe(no_mangle)]
pub extern "C" fn lu() -> f64 {
    let bench = bench();
    kernels::checked(&bench.lu, bench.model, &bench.frequencies)
}
