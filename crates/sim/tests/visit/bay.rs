//! The site and the visits of these checks, and plain measures of waves.

use std::sync::Arc;

use arcstead_sim::{SourceSetting, VisitSettings};
use arcstead_solver::nalgebra::Vector3;
use arcstead_solver::{Air, Antenna, PositionSigma, Priors, SearchBox, Site};
use realfft::num_complex::Complex;
use realfft::{RealFftPlanner, RealToComplex};

/// Distance of two frequencies of the spectrum of a record of the default length, in hertz.
pub(crate) const BIN_HZ: f64 = 5e9 / 1500.0;

pub(crate) fn site_of(places_m: &[[f64; 3]]) -> Site {
    let antennas: Vec<Antenna> = places_m
        .iter()
        .enumerate()
        .map(|(index, &at)| Antenna {
            name: format!("A{}", index + 1),
            position_m: Vector3::from(at),
            position_sigma: PositionSigma::Isotropic(0.03),
            delay_sigma_s: 1e-10,
            response_sigma_s: 5e-11,
        })
        .collect();
    let search = SearchBox::around(&antennas, &[])
        .unwrap_or(SearchBox { min_m: Vector3::zeros(), max_m: Vector3::repeat(1.0) });
    Site {
        antennas,
        assets: vec![],
        obstacles: vec![],
        air: Air::default(),
        search,
        priors: Priors::default(),
    }
}

pub(crate) fn site() -> Site {
    site_of(&[[0.0, 0.0, 2.0], [12.0, 0.0, 2.0], [12.0, 10.0, 3.0], [0.0, 10.0, 1.5]])
}

pub(crate) fn source() -> SourceSetting {
    SourceSetting::at([8.0, 6.0, 5.0])
}

pub(crate) fn settings() -> VisitSettings {
    VisitSettings { sources: vec![source()], captures: 20, seed: 42, ..VisitSettings::default() }
}

/// Nothing but the direct pulse, on antennas that are all alike.
pub(crate) fn bare() -> VisitSettings {
    VisitSettings {
        gain_spread_db: 0.0,
        ripple_db: 0.0,
        ground_reflection: Some(0.0),
        scatterers: 0,
        draw_errors: false,
        ..settings()
    }
}

pub(crate) fn energy(wave: &[f64]) -> f64 {
    wave.iter().map(|v| v * v).sum()
}

pub(crate) fn peak(wave: &[f64]) -> f64 {
    wave.iter().fold(0.0, |peak, v| peak.max(v.abs()))
}

pub(crate) fn spectrum(wave: &[f64]) -> Vec<Complex<f64>> {
    let plan: Arc<dyn RealToComplex<f64>> = RealFftPlanner::new().plan_fft_forward(wave.len());
    let mut spectrum = plan.make_output_vec();
    plan.process(&mut wave.to_vec(), &mut spectrum).expect("the plan made the spectrum");
    spectrum
}
