//! Changing a JSON text in a few places, so that every other character of it stays as it was.
//!
//! The text was parsed before and is valid JSON.

use std::ops::Range;

/// Where a member of an object lies.
struct Member {
    /// Its key, quotes included.
    key: Range<usize>,
    /// Its value.
    value: Range<usize>,
}

/// Changes to a text, collected and then made all at once.
#[derive(Debug)]
pub(super) struct Patch<'a> {
    text: &'a str,
    edits: Vec<(Range<usize>, String)>,
}

impl<'a> Patch<'a> {
    /// No changes yet to the valid JSON `text`.
    pub(super) fn new(text: &'a str) -> Self {
        Self { text, edits: Vec::new() }
    }

    /// The whole document.
    pub(super) fn root(&self) -> Range<usize> {
        let start = skip_blank(self.text.as_bytes(), 0);
        start..skip_value(self.text.as_bytes(), start)
    }

    /// The value of the member `key` of an object. Of repeated keys the last counts (section 2.7).
    pub(super) fn member(&self, object: &Range<usize>, key: &str) -> Option<Range<usize>> {
        self.members(object)
            .into_iter()
            .rev()
            .find(|member| self.is_key(member, key))
            .map(|member| member.value)
    }

    /// The elements of the list `key` of an object; none where there is no list.
    pub(super) fn elements_of(&self, object: &Range<usize>, key: &str) -> Vec<Range<usize>> {
        self.member(object, key).map_or(Vec::new(), |list| self.elements(&list))
    }

    /// Gives an object the member `key` with the JSON `value`, in place of the one it has or at its end.
    pub(super) fn set(&mut self, object: &Range<usize>, key: &str, value: &str) {
        if let Some(old) = self.member(object, key) {
            self.edits.push((old, value.to_owned()));
            return;
        }
        let last = self.members(object).pop().map(|member| member.key.start..member.value.end);
        self.insert(object, last, &[format!("{}:{value}", quoted(key))]);
    }

    /// Puts the JSON `members`, `"key":value` each, in place of the member `key` of an object.
    pub(super) fn replace_member(&mut self, object: &Range<usize>, key: &str, members: &str) {
        let all = self.members(object);
        if let Some(member) = all.iter().rev().find(|member| self.is_key(member, key)) {
            self.edits.push((member.key.start..member.value.end, members.to_owned()));
        }
    }

    /// Adds JSON `values` to the list `key` of an object; makes the list where there is none.
    /// To be called once for each list.
    pub(super) fn extend(&mut self, object: &Range<usize>, key: &str, values: &[String]) {
        if values.is_empty() {
            return;
        }
        match self.member(object, key) {
            Some(list) => {
                let last = self.elements(&list).pop();
                self.insert(&list, last, values);
            }
            None => self.set(object, key, &format!("[{}]", values.join(","))),
        }
    }

    /// The text with all changes made.
    pub(super) fn finish(mut self) -> String {
        // Stable: what goes to one place stays in the order in which it was asked for.
        self.edits.sort_by_key(|(range, _)| range.start);
        let added: usize = self.edits.iter().map(|(_, text)| text.len()).sum();
        let mut patched = String::with_capacity(self.text.len() + added);
        let mut done = 0;
        for (range, text) in &self.edits {
            patched.push_str(&self.text[done..range.start]);
            patched.push_str(text);
            done = range.end;
        }
        patched.push_str(&self.text[done..]);
        patched
    }

    /// Inserts `items` into the object or list `outer`, behind its last item and laid out as that one is.
    fn insert(&mut self, outer: &Range<usize>, last: Option<Range<usize>>, items: &[String]) {
        let bytes = self.text.as_bytes();
        let Some(last) = last else {
            let at = outer.start + 1;
            self.edits.push((at..at, items.join(",")));
            return;
        };
        let before = (outer.start..last.start).rev().find(|&at| !is_blank(bytes[at])).unwrap_or(outer.start);
        let gap = &self.text[before + 1..last.start];
        let text: String = items.iter().flat_map(|item| [",", gap, item]).collect();
        self.edits.push((last.end..last.end, text));
    }

    fn is_key(&self, member: &Member, key: &str) -> bool {
        let written = &self.text[member.key.clone()];
        let plain = &written[1..written.len() - 1];
        plain == key
            || (plain.contains('\\') && serde_json::from_str::<String>(written).is_ok_and(|own| own == key))
    }

    fn members(&self, object: &Range<usize>) -> Vec<Member> {
        let bytes = self.text.as_bytes();
        let mut members = Vec::new();
        if bytes[object.start] != b'{' {
            return members;
        }
        let mut at = skip_blank(bytes, object.start + 1);
        while bytes[at] == b'"' {
            let key = at..skip_value(bytes, at);
            // Past the colon.
            let start = skip_blank(bytes, skip_blank(bytes, key.end) + 1);
            let value = start..skip_value(bytes, start);
            at = skip_comma(bytes, value.end);
            members.push(Member { key, value });
        }
        members
    }

    fn elements(&self, list: &Range<usize>) -> Vec<Range<usize>> {
        let bytes = self.text.as_bytes();
        let mut elements = Vec::new();
        if bytes[list.start] != b'[' {
            return elements;
        }
        let mut at = skip_blank(bytes, list.start + 1);
        while bytes[at] != b']' {
            let end = skip_value(bytes, at);
            elements.push(at..end);
            at = skip_comma(bytes, end);
        }
        elements
    }
}

fn quoted(key: &str) -> String {
    serde_json::Value::from(key).to_string()
}

fn is_blank(byte: u8) -> bool {
    matches!(byte, b' ' | b'\t' | b'\r' | b'\n')
}

fn skip_blank(bytes: &[u8], mut at: usize) -> usize {
    while bytes.get(at).copied().is_some_and(is_blank) {
        at += 1;
    }
    at
}

/// Past a comma if there is one, and blanks around it.
fn skip_comma(bytes: &[u8], at: usize) -> usize {
    let at = skip_blank(bytes, at);
    if bytes.get(at) == Some(&b',') { skip_blank(bytes, at + 1) } else { at }
}

/// Just past the value that starts at `at`.
fn skip_value(bytes: &[u8], mut at: usize) -> usize {
    let mut depth = 0_usize;
    loop {
        match bytes.get(at) {
            None => return at,
            Some(b'"') => at = skip_text(bytes, at),
            Some(b'{' | b'[') => {
                depth += 1;
                at += 1;
            }
            Some(b'}' | b']') => {
                depth = depth.saturating_sub(1);
                at += 1;
            }
            Some(_) if depth > 0 => at += 1,
            Some(_) => {
                while bytes.get(at).is_some_and(|byte| !is_blank(*byte) && !b",]}".contains(byte)) {
                    at += 1;
                }
            }
        }
        if depth == 0 {
            return at;
        }
    }
}

/// Just past the text whose opening quote is at `at`.
fn skip_text(bytes: &[u8], at: usize) -> usize {
    let mut at = at + 1;
    while let Some(byte) = bytes.get(at) {
        match byte {
            b'"' => return at + 1,
            b'\\' => at += 2,
            _ => at += 1,
        }
    }
    at
}

#[cfg(test)]
mod tests {
    use super::*;

    const TEXT: &str = "{ \"a\" : [\n  {\"x\": 1.50e+1, \"y]\":\"}\\\"\"},\n  2 ],\n\"b\":{}, \"\\u0063\":[], \"a2\":[1,2] }";

    #[test]
    fn only_what_is_named_changes() {
        let mut patch = Patch::new(TEXT);
        let root = patch.root();
        let first = patch.elements_of(&root, "a").remove(0);
        patch.set(&first, "x", "7");
        patch.set(&first, "z", "8");
        patch.extend(&root, "a", &["3".to_owned(), "4".to_owned()]);
        let b = patch.member(&root, "b").unwrap();
        patch.set(&b, "q", "true");
        patch.extend(&root, "c", &["5".to_owned(), "6".to_owned()]);
        patch.extend(&root, "a2", &["3".to_owned()]);
        patch.extend(&root, "new", &["0".to_owned()]);
        let patched = patch.finish();
        assert_eq!(
            patched,
            "{ \"a\" : [\n  {\"x\": 7, \"y]\":\"}\\\"\", \"z\":8},\n  2,\n  3,\n  4 ],\n\"b\":{\"q\":true}, \
             \"\\u0063\":[5,6], \"a2\":[1,2,3], \"new\":[0] }"
        );
        serde_json::from_str::<serde_json::Value>(&patched).unwrap();
    }

    #[test]
    fn of_repeated_keys_the_last_is_meant() {
        let mut patch = Patch::new(r#"{"a":1,"a":2}"#);
        patch.set(&patch.root(), "a", "3");
        assert_eq!(patch.finish(), r#"{"a":1,"a":3}"#);
        let mut patch = Patch::new(r#"{"m":[1,2],"n":4}"#);
        patch.replace_member(&patch.root(), "m", r#""t":1,"r":2"#);
        assert_eq!(patch.finish(), r#"{"t":1,"r":2,"n":4}"#);
    }

    #[test]
    fn without_changes_the_text_is_the_same() {
        assert_eq!(Patch::new(TEXT).finish(), TEXT);
    }
}
