//! The virtual operator: does to the virtual unit what the prompts say.

use crate::clock::Clock;
use crate::quantity::Seconds;
use crate::run::{Answering, Operator, Prompt, Reply, Want};
use crate::virtual_bench::Hands;

/// How long the virtual operator takes to answer.
const THINKING: Seconds = Seconds::whole(5);

/// Answers every prompt well, after a while.
pub struct VirtualOperator {
    hands: Option<Hands>,
    clock: Clock,
}

impl VirtualOperator {
    /// With hands on a virtual bench in memory, or without where the bench is
    /// somewhere else and turns its own switch.
    pub fn new(hands: Option<Hands>, clock: Clock) -> Self {
        Self { hands, clock }
    }

    fn act(&self, want: &Want) -> String {
        let now = self.clock.now();
        match (want, &self.hands) {
            (Want::Position { name }, Some(hands)) => {
                hands.turn(name, now);
            }
            (Want::Condition { name }, Some(hands)) => {
                hands.set_condition(name, now);
            }
            (Want::Answer(question), _) => return Hands::answer(question),
            _ => {}
        }
        String::new()
    }
}

impl Operator for VirtualOperator {
    fn name(&self) -> String {
        "virtual operator".to_owned()
    }

    fn ask<'a>(&'a mut self, prompt: &'a Prompt) -> Answering<'a> {
        Box::pin(async move {
            self.clock.sleep_until(self.clock.now() + THINKING).await;
            Reply::Given(self.act(&prompt.want))
        })
    }
}
