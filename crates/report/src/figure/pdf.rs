//! Figures as PDF: vectors, with the letters of the standard fonts Helvetica and Symbol, which every reader has and no
//! file needs to carry.

use super::colours::Colour;
use super::scene::{Anchor, Figure, Mark, Stroke};
use pdf_writer::types::LineCapStyle;
use pdf_writer::{Content, Finish, Name, Pdf, Rect, Ref, Str, TextStr};

/// CSS pixels are 1/96 of an inch, PDF's units 1/72.
const UNIT: f64 = 0.75;

const LETTERS: Name<'static> = Name(b"L");
const SYMBOLS: Name<'static> = Name(b"S");

impl Figure {
    /// A file of one page as large as the figure. Letters beyond Latin and Greek become question marks.
    #[must_use]
    pub fn pdf(&self) -> Vec<u8> {
        let mut ids = (1..).map(Ref::new);
        let mut id = || ids.next().unwrap_or(Ref::new(1));
        let (catalog, pages, page, contents, letters, symbols, about) =
            (id(), id(), id(), id(), id(), id(), id());
        let mut canvas = Canvas { content: Content::new(), height: self.height, opacities: Vec::new() };
        self.marks.iter().for_each(|mark| canvas.draw(mark));
        let mut pdf = Pdf::new();
        pdf.document_info(about).title(TextStr(&self.title)).subject(TextStr(&self.description));
        pdf.catalog(catalog).pages(pages);
        pdf.pages(pages).kids([page]).count(1);
        let states: Vec<(String, Ref, f64)> = canvas
            .opacities
            .iter()
            .enumerate()
            .map(|(n, &opacity)| (format!("O{n}"), id(), opacity))
            .collect();
        let mut sheet = pdf.page(page);
        sheet.media_box(Rect::new(0.0, 0.0, (self.width * UNIT) as f32, (self.height * UNIT) as f32));
        sheet.parent(pages).contents(contents);
        let mut resources = sheet.resources();
        resources.fonts().pair(LETTERS, letters).pair(SYMBOLS, symbols);
        let mut dictionary = resources.ext_g_states();
        for (name, state, _) in &states {
            dictionary.pair(Name(name.as_bytes()), *state);
        }
        dictionary.finish();
        resources.finish();
        sheet.finish();
        pdf.type1_font(letters).base_font(Name(b"Helvetica")).encoding_predefined(Name(b"WinAnsiEncoding"));
        pdf.type1_font(symbols).base_font(Name(b"Symbol"));
        for (_, state, opacity) in states {
            pdf.ext_graphics(state).non_stroking_alpha(opacity as f32);
        }
        pdf.stream(contents, &canvas.content.finish());
        pdf.finish()
    }
}

struct Canvas {
    content: Content,
    height: f64,
    opacities: Vec<f64>,
}

impl Canvas {
    fn place(&self, (x, y): (f64, f64)) -> (f32, f32) {
        ((x * UNIT) as f32, ((self.height - y) * UNIT) as f32)
    }

    fn path(&mut self, points: &[(f64, f64)]) {
        for (index, &point) in points.iter().enumerate() {
            let (x, y) = self.place(point);
            if index == 0 {
                self.content.move_to(x, y)
            } else {
                self.content.line_to(x, y)
            };
        }
    }

    fn pen(&mut self, Stroke { colour, width, dash }: &Stroke) {
        let [red, green, blue] = shares(*colour);
        self.content.set_stroke_rgb(red, green, blue).set_line_width((width * UNIT) as f32);
        self.content.set_line_cap(LineCapStyle::ButtCap);
        self.content.set_dash_pattern(dash.lengths().iter().map(|length| (length * UNIT) as f32), 0.0);
    }

    fn brush(&mut self, colour: Colour) {
        let [red, green, blue] = shares(colour);
        self.content.set_fill_rgb(red, green, blue);
    }

    fn draw(&mut self, mark: &Mark) {
        match mark {
            Mark::Line { points, stroke } => {
                self.pen(stroke);
                self.path(points);
                self.content.stroke();
            }
            Mark::Segments { segments, stroke } => {
                self.pen(stroke);
                segments.iter().for_each(|segment| self.path(segment));
                self.content.stroke();
            }
            Mark::Area { points, fill, opacity } => {
                self.content.save_state();
                if *opacity < 1.0 {
                    let known = self.opacities.iter().position(|known| known == opacity);
                    let index = known.unwrap_or_else(|| {
                        self.opacities.push(*opacity);
                        self.opacities.len() - 1
                    });
                    self.content.set_parameters(Name(format!("O{index}").as_bytes()));
                }
                self.brush(*fill);
                self.path(points);
                self.content.close_path().fill_nonzero().restore_state();
            }
            Mark::Symbol { at: (x, y), radius, shape, colour } => {
                self.brush(*colour);
                let corners = shape.corners(*radius).unwrap_or_else(|| disc(*radius));
                let corners: Vec<(f64, f64)> = corners.into_iter().map(|(dx, dy)| (x + dx, y + dy)).collect();
                self.path(&corners);
                self.content.close_path().fill_nonzero();
            }
            Mark::Words { at, text, size, anchor, colour, upright } => {
                self.words(*at, text, (*size, *anchor, *colour, *upright));
            }
            Mark::Group { marks, .. } => marks.iter().for_each(|mark| self.draw(mark)),
        }
    }

    fn words(&mut self, at: (f64, f64), text: &str, style: (f64, Anchor, Colour, bool)) {
        let (size, anchor, colour, upright) = style;
        let letters: Vec<Letter> = text.chars().map(letter).collect();
        let width: f64 = letters.iter().map(|letter| letter.width).sum::<f64>() * size;
        let back = match anchor {
            Anchor::Start => 0.0,
            Anchor::Middle => 0.5 * width,
            Anchor::End => width,
        };
        let start = if upright { (at.0 - back, at.1) } else { (at.0, at.1 + back) };
        let (x, y) = self.place(start);
        self.brush(colour);
        self.content.begin_text();
        let matrix = if upright { [1.0, 0.0, 0.0, 1.0, x, y] } else { [0.0, 1.0, -1.0, 0.0, x, y] };
        self.content.set_text_matrix(matrix);
        // Runs of letters of one font.
        let mut rest = &letters[..];
        while let Some(first) = rest.first() {
            let length = rest.iter().take_while(|letter| letter.greek == first.greek).count();
            let bytes: Vec<u8> = rest[..length].iter().map(|letter| letter.code).collect();
            self.content.set_font(if first.greek { SYMBOLS } else { LETTERS }, (size * UNIT) as f32);
            self.content.show(Str(&bytes));
            rest = &rest[length..];
        }
        self.content.end_text();
    }
}

fn shares(Colour(red, green, blue): Colour) -> [f32; 3] {
    [red, green, blue].map(|part| f32::from(part) / 255.0)
}

/// A disc as a polygon that no eye tells from one.
fn disc(radius: f64) -> Vec<(f64, f64)> {
    (0..24)
        .map(|part| (f64::from(part) / 24.0 * std::f64::consts::TAU).sin_cos())
        .map(|(sine, cosine)| (radius * cosine, radius * sine))
        .collect()
}

/// A letter in one of the two fonts, with its width as a share of the size.
#[derive(Clone, Copy)]
struct Letter {
    greek: bool,
    code: u8,
    width: f64,
}

/// Widths of Helvetica's letters from space to tilde, in thousandths (Adobe Font Metrics of the 14 standard fonts).
const WIDTHS: [u16; 95] = [
    278, 278, 355, 556, 556, 889, 667, 191, 333, 333, 389, 584, 278, 333, 278, 278, 556, 556, 556, 556, 556,
    556, 556, 556, 556, 556, 278, 278, 584, 584, 584, 556, 1015, 667, 667, 722, 722, 667, 611, 778, 722, 278,
    500, 667, 556, 833, 722, 778, 667, 778, 722, 667, 611, 722, 667, 944, 667, 667, 611, 278, 278, 278, 469,
    556, 333, 556, 556, 500, 556, 556, 278, 556, 556, 222, 222, 500, 222, 833, 556, 556, 556, 556, 333, 500,
    278, 556, 500, 722, 500, 500, 500, 334, 260, 334, 584,
];

fn letter(letter: char) -> Letter {
    let thousandths = |greek, code, width: u16| Letter { greek, code, width: f64::from(width) / 1000.0 };
    match letter {
        ' '..='~' => {
            let code = letter as u8;
            thousandths(false, code, WIDTHS[usize::from(code - b' ')])
        }
        '±' | '·' | '²' | '³' | '°' => {
            let width = if letter == '±' { 584 } else { 333 };
            thousandths(false, letter as u32 as u8, width)
        }
        'à'..='ÿ' => thousandths(false, letter as u32 as u8, 556),
        'À'..='Þ' => thousandths(false, letter as u32 as u8, 667),
        '–' => thousandths(false, 0x96, 556),
        '…' => thousandths(false, 0x85, 1000),
        'ℓ' => thousandths(false, b'l', 222),
        '−' => thousandths(true, 0x2d, 549),
        '→' => thousandths(true, 0xae, 987),
        'α' => thousandths(true, b'a', 631),
        'β' => thousandths(true, b'b', 549),
        'χ' => thousandths(true, b'c', 549),
        'δ' => thousandths(true, b'd', 494),
        'Δ' => thousandths(true, b'D', 612),
        'γ' => thousandths(true, b'g', 411),
        'λ' => thousandths(true, b'l', 549),
        'μ' => thousandths(true, b'm', 576),
        'ξ' => thousandths(true, b'x', 493),
        'ρ' => thousandths(true, b'r', 549),
        'σ' => thousandths(true, b's', 603),
        'τ' => thousandths(true, b't', 439),
        'Ω' => thousandths(true, b'W', 768),
        _ => thousandths(false, b'?', 556),
    }
}

#[cfg(test)]
mod tests {
    use super::super::colours::INK;
    use super::super::scene::Dash;
    use super::*;

    #[test]
    fn a_figure_is_a_complete_file() {
        let marks = vec![
            Mark::line(vec![(0.0, 0.0), (100.0, 50.0)], Stroke::solid(INK, 1.0).dashed(Dash::Long)),
            Mark::Area { points: vec![(0.0, 0.0), (9.0, 0.0), (9.0, 9.0)], fill: INK, opacity: 0.25 },
            Mark::words((50.0, 20.0), "τ = −1.5 ± 2 (Ωm)", 12.0, Anchor::Middle, INK),
        ];
        let figure = Figure {
            name: "a".to_owned(),
            title: "τ".to_owned(),
            description: "one".to_owned(),
            width: 100.0,
            height: 50.0,
            marks,
        };
        let bytes = figure.pdf();
        let text = String::from_utf8_lossy(&bytes);
        assert!(text.starts_with("%PDF-") && text.trim_end().ends_with("%%EOF"), "{text}");
        for expected in ["/MediaBox [0 0 75 37.5]", "/BaseFont /Symbol", "/O0 gs", "[5.25 3] 0 d", "/ca 0.25"]
        {
            assert!(text.contains(expected), "{expected} is missing in {text}");
        }
        // τ is the letter t of the font Symbol.
        assert!(text.contains("/S 9 Tf\n(t) Tj"), "{text}");
    }
}
