//! One mode through a whole performance: starts and changes of its losses.

use crate::reference::Damped;

/// What happens to a mode.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Event {
    /// A start is added to what sounds: the two samples at its frame and before it
    /// that it has with its own pitch and losses.
    Start(Damped),
    /// From here on the mode has this pitch and these losses. It goes on through
    /// its last two samples.
    Exchange(Damped),
}

/// Adds to `signal` a mode that rests at first with the pitch and losses of
/// `first`. Each of `events` takes effect at its frame, in order.
pub fn perform(first: &Damped, events: &[(usize, Event)], signal: &mut [f64], sample_rate_hz: f64) {
    let mut motion = Damped {
        a: 0.0,
        c: 0.0,
        ..*first
    };
    let mut from = 0;
    for &(frame, event) in events {
        let until = frame.clamp(from, signal.len());
        motion.add_to(&mut signal[from..until], sample_rate_hz);
        motion = motion.moved_to((until - from) as f64 / sample_rate_hz);
        from = until;
        motion = match event {
            Event::Start(start) => {
                let here = exchanged(start, &motion, sample_rate_hz);
                Damped {
                    a: motion.a + here.a,
                    c: motion.c + here.c,
                    ..motion
                }
            }
            Event::Exchange(other) => exchanged(motion, &other, sample_rate_hz),
        };
    }
    motion.add_to(&mut signal[from..], sample_rate_hz);
}

/// `motion` with the pitch and losses of `other`, through the last two samples.
fn exchanged(motion: Damped, other: &Damped, sample_rate_hz: f64) -> Damped {
    if motion.angular == other.angular && motion.decay == other.decay {
        motion
    } else {
        motion.with_losses(other, 1.0 / sample_rate_hz)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const RATE_HZ: f64 = 48_000.0;

    /// The recurrence of `mode` from two samples on.
    fn assert_goes_on(frames: &[f64], mode: &Damped) {
        let r = (-mode.decay / RATE_HZ).exp();
        let turn = 2.0 * r * (mode.angular / RATE_HZ).cos();
        for three in frames.windows(3) {
            let next = turn * three[1] - r * r * three[0];
            assert!((three[2] - next).abs() < 1e-12, "{} {next}", three[2]);
        }
    }

    #[test]
    fn an_exchange_goes_through_the_last_two_samples() {
        let ringing = Damped::new(200.0, 2.0, 0.3, 40.0);
        let muted = Damped::new(200.0, 40.0, 0.0, 0.0);
        let (mut played, mut plain) = (vec![0.0; 2_000], vec![0.0; 2_000]);
        ringing.add_to(&mut plain, RATE_HZ);
        let events = [(0, Event::Start(ringing)), (700, Event::Exchange(muted))];
        perform(&ringing, &events, &mut played, RATE_HZ);
        assert_eq!(played[..700], plain[..700]);
        assert_goes_on(&played[699..], &muted);
    }

    #[test]
    fn a_start_keeps_its_samples_under_other_losses() {
        let ringing = Damped::new(200.0, 2.0, 0.3, 40.0);
        let muted = Damped::new(200.0, 40.0, 0.0, 0.0);
        let mut played = vec![0.0; 2_000];
        perform(&muted, &[(5, Event::Start(ringing))], &mut played, RATE_HZ);
        assert_eq!(played[..5], [0.0; 5]);
        // What would have been heard one frame before the start.
        played[4] = ringing.at(-1.0 / RATE_HZ);
        assert_goes_on(&played[4..], &muted);
    }
}
