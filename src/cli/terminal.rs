//! A person at a terminal: prompts out, lines in. End of input is a stop, never a yes.

use std::io::BufRead;

use tokio::sync::mpsc::{UnboundedReceiver, unbounded_channel};

use super::say::say;
use crate::run::{Answering, Operator, Prompt, Reply, Want, understand};
use crate::spec::sequence::AnswerKind;

/// A person who types.
pub struct Terminal {
    name: String,
    lines: UnboundedReceiver<String>,
}

impl Terminal {
    /// Reads standard input on a detached thread: a blocked read must never hold up OFF.
    pub fn new(name: &str) -> Self {
        let (send, lines) = unbounded_channel();
        std::thread::spawn(move || {
            for line in std::io::stdin().lock().lines() {
                let Ok(line) = line else { return };
                if send.send(line).is_err() {
                    return;
                }
            }
        });
        Self {
            name: name.to_owned(),
            lines,
        }
    }
}

impl Operator for Terminal {
    fn name(&self) -> String {
        self.name.clone()
    }

    fn ask<'a>(&'a mut self, prompt: &'a Prompt) -> Answering<'a> {
        Box::pin(async move {
            say(&shown(prompt));
            loop {
                let Some(line) = self.lines.recv().await else {
                    return Reply::Stop;
                };
                let line = line.trim();
                if line.eq_ignore_ascii_case("stop") {
                    return Reply::Stop;
                }
                if is_answer(&prompt.want, line) {
                    return Reply::Given(line.to_owned());
                }
                say(&format!(
                    "  {:?} is no answer here: {}",
                    line,
                    wanted(&prompt.want)
                ));
            }
        })
    }
}

fn shown(prompt: &Prompt) -> String {
    let head = format!("=== {} / unit {} ===", prompt.bay, prompt.unit);
    format!(
        "\n{head}\n{}\n  {}, or `stop`",
        prompt.text,
        wanted(&prompt.want)
    )
}

fn wanted(want: &Want) -> String {
    match want {
        Want::Acknowledge => "type `yes` when you have read this and act on it".to_owned(),
        Want::Done | Want::Condition { .. } | Want::Position { .. } => {
            "type `done` when it is done".to_owned()
        }
        Want::Answer(question) => match &question.answer {
            AnswerKind::YesNo => "type `yes` or `no`".to_owned(),
            AnswerKind::Number { unit, .. } => format!("type a number in {unit}"),
            AnswerKind::Choice(choices) => {
                let numbered = choices
                    .iter()
                    .enumerate()
                    .map(|(n, c)| format!("{} {c}", n + 1));
                format!("type one of: {}", numbered.collect::<Vec<_>>().join(", "))
            }
        },
    }
}

/// A bare Enter, or a unit number from a scanner, answers nothing.
fn is_answer(want: &Want, line: &str) -> bool {
    match want {
        Want::Acknowledge => line.eq_ignore_ascii_case("yes"),
        Want::Done | Want::Condition { .. } | Want::Position { .. } => {
            line.eq_ignore_ascii_case("done")
        }
        Want::Answer(question) => understand(question, line).is_some(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn neither_enter_nor_a_scanned_number_answers_a_safety_prompt() {
        for line in ["", "0017", "y", "CD9-2026-117"] {
            assert!(!is_answer(&Want::Acknowledge, line), "{line}");
            assert!(!is_answer(&Want::Done, line), "{line}");
        }
        assert!(is_answer(&Want::Acknowledge, "Yes"));
        assert!(is_answer(&Want::Done, "done"));
    }
}
