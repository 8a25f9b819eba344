//! A report as HTML and SVG: one renderer for the book, single pages, fragments and the live sheet.
//!
//! What comes in is a stage block with its report; what goes out is one line of HTML without line breaks (Markdown
//! would end an HTML block at a blank line). Text of notes and part files is escaped by construction (`maud`); there are no
//! `style` attributes and no inline handlers, so that strict content policies hold.
//!
//! # The document
//! [`render`] gives `<div class="stageleaf-body">` with one element per [`Section`], each with `data-section`. The element around a
//! section never changes; its content is [`Section::markup`]. So a live sheet sets the `innerHTML` of those sections whose
//! markup differs, and open panels stay open. The section `problems` is `hidden` while it is empty; its content comes from
//! [`problems_markup`]. Sections that hold panels are `<details>`; their markup starts with `<summary>`.
//!
//! Every value that can be edited is an `<input data-path="components.Rf">`, in the drawing or in the list of conditions; its
//! `value` is the note's own text. `id`s start with [`Sheet::id`] and a dot. Every figure's row has the id
//! `{Sheet::id}.{query_anchor}`, to which prose quotes link.
//!
//! # Plots
//! `<figure class="plot" data-plot="ID" data-points="N">` holds an SVG that takes the focus (`role="img"`, `tabindex="0"`, a summary as
//! its name), in it `<line class="cursor" visibility="hidden">`, and an empty `<output class="readout">`. A live sheet asks
//! [`plot::reading_near`] (pointer position in units of the SVG's view box) or [`plot::reading`] (index, 0 to N − 1), sets the
//! line's `x1` and `x2`, shows it, and writes the reading's text into the output. [`plot::chart`] with [`plot::csv`] gives the numbers.
//! The page therefore carries no copy of them; without script, the tables under "Numbers" do.
//!
//! # What it leaves out
//! Arithmetic beyond placing a point, a sum or a difference for display; where the HTML ends up; anything that reacts.
//!
//! # Example
//! ```
//! let page = stageleaf_sheet::page("Cable driver & line", "<p>body</p>", None);
//! assert!(page.contains("<title>Cable driver &amp; line</title>"));
//! ```

pub mod drawing;
mod panel;
pub mod plot;
mod sheet;
pub mod strip;

pub use panel::problems_markup;
pub use sheet::{STYLE, Section, Sheet, page, render, sections, sections_where};
