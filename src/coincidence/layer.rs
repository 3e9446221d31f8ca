//! What is compared: a subject that moves and a reference that stays, as plain arrays.

use ndarray::Array2;

use super::null::SMALLEST_P;
use crate::error::{Error, Result};

/// The pattern that is moved under the null.
#[derive(Debug, Clone)]
pub struct Subject {
    /// The cells where the layer has data.
    pub footprint: Array2<bool>,
    /// The cells that belong to the pattern (conductors, for example); only those inside the footprint count.
    pub members: Option<Array2<bool>>,
    /// A number in each cell of the footprint (log10 conductivity, for example), for the correlation.
    pub strength: Option<Array2<f64>>,
}

/// The pattern that stays in place.
#[derive(Debug, Clone, Default)]
pub struct Reference {
    /// The cells where the layer has data.
    pub footprint: Array2<bool>,
    /// Distance from each cell of the footprint to the nearest line, in the units of [`Settings::within`].
    pub distance: Option<Array2<f64>>,
    /// A number in each cell of the footprint (gradient strength, for example), for the correlation.
    pub strength: Option<Array2<f64>>,
    /// True if the reference is ground (mapped units, for example) and a distance of 0 means inside it: being inside is
    /// then tested as well, as enrichment within 0.
    pub area: bool,
    /// The subjects that are compared with it, by index; `None` for all.
    pub against: Option<Vec<usize>>,
}

impl Reference {
    /// True if a subject is compared with it.
    pub(super) fn meets(&self, subject: usize) -> bool {
        self.against.as_ref().is_none_or(|subjects| subjects.contains(&subject))
    }
}

/// What is asked of every pair of subject and reference.
#[derive(Debug, Clone)]
pub struct Settings {
    /// Distances at which enrichment is tested; each is a member of the family.
    pub within: Vec<f64>,
    /// Further distances at which enrichment is described, with a pointwise band and without a test.
    pub profile: Vec<f64>,
    /// Distances beyond this one count as this one in the mean distance, because lines outside the footprint are unseen.
    pub distance_cap: f64,
    /// The level at which the family of tests is judged, from [`SMALLEST_P`] to below 1.
    pub level: f64,
}

impl Settings {
    /// Checks every number.
    ///
    /// # Errors
    /// A distance or cap that is not positive and finite, a distance given twice, a level outside (0, 1) or below the
    /// smallest p-value that shifts resolve.
    pub fn check(&self) -> Result<()> {
        for distance in self.within.iter().chain(&self.profile).chain([&self.distance_cap]) {
            if !(distance.is_finite() && *distance > 0.0) {
                return Err(Error::input("a distance of the test").found(distance).wanted("a positive number"));
            }
        }
        for (index, distance) in self.within.iter().enumerate() {
            if self.within[..index].contains(distance) {
                return Err(Error::input("the distances of the test")
                    .found(format!("{distance} twice"))
                    .wanted("each once"));
            }
        }
        if !(self.level >= SMALLEST_P && self.level < 1.0) {
            return Err(Error::input("the level of the family")
                .found(self.level)
                .wanted(format!("a number from {SMALLEST_P}, the smallest p-value that shifts resolve, to below 1")));
        }
        Ok(())
    }
}

/// Checks that every array of every layer has the shape of the first and that numbers are finite inside footprints.
pub(super) fn check_layers(subjects: &[Subject], references: &[Reference]) -> Result<(usize, usize)> {
    let Some(shape) = subjects.first().map(|subject| subject.footprint.dim()) else {
        return Err(Error::input("the comparison").found("no subject").wanted("at least one"));
    };
    if references.is_empty() {
        return Err(Error::input("the comparison").found("no reference").wanted("at least one"));
    }
    let same = |name: &str, found: (usize, usize)| {
        if found == shape {
            return Ok(());
        }
        Err(Error::input(format!("the shape of {name}"))
            .found(format!("{found:?}"))
            .wanted(format!("{shape:?}, as the first subject")))
    };
    let numbers = |name: String, footprint: &Array2<bool>, values: &Option<Array2<f64>>| {
        let Some(values) = values else { return Ok(()) };
        same(&name, values.dim())?;
        let bad = footprint.indexed_iter().find(|(index, inside)| **inside && !values[*index].is_finite());
        match bad {
            None => Ok(()),
            Some((index, _)) => Err(Error::input(name)
                .found(format!("{} at (row, column) {index:?}", values[index]))
                .wanted("a finite number in every cell of its footprint")
                .mend("leave that cell out of the footprint")),
        }
    };
    for (index, subject) in subjects.iter().enumerate() {
        same(&format!("subject {index}"), subject.footprint.dim())?;
        if let Some(members) = &subject.members {
            same(&format!("the members of subject {index}"), members.dim())?;
        }
        numbers(format!("the strength of subject {index}"), &subject.footprint, &subject.strength)?;
    }
    for (index, reference) in references.iter().enumerate() {
        same(&format!("reference {index}"), reference.footprint.dim())?;
        numbers(format!("the distances of reference {index}"), &reference.footprint, &reference.distance)?;
        numbers(format!("the strength of reference {index}"), &reference.footprint, &reference.strength)?;
        if let Some(missing) = reference.against.iter().flatten().find(|subject| **subject >= subjects.len()) {
            return Err(Error::input(format!("the subjects of reference {index}"))
                .found(format!("number {missing}"))
                .wanted(format!("numbers below {}, which counts the subjects", subjects.len())));
        }
    }
    Ok(shape)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn settings() -> Settings {
        Settings { within: vec![1.0, 2.0], profile: vec![3.0], distance_cap: 8.0, level: 0.05 }
    }

    #[test]
    fn each_bad_setting_is_refused() {
        assert!(settings().check().is_ok());
        for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
            assert!(Settings { within: vec![bad], ..settings() }.check().is_err());
            assert!(Settings { profile: vec![bad], ..settings() }.check().is_err());
            assert!(Settings { distance_cap: bad, ..settings() }.check().is_err());
        }
        assert!(Settings { within: vec![2.0, 2.0], ..settings() }.check().is_err());
        for level in [0.0, 1.0, -0.1, 0.0049, f64::NAN] {
            assert!(Settings { level, ..settings() }.check().is_err());
        }
    }

    #[test]
    fn each_bad_layer_is_refused() {
        let subject = || Subject { footprint: Array2::from_elem((3, 4), true), members: None, strength: None };
        let reference = || Reference { footprint: Array2::from_elem((3, 4), true), ..Reference::default() };
        assert_eq!(check_layers(&[subject()], &[reference()]).unwrap(), (3, 4));
        assert!(check_layers(&[], &[reference()]).is_err());
        assert!(check_layers(&[subject()], &[]).is_err());
        let small = Array2::zeros((3, 3));
        let message = |subject, reference| check_layers(&[subject], &[reference]).unwrap_err().to_string();
        assert!(message(Subject { strength: Some(small.clone()), ..subject() }, reference()).contains("shape"));
        assert!(message(subject(), Reference { distance: Some(small.clone()), ..reference() }).contains("shape"));
        let members = Some(Array2::from_elem((4, 3), true));
        assert!(message(Subject { members, ..subject() }, reference()).contains("members"));
        let mut holed = Array2::zeros((3, 4));
        holed[[1, 2]] = f64::NAN;
        let found = message(subject(), Reference { strength: Some(holed.clone()), ..reference() });
        assert!(found.contains("(1, 2)"), "{found}");
        let mut footprint = Array2::from_elem((3, 4), true);
        footprint[[1, 2]] = false;
        assert!(check_layers(&[subject()], &[Reference { footprint, strength: Some(holed), ..reference() }]).is_ok());
        assert!(message(subject(), Reference { against: Some(vec![0, 1]), ..reference() }).contains("number 1"));
    }
}
