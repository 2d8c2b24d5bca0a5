//! The page's own colours. A test holds them to what is promised: apart for readers who see no red, no green or no blue,
//! apart in grey print, and readable on paper.

/// Red, green and blue of sRGB.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) struct Colour(pub(crate) u8, pub(crate) u8, pub(crate) u8);

/// What everything stands on.
pub(crate) const PAPER: Colour = Colour(0xff, 0xff, 0xff);
/// A field of its own on the paper.
pub(crate) const FIELD: Colour = Colour(0xf5, 0xf2, 0xef);
/// Text, and what was measured.
pub(crate) const INK: Colour = Colour(0x1c, 0x19, 0x1f);
/// Text that can be read over.
pub(crate) const MUTED: Colour = Colour(0x56, 0x50, 0x5c);
/// Axes and frames.
pub(crate) const AXIS: Colour = Colour(0x86, 0x80, 0x8c);
/// Faint lines across a plot.
pub(crate) const GRID: Colour = Colour(0xe6, 0xe2, 0xe8);
/// What was fitted: the posterior.
pub(crate) const BAND: Colour = CATEGORIES[1];
/// General relativity, always dashed too.
pub(crate) const RELATIVITY: Colour = CATEGORIES[2];
/// What must be looked at.
pub(crate) const ALARM: Colour = Colour(0x8f, 0x12, 0x12);

/// Colours of categories, from dark to light.
pub(crate) const CATEGORIES: [Colour; 6] = [
    Colour(0x51, 0x00, 0x0c),
    Colour(0x39, 0x1a, 0x7e),
    Colour(0x96, 0x30, 0x00),
    Colour(0x74, 0x51, 0xb6),
    Colour(0xcd, 0x57, 0x81),
    Colour(0x00, 0x97, 0xe4),
];

impl Colour {
    /// As CSS writes it.
    pub(crate) fn css(self) -> String {
        format!("#{:02x}{:02x}{:02x}", self.0, self.1, self.2)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    type Linear = [f64; 3];

    fn linear(Colour(red, green, blue): Colour) -> Linear {
        [red, green, blue].map(|part| {
            let part = f64::from(part) / 255.0;
            if part <= 0.040_45 { part / 12.92 } else { ((part + 0.055) / 1.055).powf(2.4) }
        })
    }

    fn luminance([red, green, blue]: Linear) -> f64 {
        0.2126 * red + 0.7152 * green + 0.0722 * blue
    }

    /// WCAG 2.2's contrast ratio.
    fn contrast(one: Colour, other: Colour) -> f64 {
        let (one, other) = (luminance(linear(one)), luminance(linear(other)));
        (one.max(other) + 0.05) / (one.min(other) + 0.05)
    }

    fn times(matrix: [Linear; 3], vector: Linear) -> Linear {
        matrix.map(|row| row.iter().zip(vector).map(|(entry, part)| entry * part).sum())
    }

    /// Ottosson 2020: OKLab.
    fn oklab(colour: Linear) -> Linear {
        let cones = times(
            [
                [0.412_221_470_8, 0.536_332_536_3, 0.051_445_992_9],
                [0.211_903_498_2, 0.680_699_545_1, 0.107_396_956_6],
                [0.088_302_461_9, 0.281_718_837_6, 0.629_978_700_5],
            ],
            colour,
        );
        times(
            [
                [0.210_454_255_3, 0.793_617_785_0, -0.004_072_046_8],
                [1.977_998_495_1, -2.428_592_205_0, 0.450_593_709_9],
                [0.025_904_037_1, 0.782_771_766_2, -0.808_675_766_0],
            ],
            cones.map(f64::cbrt),
        )
    }

    /// Machado, Oliveira & Fernandes 2009 (IEEE Trans. Vis. Comput. Graph. 15, 1291), severity 1, for linear RGB: no red
    /// cones, no green ones, no blue ones.
    const DEFICIENCIES: [(&str, [Linear; 3]); 4] = [
        ("none", [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]]),
        (
            "protanopia",
            [
                [0.152_286, 1.052_583, -0.204_868],
                [0.114_503, 0.786_281, 0.099_216],
                [-0.003_882, -0.048_116, 1.051_998],
            ],
        ),
        (
            "deuteranopia",
            [
                [0.367_322, 0.860_646, -0.227_968],
                [0.280_085, 0.672_501, 0.047_413],
                [-0.011_820, 0.042_940, 0.968_881],
            ],
        ),
        (
            "tritanopia",
            [
                [1.255_528, -0.076_749, -0.178_779],
                [-0.078_411, 0.930_809, 0.147_602],
                [0.004_733, 0.691_367, 0.303_900],
            ],
        ),
    ];

    /// Distances in OKLab: 0.02 is just noticed side by side; 0.1 is told apart in a legend.
    #[test]
    fn categories_are_apart_whatever_cones_a_reader_has() {
        for (deficiency, matrix) in DEFICIENCIES {
            let seen = CATEGORIES
                .map(|colour| oklab(times(matrix, linear(colour)).map(|part| part.clamp(0.0, 1.0))));
            for (i, one) in seen.iter().enumerate() {
                for (j, other) in seen.iter().enumerate().skip(i + 1) {
                    let apart =
                        one.iter().zip(other).map(|(one, other)| (one - other).powi(2)).sum::<f64>().sqrt();
                    assert!(apart > 0.11, "{deficiency}: {i} and {j} are {apart:.3} apart");
                }
            }
        }
    }

    /// CIE 1976 lightness, 0 to 100, which is all that grey print leaves: neighbours are five or more apart.
    #[test]
    fn categories_are_apart_in_grey_print() {
        let lightness = CATEGORIES.map(|colour| 116.0 * luminance(linear(colour)).cbrt() - 16.0);
        for pair in lightness.windows(2) {
            assert!(pair[1] - pair[0] > 5.0, "{lightness:?}");
        }
    }

    /// WCAG 2.2: 4.5 for text (1.4.3 AA), 3 for what must be seen in graphics (1.4.11 AA).
    #[test]
    fn contrast_suffices_on_paper_and_on_fields() {
        for background in [PAPER, FIELD] {
            for text in [INK, MUTED, ALARM, BAND, RELATIVITY] {
                assert!(contrast(text, background) > 4.5, "{text:?} on {background:?}");
            }
        }
        for graphic in CATEGORIES.into_iter().chain([AXIS]) {
            assert!(contrast(graphic, PAPER) > 3.0, "{graphic:?}");
        }
        assert!(contrast(PAPER, ALARM) > 4.5 && contrast(PAPER, BAND) > 4.5);
        // The formula itself: black on white is 21 by definition.
        assert!((contrast(Colour(0, 0, 0), PAPER) - 21.0).abs() < 1e-9);
    }
}
