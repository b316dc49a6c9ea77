//! The store of references: what is loaded is what was saved, to the bit; whatever is in it, references come out as
//! if there were none.

use std::fs;
use std::path::Path;
use std::sync::atomic::{AtomicUsize, Ordering};

use gaussworthy::reference::{
    FORMAT, Loaded, ResumeError, Sampler, SamplerError, SamplerSettings, SamplerState, Saved, ShareSampler, Store,
};
use gaussworthy::suite::{Case, Suite};
use gaussworthy::survey::{Shard, SurveyPlan, SurveySettings, Watch, survey};
use serde_json::{Value, json};
use sha2::{Digest, Sha256};

fn case(record: Value) -> Case {
    Case::from_json(record).unwrap()
}

/// Range and bearing, spread around the station so that samples lie on both sides of the cut.
fn wide_angle() -> Case {
    case(json!({"case": "wide", "sensor": {"kind": "range-bearing", "station": [0, 0]},
        "prior": {"mean": [-3, 0.4, 7], "covariance": [[2, 0.3, 0.1], [0.3, 4, 0], [0.1, 0, 1]]},
        "noise": {"covariance": [[0.01, 0], [0, 1e-4]]}}))
}

fn product() -> Case {
    case(json!({"case": "product", "sensor": {"kind": "quadratic", "A": [[[0, 0.5], [0.5, 0]]]},
        "prior": {"mean": [1, 0.8], "covariance": [[0.0025, 0], [0, 0.36]]}, "noise": {"covariance": 9e-4}}))
}

/// More dimensions than there are direction numbers: plain streams.
fn many_dimensions() -> Case {
    let n = gaussworthy::net::MOST_DIMENSIONS + 1;
    let identity: Vec<Vec<f64>> = (0..n).map(|i| (0..n).map(|j| f64::from(u8::from(i == j))).collect()).collect();
    case(json!({"case": "many", "sensor": {"kind": "quadratic", "A": [identity]},
        "prior": {"mean": vec![1.0; n], "covariance": identity}}))
}

fn cases() -> [Case; 3] {
    [wide_angle(), product(), many_dimensions()]
}

fn settings(seed: u64) -> SamplerSettings {
    SamplerSettings { seed, precision: 1e-9, cap: 1 << 18, ..SamplerSettings::default() }
}

/// Deepens `times` times; the reference at every doubling, written so that each different bit shows.
fn looks(sampler: &mut Sampler<'_>, times: usize) -> Vec<String> {
    (0..times)
        .map(|_| {
            assert!(sampler.deepen());
            format!("{:?}", sampler.reference())
        })
        .collect()
}

fn deepened(case: &Case, settings: SamplerSettings, times: usize) -> SamplerState {
    let mut sampler = Sampler::new(case, settings).unwrap();
    looks(&mut sampler, times);
    sampler.state()
}

fn store() -> (tempfile::TempDir, Store) {
    let folder = tempfile::tempdir().unwrap();
    let store = Store::open(&folder.path().join("a/store")).unwrap();
    (folder, store)
}

fn found(store: &Store, case: &Case, settings: &SamplerSettings) -> SamplerState {
    match store.load(case, settings) {
        Loaded::Found(state) => *state,
        other => panic!("{other:?}"),
    }
}

#[test]
fn what_is_loaded_is_what_was_saved_to_the_bit() {
    for case in cases() {
        let settings = settings(3);
        let ((_one, first), (_other, second)) = (store(), store());
        assert_eq!(first.load(&case, &settings), Loaded::Missing);
        let state = deepened(&case, settings, 2);
        assert_eq!(first.save(&case, &settings, &state).unwrap(), Saved::Written);
        let loaded = found(&first, &case, &settings);
        assert_eq!(loaded, state);
        // Equality holds 0 and -0 for equal; the text does not.
        second.save(&case, &settings, &loaded).unwrap();
        let text = |store: &Store| fs::read_to_string(store.path(&case, &settings)).unwrap();
        assert_eq!(text(&first), text(&second), "{}", case.id());
    }
}

#[test]
fn a_resumed_sampler_gives_the_bits_of_a_new_one_at_every_doubling() {
    for case in cases() {
        let settings = settings(4);
        let scratch = looks(&mut Sampler::new(&case, settings).unwrap(), 4);
        let (_folder, store) = store();
        for depth in 1..=4 {
            let mut sampler = match store.load(&case, &settings) {
                Loaded::Found(state) => Sampler::resume(&case, settings, *state).unwrap(),
                _ => Sampler::new(&case, settings).unwrap(),
            };
            assert_eq!(sampler.points(), 0);
            assert_eq!(looks(&mut sampler, depth), scratch[..depth], "{} to depth {depth}", case.id());
            assert_eq!(store.save(&case, &settings, &sampler.state()).unwrap(), Saved::Written);
        }
        // Whoever asks for less than is stored stops where they would have stopped without.
        let mut sampler = Sampler::resume(&case, settings, found(&store, &case, &settings)).unwrap();
        assert_eq!(looks(&mut sampler, 2), scratch[..2], "{}", case.id());
        let shallow = SamplerSettings { cap: 1 << 16, ..settings };
        let run = |sampler: Sampler<'_>| format!("{:?}", sampler.run());
        let resumed = Sampler::resume(&case, shallow, found(&store, &case, &shallow)).unwrap();
        assert_eq!(run(resumed), run(Sampler::new(&case, shallow).unwrap()), "{}", case.id());
    }
}

#[test]
fn the_deepest_state_stays_unless_it_is_to_be_fresh() {
    let (case, settings, (_folder, store)) = (product(), settings(1), store());
    let (shallow, deep) = (deepened(&case, settings, 1), deepened(&case, settings, 3));
    assert_eq!(store.save(&case, &settings, &deep).unwrap(), Saved::Written);
    assert_eq!(store.save(&case, &settings, &shallow).unwrap(), Saved::AsDeep);
    assert_eq!(store.save(&case, &settings, &deep).unwrap(), Saved::AsDeep);
    assert_eq!(found(&store, &case, &settings), deep);
    let fresh = store.clone().fresh();
    assert_eq!(fresh.load(&case, &settings), Loaded::Missing);
    assert_eq!(fresh.save(&case, &settings, &shallow).unwrap(), Saved::Written);
    assert_eq!(found(&store, &case, &settings), shallow);
}

#[test]
fn a_file_is_named_by_what_its_bits_depend_on() {
    let (_folder, store) = store();
    let base = settings(1);
    let path = |case: &Case, settings: SamplerSettings| store.path(case, &settings);
    let named = |name: &str| {
        let mut record = product().to_json();
        record["case"] = name.into();
        Case::from_json(record).unwrap()
    };
    let same = path(&product(), base);
    assert_eq!(same, path(&named("other name"), base));
    assert_eq!(same, path(&product(), SamplerSettings { precision: 0.1, cap: 1 << 30, ..base }));
    for other in [
        path(&wide_angle(), base),
        path(&product(), SamplerSettings { seed: 2, ..base }),
        path(&product(), SamplerSettings { replicates: 16, ..base }),
        // A cap of one block a replicate begins with one block, not with four: other doublings.
        path(&product(), SamplerSettings { cap: 32 * 256, ..base }),
    ] {
        assert_ne!(same, other);
    }
}

/// Seals what stands in a file of the store anew, as one who means to deceive would.
fn reseal(path: &Path, change: impl FnOnce(String) -> String) {
    let text = fs::read_to_string(path).unwrap();
    let (body, _) = text.rsplit_once(",\n\"sha256\": \"").unwrap();
    let body = change(body.to_string());
    let checksum: String = Sha256::digest(&body).iter().map(|byte| format!("{byte:02x}")).collect();
    fs::write(path, format!("{body},\n\"sha256\": \"{checksum}\"\n}}\n")).unwrap();
}

fn damage(store: &Store, case: &Case, settings: &SamplerSettings) -> String {
    match store.load(case, settings) {
        Loaded::Damaged(why) => why,
        other => panic!("{other:?}"),
    }
}

#[test]
fn damaged_files_are_found_out_and_replaced() {
    let (case, settings, (_folder, store)) = (wide_angle(), settings(5), store());
    let state = deepened(&case, settings, 1);
    let path = store.path(&case, &settings);
    let name = path.file_name().unwrap().to_str().unwrap();
    store.save(&case, &settings, &state).unwrap();
    let whole = fs::read(&path).unwrap();
    let replaced = |bytes: &[u8], expected: &str| {
        fs::write(&path, bytes).unwrap();
        let why = damage(&store, &case, &settings);
        assert!(why.contains(expected) && why.contains(name), "{why}");
        assert_eq!(store.save(&case, &settings, &state).unwrap(), Saved::Written);
        assert_eq!(fs::read(&path).unwrap(), whole);
    };
    for length in [0, 1, whole.len() / 2, whole.len() - 80, whole.len() - 1] {
        replaced(&whole[..length], "cut short");
    }
    // One digit, one bit of it: in the facts, the looks, the sums, the checksum.
    let digits: Vec<usize> = (0..whole.len()).filter(|&i| whole[i].is_ascii_digit()).collect();
    for place in (0..24).map(|k| digits[k * (digits.len() - 1) / 23]) {
        let mut bytes = whole.clone();
        bytes[place] ^= 1;
        replaced(&bytes, "checksum");
    }
    replaced(&[0xff; 200], "is not text");
    replaced(b"{}\n", "no reference");
}

#[test]
fn foreign_files_are_not_taken_for_references() {
    let (case, base, (_folder, store)) = (product(), settings(6), store());
    let path = store.path(&case, &base);
    let foreign = |other: &Case, settings: SamplerSettings| {
        store.save(other, &settings, &deepened(other, settings, 1)).unwrap();
        fs::rename(store.path(other, &settings), &path).unwrap();
        let why = damage(&store, &case, &base);
        assert!(why.contains("another reference than its name says"), "{why}");
    };
    foreign(&wide_angle(), base);
    foreign(&case, SamplerSettings { seed: 7, ..base });
    foreign(&case, SamplerSettings { replicates: 4, ..base });

    store.save(&case, &base, &deepened(&case, base, 1)).unwrap();
    reseal(&path, |body| body.replace("\"format\": ", "\"format\": 9"));
    assert!(damage(&store, &case, &base).contains("another reference"));
    for (from, to) in [("\"looks\"", "\"lokks\""), ("\"count\":", "\"count\":null,\"more\":"), ("[\n", "[[\n")] {
        fs::remove_file(&path).unwrap();
        store.save(&case, &base, &deepened(&case, base, 1)).unwrap();
        reseal(&path, |body| body.replacen(from, to, 1));
        let why = damage(&store, &case, &base);
        assert!(why.contains("is not as references are"), "{why}");
    }
    fs::remove_file(&path).unwrap();
    fs::create_dir(&path).unwrap();
    assert!(damage(&store, &case, &base).contains("cannot be read"));
    assert!(store.save(&case, &base, &deepened(&case, base, 1)).is_err());
}

/// States whose seal is right and whose shape is not, and a state of another case: refused, never a panic.
#[test]
fn a_state_that_does_not_fit_is_refused() {
    let (case, settings, (_folder, store)) = (wide_angle(), settings(8), store());
    let path = store.path(&case, &settings);
    let changed = |from: &str, to: &str| {
        let _ = fs::remove_file(&path);
        store.save(&case, &settings, &deepened(&case, settings, 2)).unwrap();
        reseal(&path, |body| {
            let (facts, states) = body.split_once("\"states\"").unwrap();
            assert!(states.contains(from), "no {from}");
            // A list that was empty needs no comma.
            let states = states.replacen(from, to, 1).replacen(",]", "]", 1);
            format!("{facts}\"states\"{states}")
        });
        Sampler::resume(&case, settings, found(&store, &case, &settings)).map(drop).unwrap_err()
    };
    for (from, to) in [
        ("\"blocks\":4,", "\"blocks\":2,"),
        ("\"blocks\":8,", "\"blocks\":18446744073709551615,"),
        ("\"sums\":{\"count\":2048.0", "\"sums\":{\"count\":1024.0"),
        ("\"z\":[", "\"z\":[0.5,"),
        ("\"ee\":[", "\"ee\":[0.5,"),
        ("\"basis\":[", "\"basis\":[0.5,"),
        ("\"centre\":[", "\"centre\":[0.5,"),
        ("\"circles\":[null,", "\"circles\":["),
        ("\"bands\":[", "\"bands\":[0.5,"),
        ("\"near_cut\":[", "\"near_cut\":[{\"z\":[],\"e\":[],\"deviation\":[]},"),
        ("\"covariance\":[[", "\"covariance\":[[0.5,"),
        ("\"cross_covariance\":[", "\"cross_covariance\":[[0.5,0.5],"),
        ("\"mean\":[", "\"mean\":[0.5,"),
    ] {
        let error = changed(from, to);
        assert!(matches!(error, ResumeError::Misfit(_)), "{from}: {error}");
    }
    for other in [product(), many_dimensions()] {
        let state = deepened(&other, settings, 1);
        assert!(matches!(Sampler::resume(&case, settings, state), Err(ResumeError::Misfit(_))));
    }
    let few = SamplerSettings { replicates: 4, ..settings };
    let state = deepened(&case, settings, 1);
    assert!(matches!(Sampler::resume(&case, few, state.clone()), Err(ResumeError::Misfit(_))));
    let none = SamplerSettings { replicates: 1, ..settings };
    assert!(matches!(Sampler::resume(&case, none, state), Err(ResumeError::Sampler(_))));
}

#[test]
fn a_state_without_numbers_is_not_stored() {
    let case = case(json!({"case": "over", "sensor": {"kind": "quadratic", "A": [[[1e200]]]},
        "prior": {"mean": [0], "covariance": [[1e10]]}}));
    let (settings, (_folder, store)) = (settings(1), store());
    let state = deepened(&case, settings, 1);
    assert!(!state.is_finite());
    assert_eq!(store.save(&case, &settings, &state).unwrap(), Saved::NotFinite);
    assert_eq!(store.load(&case, &settings), Loaded::Missing);
    assert!(Sampler::resume(&case, settings, state).is_err());
}

/// Stops a survey at a look at its one case.
struct StopAt(usize, AtomicUsize);

impl Watch for StopAt {
    fn case_done(&self, _points: u64) {}

    fn stop(&self) -> bool {
        self.1.fetch_add(1, Ordering::SeqCst) >= self.0
    }
}

#[test]
fn a_case_that_is_stopped_between_doublings_keeps_what_it_has() {
    let text = "precision = 1e-9\ncap = 1_000_000\n[sensor]\nkind = \"range-bearing\"\nstation = [0, 0]\n[prior]\n\
        mean = [3, 1]\nsd = [1, 2]\n[noise]\nsd = [0.1, \"1 deg\"]\n";
    let suite = Suite::from_text("stopped", "stopped.toml", text, None).unwrap();
    let plan = |store| SurveyPlan::new(&suite, &SurveySettings { store, ..Default::default() }).unwrap();
    let never = || StopAt(usize::MAX, AtomicUsize::new(0));
    let answer = |plan: &SurveyPlan| format!("{:?}", survey(&suite, plan, false, &never()).cases);
    let alone = answer(&plan(None));
    let (_folder, store) = store();
    let kept = plan(Some(store.clone()));
    for looks in 0..4 {
        let stopped = survey(&suite, &kept, false, &StopAt(looks, AtomicUsize::new(0)));
        assert!(!stopped.is_complete() && stopped.cases.is_empty());
        let stored = store.load(&suite.cases[0], &kept.sampler);
        let points = if let Loaded::Found(state) = stored { state.points() } else { 0 };
        assert_eq!(points, if looks == 0 { 0 } else { (32 * 1024) << (looks - 1) }, "{looks} looks");
    }
    assert_eq!(answer(&kept), alone);
    assert_eq!(answer(&kept), alone);
}

/// Saves a share of the replicates, `times` doublings deep, from what the store has of it.
fn save_share(store: &Store, case: &Case, settings: SamplerSettings, share: Shard, times: usize) {
    let mut sampler = match store.load_share(case, &settings, share) {
        Loaded::Found(state) => ShareSampler::resume(case, settings, share, *state).unwrap(),
        _ => ShareSampler::new(case, settings, share).unwrap(),
    };
    for _ in 0..times {
        assert!(sampler.deepen());
    }
    assert_eq!(store.save_share(case, &settings, share, &sampler.state()).unwrap(), Saved::Written);
}

#[test]
fn shares_of_the_replicates_join_to_the_state_of_one_sampler() {
    for case in [wide_angle(), product()] {
        let settings = settings(9);
        for of in [2, 5, 32] {
            let (_folder, store) = store();
            let shares: Vec<Shard> = (1..=of).map(|k| Shard::new(k, of).unwrap()).collect();
            for &share in shares.iter().rev() {
                assert_eq!(store.load(&case, &settings), Loaded::Missing);
                save_share(&store, &case, settings, share, 2);
            }
            assert_eq!(found(&store, &case, &settings), deepened(&case, settings, 2));
            // Shares that differ in depth do not join, and say so.
            save_share(&store, &case, settings, shares[0], 3);
            assert!(damage(&store, &case, &settings).contains("not equally deep"));
            shares[1..].iter().for_each(|&share| save_share(&store, &case, settings, share, 3));
            let whole = deepened(&case, settings, 3);
            assert_eq!(found(&store, &case, &settings), whole);
            assert!(whole.points() > deepened(&case, settings, 2).points());
            // The deeper of the whole and the shares counts.
            store.save(&case, &settings, &deepened(&case, settings, 2)).unwrap();
            assert_eq!(found(&store, &case, &settings), whole);
            store.save(&case, &settings, &deepened(&case, settings, 4)).unwrap();
            assert_eq!(found(&store, &case, &settings), deepened(&case, settings, 4));
        }
    }
    let (case, share) = (product(), Shard::new(1, 33).unwrap());
    let error = ShareSampler::new(&case, settings(1), share).unwrap_err();
    assert_eq!(error, SamplerError::TooManyShares { shares: 33, replicates: 32 });
}

/// Eight threads save states of different depths under one name and load them all the while.
#[test]
fn many_may_read_and_write_at_once() {
    let (case, settings, (_folder, store)) = (product(), settings(2), store());
    let states: Vec<SamplerState> = (1..=4).map(|times| deepened(&case, settings, times)).collect();
    std::thread::scope(|scope| {
        for t in 0..8 {
            let (store, case, states) = (&store, &case, &states);
            scope.spawn(move || {
                let writer = if t % 2 == 0 { store.clone() } else { store.clone().fresh() };
                for k in 0..50 {
                    writer.save(case, &settings, &states[(t + k) % states.len()]).unwrap();
                    let state = found(store, case, &settings);
                    assert!(states.contains(&state));
                }
            });
        }
    });
    let files = fs::read_dir(store.path(&case, &settings).parent().unwrap()).unwrap().count();
    assert_eq!(files, 1, "temporary files are left");
}

/// Pinned bits of a sampled state, on arithmetic that is the same on every machine. If this fails, seeded results have
/// moved: raise `FORMAT` in src/reference/store.rs, or stores would mix old samples with new ones; then pin the new
/// bits here and say **value-breaking** in CHANGELOG.md.
#[test]
fn the_format_is_raised_when_samples_change() {
    let (case, settings, (_folder, store)) = (product(), settings(1), store());
    store.save(&case, &settings, &deepened(&case, settings, 2)).unwrap();
    let text = fs::read_to_string(store.path(&case, &settings)).unwrap();
    let checksum = text.rsplit_once("\"sha256\": \"").unwrap().1;
    assert_eq!((FORMAT, &checksum[..16]), (2, "9cd07a6d823d64c6"));
}
