//! Values to what people see. No engine, no sockets.
//!
//! A [`Bundle`] holds one output in several forms. A report's forms are all made from one [`report::Report`], so that
//! text, HTML, LaTeX and the machine record cannot disagree.

pub mod headline;
pub mod html;
pub mod latex;
pub mod register;
pub mod report;
pub mod text;

use std::collections::BTreeMap;

/// One output in several forms: MIME type to its content (text types as strings, `+json` types as JSON values).
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Bundle {
    pub data: BTreeMap<String, serde_json::Value>,
}

impl Bundle {
    pub fn text(text: impl Into<String>) -> Self {
        Bundle::default().with("text/plain", serde_json::Value::String(text.into()))
    }

    #[must_use]
    pub fn with(mut self, mime: &str, content: serde_json::Value) -> Self {
        self.data.insert(mime.to_owned(), content);
        self
    }

    #[must_use]
    pub fn with_text(self, mime: &str, content: String) -> Self {
        self.with(mime, serde_json::Value::String(content))
    }

    pub fn plain(&self) -> &str {
        self.data.get("text/plain").and_then(|text| text.as_str()).unwrap_or("")
    }
}
