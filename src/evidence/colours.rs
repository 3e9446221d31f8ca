//! Colour maps for rasters.

/// How numbers become colours. All are perceptually uniform or plain greys, and safe for the colour-blind.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Colours {
    /// Quiet greys, darker where the value is high: a background that other things are drawn on.
    Quiet,
    /// Warm to cool: the low end is warm. For resistivity.
    WarmLow,
}

impl Colours {
    /// Red, green and blue at `position`, 0 for the low end and 1 for the high one; outside, the nearer end.
    ///
    /// The map from warm to cool is cividis (Nunez, Anderton & Renslow 2018, doi 10.1371/journal.pone.0199239).
    pub(super) fn at(self, position: f64) -> [u8; 3] {
        let position = position.clamp(0.0, 1.0);
        match self {
            Self::Quiet => {
                let level = |low: f64, high: f64| (low + (high - low) * position).round() as u8;
                [level(246.0, 150.0), level(247.0, 155.0), level(247.0, 160.0)]
            }
            Self::WarmLow => {
                let colour = colorous::CIVIDIS.eval_continuous(1.0 - position);
                [colour.r, colour.g, colour.b]
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn warm_is_yellow_and_lightness_never_turns() {
        let [red, _, blue] = Colours::WarmLow.at(0.0);
        assert!(red > 200 && blue < 100);
        assert_eq!(Colours::WarmLow.at(7.0), Colours::WarmLow.at(1.0));
        // Relative luminance of ITU-R BT.709, on the encoded values: enough to see a turn.
        let light = |colours: Colours, step: usize| {
            let [r, g, b] = colours.at(step as f64 / 32.0).map(f64::from);
            0.2126 * r + 0.7152 * g + 0.0722 * b
        };
        for step in 0..32 {
            assert!(light(Colours::WarmLow, step) > light(Colours::WarmLow, step + 1));
            assert!(light(Colours::Quiet, step) > light(Colours::Quiet, step + 1));
        }
    }
}
