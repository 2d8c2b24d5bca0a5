//! The study that `oddwell new` writes.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use oddwell_study::{Study, StudyFile, template};

fn study(text: &str) -> Study {
    Study::resolve(StudyFile::parse("study.toml", text, "").unwrap(), &[]).unwrap()
}

#[test]
fn the_template_is_a_study_and_says_that_its_data_are_invented() {
    let text = template::study_text();
    let study = study(&text);
    assert_eq!(study.default_hypothesis().name, "constant");
    assert_eq!(study.file.surveys[0].multipoles.value, template::MULTIPOLES_FILE);
    assert_eq!(study.file.surveys[0].covariance.as_ref().unwrap().value, template::COVARIANCE_FILE);
    assert!(text.lines().next().unwrap().contains("INVENTED"));
    for shape in oddwell_model::departures::registry() {
        assert!(text.contains(shape.name()), "{}", shape.name());
    }
    for family in oddwell_sampler::prior_families() {
        assert!(text.contains(&format!("{} = ", family.key)), "{}", family.key);
    }
    assert!(text.lines().all(|line| !line.contains("SHAPES")));
}

/// `#key = …` and `#[section]` are optional lines; `# …` is a comment.
fn is_optional(line: &str) -> bool {
    line.starts_with('#') && line[1..].starts_with(|letter: char| letter.is_alphabetic() || letter == '[')
}

#[test]
fn every_optional_block_makes_a_study_when_uncommented() {
    let text = template::study_text();
    let lines: Vec<&str> = text.lines().collect();
    let mut blocks = 0;
    let mut start = 0;
    while start < lines.len() {
        if !is_optional(lines[start]) {
            start += 1;
            continue;
        }
        let length = lines[start..].iter().take_while(|line| is_optional(line)).count();
        let uncommented: Vec<&str> = lines
            .iter()
            .enumerate()
            .map(|(index, line)| if (start..start + length).contains(&index) { &line[1..] } else { line })
            .collect();
        assert_ne!(study(&uncommented.join("\n")).file, study(&text).file, "{}", lines[start]);
        blocks += 1;
        start += length;
    }
    assert_eq!(blocks, 11);
}

#[test]
fn a_template_is_written_whole_or_not_at_all() {
    let folder = tempfile::tempdir().unwrap();
    let data = template::TemplateData { multipoles: "# invented\nm\n", covariance: "c\n" };
    let new = folder.path().join("deep").join("new");
    let files = template::write_template(&new, &data).unwrap();
    assert_eq!(files[0], new.join("study.toml"));
    assert_eq!(std::fs::read_to_string(&files[1]).unwrap(), data.multipoles);
    assert_eq!(std::fs::read_to_string(&files[2]).unwrap(), data.covariance);
    assert_eq!(StudyFile::read(&files[0]).unwrap().title.value, "An invented survey");

    let error = template::write_template(&new, &data).unwrap_err().to_string();
    let shown = new.display();
    assert_eq!(
        error,
        format!("{shown}: exists already and is not an empty folder; a new study needs a folder of its own")
    );

    let empty = folder.path().join("empty");
    std::fs::create_dir(&empty).unwrap();
    assert_eq!(template::write_template(&empty, &data).unwrap().len(), 3);

    let below_a_file = files[0].join("new");
    let error = template::write_template(&below_a_file, &data).unwrap_err().to_string();
    let shown = below_a_file.display();
    assert!(error.starts_with(&format!("{shown}: a new study cannot be written there: ")), "{error}");
    let left: Vec<_> = std::fs::read_dir(&new).unwrap().map(|entry| entry.unwrap().file_name()).collect();
    assert_eq!(left.len(), 3, "{left:?}");
}
