//! Rules for what a survey says of its covariance and noise, and for surveys that share volume.

use oddwell_likelihood::noise_families;

use super::checker::Checker;
use crate::fault::Fault;
use crate::file::{EmptyBlock, JointCovarianceSection, Located, Origin, StudyFile, SurveySection};
use crate::nearest::Nearest;

/// The file names of a pattern are not one file.
pub(crate) fn is_pattern(path: &str) -> bool {
    path.contains(['*', '?', '['])
}

/// Checks covariances, mocks and noise of every survey, alone and together.
pub(super) fn check(file: &StudyFile, checker: &mut Checker<'_>) {
    for survey in &file.surveys {
        let joint = file.joint_covariance_of(&survey.name.value);
        check_sources(survey, joint, checker);
        match joint {
            Some(_) => check_member(survey, checker),
            None => check_noise(&Noise::of_survey(survey), checker),
        }
        let bins = survey.bins.iter().map(|bin| bin.name.value.clone()).collect();
        check_blocks(survey.empty_blocks.as_ref(), bins, checker);
    }
    let mut taken: Vec<&str> = Vec::new();
    for joint in &file.joint_covariances {
        check_joint(file, joint, &taken, checker);
        taken.extend(joint.surveys.value.iter().map(String::as_str));
    }
}

fn needs(key: &str, other: &str, way_out: &'static str) -> Fault {
    Fault::NeedsOther { key: key.to_owned(), other: other.to_owned(), way_out }
}

/// What stands beside what in one survey.
fn check_sources(survey: &SurveySection, joint: Option<&JointCovarianceSection>, checker: &mut Checker<'_>) {
    if let (Some(_), Some(mocks)) = (&survey.covariance, &survey.mocks) {
        let way_out = "give a covariance, or the mocks to estimate it from";
        checker.fault(mocks.origin, "mocks", Fault::EitherOr { one: "covariance", other: "mocks", way_out });
    }
    if let (Some(_), Some(count)) = (&survey.mocks, &survey.mock_count) {
        let way_out = "remove it: the mocks are counted as they are read";
        checker.fault(
            count.origin,
            "mock_count",
            Fault::EitherOr { one: "mocks", other: "mock_count", way_out },
        );
    }
    let array = survey.mocks.as_ref().is_some_and(|mocks| !is_pattern(&mocks.value));
    let further = [&survey.extra_covariance, &survey.shrink_towards];
    let names_something = survey.covariance.is_some()
        || array
        || further.iter().any(|path| path.is_some())
        || joint.is_some_and(|joint| joint.file.is_some() || joint.extra_covariance.is_some());
    if let Some(rows) = survey.covariance_rows.as_ref().filter(|_| !names_something) {
        let way_out = "give the covariance whose rows it names, or remove it";
        checker.fault(rows.origin, "covariance_rows", needs("covariance_rows", "covariance", way_out));
    }
}

/// What decides whether a noise model can be had, of a survey or of several together.
struct Noise<'a> {
    noise: &'a Located<&'static str>,
    mock_count: bool,
    mocks: bool,
    determined: &'a Option<Located<u64>>,
    shrink_towards: &'a Option<Located<String>>,
}

impl<'a> Noise<'a> {
    fn of_survey(survey: &'a SurveySection) -> Self {
        Noise {
            noise: &survey.noise,
            mock_count: survey.mock_count.is_some(),
            mocks: survey.mocks.is_some(),
            determined: &survey.determined,
            shrink_towards: &survey.shrink_towards,
        }
    }
}

fn check_noise(given: &Noise<'_>, checker: &mut Checker<'_>) {
    let noise = given.noise.value;
    let needs_mocks = noise_families().iter().any(|family| family.name == noise && family.needs_mocks);
    if needs_mocks && !given.mock_count && !given.mocks {
        let way_out = "say how many mocks the covariance was estimated from, give the `mocks` themselves, or choose `noise = \"gaussian\"`";
        let key = format!("noise = \"{noise}\"");
        checker.fault(given.noise.origin, "noise", needs(&key, "mock_count", way_out));
    }
    if let Some(determined) = given.determined.as_ref().filter(|_| noise != "percival") {
        let way_out = "no other noise asks how many quantities the data determine; remove it";
        checker.fault(determined.origin, "determined", needs("determined", "noise = \"percival\"", way_out));
    }
    if let Some(model) = given.shrink_towards.as_ref().filter(|_| !given.mocks) {
        let way_out =
            "how far to shrink is estimated from the mocks themselves, which a covariance no longer has";
        checker.fault(model.origin, "shrink_towards", needs("shrink_towards", "mocks", way_out));
    }
}

/// What a survey may not say for itself that a joint covariance speaks for.
fn check_member(survey: &SurveySection, checker: &mut Checker<'_>) {
    let origin = |path: &Option<Located<String>>| path.as_ref().map(|path| path.origin);
    let noise = Some(survey.noise.origin).filter(|origin| *origin != Origin::Default);
    let own = [
        ("covariance", origin(&survey.covariance)),
        ("mock_count", survey.mock_count.as_ref().map(|count| count.origin)),
        ("noise", noise),
        ("determined", survey.determined.as_ref().map(|count| count.origin)),
        ("extra_covariance", origin(&survey.extra_covariance)),
        ("shrink_towards", origin(&survey.shrink_towards)),
        ("empty_blocks", survey.empty_blocks.as_ref().map(|blocks| blocks.origin)),
    ];
    for (key, place) in own {
        if let Some(place) = place {
            let survey = survey.name.value.clone();
            checker.fault(place, key, Fault::SpokenForJointly { key, survey });
        }
    }
}

fn check_joint(file: &StudyFile, joint: &JointCovarianceSection, taken: &[&str], checker: &mut Checker<'_>) {
    let mut members: Vec<&SurveySection> = Vec::new();
    for name in &joint.surveys.value {
        let known = file.surveys.iter().find(|survey| survey.name.value == *name);
        let fault = match known {
            None => {
                let nearest = Nearest::find(name, file.surveys.iter().map(|survey| &survey.name.value));
                Some(Fault::UnknownChoice { what: "survey", value: name.clone(), nearest })
            }
            Some(survey) => {
                let twice =
                    taken.contains(&name.as_str()) || members.iter().any(|member| member.name.value == *name);
                members.push(survey);
                twice.then(|| Fault::JointlyTwice { survey: name.clone() })
            }
        };
        if let Some(fault) = fault {
            checker.fault(joint.surveys.origin, "surveys", fault);
        }
    }
    for member in &members {
        match (&joint.file, &member.mocks) {
            (Some(file), Some(_)) => {
                let way_out = "give a covariance, or the mocks of every survey to estimate it from";
                let fault = Fault::EitherOr { one: "mocks", other: "file", way_out };
                checker.fault(file.origin, "file", fault);
            }
            (None, None) => {
                let key = format!("joint_covariance` of `{}", member.name.value);
                let way_out = "give the covariance of all rows, or the `mocks` of every one of the surveys";
                checker.fault(joint.surveys.origin, "file", needs(&key, "file", way_out));
            }
            _ => continue,
        }
        break;
    }
    if let (None, Some(count)) = (&joint.file, &joint.mock_count) {
        let way_out = "give the covariance that was estimated from so many, or remove it: mocks are counted";
        checker.fault(count.origin, "mock_count", needs("mock_count", "file", way_out));
    }
    let noise = Noise {
        noise: &joint.noise,
        mock_count: joint.mock_count.is_some(),
        mocks: joint.file.is_none(),
        determined: &joint.determined,
        shrink_towards: &joint.shrink_towards,
    };
    check_noise(&noise, checker);
    let names = members.iter().flat_map(|survey| {
        let bins = survey.bins.iter().map(|bin| format!("{}.{}", survey.name.value, bin.name.value));
        std::iter::once(survey.name.value.clone()).chain(bins)
    });
    check_blocks(joint.empty_blocks.as_ref(), names.collect(), checker);
}

fn check_blocks(blocks: Option<&Located<Vec<EmptyBlock>>>, known: Vec<String>, checker: &mut Checker<'_>) {
    let Some(blocks) = blocks else { return };
    for (one, other) in &blocks.value {
        let unknown = [one, other].into_iter().find(|name| !known.contains(*name));
        let fault = match unknown {
            Some(name) => {
                let nearest = Nearest::find(name, known.iter());
                Fault::UnknownChoice { what: "part of the covariance", value: name.clone(), nearest }
            }
            None if overlap(one, other) => Fault::BlockWithItself { one: one.clone(), other: other.clone() },
            None => continue,
        };
        checker.fault(blocks.origin, "empty_blocks", fault);
    }
}

/// Whether one of two parts holds the other.
fn overlap(one: &str, other: &str) -> bool {
    let holds = |whole: &str, part: &str| {
        part == whole || part.strip_prefix(whole).is_some_and(|rest| rest.starts_with('.'))
    };
    holds(one, other) || holds(other, one)
}
