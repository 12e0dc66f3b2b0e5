//! One triggered record of all channels on one clock.

use thiserror::Error;

/// One triggered record: the samples of all channels, taken at the same instants of one clock.
///
/// Sample `k` of every channel was taken at `k * sample_interval_s` after the first sample. Samples are stored
/// one channel after the other as `f32`; their unit is whatever the recorder gave (volts where it said so),
/// because no result depends on it: a level on an antenna is not calibrated.
///
/// ```
/// use arcstead_core::Capture;
/// let capture = Capture::new(5e9, vec![vec![0.0, 1.0, 0.0], vec![0.0, 0.0, 0.5]])?;
/// assert_eq!(capture.channel_count(), 2);
/// assert_eq!(capture.channel(1), &[0.0, 0.0, 0.5]);
/// # Ok::<(), arcstead_core::CaptureError>(())
/// ```
#[derive(Debug, Clone, PartialEq)]
pub struct Capture {
    samples: Vec<f32>,
    channel_count: usize,
    sample_count: usize,
    sample_rate_hz: f64,
    range: Option<Vec<(f32, f32)>>,
}

/// Why samples do not make a [`Capture`].
#[derive(Debug, Clone, PartialEq, Error)]
#[non_exhaustive]
pub enum CaptureError {
    /// There is no channel, or the channels hold no sample.
    #[error("the capture holds no samples ({channels} channels)")]
    Empty {
        /// Number of channels given.
        channels: usize,
    },
    /// The channels are not equally long.
    #[error(
        "channel {channel} holds {found} samples where channel 1 holds {expected}; all channels of a capture share one clock"
    )]
    UnequalLength {
        /// Channel counted from 1.
        channel: usize,
        /// Its number of samples.
        found: usize,
        /// The number of samples of channel 1.
        expected: usize,
    },
    /// The sample rate is not a positive finite number.
    #[error("a sample rate of {found_hz} Hz; expected a positive finite number")]
    SampleRate {
        /// The rate given, in hertz.
        found_hz: f64,
    },
    /// A sample is NaN or infinite.
    #[error("sample {sample} of channel {channel} is {found}; every sample must be a finite number")]
    NotFinite {
        /// Channel counted from 1.
        channel: usize,
        /// Sample counted from 0.
        sample: usize,
        /// The value found.
        found: f32,
    },
    /// The ranges given do not match the channels, or a range is empty.
    #[error(
        "the recorder range of channel {channel} is not usable; expected one pair lowest < highest for each channel"
    )]
    Range {
        /// Channel counted from 1.
        channel: usize,
    },
}

impl Capture {
    /// Makes a capture of one vector of samples per channel, at `sample_rate_hz`.
    ///
    /// # Errors
    /// [`CaptureError`] when there are no samples, the channels differ in length, the rate is not positive and
    /// finite, or a sample is not finite.
    pub fn new(sample_rate_hz: f64, channels: Vec<Vec<f32>>) -> Result<Self, CaptureError> {
        let sample_count = channels.first().map_or(0, Vec::len);
        for (index, channel) in channels.iter().enumerate() {
            if channel.len() != sample_count {
                return Err(CaptureError::UnequalLength {
                    channel: index + 1,
                    found: channel.len(),
                    expected: sample_count,
                });
            }
        }
        Self::from_planar(sample_rate_hz, channels.len(), channels.concat())
    }

    /// Makes a capture of samples that lie one channel after the other in `samples`
    /// (shape: `channel_count` x samples per channel).
    ///
    /// # Errors
    /// As [`Capture::new`]; a length that is no multiple of `channel_count` is [`CaptureError::UnequalLength`].
    pub fn from_planar(
        sample_rate_hz: f64,
        channel_count: usize,
        samples: Vec<f32>,
    ) -> Result<Self, CaptureError> {
        if channel_count == 0 || samples.is_empty() {
            return Err(CaptureError::Empty { channels: channel_count });
        }
        let sample_count = samples.len() / channel_count;
        if sample_count * channel_count != samples.len() {
            return Err(CaptureError::UnequalLength {
                channel: channel_count,
                found: samples.len() - sample_count * (channel_count - 1),
                expected: sample_count,
            });
        }
        if !(sample_rate_hz.is_finite() && sample_rate_hz > 0.0) {
            return Err(CaptureError::SampleRate { found_hz: sample_rate_hz });
        }
        if let Some(at) = samples.iter().position(|sample| !sample.is_finite()) {
            return Err(CaptureError::NotFinite {
                channel: at / sample_count + 1,
                sample: at % sample_count,
                found: samples[at],
            });
        }
        Ok(Self { samples, channel_count, sample_count, sample_rate_hz, range: None })
    }

    /// States the lowest and highest value each channel can hold, as the recorder gave it; a sample at either
    /// end is clipped. Without it, clipping is found from repeated extreme values alone.
    ///
    /// # Errors
    /// [`CaptureError::Range`] when the number of pairs is not the number of channels or a pair is empty.
    pub fn with_range(mut self, range: Vec<(f32, f32)>) -> Result<Self, CaptureError> {
        if range.len() != self.channel_count {
            return Err(CaptureError::Range { channel: range.len().min(self.channel_count) + 1 });
        }
        if let Some(bad) =
            range.iter().position(|(low, high)| low.partial_cmp(high) != Some(std::cmp::Ordering::Less))
        {
            return Err(CaptureError::Range { channel: bad + 1 });
        }
        self.range = Some(range);
        Ok(self)
    }

    /// The capture of some of the channels (indices counted from 0), in the order given.
    ///
    /// # Panics
    /// When there is no such channel, or none is asked for.
    #[must_use]
    pub fn select(&self, channels: &[usize]) -> Self {
        assert!(!channels.is_empty(), "a capture has at least one channel");
        Self {
            samples: channels.iter().flat_map(|&index| self.channel(index)).copied().collect(),
            channel_count: channels.len(),
            sample_count: self.sample_count,
            sample_rate_hz: self.sample_rate_hz,
            range: self.range.as_ref().map(|range| channels.iter().map(|&index| range[index]).collect()),
        }
    }

    /// Number of channels.
    #[must_use]
    pub fn channel_count(&self) -> usize {
        self.channel_count
    }

    /// Number of samples of each channel.
    #[must_use]
    pub fn sample_count(&self) -> usize {
        self.sample_count
    }

    /// Sample rate in hertz.
    #[must_use]
    pub fn sample_rate_hz(&self) -> f64 {
        self.sample_rate_hz
    }

    /// Time between two samples in seconds.
    #[must_use]
    pub fn sample_interval_s(&self) -> f64 {
        1.0 / self.sample_rate_hz
    }

    /// Samples of the channel with this index (counted from 0).
    ///
    /// # Panics
    /// When there is no such channel.
    #[must_use]
    pub fn channel(&self, index: usize) -> &[f32] {
        &self.samples[index * self.sample_count..(index + 1) * self.sample_count]
    }

    /// Samples of all channels in order.
    pub fn channels(&self) -> impl ExactSizeIterator<Item = &[f32]> {
        self.samples.chunks_exact(self.sample_count)
    }

    /// Lowest and highest value that channel `index` can hold, where the recorder said so.
    #[must_use]
    pub fn range(&self, index: usize) -> Option<(f32, f32)> {
        self.range.as_ref().map(|range| range[index])
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_is_no_capture_is_told_with_its_place() {
        assert_eq!(Capture::new(1e9, vec![]), Err(CaptureError::Empty { channels: 0 }));
        assert_eq!(
            Capture::new(1e9, vec![vec![0.0; 3], vec![0.0; 2]]),
            Err(CaptureError::UnequalLength { channel: 2, found: 2, expected: 3 })
        );
        assert_eq!(Capture::new(0.0, vec![vec![0.0]]), Err(CaptureError::SampleRate { found_hz: 0.0 }));
        let error = Capture::new(1e9, vec![vec![0.0, 1.0], vec![0.0, f32::INFINITY]]).unwrap_err();
        assert_eq!(error, CaptureError::NotFinite { channel: 2, sample: 1, found: f32::INFINITY });
    }

    #[test]
    fn planar_and_nested_samples_make_the_same_capture() {
        let nested = Capture::new(2e9, vec![vec![1.0, 2.0], vec![3.0, 4.0]]).unwrap();
        let planar = Capture::from_planar(2e9, 2, vec![1.0, 2.0, 3.0, 4.0]).unwrap();
        assert_eq!(nested, planar);
        assert_eq!(planar.channels().collect::<Vec<_>>(), [&[1.0, 2.0][..], &[3.0, 4.0]]);
    }
}
