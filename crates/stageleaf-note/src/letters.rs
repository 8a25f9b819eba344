//! Letters of any script, and the lower case of those that engineers' names are written in.
//!
//! The standard library's tables for all scripts weigh 12 KB in a page as served. Here: lower case for Latin, Greek and
//! Cyrillic as far as it goes by rule; a letter of another script stays as it stands.

/// The lower case of one letter.
#[must_use]
pub fn lower(c: char) -> char {
    let code = u32::from(c);
    let next_if = |odd: u32| if code % 2 == odd { code + 1 } else { code };
    let lower = match code {
        0x41..=0x5a | 0xc0..=0xd6 | 0xd8..=0xde | 0x391..=0x3a1 | 0x3a3..=0x3ab | 0x410..=0x42f => code + 32,
        0x100..=0x12f
        | 0x132..=0x137
        | 0x14a..=0x177
        | 0x460..=0x481
        | 0x48a..=0x4bf
        | 0x4d0..=0x52f
        | 0x1e00..=0x1e95
        | 0x1ea0..=0x1eff => next_if(0),
        0x139..=0x148 | 0x179..=0x17e | 0x4c1..=0x4ce => next_if(1),
        0x178 => 0xff,
        0x386 => 0x3ac,
        0x388..=0x38a => code + 37,
        0x38c => 0x3cc,
        0x38e | 0x38f => code + 63,
        0x400..=0x40f => code + 80,
        0x4c0 => 0x4cf,
        0x2126 => 0x3c9,
        _ => code,
    };
    char::from_u32(lower).unwrap_or(c)
}

/// The text in lower case.
#[must_use]
pub fn lowered(text: &str) -> String {
    text.chars().map(lower).collect()
}

/// Whether it is a letter or a digit, and no space, punctuation, sign or picture. Blocks of signs are left out as a
/// whole, even where a letter stands among them.
#[must_use]
pub const fn is_letter_or_digit(c: char) -> bool {
    match c {
        '\0'..='\u{7f}' => c.is_ascii_alphanumeric(),
        'ª' | '²' | '³' | 'µ' | '¹'..='º' | '¼'..='¾' | '⁰'..='₉' | 'Ω' => true,
        '\u{80}'..='¿' | '×' | '÷' | '\u{2c2}'..='\u{2df}' | '\u{300}'..='\u{36f}' => false,
        // Punctuation, signs, arrows, shapes; CJK punctuation; private use; variants and marks; full-width punctuation.
        '\u{2000}'..='\u{2bff}' | '\u{2e00}'..='\u{2fff}' | '\u{3000}'..='\u{3004}' | '\u{3008}'..='\u{3020}' => false,
        '\u{e000}'..='\u{f8ff}' | '\u{fe00}'..='\u{fe6f}' | '\u{feff}'..='\u{ff0f}' | '\u{ff1a}'..='\u{ff20}' => false,
        // Pictures, and all that is no text.
        '\u{1d000}'..='\u{1d3ff}' | '\u{1f000}'..='\u{1faff}' | '\u{e0000}'.. => false,
        _ => true,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Latin, Greek and Cyrillic, by the standard library's own tables.
    #[test]
    fn lower_case_is_the_standards_where_the_scripts_go_by_rule() {
        for c in ('\0'..='\u{17f}').chain('\u{370}'..='\u{3ce}').chain('\u{400}'..='\u{52f}').chain('\u{1e00}'..='\u{1e95}') {
            // The one capital whose lower case is two characters, and a letter of Coptic descent.
            if c == 'İ' || c == 'Ͱ' || c == 'Ͳ' || c == 'Ͷ' || c == 'Ϳ' {
                continue;
            }
            assert_eq!(c.to_lowercase().collect::<Vec<_>>(), [lower(c)], "{c} U+{:04X}", u32::from(c));
        }
    }

    #[test]
    fn letters_are_the_standards_in_those_scripts() {
        for c in ('\0'..='\u{2c1}')
            .chain('\u{386}'..='\u{3f5}')
            .chain('\u{400}'..='\u{481}')
            .chain('\u{48a}'..='\u{52f}')
            .chain('\u{1e00}'..='\u{1eff}')
        {
            if c != '\u{387}' && c.to_lowercase().next().is_some() && !matches!(u32::from(c), 0x38b | 0x38d | 0x3a2) {
                assert_eq!(c.is_alphanumeric(), is_letter_or_digit(c), "{c} U+{:04X}", u32::from(c));
            }
        }
        for c in "–—’“”… ·•→−∞√≈Σ∥△☂、。「」！😀".chars() {
            assert_eq!(c.is_alphanumeric(), is_letter_or_digit(c), "{c}");
        }
        for c in "水温計अنमםΩ９".chars() {
            assert!(is_letter_or_digit(c) && c.is_alphanumeric(), "{c}");
        }
    }
}
