//! The only room that knows what time it is.
//!
//! Three kinds of time behind one type: the wall's, the wall's times a factor
//! (for a virtual bench on pseudo-terminals), and simulated time, which is
//! tokio's paused clock on a current-thread runtime and so advances by itself
//! whenever every task waits.

use std::time::{Duration, Instant};

use chrono::{DateTime, TimeZone, Utc};

use crate::quantity::Moment;

/// A source of [`Moment`]s, cheap to clone; all clones share their origin.
#[derive(Debug, Clone)]
pub struct Clock {
    origin: Origin,
    started: DateTime<Utc>,
}

#[derive(Debug, Clone)]
enum Origin {
    /// Wall time, `factor` run seconds to a wall second.
    Wall { since: Instant, factor: f64 },
    /// tokio's clock, meant to be paused.
    Simulated { since: tokio::time::Instant },
}

impl Clock {
    /// Wall time from now on.
    pub fn real() -> Self {
        Self::scaled(1.0)
    }

    /// Wall time from now on, `factor` run seconds to each wall second.
    ///
    /// # Panics
    /// On a factor that is not finite and positive.
    pub fn scaled(factor: f64) -> Self {
        assert!(
            factor.is_finite() && factor > 0.0,
            "a clock's factor is positive"
        );
        Self {
            origin: Origin::Wall {
                since: Instant::now(),
                factor,
            },
            started: Utc::now(),
        }
    }

    /// Simulated time from now on. The run starts at a fixed date, so that the
    /// same plan and seed leave the same record (invariant 6).
    ///
    /// # Panics
    /// Outside a tokio runtime.
    pub fn simulated() -> Self {
        let started = Utc
            .with_ymd_and_hms(2000, 1, 1, 0, 0, 0)
            .single()
            .expect("a valid date");
        Self {
            origin: Origin::Simulated {
                since: tokio::time::Instant::now(),
            },
            started,
        }
    }

    /// Microseconds since the run's start.
    pub fn now(&self) -> Moment {
        match &self.origin {
            Origin::Wall { since, factor } => {
                Moment::from_micros((since.elapsed().as_secs_f64() * factor * 1e6) as u64)
            }
            Origin::Simulated { since } => Moment::from_micros(since.elapsed().as_micros() as u64),
        }
    }

    /// The date and time of `moment`.
    pub fn date_of(&self, moment: Moment) -> DateTime<Utc> {
        self.started + chrono::TimeDelta::microseconds(moment.as_micros() as i64)
    }

    /// The date and time of the run's start.
    pub fn started(&self) -> DateTime<Utc> {
        self.started
    }

    /// Run seconds to a wall second; simulated time counts as 1.
    pub fn factor(&self) -> f64 {
        match self.origin {
            Origin::Wall { factor, .. } => factor,
            Origin::Simulated { .. } => 1.0,
        }
    }

    /// Whether time is simulated.
    pub fn is_simulated(&self) -> bool {
        matches!(self.origin, Origin::Simulated { .. })
    }

    /// How long a thread must sleep until `moment`; zero where it has passed.
    pub fn wall_until(&self, moment: Moment) -> Duration {
        let us = moment.micros_since(self.now()) as f64;
        Duration::from_micros((us / self.factor()).ceil() as u64)
    }

    /// Waits until `moment`; timers are whole milliseconds, rounded up.
    pub async fn sleep_until(&self, moment: Moment) {
        match &self.origin {
            Origin::Wall { .. } => tokio::time::sleep(self.wall_until(moment)).await,
            Origin::Simulated { since } => {
                tokio::time::sleep_until(*since + Duration::from_micros(moment.as_micros())).await;
            }
        }
    }
}

/// A limit in wall time, for calls that block: whatever a run's own time does, a port
/// that hangs must be given up.
#[derive(Debug, Clone, Copy)]
pub struct Deadline(Instant);

impl Deadline {
    /// `within` from now.
    pub fn within(within: Duration) -> Self {
        Self(Instant::now() + within)
    }

    /// Whether it has passed.
    pub fn has_passed(self) -> bool {
        Instant::now() >= self.0
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::Seconds;

    fn paused() -> tokio::runtime::Runtime {
        tokio::runtime::Builder::new_current_thread()
            .enable_time()
            .start_paused(true)
            .build()
            .unwrap()
    }

    #[test]
    fn simulated_time_runs_to_the_next_timer_at_once() {
        let before = Instant::now();
        let end = paused().block_on(async {
            let clock = Clock::simulated();
            clock.sleep_until(Moment::START + Seconds::of(3600.0)).await;
            clock.now()
        });
        assert_eq!(end.as_micros(), 3_600_000_000);
        assert!(before.elapsed() < Duration::from_secs(5));
    }

    #[test]
    fn scaled_time_counts_faster_than_the_wall() {
        let clock = Clock::scaled(100.0);
        std::thread::sleep(Duration::from_millis(20));
        assert!(clock.now() >= Moment::from_micros(2_000_000));
        assert!(clock.wall_until(clock.now() + Seconds::of(10.0)) <= Duration::from_millis(101));
    }
}
