//! The list of what is explained.

use super::example;
use crate::snag::SnagKind;

/// What is explained.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
#[expect(missing_docs, reason = "the passes by their names")]
pub enum Subject {
    /// A kind of snag.
    Snag(SnagKind),
    Smooth,
    Push,
    Keys,
    Reduce,
    Resample,
    Limits,
    Blend,
    Loop,
    Retarget,
}

impl Subject {
    /// The passes, apart from mends.
    pub const PASSES: [Self; 9] = [
        Self::Smooth,
        Self::Push,
        Self::Keys,
        Self::Limits,
        Self::Reduce,
        Self::Resample,
        Self::Blend,
        Self::Loop,
        Self::Retarget,
    ];
}

/// An explanation.
#[derive(Clone, Debug, PartialEq)]
pub struct Topic {
    /// What of.
    pub subject: Subject,
    /// Its name.
    pub title: String,
    /// Two sentences.
    pub words: String,
}

/// All explanations that hold some words; all of them for none.
pub fn topics(wanted: &str) -> Vec<Topic> {
    let wanted = wanted.trim().to_lowercase();
    let snags = SnagKind::ALL.into_iter().map(|kind| Topic {
        subject: Subject::Snag(kind),
        title: format!("{}  {}", kind.letter(), kind.name()),
        words: format!("{} {}", kind.explanation(), kind.mend_explanation()),
    });
    let passes = Subject::PASSES.into_iter().map(|subject| Topic {
        subject,
        title: example::pass_title(subject).to_owned(),
        words: example::pass_words(subject).to_owned(),
    });
    let fits = |topic: &Topic| format!("{} {}", topic.title, topic.words).to_lowercase().contains(&wanted);
    snags.chain(passes).filter(fits).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_kind_and_pass_has_two_sentences() {
        let all = topics("");
        assert_eq!(all.len(), SnagKind::ALL.len() + Subject::PASSES.len());
        for topic in &all {
            let ends = topic.words.matches(". ").count() + usize::from(topic.words.ends_with('.'));
            assert_eq!(ends, 2, "{}: {}", topic.title, topic.words);
        }
    }

    #[test]
    fn looking_for_words_finds_them_in_titles_and_sentences() {
        let found = topics("Half turn");
        assert!(
            found.iter().any(|topic| topic.subject == Subject::Snag(SnagKind::HalfTurn)) || found.is_empty()
        );
        assert_eq!(
            topics("jitter").first().map(|topic| topic.subject),
            Some(Subject::Snag(SnagKind::Jitter))
        );
        assert!(topics("no such words at all").is_empty());
    }
}
