//! How it was done, in paragraphs made from what was run.

use super::answer::list;
use super::contact_details::LADDER_CELLS;
use super::fields::DENSITY_PER_MAGNETISATION;
use super::plan::PlannedDirections;
use super::run::Findings;
use super::settings::{Angles, ContactChoice, FieldDirection, PotentialKind, Resolution};
use crate::coincidence::{LEAST_OVERLAP, LONGEST_SHIFT, SMALLEST_P, VALID_LEVEL};
use crate::conductor::Threshold;
use crate::evidence::{Method, distance_label, significant};
use crate::field::{LEAST_EXACT_INCLINATION, ReferenceField};

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
             by more than half, and interpolated by cubic convolution otherwise, and resistivity, resampled as log10, was kept within the range of the file.",
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
            "Conductors are {threshold}, joined over edges and corners; bodies smaller than {} km\u{b2} were dropped.{}",
            significant(plan.conductor_area / 1e6, 3),
            plan.study.conductivity.resistors.as_ref().map_or_else(String::new, |choice| {
                let limit = match choice.threshold {
                    Threshold::Quantile(quantile) => {
                        format!("cells at or below the {quantile} quantile of log10 conductivity in each slice")
                    }
                    Threshold::Absolute(limit) => format!("cells above {limit} ohm m"),
                    Threshold::Mixture => "cells on the resistive side of such a crossing".into(),
                };
                format!(
                    " Resistors are {limit}, joined likewise; those smaller than {} km\u{b2} were dropped.",
                    significant(plan.resistor_area / 1e6, 3)
                )
            })
        ),
        "",
    ));
    for ((field, planned), found) in plan.study.potentials.iter().zip(&plan.potentials).zip(&findings.potentials) {
        let heights = match (&field.heights, plan.study.test.resolution) {
            (_, Resolution::Matched) => "to the resolving length of each slice (below)".to_string(),
            (Some(heights), _) => {
                let heights: Vec<String> = heights.iter().map(|height| distance_label(*height)).collect();
                format!("by {}", heights.join(" and "))
            }
            (None, _) => format!(
                "by nothing and, for each slice, by {} of its depth where that is at least half a cell",
                plan.share_label()
            ),
        };
        let first = planned
            .directions
            .map_or_else(String::new, |directions| pseudo_gravity(field.kind, directions, plan.true_north));
        let ContactChoice { quantiles: (strong, weak), significance, .. } = field.contacts;
        steps.push(step(
            &format!("Contacts of {}", field.name),
            format!(
                "{first}A plane and a sparse sheet of sources that together explain the grid were fitted; their field stands in for \
                 the ground beyond the edges and gaps were filled by a thin plate, for the transform only. After upward \
                 continuation {heights}, crests of the horizontal gradient magnitude were found by quadratic fits in four \
                 directions of a 3 x 3 window and traced into lines. A line starts at a crest that is above the {strong} \
                 quantile of all crests and that noise, in strength and in its fall to both sides, would give anywhere in the \
                 layer with a chance of at most {significance}; it does not start where the edge makes the noise larger. It is \
                 followed down to the {weak} quantile and to that chance in each cell; lines shorter than {} were dropped. The \
                 noise of a cell, {} {} ({}), was taken as white and carried through the transforms; an estimate is the median power of the highest \
                 wavenumbers of the file's own cells.",
                distance_label(planned.least_length),
                significant(found.noise.sigma, 2),
                field.kind.file_unit(),
                found.noise.origin()
            ),
            match field.kind {
                PotentialKind::Magnetic { .. } => {
                    "Blakely & Simpson 1986 (Geophysics 51, 1494-1498); Baranov 1957 (Geophysics 22, 359-383); Blakely 1995 (Potential Theory in Gravity and Magnetic Applications, Cambridge University Press)"
                }
                _ => "Blakely & Simpson 1986 (Geophysics 51, 1494-1498)",
            },
        ));
        if field.kind != PotentialKind::Other {
            steps.push(step(
                &format!("Depth and dip of the contacts of {}", field.name),
                format!(
                    "The depth of a contact is half the distance between the contours of -45\u{b0} and 45\u{b0} of the tilt angle \
                     of the vertical derivative{}, on the field as it is: right for a vertical contact of great depth extent, and told only \
                     where it stands ten deviations above the noise. Where heights do not belong to depths, each contact was looked for again {} cells higher; the \
                     drift of its crest tells which way it dips where it is faster than that of a vertical-sided body.",
                    if planned.directions.is_some() { " (which is the anomaly reduced to the pole)" } else { "" },
                    list(&LADDER_CELLS.map(|cells| cells.to_string()))
                ),
                "Salem, Williams, Fairhead, Ravat & Smith 2007 (The Leading Edge 26, 1502-1505)",
            ));
        }
    }
    if plan.study.test.resolution == Resolution::Matched {
        steps.push(step(
            "Resolution",
            "The resolving length of a layer is half the wavelength beyond which nine tenths of the power of its horizontal \
             gradient lie. At each depth every field was continued upward, and the slice smoothed by a Gaussian, until their \
             resolving lengths were that of the coarsest; conductors were picked after smoothing."
                .into(),
            "",
        ));
    }
    let mapped = plan.study.lines.iter().map(|lines| (&lines.name, "lines"));
    let mapped: Vec<String> = mapped
        .chain(plan.study.units.iter().map(|units| (&units.name, "units")))
        .map(|(name, what)| format!("{name} ({what})"))
        .collect();
    if !mapped.is_empty() {
        steps.push(step(
            "What is mapped",
            format!(
                "{} came from vector files, cut at the frame. A cell belongs to units if its centre lies inside; distance to them \
                 is 0 inside, and enrichment inside is tested beside the distances.",
                list(&mapped)
            ),
            "",
        ));
    }
    steps.push(step(
        "Measures",
        format!(
            "Enrichment is the share of the subject's cells (conductors, resistors, or units that are moved) within a distance of a line over the share of all cells within it. \
             Correlation is Pearson's coefficient of log10 conductivity and gradient strength after a plane was taken out of \
             both. The mean distance, capped at {}, is described only: its level is approximate near the footprint's edge.",
            distance_label(plan.distance_cap)
        ),
        "",
    ));
    steps.push(step(
        "Null",
        format!(
            "The subjects were displaced, without wrapping, by every whole-cell shift within an ellipse whose \
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

/// How magnetics became pseudo-gravity.
fn pseudo_gravity(kind: PotentialKind, directions: PlannedDirections, true_north: f64) -> String {
    let Angles { inclination, declination } = directions.field;
    let own = match directions.magnetisation {
        None => "magnetisation taken along the earth's field".to_string(),
        Some(Angles { inclination, declination }) => format!(
            "magnetisation taken along inclination {}\u{b0} and declination {}\u{b0} from true north",
            significant(inclination, 4),
            significant(declination, 4)
        ),
    };
    let steep = directions.magnetisation.map_or(inclination.abs(), |own| own.inclination.abs().min(inclination.abs()));
    let guard = if steep < LEAST_EXACT_INCLINATION {
        format!(
            " Where a direction is less steep than {LEAST_EXACT_INCLINATION}\u{b0}, the amplitude of the operator is that of \
             {LEAST_EXACT_INCLINATION}\u{b0}, so that waves along the declination are not magnified without bound (MacLeod, \
             Jordan & Li 1993)."
        )
    } else {
        String::new()
    };
    let model = match kind {
        PotentialKind::Magnetic { field: FieldDirection::Year(year), .. } => {
            format!(" (the main field by {} in {year}, Alken et al. 2021)", ReferenceField::MODEL)
        }
        _ => String::new(),
    };
    format!(
        "The anomaly was turned into pseudo-gravity with inclination {}\u{b0} and declination {}\u{b0} from true north \
         ({}\u{b0} from the frame's grid north){model}, {own} and {DENSITY_PER_MAGNETISATION} kg/m\u{b3} of density standing for \
         1 A/m, a scale that moves no contact.{guard} ",
        significant(inclination, 4),
        significant(declination, 4),
        significant(declination + true_north, 4)
    )
}
