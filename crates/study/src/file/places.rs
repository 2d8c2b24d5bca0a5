//! The dotted names of the file's quantities: the one list of them, in the order of the study.

use super::{Located, Quantity, StudyFile, TracerSection};

/// Where a quantity of the file stands.
pub(crate) enum QuantityPlace<'a> {
    /// It always has a value, be it the default.
    Given(&'a mut Located<Quantity>),
    /// It is part of the study only where it is given.
    Optional(&'a mut Option<Located<Quantity>>),
}

impl StudyFile {
    /// Every quantity of the file under its dotted name: background, prediction, surveys, systematics.
    pub(crate) fn places(&mut self) -> Vec<(String, QuantityPlace<'_>)> {
        use QuantityPlace::{Given, Optional};
        let background = &mut self.background;
        let mut places: Vec<(String, QuantityPlace<'_>)> = [
            ("omega_m", &mut background.omega_m),
            ("omega_b", &mut background.omega_b),
            ("h", &mut background.h),
            ("n_s", &mut background.n_s),
            ("sigma8", &mut background.sigma8),
            ("omega_k", &mut background.omega_k),
            ("w0", &mut background.w0),
            ("wa", &mut background.wa),
        ]
        .into_iter()
        .map(|(key, place)| (format!("background.{key}"), Given(place)))
        .collect();
        let prediction = &mut self.prediction;
        places.push(("prediction.damping".to_owned(), Given(&mut prediction.damping)));
        places.push(("prediction.growth_index".to_owned(), Optional(&mut prediction.growth_index)));
        places.push(("prediction.smearing".to_owned(), Given(&mut prediction.smearing)));
        places.push(("prediction.clock_distance".to_owned(), Given(&mut prediction.clock_distance)));
        for survey in &mut self.surveys {
            for bin in &mut survey.bins {
                let path = format!("{}.{}", survey.name.value, bin.name.value);
                places.push((format!("{path}.offset"), Given(&mut bin.offset)));
                places.push((format!("{path}.growth_rate"), Optional(&mut bin.growth_rate)));
                places.push((format!("{path}.growth_slope"), Optional(&mut bin.growth_slope)));
                add_tracer(&mut places, &format!("{path}.first"), &mut bin.first);
                add_tracer(&mut places, &format!("{path}.second"), &mut bin.second);
            }
            for template in &mut survey.templates {
                let name = template_name(&survey.name.value, &template.name.value);
                places.push((name, Given(&mut template.amplitude)));
            }
        }
        for systematic in &mut self.systematics {
            let name = format!("systematic.{}", systematic.name.value);
            places.push((name, Given(&mut systematic.amplitude)));
        }
        places
    }
}

/// The dotted name of a template's amplitude.
pub(crate) fn template_name(survey: &str, template: &str) -> String {
    format!("{survey}.template.{template}")
}

fn add_tracer<'a>(places: &mut Vec<(String, QuantityPlace<'a>)>, path: &str, tracer: &'a mut TracerSection) {
    let mut add = |key: &str, place: Option<&'a mut Located<Quantity>>| {
        places.extend(place.map(|place| (format!("{path}.{key}"), QuantityPlace::Given(place))));
    };
    add("bias", Some(&mut tracer.bias));
    add("magnification", Some(&mut tracer.magnification));
    // One of the two.
    add("evolution", tracer.evolution.as_mut());
    add("observed_density_slope", tracer.observed_density_slope.as_mut());
    add("bias_slope", Some(&mut tracer.bias_slope));
}
