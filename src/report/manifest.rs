use std::io::{self, Write};

use serde::Serialize;

use crate::outside::{Origin, Outside, Tally};
use crate::survey::{Quartiles, SurveyResult};
use crate::trust::{Claim, Limits};

/// What a results folder is: enough to make it again and to know what its times mean.
#[derive(Serialize)]
struct Manifest<'a> {
    version: &'static str,
    build: Build,
    suite: SuiteEntry<'a>,
    seed: u64,
    settings: Settings<'a>,
    machine: Machine,
    #[serde(skip_serializing_if = "Option::is_none")]
    shard: Option<ShardEntry>,
    cases: Cases,
    samples: u64,
    times: Times,
    #[serde(skip_serializing_if = "Option::is_none")]
    cost: Option<Vec<MethodCost<'a>>>,
    /// One an outside implementation.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    answers: Vec<AnswersEntry<'a>>,
}

#[derive(Serialize)]
struct Build {
    profile: &'static str,
    target: String,
}

#[derive(Serialize)]
struct SuiteEntry<'a> {
    name: &'a str,
    title: &'a str,
    note: &'a str,
    /// SHA-256 of the suite's text.
    hash: &'a str,
}

#[derive(Serialize)]
struct Settings<'a> {
    precision: f64,
    cap: u64,
    replicates: usize,
    methods: Vec<&'a str>,
    /// Implementations outside of the program; their rows come after those of the methods.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    outside: Vec<OutsideEntry<'a>>,
    limits: &'a Limits,
    /// What envelopes are asked to promise.
    #[serde(skip_serializing_if = "Option::is_none")]
    envelope: Option<Claim>,
}

/// An outside implementation: where its answers come from.
#[derive(Serialize)]
struct OutsideEntry<'a> {
    name: &'a str,
    /// The words of its command, as they were typed.
    #[serde(skip_serializing_if = "Option::is_none")]
    command: Option<&'a [String]>,
    #[serde(skip_serializing_if = "Option::is_none")]
    timeout_seconds: Option<f64>,
    /// The file of its answers, without its folder.
    #[serde(skip_serializing_if = "Option::is_none")]
    file: Option<&'a str>,
    /// SHA-256 of that file.
    #[serde(skip_serializing_if = "Option::is_none")]
    sha256: Option<&'a str>,
}

impl<'a> OutsideEntry<'a> {
    fn of(outside: &'a Outside) -> Self {
        let name = outside.name();
        let nothing = Self { name, command: None, timeout_seconds: None, file: None, sha256: None };
        match outside.origin() {
            Origin::Command { words, timeout } => {
                Self { command: Some(words), timeout_seconds: Some(timeout.as_secs_f64()), ..nothing }
            }
            Origin::File { name: file, sha256 } => Self { file: Some(file), sha256: Some(sha256), ..nothing },
        }
    }
}

/// Its answers counted, over all cases asked.
#[derive(Serialize)]
struct AnswersEntry<'a> {
    name: &'a str,
    asked: usize,
    valid: usize,
    invalid: usize,
    missing: usize,
    /// For cases that are not in the suite.
    unknown: u64,
    /// Lines that name no case.
    unreadable: u64,
    /// How its command failed.
    #[serde(skip_serializing_if = "Option::is_none")]
    failure: Option<&'a str>,
}

impl<'a> AnswersEntry<'a> {
    fn of(outside: &'a Outside) -> Self {
        let Tally { asked, usable, unusable, missing, unknown, unreadable, .. } = outside.tally();
        Self {
            name: outside.name(),
            asked,
            valid: usable,
            invalid: unusable,
            missing,
            unknown,
            unreadable,
            failure: outside.failure(),
        }
    }
}

#[derive(Serialize)]
struct Machine {
    threads: usize,
    cores: usize,
    architecture: &'static str,
    system: &'static str,
}

/// Which part of a shared survey this is.
#[derive(Serialize)]
struct ShardEntry {
    part: usize,
    of: usize,
    /// Cases of all parts together.
    suite_cases: usize,
}

#[derive(Serialize)]
struct Cases {
    asked: usize,
    finished: usize,
    complete: bool,
}

#[derive(Serialize)]
struct Times {
    /// RFC 3339, UTC.
    started: String,
    sampling_seconds: f64,
    timing_seconds: f64,
}

#[derive(Serialize)]
struct MethodCost<'a> {
    method: &'a str,
    /// Quartiles over the timed cases of the ratio to first-order Taylor.
    time_ratio: Option<Quartiles>,
    /// On all threads.
    transforms_per_second: Option<f64>,
}

pub(super) fn write(survey: &SurveyResult<'_>, to: &mut dyn Write) -> io::Result<()> {
    let (suite, plan) = (survey.suite, survey.plan);
    let labels: Vec<&str> = plan.methods.iter().map(|m| m.label()).collect();
    let manifest = Manifest {
        version: env!("CARGO_PKG_VERSION"),
        build: Build {
            profile: if cfg!(debug_assertions) { "debug" } else { "release" },
            target: format!("{}-{}", std::env::consts::ARCH, std::env::consts::OS),
        },
        suite: SuiteEntry { name: &suite.name, title: &suite.title, note: &suite.note, hash: &suite.hash },
        seed: plan.sampler.seed,
        settings: Settings {
            precision: plan.sampler.precision,
            cap: plan.sampler.cap,
            replicates: plan.sampler.replicates,
            methods: labels.clone(),
            outside: plan.outside.iter().map(OutsideEntry::of).collect(),
            limits: &plan.limits,
            envelope: survey.suite.envelope,
        },
        machine: Machine {
            threads: rayon::current_num_threads(),
            cores: std::thread::available_parallelism().map_or(1, usize::from),
            architecture: std::env::consts::ARCH,
            system: std::env::consts::OS,
        },
        shard: plan.shard.map(|shard| ShardEntry {
            part: shard.part(),
            of: shard.of(),
            suite_cases: suite.cases.len(),
        }),
        cases: Cases { asked: survey.asked(), finished: survey.cases.len(), complete: survey.is_complete() },
        samples: survey.points(),
        times: Times {
            started: humantime::format_rfc3339_seconds(survey.started).to_string(),
            sampling_seconds: survey.sampling_time.as_secs_f64(),
            timing_seconds: survey.timing_time.as_secs_f64(),
        },
        cost: survey.timing.as_ref().map(|timing| {
            labels
                .iter()
                .enumerate()
                .map(|(m, &method)| MethodCost {
                    method,
                    time_ratio: timing.ratio[m],
                    transforms_per_second: timing.throughput[m],
                })
                .collect()
        }),
        answers: plan.outside.iter().map(AnswersEntry::of).collect(),
    };
    serde_json::to_writer_pretty(&mut *to, &manifest)?;
    writeln!(to)
}
