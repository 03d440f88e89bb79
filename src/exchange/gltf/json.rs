//! Reading the JSON document with the place at hand, so that every complaint can name it.

#![deny(clippy::arithmetic_side_effects, clippy::indexing_slicing)]

use std::fmt;

use serde::de::{Deserializer, IgnoredAny, MapAccess, Visitor};
use serde_json::{Map, Value};

use crate::exchange::decimal::is_measure;

use super::error::GltfError;

/// The members that animation has to do with. The writer changes the text itself, so all others may stay text.
pub(super) const READ_MEMBERS: [&str; 9] = [
    "accessors",
    "animations",
    "asset",
    "bufferViews",
    "buffers",
    "extensionsRequired",
    "images",
    "nodes",
    "skins",
];

/// Whole numbers up to here are exact in any JSON reader.
const LARGEST_WHOLE: f64 = 9_007_199_254_740_992.0;

/// Parses a document. Of its members only those of [`READ_MEMBERS`] are kept: meshes and whatever else a file is full
/// of take no memory. A document that is no object is an error.
pub(super) fn parse(text: &[u8]) -> serde_json::Result<Value> {
    struct Members;

    impl<'de> Visitor<'de> for Members {
        type Value = Map<String, Value>;

        fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
            f.write_str("a JSON object")
        }

        fn visit_map<A: MapAccess<'de>>(self, mut map: A) -> Result<Self::Value, A::Error> {
            let mut members = Map::new();
            while let Some(key) = map.next_key::<String>()? {
                if READ_MEMBERS.contains(&key.as_str()) {
                    // Of repeated keys the last counts (section 2.7).
                    members.insert(key, map.next_value()?);
                } else {
                    map.next_value::<IgnoredAny>()?;
                }
            }
            Ok(members)
        }
    }

    let mut deserializer = serde_json::Deserializer::from_slice(text);
    let members = deserializer.deserialize_map(Members)?;
    deserializer.end()?;
    Ok(Value::Object(members))
}

/// A JSON value and its path in the document.
#[derive(Clone, Debug)]
pub(super) struct At<'a> {
    /// The value.
    pub value: &'a Value,
    /// Its path, empty for the document itself.
    pub path: String,
}

impl<'a> At<'a> {
    /// The document itself.
    pub(super) fn root(value: &'a Value) -> Self {
        Self { value, path: String::new() }
    }

    /// The path of a member.
    pub(super) fn path_of(&self, key: &str) -> String {
        if self.path.is_empty() { key.to_owned() } else { format!("{}.{key}", self.path) }
    }

    /// A member that may be missing.
    pub(super) fn get(&self, key: &str) -> Option<Self> {
        let value = self.value.get(key)?;
        Some(Self { value, path: self.path_of(key) })
    }

    /// An element of the list `key`, which must have it.
    pub(super) fn element(&self, key: &str, index: usize) -> Result<Self, GltfError> {
        match self.value.get(key).and_then(|list| list.get(index)) {
            Some(value) => Ok(Self { value, path: format!("{}[{index}]", self.path_of(key)) }),
            None => Err(GltfError::unlike(self.path_of(key), format!("an element {index}"), "none")),
        }
    }

    /// The elements of a list; a missing list is empty.
    pub(super) fn list(&self, key: &str) -> Result<Vec<Self>, GltfError> {
        let Some(items) = self.list_value(key)? else { return Ok(Vec::new()) };
        let path = self.path_of(key);
        let at = |(index, value)| Self { value, path: format!("{path}[{index}]") };
        Ok(items.iter().enumerate().map(at).collect())
    }

    fn list_value(&self, key: &str) -> Result<Option<&'a Vec<Value>>, GltfError> {
        let Some(list) = self.get(key) else { return Ok(None) };
        list.value.as_array().map(Some).ok_or_else(|| list.unlike("a list"))
    }

    /// How many elements a list has; a missing one has none.
    pub(super) fn count(&self, key: &str) -> usize {
        self.value.get(key).and_then(Value::as_array).map_or(0, Vec::len)
    }

    /// The texts in a list; whatever else is in it is passed over.
    pub(super) fn texts(&self, key: &str) -> impl Iterator<Item = &'a str> {
        self.value.get(key).and_then(Value::as_array).into_iter().flatten().filter_map(Value::as_str)
    }

    /// A text member that may be missing.
    pub(super) fn text(&self, key: &str) -> Result<Option<&'a str>, GltfError> {
        let Some(member) = self.get(key) else { return Ok(None) };
        member.value.as_str().map(Some).ok_or_else(|| member.unlike("a text"))
    }

    /// A whole number of 0 or more that may be missing. `100`, `100.0` and `1e2` are all one (section 2.7).
    pub(super) fn whole(&self, key: &str) -> Result<Option<usize>, GltfError> {
        self.get(key).map(|member| member.as_whole()).transpose()
    }

    /// A whole number that must be there.
    pub(super) fn needed_whole(&self, key: &str) -> Result<usize, GltfError> {
        self.whole(key)?.ok_or_else(|| self.missing(key, "a whole number"))
    }

    /// An index into the list `list` of `root`, that may be missing.
    pub(super) fn index(&self, key: &str, list: &str, root: &At<'_>) -> Result<Option<usize>, GltfError> {
        self.get(key).map(|member| member.as_index(list, root)).transpose()
    }

    /// An index that must be there.
    pub(super) fn needed_index(&self, key: &str, list: &str, root: &At<'_>) -> Result<usize, GltfError> {
        self.index(key, list, root)?.ok_or_else(|| self.missing(key, &format!("an index into {list}")))
    }

    /// This value as an index into the list `list` of `root`.
    pub(super) fn as_index(&self, list: &str, root: &At<'_>) -> Result<usize, GltfError> {
        let count = root.list_value(list)?.map_or(0, Vec::len);
        let index = self.as_whole()?;
        if index < count {
            return Ok(index);
        }
        Err(self.unlike(&match count {
            0 => format!("an index into {list}, of which there are none"),
            _ => format!("an index into {list}, below {count}"),
        }))
    }

    /// Exactly `N` numbers of a size that can be reckoned with, that may be missing.
    pub(super) fn numbers<const N: usize>(&self, key: &str) -> Result<Option<[f64; N]>, GltfError> {
        let Some(member) = self.get(key) else { return Ok(None) };
        let wrong = || member.unlike(&format!("{N} numbers"));
        let list: Option<Vec<f64>> =
            member.value.as_array().ok_or_else(wrong)?.iter().map(Value::as_f64).collect();
        let list: [f64; N] = list.and_then(|list| list.try_into().ok()).ok_or_else(wrong)?;
        match list.iter().find(|&&number| !is_measure(number)) {
            None => Ok(Some(list)),
            Some(number) => {
                let expected = format!("{N} numbers that can be reckoned with");
                Err(GltfError::unlike(member.path, expected, format!("{number:e}")))
            }
        }
    }

    /// A truth value; missing counts as `false`.
    pub(super) fn is_set(&self, key: &str) -> bool {
        self.value.get(key).and_then(Value::as_bool) == Some(true)
    }

    /// The complaint that this value is not what it should be.
    pub(super) fn unlike(&self, expected: &str) -> GltfError {
        GltfError::unlike(self.path.clone(), expected, describe(self.value))
    }

    /// The complaint that a member is not there.
    pub(super) fn missing(&self, key: &str, expected: &str) -> GltfError {
        GltfError::unlike(self.path_of(key), expected, "nothing")
    }

    fn as_whole(&self) -> Result<usize, GltfError> {
        match self.value.as_f64() {
            Some(number) if number.fract() == 0.0 && (0.0..=LARGEST_WHOLE).contains(&number) => {
                Ok(number as usize)
            }
            _ => Err(self.unlike("a whole number")),
        }
    }
}

/// A value in few words, for messages.
fn describe(value: &Value) -> String {
    match value {
        Value::Null => "null".to_owned(),
        Value::Bool(truth) => truth.to_string(),
        Value::Number(number) => shortened(&number.to_string()),
        Value::String(text) => format!("`{}`", shortened(text)),
        Value::Array(list) => format!("a list of {}", list.len()),
        Value::Object(_) => "an object".to_owned(),
    }
}

/// At most 60 characters of a text.
pub(super) fn shortened(text: &str) -> String {
    match text.char_indices().nth(60) {
        Some((end, _)) => format!("{}…", text.get(..end).unwrap_or_default()),
        None => text.to_owned(),
    }
}
