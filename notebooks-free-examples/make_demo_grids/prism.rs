//! Gravity and magnetic total-field anomaly of a right rectangular prism, in closed form.

/// Newton's constant, m3/(kg s2) (CODATA 2018).
const NEWTON: f64 = 6.674_30e-11;
/// Milligal in one m/s2.
const MILLIGAL: f64 = 1.0e5;

/// A right rectangular prism in a local frame: x and y level, z positive down; all in metres.
#[derive(Debug, Clone, Copy)]
pub struct Prism {
    /// Lower and upper bound in x.
    pub x: [f64; 2],
    /// Lower and upper bound in y.
    pub y: [f64; 2],
    /// Top and bottom.
    pub z: [f64; 2],
}

impl Prism {
    /// Vertical attraction in mGal, positive down, at `at` = (x, y, z) in metres for a density contrast in kg/m3.
    ///
    /// The point must lie above the prism. Closed form of Nagy 1966 and Plouff 1976, as in Blakely 1995.
    pub fn gravity(&self, at: [f64; 3], density: f64) -> f64 {
        let sum = self.corner_sum(at, |[x, y, z], r| {
            z * (x * y / (z * r)).atan() - x * ln_sum(r, y, x, z) - y * ln_sum(r, x, y, z)
        });
        NEWTON * density * sum * MILLIGAL
    }

    /// Total-field anomaly in nT at `at` = (x, y, z) in metres, for magnetisation by induction alone.
    ///
    /// `direction` is the unit vector of the inducing field in (x, y, down), `field` its strength in nT and
    /// `susceptibility` is in SI units. The anomaly is susceptibility x field / (4 pi) times the second derivative
    /// along the field of the integral of 1/r over the prism (Plouff 1976; Blakely 1995). The point must lie above the
    /// prism.
    pub fn total_field_anomaly(&self, at: [f64; 3], susceptibility: f64, field: f64, direction: [f64; 3]) -> f64 {
        let [fx, fy, fz] = direction;
        let sum = self.corner_sum(at, |[x, y, z], r| {
            let diagonal =
                fx * fx * angle(y * z, x * r) + fy * fy * angle(x * z, y * r) + fz * fz * angle(x * y, z * r);
            let mixed = fx * fy * ln_sum(r, z, x, y) + fx * fz * ln_sum(r, y, x, z) + fy * fz * ln_sum(r, x, y, z);
            2.0 * mixed - diagonal
        });
        susceptibility * field / (4.0 * std::f64::consts::PI) * sum
    }

    /// Sums a term over the eight corners, with the sign of the triple integral's bounds.
    fn corner_sum(&self, at: [f64; 3], term: impl Fn([f64; 3], f64) -> f64) -> f64 {
        let mut sum = 0.0;
        for (i, px) in self.x.iter().enumerate() {
            for (j, py) in self.y.iter().enumerate() {
                for (k, pz) in self.z.iter().enumerate() {
                    let corner = [px - at[0], py - at[1], pz - at[2]];
                    let r = corner.iter().map(|side| side * side).sum::<f64>().sqrt();
                    let sign = if (i + j + k) % 2 == 1 { 1.0 } else { -1.0 };
                    sum += sign * term(corner, r);
                }
            }
        }
        sum
    }
}

/// ln(r + a), where r2 = a2 + b2 + c2; written so that a negative `a` loses no digits.
fn ln_sum(r: f64, a: f64, b: f64, c: f64) -> f64 {
    if a >= 0.0 { (r + a).ln() } else { ((b * b + c * c) / (r - a)).ln() }
}

/// atan(a / b). On the plane of a face b is 0; the terms of the two depths then cancel, so 0 stands for both.
fn angle(a: f64, b: f64) -> f64 {
    if b == 0.0 { 0.0 } else { (a / b).atan() }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn close(got: f64, wanted: f64) {
        assert!((got - wanted).abs() <= 1e-9 * wanted.abs(), "got {got}, wanted {wanted}");
    }

    /// Source: reference record `gravity_prism_cube`: an independent closed form in Python (Nagy 1966; Plouff 1976;
    /// Blakely 1995) that agrees with 80^3-point Gauss quadrature to 2e-13.
    #[test]
    fn gravity_of_a_cube() {
        let cube = Prism { x: [-500.0, 500.0], y: [-500.0, 500.0], z: [500.0, 1500.0] };
        let cases = [
            ([0.0, 0.0, 0.0], 6.293849964203659),
            ([600.0, -300.0, 0.0], 3.8780854183065805),
            ([2500.0, 1000.0, 0.0], 0.28136441858481087),
            ([0.0, 0.0, -1000.0], 1.6612982833808996),
        ];
        for (at, wanted) in cases {
            close(cube.gravity(at, 1000.0), wanted);
        }
    }

    /// Source: reference record `gravity_prism_offset_cube_qanda`: exact value, computed independently in Python
    /// (a public question-and-answer thread quotes 2.360 mGal for it).
    #[test]
    fn gravity_beside_a_cube() {
        let cube = Prism { x: [-500.0, 500.0], y: [500.0, 1500.0], z: [500.0, 1500.0] };
        close(cube.gravity([0.0; 3], 1000.0), 2.3663485387603727);
    }

    /// Source: reference record `magnetic_prism_tmi`, computed independently in Python
    /// (57,000 nT, inclination -60, declination 5, susceptibility 0.02).
    #[test]
    fn total_field_of_a_cube() {
        let cube = Prism { x: [-500.0, 500.0], y: [-500.0, 500.0], z: [300.0, 1300.0] };
        let (inclination, declination) = ((-60.0_f64).to_radians(), 5.0_f64.to_radians());
        let direction =
            [inclination.cos() * declination.sin(), inclination.cos() * declination.cos(), inclination.sin()];
        let cases = [
            ([0.0, 0.0, 0.0], 158.04836492185257),
            ([1500.0, 620.0, 0.0], 0.33631561272712535),
            ([-1000.0, 2000.0, 0.0], 2.9729247293277097),
        ];
        for (at, wanted) in cases {
            close(cube.total_field_anomaly(at, 0.02, 57_000.0, direction), wanted);
        }
    }
}
