//! The publications behind the methods, to cite and to check against.

/// One publication.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Reference {
    /// Key in the BibTeX file.
    pub key: &'static str,
    /// As BibTeX separates them: `Last, First and Last, First`; initials, and `others` where there are many.
    pub authors: &'static str,
    /// Year.
    pub year: u16,
    /// Journal, or publisher of a book.
    pub journal: &'static str,
    /// Volume; empty for a book.
    pub volume: &'static str,
    /// First page or article number; empty for a book.
    pub page: &'static str,
    /// What it is used for here.
    pub used_for: &'static str,
}

macro_rules! reference {
    ($key:literal, $authors:literal, $year:literal, $journal:literal, $volume:literal, $page:literal, $for:literal) => {
        Reference {
            key: $key,
            authors: $authors,
            year: $year,
            journal: $journal,
            volume: $volume,
            page: $page,
            used_for: $for,
        }
    };
}

/// Every publication, by what it is used for.
#[must_use]
pub fn references() -> &'static [Reference] {
    const ALL: &[Reference] = &[
        reference!(
            "McDonald2009",
            "McDonald, P.",
            2009,
            "JCAP",
            "11",
            "026",
            "odd multipoles of two tracers"
        ),
        reference!(
            "Yoo2010",
            "Yoo, J.",
            2010,
            "Phys. Rev. D",
            "82",
            "083508",
            "counts of galaxies to first order"
        ),
        reference!(
            "ChallinorLewis2011",
            "Challinor, A. and Lewis, A.",
            2011,
            "Phys. Rev. D",
            "84",
            "043516",
            "counts of galaxies to first order"
        ),
        reference!(
            "Jeong2012",
            "Jeong, D. and Schmidt, F. and Hirata, C. M.",
            2012,
            "Phys. Rev. D",
            "85",
            "023504",
            "counts of galaxies to first order"
        ),
        reference!(
            "Kaiser1987",
            "Kaiser, N.",
            1987,
            "Mon. Not. R. Astron. Soc.",
            "227",
            "1",
            "redshift-space distortions"
        ),
        reference!(
            "Hamilton1992",
            "Hamilton, A. J. S.",
            1992,
            "Astrophys. J.",
            "385",
            "L5",
            "even multipoles"
        ),
        reference!(
            "Breton2019",
            "Breton, M.-A. and others",
            2019,
            "Mon. Not. R. Astron. Soc.",
            "483",
            "2671",
            "wells of haloes in the dipole: the offset"
        ),
        reference!(
            "Saga2020",
            "Saga, S. and others",
            2020,
            "Mon. Not. R. Astron. Soc.",
            "498",
            "981",
            "wells of haloes in the dipole: the offset"
        ),
        reference!(
            "Szalay1998",
            "Szalay, A. S. and Matsubara, T. and Landy, S. D.",
            1998,
            "Astrophys. J.",
            "498",
            "L1",
            "wide angles"
        ),
        reference!(
            "Reimberg2016",
            "Reimberg, P. and Bernardeau, F. and Pitrou, C.",
            2016,
            "JCAP",
            "01",
            "048",
            "wide angles"
        ),
        reference!(
            "AlcockPaczynski1979",
            "Alcock, C. and Paczynski, B.",
            1979,
            "Nature",
            "281",
            "358",
            "geometric remapping"
        ),
        reference!(
            "EisensteinHu1998",
            "Eisenstein, D. J. and Hu, W.",
            1998,
            "Astrophys. J.",
            "496",
            "605",
            "transfer function"
        ),
        reference!("Hogg1999", "Hogg, D. W.", 1999, "arXiv", "astro-ph", "9905116", "distances"),
        reference!("Linder2005", "Linder, E. V.", 2005, "Phys. Rev. D", "72", "043529", "growth index"),
        reference!(
            "KoyamaMaartens2006",
            "Koyama, K. and Maartens, R.",
            2006,
            "JCAP",
            "01",
            "016",
            "braneworld departure"
        ),
        reference!(
            "HuSawicki2007",
            "Hu, W. and Sawicki, I.",
            2007,
            "Phys. Rev. D",
            "76",
            "064004",
            "f(R) departure"
        ),
        reference!(
            "Hartlap2007",
            "Hartlap, J. and Simon, P. and Schneider, P.",
            2007,
            "Astron. Astrophys.",
            "464",
            "399",
            "covariances from mocks"
        ),
        reference!(
            "SellentinHeavens2016",
            "Sellentin, E. and Heavens, A. F.",
            2016,
            "Mon. Not. R. Astron. Soc.",
            "456",
            "L132",
            "covariances from mocks"
        ),
        reference!(
            "Percival2022",
            "Percival, W. J. and others",
            2022,
            "Mon. Not. R. Astron. Soc.",
            "510",
            "3207",
            "covariances from mocks"
        ),
        reference!(
            "GoodmanWeare2010",
            "Goodman, J. and Weare, J.",
            2010,
            "Commun. Appl. Math. Comput. Sci.",
            "5",
            "65",
            "sampling"
        ),
        reference!("terBraak2006", "ter Braak, C. J. F.", 2006, "Stat. Comput.", "16", "239", "sampling"),
        reference!(
            "terBraakVrugt2008",
            "ter Braak, C. J. F. and Vrugt, J. A.",
            2008,
            "Stat. Comput.",
            "18",
            "435",
            "sampling"
        ),
        reference!(
            "Vehtari2021",
            "Vehtari, A. and Gelman, A. and Simpson, D. and Carpenter, B. and B{\\\"u}rkner, P.-C.",
            2021,
            "Bayesian Anal.",
            "16",
            "667",
            "convergence"
        ),
        reference!(
            "Sokal1997",
            "Sokal, A.",
            1997,
            "in Functional Integration, NATO ASI Ser. B",
            "361",
            "131",
            "autocorrelation times"
        ),
        reference!(
            "Gelman1996",
            "Gelman, A. and Meng, X.-L. and Stern, H.",
            1996,
            "Stat. Sin.",
            "6",
            "733",
            "posterior-predictive checks"
        ),
        reference!(
            "Silverman1986",
            "Silverman, B. W.",
            1986,
            "Chapman and Hall",
            "",
            "",
            "densities of draws"
        ),
        reference!(
            "GrattonChallinor2020",
            "Gratton, S. and Challinor, A.",
            2020,
            "Mon. Not. R. Astron. Soc.",
            "499",
            "3410",
            "scatter of nested subsets of data"
        ),
        reference!(
            "Skilling2006",
            "Skilling, J.",
            2006,
            "Bayesian Anal.",
            "1",
            "833",
            "evidence by nested sampling"
        ),
        reference!(
            "Xie2011",
            "Xie, W. and Lewis, P. O. and Fan, Y. and Kuo, L. and Chen, M.-H.",
            2011,
            "Syst. Biol.",
            "60",
            "150",
            "evidence by stepping stones"
        ),
        reference!(
            "Dickey1971",
            "Dickey, J. M.",
            1971,
            "Ann. Math. Stat.",
            "42",
            "204",
            "ratio of densities"
        ),
        reference!(
            "Muir2020",
            "Muir, J. and others",
            2020,
            "Mon. Not. R. Astron. Soc.",
            "494",
            "4454",
            "blinding of measurements"
        ),
    ];
    ALL
}

impl Reference {
    /// Authors and year, as a text cites them.
    #[must_use]
    pub fn cited(&self) -> String {
        let names: Vec<&str> =
            self.authors.split(" and ").map(|author| author.split(',').next().unwrap_or(author)).collect();
        let names: Vec<String> = names.into_iter().map(|name| name.replace("{\\\"u}", "ü")).collect();
        let who = match &names[..] {
            [only] => only.clone(),
            [first, second] if second != "others" => format!("{first} & {second}"),
            [first, second, third] => format!("{first}, {second} & {third}"),
            [first, ..] => format!("{first} et al."),
            [] => String::new(),
        };
        format!("{who} {}", self.year)
    }

    /// Journal, volume and page.
    #[must_use]
    pub fn place(&self) -> String {
        let parts = [self.journal, self.volume, self.page];
        parts.into_iter().filter(|part| !part.is_empty()).collect::<Vec<_>>().join(" ")
    }
}

/// All references as a BibTeX file. Titles are left out: journal, volume and page find the publication.
#[must_use]
pub fn bibliography() -> String {
    let mut out = String::from(
        "% The publications behind the methods of oddwell. What each is used for is its note.\n",
    );
    for Reference { key, authors, year, journal, volume, page, used_for } in references() {
        let book = volume.is_empty();
        let (kind, place) = if book { ("book", "publisher") } else { ("article", "journal") };
        out.push_str(&format!("\n@{kind}{{{key},\n  author = {{{authors}}},\n  year = {{{year}}},\n"));
        out.push_str(&format!("  {place} = {{{journal}}},\n"));
        for (field, value) in [("volume", volume), ("pages", page)] {
            if !value.is_empty() {
                out.push_str(&format!("  {field} = {{{value}}},\n"));
            }
        }
        out.push_str(&format!("  note = {{{used_for}}}\n}}\n"));
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn keys_are_unique_and_braces_close() {
        let mut keys: Vec<&str> = references().iter().map(|reference| reference.key).collect();
        keys.sort_unstable();
        keys.dedup();
        assert_eq!(keys.len(), references().len());
        let text = bibliography();
        assert_eq!(text.matches('{').count(), text.matches('}').count());
        assert_eq!(text.matches("\n@").count(), references().len());
    }

    #[test]
    fn citations_read_as_in_a_text() {
        let cited = |key: &str| {
            references()
                .iter()
                .find(|reference| reference.key == key)
                .map(Reference::cited)
                .unwrap_or_default()
        };
        assert_eq!(cited("Yoo2010"), "Yoo 2010");
        assert_eq!(cited("HuSawicki2007"), "Hu & Sawicki 2007");
        assert_eq!(cited("Jeong2012"), "Jeong, Schmidt & Hirata 2012");
        assert_eq!(cited("Saga2020"), "Saga et al. 2020");
        assert_eq!(cited("Vehtari2021"), "Vehtari et al. 2021");
    }
}
