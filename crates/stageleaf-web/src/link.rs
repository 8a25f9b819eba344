//! A sheet's changed values in the page's address: `#stageleaf-1/SHEET/path=value/path=value//OTHER-SHEET/path=value`.
//!
//! Names and values are percent-encoded, so that no text of theirs can pass for a separator. The number is the
//! format's version. What stands in an address is a stranger's text: it goes through the block's reader like typed text.

use std::fmt::Write as _;

const START: &str = "stageleaf-1/";

/// More changes than any stage has values are not looked at.
const MOST: usize = 64;

/// What an address says about a sheet.
#[derive(Debug, PartialEq, Eq)]
pub enum Found {
    /// Nothing.
    Nothing,
    /// It is in a format of another version.
    OtherVersion,
    /// These paths with these values.
    Changes(Vec<(String, String)>),
}

/// What `fragment` (without `#`) says about the sheet called `id`.
pub fn read(fragment: &str, id: &str) -> Found {
    if fragment.starts_with("stageleaf-") && !fragment.starts_with(START) {
        return Found::OtherVersion;
    }
    let Some(rest) = fragment.strip_prefix(START) else { return Found::Nothing };
    for sheet in rest.split("//") {
        let mut pieces = sheet.split('/');
        if pieces.next().and_then(decode).as_deref() != Some(id) {
            continue;
        }
        let changes = pieces.take(MOST).filter_map(|piece| {
            let (path, value) = piece.split_once('=')?;
            Some((decode(path)?, decode(value)?))
        });
        return Found::Changes(changes.collect());
    }
    Found::Nothing
}

/// The fragment with `changes` for the sheet called `id`; what it says about other sheets stays.
pub fn write(fragment: &str, id: &str, changes: &[(String, String)]) -> String {
    let mut sheets: Vec<String> = fragment
        .strip_prefix(START)
        .into_iter()
        .flat_map(|rest| rest.split("//"))
        .filter(|sheet| !sheet.is_empty() && sheet.split('/').next().and_then(decode).as_deref() != Some(id))
        .map(str::to_owned)
        .collect();
    if !changes.is_empty() {
        let mut sheet = encode(id);
        for (path, value) in changes {
            let _ = write!(sheet, "/{}={}", encode(path), encode(value));
        }
        sheets.push(sheet);
    }
    if sheets.is_empty() { encode(id) } else { format!("{START}{}", sheets.join("//")) }
}

fn encode(text: &str) -> String {
    let mut encoded = String::with_capacity(text.len());
    for byte in text.bytes() {
        if byte.is_ascii_alphanumeric() || b"-._~".contains(&byte) {
            encoded.push(char::from(byte));
        } else {
            let _ = write!(encoded, "%{byte:02X}");
        }
    }
    encoded
}

fn decode(text: &str) -> Option<String> {
    let mut bytes = Vec::with_capacity(text.len());
    let mut rest = text.bytes();
    while let Some(byte) = rest.next() {
        if byte == b'%' {
            let mut digit = || char::from(rest.next()?).to_digit(16).and_then(|d| u8::try_from(d).ok());
            bytes.push(digit()? * 16 + digit()?);
        } else {
            bytes.push(byte);
        }
    }
    String::from_utf8(bytes).ok()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn change(path: &str, value: &str) -> (String, String) {
        (path.to_owned(), value.to_owned())
    }

    #[test]
    fn what_is_written_is_read_back_with_any_characters() {
        let changes = vec![change("components.Rf", "4k7 1% 50ppm"), change("limits.gain_at 20 kHz", "a/b=c//d#µΩ%")];
        let fragment = write("", "line-amplifier", &changes);
        assert_eq!(read(&fragment, "line-amplifier"), Found::Changes(changes));
        assert_eq!(read(&fragment, "other"), Found::Nothing);
    }

    #[test]
    fn sheets_share_one_address() {
        let one = write("", "a", &[change("part", "x")]);
        let both = write(&one, "b", &[change("part", "y")]);
        assert_eq!(both, "stageleaf-1/a/part=x//b/part=y");
        assert_eq!(write(&both, "a", &[]), "stageleaf-1/b/part=y");
    }

    #[test]
    fn broken_and_foreign_addresses_change_nothing() {
        assert_eq!(read("bandwidth", "a"), Found::Nothing);
        assert_eq!(read("stageleaf-9/a/part=x", "a"), Found::OtherVersion);
        assert_eq!(read("stageleaf-1/a/part=%zz/=/x/%F0=1", "a"), Found::Changes(vec![change("", "")]));
    }
}
