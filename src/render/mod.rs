//! Values to what people see. No engine, no sockets.

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

    pub fn plain(&self) -> &str {
        self.data.get("text/plain").and_then(|text| text.as_str()).unwrap_or("")
    }
}
