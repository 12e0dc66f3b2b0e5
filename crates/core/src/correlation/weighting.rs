//! Weights of the generalised cross-correlation.

use realfft::num_complex::Complex64;

/// Bins on either side over which spectra are averaged where a weight needs a coherence.
const SMOOTHING: usize = 4;
/// Bins weaker than this share of the strongest one are not whitened further: there is nothing in them but rounding.
const LEAST_SHARE: f64 = 1e-12;

/// How each frequency of a cross-spectrum counts (C. H. Knapp, G. C. Carter, IEEE Trans. ASSP 24(4), 1976).
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub enum Weighting {
    /// By its own power: the plain cross-correlation. The best in white noise that is weaker than the pulse.
    #[default]
    Plain,
    /// Divided by its magnitude to the power of the exponent: 1 is the phase transform, 0 the plain correlation.
    PhaseTransform {
        /// Exponent between 0 and 1.
        exponent: f64,
    },
    /// Smoothed coherence transform: divided by the geometric mean of both power spectra, each smoothed over nine
    /// bins.
    Scot,
    /// Maximum likelihood for a random signal: by `C / (|G| (1 - C))` with C the squared coherence of the spectra,
    /// smoothed over nine bins.
    MaximumLikelihood,
}

/// Multiplies each bin of `cross` (`conj(a) b`) by its weight. `scratch` is for running sums.
pub(crate) fn apply(
    weighting: Weighting,
    a: &[Complex64],
    b: &[Complex64],
    cross: &mut [Complex64],
    scratch: &mut Vec<[f64; 4]>,
) {
    let strongest = cross.iter().fold(0.0, |most: f64, bin| most.max(bin.norm()));
    let least = LEAST_SHARE * strongest;
    if strongest <= 0.0 {
        return;
    }
    match weighting {
        Weighting::Plain => {}
        Weighting::PhaseTransform { exponent } => {
            for bin in cross {
                let magnitude = bin.norm();
                *bin = if magnitude > least { *bin * magnitude.powf(-exponent) } else { Complex64::ZERO };
            }
        }
        Weighting::Scot => smoothed(a, b, cross, scratch, |bin, [aa, bb, _, _]| {
            let mean = (aa * bb).sqrt();
            if mean > least { bin / mean } else { Complex64::ZERO }
        }),
        Weighting::MaximumLikelihood => smoothed(a, b, cross, scratch, |bin, [aa, bb, re, im]| {
            let coherence = ((re * re + im * im) / (aa * bb).max(f64::MIN_POSITIVE)).min(1.0 - 1e-6);
            let magnitude = bin.norm();
            if magnitude > least {
                bin * (coherence / (magnitude * (1.0 - coherence)))
            } else {
                Complex64::ZERO
            }
        }),
    }
}

/// Calls `weigh` with each bin of the cross-spectrum and the mean of `[|a|^2, |b|^2, re cross, im cross]` around it.
fn smoothed(
    a: &[Complex64],
    b: &[Complex64],
    cross: &mut [Complex64],
    sums: &mut Vec<[f64; 4]>,
    weigh: impl Fn(Complex64, [f64; 4]) -> Complex64,
) {
    sums.clear();
    sums.push([0.0; 4]);
    let mut sum = [0.0; 4];
    for ((a, b), c) in a.iter().zip(b).zip(&*cross) {
        for (sum, term) in sum.iter_mut().zip([a.norm_sqr(), b.norm_sqr(), c.re, c.im]) {
            *sum += term;
        }
        sums.push(sum);
    }
    let count = cross.len();
    for (k, bin) in cross.iter_mut().enumerate() {
        let (from, to) = (k.saturating_sub(SMOOTHING), (k + SMOOTHING + 1).min(count));
        let mean = std::array::from_fn(|i| (sums[to][i] - sums[from][i]) / (to - from) as f64);
        *bin = weigh(*bin, mean);
    }
}
