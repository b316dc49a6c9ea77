//! What single precision costs, as the bundled suite shows it.

use gaussworthy::sensor::Arithmetic;
use gaussworthy::suite::Suite;
use gaussworthy::survey::{SurveyPlan, SurveySettings, Unwatched, survey};
use gaussworthy::trust::Trust;

/// Points a thousandth of a spread apart, weighed by a million, need more digits than a single has: about 6 of its 7 are lost
/// (S. J. Julier, "The scaled unscented transformation", Proc. American Control Conference (2002) 4555-4559, for the weights).
/// Every other method keeps what it is worth.
#[test]
fn only_the_scaled_unscented_transform_with_its_small_alpha_breaks() {
    let suite = Suite::load("buoy-controllers", None).unwrap();
    let plan = SurveyPlan::new(&suite, &SurveySettings::default()).unwrap();
    let found = survey(&suite, &plan, false, &Unwatched);
    for (m, method) in plan.methods.iter().enumerate() {
        let trusted = |family: &str| {
            let of_family = found.cases.iter().filter(|c| suite.cases[c.index].id().starts_with(family));
            let trusted =
                of_family.clone().filter(|c| c.answers[m].as_ref().unwrap().verdict.trust == Trust::Trusted);
            (trusted.count(), of_family.count())
        };
        let (sound, all) = trusted("");
        if method.label() == "unscented-scaled:arithmetic=f32" {
            // In a chart of its own half of the buoy's bearings survive; 40 km from the origin none, and no plot.
            assert_eq!(trusted("own-chart"), (6, 12));
            assert_eq!(trusted("chart-40-km"), (0, 12));
            assert_eq!(trusted("plotter"), (0, 24));
        } else {
            assert_eq!(sound, all, "{}", method.label());
        }
    }
    assert!(plan.methods.iter().any(|m| m.arithmetic() == Arithmetic::Single));
}
