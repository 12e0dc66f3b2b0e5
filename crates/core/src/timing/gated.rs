//! The default method: onsets gate short windows, and what is in them is laid on one common shape.

use nalgebra::DMatrix;
use realfft::num_complex::Complex64;

use super::conditioning::{Conditioned, Conditioning};
use super::onsets::Picked;
use crate::alignment::{Alignment, Member, SignalToNoise, covariance};
use crate::fusion::{PairDelay, closure_error, fuse_delays};

/// How far from the onsets the first shift is searched, in periods.
const FIRST_SEARCH: f64 = 1.5;
/// How far the later ones are searched, in periods.
const LATER_SEARCH: f64 = 1.25;
/// How far, in periods, and how often to either side the gates are tried elsewhere.
const HOP: f64 = 0.5;
const HOPS: i32 = 6;
/// How much more of its energy must be explained where a gate hops to.
const MORE_ALIKE: f64 = 0.02;
/// Times the gates are set anew where the pulses were found, so that every gate cuts its pulse at the same place.
const REGATINGS: usize = 3;
/// Measured variance of the delays over their bound (test `sigmas_of_gated_delays_are_true`).
const INEFFICIENCY: f64 = 1.15;

/// Buffers of the gated method.
#[derive(Debug, Clone, Default)]
pub(crate) struct Gated {
    alignment: Alignment,
    signal: SignalToNoise,
    spectra: Vec<Complex64>,
    members: Vec<Member>,
    pairs: Vec<PairDelay>,
}

/// Times of the channels that took part, in samples.
#[derive(Debug, Clone)]
pub(crate) struct Aligned {
    pub(crate) channels: Vec<usize>,
    pub(crate) times: Vec<f64>,
    pub(crate) covariance: DMatrix<f64>,
    pub(crate) closure: Option<f64>,
}

impl Gated {
    /// Aligns the channels whose gate lies inside the record; none when fewer than two do.
    pub(crate) fn align(
        &mut self,
        conditioning: &Conditioning,
        channels: &[Conditioned],
        onsets: &[Option<Picked>],
    ) -> Option<Aligned> {
        let gate = &conditioning.gate;
        let mut taking_part = Vec::with_capacity(channels.len());
        self.members.clear();
        for (index, (channel, onset)) in channels.iter().zip(onsets).enumerate() {
            let Some(onset) = onset.filter(|onset| gate.fits(onset.position, channel.undelayed.len())) else {
                continue;
            };
            taking_part.push(index);
            self.members.push(Member {
                gate: onset.position,
                shift: 0.0,
                onset: onset.position,
                onset_variance: onset.variance,
                polarity: 1.0,
                energy: 0.0,
            });
        }
        if self.members.len() < 2 {
            return None;
        }
        for round in 0..=REGATINGS {
            self.look(conditioning, channels, &taking_part);
            if round == 0 {
                self.alignment.coarse(gate, &self.spectra, &mut self.members, FIRST_SEARCH * gate.period);
            }
            if round == 1 {
                self.hop(conditioning, channels, &taking_part);
            }
            if round < REGATINGS {
                let search = if round + 1 < REGATINGS { LATER_SEARCH } else { 0.25 };
                self.alignment.settle(gate, &self.spectra, &mut self.members, search * gate.period);
                move_gates(&mut self.members);
            }
        }
        self.signal.measure(gate, &self.spectra, self.members.len());
        self.alignment.pairs(gate, &self.spectra, &self.members, &self.signal, &mut self.pairs);
        let mut times = fuse_delays(&self.pairs, self.members.len())?;
        let mut covariance = covariance(&self.signal.information(gate))? * INEFFICIENCY;
        for index in 0..self.members.len() {
            covariance[(index, index)] += self.alignment.slip_variance(
                gate,
                &self.spectra,
                &self.members,
                index,
                FIRST_SEARCH * gate.period,
            );
        }
        // Delays carry no common time: the onsets give it, each as much as it is sure.
        let (late, weights) =
            self.members.iter().zip(&times).fold((0.0, 0.0), |(late, weights), (member, time)| {
                let weight = 1.0 / member.onset_variance;
                (late + weight * (member.onset - time), weights + weight)
            });
        times.iter_mut().for_each(|time| *time += late / weights);
        Some(Aligned { channels: taking_part, times, covariance, closure: closure_error(&self.pairs) })
    }

    /// Tries other places for every gate: an onset that was picked some swings off leaves the gate on another part of the
    /// pulse, and no shift inside the gate brings that back.
    fn hop(&mut self, conditioning: &Conditioning, channels: &[Conditioned], taking_part: &[usize]) {
        let gate = &conditioning.gate;
        let count = gate.omega.len();
        for (index, &channel) in taking_part.iter().enumerate() {
            let channel = &channels[channel];
            let white = (channel.noise_power / conditioning.noise_gain).sqrt();
            let start = self.members[index].gate;
            let reach = HOP * gate.period;
            let here = self.alignment.explained(gate, &self.spectra, &self.members, index, reach);
            if here.1 + MORE_ALIKE >= 1.0 {
                continue;
            }
            let mut best = (here.0, start);
            for hop in (-HOPS..=HOPS).filter(|&hop| hop != 0) {
                let place = start + f64::from(hop) * reach;
                let spectrum = &mut self.spectra[index * count..][..count];
                gate.spectrum(&channel.undelayed, place, white, spectrum);
                self.members[index].gate = place;
                let there = self.alignment.explained(gate, &self.spectra, &self.members, index, reach);
                // More energy alone may be a later, louder part of the pulse: it must be more alike as well.
                if there.0 > best.0 && there.1 > here.1 + MORE_ALIKE {
                    best = (there.0, place);
                }
            }
            self.members[index].gate = best.1;
            gate.spectrum(&channel.undelayed, best.1, white, &mut self.spectra[index * count..][..count]);
        }
        Alignment::measure(gate, &self.spectra, &mut self.members);
    }

    /// Takes the spectra of all members under their gates.
    fn look(&mut self, conditioning: &Conditioning, channels: &[Conditioned], taking_part: &[usize]) {
        let count = conditioning.gate.omega.len();
        self.spectra.resize(count * taking_part.len(), Complex64::ZERO);
        for ((member, &index), spectrum) in
            self.members.iter().zip(taking_part).zip(self.spectra.chunks_exact_mut(count))
        {
            let white = (channels[index].noise_power / conditioning.noise_gain).sqrt();
            conditioning.gate.spectrum(&channels[index].undelayed, member.gate, white, spectrum);
        }
        Alignment::measure(&conditioning.gate, &self.spectra, &mut self.members);
    }
}

/// Moves every gate to where its pulse was found, keeping the gates on the onsets on the whole.
fn move_gates(members: &mut [Member]) {
    let (late, weights) = members.iter().fold((0.0, 0.0), |(late, weights), member| {
        let weight = 1.0 / member.onset_variance;
        (late + weight * (member.gate + member.shift - member.onset), weights + weight)
    });
    for member in members {
        member.gate += member.shift - late / weights;
        member.shift = 0.0;
    }
}
