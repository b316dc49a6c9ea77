//! Guidance for people who did not run the survey: one page for a browser, the same in Markdown, and pictures. What is
//! shown was computed by [`guidance`](crate::guidance); here it is put into words, tables and colours.

mod axes;
mod data;
mod markdown;
mod marks;
mod page;
mod pictures;
mod prepared;
mod publication;
mod views;
mod words;

pub use publication::{Publication, PublishError};
