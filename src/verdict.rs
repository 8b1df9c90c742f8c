//! Answers, with the figures behind each.

/// One of three answers.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Answer {
    /// The data show it.
    Yes,
    /// The data rule it out, to the stated precision.
    No,
    /// The data allow both; the sentence says what would decide.
    Undecided,
}

impl Answer {
    /// The word used in every file: `yes`, `no`, `undecided`.
    #[must_use]
    pub fn word(self) -> &'static str {
        match self {
            Self::Yes => "yes",
            Self::No => "no",
            Self::Undecided => "undecided",
        }
    }
}

/// A question, its answer and what the answer rests on.
#[derive(Clone, Debug, PartialEq)]
pub struct Verdict {
    /// Key: `loss_present`, `loss_shifts_period`.
    pub question: &'static str,
    /// The question as a person would ask it.
    pub asked: &'static str,
    /// Yes, no or undecided.
    pub answer: Answer,
    /// The ratio the answer rests on.
    pub ratio: f64,
    /// What is divided by what, in words.
    pub ratio_of: &'static str,
    /// One sentence in plain words, with figures.
    pub sentence: String,
}
