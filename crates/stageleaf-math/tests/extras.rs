//! Which of the extras that real boards have each kind takes, and that each stands in the network where it is given.

use stageleaf_math::{
    kind::Kind,
    network::{Builder, Network, Without},
    parameters::Parameters,
    stage::{Board, Component, Converter, Isolation, Stage, Toleranced},
};

#[path = "samples/mod.rs"]
mod samples;

/// Extras by their components: across the feedback, bias balance, input filter, isolation, snubber, noise gain.
struct Extras {
    feedback: &'static [&'static str],
    balance: &'static [&'static str],
    filter: &'static [&'static str],
    noise_gain: bool,
}

const BALANCE: &[&str] = &["Rp", "Cp"];
const FILTER: &[&str] = &["Rser", "Cshunt"];

/// Isolation, snubber, load, converter, board strays and a part for each amplifier every kind takes; the others where they make sense.
/// No `_` arm: a new kind is decided here.
fn extras(kind: Kind) -> Option<Extras> {
    let of = |feedback, balance, filter, noise_gain| Extras { feedback, balance, filter, noise_gain };
    let extras = match kind {
        // Between two rails there is no loop to steady and no offset to balance.
        Kind::ComparatorInverting | Kind::ComparatorNonInverting => return None,
        // What balances the bias current here is `Rf`, or the source behind `Rser`.
        Kind::Follower | Kind::NonInverting => of(&["Cf"], &[], FILTER, true),
        Kind::Inverting => of(&["Cf"], BALANCE, FILTER, true),
        // Each input's filter would be a stage's of its own.
        Kind::Summing => of(&["Cf"], BALANCE, &[], true),
        // Both inputs see the same by design.
        Kind::Difference => of(&["C2"], &[], &[], true),
        // Its difference stage works from two low impedances: it needs no more noise gain.
        Kind::Instrumentation => of(&["C2"], &[], &[], false),
        // A filter at a current's input would take the current.
        Kind::Transimpedance => of(&["Cf"], BALANCE, &[], true),
        Kind::Charge => of(&[], BALANCE, &["Rser"], true),
        // Their own `Cf` and `Rin` are the filter.
        Kind::Integrator => of(&[], BALANCE, &[], true),
        Kind::Differentiator => of(&["Cf"], BALANCE, &[], true),
        // `R1` and `Cshunt` are the filter; the + input's resistance follows from the divider.
        Kind::ScaleAndShift => of(&["Cf"], &[], &["Cshunt"], true),
        // `Cin` stands in the filter's place, `Rb` in the balancing resistor's.
        Kind::AcNonInverting | Kind::AcInverting => of(&["Cf"], &[], &[], false),
        // A branch between the inputs is a positive feedback of its own here; the filter's parts set the rest.
        Kind::SallenKeyLowPass | Kind::SallenKeyHighPass => of(&[], &[], &[], false),
        Kind::MultipleFeedbackLowPass | Kind::MultipleFeedbackBandPass => of(&[], BALANCE, &[], true),
    };
    Some(extras)
}

fn laid_out(stage: &Stage) -> Network {
    Builder::lay_out(stage, &Parameters::of(stage), Without::WORKING)
}

/// The stage with more components.
fn with(stage: &Stage, names: &[&str]) -> Stage {
    let given = |name: &str| stage.component(name).is_some();
    let specs = stage.kind.components().iter().filter(|c| names.contains(&c.name) && !given(c.name));
    let value = |name: &str| Toleranced::exact(if name.starts_with('R') { 100.0 } else { 1e-9 });
    let more = specs.map(|c| Component { name: c.name, value: value(c.name) });
    Stage { components: stage.components.iter().cloned().chain(more).collect(), ..stage.clone() }
}

#[test]
fn each_kind_takes_the_extras_that_make_sense_and_they_stand_in_its_network() {
    for &kind in Kind::ALL {
        let has = |name: &str| kind.components().iter().any(|c| c.name == name && (!c.required || name == "Rin"));
        let plain = samples::stage(kind, 1.0, 1.0);
        let elements = laid_out(&plain).elements.len();
        let grows = |stage: &Stage, what: &str| {
            assert!(laid_out(stage).elements.len() > elements, "{kind:?}: {what} does not stand in the network")
        };
        let Some(extras) = extras(kind) else { continue };
        for names in [extras.feedback, extras.filter, extras.balance] {
            for name in names {
                assert!(has(name), "{kind:?} takes no `{name}`");
                // `Cp` stands across `Rp`.
                grows(&with(&plain, if *name == "Cp" { BALANCE } else { std::slice::from_ref(name) }), name);
            }
        }
        for (names, wanted) in [(&["Riso"][..], true), (&["Rsn", "Csn"], true), (&["Rng", "Cng"], extras.noise_gain)] {
            assert_eq!(names.iter().all(|n| has(n)), wanted, "{kind:?}: {names:?}");
            if wanted {
                grows(&with(&plain, names), names[0]);
            }
        }
        for (name, taken) in
            [("Rp", !extras.balance.is_empty()), ("Rser", extras.filter.contains(&"Rser")), ("Cshunt", extras.filter.contains(&"Cshunt"))]
        {
            assert_eq!(has(name), taken, "{kind:?}: `{name}`");
        }

        // Inside the loop, what leads back from the output starts at the load.
        let outside = with(&plain, &["Riso", "Rf"]);
        let inside = Stage { isolation: Isolation::InsideLoop, ..outside.clone() };
        assert_ne!(laid_out(&inside).elements, laid_out(&outside).elements, "{kind:?}: where `Riso` stands");
        let stray = Some(Toleranced::exact(1e-12));
        for (what, board) in [
            ("inverting_node", Board { inverting_node: stray, ..Board::default() }),
            ("non_inverting_node", Board { non_inverting_node: stray, ..Board::default() }),
            ("across_feedback", Board { across_feedback: stray, ..Board::default() }),
        ] {
            grows(&Stage { board, ..plain.clone() }, what);
        }
        for (what, converter) in [
            ("series_resistance", Converter { series_resistance: Some(Toleranced::exact(100.0)), ..Converter::default() }),
            ("shunt_capacitance", Converter { shunt_capacitance: Some(Toleranced::exact(1e-9)), ..Converter::default() }),
        ] {
            grows(&Stage { converter, ..plain.clone() }, what);
        }
        let count = kind.spec().amplifiers;
        let mut other = plain.part.clone();
        other.name = "other".into();
        let stage = Stage { parts: vec![(count, other)], ..plain.clone() };
        assert_eq!(stage.part_of(count - 1).name, "other", "{kind:?}");
    }
}
