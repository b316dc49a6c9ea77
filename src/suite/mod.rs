//! Suites: TOML files that describe a sensor and a family of cases, and the case records they become.

mod case;

pub use case::{Case, CaseError};

pub(crate) use case::rows;

/// stand-in
#[derive(Debug)]
#[allow(missing_docs)]
pub struct Suite {
    pub name: String,
    pub title: String,
    pub note: String,
    pub hash: String,
    pub seed: Option<u64>,
    pub precision: Option<f64>,
    pub cap: Option<u64>,
    pub limits: crate::trust::Limits,
    pub methods: Option<Vec<crate::method::MethodSpec>>,
    pub cases: Vec<Case>,
}
/// stand-in
pub const DEMONSTRATION: [&str; 3] = ["a", "b", "c"];
#[allow(missing_docs)]
impl Suite {
    pub fn load(_: &str, _: Option<u64>) -> Result<Self, CaseError> {
        Err(CaseError::new("", ""))
    }
    pub fn from_case_records(p: &std::path::Path) -> Result<Self, CaseError> {
        let text = std::fs::read_to_string(p).unwrap();
        let cases = text
            .lines()
            .map(|l| Case::from_json(serde_json::from_str(l).unwrap()))
            .collect::<Result<Vec<_>, _>>()?;
        Ok(Self {
            name: "records".into(),
            title: "t".into(),
            note: "n".into(),
            hash: "h".into(),
            seed: None,
            precision: None,
            cap: None,
            limits: Default::default(),
            methods: None,
            cases,
        })
    }
}
