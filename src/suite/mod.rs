//! Suites: TOML files that describe a sensor and a family of cases, and the case records they become.
//!
//! A suite has a `[sensor]`, a `[prior]` and perhaps a `[noise]`. Any value in them may be a sweep or a
//! draw; sweeps combine as a grid in which the first one written runs slowest. With `[[family]]` tables there
//! are several such grids: what a family does not say for itself it takes from the top level, whole sections
//! at a time.
//!
//! ```
//! # fn main() -> Result<(), gaussworthy::suite::SuiteError> {
//! let text = r#"
//! title = "Pilot station, an invented example"
//! draws = 4                           # cases drawn at every point of a grid that has a draw
//!
//! [sensor]
//! kind = "range-bearing"
//! station = [0, 0]                    # m, unless a unit is given
//!
//! [prior]                             # as the station sees it
//! range = { from = "500 m", to = "20 km", steps = 5, scale = "log" }
//! bearing = { draw = "uniform", from = "0 deg", to = "360 deg" }
//! along_sd = "2 %"                    # of the range; or a length
//! across_sd = { list = ["0.5 deg", "3 deg"] }
//!
//! [noise]
//! sd = ["10 m", "0.3 deg"]            # one an output
//!
//! [limits]
//! mean_error = 0.2
//! "#;
//! let suite = gaussworthy::suite::Suite::from_text("pilot", "pilot.toml", text, None)?;
//! assert_eq!(suite.cases.len(), 5 * 2 * 4);
//! assert_eq!(suite.cases[0].id(), "pilot-000");
//! assert_eq!(suite.limits.mean_error, 0.2);
//! # Ok(())
//! # }
//! ```
//!
//! | key | meaning |
//! | --- | --- |
//! | `title`, `note` | for the reader |
//! | `seed` | of the draws, 1 unless given |
//! | `precision`, `cap` | standardised standard error asked, most samples a case may take |
//! | `draws` | cases drawn at every grid point; needed when a value is drawn |
//! | `[limits]` | see [`Limits`](crate::trust::Limits) |
//! | `[[method]]` | `id` and parameters, see [`method`](crate::method) |
//! | `[sensor]` | `kind` and parameters, see [`sensor`](crate::sensor) |
//! | `[prior]` | `mean` and `covariance`; or `mean`, `sd` and perhaps `correlation`, a matrix or triples `[i, j, rho]`; or, for a planar position, `range`, `bearing`, `along_sd`, `across_sd` and perhaps `seen_from`, `rest_mean`, `rest_sd` |
//! | `[noise]` | `sd`, one an output or one for all; or `covariance`, a matrix or one number for its diagonal |
//! | `[[family]]` | `name`, perhaps `draws`, and its own sections in place of those above |
//!
//! - Quantity: a bare number, or a text with a unit: m, km, cm, mm; deg, rad, mrad; % of the range. A bare length
//!   is in metres. An angle must have its unit. Covariances are bare numbers, in m^2 and rad^2.
//! - Sweep: `{ from, to, steps }`, with `scale = "log"` for equal ratios, or `{ list = [..] }`, whose values may
//!   be whole lists.
//! - Draw: `{ draw = "uniform", from, to }` or `"log-uniform"`. A case's draws depend on the seed, the
//!   family's name and the case's number alone.
//! - A planar prior is seen from the sensor's station (the first of several) unless `seen_from = [x, y]` says
//!   otherwise. It takes the state components that the sensor reads as the position; `rest_mean` and `rest_sd`
//!   speak of the others in their order.
//! - Cases are called after their family (or suite) with a number from 000.

mod bundled;
mod case;
mod definition;
mod draw;
mod error;
mod family;
mod frame;
mod grid;
mod layout;
mod name;
mod node;
mod noise;
mod numbers;
mod prior;
mod quantity;
mod records;
mod sensor;
mod settings;
mod sighting;
mod source;
mod sweep;
mod unit;
mod velocity;

pub use bundled::{Bundled, DEMONSTRATION};
pub(crate) use case::rows;
pub use case::{Case, CaseError};
pub use definition::Suite;
pub(crate) use definition::hex;
pub use error::SuiteError;
