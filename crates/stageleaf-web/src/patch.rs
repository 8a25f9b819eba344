//! Changes a part of the page into another one and touches only what differs.
//!
//! Focus, selection, scroll position, opened panels and the reader's half-typed text survive, since nodes that stay the
//! same stay the same nodes.

use wasm_bindgen::JsCast;
use web_sys::{Document, DocumentFragment, Element, HtmlTemplateElement, Node};

/// Marks what the script adds to a sheet: it is no part of the document that the note gives.
pub const BY_SCRIPT: &str = "data-by-script";

/// Attributes that belong to the reader or to the script, not to the document.
const LEFT_ALONE: [&str; 3] = ["open", "aria-invalid", "aria-errormessage"];

/// Reads markup that the sheet's renderer made. Never given any other text.
pub fn parse(document: &Document, markup: &str) -> Option<DocumentFragment> {
    let template: HtmlTemplateElement = document.create_element("template").ok()?.dyn_into().ok()?;
    template.set_inner_html(markup);
    Some(template.content())
}

/// Whether the children of `old` are those of `new`.
pub fn same(old: &Element, new: &DocumentFragment) -> bool {
    let (present, wanted) = (list(old), list(new));
    present.len() == wanted.len() && present.iter().zip(&wanted).all(|(there, child)| there.is_equal_node(Some(child)))
}

/// Drops the line breaks that a page's own writer put between elements; the renderer makes none.
pub fn tidy(root: &Node) {
    for node in list(root) {
        if node.node_type() == Node::TEXT_NODE {
            let text = node.node_value().unwrap_or_default();
            if text.contains('\n') && text.trim().is_empty() {
                // A child of the root can be removed from it.
                let _ = root.remove_child(&node);
            }
        } else {
            tidy(&node);
        }
    }
}

/// The first element below `root` that `selector` means.
pub fn find(root: &Element, selector: &str) -> Option<Element> {
    root.query_selector(selector).ok().flatten()
}

/// Makes `old` equal to `new`.
fn morph(old: &Element, new: &Element) {
    if old.node_name() == new.node_name() {
        attributes(old, new);
        children(old, new);
    } else {
        // An element with a parent can be replaced.
        let _ = old.replace_with_with_node_1(new);
    }
}

fn attributes(old: &Element, new: &Element) {
    // Most elements on the way to what differs have the same attributes; asking for each costs a call into the page.
    if let (Ok(there), Ok(wanted)) = (old.clone_node(), new.clone_node())
        && there.is_equal_node(Some(&wanted))
    {
        return;
    }
    let wanted = new.attributes();
    for index in 0..wanted.length() {
        let Some(attribute) = wanted.item(index) else { continue };
        let (name, value) = (attribute.name(), attribute.value());
        if !LEFT_ALONE.contains(&name.as_str()) && old.get_attribute(&name).as_deref() != Some(&value) {
            // A name that the parser took is a name that can be set.
            let _ = old.set_attribute(&name, &value);
        }
    }
    let present = old.attributes();
    let surplus: Vec<String> =
        (0..present.length()).filter_map(|index| Some(present.item(index)?.name())).filter(|name| !new.has_attribute(name)).collect();
    for name in surplus {
        if !LEFT_ALONE.contains(&name.as_str()) {
            let _ = old.remove_attribute(&name);
        }
    }
}

/// Gives `old` the children of `new`.
pub fn children(old: &Element, new: &Node) {
    let present: Vec<Node> = list(old).into_iter().filter(|node| !by_script(node)).collect();
    let wanted = list(new);
    for (index, child) in wanted.iter().enumerate() {
        let Some(there) = present.get(index) else {
            let _ = old.append_child(child);
            continue;
        };
        if there.is_equal_node(Some(child)) {
            continue;
        }
        match (there.dyn_ref::<Element>(), child.dyn_ref::<Element>()) {
            (Some(there), Some(child)) => morph(there, child),
            (None, None) if there.node_type() == child.node_type() => there.set_node_value(child.node_value().as_deref()),
            _ => {
                let _ = old.replace_child(child, there);
            }
        }
    }
    for node in present.iter().skip(wanted.len()) {
        let _ = old.remove_child(node);
    }
}

fn list(parent: &Node) -> Vec<Node> {
    let nodes = parent.child_nodes();
    (0..nodes.length()).filter_map(|index| nodes.item(index)).collect()
}

fn by_script(node: &Node) -> bool {
    node.dyn_ref::<Element>().is_some_and(|element| element.has_attribute(BY_SCRIPT))
}
