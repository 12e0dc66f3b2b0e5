//! The tables that occur once: `[site]`, `[air]`, `[search]`, `[verdict]`, `[recorder]`, `[planning]`.

use arcstead_solver::{Air, Asset, Priors, SearchBox};
use nalgebra::Vector3;

use super::antennas::Antennas;
use super::contents::{Origin, Planning, Recorder};
use super::mistake::MistakeKind;
use super::quantity::{
    COORDINATE_M, ELLIPSOID_HEIGHT_M, FREQUENCY_MHZ, LATE_SCALE_NS, LATITUDE_DEG, LONGITUDE_DEG, MAINS_HZ,
    PRIOR, REFRACTIVITY, SAMPLE_RATE_GSPS, SNR_DB, SPEED_M_PER_NS,
};
use super::section::Section;

/// What `[site]` says.
pub(super) struct Head {
    pub(super) name: String,
    pub(super) mains_frequency_hz: Option<f64>,
    pub(super) origin: Option<Origin>,
}

pub(super) fn site(whole: &Section<'_>) -> Option<Head> {
    whole.need("site", "a table [site] with the name of the site");
    let section = whole.table("site", &["name", "mains_frequency_hz", "origin"])?;
    let name = section.needed_name("name");
    let mains_frequency_hz = section.number("mains_frequency_hz", &MAINS_HZ);
    let origin = section.table("origin", &["latitude_deg", "longitude_deg", "height_m"]).and_then(|origin| {
        let latitude_deg = origin.needed_number("latitude_deg", &LATITUDE_DEG);
        let longitude_deg = origin.needed_number("longitude_deg", &LONGITUDE_DEG);
        let height_m = origin.needed_number("height_m", &ELLIPSOID_HEIGHT_M);
        Some(Origin { latitude_deg: latitude_deg?, longitude_deg: longitude_deg?, height_m: height_m? })
    });
    Some(Head { name: name?, mains_frequency_hz, origin })
}

pub(super) fn air(whole: &Section<'_>) -> Air {
    let (n_key, speed_key) = ("refractivity_n_units", "speed_m_per_ns");
    let Some(section) = whole.table("air", &["refractivity_n_units", "speed_m_per_ns"]) else {
        return Air::default();
    };
    section.exclude(n_key, speed_key);
    let refractivity = section.number(n_key, &REFRACTIVITY);
    let speed = section.number(speed_key, &SPEED_M_PER_NS);
    match (refractivity, speed) {
        (_, Some(m_per_ns)) => Air { speed_m_per_s: m_per_ns * 1e9 },
        (Some(n_units), None) => Air::from_refractivity(n_units),
        (None, None) => Air::default(),
    }
}

pub(super) fn verdict(whole: &Section<'_>) -> Priors {
    let default = Priors::default();
    let Some(section) = whole.table("verdict", &["elsewhere_prior", "late_prior", "late_scale_ns"]) else {
        return default;
    };
    Priors {
        elsewhere: section.number_or("elsewhere_prior", &PRIOR, default.elsewhere),
        late: section.number_or("late_prior", &PRIOR, default.late),
        late_scale_s: section
            .number("late_scale_ns", &LATE_SCALE_NS)
            .map_or(default.late_scale_s, |ns| ns * 1e-9),
    }
}

pub(super) fn recorder(whole: &Section<'_>) -> Recorder {
    let Some(section) = whole.table("recorder", &["sample_rate_gsps", "bandwidth_mhz", "bits"]) else {
        return Recorder::default();
    };
    Recorder {
        sample_rate_hz: section.number("sample_rate_gsps", &SAMPLE_RATE_GSPS).map(|gsps| gsps * 1e9),
        bandwidth_hz: section.number("bandwidth_mhz", &FREQUENCY_MHZ).map(|mhz| mhz * 1e6),
        bits: section.integer("bits", 1, 64),
    }
}

pub(super) fn planning(whole: &Section<'_>) -> Planning {
    let section = whole.table("planning", &["snr_at_10m_db"]);
    Planning { snr_at_10m_db: section.and_then(|section| section.number("snr_at_10m_db", &SNR_DB)) }
}

/// The search box. `min_m` and `max_m` give it whole; without them it is the box around antennas and assets. With
/// `height_m` it is the cut of that box at this height: `min_m` and `max_m` may then be [x, y], and with a z the
/// height must lie between.
pub(super) fn search(whole: &Section<'_>, antennas: &Antennas, assets: &[Asset]) -> Option<SearchBox> {
    let section = whole.table("search", &["min_m", "max_m", "height_m"]);
    let around = || {
        // Antennas without a position stand nowhere.
        let placed: Vec<_> = (0..antennas.antennas.len())
            .filter(|index| !antennas.free.contains(index))
            .map(|index| antennas.antennas[index].clone())
            .collect();
        let around = SearchBox::around(&placed, assets);
        if around.is_none() && !whole.has("antenna") && !whole.has("asset") {
            whole.report("search", MistakeKind::NothingToSearch);
        }
        around
    };
    let Some(section) = section else { return around() };
    section.together("min_m", "max_m");
    let height_m = section.number("height_m", &COORDINATE_M);
    let flat = section.has("height_m");
    if !section.has("min_m") || !section.has("max_m") {
        return around().map(|found| at_height(found, height_m));
    }
    let corner = |key: &'static str| {
        let pair = flat && section.list(key, "a corner").is_some_and(|list| list.len() == 2);
        if pair {
            let corner = section.numbers(key, &COORDINATE_M, "a corner [x, y] in metres");
            corner.map(|[x, y]| (Vector3::new(x, y, height_m.unwrap_or(0.0)), true))
        } else {
            section.point(key).map(|corner| (corner, false))
        }
    };
    let (min, max) = (corner("min_m"), corner("max_m"));
    let ((min_m, min_is_flat), (max_m, max_is_flat)) = (min?, max?);
    for (axis, name) in ["x", "y", "z"].into_iter().enumerate() {
        let given = axis < 2 || !(min_is_flat || max_is_flat);
        if given && min_m[axis] >= max_m[axis] {
            let expected = match name {
                "x" => "x of `min_m` below x of `max_m`",
                "y" => "y of `min_m` below y of `max_m`",
                _ => "z of `min_m` below z of `max_m`, or `height_m` for a search on a plane",
            };
            let (table, low, high) = (section.title.clone(), min_m[axis], max_m[axis]);
            section.report("max_m", MistakeKind::Order { table, key: "max_m", low, high, expected });
        }
    }
    if let Some(height_m) = height_m {
        // A corner without z leaves that side open.
        let low_m = if min_is_flat { height_m } else { min_m.z };
        let high_m = if max_is_flat { height_m } else { max_m.z };
        if !(low_m..=high_m).contains(&height_m) {
            section.report("height_m", MistakeKind::PlaneOutsideBox { height_m, low_m, high_m });
        }
    }
    Some(at_height(SearchBox { min_m, max_m }, height_m))
}

fn at_height(mut search: SearchBox, height_m: Option<f64>) -> SearchBox {
    if let Some(height_m) = height_m {
        search.min_m.z = height_m;
        search.max_m.z = height_m;
    }
    search
}
