//! What every document of a visit begins with: what was read, and how it was timed.

use arcstead_core::Method;
use serde_json::{Map, Value};

use crate::documents::{ARRIVALS_SCHEMA, Head, Inputs, Program};
use crate::site::Site;
use crate::visit::TimedVisit;

/// The head of a document about `visit`; more options may be added to it. A visit read from arrivals tables was timed
/// elsewhere, so its timing options are not told.
pub(crate) fn head(schema: &str, site: &Site, visit: &TimedVisit) -> Head {
    let mut options = Map::new();
    if let Some(timing) = &visit.timing {
        let band_mhz = timing.band_of(site).map(|(low, high)| vec![low / 1e6, high / 1e6]);
        options.insert("method".into(), method_name(timing.method).into());
        options.insert("band".into(), band_mhz.into());
        options.insert("excise".into(), timing.excise.into());
    } else {
        options.insert("arrivals".into(), Value::from(visit.files.clone()));
    }
    Head {
        schema: schema.into(),
        program: Program::this(),
        site: Some(site.name.clone()),
        inputs: Inputs {
            files: visit.files.clone(),
            count: visit.captures,
            site_sha256: Some(site.sha256.clone()),
        },
        options,
    }
}

/// The head of an arrivals table in JSON, for [`ArrivalsWriter::json`](crate::arrivals_table::ArrivalsWriter::json).
#[must_use]
pub fn arrivals_head(site: &Site, visit: &TimedVisit) -> Head {
    head(ARRIVALS_SCHEMA, site, visit)
}

/// The name of a method on the command line and in documents.
#[must_use]
pub fn method_name(method: Method) -> &'static str {
    match method {
        Method::Gated => "gated",
        Method::Correlation => "correlation",
        Method::Energy => "energy",
        Method::Akaike => "akaike",
        Method::Threshold => "threshold",
    }
}
