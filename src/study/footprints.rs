//! Where the layers have data once they are placed: for the plan, before a run.

use std::fmt::Write as _;

use super::plan::Plan;
use crate::coincidence::{LONGEST_SHIFT, Reach};
use crate::error::Result;
use crate::grid::Mask;

impl Plan {
    /// Places every raster and says how much of the frame each covers, how much of it the slices share with each
    /// potential field, and how far the conductors will be displaced.
    ///
    /// # Errors
    /// Layers that cannot be read or placed, and values that cannot be resistivities: what a run would refuse as well.
    pub fn describe_footprints(&self) -> Result<String> {
        let quantity = self.study.conductivity.quantity;
        let cells = self.frame.rows * self.frame.cols;
        let share =
            |mask: &Mask| format!("{} cells ({:.0} %)", mask.count(), 100.0 * mask.count() as f64 / cells as f64);
        let mut fields = Vec::new();
        let mut text = String::from("Footprints:\n");
        let (mapped, _) = self.read_small_files()?;
        // Writing to a String cannot fail.
        for (choice, found) in self.study.units.iter().zip(&mapped.units) {
            let _ = writeln!(text, "  {:<24} {}, features kept: {}", choice.name, share(&found.mask), found.features);
        }
        for (field, planned) in self.study.potentials.iter().zip(&self.potentials) {
            let placed = planned.layer.source.open()?.place(planned.layer.band, &self.frame, Ok)?;
            let footprint = placed.grid.footprint();
            let _ = writeln!(text, "  {:<24} {}", field.name, share(&footprint));
            fields.push((&field.name, footprint));
        }
        let mut told = None;
        for slice in &self.slices {
            let raster = slice.layer.source.open()?;
            let placed = raster.place(slice.layer.band, &self.frame, |values| quantity.to_log10_resistivity(values))?;
            let footprint = placed.grid.footprint();
            let mut line = share(&footprint);
            for (name, field) in &fields {
                let both = footprint.and(field);
                let _ = write!(line, "; {} with {name}", both.count());
                if let (None, Some(((top, left), (bottom, right)))) = (told, both.bounds()) {
                    told = Some(Reach::of_box(bottom - top + 1, right - left + 1));
                }
            }
            let _ = writeln!(text, "  {:<24} {line}", format!("resistivity {} m", slice.depth));
        }
        if let Some(Reach { rows, cols }) = told {
            let _ = writeln!(
                text,
                "  displaced by up to {rows} rows and {cols} columns, {LONGEST_SHIFT} of the footprint's sides"
            );
        }
        Ok(text)
    }
}
