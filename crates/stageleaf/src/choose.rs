//! `choose`: component values for what is wanted, from a series or a stock list, judged with the stage's own limits.

use std::{
    fmt::Write as _,
    fs,
    path::{Path, PathBuf},
};

use clap::Args;
use stageleaf_math::{
    dimension::Dimension,
    figure::Figure,
    kind::Kind,
    report::Outcome,
    search::choose::{Choice, Refusal, Response, Stock, Target, choose},
    series::Series,
};
use stageleaf_note::{Trouble, code, format as quantity_text, parse, problem::nearest, query_text, words::caution_text};

use crate::{
    asked::{self, AskedStage},
    check::Ending,
    fault::Fault,
    terminal::{Ink, Terminal, paint, plain},
    walk::{show, unreadable},
};

/// How many choices are shown.
const SHOWN: usize = 5;
/// Digits of a figure.
const DIGITS: usize = 4;
/// Figures that can be aimed at.
const AIMS: [Figure; 5] = [Figure::Gain, Figure::Bandwidth, Figure::LowCutoff, Figure::NaturalFrequency, Figure::Q];

/// What `choose` is asked.
#[derive(Args, Clone, Debug)]
pub struct Options {
    /// The note with the stage whose components are to be chosen
    #[arg(value_name = "NOTE")]
    pub note: PathBuf,
    /// What is wanted: gain=20.4, bandwidth="300 kHz", `low_cutoff`, `natural_frequency`, q; or cutoff="1 kHz" with --response
    #[arg(required = true, value_name = "FIGURE=VALUE")]
    pub wanted: Vec<String>,
    /// A second-order response: butterworth, bessel, or chebyshev with its ripple as chebyshev=0.5
    #[arg(long, value_name = "RESPONSE")]
    pub response: Option<String>,
    /// The stage, by its name or as links write it
    #[arg(long, value_name = "NAME")]
    pub stage: Option<String>,
    /// Components that keep their values
    #[arg(long, value_name = "NAME", value_delimiter = ',')]
    pub hold: Vec<String>,
    /// Series of the resistors, instead of the settings' one
    #[arg(long, value_name = "SERIES")]
    pub resistors: Option<String>,
    /// Series of the capacitors, instead of the settings' one
    #[arg(long, value_name = "SERIES")]
    pub capacitors: Option<String>,
    /// Least and greatest resistor
    #[arg(long, value_name = "FROM..TO", default_value = "1k..1M")]
    pub ohms: String,
    /// Least and greatest capacitor
    #[arg(long, value_name = "FROM..TO", default_value = "1n..100n")]
    pub farads: String,
    /// A list of the values in stock, one on a line, instead of the series
    #[arg(long, value_name = "FILE")]
    pub stock: Option<PathBuf>,
    /// Folder of part files, instead of the one that stageleaf.toml names
    #[arg(long, value_name = "DIR")]
    pub shelf: Option<PathBuf>,
}

/// Chooses.
///
/// Ends with 1 when no choice keeps every limit of the stage.
pub fn run(options: &Options, terminal: &mut Terminal) -> Ending {
    let asked = asked::stages(std::slice::from_ref(&options.note), options.stage.as_deref(), options.shelf.as_deref());
    for fault in &asked.faults {
        terminal.complain(&format!("{fault}\n"));
    }
    let chosen = match asked.stages.as_slice() {
        [] => return Ending::BadInput,
        [only] => only,
        several => {
            let names: Vec<String> = several.iter().map(|s| format!("“{}”", plain(&s.stage.block.stage.name))).collect();
            terminal.complain(
                &Fault::Path {
                    path: show(&options.note),
                    message: "there are several stages here".to_owned(),
                    allowed: Some(names.join(", ")),
                    attempt: Some("--stage NAME".to_owned()),
                }
                .to_string(),
            );
            return Ending::BadInput;
        }
    };
    match values(options, chosen) {
        Ok((targets, choices)) => {
            terminal.out(&text(chosen, &targets, &choices, terminal.colour()));
            let kept = choices.iter().any(Choice::survives);
            match (asked.faults.is_empty(), kept) {
                (false, _) => Ending::BadInput,
                (true, false) => Ending::Broken,
                (true, true) => Ending::Good,
            }
        }
        Err(fault) => {
            terminal.complain(&fault.to_string());
            Ending::BadInput
        }
    }
}

fn values(options: &Options, of: &AskedStage) -> Result<(Vec<Target>, Vec<Choice>), Fault> {
    let stage = &of.stage.block.stage;
    let targets = targets(options, stage.kind)?;
    let names: Vec<&str> = stage.components.iter().map(|c| c.name).collect();
    for held in &options.hold {
        if !names.contains(&held.as_str()) {
            return Err(Fault::Path {
                path: "--hold".to_owned(),
                message: format!("the stage has no component `{}`", plain(held)),
                allowed: Some(names.join(", ")),
                attempt: nearest(held, names.iter().copied()).map(|n| format!("--hold {n}")),
            });
        }
    }
    // The sign is the kind's: nobody can choose it.
    let inverts = (stage.kind.spec().ideal_gain)(stage) < 0.0;
    let targets: Vec<Target> = match targets.iter().find(|t| t.figure == Figure::Gain && t.value < 0.0 && !inverts) {
        Some(_) => {
            return Err(Fault::path("gain", format!("a stage of kind {} does not invert: its gain is above zero", stage.kind.id())));
        }
        None => targets
            .into_iter()
            .map(|t| if t.figure == Figure::Gain && inverts { Target { value: -t.value.abs(), ..t } } else { t })
            .collect(),
    };
    let stock = stock(options, of)?;
    let held: Vec<&str> = options.hold.iter().map(String::as_str).collect();
    let choices = choose(stage, &targets, &held, &stock).map_err(|refusal| refused(&refusal, stage.kind))?;
    Ok((targets, choices))
}

fn targets(options: &Options, kind: Kind) -> Result<Vec<Target>, Fault> {
    let mut targets: Vec<Target> = Vec::new();
    let mut cutoff = None;
    for wanted in &options.wanted {
        let Some((id, value)) = wanted.split_once('=') else {
            return Err(Fault::Path {
                path: plain(wanted),
                message: "a wanted figure needs its value".to_owned(),
                allowed: Some("FIGURE=VALUE, as gain=20.4".to_owned()),
                attempt: None,
            });
        };
        let id = id.trim();
        let read = |dimension: Dimension| parse(value, dimension).map_err(|t| troubled(wanted, &t));
        if id == "cutoff" {
            cutoff = Some(read(Dimension::Frequency)?);
            continue;
        }
        let Some(figure) = AIMS.into_iter().find(|f| f.id() == id) else {
            let ids: Vec<&str> = AIMS.iter().map(|f| f.id()).chain(["cutoff"]).collect();
            return Err(Fault::Path {
                path: plain(wanted),
                message: format!("values cannot be chosen for `{}`", plain(id)),
                allowed: Some(ids.join(", ")),
                attempt: nearest(id, ids.iter().copied()).map(|id| format!("{id}={}", plain(value))),
            });
        };
        let value = read(figure.dimension_in(kind))?;
        if !(value.abs() > 0.0 && value.is_finite()) || (figure != Figure::Gain && value < 0.0) {
            return Err(Fault::path(plain(wanted), format!("`{id}` has to be above zero")));
        }
        targets.push(Target { figure, value });
    }
    match (&options.response, cutoff) {
        (None, None) => {}
        (Some(name), Some(cutoff)) => {
            let (ratio, q) = response(name)?.shape();
            let high_pass = matches!(kind, Kind::SallenKeyHighPass);
            targets.push(Target { figure: Figure::NaturalFrequency, value: if high_pass { cutoff / ratio } else { cutoff * ratio } });
            targets.push(Target { figure: Figure::Q, value: q });
        }
        (Some(_), None) => return Err(Fault::path("--response", "a response needs its cutoff: cutoff=\"1 kHz\"")),
        (None, Some(_)) => return Err(Fault::path("cutoff", "a cutoff needs its response: --response butterworth")),
    }
    Ok(targets)
}

fn response(name: &str) -> Result<Response, Fault> {
    let ripple = name.strip_prefix("chebyshev=").and_then(|r| r.trim().trim_end_matches("dB").trim().parse::<f64>().ok());
    match (name, ripple) {
        ("butterworth", _) => Ok(Response::Butterworth),
        ("bessel", _) => Ok(Response::Bessel),
        (_, Some(ripple)) if ripple > 0.0 && ripple <= 6.0 => Ok(Response::Chebyshev(ripple)),
        _ => Err(Fault::Path {
            path: "--response".to_owned(),
            message: format!("no response is called `{}`", plain(name)),
            allowed: Some("butterworth, bessel, or chebyshev with a ripple up to 6 dB, as chebyshev=0.5".to_owned()),
            attempt: None,
        }),
    }
}

fn stock(options: &Options, of: &AskedStage) -> Result<Stock, Fault> {
    let ohms = range(&options.ohms, Dimension::Resistance, "--ohms")?;
    let farads = range(&options.farads, Dimension::Capacitance, "--farads")?;
    let within = |values: Vec<f64>, (low, high): (f64, f64)| values.into_iter().filter(|v| (low..=high).contains(v)).collect::<Vec<f64>>();
    if let Some(path) = &options.stock {
        let text = fs::read_to_string(path).map_err(|e| unreadable(path, &e))?;
        let (resistors, capacitors) = listed(&text, path)?;
        return Ok(Stock { resistors: within(resistors, ohms), capacitors: within(capacitors, farads) });
    }
    let resistors = series(options.resistors.as_deref(), of.team.settings.resistor_series, "--resistors")?;
    let capacitors = series(options.capacitors.as_deref(), of.team.settings.capacitor_series, "--capacitors")?;
    Ok(Stock { resistors: all_of(resistors, ohms), capacitors: all_of(capacitors, farads) })
}

/// The values of a series between two, ascending.
fn all_of(series: Series, (low, high): (f64, f64)) -> Vec<f64> {
    let mut values = Vec::new();
    let mut value = series.nearest(low);
    if value < low * (1.0 - 1e-9) {
        value = series.step_up(value);
    }
    while value <= high * (1.0 + 1e-9) && values.last().is_none_or(|last| value > *last) {
        values.push(value);
        value = series.step_up(value);
    }
    values
}

fn series(given: Option<&str>, usual: Series, what: &str) -> Result<Series, Fault> {
    let Some(given) = given else { return Ok(usual) };
    Series::ALL.iter().copied().find(|s| s.id().eq_ignore_ascii_case(given)).ok_or_else(|| Fault::Path {
        path: what.to_owned(),
        message: format!("no series is called `{}`", plain(given)),
        allowed: Some(Series::ALL.iter().map(|s| s.id()).collect::<Vec<_>>().join(", ")),
        attempt: None,
    })
}

fn range(text: &str, dimension: Dimension, what: &str) -> Result<(f64, f64), Fault> {
    let refused = |message: String| Fault::Path {
        path: what.to_owned(),
        message,
        allowed: Some("least and greatest value with two dots between, as 1k..100k".to_owned()),
        attempt: None,
    };
    let (low, high) = text.split_once("..").ok_or_else(|| refused(format!("`{}` is no range", plain(text))))?;
    let read = |t: &str| parse(t, dimension).map_err(|t| refused(t.message));
    let (low, high) = (read(low)?, read(high)?);
    // Twelve decades of a fine series would take a day.
    if low > 0.0 && low <= high && high / low <= 1e7 {
        Ok((low, high))
    } else {
        Err(refused(format!("`{}` does not run upwards from above zero over at most seven decades", plain(text))))
    }
}

/// A stock list: a value on each line, ohms or farads by their unit; what follows `#` is a remark.
fn listed(text: &str, path: &Path) -> Result<(Vec<f64>, Vec<f64>), Fault> {
    let (mut resistors, mut capacitors) = (Vec::new(), Vec::new());
    for (number, line) in text.trim_start_matches('\u{feff}').lines().enumerate() {
        let value = line.split('#').next().unwrap_or_default().trim();
        if value.is_empty() {
            continue;
        }
        // `4n7` is a capacitor and `4k7` a resistor; a bare number is neither.
        let (ohms, farads) = (parse(value, Dimension::Resistance), parse(value, Dimension::Capacitance));
        match (ohms, farads) {
            (Ok(r), Err(_)) if r > 0.0 => resistors.push(r),
            (Err(_), Ok(c)) if c > 0.0 => capacitors.push(c),
            (Ok(v), Ok(_)) if v >= 1.0 && !value.contains(['p', 'n', 'u', 'µ', 'μ', 'm']) => resistors.push(v),
            (Ok(_), Ok(c)) if c > 0.0 && c < 1.0 => capacitors.push(c),
            _ => {
                return Err(Fault::Path {
                    path: format!("{}:{}", show(path), number + 1),
                    message: format!("`{}` is neither a resistance nor a capacitance", plain(value)),
                    allowed: Some("a value on each line, as 4k7 or 4n7; a remark behind #".to_owned()),
                    attempt: None,
                });
            }
        }
    }
    for list in [&mut resistors, &mut capacitors] {
        list.sort_by(f64::total_cmp);
        list.dedup();
    }
    Ok((resistors, capacitors))
}

fn troubled(wanted: &str, trouble: &Trouble) -> Fault {
    Fault::Path {
        path: plain(wanted),
        message: trouble.message.clone(),
        allowed: Some(trouble.allowed.clone()),
        attempt: trouble.attempt.clone(),
    }
}

fn refused(refusal: &Refusal, kind: Kind) -> Fault {
    let (message, allowed) = match refusal {
        Refusal::NoClosedForm(figure) => {
            (format!("a stage of kind {} with these components has no closed form for `{}`", kind.id(), figure.id()), None)
        }
        Refusal::Nothing(figure) => (format!("no component that is free moves `{}`", figure.id()), None),
        Refusal::TooFree { free, targets } => (
            format!("{} components are free ({}) and {targets} figures are wanted", free.len(), free.join(", ")),
            Some("as many free components as figures, two for a gain; hold the others with --hold, or want more".to_owned()),
        ),
        Refusal::NoValues => {
            ("there is no value to choose from".to_owned(), Some("a wider --ohms or --farads, another series or stock list".to_owned()))
        }
        Refusal::TooMany(count) => (
            format!("{count} combinations of capacitors are too many"),
            Some("a coarser series of capacitors, a narrower --farads, or some held".to_owned()),
        ),
        Refusal::Impossible => {
            ("no combination of these values meets what is wanted".to_owned(), Some("other ranges, a lower Q, another gain".to_owned()))
        }
    };
    Fault::Path { path: "choose".to_owned(), message, allowed, attempt: None }
}

fn text(of: &AskedStage, targets: &[Target], choices: &[Choice], colour: bool) -> String {
    let stage = &of.stage.block.stage;
    let aims: Vec<String> = targets
        .iter()
        .map(|t| format!("{} {}", t.figure.id(), quantity_text(t.value, t.figure.dimension_in(stage.kind), DIGITS)))
        .collect();
    let mut text = format!(
        "{}:{}  {}  ({}, {})\n  wanted: {}\n",
        of.file,
        of.stage.block.line,
        plain(&stage.name),
        stage.kind.id(),
        plain(&stage.part.id),
        aims.join(", ")
    );
    for choice in choices.iter().take(SHOWN) {
        let values: Vec<String> = choice.values.iter().map(|(name, value)| format!("{name} {}", value_text(of, name, *value))).collect();
        let (word, ink) = match (choice.survives(), choice.cautions.is_empty(), stage.limits.is_empty()) {
            (true, _, true) => ("fits", Ink::Quiet),
            (true, _, false) => ("holds", Ink::Good),
            (false, true, _) => ("breaks", Ink::Bad),
            (false, false, _) => ("cannot work", Ink::Bad),
        };
        line(&mut text, &format!("  {}  {}", paint(word, ink, colour), values.join("  ")));
        for reached in &choice.reached {
            let d = reached.target.figure.dimension_in(stage.kind);
            let nominal = match &reached.nominal {
                Outcome::Value(v) => quantity_text(*v, d, DIGITS),
                _ => "without a value".to_owned(),
            };
            let range = reached.range.map_or(String::new(), |(low, high)| {
                format!(", {} to {} at the worst case", quantity_text(low, d, DIGITS), quantity_text(high, d, DIGITS))
            });
            line(&mut text, &format!("         {} {nominal}{range}", reached.target.figure.id()));
        }
        if let Some(noise) = choice.noise {
            line(&mut text, &format!("         output noise {}", quantity_text(noise, Dimension::Voltage, 3)));
        }
        for caution in &choice.cautions {
            line(&mut text, &format!("         {}", plain(&caution_text(caution))));
        }
        if !choice.lost.is_empty() {
            let lost: Vec<String> = choice.lost.iter().map(|l| query_text(l.query)).collect();
            line(&mut text, &format!("         not kept: {}", lost.join(", ")));
        }
    }
    let rejected = choices.iter().filter(|c| !c.survives()).count();
    line(&mut text, &format!("  {} judged in full at the worst case; {rejected} lose a limit", choices.len()));
    if let Some(first) = choices.first().filter(|c| c.survives()) {
        text.push_str("\n  [components]\n");
        for (name, _) in &first.values {
            let value = first.values.iter().find(|(n, _)| n == name).map_or(0.0, |v| v.1);
            line(&mut text, &format!("  {name} = \"{}\"", value_text(of, name, value)));
        }
    }
    text.push('\n');
    text
}

/// The value as the block would state it: the note's tolerance and drift stay.
fn value_text(of: &AskedStage, name: &str, value: f64) -> String {
    let dimension = of.stage.block.stage.kind.components().iter().find(|c| c.name == name).map_or(Dimension::Number, |c| c.dimension);
    let rest = of.stage.block.field(&format!("components.{name}")).and_then(|f| f.text.trim().split_once(' ')).map_or("", |(_, rest)| rest);
    // "91 kΩ 1%": the unit belongs to the value that goes.
    let rest = rest.trim_start();
    let rest = if rest.starts_with(|c: char| c.is_ascii_digit() || c == '±' || c == '+') {
        rest
    } else {
        rest.split_once(' ').map_or("", |(_, r)| r)
    };
    plain(format!("{} {rest}", code(value, dimension)).trim())
}

fn line(text: &mut String, words: &str) {
    writeln!(text, "{words}").expect("a string takes all");
}
