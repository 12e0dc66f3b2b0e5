//! Errors that are drawn once for a visit, and times of arrival without samples.

use arcstead_solver::nalgebra::Vector3;
use arcstead_solver::{PositionSigma, Site};
use rand::Rng;
use rand_distr::{Distribution, StandardNormal};

use crate::error::SimError;
use crate::travel::first_way;

/// What is wrong with a measuring chain during a whole visit, unknown to who measures.
///
/// Arrival-level simulation for statistics:
///
/// ```
/// # use arcstead_solver::{Air, Antenna, PositionSigma, Priors, SearchBox, Site, nalgebra::Vector3};
/// # let antennas: Vec<Antenna> = [[0.0, 0.0, 2.0], [12.0, 0.0, 2.0], [12.0, 10.0, 3.0], [0.0, 10.0, 1.5]]
/// #     .into_iter()
/// #     .map(|at| Antenna {
/// #         name: format!("{at:?}"),
/// #         position_m: Vector3::from(at),
/// #         position_sigma: PositionSigma::Isotropic(0.03),
/// #         delay_sigma_s: 1e-10,
/// #         response_sigma_s: 5e-11,
/// #     })
/// #     .collect();
/// # let search = SearchBox::around(&antennas, &[]).unwrap();
/// # let site = Site { antennas, assets: vec![], obstacles: vec![], air: Air::default(), search, priors: Priors::default() };
/// use arcstead_sim::SystematicErrors;
/// use rand::SeedableRng;
/// let mut rng = rand_chacha::ChaCha8Rng::seed_from_u64(1);
/// let source_m = Vector3::new(5.0, 4.0, 6.0);
/// // One visit to one source: the errors stay, the captures differ.
/// let errors = SystematicErrors::draw(&site, 1, &mut rng);
/// let exact_s = errors.arrivals(&site, 0, &source_m)?;
/// let captures: Vec<Vec<f64>> = (0..10)
///     .map(|_| arcstead_sim::with_timing_noise(&exact_s, &[5e-11; 4], &mut rng))
///     .collect::<Result<_, _>>()?;
/// assert_eq!(captures[3].len(), 4);
/// # Ok::<(), arcstead_sim::SimError>(())
/// ```
#[derive(Debug, Clone, PartialEq)]
pub struct SystematicErrors {
    /// True delay of each antenna's chain minus the stated one, in seconds.
    pub delay_error_s: Vec<f64>,
    /// True position of each antenna minus the stated one, in metres.
    pub survey_error_m: Vec<Vector3<f64>>,
    /// What the response adds to the delay, in seconds; shape: sources x antennas.
    pub response_error_s: Vec<Vec<f64>>,
}

impl SystematicErrors {
    /// No errors at all, for this number of sources and antennas.
    #[must_use]
    pub fn none(sources: usize, antennas: usize) -> Self {
        Self {
            delay_error_s: vec![0.0; antennas],
            survey_error_m: vec![Vector3::zeros(); antennas],
            response_error_s: vec![vec![0.0; antennas]; sources],
        }
    }

    /// Independent normal errors with the sigmas of the site: one delay error and one survey error (each axis, for
    /// an isotropic sigma as well) per antenna, one response error per source and antenna.
    #[must_use]
    pub fn draw(site: &Site, sources: usize, rng: &mut (impl Rng + ?Sized)) -> Self {
        let mut normal = |sigma: f64| {
            let deviation: f64 = StandardNormal.sample(rng);
            sigma * deviation
        };
        let delay_error_s = site.antennas.iter().map(|a| normal(a.delay_sigma_s)).collect();
        let survey_error_m = site
            .antennas
            .iter()
            .map(|antenna| {
                let sigma_m = match antenna.position_sigma {
                    PositionSigma::Isotropic(sigma_m) => Vector3::repeat(sigma_m),
                    PositionSigma::PerAxis(sigma_m) => sigma_m,
                };
                sigma_m.map(&mut normal)
            })
            .collect();
        let response_error_s = (0..sources)
            .map(|_| site.antennas.iter().map(|a| normal(a.response_sigma_s)).collect())
            .collect();
        Self { delay_error_s, survey_error_m, response_error_s }
    }

    /// Arrival times in seconds at the antennas of the site, counted from the emission, stated delays already
    /// subtracted: `L_i/v + delay error + response error`, L_i the first way ([`first_way`]) to where the antenna
    /// really is.
    ///
    /// # Errors
    /// [`SimError::NoWay`] when an obstacle lies between the source and an antenna straight above or below it.
    ///
    /// # Panics
    /// When the errors were drawn for fewer sources or antennas.
    pub fn arrivals(
        &self,
        site: &Site,
        source: usize,
        source_m: &Vector3<f64>,
    ) -> Result<Vec<f64>, SimError> {
        let speed_m_per_s = site.air.speed_m_per_s;
        let response_error_s = &self.response_error_s[source];
        site.antennas
            .iter()
            .enumerate()
            .map(|(index, antenna)| {
                let antenna_m = antenna.position_m + self.survey_error_m[index];
                // The wavelength tells the loss only, which has no part in this.
                let way = first_way(&site.obstacles, source_m, &antenna_m, 1.0).ok_or_else(|| {
                    SimError::NoWay { source_m: (*source_m).into(), antenna: antenna.name.clone() }
                })?;
                Ok(way.length_m / speed_m_per_s + self.delay_error_s[index] + response_error_s[index])
            })
            .collect()
    }
}

/// These times with independent normal errors of `timing_sigma_s` added: one capture.
///
/// # Errors
/// [`SimError::TimingSigma`] when there is not one finite sigma of zero or more for each time.
pub fn with_timing_noise(
    times_s: &[f64],
    timing_sigma_s: &[f64],
    rng: &mut (impl Rng + ?Sized),
) -> Result<Vec<f64>, SimError> {
    let fits = timing_sigma_s.len() == times_s.len()
        && timing_sigma_s.iter().all(|sigma| sigma.is_finite() && *sigma >= 0.0);
    if !fits {
        return Err(SimError::TimingSigma { found: timing_sigma_s.len(), expected: times_s.len() });
    }
    let noisy = times_s.iter().zip(timing_sigma_s).map(|(time_s, sigma_s)| {
        let deviation: f64 = StandardNormal.sample(rng);
        time_s + sigma_s * deviation
    });
    Ok(noisy.collect())
}

/// One capture of a source on a visit of its own, without samples: the first way to every antenna, systematic errors
/// drawn anew with the sigmas of the site, and independent timing errors of `timing_sigma_s` per antenna. Times in
/// seconds after the emission, one per antenna, stated delays subtracted.
///
/// Several captures of one visit share their systematic errors: see [`SystematicErrors`].
///
/// # Errors
/// [`SimError::TimingSigma`], and [`SimError::NoWay`] as [`SystematicErrors::arrivals`].
pub fn draw_arrivals(
    site: &Site,
    source_m: &Vector3<f64>,
    timing_sigma_s: &[f64],
    rng: &mut (impl Rng + ?Sized),
) -> Result<Vec<f64>, SimError> {
    let times_s = SystematicErrors::draw(site, 1, rng).arrivals(site, 0, source_m)?;
    with_timing_noise(&times_s, timing_sigma_s, rng)
}
