//! Which references a study has, and which of them are one to the reader.

use super::plan::Plan;
use super::settings::{Resolution, UnitRole};
use crate::evidence::{distance_label, file_stem};

/// A reference as the reader knows it: a curve over depth. It is one layer for all slices, or one for each slice where the
/// height of continuation follows the depth.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Series {
    /// A potential field at one height, m, for every slice.
    Height {
        /// Index of the field.
        potential: usize,
        /// The height.
        height: f64,
    },
    /// A potential field at a height tied to the depth of each slice.
    ByDepth {
        /// Index of the field.
        potential: usize,
    },
    /// A potential field at the height that gives it the resolving length of its slice.
    Matched {
        /// Index of the field.
        potential: usize,
    },
    /// Mapped lines, by index.
    Lines(usize),
    /// Mapped units that stay, by index.
    Units(usize),
}

impl Series {
    /// Index of the potential field, if it is one.
    pub fn potential(self) -> Option<usize> {
        match self {
            Self::Height { potential, .. } | Self::ByDepth { potential } | Self::Matched { potential } => {
                Some(potential)
            }
            Self::Lines(_) | Self::Units(_) => None,
        }
    }

    /// True if it is ground rather than lines, so that being inside is tested.
    pub fn is_area(self) -> bool {
        matches!(self, Self::Units(_))
    }

    /// True if it is a potential field, with a gradient to correlate.
    pub fn is_field(self) -> bool {
        self.potential().is_some()
    }

    /// True if units that are moved meet it: it does not belong to a slice.
    pub fn meets_units(self) -> bool {
        matches!(self, Self::Height { .. } | Self::Lines(_) | Self::Units(_))
    }
}

impl Plan {
    /// Every series of references, in the order of the study.
    pub fn series(&self) -> Vec<Series> {
        let mut series = Vec::new();
        for (potential, field) in self.study.potentials.iter().enumerate() {
            match (self.study.test.resolution, &field.heights) {
                (Resolution::Matched, _) => series.push(Series::Matched { potential }),
                (Resolution::AsIs, Some(heights)) => {
                    series.extend(heights.iter().map(|height| Series::Height { potential, height: *height }));
                }
                (Resolution::AsIs, None) => {
                    series.push(Series::Height { potential, height: 0.0 });
                    if (0..self.slices.len()).any(|slice| self.tied_height(slice).is_some()) {
                        series.push(Series::ByDepth { potential });
                    }
                }
            }
        }
        series.extend((0..self.study.lines.len()).map(Series::Lines));
        let stays = |index: &usize| self.study.units[*index].role == UnitRole::Reference;
        series.extend((0..self.study.units.len()).filter(stays).map(Series::Units));
        series
    }

    /// The height of continuation, m, that belongs to a slice; `None` where it would be less than half a cell, which is
    /// height 0.
    pub fn tied_height(&self, slice: usize) -> Option<f64> {
        let height = self.study.test.height_per_depth * self.slices[slice].depth;
        (height >= 0.5 * self.frame.cell).then_some(height)
    }

    /// The slices that a series is compared with.
    pub fn slices_met(&self, series: Series) -> Vec<usize> {
        let all = 0..self.slices.len();
        match series {
            Series::ByDepth { .. } => all.filter(|slice| self.tied_height(*slice).is_some()).collect(),
            _ => all.collect(),
        }
    }

    /// How many layers a series holds.
    pub fn layers_of(&self, series: Series) -> usize {
        match series {
            Series::ByDepth { .. } | Series::Matched { .. } => self.slices_met(series).len(),
            _ => 1,
        }
    }

    /// What a series is called.
    pub fn series_label(&self, series: Series) -> String {
        let contacts = |potential: usize| format!("{} contacts", self.study.potentials[potential].name);
        match series {
            Series::Height { potential, height } if height > 0.0 => {
                format!("{} (continued up {})", contacts(potential), distance_label(height))
            }
            Series::Height { potential, .. } => contacts(potential),
            Series::ByDepth { potential } => {
                format!("{} (continued up {} of the depth)", contacts(potential), self.share_label())
            }
            Series::Matched { potential } => format!("{} (at a common resolution)", contacts(potential)),
            Series::Lines(index) => self.study.lines[index].name.clone(),
            Series::Units(index) => self.study.units[index].name.clone(),
        }
    }

    /// The height for a metre of depth, in words.
    pub(super) fn share_label(&self) -> String {
        match self.study.test.height_per_depth {
            0.5 => "half".into(),
            share => format!("{share}"),
        }
    }

    /// The stem of file names and columns of a series.
    pub fn series_stem(&self, series: Series) -> String {
        let field = |potential: usize| file_stem(&self.study.potentials[potential].name);
        match series {
            Series::Height { potential, height } => format!("{}_{height}", field(potential)),
            Series::ByDepth { potential } => format!("{}_by_depth", field(potential)),
            Series::Matched { potential } => format!("{}_matched", field(potential)),
            Series::Lines(index) => file_stem(&self.study.lines[index].name),
            Series::Units(index) => file_stem(&self.study.units[index].name),
        }
    }

    /// How near a subject is, in words: "inside NAME", "within 500 m of NAME".
    pub(super) fn near_label(&self, series: Series, within: f64) -> String {
        let label = self.series_label(series);
        if within == 0.0 { format!("inside {label}") } else { format!("within {} of {label}", distance_label(within)) }
    }
}
