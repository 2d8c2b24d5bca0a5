//! Figures as SVG.

use super::colours::Colour;
use super::scene::{Anchor, Dash, Figure, Mark, Stroke};
use std::fmt::Write;

/// Letters that every system has; figures must not ask for a font from elsewhere.
const FONT: &str = "Helvetica,Arial,'Liberation Sans','DejaVu Sans',sans-serif";

impl Figure {
    /// A file of its own.
    #[must_use]
    pub fn svg(&self) -> String {
        format!("<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n{}\n", self.element(&self.name, &[]))
    }

    /// The element, for a page: `id` must be unique there; `attributes` are added to it.
    pub(crate) fn element(&self, id: &str, attributes: &[(&str, &str)]) -> String {
        let Figure { width, height, .. } = self;
        let (width, height) = (number(*width), number(*height));
        let mut out = format!(
            "<svg xmlns=\"http://www.w3.org/2000/svg\" viewBox=\"0 0 {width} {height}\" width=\"{width}\" height=\"{height}\" \
             role=\"img\" aria-labelledby=\"{id}-t {id}-d\" font-family=\"{FONT}\""
        );
        for (name, value) in attributes {
            let _ = write!(out, " {name}=\"{}\"", escaped(value));
        }
        let (title, description) = (escaped(&self.title), escaped(&self.description));
        let _ = write!(out, "><title id=\"{id}-t\">{title}</title><desc id=\"{id}-d\">{description}</desc>");
        self.marks.iter().for_each(|mark| write_mark(&mut out, mark));
        out.push_str("</svg>");
        out
    }
}

/// Text for an element or an attribute.
fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for letter in text.chars() {
        match letter {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            // Not allowed in XML at all.
            control if control.is_control() && !matches!(control, '\n' | '\t') => out.push(' '),
            other => out.push(other),
        }
    }
    out
}

/// A tenth of a pixel is finer than anybody sees.
fn number(value: f64) -> String {
    let text = format!("{value:.1}");
    text.strip_suffix(".0").map_or_else(|| text.clone(), str::to_owned)
}

fn colour(colour: Colour) -> String {
    let Colour(red, green, blue) = colour;
    format!("#{red:02x}{green:02x}{blue:02x}")
}

fn points(out: &mut String, points: &[(f64, f64)]) {
    for (index, (x, y)) in points.iter().enumerate() {
        let _ = write!(out, "{}{},{}", if index > 0 { " " } else { "" }, number(*x), number(*y));
    }
}

/// The end of an element that is a line.
fn pen(out: &mut String, Stroke { colour: ink, width, dash }: &Stroke) {
    let _ = write!(out, " fill=\"none\" stroke=\"{}\" stroke-width=\"{}\"", colour(*ink), number(*width));
    if *dash != Dash::Solid {
        let lengths: Vec<String> = dash.lengths().iter().map(|length| number(*length)).collect();
        let _ = write!(out, " stroke-dasharray=\"{}\"", lengths.join(" "));
    }
    out.push_str("/>");
}

fn write_mark(out: &mut String, mark: &Mark) {
    match mark {
        Mark::Line { points: at, stroke } => {
            out.push_str("<polyline points=\"");
            points(out, at);
            out.push('"');
            pen(out, stroke);
        }
        Mark::Segments { segments, stroke } => {
            out.push_str("<path d=\"");
            for [(x, y), (to_x, to_y)] in segments {
                let _ = write!(out, "M{} {}L{} {}", number(*x), number(*y), number(*to_x), number(*to_y));
            }
            out.push('"');
            pen(out, stroke);
        }
        Mark::Area { points: at, fill, opacity } => {
            out.push_str("<polygon points=\"");
            points(out, at);
            let _ = write!(out, "\" fill=\"{}\"", colour(*fill));
            if *opacity < 1.0 {
                let _ = write!(out, " fill-opacity=\"{opacity}\"");
            }
            out.push_str("/>");
        }
        Mark::Symbol { at: (x, y), radius, shape, colour: ink } => match shape.corners(*radius) {
            None => {
                let (x, y, r) = (number(*x), number(*y), number(*radius));
                let _ = write!(out, "<circle cx=\"{x}\" cy=\"{y}\" r=\"{r}\" fill=\"{}\"/>", colour(*ink));
            }
            Some(corners) => {
                let corners: Vec<(f64, f64)> = corners.into_iter().map(|(dx, dy)| (x + dx, y + dy)).collect();
                out.push_str("<polygon points=\"");
                points(out, &corners);
                let _ = write!(out, "\" fill=\"{}\"/>", colour(*ink));
            }
        },
        Mark::Words { at: (x, y), text, size, anchor, colour: ink, upright } => {
            let (x, y) = (number(*x), number(*y));
            let anchor = match anchor {
                Anchor::Start => "",
                Anchor::Middle => " text-anchor=\"middle\"",
                Anchor::End => " text-anchor=\"end\"",
            };
            let turn = if *upright { String::new() } else { format!(" transform=\"rotate(-90 {x} {y})\"") };
            let (size, text) = (number(*size), escaped(text));
            let _ = write!(
                out,
                "<text x=\"{x}\" y=\"{y}\" font-size=\"{size}\" fill=\"{}\"{anchor}{turn}>{text}</text>",
                colour(*ink)
            );
        }
        Mark::Group { keys, tip, marks } => {
            out.push_str("<g");
            if !keys.is_empty() {
                let _ = write!(out, " data-key=\"{}\"", escaped(&keys.join(" ")));
            }
            out.push('>');
            if let Some(tip) = tip {
                let _ = write!(out, "<title>{}</title>", escaped(tip));
            }
            marks.iter().for_each(|mark| write_mark(out, mark));
            out.push_str("</g>");
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::colours::INK;
    use super::*;

    #[test]
    fn names_from_a_study_cannot_break_out() {
        let words = Mark::words((1.0, 2.25), "<script>\"&", 10.0, Anchor::End, INK);
        let figure = Figure {
            name: "a".to_owned(),
            title: "a < b".to_owned(),
            description: "τ = 1 & no more".to_owned(),
            width: 10.0,
            height: 5.0,
            marks: vec![Mark::about(&["x\"y"], "<b>", vec![words])],
        };
        let svg = figure.svg();
        assert!(svg.contains("data-key=\"x&quot;y\"><title>&lt;b&gt;</title>"), "{svg}");
        assert!(svg.contains(">&lt;script&gt;&quot;&amp;</text>"), "{svg}");
        assert!(!svg.contains("<script"), "{svg}");
    }
}
