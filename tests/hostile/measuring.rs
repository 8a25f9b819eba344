//! `[measured]`: the bench beside the prediction for its conditions.

use super::{Bench, fenced};

fn note(measured: &str) -> String {
    fenced(&format!(
        "stage = \"non-inverting\"\nname = \"A\"\npart = \"oak-1\"\n[components]\nRf = \"9k 1% 100ppm\"\nRg = \"1k 1%\"\n[ambient]\nrange = \"-20 °C to 60 °C, 20 °C nominal\"\n[measured]\n{measured}"
    ))
}

#[test]
fn a_measurement_within_its_uncertainty_agrees_or_contradicts() {
    let bench = Bench::new("measured");
    // By hand, open-loop gain 100 dB aside: 1 + 9·1.01/0.99 = 10.182 and 1 + 9·0.99/1.01 = 9.822 at 20 °C, 0.4 % of Rf wider at 60 °C.
    for (value, at, agrees) in [
        ("10.0 ± 0.01", "", true),
        ("10.17 ± 0.01", "20 °C", true),
        ("10.20 ± 0.03", "20 °C", true),
        ("10.205 ± 0.01", "20 °C", false),
        ("10.205 ± 0.01", "60 °C", true),
        ("10.205 ± 0.01", "", true),
        ("10.3 ± 0.01", "", false),
        ("9.7 ± 0.01", "", false),
    ] {
        let at = if at.is_empty() { String::new() } else { format!(", at = {{ temperature = \"{at}\" }}") };
        bench.write("note.md", note(&format!("gain = {{ value = \"{value}\", unit = \"unit 3\"{at} }}\n")));
        let said = bench.run(&["check", "note.md"]);
        assert_eq!(said.code, Some(i32::from(!agrees)), "{value}{at}: {}", said.out);
        let word = if agrees { ": agrees\n" } else { ": contradicts\n" };
        assert!(said.out.contains("measured: gain ") && said.out.contains(", unit 3") && said.out.contains(word), "{value}: {}", said.out);
    }
    let said = bench.run(&["check", "note.md"]);
    assert!(said.out.ends_with("; 1 measurement outside its prediction\n"), "{}", said.out);
    let json: serde_json::Value = serde_json::from_str(&bench.run(&["check", "note.md", "--format", "json"]).out).expect("JSON");
    let row = &json["stages"][0]["measured"][0];
    assert_eq!(
        (row["figure"].as_str(), row["agreement"].as_str(), row["sample"].as_str()),
        (Some("gain"), Some("contradicts"), Some("unit 3"))
    );
    assert!((row["predicted"]["low"].as_f64().expect("a number") - 9.79).abs() < 0.05);
    assert!(bench.run(&["check", "note.md", "--format", "github"]).out.starts_with("::error file=note.md,line=11,col="));
}

#[test]
fn what_is_not_predicted_is_neither_right_nor_wrong() {
    let bench = Bench::new("measured-undetermined");
    bench.write(
        "note.md",
        note("output_noise = \"20 µV\"\n\"gain_at 100 kHz\" = { value = \"9.9 ± 0.3\", at = { temperature = \"25 °C\" } }\n"),
    );
    let said = bench.run(&["check", "note.md"]);
    assert_eq!((said.code, said.err.as_str()), (Some(0), ""), "{}", said.out);
    assert!(said.out.contains("measured: output_noise 20.00 µV; predicted needs `voltage`"), "{}", said.out);
    assert!(said.out.contains("measured: gain_at 100 kHz 9.900 (9.600 to 10.20), at 25 °C; predicted "), "{}", said.out);
}
