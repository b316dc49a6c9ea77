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
//! | `[envelope]` | asks for envelopes, see [`Claim`](crate::trust::Claim) |
//! | `[[method]]` | `id` and parameters, see [`method`](crate::method) |
//! | `[sensor]` | `kind` and parameters, see [`sensor`](crate::sensor) |
//! | `[prior]` | `mean` and `covariance`; or `mean`, `sd` and perhaps `correlation`, a matrix or triples `[i, j, rho]`; or as an observer sees it, by `range`, `bearing` and what goes with them, below |
//! | `[noise]` | `sd`, one an output or one for all; or `covariance`, a matrix or one number for its diagonal |
//! | `[[family]]` | `name`, perhaps `draws`, and its own sections in place of those above |
//!
//! - Quantity: a bare number, or a text with a unit: m, km, cm, mm; deg, rad, mrad; s, ms, us, ns, min, h; m/s, km/h,
//!   kn; deg/s, rad/s; Hz, kHz, MHz, GHz; % of the range or of the speed. A bare number is in m, s, m/s or Hz; an angle
//!   or an angular rate must have its unit. What is measured in another unit (dB, nT, pixels) is a bare number in it.
//!   Covariances are bare numbers, in m^2, rad^2 and so on.
//! - Sweep: `{ from, to, steps }`, with `scale = "log"` for equal ratios, or `{ list = [..] }`, whose values may
//!   be whole lists.
//! - Draw: `{ draw = "uniform", from, to }` or `"log-uniform"`. A case's draws depend on the seed, the
//!   family's name and the case's number alone.
//! - Cases are called after their family (or suite) with a number from 000.
//!
//! # A prior as an observer sees it
//!
//! ```
//! # fn main() -> Result<(), gaussworthy::suite::SuiteError> {
//! # let text = r#"
//! # [sensor]
//! # kind = "range-bearing"
//! # station = [0, 0]
//! [prior]                             # a ferry off Brackmoor Sound, the state [x, y, vx, vy]
//! range = "4 km"
//! bearing = "110 deg"
//! along_sd = "30 m"
//! across_sd = "2 deg"
//! speed = "14 kn"
//! course = { list = ["-20 deg", "70 deg"] }
//! speed_sd = "5 %"                    # of the speed
//! course_sd = "8 deg"
//! # "#;
//! # let suite = gaussworthy::suite::Suite::from_text("ferry", "ferry.toml", text, None)?;
//! # let m = suite.cases[0].prior().mean();
//! # assert_eq!((suite.cases.len(), m.len()), (2, 4));
//! # assert!((m[2].hypot(m[3]) - 14.0 * 1852.0 / 3600.0).abs() < 1e-12 && m[3] < 0.0);
//! # Ok(())
//! # }
//! ```
//!
//! | key | meaning |
//! | --- | --- |
//! | `range`, `bearing` | r above 0, b: the position lies at the observer + r (cos b, sin b) |
//! | `elevation` | e, -90 to 90 degrees: in space, at the observer + r (cos e cos b, cos e sin b, sin e) |
//! | `along_sd`, `across_sd`, `up_sd` | standard deviations along the line of sight; horizontally across it, along (-sin b, cos b, 0); and, with `elevation`, across both, along (-sin e cos b, -sin e sin b, cos e). Lengths, shares of the range, or (but for along) angles as seen by the observer, times r |
//! | `frame_covariance` | in place of these: K (2 x 2, in space 3 x 3) in m^2 in the axes along, across, up; the covariance is T K T' with the axes as the columns of T |
//! | `frame_bearing`, `frame_elevation` | the axes of `frame_covariance` are those of this direction and not of the line of sight; elevation 0 unless given |
//! | `seen_from` | the observer, `[x, y]` or `[x, y, z]`; the sensor's station (the first of several) unless given |
//! | `speed`, `course` | v above 0, c: the velocity v (cos c, sin c), horizontal |
//! | `speed_sd`, `course_sd` | a speed or a share of v; an angle. The covariance is T diag(`speed_sd`^2, (v `course_sd`)^2) T' with T the rotation by c: to first order in `course_sd`, for the prior is a Gaussian |
//! | `climb`, `climb_sd` | with `elevation`: the third component of the velocity, upwards |
//! | `rest_mean`, `rest_sd` | lists for the remaining components of the state, in their order |
//!
//! - Bearings and courses are counter-clockwise from the x axis, which is not the clockwise from north of a chart: course
//!   C there is 90 deg - C here, if x points east and y north.
//! - The position takes the components that the sensor reads as its `position`, else the first; the velocity those that
//!   it reads as its `velocity`, else the first that are not of the position, so it stands right in `[x, y, vx, vy]` and in
//!   `[x, vx, y, vy]`.
//! - An angle across is one at the observer's eye: at elevation e, a bearing known to s is `across_sd` = s cos e.
//! - `frame_bearing`, perhaps with `frame_elevation`, goes with `mean` too: `covariance` or `sd` is then along the axes
//!   of that direction as far as the position is concerned, P = T P T' where T turns the position's components and
//!   leaves the others.

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
mod setting;
mod settings;
mod sighting;
mod source;
mod sweep;
mod unit;
mod velocity;

pub use bundled::{Bundled, DEMONSTRATION};
pub(crate) use case::rows;
pub use case::{Case, CaseError, Noise};
pub use definition::Suite;
pub(crate) use definition::hex;
pub use error::SuiteError;
pub use setting::Setting;
