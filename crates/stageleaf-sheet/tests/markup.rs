//! The markup: hostile text stays text, hostile numbers stay readable, ids are unique, one line.

mod samples;

use std::collections::BTreeSet;

use stageleaf_math::{
    kind::Kind,
    report::{DcLine, Outcome, Report, Root},
    stage::Isolation,
};
use stageleaf_note::{Block, Problem, ShelfPart};
use stageleaf_sheet::{Sheet, plot, problems_markup, render, sections};

const HOSTILE: &str = "</script><script>alert(1)</script>\"><img src=x onerror=alert(1)>'`&amp;\n\n<!-- ]]> \u{202e}";

fn usual(kind: Kind) -> (Block, Report, ShelfPart) {
    let all: Vec<&str> = kind.components().iter().map(|s| s.name).collect();
    (samples::block(kind, &all, Isolation::InsideLoop, (true, true), true), samples::report(kind), samples::part())
}

fn rendered((block, report, part): &(Block, Report, ShelfPart)) -> String {
    render(&Sheet { block, report, part, id: "s" })
}

/// Names of all tags with the names of their attributes, in order.
fn tags(html: &str) -> Vec<String> {
    let mut tags = Vec::new();
    let mut rest = html;
    while let Some(start) = rest.find('<') {
        rest = &rest[start + 1..];
        let mut tag = String::new();
        let mut quoted = false;
        let mut end = rest.len();
        for (i, c) in rest.char_indices() {
            match c {
                '"' => quoted = !quoted,
                '>' if !quoted => {
                    end = i;
                    break;
                }
                _ if !quoted => tag.push(c),
                _ => {}
            }
        }
        tags.push(tag);
        rest = &rest[end..];
    }
    tags
}

#[test]
fn hostile_text_never_becomes_markup() {
    for kind in Kind::ALL {
        let plain = usual(*kind);
        let mut hostile = plain.clone();
        hostile.0.stage.name = HOSTILE.into();
        hostile.0.file = HOSTILE.into();
        hostile.0.text = HOSTILE.into();
        for field in &mut hostile.0.fields {
            field.text = HOSTILE.into();
        }
        hostile.1.name = HOSTILE.into();
        hostile.2.file = HOSTILE.into();
        hostile.2.text = HOSTILE.into();
        let part = &mut hostile.2.part;
        (part.id, part.name) = (HOSTILE.into(), HOSTILE.into());
        (part.description, part.source) = (Some(HOSTILE.into()), Some(HOSTILE.into()));
        let (a, b) = (rendered(&plain), rendered(&hostile));
        assert!(b.contains("&lt;script&gt;"), "the hostile text is shown");
        // A back-tick marks a key in the words of `needs`, so a file's name may start one: the only tag that text can ask for.
        let without_keys = |html: &str| tags(html).into_iter().filter(|t| t != "samp" && t != "/samp").collect::<Vec<_>>();
        assert_eq!(without_keys(&a), without_keys(&b), "{kind:?}");
        assert!(!b.contains(['\n', '\r']), "{kind:?}: a line break");
    }
}

#[test]
fn the_check_for_markup_sees_markup() {
    assert_ne!(tags("<p class=\"a\">b</p>"), tags("<p class=\"a\">b<img></p>"));
    assert_ne!(tags("<p class=\"a\">"), tags("<p class=\"a\" onclick=\"b\">"));
}

#[test]
fn hostile_problems_stay_text() {
    let problem = Problem {
        file: HOSTILE.into(),
        line: 1,
        column: 1,
        length: 1,
        line_text: HOSTILE.into(),
        line_text_column: 1,
        message: HOSTILE.into(),
        allowed: Some(HOSTILE.into()),
        attempt: Some(HOSTILE.into()),
    };
    let markup = problems_markup(std::slice::from_ref(&problem));
    assert!(!markup.contains("<script") && !markup.contains("<img") && !markup.contains('\n'));
    assert!(problems_markup(&[]).is_empty());
}

#[test]
fn markup_holds_no_style_attribute_and_no_handler() {
    for kind in Kind::ALL {
        for tag in tags(&rendered(&usual(*kind))) {
            for name in tag.split_whitespace().skip(1) {
                assert!(!name.starts_with("style=") && !name.starts_with("on"), "{kind:?}: <{tag}>");
            }
        }
    }
}

#[test]
fn ids_are_unique_and_start_with_the_sheets_id() {
    for kind in Kind::ALL {
        let mut sample = usual(*kind);
        // A figure limited or listed twice has one place to link to.
        sample.1.limits.extend(sample.1.limits.clone());
        sample.1.figures.extend(sample.1.figures.clone());
        let html = rendered(&sample);
        let mut seen = BTreeSet::new();
        for piece in html.split(" id=\"").skip(1) {
            let id = &piece[..piece.find('"').unwrap()];
            assert!(id.starts_with("s."), "{kind:?}: `{id}`");
            assert!(seen.insert(id), "{kind:?}: `{id}` twice");
        }
        assert!(seen.len() > 30, "{kind:?}: {} ids", seen.len());
    }
}

#[test]
fn every_value_is_a_field_once() {
    for kind in Kind::ALL {
        let sample = usual(*kind);
        let html = rendered(&sample);
        for field in &sample.0.fields {
            let count = html.matches(&format!(" data-path=\"{}\"", field.path)).count();
            assert_eq!(count, 1, "{kind:?}: `{}` occurs {count} times", field.path);
        }
    }
}

#[test]
fn tags_are_closed_in_order() {
    for kind in Kind::ALL {
        let mut open: Vec<String> = Vec::new();
        for tag in tags(&rendered(&usual(*kind))) {
            let name = tag.split_whitespace().next().unwrap_or("").to_owned();
            if let Some(closed) = name.strip_prefix('/') {
                assert_eq!(open.pop().as_deref(), Some(closed), "{kind:?}");
            } else if !["input", "br"].contains(&name.as_str()) {
                open.push(name);
            }
        }
        assert!(open.is_empty(), "{kind:?}: {open:?} not closed");
    }
}

/// Whether a number that is none shows.
fn shows_nonsense(html: &str) -> Option<&str> {
    for word in ["NaN", "nan", "inf", "Infinity"] {
        for (at, _) in html.match_indices(word) {
            let before = html[..at].chars().next_back();
            let after = html[at + word.len()..].chars().next();
            if !before.is_some_and(char::is_alphabetic) && !after.is_some_and(char::is_alphabetic) {
                return Some(&html[at.saturating_sub(60).max(html[..at].rfind('<').unwrap_or(0))..at + word.len()]);
            }
        }
    }
    None
}

/// The report with every number replaced.
fn filled(mut r: Report, v: f64) -> Report {
    let o = |o: &mut Outcome| {
        if let Outcome::Value(x) = o {
            *x = v;
        }
    };
    for row in &mut r.figures {
        o(&mut row.nominal);
        row.range = row.range.map(|_| (v, v));
    }
    for row in &mut r.limits {
        o(&mut row.nominal);
        o(&mut row.worst);
        row.range = row.range.map(|_| (-v, v));
        row.margin = row.margin.map(|_| v);
        for c in &mut row.corner {
            c.value = v;
        }
    }
    for p in r.response.iter_mut().chain(&mut r.loop_gain) {
        (p.magnitude, p.phase) = (v, v);
    }
    for p in &mut r.density {
        p.total = v;
        p.by_source.iter_mut().for_each(|x| *x = v);
    }
    for s in &mut r.noise_shares {
        (s.rms, s.share) = (v, v);
    }
    for DcLine { nominal, worst, .. } in &mut r.dc_budget {
        o(nominal);
        o(worst);
    }
    for p in &mut r.envelope {
        (p.rails, p.current, p.slew) = (Some(v), None, Some(-v));
    }
    for Root { re, im } in r.poles.iter_mut().chain(&mut r.zeros) {
        (*re, *im) = (v, v);
    }
    for w in &mut r.working {
        w.handbook = v;
        o(&mut w.exact);
        w.numbers.iter_mut().for_each(|n| n.1 = v);
    }
    r
}

#[test]
fn no_number_that_is_none_is_ever_shown() {
    for kind in Kind::ALL {
        for v in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY, 0.0, -0.0, 5e-324, f64::MAX, f64::MIN, -1e-30, 1e21] {
            let mut sample = usual(*kind);
            sample.1 = filled(sample.1, v);
            let html = rendered(&sample);
            assert_eq!(shows_nonsense(&html), None, "{kind:?} filled with {v}");
            // Frequencies too, which make the axes.
            for p in sample.1.response.iter_mut().chain(&mut sample.1.loop_gain) {
                p.frequency = v;
            }
            sample.1.density.iter_mut().for_each(|p| p.frequency = v);
            sample.1.envelope.iter_mut().for_each(|p| p.frequency = v);
            assert_eq!(shows_nonsense(&rendered(&sample)), None, "{kind:?} with frequencies {v}");
        }
    }
}

#[test]
fn an_empty_report_renders() {
    for kind in Kind::ALL {
        let mut sample = usual(*kind);
        sample.1 = Report {
            transfer: vec![],
            name: String::new(),
            figures: vec![],
            limits: vec![],
            measured: vec![],
            response: vec![],
            loop_gain: vec![],
            density: vec![],
            noise_shares: vec![],
            dc_budget: vec![],
            envelope: vec![],
            poles: vec![],
            zeros: vec![],
            working: vec![],
            cautions: vec![],
        };
        sample.0.stage.supply = None;
        sample.0.stage.sources = vec![];
        assert!(rendered(&sample).contains("no limits to judge"));
    }
}

#[test]
fn the_whole_sheet_holds_every_section() {
    let sample = usual(Kind::NonInverting);
    let sheet = Sheet { block: &sample.0, report: &sample.1, part: &sample.2, id: "s" };
    let html = render(&sheet);
    for section in sections(&sheet) {
        assert!(html.contains(&format!(" data-section=\"{}\"", section.id)) && html.contains(&section.markup), "`{}`", section.id);
    }
}

#[test]
fn readings_walk_along_every_plot() {
    let sample = usual(Kind::NonInverting);
    let sheet = Sheet { block: &sample.0, report: &sample.1, part: &sample.2, id: "s" };
    for id in plot::charts::IDS {
        let chart = plot::chart(&sheet, id).unwrap();
        let (first, last) = (plot::reading(&sheet, id, 0).unwrap(), plot::reading(&sheet, id, usize::MAX).unwrap());
        assert_eq!(last.index, chart.x.len() - 1, "{id}");
        assert!(first.x < last.x, "{id}");
        assert_eq!(plot::reading_near(&sheet, id, -1e9).unwrap(), first, "{id}");
        assert_eq!(plot::reading_near(&sheet, id, 1e9).unwrap(), last, "{id}");
        for index in 0..chart.x.len() {
            let there = plot::reading(&sheet, id, index).unwrap();
            // Where a curve jumps, two points stand at one place.
            let near = plot::reading_near(&sheet, id, there.x).unwrap();
            assert_eq!(near.x.to_bits(), there.x.to_bits(), "{id}: a point is nearest to itself");
            assert!(near.index == index || id == "transfer", "{id}: {index}");
        }
        let csv = plot::csv(&chart);
        assert_eq!(csv.lines().count(), chart.x.len() + 1, "{id}");
    }
    assert_eq!(plot::reading(&sheet, "no such plot", 0), None);
}

#[test]
fn a_response_is_plotted_in_the_unit_of_the_kinds_gain() {
    // 20·log10(20.3) = 26.15, by hand.
    for (kind, title, head, least, most, text) in [
        (Kind::Inverting, "magnitude, dB", "\"magnitude (dB)\"", 26.14, 26.16, "26.15 dB"),
        (Kind::Transimpedance, "transimpedance, Ω", "\"magnitude (Ω)\"", 20.29, 20.31, "20.3 Ω"),
        (Kind::Charge, "charge gain, V/C", "\"magnitude (V/C)\"", 20.29, 20.31, "20.3 V/C"),
    ] {
        let sample = usual(kind);
        let sheet = Sheet { block: &sample.0, report: &sample.1, part: &sample.2, id: "s" };
        let chart = plot::chart(&sheet, "response-magnitude").unwrap();
        assert_eq!(chart.title, title);
        let csv = plot::csv(&chart);
        let mut lines = csv.lines();
        assert_eq!(lines.next(), Some(format!("frequency (Hz),{head}").as_str()));
        let first: f64 = lines.next().unwrap().split(',').nth(1).unwrap().parse().unwrap();
        assert!((least..most).contains(&first), "{kind:?}: {first}");
        assert_eq!(plot::reading(&sheet, "response-magnitude", 0).unwrap().text, format!("1.00 Hz: magnitude {text}"));
        // The response falls off over decades, and no curve runs along the frame.
        let places: Vec<f64> = chart.curves[0].y.iter().map(|v| chart.y_axis.place(*v)).collect();
        assert!(places[0] < 0.98 && places[0] > 0.5, "{kind:?}: {}", places[0]);
    }
}

#[test]
fn both_edges_of_a_pass_band_are_marked_and_their_words_keep_apart() {
    use stageleaf_math::figure::Figure;
    // A narrow band in the middle, a wide one, and bands at either end of the axis (1 Hz to 100 MHz).
    for (low, high) in [(27.9e3, 37.8e3), (99.6, 2.7e6), (2.0, 3.0), (2e7, 6e7), (3.0, 5e7), (1e3, 2e6)] {
        let mut sample = usual(Kind::MultipleFeedbackBandPass);
        for row in &mut sample.1.figures {
            match row.query.figure {
                Figure::LowCutoff => row.nominal = Outcome::Value(low),
                Figure::Bandwidth => row.nominal = Outcome::Value(high),
                _ => {}
            }
        }
        let html = rendered(&sample);
        let plot = html.split("data-plot=\"response-magnitude\"").nth(1).unwrap().split("</figure>").next().unwrap();
        let words: Vec<(f64, f64, bool)> = plot
            .split("<text class=\"mark\" ")
            .skip(1)
            .map(|t| {
                let attribute = |name: &str| t.split(&format!("{name}=\"")).nth(1).unwrap().split('"').next().unwrap();
                (attribute("x").parse().unwrap(), attribute("y").parse().unwrap(), attribute("text-anchor") == "end")
            })
            .collect();
        let [a, b] = words[..] else { panic!("{low} to {high}: {} marks", words.len()) };
        // 17 characters of 13 units' height are at most 120 wide.
        let span = |(x, _, end): (f64, f64, bool)| if end { (x - 120.0, x) } else { (x, x + 120.0) };
        let apart = span(a).1 <= span(b).0 || span(b).1 <= span(a).0 || (a.1 - b.1).abs() >= 14.0;
        assert!(apart, "{low} to {high}: {a:?} and {b:?}");
        for (from, to) in [span(a), span(b)] {
            assert!(from > 50.0 && to < 420.0, "{low} to {high}: words from {from} to {to}");
        }
    }
}

#[test]
fn the_envelope_is_the_lowest_of_the_bounds_that_there_are() {
    use stageleaf_math::report::EnvelopePoint;
    let mut sample = usual(Kind::NonInverting);
    let point = |frequency, rails, current, slew| EnvelopePoint { frequency, rails, current, slew };
    sample.1.envelope = vec![
        point(1e3, Some(10.0), Some(20.0), None),
        point(1e4, Some(10.0), None, Some(9.0)),
        point(1e5, None, Some(3.0), Some(4.0)),
        // No bound is known: nothing can be drawn.
        point(1e6, None, None, None),
    ];
    let sheet = Sheet { block: &sample.0, report: &sample.1, part: &sample.2, id: "s" };
    let chart = plot::chart(&sheet, "envelope").unwrap();
    assert_eq!(chart.x, [1e3, 1e4, 1e5]);
    assert_eq!(chart.curves[0].y, [10.0, 9.0, 3.0]);
    let names: Vec<&str> = chart.curves.iter().map(|c| c.name.as_str()).collect();
    assert_eq!(names, ["clean output", "rails", "current", "slew rate"]);
    assert_eq!(plot::reading(&sheet, "envelope", 2).unwrap().text.split("; rails").next(), Some("100 kHz: clean output 3.00 V"));
}

#[test]
fn an_oscillating_stage_says_so_before_its_limits() {
    use stageleaf_math::report::Caution;
    let mut sample = usual(Kind::NonInverting);
    sample.1.cautions = vec![Caution::Oscillates, Caution::TakenAsExact(vec!["Rf", "Rg"])];
    let html = rendered(&sample);
    let (alarm, summary) = (html.find("class=\"alarm\"").unwrap(), html.find("class=\"summary\"").unwrap());
    assert!(alarm < summary && html[alarm..summary].contains("oscillates"));
    // What is taken as exact bears on the limits, and is told there.
    let limits = html.split("data-section=\"limits\"").nth(1).unwrap().split("</section>").next().unwrap();
    assert!(limits.contains("Rf, Rg"));
    sample.1.cautions.clear();
    assert!(!rendered(&sample).contains("class=\"alarm\""));
}

#[test]
fn an_impedance_says_at_which_frequency() {
    let mut sample = usual(Kind::NonInverting);
    for signal in sample.0.stage.signals.iter_mut().flatten() {
        signal.frequency = Some(20e3);
    }
    assert!(rendered(&sample).contains("Input impedance at 20 kHz"));
    sample.0.stage.signals.clear();
    assert!(rendered(&sample).contains("Output impedance at DC"));
}
