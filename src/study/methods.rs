//! How it was done, in paragraphs made from what was run.

use super::run::{DENSITY_PER_MAGNETISATION, Findings};
use super::settings::PotentialKind;
use crate::coincidence::{LEAST_OVERLAP, LONGEST_SHIFT, SMALLEST_P, VALID_LEVEL};
use crate::conductor::Threshold;
use crate::evidence::{Method, distance_label, significant};

/// The steps of the run, each with the numbers used and its published source.
pub(super) fn methods(findings: &Findings) -> Vec<Method> {
    let plan = &findings.plan;
    let step = |heading: &str, text: String, reference: &str| Method {
        heading: heading.into(),
        text,
        reference: reference.into(),
    };
    let frame = &plan.frame;
    let mut steps = vec![step(
        "Frame",
        format!(
            "All layers were placed on {} rows x {} columns of {} in {}. {} Values were averaged by area where the cells grow \
             by more than half, and interpolated by cubic convolution otherwise, kept within the range of the file; resistivity was resampled as log10.",
            frame.rows,
            frame.cols,
            distance_label(frame.cell),
            frame.crs.name,
            plan.reasons.join(" ")
        ),
        "",
    )];
    let threshold = match plan.study.conductivity.conductors.threshold {
        Threshold::Quantile(quantile) => {
            format!("cells at or above the {quantile} quantile of log10 conductivity in each slice")
        }
        Threshold::Absolute(limit) => format!("cells below {limit} ohm m"),
        Threshold::Mixture => {
            "cells on the conductive side of the crossing of two normal populations of log10 conductivity, \
                               fitted to each slice"
                .into()
        }
    };
    steps.push(step(
        "Conductors",
        format!(
            "Conductors are {threshold}, joined over edges and corners; bodies smaller than {} km\u{b2} were dropped.",
            significant(plan.conductor_area / 1e6, 3)
        ),
        "",
    ));
    for (field, planned) in plan.study.potentials.iter().zip(&plan.potentials) {
        let heights: Vec<String> = field.heights.iter().map(|height| distance_label(*height)).collect();
        let first = match field.kind {
            PotentialKind::Gravity | PotentialKind::Other => String::new(),
            PotentialKind::Magnetic { inclination, declination } => format!(
                "The anomaly was turned into pseudo-gravity with inclination {inclination}\u{b0} and declination \
                 {declination}\u{b0} from true north ({:.2}\u{b0} from the frame's grid north), magnetisation taken along the \
                 inducing field and {DENSITY_PER_MAGNETISATION} kg/m\u{b3} of density standing for 1 A/m, a scale that moves no contact. ",
                declination + plan.true_north
            ),
        };
        steps.push(step(
            &format!("Contacts of {}", field.name),
            format!(
                "{first}Gaps were filled for the transform and masked again, a plane was removed, and the grid was padded \
                 beyond its edges. After upward continuation by {}, crests of the horizontal gradient magnitude were found \
                 by quadratic fits in four directions of a 3 x 3 window and traced into lines: from crests above the {} \
                 quantile of crest strength, followed down to the {} quantile; lines shorter than {} were dropped.",
                heights.join(" and "),
                field.contacts.0,
                field.contacts.1,
                distance_label(planned.least_length)
            ),
            match field.kind {
                PotentialKind::Magnetic { .. } => {
                    "Blakely & Simpson 1986 (Geophysics 51, 1494-1498); Baranov 1957 (Geophysics 22, 359-383); Blakely 1995 (Potential Theory in Gravity and Magnetic Applications, Cambridge University Press)"
                }
                _ => "Blakely & Simpson 1986 (Geophysics 51, 1494-1498)",
            },
        ));
    }
    steps.push(step(
        "Measures",
        format!(
            "Enrichment is the share of conductor cells within a distance of a line over the share of all cells within it. \
             Correlation is Pearson's coefficient of log10 conductivity and gradient strength after a plane was taken out of \
             both. The mean distance, capped at {}, is described only: its level is approximate near the footprint's edge.",
            distance_label(plan.distance_cap)
        ),
        "",
    ));
    steps.push(step(
        "Null",
        format!(
            "The conductivity layers were displaced, without wrapping, by every whole-cell shift within an ellipse whose \
             half-axes are {LONGEST_SHIFT} of the footprint's sides, as long as {LEAST_OVERLAP} of the overlap remained; short \
             shifts were kept. At each shift every term was computed on the remaining overlap. A statistic T at shift s with n \
             cells in the overlap was standardised as (T - mean T) sqrt(n). p is the share of shifts, the observed one \
             included, that score at least as high. Smoothness of both layers is kept by construction."
        ),
        "Mrkvicka, Dvorak, Gonzalez & Mateu 2021 (Spatial Statistics 42, 100430)",
    ));
    steps.push(step(
        "Family",
        format!(
            "Enrichment at the tested distances and correlation, over all depths, sides and references, form one family of {} \
             tests. One shift moves every depth together; the largest standardised score at each shift gives the \
             family-wise p-value. It is judged at {}.",
            findings.comparison.family_tests, plan.study.test.level
        ),
        "Westfall & Young 1993 (Resampling-Based Multiple Testing, Wiley)",
    ));
    steps.push(step(
        "Guards",
        format!(
            "The number of effectively independent shifts is the number of shifts over the summed autocorrelation of the \
             scores. No p-value is printed below 1/(1 + that number), or below {VALID_LEVEL} where that is smaller (the level was measured to hold there), nor below {SMALLEST_P}; a test that cannot reach the \
             level is left empty. Both layers were tested for a slope across the survey."
        ),
        "Bartlett 1946 (Supplement to the Journal of the Royal Statistical Society 8, 27-41); Clifford, Richardson & Hemon 1989 (Biometrics 45, 123-134)",
    ));
    steps
}
