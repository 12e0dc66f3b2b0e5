//! Channels whose samples cannot be believed: clipped, or dead.

/// How many samples must stand at the same extreme value before it is taken for the end of the range, when the
/// recorder did not tell its range.
const REPEATED_EXTREME: usize = 3;

/// A recorder with fewer distinct levels than this on a channel records nothing but its own last bit.
const FEWEST_LEVELS: usize = 3;

/// Whether samples stand at the end of the recorder's range.
///
/// With `range` (lowest and highest value the channel can hold), any sample at or beyond either end. Without it: the
/// highest or the lowest value occurs three times or more in a row, which a band-limited pulse does not do by itself.
#[must_use]
pub fn is_clipped(samples: &[f32], range: Option<(f32, f32)>) -> bool {
    if let Some((low, high)) = range {
        return samples.iter().any(|&x| x <= low || x >= high);
    }
    let (low, high) = extremes(samples);
    if high <= low || is_dead(samples) {
        return false;
    }
    // The resting level of a quiet channel is no clipping: the run must stand well away from the rest.
    let span = high - low;
    let rest = crate::offset::offset(samples) as f32;
    [low, high]
        .into_iter()
        .filter(|end| (end - rest).abs() > 0.25 * span)
        .any(|end| samples.windows(REPEATED_EXTREME).any(|run| run.iter().all(|&x| (x - end).abs() <= 0.0)))
}

/// Whether the channel carries nothing: all samples equal, or not more than two neighbouring levels.
#[must_use]
pub fn is_dead(samples: &[f32]) -> bool {
    let (low, high) = extremes(samples);
    if high <= low {
        return true;
    }
    // Two levels only: the last bit of the recorder flickering. A pulse visits more.
    let mut levels = [low, high, f32::NAN];
    let mut count = 2;
    for &x in samples {
        if !levels[..count].iter().any(|level| (level - x).abs() <= 0.0) {
            levels[count] = x;
            count += 1;
            if count >= FEWEST_LEVELS {
                return false;
            }
        }
    }
    true
}

fn extremes(samples: &[f32]) -> (f32, f32) {
    samples.iter().fold((f32::INFINITY, f32::NEG_INFINITY), |(low, high), &x| (low.min(x), high.max(x)))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_flat_top_is_clipped_and_a_round_one_is_not() {
        let round: Vec<f32> = (0..200).map(|n| (n as f32 * 0.37).sin()).collect();
        let flat: Vec<f32> = round.iter().map(|x| x.min(0.7)).collect();
        assert!(!is_clipped(&round, None) && is_clipped(&flat, None));
        assert!(is_clipped(&round, Some((-0.9, 2.0))) && !is_clipped(&round, Some((-2.0, 2.0))));
    }

    #[test]
    fn a_channel_of_one_or_two_levels_is_dead() {
        assert!(is_dead(&[]) && is_dead(&[2.0; 30]));
        assert!(is_dead(&[0.0, 1.0, 0.0, 0.0, 1.0]) && !is_dead(&[0.0, 1.0, 2.0]));
        assert!(!is_clipped(&[0.0; 30], None));
    }
}
