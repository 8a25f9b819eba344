//! Whole notes: the stage blocks in their fences, and the figures that prose quotes.
//!
//! A stage block is a fenced code block (backticks or tildes) whose language is `stageleaf`, also inside lists and
//! quotations. A quote is a link whose text is the number and whose target is the figure:
//! `[79.7 kHz](#hydrophone-line-amplifier.bandwidth)`; see [`crate::query`] for arguments.
//!
//! Places count in the file as it is: a byte-order mark has no column, bytes that are no UTF-8 are reported and count
//! as one character each, CR LF is one line end.

use std::{borrow::Cow, collections::BTreeMap, ops::Range};

use pulldown_cmark::{CodeBlockKind, Event, Options, Parser, Tag, TagEnd};
use stageleaf_math::figure::{Figure, Query};

use crate::{
    block::{Block, Place},
    place::Lines,
    problem::{Problem, nearest, quoted},
    query::{parse_anchor, percent_decoded, slug},
    reading::read_named,
    settings::Settings,
    shelf::Shelf,
};

const LANGUAGE: &str = "stageleaf";

/// More problems than this in one note are counted, not listed.
const LISTED: usize = 1000;

/// A figure quoted in prose.
#[derive(Clone, Debug, PartialEq)]
pub struct Quote {
    /// The text shown.
    pub shown: String,
    /// The stage, as [`crate::slug`] writes its name.
    pub slug: String,
    /// The figure.
    pub query: Query,
    /// The bytes of the shown text in the file.
    pub range: Range<usize>,
    /// Line in the file.
    pub line: usize,
    /// Column in the file.
    pub column: usize,
}

/// A note: what could be read, and what is wrong with the rest.
#[derive(Clone, Debug, Default)]
pub struct Note {
    /// The file.
    pub file: String,
    /// Stage blocks that could be read, in order.
    pub blocks: Vec<Block>,
    /// Figures quoted in prose, in order.
    pub quotes: Vec<Quote>,
    /// What is wrong, in the order of the file.
    pub problems: Vec<Problem>,
    /// The bytes of each stage block's fence, from the first character of the opening to the last of the closing one;
    /// of blocks that could not be read, too.
    pub fences: Vec<Range<usize>>,
    /// For each fence, which of `blocks` it holds; `None` where it could not be read.
    pub block_of_fence: Vec<Option<usize>>,
}

/// Reads a note. Whatever is wrong becomes a problem; one bad block hides nothing.
#[must_use]
pub fn read_note(bytes: &[u8], file: &str, shelf: &Shelf, settings: &Settings) -> Note {
    let (text, bad) = readable(bytes);
    let lines = Lines::of(&text);
    let mut note = Note { file: file.to_owned(), ..Note::default() };
    if let Some((first, count)) = bad {
        let rest = if count > 1 { format!(", and {} more", count - 1) } else { String::new() };
        let message = format!("a byte here is no UTF-8 (0x{:02X}{rest})", bytes[first]);
        note.problems.push(Problem::at(file, &text, &lines, first, 1, message).allowed("UTF-8 text"));
    }
    let scan = scan(&text);
    let mut names: BTreeMap<String, usize> = BTreeMap::new();
    for fence in scan.fences {
        if fence.is_open {
            let opening = lines.range(lines.position(fence.range.start).0);
            let problem = Problem::at(
                file,
                &text,
                &lines,
                fence.range.start,
                opening.end - fence.range.start,
                "the stage block is never closed".into(),
            );
            note.problems.push(problem.allowed("a closing fence like the opening one, on a line of its own"));
        }
        note.fences.push(fence.range.clone());
        note.block_of_fence.push(None);
        let first_line = lines.position(fence.body_start).0;
        let place = Place { file: file.to_owned(), first_line, prefixes: fence.prefixes };
        let (name, result) = read_named(&fence.body, &place, shelf, settings);
        let line = lines.position(fence.range.start).0;
        let earlier = name.as_deref().map(slug).and_then(|s| names.insert(s, line).map(|line| (name.clone().unwrap_or_default(), line)));
        if let Some((name, earlier_line)) = earlier {
            let (line, column, length, line_text) = name_place(&result, &text, &lines, line);
            let message = format!("a stage called {} stands on line {earlier_line} already", quoted(&name));
            note.problems.push(
                Problem::on_line(file, line, column, length, &line_text, message)
                    .allowed("each name once; names differ by their letters and digits"),
            );
        }
        match result {
            Ok(block) => {
                *note.block_of_fence.last_mut().expect("pushed above") = Some(note.blocks.len());
                note.blocks.push(block);
            }
            Err(problems) => note.problems.extend(problems),
        }
    }
    for (range, given) in scan.strangers {
        let problem = Problem::at(
            file,
            &text,
            &lines,
            range.start,
            range.len(),
            format!("{} is no stage block: its language is not `{LANGUAGE}`", quoted(&given)),
        );
        note.problems.push(problem.allowed("`stageleaf`, in small letters, behind the opening fence"));
    }
    let unread = note.block_of_fence.iter().any(Option::is_none);
    for link in scan.links {
        read_quote(&mut note, link, &text, &lines, &names, unread);
    }
    note.problems.sort_by_key(|p| (p.line, p.column));
    if note.problems.len() > LISTED {
        let rest = note.problems.len() - LISTED;
        note.problems.truncate(LISTED);
        let message = format!("{rest} more problems of this note are not listed");
        let more = Problem { message, allowed: None, attempt: None, ..note.problems[LISTED - 1].clone() };
        note.problems.push(more);
    }
    note
}

/// Stage names that occur in more than one of several notes, as problems at every later occurrence.
#[must_use]
pub fn duplicate_names(notes: &[Note]) -> Vec<Problem> {
    let mut first: BTreeMap<String, (&str, usize)> = BTreeMap::new();
    let mut problems = Vec::new();
    for note in notes {
        for block in &note.blocks {
            let name = slug(&block.stage.name);
            let Some(&(file, line)) = first.get(&name) else {
                first.insert(name, (&note.file, block.line));
                continue;
            };
            // The same name twice in one file is that note's own problem.
            if file == note.file {
                continue;
            }
            let field = block.field("name");
            let (line_in, column) = field.map_or((block.line, 1), |f| (f.line, f.column));
            let row = block.text.lines().nth(line_in - block.line).unwrap_or("");
            let column = column.min(row.chars().count().max(1));
            let length = field.map_or(1, |f| f.text.chars().count());
            let message = format!("a stage called {} stands in {file} already, near line {line}", quoted(&block.stage.name));
            problems.push(Problem::on_line(&note.file, line_in, column, length, row, message).allowed("each name once in all notes"));
        }
    }
    problems
}

/// The bytes as text of the same length: each byte that is no UTF-8 as `?`. Where the first one is, and how many.
fn readable(bytes: &[u8]) -> (Cow<'_, str>, Option<(usize, usize)>) {
    if let Ok(text) = std::str::from_utf8(bytes) {
        return (Cow::Borrowed(text), None);
    }
    let mut text = String::with_capacity(bytes.len());
    let mut bad = None;
    for chunk in bytes.utf8_chunks() {
        text.push_str(chunk.valid());
        for _ in chunk.invalid() {
            let (_, count) = bad.get_or_insert((text.len(), 0));
            *count += 1;
            text.push('?');
        }
    }
    (Cow::Owned(text), bad)
}

/// A stage block's fence.
struct Fence {
    range: Range<usize>,
    body: String,
    /// Byte of the file at which the body begins.
    body_start: usize,
    prefixes: Vec<String>,
    is_open: bool,
}

/// A link into this page.
struct Link {
    target: String,
    shown: String,
    range: Range<usize>,
}

#[derive(Default)]
struct Scan {
    fences: Vec<Fence>,
    /// Fences with a language that is nearly ours.
    strangers: Vec<(Range<usize>, String)>,
    links: Vec<Link>,
}

fn scan(text: &str) -> Scan {
    let skipped = if text.starts_with('\u{feff}') { 3 } else { 0 };
    let options = Options::ENABLE_TABLES | Options::ENABLE_FOOTNOTES | Options::ENABLE_STRIKETHROUGH;
    let mut scan = Scan::default();
    let mut fence: Option<Fence> = None;
    let mut links: Vec<Link> = Vec::new();
    for (event, range) in Parser::new_ext(&text[skipped..], options).into_offset_iter() {
        let range = range.start + skipped..range.end + skipped;
        match event {
            Event::Start(Tag::CodeBlock(CodeBlockKind::Fenced(info))) => {
                let language = info.split([' ', '\t', ',', '{']).next().unwrap_or("");
                if language == LANGUAGE {
                    let range = range.start..range.start + text[range.clone()].trim_end().len();
                    fence = Some(Fence { range, body: String::new(), body_start: 0, prefixes: Vec::new(), is_open: false });
                } else if nearest(language, [LANGUAGE]).is_some() {
                    scan.strangers.push((range.start..range.start + text[range].find('\n').unwrap_or(0), language.to_owned()));
                }
            }
            Event::Text(piece) if fence.is_some() => {
                if let Some(fence) = &mut fence {
                    body(fence, text, &piece, range);
                }
            }
            Event::End(TagEnd::CodeBlock) => {
                if let Some(mut done) = fence.take() {
                    close(&mut done, text);
                    scan.fences.push(done);
                }
            }
            Event::Start(Tag::Link { dest_url, .. }) if dest_url.starts_with('#') => {
                links.push(Link { target: dest_url[1..].to_owned(), shown: String::new(), range: range.start..range.start });
            }
            Event::Start(Tag::Link { .. }) => links.push(Link { target: String::new(), shown: String::new(), range }),
            Event::End(TagEnd::Link) => scan.links.extend(links.pop().filter(|l| l.target.contains('.'))),
            Event::Text(piece) => shown(&mut links, &piece, range),
            Event::Code(piece) => {
                let inner = text[range.clone()].find(&*piece).map_or(range.clone(), |i| range.start + i..range.start + i + piece.len());
                shown(&mut links, &piece, inner);
            }
            Event::SoftBreak | Event::HardBreak => shown(&mut links, " ", range),
            _ => {}
        }
    }
    scan
}

/// Adds lines to a block's body, with what stands before them in the file.
fn body(fence: &mut Fence, text: &str, piece: &str, range: Range<usize>) {
    if fence.body.is_empty() {
        fence.body_start = range.start;
    }
    let mut at = range.start;
    for line in piece.split_inclusive('\n') {
        if fence.body.is_empty() || fence.body.ends_with('\n') {
            let line_start = text[..at].rfind(['\n', '\r']).map_or(0, |i| i + 1);
            let prefix = text[line_start..at].trim_start_matches('\u{feff}');
            fence.prefixes.push(prefix.to_owned());
        }
        fence.body.push_str(line);
        at = (at + line.len()).min(range.end);
    }
}

/// Whether the fence was closed, and where an empty body would begin.
fn close(fence: &mut Fence, text: &str) {
    let source = &text[fence.range.clone()];
    let mark = source.chars().next().unwrap_or('`');
    let width = source.chars().take_while(|c| *c == mark).count();
    let first_end = source.find(['\n', '\r']).unwrap_or(source.len());
    if fence.body.is_empty() {
        let next = fence.range.start + first_end;
        fence.body_start = (next + text[next..].find('\n').map_or(0, |i| i + 1)).min(text.len());
    }
    let last_start = source.rfind(['\n', '\r']).map_or(0, |i| i + 1);
    let last = source[last_start..].trim_start_matches([' ', '\t', '>']);
    let marks = last.chars().all(|c| c == mark) && last.chars().count() >= width;
    let content_end = fence.body.trim_end().lines().last().unwrap_or("").trim_start_matches([' ', '\t', '>']);
    fence.is_open = !(marks && last_start > 0) || content_end == last;
}

/// Adds to the shown text of every open link.
fn shown(links: &mut [Link], piece: &str, range: Range<usize>) {
    for link in links {
        if link.shown.is_empty() {
            link.range = range.clone();
        }
        link.shown.push_str(piece);
        link.range.end = range.end;
    }
}

fn read_quote(note: &mut Note, link: Link, text: &str, lines: &Lines<'_>, names: &BTreeMap<String, usize>, unread: bool) {
    let target = percent_decoded(&link.target);
    let Some((name, figure)) = target.split_once('.') else { return };
    let id = figure.split(['-', '+', ' ']).next().unwrap_or("");
    let known_stage = names.contains_key(name);
    // Other links with a dot are not ours.
    if !known_stage && !Figure::ALL.iter().any(|f| f.id() == id) {
        return;
    }
    let mut problem = |message: String, allowed: String, attempt: Option<String>| {
        let problem = Problem::at(&note.file, text, lines, link.range.start, link.range.len(), message);
        note.problems.push(problem.allowed(allowed).attempt(attempt));
    };
    let query = match parse_anchor(figure) {
        Ok(query) => query,
        Err(trouble) => {
            let attempt = trouble.attempt.map(|a| format!("#{name}.{}", a.replace(' ', "-")));
            return problem(trouble.message, "a figure id, with its frequency where it takes one (`#name.gain_at-20-kHz`)".into(), attempt);
        }
    };
    if !known_stage {
        // The stage may be one that could not be read far enough to know its name.
        if !unread {
            let attempt = nearest(name, names.keys().map(String::as_str)).map(|n| format!("#{n}.{figure}"));
            problem(
                format!("no stage of this note is called {}", quoted(name)),
                "a stage's name in small letters and dashes, a dot, a figure".into(),
                attempt,
            );
        }
        return;
    }
    if link.shown.trim().is_empty() {
        return problem(
            format!("the link to `{figure}` shows no number"),
            "the number between the brackets, as `[79.7 kHz](#…)`".into(),
            None,
        );
    }
    let (line, column) = lines.position(link.range.start);
    note.quotes.push(Quote { shown: link.shown, slug: name.to_owned(), query, range: link.range, line, column });
}

/// Where a block's name stands; its fence where that is not known.
fn name_place(result: &Result<Block, Vec<Problem>>, text: &str, lines: &Lines<'_>, fence_line: usize) -> (usize, usize, usize, String) {
    let field = result.as_ref().ok().and_then(|b| b.field("name"));
    let (line, column, length) = field.map_or((fence_line, 1, 1), |f| (f.line, f.column, f.text.chars().count()));
    (line, column, length, text[lines.range(line)].to_owned())
}
