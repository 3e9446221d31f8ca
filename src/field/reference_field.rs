//! The earth's main magnetic field at a place and time, from the International Geomagnetic Reference Field.

use time::Date;

use crate::error::{Error, Result};

/// The main field at a place and time.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ReferenceField {
    /// Degrees below the horizon; negative where the field points upward.
    pub inclination: f64,
    /// Degrees clockwise from true north, -180 to 180.
    pub declination: f64,
    /// Total intensity, nT.
    pub intensity: f64,
}

impl ReferenceField {
    /// Name of the model, for provenance.
    pub const MODEL: &'static str = "IGRF-13";
    /// First and last decimal year for which the model was published.
    pub const YEARS: (f64, f64) = (1900.0, 2025.0);
    /// The least horizontal intensity, nT, at which a declination means something.
    const LEAST_HORIZONTAL: f64 = 100.0;
}

/// The main field by the 13th generation of the International Geomagnetic Reference Field (Alken et al. 2021, Earth,
/// Planets and Space 73, 49).
///
/// `longitude` and `latitude` in degrees (WGS 84, latitude geodetic), `height_m` above the ellipsoid, `decimal_year` such as
/// 1998.5, taken to the nearest day. The declination is from true north; grid north differs by the convergence
/// ([`crate::grid::true_north`]). The crust's own field, some hundreds of nT, is not in it.
///
/// # Errors
/// A longitude outside -360 to 360 or a latitude outside -90 to 90; a height outside 0 to 100,000 m; a time outside
/// [`ReferenceField::YEARS`]; a place at a geographic or magnetic pole, where no declination exists.
pub fn reference_field(longitude: f64, latitude: f64, height_m: f64, decimal_year: f64) -> Result<ReferenceField> {
    let outside = |thing: &str, found: f64, wanted: &str| Error::input(thing).found(found).wanted(wanted);
    if !(-360.0..=360.0).contains(&longitude) {
        return Err(outside("the longitude", longitude, "degrees between -360 and 360"));
    }
    if !(-90.0..=90.0).contains(&latitude) {
        return Err(outside("the latitude", latitude, "degrees between -90 and 90"));
    }
    if !(0.0..=100_000.0).contains(&height_m) {
        return Err(outside("the height of the magnetic survey", height_m, "0 to 100,000 m above the ellipsoid"));
    }
    let (first, last) = ReferenceField::YEARS;
    if !(first..=last).contains(&decimal_year) {
        let wanted = format!("{first} to {last}, the years of {}", ReferenceField::MODEL);
        return Err(outside("the year of the magnetic survey", decimal_year, &wanted)
            .mend("state inclination and declination from a model that covers the date"));
    }
    let date = date_of(decimal_year)?;
    // The last day counts as past the end there, and the field comes with that remark; our own check is above.
    let field = match igrf::declination(latitude, longitude, height_m.round() as u32, date) {
        Ok(field) | Err(igrf::Error::DateOutOfRange(field)) => field,
        Err(error) => return Err(Error::ours("evaluating the geomagnetic reference field").because(error)),
    };
    if field.h < ReferenceField::LEAST_HORIZONTAL || !field.d.is_finite() {
        return Err(Error::input("the place of the magnetic survey")
            .found(format!("{longitude}, {latitude}, at a geographic or magnetic pole"))
            .wanted("a place where the field has a declination")
            .mend("state inclination and declination"));
    }
    Ok(ReferenceField { inclination: field.i, declination: field.d, intensity: field.f })
}

/// The day nearest to a decimal year; the first moment of a year is its first day.
fn date_of(decimal_year: f64) -> Result<Date> {
    let year = decimal_year.floor() as i32;
    let days = f64::from(time::util::days_in_year(year));
    // The model's own convention: the n-th day of a year of N days is the fraction n / N.
    let day = (decimal_year.fract() * days).round().clamp(1.0, days) as u16;
    Date::from_ordinal_date(year, day)
        .map_err(|error| Error::ours(format!("turning the year {decimal_year} into a date")).because(error))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn agrees_with_another_program_on_the_same_coefficients() {
        // Inclination, declination and intensity from ppigrf 2.1.0 (PyPI, MIT; numpy) with its file IGRF13.shc:
        // igrf(longitude, latitude, height in km, date). Places are arbitrary; one lies near the magnetic pole.
        let cases = [
            ([15.0, 50.0, 0.0, 2020.0000], [66.057, 4.459, 49239.8]),
            ([15.0, 50.0, 0.0, 2024.4973], [66.168, 5.190, 49507.1]),
            ([147.0, -33.0, 120.0, 1998.4986], [-64.305, 10.893, 57657.1]),
            ([-61.0, -15.0, 300.0, 1987.4986], [-5.551, -8.894, 24664.7]),
            ([121.5, -30.75, 60.0, 2012.4973], [-64.531, 1.027, 57838.3]),
            ([25.0, 68.0, 80.0, 1975.4986], [76.871, 5.570, 52523.6]),
            ([-105.0, 58.0, 5000.0, 2005.4986], [80.105, 11.980, 59508.3]),
            ([28.0, -26.0, 1500.0, 1932.4973], [-61.476, -16.874, 34086.2]),
            ([-179.5, 5.0, 0.0, 2015.0000], [5.412, 9.218, 33162.8]),
            ([15.0, 50.0, 0.0, 1900.0027], [64.560, -8.827, 46481.3]),
            ([70.0, 80.0, 0.0, 2019.4986], [85.824, 44.865, 57634.2]),
            ([15.0, 50.0, 0.0, 2024.9973], [66.180, 5.271, 49537.0]),
        ];
        for ([longitude, latitude, height, year], [inclination, declination, intensity]) in cases {
            let field = reference_field(longitude, latitude, height, year).unwrap();
            assert!((field.inclination - inclination).abs() < 0.05, "{longitude}, {latitude}, {year}: {field:?}");
            assert!((field.declination - declination).abs() < 0.05, "{longitude}, {latitude}, {year}: {field:?}");
            assert!((field.intensity - intensity).abs() < 5.0, "{longitude}, {latitude}, {year}: {field:?}");
        }
    }

    #[test]
    fn the_ends_of_the_model_are_inside_and_join_on() {
        for (end, inner) in [(1900.0, 1900.01), (2025.0, 2024.99)] {
            let [end, inner] = [end, inner].map(|year| reference_field(15.0, 50.0, 0.0, year).unwrap());
            // The field turns by some tenths of a degree a year at most here.
            assert!((end.declination - inner.declination).abs() < 0.01, "{end:?} {inner:?}");
        }
    }

    #[test]
    fn each_value_out_of_range_is_refused() {
        let refused =
            |place: [f64; 4]| reference_field(place[0], place[1], place[2], place[3]).unwrap_err().to_string();
        assert_eq!(
            refused([15.0, 50.0, 0.0, 2026.25]),
            "the year of the magnetic survey: found 2026.25; wanted 1900 to 2025, the years of IGRF-13. To mend it: state \
             inclination and declination from a model that covers the date."
        );
        assert!(refused([15.0, 50.0, 0.0, 1899.9]).starts_with("the year of the magnetic survey: found 1899.9"));
        assert!(refused([15.0, 50.0, 0.0, f64::NAN]).starts_with("the year of the magnetic survey: found NaN"));
        let longitude = "the longitude: found 361; wanted degrees between -360 and 360.";
        assert_eq!(refused([361.0, 50.0, 0.0, 2000.0]), longitude);
        assert!(refused([f64::NAN, 50.0, 0.0, 2000.0]).starts_with("the longitude: found NaN"));
        let latitude = "the latitude: found -90.5; wanted degrees between -90 and 90.";
        assert_eq!(refused([15.0, -90.5, 0.0, 2000.0]), latitude);
        assert!(refused([15.0, f64::NAN, 0.0, 2000.0]).starts_with("the latitude: found NaN"));
        assert_eq!(
            refused([15.0, 50.0, -1.0, 2000.0]),
            "the height of the magnetic survey: found -1; wanted 0 to 100,000 m above the ellipsoid."
        );
        assert!(refused([15.0, 50.0, f64::NAN, 2000.0]).starts_with("the height of the magnetic survey: found NaN"));
        assert_eq!(
            refused([15.0, 90.0, 0.0, 2000.0]),
            "the place of the magnetic survey: found 15, 90, at a geographic or magnetic pole; wanted a place where the \
             field has a declination. To mend it: state inclination and declination."
        );
    }
}
