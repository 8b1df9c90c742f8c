//! The parts an HTML page is made of. Text goes in through [`escape`]; what is named `html` or `svg` is markup already.

/// The page's own style; nothing is fetched.
const STYLE: &str = include_str!("style.css");

/// Text as HTML shows it, in an element or in an attribute between double quotes.
pub(super) fn escape(text: &str) -> String {
    let mut html = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '&' => html.push_str("&amp;"),
            '<' => html.push_str("&lt;"),
            '>' => html.push_str("&gt;"),
            '"' => html.push_str("&quot;"),
            '\'' => html.push_str("&#39;"),
            // Control characters other than line feed and tab are not allowed in HTML, not even as references.
            c if c.is_control() && c != '\n' && c != '\t' => html.push('\u{fffd}'),
            c => html.push(c),
        }
    }
    html
}

/// A whole page.
pub(super) fn page(title: &str, body_html: &str) -> String {
    format!(
        "<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n<meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n\
         <title>{}</title>\n<style>\n{STYLE}</style>\n</head>\n<body>\n{body_html}</body>\n</html>\n",
        escape(title)
    )
}

/// A section under a second-level heading; nothing where its body is empty.
pub(super) fn section(heading: &str, body_html: &str) -> String {
    if body_html.is_empty() {
        String::new()
    } else {
        format!(
            "<section>\n<h2>{}</h2>\n{body_html}</section>\n",
            escape(heading)
        )
    }
}

/// A paragraph.
pub(super) fn paragraph(text: &str) -> String {
    format!("<p>{}</p>\n", escape(text))
}

/// A picture or plot with its caption; `name` is what a screen reader says, as title of an SVG.
pub(super) fn figure(name: &str, content_html: &str, caption: &str) -> String {
    let titled = match content_html.split_once('>') {
        Some((root, rest)) if root.starts_with("<svg") => format!(
            "{root} aria-label=\"{0}\"><title>{0}</title>{rest}",
            escape(name)
        ),
        _ => content_html.to_owned(),
    };
    format!(
        "<figure>\n{titled}\n<figcaption>{}</figcaption>\n</figure>\n",
        escape(caption)
    )
}

/// A table whose columns each align left or right.
#[derive(Clone, Debug)]
pub(super) struct Table {
    caption: String,
    columns: Vec<(&'static str, Align)>,
    rows_html: String,
}

/// How a column stands.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Align {
    /// Words.
    Left,
    /// Words that must not be parted: a sign and its figure.
    Whole,
    /// Figures.
    Right,
}

impl Table {
    /// An empty table; the caption is read by all and may be empty.
    pub(super) fn new(caption: &str, columns: &[(&'static str, Align)]) -> Self {
        Self {
            caption: caption.to_owned(),
            columns: columns.to_vec(),
            rows_html: String::new(),
        }
    }

    /// A row of text cells, the first of which names the row.
    pub(super) fn row(&mut self, cells: &[&str]) {
        self.rows_html.push_str("<tr>");
        for (i, (cell, (_, align))) in cells.iter().zip(&self.columns).enumerate() {
            let (open, close) = if i == 0 {
                ("th scope=\"row\"", "th")
            } else {
                ("td", "td")
            };
            self.rows_html.push_str(&format!(
                "<{open}{}>{}</{close}>",
                align.class(),
                escape(cell)
            ));
        }
        self.rows_html.push_str("</tr>\n");
    }

    /// A line across the table that heads the rows after it; a page break does not part it from them.
    pub(super) fn group(&mut self, heading: &str) {
        let n = self.columns.len();
        if !self.rows_html.is_empty() {
            self.rows_html.push_str("</tbody>\n<tbody>\n");
        }
        self.rows_html.push_str(&format!(
            "<tr class=\"group\"><th colspan=\"{n}\" scope=\"colgroup\">{}</th></tr>\n",
            escape(heading)
        ));
    }

    /// The table; nothing where it has no rows.
    pub(super) fn html(&self) -> String {
        if self.rows_html.is_empty() {
            return String::new();
        }
        let head: String = self
            .columns
            .iter()
            .map(|(name, align)| {
                format!("<th scope=\"col\"{}>{}</th>", align.class(), escape(name))
            })
            .collect();
        let caption = if self.caption.is_empty() {
            String::new()
        } else {
            format!("<caption>{}</caption>\n", escape(&self.caption))
        };
        format!(
            "<div class=\"wide\"><table>\n{caption}<thead><tr>{head}</tr></thead>\n<tbody>\n{}</tbody>\n</table></div>\n",
            self.rows_html
        )
    }
}

impl Align {
    fn class(self) -> &'static str {
        match self {
            Self::Left => "",
            Self::Whole => " class=\"whole\"",
            Self::Right => " class=\"figure\"",
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn nothing_a_user_writes_becomes_markup() {
        assert_eq!(
            escape("<a href=\"x\">'&'"),
            "&lt;a href=&quot;x&quot;&gt;&#39;&amp;&#39;"
        );
        assert_eq!(escape("a\u{0}b\nc"), "a\u{fffd}b\nc");
        let mut table = Table::new("<i>", &[("x", Align::Left)]);
        table.row(&["<b>"]);
        assert!(
            !table.html().contains("<b>") && !table.html().contains("<i>"),
            "{}",
            table.html()
        );
    }

    #[test]
    fn an_empty_table_or_section_leaves_no_heading() {
        assert_eq!(section("Warnings", &Table::new("", &[]).html()), "");
    }
}
