//! One classic script: the glue, the wasm as hex text, the element, the stylesheet.
//!
//! Hex, not base64: base64 hides repeats from the compressor, so that hex is smaller as served. Classic, not a module:
//! from `file://` browsers refuse modules and `fetch`.

use std::{
    fmt::Write as _,
    fs,
    path::{Path, PathBuf},
    process::Command,
};

use super::{Failure, read, write};

/// The element's hand-written script.
const ELEMENT: &str = include_str!("../../../stageleaf-web/element.js");

/// Rules for what only the script or the book adds.
const LIVE_STYLE: &str = include_str!("../../../stageleaf-web/live.css");

/// Compiles `stageleaf-web` and writes `stageleaf.js` and `stageleaf.css` into `out`.
pub fn build(root: &Path, out: &Path) -> Result<(), Failure> {
    let wasm = compile(root)?;
    bind(&wasm, out)?;
    let glue = without_script_address(&read(&out.join("stageleaf_web.js"))?)?;
    let bytes = fs::read(out.join("stageleaf_web_bg.wasm")).map_err(|error| format!("the wasm: {error}"))?;
    let style = format!("{}\n{LIVE_STYLE}", stageleaf_sheet::STYLE);
    let script = bundle(&glue, &bytes, &style);
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

fn bundle(glue: &str, wasm: &[u8], style: &str) -> String {
    let mut script = String::with_capacity(wasm.len() * 2 + glue.len() + 20_000);
    script.push_str("(() => {\n\"use strict\";\n");
    script.push_str(glue.trim());
    script.push_str("\nconst STAGELEAF_WASM = \"");
    for byte in wasm {
        // Writing into a string cannot fail.
        let _ = write!(script, "{byte:02x}");
    }
    script.push_str("\";\nconst STAGELEAF_STYLE = ");
    let quoted = serde_json::Value::from(style).to_string().replace('<', "\\u003c");
    script.push_str(&quoted);
    script.push_str(";\n");
    script.push_str(ELEMENT);
    script.push_str("})();\n");
    script
}

#[cfg(test)]
mod tests {
    use super::*;

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
        let script = bundle("let stageleaf_wasm;", &[0, 255], "a::after { content: \"</script>\" }");
        assert!(!script.contains("</script"));
        assert!(script.contains("\"00ff\""));
    }
}
