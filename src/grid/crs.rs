//! Coordinate reference systems: from text and from files, and back.

use geo::{Distance, Geodesic, Point};

use gdal::spatial_ref::{AxisMappingStrategy, CoordTransform, SpatialRef};

use super::reason::Reason;
use super::{Crs, Frame};
use crate::error::{Error, Result};

impl Crs {
    /// Reads a definition as a user writes it: `EPSG:32633`, WKT, or a PROJ string.
    ///
    /// # Errors
    /// When the definition is not understood, or is neither geographic nor projected.
    pub fn from_definition(text: &str) -> Result<Self> {
        let reference = SpatialRef::from_definition(text).map_err(|source| {
            Error::input("the coordinate system")
                .found(format!("{text:?}, which is not understood"))
                .wanted("a code such as EPSG:32633, WKT or a PROJ string")
                .mend("check the code")
                .because(Reason(source))
        })?;
        let mut crs = Self::from_reference(&reference)?;
        if text.len() <= 24 {
            crs.name = text.trim().to_uppercase();
        }
        Ok(crs)
    }

    /// Takes over what a file says of its own system.
    pub(super) fn from_reference(reference: &SpatialRef) -> Result<Self> {
        let geographic = reference.is_geographic() || reference.is_derived_geographic();
        let title = reference.name().unwrap_or_else(|| "unnamed".into());
        if !geographic && !reference.is_projected() {
            return Err(Error::input("the coordinate system")
                .found(format!("{title}, which is neither geographic nor projected"))
                .wanted("a system that ties coordinates to places on the earth")
                .mend("state crs for this layer in the study"));
        }
        let wkt = reference.to_wkt().map_err(|source| Error::input("the coordinate system").because(Reason(source)))?;
        // Files often carry a well-known system without its code.
        let mut known = reference.clone();
        let mut code = || known.auto_identify_epsg().and_then(|()| known.authority());
        let name = reference.authority().or_else(|_| code()).unwrap_or(title);
        Ok(Self { name, wkt, geographic, metres_per_unit: if geographic { 1.0 } else { reference.linear_units() } })
    }

    /// The definition to write into a study: the code where there is one, the WKT otherwise.
    pub fn definition(&self) -> &str {
        let coded = self.name.split_once(':').is_some_and(|(_, code)| code.chars().all(|c| c.is_ascii_digit()));
        if coded { &self.name } else { &self.wkt }
    }

    /// The system for GDAL, with coordinates in the order (x or longitude, y or latitude).
    pub(super) fn reference(&self) -> Result<SpatialRef> {
        let mut reference = SpatialRef::from_wkt(&self.wkt).map_err(|source| {
            Error::ours(format!("using the coordinate system {}", self.name)).because(Reason(source))
        })?;
        reference.set_axis_mapping_strategy(AxisMappingStrategy::TraditionalGisOrder);
        Ok(reference)
    }

    /// The transformation of coordinates into another system.
    pub(super) fn transform_to(&self, other: &Self) -> Result<CoordTransform> {
        CoordTransform::new(&self.reference()?, &other.reference()?).map_err(|source| {
            Error::input("the coordinate systems")
                .found(format!("no way from {} to {}", self.name, other.name))
                .wanted("two systems on the same body")
                .because(Reason(source))
        })
    }

    /// The UTM zone (WGS 84) of a longitude and latitude in degrees.
    ///
    /// # Errors
    /// When the system cannot be built.
    pub fn utm_at(longitude: f64, latitude: f64) -> Result<Self> {
        let zone = (((longitude + 180.0) / 6.0).floor() as i64).rem_euclid(60) + 1;
        let code = if latitude < 0.0 { 32700 } else { 32600 } + zone;
        Self::from_definition(&format!("EPSG:{code}"))
    }
}

/// Metres on the ground, along the geodesic, for one metre of a projected system at a place: the mean over 1 km to the east
/// and 1 km to the north.
///
/// # Errors
/// When the place has no longitude and latitude.
pub fn ground_scale(crs: &Crs, (x, y): (f64, f64)) -> Result<f64> {
    let geographic = Crs::from_definition("EPSG:4326")?;
    let places = carry(&[(x, y), (x + 1000.0, y), (x, y + 1000.0)], crs, &geographic)?;
    let [here, east, north] =
        [places[0], places[1], places[2]].map(|(longitude, latitude)| Point::new(longitude, latitude));
    let scale = (Geodesic.distance(here, east) + Geodesic.distance(here, north)) / 2000.0;
    if scale.is_finite() && scale > 0.0 {
        return Ok(scale);
    }
    Err(Error::input("the coordinate system")
        .found(format!("{x}, {y} in {}, which is no place on the earth", crs.name))
        .wanted("coordinates inside its area"))
}

/// Azimuth of true north at the middle of a frame, degrees clockwise from grid north.
///
/// # Errors
/// When the frame has no place on the earth.
pub fn true_north(frame: &Frame) -> Result<f64> {
    let geographic = Crs::from_definition("EPSG:4326")?;
    let middle = ((frame.west + frame.east()) / 2.0, (frame.south() + frame.north) / 2.0);
    let (longitude, latitude) = carry(&[middle], &frame.crs, &geographic)?[0];
    // A step of some hundred metres along the meridian, toward the equator's side so that no pole is crossed.
    let step = if latitude > 0.0 { -0.001 } else { 0.001 };
    let ends = carry(&[(longitude, latitude), (longitude, latitude + step)], &geographic, &frame.crs)?;
    let (east, north) = ((ends[1].0 - ends[0].0) / step, (ends[1].1 - ends[0].1) / step);
    let azimuth = east.atan2(north).to_degrees();
    if azimuth.is_finite() {
        return Ok(azimuth);
    }
    Err(Error::input("the frame's middle").found("no place on the earth").wanted("a frame inside its system's area"))
}

/// Carries points from one system into another; a point that cannot be carried comes back as NaN.
///
/// # Errors
/// When the two systems do not belong to one body.
pub fn carry(points: &[(f64, f64)], from: &Crs, into: &Crs) -> Result<Vec<(f64, f64)>> {
    let transform = from.transform_to(into)?;
    let one = |&(x, y): &(f64, f64)| {
        let (mut xs, mut ys) = ([x], [y]);
        match transform.transform_coords(&mut xs, &mut ys, &mut []) {
            Ok(()) => (xs[0], ys[0]),
            Err(_) => (f64::NAN, f64::NAN),
        }
    };
    Ok(points.iter().map(one).collect())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn codes_are_understood_and_told_apart() {
        let utm = Crs::from_definition("epsg:32633").unwrap();
        assert_eq!((utm.name.as_str(), utm.geographic, utm.metres_per_unit), ("EPSG:32633", false, 1.0));
        assert!(Crs::from_definition("EPSG:4326").unwrap().geographic);
        // EPSG:2263 is in US survey feet: 1200/3937 m (EPSG registry, unit 9003).
        let feet = Crs::from_definition("EPSG:2263").unwrap();
        assert!((feet.metres_per_unit - 1200.0 / 3937.0).abs() < 1e-12);
        assert!(Crs::from_definition("EPSG:nowhere").unwrap_err().to_string().contains("not understood"));
    }

    #[test]
    fn a_zone_is_found_from_its_place() {
        // Zone 33 spans 12 to 18 degrees east, 56 spans 150 to 156 (definition of UTM).
        assert_eq!(Crs::utm_at(15.0, 50.0).unwrap().name, "EPSG:32633");
        assert_eq!(Crs::utm_at(151.0, -33.0).unwrap().name, "EPSG:32756");
        assert_eq!(Crs::utm_at(180.0, 1.0).unwrap().name, "EPSG:32601");
    }

    #[test]
    fn a_metre_of_a_web_map_is_less_than_one_on_the_ground() {
        // Spherical Mercator enlarges by about 1 / cos(latitude) (Snyder 1987): at 60 degrees a metre is half a metre, but
        // for the ellipsoid, which makes some tenths of a percent. UTM is 0.9996 on its central meridian by definition.
        let [web, utm] = ["EPSG:3857", "EPSG:32633"].map(|code| Crs::from_definition(code).unwrap());
        let geographic = Crs::from_definition("EPSG:4326").unwrap();
        let at = |crs: &Crs, longitude, latitude| {
            ground_scale(crs, carry(&[(longitude, latitude)], &geographic, crs).unwrap()[0]).unwrap()
        };
        assert!((at(&web, 15.0, 60.0) - 0.5).abs() < 0.003, "{}", at(&web, 15.0, 60.0));
        assert!((at(&utm, 15.0, 50.0) - 1.0 / 0.9996).abs() < 1e-5);
    }

    #[test]
    fn true_north_turns_by_the_convergence() {
        // To first order the grid of a transverse Mercator system is turned by (longitude - central meridian) sin(latitude)
        // clockwise from true north (Snyder 1987, USGS Professional Paper 1395), so true north lies as much to the left.
        let utm = Crs::from_definition("EPSG:32633").unwrap();
        let geographic = Crs::from_definition("EPSG:4326").unwrap();
        for (longitude, latitude) in [(17.0f64, 50.0f64), (12.5, 50.0), (15.0, 10.0), (17.0, -35.0)] {
            let (x, y) = carry(&[(longitude, latitude)], &geographic, &utm).unwrap()[0];
            let frame = Frame::new(utm.clone(), x - 500.0, y + 500.0, 100.0, 10, 10).unwrap();
            let expected = -(longitude - 15.0) * latitude.to_radians().sin();
            let found = true_north(&frame).unwrap();
            assert!((found - expected).abs() < 0.01, "{longitude}, {latitude}: {found} against {expected}");
        }
    }

    #[test]
    fn points_are_carried_in_the_order_x_y() {
        // The central meridian of zone 33 at the equator is (500000, 0) by the definition of UTM.
        let (geographic, utm) = (Crs::from_definition("EPSG:4326"), Crs::from_definition("EPSG:32633"));
        let there = carry(&[(15.0, 0.0)], &geographic.unwrap(), &utm.unwrap()).unwrap();
        assert!((there[0].0 - 500_000.0).abs() < 1e-6 && there[0].1.abs() < 1e-6, "{there:?}");
    }
}
