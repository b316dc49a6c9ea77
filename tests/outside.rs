//! The methods beside implementations that share nothing with them: those of `examples/outside/`, in Python with NumPy
//! (Jacobians by the complex step) and in C (by hand), on every bundled suite.
//!
//! Python is the program named by `GAUSSWORTHY_PYTHON`, which must then have NumPy; without it, a `python3` that has NumPy;
//! without that, the comparison is left out, and that is said. The C compiler is the one named by `CC`, else `cc`.

mod common;

use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};
use std::time::Duration;

use common::close::{assert_within, scaled_difference, scaled_vector_difference, standard_deviations};
use gaussworthy::gaussian::Moments;
use gaussworthy::method::{MethodSpec, Problem};
use gaussworthy::outside::OutsideCommand;
use gaussworthy::sensor::chart_deviation;
use gaussworthy::suite::{Case, Suite};
use gaussworthy::survey::Unwatched;

/// Largest difference of a mean in standard deviations of its output, of a covariance in those of its two outputs, of a
/// cross-covariance in those of its state component and its output.
///
/// Both sides round some ten times at 1e-16, on values that are up to 1e4 standard deviations large (a field of 48,500 nT
/// known to 10 nT): 1e-11, and as much again for the solves.
const TOLERANCE: f64 = 1e-10;

/// Longest silence, generous: the machine may do much else.
const PATIENCE: Duration = Duration::from_secs(300);

/// The sensors that the Python example knows, and those that the C example knows.
const IN_PYTHON: [&str; 22] = [
    "range-bearing",
    "bearing-only",
    "range-only",
    "range-azimuth-elevation",
    "azimuth-elevation",
    "range-doppler",
    "bearing-rate",
    "time-difference",
    "frequency-difference",
    "received-strength",
    "quadratic",
    "linear",
    "line-offset",
    "line-feature",
    "polar-to-cartesian",
    "pinhole",
    "stereo-disparity",
    "attitude-vector",
    "dipole-field",
    "exponential-decay",
    "saturating",
    "phase-sine",
];
const IN_C: [&str; 2] = ["range-bearing", "bearing-only"];

fn example(file: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("examples/outside").join(file)
}

/// The method's moments of the whole state.
fn ours(case: &Case, method: &MethodSpec) -> Moments {
    let prior = case.marginal().law();
    let (a, p) = (prior.dimension(), case.sensor().outputs().len());
    let noise = case.noise_or_zero();
    let mut moments = Moments::zeros(a, p);
    let mut transform = method.plan(a, p).unwrap();
    transform.apply(Problem { sensor: case.sensor(), prior, noise: &noise }, &mut moments);
    moments.cross_covariance = case.marginal().lift(moments.cross_covariance);
    moments
}

/// The largest differences of mean, covariance and cross-covariance, see [`TOLERANCE`].
fn differences(case: &Case, theirs: &Moments, ours: &Moments) -> [f64; 3] {
    let of_output = standard_deviations(&ours.covariance);
    let of_state = standard_deviations(case.prior().covariance());
    let shift = chart_deviation(case.sensor().outputs(), &theirs.mean, &ours.mean);
    [
        scaled_vector_difference(&shift, &(&shift * 0.0), &of_output),
        scaled_difference(&theirs.covariance, &ours.covariance, &of_output, &of_output),
        scaled_difference(&theirs.cross_covariance, &ours.cross_covariance, &of_state, &of_output),
    ]
}

/// Asks a command for all bundled suites and holds its answers against a method's. It must answer every case of the
/// sensors it knows; gives how many cases were compared.
fn compare(command: &str, method: &str, known: &[&str]) -> usize {
    let asked = OutsideCommand::parse(&format!("theirs={command}"), PATIENCE).unwrap();
    let method = MethodSpec::parse(method).unwrap();
    let mut compared = 0;
    for bundled in Suite::bundled() {
        let suite = Suite::load(bundled.name, None).unwrap();
        let theirs = asked.ask(&suite, None, &Unwatched).unwrap();
        let mut largest = [0.0_f64; 3];
        let mut count = 0;
        for (index, case) in suite.cases.iter().enumerate() {
            let theirs = match theirs.answer(index) {
                Ok(theirs) => theirs,
                Err(flaw) => {
                    assert!(!known.contains(&case.spec().kind()), "{command}: {}: {flaw}", case.id());
                    continue;
                }
            };
            let found = differences(case, theirs, &ours(case, &method));
            for ((largest, found), what) in
                largest.iter_mut().zip(found).zip(["mean", "covariance", "cross-covariance"])
            {
                let place = format!("{} of {}, {what} of {}", command, bundled.name, case.id());
                assert_within(found, TOLERANCE, place);
                *largest = largest.max(found);
            }
            count += 1;
        }
        println!(
            "{:<16} {:<10} {count:>3} of {:>3} cases: mean {:.1e}, covariance {:.1e}, cross-covariance {:.1e}",
            bundled.name,
            method.label(),
            suite.cases.len(),
            largest[0],
            largest[1],
            largest[2]
        );
        compared += count;
    }
    compared
}

/// A Python with NumPy; it must be there if one is named.
fn python() -> Option<String> {
    let named = std::env::var("GAUSSWORTHY_PYTHON").ok();
    let program = named.clone().unwrap_or_else(|| "python3".into());
    let probe =
        Command::new(&program).args(["-c", "import numpy"]).stdout(Stdio::null()).stderr(Stdio::null()).status();
    let works = probe.is_ok_and(|status| status.success());
    assert!(works || named.is_none(), "GAUSSWORTHY_PYTHON is {program}, which is no Python with NumPy");
    works.then_some(program)
}

#[test]
fn python_agrees() {
    let Some(python) = python() else {
        // Past the harness, which would keep the words of a test that passes to itself.
        let _ = writeln!(
            std::io::stderr(),
            "SKIPPED: python_agrees: there is no python3 with NumPy; name one by GAUSSWORTHY_PYTHON"
        );
        return;
    };
    for method in ["taylor-1", "unscented"] {
        let command = format!("'{python}' '{}' {method}", example("predict.py").display());
        let compared = compare(&command, method, &IN_PYTHON);
        assert!(compared >= 600, "{compared} cases");
    }
}

/// The sensor that is written out is one of those compared.
#[test]
fn python_reads_formulas() {
    let Some(python) = python() else { return };
    let mut suite = Suite::load("smoke", None).unwrap();
    suite.cases.retain(|case| case.noise_inside().is_some());
    let asked = OutsideCommand::parse(
        &format!("theirs='{python}' '{}' unscented", example("predict.py").display()),
        PATIENCE,
    );
    let theirs = asked.unwrap().ask(&suite, None, &Unwatched).unwrap();
    assert!(theirs.tally().asked > 0 && theirs.tally().usable == theirs.tally().asked, "{:?}", theirs.notes());
}

#[cfg(unix)]
#[test]
fn c_agrees() {
    let folder = tempfile::tempdir().unwrap();
    let program = folder.path().join("predict");
    let compiler = std::env::var("CC").unwrap_or_else(|_| "cc".into());
    // The command of the example's README, with every warning an error.
    let output = Command::new(&compiler)
        .args(["-std=c11", "-O2", "-Wall", "-Wextra", "-pedantic", "-Werror", "-o"])
        .args([program.as_path(), example("predict.c").as_path(), Path::new("-lm")])
        .output()
        .unwrap_or_else(|e| panic!("{compiler}: {e}"));
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    let compared = compare(&format!("'{}'", program.display()), "taylor-1", &IN_C);
    assert!(compared >= 170, "{compared} cases");
}
