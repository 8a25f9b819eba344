//! Times the engine beside a numpy notebook (`peer.py`) on the same circuit, and the whole way from a block to its sheet.
//!
//! Run by `scripts/bench`. Writes the sweep's results and times as JSON to the path given first; prints the sheet's times.

mod kernels;

use std::{collections::BTreeMap, hint::black_box, path::Path, time::Instant};

use serde::{Deserialize, Serialize};
use stageleaf_math::{
    Detail, analyse, analyse_in, analysis::sweep, model::Model, network::lu::Lu, report::NoiseOrigin, solution::Solution,
};
use stageleaf_note::{
    block::{Place, read_block},
    markdown::read_note,
    settings::Settings,
    shelf::{Shelf, ShelfPart, read_part},
};
use stageleaf_sheet::{Sheet, render};

#[derive(Deserialize)]
struct Circuit {
    values: BTreeMap<String, f64>,
    sweep: Grid,
}

#[derive(Deserialize)]
struct Grid {
    from: f64,
    to: f64,
    points: u16,
}

#[derive(Serialize)]
struct Native {
    frequencies: Vec<f64>,
    response: Vec<[f64; 2]>,
    noise: BTreeMap<String, Vec<f64>>,
    total: Vec<f64>,
    whole_seconds: f64,
    sweep_seconds: f64,
    /// The same sweep by the checking solver.
    lu: Checked,
    /// What the WebAssembly module gives too, and how long it takes natively.
    parity: Parity,
}

/// Sums by kernel, as bits, and seconds.
#[derive(Serialize)]
struct Parity {
    polynomials: [String; 2],
    lu: [String; 2],
}

#[derive(Serialize)]
struct Checked {
    response: Vec<[f64; 2]>,
    total: Vec<f64>,
    operations: usize,
    sweep_seconds: f64,
}

fn main() {
    let mut arguments = std::env::args().skip(1);
    let output = arguments.next().expect("the path to write the results to");
    let here = Path::new(env!("CARGO_MANIFEST_DIR"));
    let circuit = std::fs::read_to_string(here.join("bench/circuit.json")).expect("tests/bench/circuit.json is there");
    let circuit: Circuit = serde_json::from_str(&circuit).expect("circuit.json holds a circuit");
    let native = sweep_circuit(&circuit);
    std::fs::write(output, serde_json::to_string(&native).expect("numbers serialize")).expect("the results can be written");
    sheet(&here.join("../site"));
}

/// Median of the seconds that `action` takes.
fn median_seconds<T>(times: u16, mut action: impl FnMut() -> T) -> f64 {
    let mut taken: Vec<f64> = (0..times)
        .map(|_| {
            let began = Instant::now();
            black_box(action());
            began.elapsed().as_secs_f64()
        })
        .collect();
    taken.sort_by(f64::total_cmp);
    taken[taken.len() / 2]
}

fn sweep_circuit(circuit: &Circuit) -> Native {
    let value = |name: &str| *circuit.values.get(name).unwrap_or_else(|| panic!("circuit.json has no {name}"));
    let stage = kernels::stage(&value);
    let grid = &circuit.sweep;
    let ratio = grid.to / grid.from;
    let step = |i: u16| grid.from * libm::pow(ratio, f64::from(i) / f64::from(grid.points - 1));
    let frequencies: Vec<f64> = (0..grid.points).map(step).collect();

    let run = |model: &Model<'_>| {
        let solution = Solution::new(model, model.parameters.nominal(), None);
        let looped = solution.looped();
        let transfer = solution.load_numerator();
        let response = sweep::ratio(&solution, transfer, &looped.closed, &frequencies);
        (response, sweep::noise(&solution, &frequencies))
    };
    let model = Model::compile(&stage);
    let (response, noise) = run(&model);
    let mut by_name: BTreeMap<String, Vec<f64>> = BTreeMap::new();
    for (origin, row) in noise.origins.iter().zip(&noise.rows) {
        let sum = by_name.entry(name(*origin)).or_insert_with(|| vec![0.0; row.len()]);
        sum.iter_mut().zip(row).for_each(|(s, p)| *s += p);
    }
    let solution = Solution::new(&model, model.parameters.nominal(), None);
    let lu = Lu::compile(&solution, grid.from, grid.to).expect("the circuit has no short");
    let check = || lu.sweep(&Solution::new(&model, model.parameters.nominal(), None), &frequencies);
    let checked = check();
    let timed = |sum: &dyn Fn() -> f64| [format!("{:016x}", sum().to_bits()), median_seconds(1001, sum).to_string()];
    let parity = Parity {
        polynomials: timed(&|| kernels::polynomials(black_box(&model), &frequencies)),
        lu: timed(&|| kernels::checked(&lu, black_box(&model), &frequencies)),
    };
    Native {
        parity,
        lu: Checked {
            response: checked.response.iter().map(|h| [h.re, h.im]).collect(),
            total: checked.noise.total,
            operations: lu.operations(),
            sweep_seconds: median_seconds(501, check),
        },
        response: response.iter().map(|h| [h.re, h.im]).collect(),
        noise: by_name,
        total: noise.total,
        sweep_seconds: median_seconds(2001, || run(black_box(&model))),
        whole_seconds: median_seconds(501, || run(&Model::compile(black_box(&stage)))),
        frequencies,
    }
}

/// The peer's name for a source: this stage has one input and one amplifier.
fn name(origin: NoiseOrigin) -> String {
    match origin {
        NoiseOrigin::Component(name) => name.to_owned(),
        NoiseOrigin::SourceResistance(_) => "SourceResistance".into(),
        NoiseOrigin::AmplifierVoltage(_) => "AmplifierVoltage".into(),
        NoiseOrigin::CurrentNonInverting(_) => "CurrentNonInverting".into(),
        NoiseOrigin::CurrentInverting(_) => "CurrentInverting".into(),
        other => format!("{other:?}"),
    }
}

/// The way of one edit: a block's text to stage, report and markup, for every stage of the demo's notes.
fn sheet(site: &Path) {
    let mut shelf = Shelf::default();
    for path in files(&site.join("shelf"), "toml") {
        let text = std::fs::read_to_string(&path).expect("a part file can be read");
        let file = path.file_name().map(|n| n.to_string_lossy().into_owned()).unwrap_or_default();
        let part = read_part(&text, &file).expect("the demo's parts can be read");
        shelf.parts.push(ShelfPart { part, file, text });
    }
    let settings = Settings::default();
    println!("one edit of a sheet, natively (a frame at 60 Hz has 16 667 µs)");
    println!("  {:28} {:>9} {:>9} {:>9} {:>9} {:>9}", "stage", "read", "judged", "analyse", "render", "all, µs");
    for path in files(&site.join("notes"), "md") {
        let bytes = std::fs::read(&path).expect("a note can be read");
        let note = read_note(&bytes, &path.to_string_lossy(), &shelf, &settings);
        for block in &note.blocks {
            let place = Place::new(&block.file, block.line);
            let read = || read_block(&block.text, &place, &shelf, &settings).expect("the block was read before");
            let part = shelf.find(&block.stage.part.id).expect("the block's part is on the shelf");
            let report = analyse(&block.stage).expect("the demo's stages can be analysed");
            let microseconds = |seconds: f64| seconds * 1e6;
            let times = [
                microseconds(median_seconds(101, read)),
                microseconds(median_seconds(101, || analyse_in(black_box(&block.stage), Detail::Judged))),
                microseconds(median_seconds(101, || analyse(black_box(&block.stage)))),
                microseconds(median_seconds(101, || render(&Sheet { block, report: &report, part, id: "bench" }))),
                microseconds(median_seconds(101, || {
                    let block = read();
                    let report = analyse(&block.stage).expect("the demo's stages can be analysed");
                    render(&Sheet { block: &block, report: &report, part, id: "bench" })
                })),
            ];
            let [read, judged, full, rendered, all] = times;
            println!("  {:28} {read:>9.1} {judged:>9.1} {full:>9.1} {rendered:>9.1} {all:>9.1}", block.stage.name);
        }
    }
}

fn files(folder: &Path, extension: &str) -> Vec<std::path::PathBuf> {
    let entries = std::fs::read_dir(folder).unwrap_or_else(|error| panic!("{}: {error}", folder.display()));
    let mut list: Vec<_> =
        entries.filter_map(|entry| Some(entry.ok()?.path())).filter(|p| p.extension().is_some_and(|e| e == extension)).collect();
    list.sort();
    list
}
