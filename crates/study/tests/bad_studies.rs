//! A table of studies with something wrong, each with the whole message.
//!
//! Lines and columns are those of the base study in `common` after the change.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

mod common;

use common::{BASE, changed, resolve};

struct Bad {
    about: &'static str,
    text: String,
    set: &'static [&'static str],
    message: &'static str,
}

fn bad(about: &'static str, from: &str, to: &str, message: &'static str) -> Bad {
    Bad { about, text: changed(from, to), set: &[], message }
}

impl Bad {
    /// Another change of the text.
    fn and(self, from: &str, to: &str) -> Bad {
        assert_eq!(self.text.matches(from).count(), 1, "`{from}` must stand in the study exactly once");
        Bad { text: self.text.replacen(from, to, 1), ..self }
    }
}

fn bad_set(about: &'static str, set: &'static [&'static str], message: &'static str) -> Bad {
    Bad { about, text: BASE.to_owned(), set, message }
}

fn table() -> Vec<Bad> {
    vec![
        bad("not TOML", "h = 0.68", "h = = 0.68", "study.toml:6:5: not valid TOML: extra `=`, expected nothing; see the study file's language in the README"),
        bad("key given twice", "h = 0.68", "h = 0.68\nh = 0.7", "study.toml:7:1: not valid TOML: duplicate key; see the study file's language in the README"),
        bad("unknown key, a slip", "sigma8 =", "sigma9 =", "study.toml:8:1: `sigma9` is not a key of [background]; did you mean `sigma8`?"),
        bad("unknown key, far from all", "n_s = 0.965", "n_s = 0.965\ntemperature = 2.7", "study.toml:8:1: `temperature` is not a key of [background]; known: `omega_m`, `omega_b`, `h`, `n_s`, `sigma8`, `omega_k`, `w0`, `wa`, `power`"),
        bad("unknown section", "[sampling]", "[samplng]", "study.toml:47:2: `samplng` is not a key of the study file; did you mean `sampling`?"),
        bad("unknown key of a tracer", "label = \"faint\", bias", "labl = \"faint\", bias", "study.toml:24:12: `labl` is not a key of `second` of [[survey.bin]]; did you mean `label`?"),
        bad("unknown key of keep", "multipoles = [1, 3]", "multipole = [1, 3]", "study.toml:17:39: `multipole` is not a key of an entry of `keep`; did you mean `multipoles`?"),
        bad("missing key", "omega_b = 0.049\n", "", "study.toml:3:1: [background] needs `omega_b`; add `omega_b = 0.049`, or a prior, as in `omega_b = { normal = [0.049, SD] }`"),
        bad("missing section", "[background]", "[beckground]", "study.toml:3:2: `beckground` is not a key of the study file; did you mean `background`?"),
        bad("section in the wrong form", "[prediction]\ndamping = 0.5", "[[prediction]]\ndamping = 0.5\n[[prediction]]", "study.toml:10:1: `prediction` must be a table, not several tables; write `prediction = { wide_angle = true }`"),
        bad("number for a list of tables", "[[systematic]]\nname = \"luminosity-function\"\namplitude = { normal = [0.0, 1.0] }\nmoves = [{ quantity = \"larkfield.*.second.evolution\", by = 0.3 }]\n", "", "study.toml:1:14: `systematic` must be a list of tables, not the number 3; write `systematic = [{ name = \"…\" }]`").and("title =", "systematic = 3\ntitle ="),
        bad("no bin", "[[survey]]\nname = \"larkfield\"", "[[survey]]\nname = \"empty\"\nmultipoles = \"m.csv\"\n\n[[survey]]\nname = \"larkfield\"", "study.toml:14:8: survey `empty` has no bin; add a [[survey.bin]] below it"),
        bad("survey twice", "[[survey]]\nname = \"larkfield\"", "[[survey]]\nname = \"larkfield\"\nmultipoles = \"m.csv\"\nbin = [{ name = \"one\", redshift = 0.2, first = { bias = 1, magnification = 0, evolution = 0 }, second = { bias = 2, magnification = 0, evolution = 0 } }]\n\n[[survey]]\nname = \"larkfield\"", "study.toml:19:8: the survey name `larkfield` is given twice, first on line 14; rename one of the two"),
        bad("several things at once", "h = 0.68", "h = \"0.68\"", concat!("study.toml:6:5: `h` must be a number (held) or a prior (inferred), not the text \"0.68\"; write `h = NUMBER` or `h = { normal = [MEAN, SD] }`\n", "study.toml:21:12: `redshift` is NaN; give a finite number\n", "study.toml:43:13: unknown departure `constnt`; did you mean `constant`?\n", "study.toml:49:1: `sead` is not a key of [sampling]; did you mean `seed`?")).and("redshift = 0.35", "redshift = nan").and("departure = \"constant\"", "departure = \"constnt\"").and("seed = 1", "sead = 1"),
        bad("missing tracer quantity", "magnification = 0.5, evolution = { normal", "evolution = { normal", "study.toml:23:9: `first` of [[survey.bin]] needs `magnification`; add `magnification = 0.5`, or a prior, as in `magnification = { normal = [0.5, SD] }`"),
        bad("text for a number", "redshift = 0.35", "redshift = \"0.35\"", "study.toml:21:12: `redshift` must be a number, not the text \"0.35\"; write `redshift = 0.35`"),
        bad("prior for a redshift", "redshift = 0.35", "redshift = { normal = [0.35, 0.01] }", "study.toml:21:12: `redshift` must be a number, not the table { normal = [0.35, 0.01] }; write `redshift = 0.35`"),
        bad("text for a quantity", "h = 0.68", "h = \"0.68\"", "study.toml:6:5: `h` must be a number (held) or a prior (inferred), not the text \"0.68\"; write `h = NUMBER` or `h = { normal = [MEAN, SD] }`"),
        bad("number for a text", "title = \"Two invented surveys\"", "title = 3", "study.toml:1:9: `title` must be a text in quotes, not the number 3; write `title = \"My surveys\"`"),
        bad("empty text", "title = \"Two invented surveys\"", "title = \"\"", "study.toml:1:9: `title` must be a text with at least one letter, not empty; fill it in or remove the line"),
        bad("text for a flag", "damping = 0.5", "wide_angle = \"yes\"", "study.toml:11:14: `wide_angle` must be true or false, not the text \"yes\"; write `wide_angle = true`"),
        bad("NaN", "h = 0.68", "h = nan", "study.toml:6:5: `h` is NaN; give a finite number"),
        bad("infinite redshift", "redshift = 0.35", "redshift = inf", "study.toml:21:12: `redshift` is inf; give a finite number"),
        bad("omega_m zero", "omega_m = 0.31", "omega_m = 0", "study.toml:4:11: `background.omega_m` must be above 0, not 0.0; a universe without matter has no structure, as in 0.31"),
        bad("more baryons than matter", "omega_b = 0.049", "omega_b = 0.4", "study.toml:5:11: `background.omega_b` must be below `background.omega_m` = 0.31, not 0.4; baryons are part of matter"),
        bad("h in km/s/Mpc", "h = 0.68", "h = 68.0", "study.toml:6:5: `background.h` must be above 0 and below 10, not 68.0; it is H0 in 100 km/s/Mpc, as in 0.68"),
        bad("sigma8 below zero", "sigma8 = { normal = [0.81, 0.01] }", "sigma8 = -0.8", "study.toml:8:10: `background.sigma8` must be above 0, not -0.8; it is the rms of matter in 8 Mpc/h, as in 0.81"),
        bad("negative damping", "damping = 0.5", "damping = -0.5", "study.toml:11:11: `prediction.damping` must be 0 or above, not -0.5; it is a length in Mpc/h, as in 0.5"),
        bad("negative smearing", "damping = 0.5", "smearing = -3.0", "study.toml:11:12: `prediction.smearing` must be 0 or above, not -3.0; it is a length in Mpc/h, as in 5.0, or 0 for none"),
        bad("inferred clock distance", "damping = 0.5", "clock_distance = { uniform = [1.0, 50.0] }", "study.toml:11:18: `prediction.clock_distance` must be a number, not { uniform = [1.0, 50.0] }; it says what to report and cannot be inferred"),
        bad("redshift zero", "redshift = 0.35", "redshift = 0.0", "study.toml:21:12: `larkfield.near.redshift` must be above 0, not 0.0; give the pair-weighted mean redshift of the bin"),
        bad("two priors in one quantity", "offset = { normal = [0.0, 10.0] }", "offset = { normal = [0.0, 10.0], uniform = [-5.0, 5.0] }", "study.toml:22:44: `offset` has two priors, `normal` and `uniform`; keep one of them"),
        bad("prior without family", "offset = { normal = [0.0, 10.0] }", "offset = { within = [-5.0, 5.0] }", "study.toml:22:10: the prior of `offset` has no family; choose one of `normal`, `uniform`, `log_uniform`, `half_normal`, `beta`, `gamma`, `student_t`"),
        bad("unknown family", "offset = { normal = [0.0, 10.0] }", "offset = { nrmal = [0.0, 10.0] }", "study.toml:22:12: unknown prior family `nrmal`; did you mean `normal`?"),
        bad("wrong number of numbers", "offset = { normal = [0.0, 10.0] }", "offset = { normal = [0.0, 10.0, 1.0] }", "study.toml:22:21: `offset`: normal prior: needs 2 numbers (mean, sd), got 3"),
        bad("prior of text", "offset = { normal = [0.0, 10.0] }", "offset = { normal = \"wide\" }", "study.toml:22:21: `offset`: `normal` takes [mean, sd], not the text \"wide\""),
        bad("sd zero", "offset = { normal = [0.0, 10.0] }", "offset = { normal = [0.0, 0.0] }", "study.toml:22:21: `offset`: normal prior: sd must be above 0, got 0; to hold the quantity, give a plain number"),
        bad("inverted bounds", "tau = { uniform = [-30.0, 30.0] }", "tau = { uniform = [30.0, -30.0] }", "study.toml:45:19: `tau`: uniform prior: low must be below high, got [30, -30]; swap them, or give a plain number to hold the quantity"),
        bad("inverted within", "offset = { normal = [0.0, 10.0] }", "offset = { normal = [0.0, 10.0], within = [5.0, -5.0] }", "study.toml:22:43: `offset`: normal prior: within must have low below high, got [5, -5]; swap them"),
        bad("empty window", "offset = { normal = [0.0, 10.0] }", "offset = { uniform = [0.0, 10.0], within = [20.0, 30.0] }", "study.toml:22:44: `offset`: uniform prior: within = [20, 30] leaves it no probability (its mass there is 0e0, its support [0, 10]); widen the window or move the prior"),
        bad("within of three", "offset = { normal = [0.0, 10.0] }", "offset = { normal = [0.0, 10.0], within = [1.0] }", "study.toml:22:43: `offset`: `within` takes [low, high], not the list [1.0]"),
        bad("within beside a tie", "{ same_as = \"larkfield.near.first.evolution\" }", "{ same_as = \"larkfield.near.first.evolution\", within = [0.0, 1.0] }", "study.toml:29:111: `within` of `evolution` stands beside `same_as`, which is no prior; remove it and bound `larkfield.near.first.evolution` instead"),
        bad("NaN in a prior", "offset = { normal = [0.0, 10.0] }", "offset = { normal = [nan, 10.0] }", "study.toml:22:21: `offset`: normal prior: mean must be a finite number, got NaN"),
        bad("tie to nothing", "same_as = \"larkfield.near.first.evolution\"", "same_as = \"larkfeld.near.first.evolution\"", "study.toml:29:56: `same_as` of `larkfield.far.first.evolution` names `larkfeld.near.first.evolution`, but no quantity has that name; did you mean `larkfield.near.first.evolution`?"),
        bad("tie to itself", "same_as = \"larkfield.near.first.evolution\"", "same_as = \"larkfield.far.first.evolution\"", "study.toml:29:56: `same_as` runs in a circle: larkfield.far.first.evolution -> larkfield.far.first.evolution; give one of them a number or a prior"),
        bad("ties in a circle", "evolution = { normal = [0.0, 0.3] }", "evolution = { same_as = \"larkfield.far.first.evolution\" }", "study.toml:23:74: `same_as` runs in a circle: larkfield.near.first.evolution -> larkfield.far.first.evolution -> larkfield.near.first.evolution; give one of them a number or a prior"),
        bad("survey name with a dot", "name = \"larkfield\"", "name = \"lark.field\"", "study.toml:14:8: the survey name `lark.field` may have only letters, digits, `-` and `_`, since it becomes part of parameter names; rename it"),
        bad("bin name with a space", "name = \"near\"", "name = \"near one\"", "study.toml:20:8: the bin name `near one` may have only letters, digits, `-` and `_`, since it becomes part of parameter names; rename it"),
        bad("reserved survey name", "name = \"larkfield\"", "name = \"departure\"", "study.toml:14:8: the survey name `departure` is taken by oddwell itself; rename it"),
        bad("reserved hypothesis name", "name = \"gr\"", "name = \"all\"", "study.toml:38:8: the hypothesis name `all` is taken by oddwell itself; rename it"),
        bad("bin twice", "name = \"far\"", "name = \"near\"", "study.toml:27:8: the bin name `near` is given twice, first on line 20; rename one of the two"),
        bad("hypothesis twice", "name = \"gr\"", "name = \"constant\"", "study.toml:42:8: the hypothesis name `constant` is given twice, first on line 38; rename one of the two"),
        bad("unknown sight line", "keep =", "sight_line = \"middle\"\nkeep =", "study.toml:17:14: unknown sight line `middle`; known: `first`, `midpoint`, `second`"),
        bad("unknown noise", "keep =", "noise = \"gausian\"\nkeep =", "study.toml:17:9: unknown noise model `gausian`; did you mean `gaussian`?"),
        bad("noise without mock count", "keep =", "noise = \"hartlap\"\nkeep =", "study.toml:17:9: `noise = \"hartlap\"` needs `mock_count` beside it; say how many mocks the covariance was estimated from, give the `mocks` themselves, or choose `noise = \"gaussian\"`"),
        bad("percival without mocks", "keep =", "noise = \"percival\"\nkeep =", "study.toml:17:9: `noise = \"percival\"` needs `mock_count` beside it; say how many mocks the covariance was estimated from, give the `mocks` themselves, or choose `noise = \"gaussian\"`"),
        bad("unknown unit", "keep =", "unit = \"kpc\"\nkeep =", "study.toml:17:8: unknown unit `kpc`; did you mean `Mpc`?"),
        bad("unit with inferred h", "h = 0.68", "h = { normal = [0.68, 0.01] }", "study.toml:17:8: `unit = \"Mpc\"` of survey `larkfield` needs a held `background.h`, but it is inferred; hold it, give `fiducial.h`, or give lengths in Mpc/h").and("keep =", "unit = \"Mpc\"\nkeep ="),
        bad("mock count of one", "keep =", "mock_count = 1\nkeep =", "study.toml:17:14: `mock_count` must be at least 2, not 1; choose another number"),
        bad("covariance rows without covariance", "covariance = \"larkfield-covariance.csv\"", "covariance_rows = \"rows.csv\"", "study.toml:16:19: `covariance_rows` needs `covariance` beside it; give the covariance whose rows it names, or remove it"),
        bad("mocks beside a covariance", "keep =", "mocks = \"mocks.npy\"\nkeep =", "study.toml:17:9: `mocks` stands beside `covariance`, which says the same; give a covariance, or the mocks to estimate it from"),
        bad("nodes and redshift together", "redshift = 0.35", "redshift = 0.35\nnodes = [[0.30, 0.4], [0.38, 0.6]]", "study.toml:22:9: `nodes` stands beside `redshift`, which says the same; give the mean redshift of a thin bin, or the nodes of a wide one"),
        bad("nodes that are no pairs", "redshift = 0.35", "nodes = [0.30, 0.38]", "study.toml:21:9: `nodes` must be a list of [redshift, weight], not the list [0.30, 0.38]; write `nodes = [[0.30, 0.4], [0.38, 0.6]]`"),
        bad("no nodes", "redshift = 0.35", "nodes = []", "study.toml:21:9: `nodes` must be a list of [redshift, weight], not the list []; write `nodes = [[0.30, 0.4], [0.38, 0.6]]`"),
        bad("infinite node", "redshift = 0.35", "nodes = [[0.30, 0.4], [inf, 0.6]]", "study.toml:21:9: `nodes` is inf; give a finite number"),
        bad("weights of nodes that do not sum to one", "redshift = 0.35", "nodes = [[0.30, 0.4], [0.38, 0.5]]", "study.toml:21:9: `larkfield.near.nodes` must be of weights that sum to 1, not 0.9; divide each weight by that sum"),
        bad("weights of nodes that miss one by more than rounding", "redshift = 0.35", "nodes = [[0.30, 0.33333], [0.35, 0.33333], [0.38, 0.33332]]", "study.toml:21:9: `larkfield.near.nodes` must be of weights that sum to 1, not 0.9999800000000001; divide each weight by that sum"),
        bad("weight of a node below zero", "redshift = 0.35", "nodes = [[0.30, 1.4], [0.38, -0.4]]", "study.toml:21:9: `larkfield.near.nodes` must be of weights above 0, not -0.4; leave out a node that counts for nothing"),
        bad("node at redshift zero", "redshift = 0.35", "nodes = [[0.0, 0.5], [0.38, 0.5]]", "study.toml:21:9: `larkfield.near.nodes` must be of redshifts above 0, not 0.0; a node is [redshift, weight], in that order"),
        bad("fiducial without omega_m", "keep =", "fiducial = { w0 = -0.9 }\nkeep =", "study.toml:17:12: `fiducial` of [[survey]] needs `omega_m`; add `omega_m = 0.30`"),
        bad("fiducial of a number", "keep =", "fiducial = 0.3\nkeep =", "study.toml:17:12: `fiducial` must be a table, not the number 0.3; write `fiducial = { omega_m = 0.30 }`"),
        bad("fiducial with a prior", "keep =", "fiducial = { omega_m = { normal = [0.3, 0.01] } }\nkeep =", "study.toml:17:24: `omega_m` must be a number, not the table { normal = [0.3, 0.01] }; write `omega_m = 0.30`"),
        bad("fiducial without matter", "keep =", "fiducial = { omega_m = 0.0 }\nkeep =", "study.toml:17:24: `larkfield.fiducial.omega_m` must be above 0, not 0.0; give the matter density that turned redshifts into distances, as in 0.30"),
        bad("fiducial in km/s/Mpc", "keep =", "fiducial = { omega_m = 0.3, h = 70 }\nkeep =", "study.toml:17:33: `larkfield.fiducial.h` must be above 0 and below 10, not 70.0; it is H0 in 100 km/s/Mpc, as in 0.68"),
        bad("unknown key of fiducial", "keep =", "fiducial = { omega_m = 0.3, omega_c = 0.0 }\nkeep =", "study.toml:17:29: `omega_c` is not a key of `fiducial` of [[survey]]; did you mean `omega_k`?"),
        bad("fiducial that bounced", "keep =", "fiducial = { omega_m = 0.05, omega_k = -2.5 }\nkeep =", "study.toml:17:12: the fiducial background of survey `larkfield` gives no distance: the expansion rate squared is -0.0028845048234105164 times today's at redshift 0.18945826920553244: must be above 0 all the way from redshift 0.35 to today; change omega_m, omega_k, w0 or wa"),
        bad("window without rows", "keep =", "window = \"w.npy\"\nkeep =", "study.toml:17:10: `window` needs `window_rows` beside it; the window's columns are predicted rows: give the table that names them, and the matrix"),
        bad("window rows without a window", "keep =", "window_rows = \"w.csv\"\nkeep =", "study.toml:17:15: `window_rows` needs `window` beside it; the window's columns are predicted rows: give the table that names them, and the matrix"),
        bad("observed slope beside evolution", "evolution = { normal = [0.0, 0.3] }", "evolution = 0.0, observed_density_slope = 0.3", "study.toml:23:104: `observed_density_slope` stands beside `evolution`, which says the same; give the slope that the catalogue shows, or e at fixed luminosity"),
        bad("joint covariance of unknown surveys", "[sampling]", "[[joint_covariance]]\nsurveys = [\"larkfeld\", \"b\"]\nfile = \"c.csv\"\n\n[sampling]", concat!("study.toml:48:11: unknown survey `larkfeld`; did you mean `larkfield`?\n", "study.toml:48:11: unknown survey `b`; known: `larkfield`")),
        bad("joint covariance of one", "[sampling]", "[[joint_covariance]]\nsurveys = [\"larkfield\"]\nfile = \"c.csv\"\n\n[sampling]", "study.toml:48:11: `surveys` must be a list of two surveys or more, not the list [\"larkfield\"]; write `surveys = [\"one\", \"other\"]`"),
        bad("joint covariance that does not say of what", "[sampling]", "[[joint_covariance]]\nfile = \"c.csv\"\n\n[sampling]", "study.toml:47:1: [[joint_covariance]] needs `surveys`; add `surveys = [\"one\", \"other\"]`"),
        bad("a survey jointly with itself", "[sampling]", "[[joint_covariance]]\nsurveys = [\"larkfield\", \"larkfield\"]\nfile = \"c.csv\"\n\n[sampling]", "study.toml:47:11: the survey `larkfield` has a [[joint_covariance]] already; name each survey once, those that share volume together").and("covariance = \"larkfield-covariance.csv\"\n", ""),
        bad("a covariance of its own beside a joint one", "[sampling]", "[[joint_covariance]]\nsurveys = [\"larkfield\", \"other\"]\nfile = \"c.csv\"\n\n[sampling]", concat!("study.toml:16:9: `noise` of survey `other` stands beside a [[joint_covariance]] of that survey, which speaks for all its rows; give it there\n", "study.toml:22:14: `covariance` of survey `larkfield` stands beside a [[joint_covariance]] of that survey, which speaks for all its rows; give it there")).and("[[survey]]\n", "[[survey]]\nname = \"other\"\nmultipoles = \"m.csv\"\nnoise = \"t\"\nbin = [{ name = \"one\", redshift = 0.2, first = { bias = 1, magnification = 0, evolution = 0 }, second = { bias = 2, magnification = 0, evolution = 0 } }]\n\n[[survey]]\n"),
        bad("neither joint covariance nor mocks", "[sampling]", "[[joint_covariance]]\nsurveys = [\"larkfield\", \"other\"]\nmock_count = 30\n\n[sampling]", concat!("study.toml:53:11: `joint_covariance` of `other` needs `file` beside it; give the covariance of all rows, or the `mocks` of every one of the surveys\n", "study.toml:54:14: `mock_count` needs `file` beside it; give the covariance that was estimated from so many, or remove it: mocks are counted")).and("covariance = \"larkfield-covariance.csv\"\n", "mocks = \"mocks/*.csv\"\n").and("[[survey]]\n", "[[survey]]\nname = \"other\"\nmultipoles = \"m.csv\"\nbin = [{ name = \"one\", redshift = 0.2, first = { bias = 1, magnification = 0, evolution = 0 }, second = { bias = 2, magnification = 0, evolution = 0 } }]\n\n[[survey]]\n"),
        bad("mocks that are counted twice", "covariance = \"larkfield-covariance.csv\"", "mocks = \"mocks.npy\"\nmock_count = 300", "study.toml:17:14: `mock_count` stands beside `mocks`, which says the same; remove it: the mocks are counted as they are read"),
        bad("quantities determined for other noise", "keep =", "determined = 5\nkeep =", "study.toml:17:14: `determined` needs `noise = \"percival\"` beside it; no other noise asks how many quantities the data determine; remove it"),
        bad("none determined", "keep =", "determined = 0\nkeep =", "study.toml:17:14: `determined` must be at least 1, not 0; choose another number"),
        bad("shrinking a covariance", "keep =", "shrink_towards = \"model.csv\"\nkeep =", "study.toml:17:18: `shrink_towards` needs `mocks` beside it; how far to shrink is estimated from the mocks themselves, which a covariance no longer has"),
        bad("empty block of an unknown bin", "keep =", "empty_blocks = [[\"near\", \"fra\"]]\nkeep =", "study.toml:17:16: unknown part of the covariance `fra`; did you mean `far`?"),
        bad("empty block of a bin with itself", "keep =", "empty_blocks = [[\"near\", \"near\"]]\nkeep =", "study.toml:17:16: `empty_blocks` takes two parts that have no rows in common, not `near` and `near`; name the two whose covariance is nothing"),
        bad("empty blocks of one name", "keep =", "empty_blocks = [\"near\", \"far\"]\nkeep =", "study.toml:17:16: `empty_blocks` must be a list of pairs of names, not the list [\"near\", \"far\"]; write `empty_blocks = [[\"near\", \"far\"]]`"),
        bad("a template without amplitude", "[[systematic]]", "[[survey.template]]\nname = \"stray\"\nfile = \"stray.csv\"\n\n[[systematic]]", "study.toml:32:1: [[survey.template]] needs `amplitude`; add `amplitude = 1.0`, or a prior, as in `amplitude = { normal = [1.0, SD] }`"),
        bad("a template twice", "[[systematic]]", "[[survey.template]]\nname = \"stray\"\nfile = \"stray.csv\"\namplitude = 1.0\n\n[[survey.template]]\nname = \"stray\"\nfile = \"stray.csv\"\namplitude = 1.0\n\n[[systematic]]", "study.toml:38:8: the template name `stray` is given twice, first on line 33; rename one of the two"),
        bad("unknown key of a template", "[[systematic]]", "[[survey.template]]\nname = \"stray\"\nfile = \"stray.csv\"\namplitud = 1.0\n\n[[systematic]]", "study.toml:35:1: `amplitud` is not a key of [[survey.template]]; did you mean `amplitude`?"),
        bad("a bin with the name of templates", "name = \"far\"", "name = \"template\"", "study.toml:27:8: the bin name `template` is taken by oddwell itself; rename it"),
        bad("a systematic that moves no template", "larkfield.*.second.evolution", "*.template.strai", "study.toml:40:23: the systematic `luminosity-function` moves nothing: no quantity that can move is called `*.template.strai`; did you mean `*.template.stray`?").and("[[systematic]]", "[[survey.template]]\nname = \"stray\"\nfile = \"stray.csv\"\namplitude = 1.0\n\n[[systematic]]"),
        bad("neither evolution nor slope", "evolution = { normal = [0.0, 0.3] }", "bias_slope = 0.0", "study.toml:23:9: `first` of [[survey.bin]] needs `evolution`; add `evolution = 0.0`, or a prior, as in `evolution = { normal = [0.0, SD] }`"),
        bad("covariance_rows without an array", "covariance = \"larkfield-covariance.csv\"", "mocks = \"mocks/*.csv\"\ncovariance_rows = \"rows.csv\"", "study.toml:17:19: `covariance_rows` needs `covariance` beside it; give the covariance whose rows it names, or remove it"),
        bad("keep of numbers", "keep = [{ separation = [24.0, 144.0], multipoles = [1, 3] }]", "keep = [24.0, 144.0]", "study.toml:17:8: `keep` must be a list of tables, not the list [24.0, 144.0]; write `keep = [{ separation = [24.0, 144.0], multipoles = [1, 3] }]`"),
        bad("keep upside down", "separation = [24.0, 144.0]", "separation = [144.0, 24.0]", "study.toml:17:24: `separation` needs its low end below its high end, not [144, 24]; swap or change them"),
        bad("keep of one number", "separation = [24.0, 144.0]", "separation = [24.0]", "study.toml:17:24: `separation` must be a list of two numbers, [low, high], not the list [24.0]; write `separation = [24.0, 144.0]`"),
        bad("keep of multipole 7", "multipoles = [1, 3]", "multipoles = [1, 7]", "study.toml:17:52: `multipoles` must be 0, 1, 2, 3 or 4, not 7; remove it from the list"),
        bad("keep of an unknown pair", "multipoles = [1, 3]", "pairs = [\"first-secnd\"]", "study.toml:17:47: unknown pair `first-secnd`; did you mean `first-second`?"),
        bad("keep of an unknown bin", "multipoles = [1, 3]", "bins = [\"nera\"]", "study.toml:17:46: unknown bin `nera`; did you mean `near`?"),
        bad("unknown column", "[[survey.bin]]\nname = \"near\"", "[survey.columns]\nseperation = \"s\"\n\n[[survey.bin]]\nname = \"near\"", "study.toml:20:1: `seperation` is not a key of [survey.columns]; did you mean `separation`?"),
        bad("power spectrum misspelt", "[prediction]", "power = \"eisenstein-hu-smoth\"\n[prediction]", "study.toml:10:9: unknown power spectrum `eisenstein-hu-smoth`; did you mean `eisenstein-hu-smooth`?"),
        bad("growth rate alone", "redshift = 0.35", "redshift = 0.35\ngrowth_rate = 0.7", "study.toml:22:15: `larkfield.near.growth_rate` needs `growth_slope` beside it; a bin's growth is given by f and df/dln a together, or not at all"),
        bad("systematic of nothing", "larkfield.*.second.evolution", "larkfield.*.secnd.evolution", "study.toml:35:23: the systematic `luminosity-function` moves nothing: no quantity that can move is called `larkfield.*.secnd.evolution`; did you mean `larkfield.*.second.evolution`?"),
        bad("systematic of a tied quantity", "larkfield.*.second.evolution", "larkfield.far.first.evolution", "study.toml:35:23: the systematic `luminosity-function` moves `larkfield.far.first.evolution`, which follows `larkfield.near.first.evolution`; move `larkfield.near.first.evolution` instead"),
        bad("systematic of a departure", "larkfield.*.second.evolution", "departure.tau", "study.toml:35:23: the systematic `luminosity-function` moves `departure.tau`; a systematic moves quantities of [background], [prediction] and the surveys only"),
        bad("systematic by nothing", "by = 0.3", "by = 0", "study.toml:35:60: `by` must be different from 0, not 0; say how far an amplitude of 1 moves the quantity, or remove the entry"),
        bad("systematic without moves", "moves = [{ quantity = \"larkfield.*.second.evolution\", by = 0.3 }]\n", "", "study.toml:32:1: [[systematic]] needs `moves`; add `moves = [{ quantity = \"SURVEY.*.first.evolution\", by = 0.3 }]`"),
        bad("unknown departure, a slip", "departure = \"constant\"", "departure = \"constnt\"", "study.toml:43:13: unknown departure `constnt`; did you mean `constant`?"),
        bad("unknown departure, far from all", "departure = \"constant\"", "departure = \"fifth\"", "study.toml:43:13: unknown departure `fifth`; known: `none`, `constant`, `dark-energy`, `power-law`, `step`, `per-bin`, `per-survey`, `finite-range`, `braneworld`, `f-of-r`"),
        bad("departure missing", "departure = \"constant\"\n", "", "study.toml:41:1: [[hypothesis]] needs `departure`; add `departure = \"constant\"`"),
        bad("felt_by missing", "felt_by = \"light\"\n", "", "study.toml:41:1: [[hypothesis]] needs `felt_by`; add `felt_by = \"light\"` (or `matter`, `everything`), after `departure = \"constant\"`"),
        bad("felt by no one", "felt_by = \"light\"", "felt_by = \"lihgt\"", "study.toml:44:11: unknown felt_by `lihgt`; did you mean `light`?"),
        bad("shape that cannot be felt so", "departure = \"constant\"\nfelt_by = \"light\"", "departure = \"per-bin\"\nfelt_by = \"matter\"", "study.toml:44:11: the departure `per-bin` cannot be felt by matter; it can be felt by light"),
        bad("parameter missing", "departure = \"constant\"", "departure = \"power-law\"", "study.toml:41:1: [[hypothesis]] needs `slope`; add `slope = 1.0`, or a prior, as in `slope = { normal = [1.0, SD] }`"),
        bad("parameter of another shape", "tau = {", "slope = 1.0\ntau = {", "study.toml:45:1: `slope` is no parameter of the departure `constant`, but of `power-law`; remove it or change `departure`"),
        bad("held parameter out of its range", "departure = \"constant\"", "departure = \"step\"\nredshift = 0.5\nwidth = -0.1", "study.toml:45:9: `departure.width` = -0.1: the width of a step must be above 0; give a small width for a sharp step"),
        bad("a step of zero width", "departure = \"constant\"", "departure = \"step\"\nredshift = 0.5\nwidth = 0", "study.toml:45:9: `departure.width` = 0: the width of a step must be above 0; give a small width for a sharp step"),
        bad("growth index with a fifth force", "damping = 0.5", "growth_index = 0.55", "study.toml:44:11: `prediction.growth_index` gives the growth of matter, but the departure of hypothesis `constant` is felt by matter and changes it; remove `prediction.growth_index` or let light alone feel the departure").and("\"light\"", "\"matter\""),
        bad("given growth with a fifth force", "redshift = 0.35", "redshift = 0.35\ngrowth_rate = 0.7\ngrowth_slope = -0.4", "study.toml:46:11: `larkfield.near.growth_rate` gives the growth of matter, but the departure of hypothesis `constant` is felt by everything and changes it; remove `larkfield.near.growth_rate` or let light alone feel the departure").and("\"light\"", "\"everything\""),
        bad("braneworld in another background", "departure = \"constant\"\nfelt_by = \"light\"\ntau = { uniform = [-30.0, 30.0] }", "departure = \"braneworld\"\ncrossover = 1.0", concat!("study.toml:45:13: the departure `braneworld` of hypothesis `constant` needs `background.w0` held at -1, not -0.9; hold it or choose another departure\n", "study.toml:45:13: the departure `braneworld` of hypothesis `constant` needs `background.wa` held at 0, not { normal = [0.0, 0.1] }; hold it or choose another departure")).and("n_s = 0.965", "n_s = 0.965\nw0 = -0.9\nwa = { normal = [0.0, 0.1] }"),
        bad("f(R) in curved space", "departure = \"constant\"\nfelt_by = \"light\"\ntau = { uniform = [-30.0, 30.0] }", "departure = \"f-of-r\"\nlog10_f_r0 = -5", "study.toml:44:13: the departure `f-of-r` of hypothesis `constant` needs `background.omega_k` held at 0, not 0.01; hold it or choose another departure").and("n_s = 0.965", "n_s = 0.965\nomega_k = 0.01"),
        bad("f(R) with another dark energy", "departure = \"constant\"\nfelt_by = \"light\"\ntau = { uniform = [-30.0, 30.0] }", "departure = \"f-of-r\"\nlog10_f_r0 = -5", "study.toml:44:13: the departure `f-of-r` of hypothesis `constant` needs `background.w0` held at -1, not -0.9; hold it or choose another departure").and("n_s = 0.965", "n_s = 0.965\nw0 = -0.9"),
        bad("effective samples zero", "effective_samples = 4000", "effective_samples = 0", "study.toml:48:21: `effective_samples` must be from 1 to 1000000000, not 0; choose another number"),
        bad("half an ensemble", "seed = 1", "ensembles = 2.5", "study.toml:49:13: `ensembles` must be a whole number, not the number 2.5; write `ensembles = 4`"),
        bad("negative seed", "seed = 1", "seed = -1", "study.toml:49:8: `seed` must be 0 or above, not -1; choose another number"),
        bad("joint prior of one with a prior", "[sampling]", "[[joint_prior]]\nof = [\"larkfield.near.offset\", \"larkfield.far.offset\"]\nmean = [0.0, 0.0]\ncovariance = [[1.0, 0.5], [0.5, 1.0]]\n\n[sampling]", "study.toml:48:6: `larkfield.near.offset` has two priors, from line 22 and from this [[joint_prior]]; give a number there (where the search starts) or take it out of `of`"),
        bad("joint prior of nothing", "[sampling]", "[[joint_prior]]\nof = [\"larkfield.near.ofset\", \"larkfield.far.offset\"]\nmean = [0.0, 0.0]\ncovariance = [[1.0, 0.5], [0.5, 1.0]]\n\n[sampling]", "study.toml:48:6: this [[joint_prior]] names `larkfield.near.ofset`, but no quantity has that name; did you mean `larkfield.near.offset`?"),
        bad("joint prior of a tied quantity", "[sampling]", "[[joint_prior]]\nof = [\"larkfield.far.first.evolution\", \"larkfield.far.offset\"]\nmean = [0.0, 0.0]\ncovariance = [[1.0, 0.5], [0.5, 1.0]]\n\n[sampling]", "study.toml:48:6: the joint prior names `larkfield.far.first.evolution`, which follows `larkfield.near.first.evolution`; name `larkfield.near.first.evolution` instead"),
        bad("joint prior with a short mean", "[sampling]", "[[joint_prior]]\nof = [\"larkfield.far.second.bias\", \"larkfield.far.offset\"]\nmean = [0.0]\ncovariance = [[1.0, 0.5], [0.5, 1.0]]\n\n[sampling]", "study.toml:49:8: joint prior: 2 quantities need a mean of 2 and a covariance of 2 by 2, got a mean of 1 and a covariance of 2 by 2"),
        bad("joint prior, indefinite", "[sampling]", "[[joint_prior]]\nof = [\"larkfield.far.second.bias\", \"larkfield.far.offset\"]\nmean = [0.0, 0.0]\ncovariance = [[1.0, 2.0], [2.0, 1.0]]\n\n[sampling]", "study.toml:50:14: joint prior: the covariance must be positive definite, but its smallest eigenvalue is -1e0 (largest 3e0); check variances and correlations"),
        bad("joint prior naming one twice", "[sampling]", "[[joint_prior]]\nof = [\"larkfield.far.offset\", \"larkfield.far.offset\"]\nmean = [0.0, 0.0]\ncovariance = [[1.0, 0.5], [0.5, 1.0]]\n\n[sampling]", "study.toml:48:6: the quantity name `larkfield.far.offset` is given twice, first on line 48; rename one of the two"),
        Bad { about: "nothing in it", text: String::new(), set: &[], message: concat!("study.toml: the study file needs `background`; add `[background]` with `omega_m`, `omega_b`, `h`, `n_s` and `sigma8`\n", "study.toml: the study file needs `survey`; add `[[survey]]` with its `[[survey.bin]]`\n", "study.toml: the study file needs `hypothesis`; add `[[hypothesis]]`, such as one with `departure = \"none\"`") },
        Bad { about: "background only", text: BASE.split("[[survey]]").next().unwrap().to_owned(), set: &[], message: concat!("study.toml: the study file needs `survey`; add `[[survey]]` with its `[[survey.bin]]`\n", "study.toml: the study file needs `hypothesis`; add `[[hypothesis]]`, such as one with `departure = \"none\"`") },
        bad_set("set without a value", &["departure.tau"], "--set departure.tau: `--set` takes NAME=VALUE, not `departure.tau`; write, say, `--set departure.tau=0.5`"),
        bad_set("set to a word", &["departure.tau=much"], "--set departure.tau=much: `departure.tau` must be a number (held) or a prior (inferred), not `much`; write `departure.tau = NUMBER` or `departure.tau = { normal = [MEAN, SD] }`"),
        bad_set("set to infinity", &["background.h=inf"], "--set background.h=inf: `background.h` is inf; give a finite number"),
        bad_set("set out of range", &["background.h=-1"], "--set background.h=-1: `background.h` must be above 0 and below 10, not -1.0; it is H0 in 100 km/s/Mpc, as in 0.68"),
        bad_set("set of nothing", &["departure.tua=1"], "--set departure.tua=1: `--set` names `departure.tua`, but no quantity has that name; did you mean `departure.tau`?"),
        bad_set("set to a wrong prior", &["departure.tau={ normal = [0.0, -1.0] }"], "--set departure.tau={ normal = [0.0, -1.0] }: `departure.tau`: normal prior: sd must be above 0, got -1; to hold the quantity, give a plain number"),
    ]
}

#[test]
fn every_bad_study_says_what_is_wrong_in_full() {
    let mut wrong = Vec::new();
    for Bad { about, text, set, message } in table() {
        let said = match resolve(&text, set) {
            Ok(_) => "nothing".to_owned(),
            Err(said) => said,
        };
        if said != message {
            wrong.push(format!("## {about}\nsaid: {said}\nmust: {message}"));
        }
    }
    assert!(wrong.is_empty(), "{} of the messages differ:\n{}", wrong.len(), wrong.join("\n"));
}
