//! The change log as blocks to show: headings, items, paragraphs.

/// A piece of the change log.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum LogBlock {
    /// A version, or a group within one: its depth, 2 or more, and its words.
    Heading(usize, String),
    /// One change.
    Item(String),
    /// Other words.
    Text(String),
}

/// Reads the blocks of a change log written in Markdown. Lines that go on are joined; the title on top is left out.
pub fn log_blocks(text: &str) -> Vec<LogBlock> {
    let mut blocks: Vec<LogBlock> = Vec::new();
    let mut goes_on = false;
    for line in text.lines() {
        let words = line.trim().replace(['`', '*'], "");
        let depth = line.bytes().take_while(|&byte| byte == b'#').count();
        if words.is_empty() {
            goes_on = false;
        } else if depth > 0 {
            goes_on = false;
            if depth > 1 {
                blocks.push(LogBlock::Heading(depth, words.trim_start_matches('#').trim().to_owned()));
            }
        } else if let Some(item) = words.strip_prefix("- ") {
            blocks.push(LogBlock::Item(item.to_owned()));
            goes_on = true;
        } else if let (true, Some(LogBlock::Item(last) | LogBlock::Text(last))) = (goes_on, blocks.last_mut())
        {
            last.push(' ');
            last.push_str(&words);
        } else {
            blocks.push(LogBlock::Text(words));
            goes_on = true;
        }
    }
    blocks
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_that_go_on_are_joined() {
        let text = "# Changes\n\nNewest\nfirst.\n\n## 0.2\n### Added\n- One `thing`\n  and more\n- Another\n";
        let expected = [
            LogBlock::Text("Newest first.".to_owned()),
            LogBlock::Heading(2, "0.2".to_owned()),
            LogBlock::Heading(3, "Added".to_owned()),
            LogBlock::Item("One thing and more".to_owned()),
            LogBlock::Item("Another".to_owned()),
        ];
        assert_eq!(log_blocks(text), expected);
    }
}
