//! One classic script: the glue, the wasm as text, the element, the stylesheet.
//!
//! The wasm's bytes are sorted by meaning (see [`super::streams`]), and the text has one character for each, which keeps
//! the repeats that base64 hides from the compressor: as served it weighs less than the wasm itself. Classic, not a module: from `file://` browsers refuse modules and
//! `fetch`.

use std::{
    fs,
    path::{Path, PathBuf},
    process::Command,
};

use super::{Failure, read, streams, write};

/// The element's hand-written script.
const ELEMENT: &str = include_str!("../../../stageleaf-web/element.js");

/// Puts the wasm's bytes back in order.
const UNPACK: &str = include_str!("../../../stageleaf-web/unpack.js");

/// Rules for what only the script or the book adds.
const LIVE_STYLE: &str = include_str!("../../../stageleaf-web/live.css");

/// Compiles `stageleaf-web` and writes `stageleaf.js` and `stageleaf.css` into `out`.
pub fn build(root: &Path, out: &Path) -> Result<(), Failure> {
    let wasm = compile(root)?;
    bind(&wasm, out)?;
    let glue = without_script_address(&read(&out.join("stageleaf_web.js"))?)?;
    let glue = plain_lines(&without_loader(&glue)?)?;
    let at = out.join("stageleaf_web_bg.wasm");
    let bytes = fs::read(&at).map_err(|error| format!("the wasm: {error}"))?;
    let (glue, bytes) = short_names(&glue, bytes)?;
    // Tests take the two together.
    write(&at, &bytes)?;
    let style = without_comments(&format!("{}\n{LIVE_STYLE}", stageleaf_sheet::STYLE));
    let script = bundle(&glue, &bytes, &style)?;
    for forbidden in ["</script", "<!--"] {
        if script.to_ascii_lowercase().contains(forbidden) {
            return Err(format!("stageleaf.js holds `{forbidden}` and could not stand inside a page"));
        }
    }
    // What tests load without the element.
    write(&out.join("glue.js"), &glue)?;
    write(&out.join("stageleaf.css"), &style)?;
    write(&out.join("stageleaf.js"), script)
}

fn compile(root: &Path) -> Result<PathBuf, Failure> {
    let mut command = Command::new("sh");
    command.arg(root.join("scripts/wasm.sh")).stderr(std::process::Stdio::inherit());
    // What the surrounding cargo sets for its own build must not steer this one.
    for (name, _) in std::env::vars_os() {
        let name = name.to_string_lossy().into_owned();
        if name.starts_with("CARGO_PKG_")
            || name.starts_with("CARGO_FEATURE_")
            || name == "CARGO_MANIFEST_DIR"
            || name == "RUSTUP_TOOLCHAIN"
        {
            command.env_remove(name);
        }
    }
    let output = command.output().map_err(|error| format!("scripts/wasm.sh: {error}"))?;
    if !output.status.success() {
        return Err("scripts/wasm.sh failed; its words are above".to_owned());
    }
    let path = String::from_utf8_lossy(&output.stdout).trim().to_owned();
    Ok(PathBuf::from(path))
}

/// The only call into wasm-bindgen's generator, which calls itself an internal dependency.
fn bind(wasm: &Path, out: &Path) -> Result<(), Failure> {
    let work = || {
        let mut generator = wasm_bindgen_cli_support::Bindgen::new();
        generator
            .input_path(wasm)
            .no_modules(true)?
            .no_modules_global("stageleaf_wasm")?
            .typescript(false)
            .omit_default_module_path(true)
            .remove_name_section(true)
            .remove_producers_section(true);
        generator.generate(out)
    };
    work().map_err(|error| format!("glue for {}: {error:#}", wasm.display()))
}

/// Cuts the block that resolves the script's own address: in an inline script of a `srcdoc` frame it throws.
fn without_script_address(glue: &str) -> Result<String, Failure> {
    let start = "let script_src;";
    let end = "location.href).toString();";
    let (Some(from), Some(to)) = (glue.find(start), glue.find(end)) else {
        return Err("the glue has no `script_src` block any more: look at what the generator writes now".to_owned());
    };
    let close = glue[to..].find('}').map(|at| to + at + 1).filter(|_| to > from);
    let (Some(close), 1) = (close, glue.matches(start).count()) else {
        return Err("the glue's `script_src` block is not as expected: look at what the generator writes now".to_owned());
    };
    let cut = format!("{}{}", &glue[..from], &glue[close..]);
    if cut.contains("script_src") { Err("the glue uses `script_src` elsewhere too".to_owned()) } else { Ok(cut) }
}

/// Cuts the ways to load that nothing here takes: only `initSync` is called.
fn without_loader(glue: &str) -> Result<String, Failure> {
    let shape = || "the glue's loader is not as expected: look at what the generator writes now".to_owned();
    let between = |text: &str, start: &str, end: &str, put: &str| {
        let (before, rest) = text.split_once(start)?;
        let (_, after) = rest.split_once(end)?;
        Some(format!("{before}{put}{after}"))
    };
    let cut = between(glue, "async function __wbg_load(", "function initSync(", "function initSync(").ok_or_else(shape)?;
    let end = "return Object.assign(__wbg_init, { initSync }, exports);";
    let cut = between(&cut, "let __wbg_init_promise;", end, "return Object.assign(exports, { initSync });").ok_or_else(shape)?;
    if cut.contains("__wbg_load") || cut.contains("__wbg_init_") { Err(shape()) } else { Ok(cut) }
}

/// The glue without its comments, which stand on lines of their own, and without indentation.
fn plain_lines(glue: &str) -> Result<String, Failure> {
    let mut plain = String::with_capacity(glue.len());
    let mut comment = false;
    for line in glue.lines().map(str::trim) {
        comment |= line.starts_with("/*");
        if !comment && !line.is_empty() && !line.starts_with("//") {
            if line.matches('`').count() % 2 == 1 {
                return Err("the glue has a text over several lines, whose indentation counts".to_owned());
            }
            plain.push_str(line);
            plain.push('\n');
        }
        comment &= !line.ends_with("*/");
    }
    if comment { Err("the glue has a comment that ends within a line".to_owned()) } else { Ok(plain) }
}

/// Numbers the imports in place of the generator's hashes, which no compressor can shrink.
fn short_names(glue: &str, mut wasm: Vec<u8>) -> Result<(String, Vec<u8>), Failure> {
    const DIGITS: usize = 16;
    let mut hashes: Vec<&str> = Vec::new();
    for (at, _) in glue.match_indices("__wbg_") {
        let name = glue[at..].split(|c: char| !c.is_ascii_alphanumeric() && c != '_').next().unwrap_or_default();
        let Some((_, hash)) = name.rsplit_once('_') else { continue };
        if hash.len() == DIGITS && hash.bytes().all(|b| b.is_ascii_hexdigit()) && !hashes.contains(&hash) {
            hashes.push(hash);
        }
    }
    let mut named = glue.to_owned();
    for (number, hash) in hashes.iter().enumerate() {
        let short = format!("{number:0DIGITS$}");
        let places: Vec<usize> = wasm.windows(DIGITS).enumerate().filter(|(_, w)| *w == hash.as_bytes()).map(|(at, _)| at).collect();
        // The same length: nothing else in the wasm moves.
        let [at] = places[..] else { return Err(format!("the import {hash} stands {} times in the wasm, not once", places.len())) };
        wasm[at..at + DIGITS].copy_from_slice(short.as_bytes());
        named = named.replace(hash, &short);
    }
    Ok((named, wasm))
}

/// A stylesheet without comments and indentation.
fn without_comments(style: &str) -> String {
    let mut plain = String::with_capacity(style.len());
    let mut rest = style;
    let mut quote = None;
    while let Some(c) = rest.chars().next() {
        if quote.is_none() && rest.starts_with("/*") {
            rest = rest[2..].split_once("*/").map_or("", |(_, after)| after);
            continue;
        }
        match quote {
            None if c == '"' || c == '\'' => quote = Some(c),
            Some(open) if c == open => quote = None,
            _ => {}
        }
        plain.push(c);
        rest = &rest[c.len_utf8()..];
    }
    let lines: Vec<&str> = plain.lines().map(str::trim).filter(|line| !line.is_empty()).collect();
    lines.join("\n") + "\n"
}

/// Bytes are combined with this one. NUL, the wasm's commonest byte, cannot stand in a page and would cost two; the mask
/// makes it a character that costs one. Of several masks tried, this and its neighbour compressed best.
const MASK: u8 = 127;

/// Bytes as the inside of a raw template text: a character for each. `unpack.js` takes the low eight bits.
fn text_of(bytes: &[u8]) -> String {
    let mut text = String::with_capacity(bytes.len() * 3 / 2);
    for &byte in bytes {
        let code = byte ^ MASK;
        // What a page or a template would read as something else stands 256 higher.
        let higher = matches!(code, 0 | b'\r' | b'`' | b'$' | b'<' | b'\\');
        text.push(char::from_u32(u32::from(code) + if higher { 256 } else { 0 }).unwrap_or_default());
    }
    text
}

fn bundle(glue: &str, wasm: &[u8], style: &str) -> Result<String, Failure> {
    let sorted = streams::sort(wasm)?;
    let key = serde_json::json!({
        "lengths": sorted.lengths, "head": sorted.head, "size": wasm.len(), "shapes": streams::shapes(), "bulk": streams::BULK,
    });
    let mut script = String::with_capacity(wasm.len() * 2 + glue.len() + 20_000);
    // The mark makes browsers read UTF-8 whatever the page is written in; inside a page it is white space.
    script.push_str("\u{feff}(() => {\n\"use strict\";\n");
    script.push_str(glue.trim());
    script.push_str("\nconst STAGELEAF_WASM = String.raw`");
    script.push_str(&text_of(&sorted.bytes));
    script.push_str(&format!("`;\nconst STAGELEAF_KEY = {key};\nconst STAGELEAF_STYLE = "));
    let quoted = serde_json::Value::from(style).to_string().replace('<', "\\u003c");
    script.push_str(&quoted);
    script.push_str(";\n");
    script.push_str(UNPACK);
    script.push_str(ELEMENT);
    script.push_str("})();\n");
    Ok(script)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A module with an empty code section.
    const EMPTY: &[u8] = b"\0asm\x01\0\0\0\x0a\x01\0";

    #[test]
    fn the_script_address_block_is_cut_and_nothing_else() {
        let glue = "let g = (function(exports) {\n    let script_src;\n    if (typeof document !== 'undefined' && document.currentScript !== null) {\n        script_src = new URL(document.currentScript.src, location.href).toString();\n    }\n    rest();\n})({});";
        assert_eq!(without_script_address(glue).unwrap(), "let g = (function(exports) {\n    \n    rest();\n})({});");
    }

    #[test]
    fn a_glue_of_another_shape_is_refused() {
        assert!(without_script_address("let g = 1;").is_err());
        assert!(without_script_address("let script_src; location.href).toString(); } let script_src;").is_err());
    }

    #[test]
    fn style_text_cannot_close_the_script() {
        let script = bundle("let stageleaf_wasm;", EMPTY, "a::after { content: \"</script>\" }").unwrap();
        assert!(!script.contains("</script"));
    }

    #[test]
    fn every_byte_comes_back_and_none_ends_the_text() {
        let bytes: Vec<u8> = (0..=255).collect();
        let text = text_of(&bytes);
        assert!(!text.contains(['\0', '\r', '`', '$', '<', '\\']));
        let back: Vec<u32> = text.chars().map(|c| (u32::from(c) & 255) ^ u32::from(MASK)).collect();
        assert_eq!(back, bytes.iter().copied().map(u32::from).collect::<Vec<_>>());
        let mask = format!("charCodeAt(i) ^ {MASK}");
        assert!(UNPACK.contains(&mask), "unpack.js undoes it with the same byte");
    }

    #[test]
    fn comments_and_indentation_go_and_texts_stay() {
        let glue = "/**\n * Words.\n */\n    f('// no comment');\n    // Words.\n";
        assert_eq!(plain_lines(glue).unwrap(), "f('// no comment');\n");
        assert!(plain_lines("let a = `one\n  two`;").is_err());
        assert!(plain_lines("/* words */ f();\ng();").is_err());
        assert_eq!(without_comments("a { /* words */\n  content: \"/* text */\";\n}\n"), "a {\ncontent: \"/* text */\";\n}\n");
    }

    #[test]
    fn imports_are_numbered_on_both_sides() {
        let (glue, wasm) = short_names("__wbg_now_0123456789abcdef: f, __wbg_a: g", b"x__wbg_now_0123456789abcdefy".to_vec()).unwrap();
        assert_eq!(glue, "__wbg_now_0000000000000000: f, __wbg_a: g");
        assert_eq!(wasm, b"x__wbg_now_0000000000000000y");
        assert!(short_names("__wbg_now_0123456789abcdef", Vec::new()).is_err());
    }

    #[test]
    fn a_loader_of_another_shape_is_refused() {
        assert!(without_loader("let g = 1;").is_err());
    }
}
