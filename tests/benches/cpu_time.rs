//! Time that the processor spent on the thread of the bench: other programs beside it don't count, unlike on the clock.

use std::time::Duration;

use cpu_time::ThreadTime;
use criterion::measurement::{Measurement, ValueFormatter, WallTime};

#[derive(Debug)]
pub(crate) struct CpuTime;

impl Measurement for CpuTime {
    type Intermediate = ThreadTime;
    type Value = Duration;

    fn start(&self) -> ThreadTime {
        ThreadTime::now()
    }

    fn end(&self, start: ThreadTime) -> Duration {
        start.elapsed()
    }

    fn add(&self, a: &Duration, b: &Duration) -> Duration {
        *a + *b
    }

    fn zero(&self) -> Duration {
        Duration::ZERO
    }

    fn to_f64(&self, value: &Duration) -> f64 {
        value.as_nanos() as f64
    }

    fn formatter(&self) -> &dyn ValueFormatter {
        WallTime.formatter()
    }
}
