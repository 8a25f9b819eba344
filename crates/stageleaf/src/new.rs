//! `new`: a commented block to start from.

use clap::Args;
use stageleaf_math::kind::Kind;
use stageleaf_note::{
    problem::nearest,
    template::{PLACEHOLDER_PART, template_for},
    words::kind_noun,
};

use crate::fault::Fault;

/// What `new` is asked.
#[derive(Args, Clone, Debug)]
pub struct Options {
    /// Stage kind, as `follower`
    #[arg(value_name = "KIND")]
    pub kind: String,
    /// The stage's name
    #[arg(long)]
    pub name: Option<String>,
    /// The part, as the shelf calls it
    #[arg(long)]
    pub part: Option<String>,
}

/// The block with its fence, ready to stand in a note.
///
/// # Errors
/// When there is no such kind.
pub fn block(options: &Options) -> Result<String, Fault> {
    let kind = Kind::from_id(&options.kind).ok_or_else(|| unknown(&options.kind))?;
    let name = options.name.clone().unwrap_or_else(|| format!("New {}", kind_noun(kind)));
    let text = template_for(kind, &name, options.part.as_deref().unwrap_or(PLACEHOLDER_PART));
    Ok(format!("```stageleaf\n{text}```\n"))
}

fn unknown(given: &str) -> Fault {
    let ids: Vec<&str> = Kind::ALL.iter().map(|k| k.id()).collect();
    Fault::Path {
        path: "new".to_owned(),
        message: format!("no stage kind is called `{given}`"),
        allowed: Some(ids.join(", ")),
        attempt: nearest(given, ids.iter().copied()).map(|id| format!("stageleaf new {id}")),
    }
}
