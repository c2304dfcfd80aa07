//! How the story looks: bold headings and drawn lines on a terminal, plain text elsewhere. Each part ends with an empty
//! line.

use std::io::{self, Write};

use comfy_table::{Cell, CellAlignment, Table, presets};
use serde_json::Value;

/// Requests are broken into lines of about this length.
const WIDTH: usize = 88;

/// Where the story is written.
pub(super) struct Page<W> {
    out: W,
    rich: bool,
}

impl<W: Write> Page<W> {
    pub(super) fn new(out: W, rich: bool) -> Self {
        Self { out, rich }
    }

    pub(super) fn heading(&mut self, text: &str) -> io::Result<()> {
        let bold = anstyle::Style::new().bold();
        if self.rich { writeln!(self.out, "{bold}{text}{bold:#}\n") } else { writeln!(self.out, "{text}\n") }
    }

    pub(super) fn text(&mut self, text: &str) -> io::Result<()> {
        writeln!(self.out, "{text}\n")
    }

    /// The command that repeats a request to a server at its default address.
    pub(super) fn request(&mut self, path: &str, body: &str) -> io::Result<()> {
        writeln!(
            self.out,
            "curl -s http://127.0.0.1:8080{path} -H 'content-type: application/json' -d '\n{body}'\n"
        )
    }

    /// A table whose first column is words and whose other columns are aligned to the right.
    pub(super) fn table(
        &mut self,
        head: &[&str],
        rows: impl IntoIterator<Item = Vec<String>>,
    ) -> io::Result<()> {
        let aligned = |(column, cell): (usize, &str)| {
            let side = if column == 0 { CellAlignment::Left } else { CellAlignment::Right };
            Cell::new(cell).set_alignment(side)
        };
        let mut table = Table::new();
        table.load_style(if self.rich { presets::UTF8_FULL_CONDENSED } else { presets::ASCII_MARKDOWN });
        table.set_header(head.iter().copied().enumerate().map(aligned));
        for row in rows {
            table.add_row(row.iter().map(String::as_str).enumerate().map(aligned));
        }
        writeln!(self.out, "{table}\n")
    }
}

/// A JSON text with as much on a line as fits.
pub(super) fn laid_out(value: &Value) -> String {
    let mut text = String::new();
    lay_out(value, 0, &mut text);
    text
}

fn lay_out(value: &Value, indent: usize, text: &mut String) {
    let short = one_line(value);
    if indent > 0 && indent + short.len() <= WIDTH {
        text.push_str(&short);
        return;
    }
    let (open, close, items): (_, _, Vec<(String, &Value)>) = match value {
        Value::Object(members) => {
            ('{', '}', members.iter().map(|(name, member)| (format!("\"{name}\": "), member)).collect())
        }
        Value::Array(items) => ('[', ']', items.iter().map(|item| (String::new(), item)).collect()),
        _ => {
            text.push_str(&short);
            return;
        }
    };
    let margin = " ".repeat(indent + 2);
    text.push(open);
    for (index, (name, item)) in items.into_iter().enumerate() {
        text.push_str(if index > 0 { ",\n" } else { "\n" });
        text.push_str(&margin);
        text.push_str(&name);
        lay_out(item, indent + 2, text);
    }
    text.push('\n');
    text.push_str(&margin[2..]);
    text.push(close);
}

fn one_line(value: &Value) -> String {
    match value {
        Value::Object(members) => {
            let members: Vec<String> =
                members.iter().map(|(name, member)| format!("\"{name}\": {}", one_line(member))).collect();
            format!("{{ {} }}", members.join(", "))
        }
        Value::Array(items) => {
            format!("[{}]", items.iter().map(one_line).collect::<Vec<_>>().join(", "))
        }
        scalar => scalar.to_string(),
    }
}
