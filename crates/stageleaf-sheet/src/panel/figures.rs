//! All figures with their spread and basis, by group.

use maud::{Markup, html};
use stageleaf_math::{
    figure::Group,
    report::{FigureRow, Outcome},
};
use stageleaf_note::{query_anchor, query_text};

use super::{limits::basis_cell, needs, scroll, title, value, whose};
use crate::Sheet;

/// The groups with their headings.
pub const GROUPS: [(Group, &str); 7] = [
    (Group::Switching, "Switching"),
    (Group::SmallSignal, "Small signal"),
    (Group::Dc, "DC"),
    (Group::Noise, "Noise"),
    (Group::LargeSignal, "Large signal"),
    (Group::Power, "Power"),
    (Group::Starting, "Starting"),
];

/// Why no figure of a group applies, where that is so for one reason.
fn applies_nowhere(all: &[FigureRow], group: Group) -> Option<&'static str> {
    let mut rows = all.iter().filter(|r| r.query.figure.group() == group).map(|r| match r.nominal {
        Outcome::DoesNotApply(why) => Some(why),
        _ => None,
    });
    let first = rows.next()??;
    rows.all(|why| why == Some(first)).then_some(first)
}

/// The section.
pub fn figures(sheet: &Sheet) -> Markup {
    let all = &sheet.report.figures;
    // What does not apply at all comes last.
    let mut groups = GROUPS;
    groups.sort_by_key(|(group, _)| applies_nowhere(all, *group).is_some());
    let judged = |q| sheet.report.limits.iter().any(|l| l.limit.query == q);
    let first = |row: &FigureRow| all.iter().find(|r| r.query == row.query).is_some_and(|r| std::ptr::eq(r, row));
    html! {
        summary { "All figures" }
        p class="aside sideways" { "The table goes on to the right: scroll it sideways." }
        (scroll("All figures", &html! {
            table class="figures" {
                thead { tr { th scope="col" { "figure" } th scope="col" { "nominal" } th scope="col" { "least" } th scope="col" { "greatest" } th scope="col" { "basis" } } }
                @for (group, name) in groups {
                    @if let Some(why) = applies_nowhere(all, group) {
                        tbody { tr { th scope="row" { (name) } td class="words" colspan="3" { "does not apply: " (why) } td { "–" } } }
                    } @else if all.iter().any(|r| r.query.figure.group() == group) {
                        tbody {
                            tr { th class="group" scope="rowgroup" colspan="5" { (name) } }
                            @for row in all.iter().filter(|r| r.query.figure.group() == group) {
                                @let d = row.dimension;
                                // The row of a judged figure, to which prose links, stands among the limits.
                                tr id=[(first(row) && !judged(row.query)).then(|| format!("{}.{}", sheet.id, query_anchor(row.query)))] {
                                    th scope="row" { (title(sheet, row.query)) (whose(row.amplifier)) " " samp { (query_text(row.query)) } (needs(sheet, &row.nominal)) }
                                    @if row.nominal.value().is_none() { td class="words" colspan="3" { (super::outcome(&row.nominal, d)) } }
                                    @else {
                                        td { (super::outcome(&row.nominal, d)) }
                                        @match row.range {
                                            Some((low, high)) => { td { (value(low, d)) } td { (value(high, d)) } }
                                            None => { td { "–" } td { "–" } }
                                        }
                                    }
                                    (basis_cell(row.basis))
                                }
                            }
                        }
                    }
                }
            }
        }))
    }
}
