//! The arrival times of one capture: what every estimator ends in.

use nalgebra::DMatrix;

/// Arrival times of one pulse on the channels of one capture, with their full covariance.
///
/// Times count from the first sample of the capture. What is known well are their *differences*: a common
/// offset of all times (when the pulse left its source) is never used downstream, so the covariance need only
/// be right for differences. It is the random part: what another capture of the same source would draw anew.
#[derive(Debug, Clone, PartialEq)]
pub struct ChannelTimes {
    /// One entry per channel of the capture, in its order.
    pub channels: Vec<ChannelTime>,
    /// Covariance of the arrival times in s^2, shape channels x channels; rows and columns of channels without
    /// an arrival are zero.
    pub covariance_s2: DMatrix<f64>,
    /// Root mean square closure error of the triangles of pair delays, in seconds, where three or more channels
    /// were correlated: how far tau_ij + tau_jk + tau_ki is from zero.
    pub closure_s: Option<f64>,
}

/// The arrival on one channel.
#[derive(Debug, Clone, PartialEq)]
pub struct ChannelTime {
    /// Arrival time in seconds after the first sample; none when no pulse was found on this channel.
    pub arrival_s: Option<f64>,
    /// 20 log10 of pulse peak over noise rms, both after the timing band-pass, in dB; none on a dead channel.
    pub snr_db: Option<f64>,
    /// What is wrong or remarkable with the channel.
    pub flags: ChannelFlags,
}

/// What is wrong or remarkable with one channel of one capture.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
#[non_exhaustive]
pub struct ChannelFlags {
    /// Samples stand at the end of the recorder's range.
    pub clipped: bool,
    /// The channel carries nothing: all samples equal, or nearly so.
    pub dead: bool,
    /// The pulse is barely above the noise: the arrival is not to be relied on.
    pub weak: bool,
    /// Narrow lines were cut out of this channel's spectrum.
    pub carrier: bool,
    /// Onset and correlation disagree beyond their sigmas.
    pub disagree: bool,
}

impl ChannelFlags {
    /// The names of the flags that are set, in a fixed order.
    pub fn names(self) -> impl Iterator<Item = &'static str> {
        [
            (self.clipped, "clipped"),
            (self.dead, "dead"),
            (self.weak, "weak"),
            (self.carrier, "carrier"),
            (self.disagree, "disagree"),
        ]
        .into_iter()
        .filter_map(|(set, name)| set.then_some(name))
    }

    /// The flags with these names; a name that is no flag is given back as the error.
    ///
    /// # Errors
    /// The first name that is not known.
    pub fn from_names<'a>(names: impl IntoIterator<Item = &'a str>) -> Result<Self, &'a str> {
        let mut flags = Self::default();
        for name in names {
            match name {
                "clipped" => flags.clipped = true,
                "dead" => flags.dead = true,
                "weak" => flags.weak = true,
                "carrier" => flags.carrier = true,
                "disagree" => flags.disagree = true,
                other => return Err(other),
            }
        }
        Ok(flags)
    }
}

impl ChannelTimes {
    /// Indices of the channels that have an arrival.
    pub fn received(&self) -> impl Iterator<Item = usize> {
        self.channels.iter().enumerate().filter_map(|(index, time)| time.arrival_s.map(|_| index))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn flags_survive_their_names() {
        let flags = ChannelFlags { clipped: true, disagree: true, ..ChannelFlags::default() };
        assert_eq!(flags.names().collect::<Vec<_>>(), ["clipped", "disagree"]);
        assert_eq!(ChannelFlags::from_names(flags.names()), Ok(flags));
        assert_eq!(ChannelFlags::from_names(["odd"]), Err("odd"));
    }
}
