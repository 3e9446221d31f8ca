//! What was put into the ground, written down in words.

use crate::bodies::{Body, CORNER, FIELD_ANGLES, FIELD_STRENGTH, SIZE};
use crate::sanity::Line;
use crate::survey::{Deposit, NOISE};
use crate::world::{BACKGROUND, COVER_LEVEL, DECOY_SHARE, PLANTED_DEPTHS, World};

/// Everything the truth files tell.
#[derive(Debug)]
pub struct Truth<'a> {
    /// The seed.
    pub seed: u64,
    /// The bodies.
    pub bodies: &'a [Body],
    /// The ground.
    pub world: &'a World,
    /// The deposits.
    pub deposits: &'a [Deposit],
    /// The check on the invention.
    pub check: &'a [Line],
}

impl Truth<'_> {
    /// The truth in plain words, as Markdown.
    pub fn words(&self) -> String {
        let [mean, spread] = BACKGROUND;
        let [gravity_noise, magnetic_noise] = NOISE;
        let [inclination, declination] = FIELD_ANGLES;
        let (with, bare) = (self.kilometres(true), self.kilometres(false));
        format!(
            r#"# What lies under Brindle Plain

Seed {seed}. Coordinates are EPSG:32633. The place is invented.

## In short

- At {planted} m conductors follow some margins (table below), on the outer side: beside the dense body,
  not in it. They are pods of 500 to 1,800 m width and up to 6.5 km length, winding, with gaps between.
- All other margins are bare at every depth, though many are as strong.
- At the other depths nothing ties conductors to margins.
- The light body (Juniper) has bare margins only, and so has the body that only the magnetics show (Larch).

## Bodies

Right rectangular prisms, laid out by hand; strike is clockwise from grid north; the density is a contrast.

| body | easting (m) | northing (m) | length (m) | width (m) | strike (deg) | top (m) | bottom (m) | kg/m3 | SI |
| --- | ---: | ---: | ---: | ---: | ---: | ---: | ---: | ---: | ---: |
{bodies}
## Margins

Each margin is named for the direction in which it faces; where it has conductors, they lie on that side of it.

| body | with conductors at {planted} m | bare |
| --- | --- | --- |
{margins}
Of the margins that gravity can show, {with:.0} km have conductors and {bare:.0} km are bare.

## Decoys and background

Decoys are pods of the same make at random places and in random directions; their draw does not know where the bodies
are. At the unplanted depths they cover as much ground as the planted conductors do at theirs; at the planted depths
{DECOY_SHARE} of that. About half go on to the next depth. Middles inside the area, easting and northing in km:

{decoys}
The background is a random field with mean {mean} and standard deviation {spread} in log10 ohm m, of two scales
(Gaussian kernels of 2,000 and 900 m), like its neighbour above (weights 0.6 old, 0.8 new). Conductors have
10^0.8 to 10^1.3 ohm m. All of it is smoothed in log10 by a Gaussian with a sigma of 0.15 x depth + 200 m. At 150 and
400 m a cover of about 10^{COVER_LEVEL} ohm m and of uneven thickness (`cover_thickness.tif`) hides part of the area; it
knows nothing of the bodies. The ragged edge and the three holes of the resistivity model are by lot too.

## Fields

Gravity by the closed form for a prism (Nagy 1966; Plouff 1976), magnetics by Plouff 1976 (Blakely 1995), induced by a
field of {FIELD_STRENGTH} nT, inclination {inclination}, declination {declination} from grid north; the direction is
part of the invention. Added: a plane and one long wave (140 km in gravity, 120 km in magnetics), and normal noise of
{gravity_noise} mGal and {magnetic_noise} nT, independent from cell to cell.

## Deposits

{deposits}
## A check

Conductors here are the most conductive 15 % of the ground at each depth; the ratio is their share within 1 km of
margins over the ground's share. Without a tie it is near 1. Margins are those of all bodies with a density contrast,
bare ones too; crests are those of the horizontal gradient of the gravity grid.

{check}
The seed is the first from 20260401 on with ratios from 0.75 to 1.25 at every unplanted depth and of 1.8 or more at
every planted one: chosen for a clear lesson, not a fair draw. Over the 40 seeds from 20260401 the unplanted ratios had
means from 0.96 to 1.02 and standard deviations from 0.14 to 0.17 by depth; the planted ones had means from 1.76 to
1.86.
"#,
            seed = self.seed,
            planted = list(&PLANTED_DEPTHS),
            bodies = self.bodies.iter().map(body_row).collect::<String>(),
            margins = self.bodies.iter().map(margins_row).collect::<String>(),
            decoys = self.decoys(),
            deposits = self.deposits.iter().map(deposit_row).collect::<String>(),
            check = check_table(self.check),
        )
    }

    /// Length of the margins that gravity can show, with conductors or bare, km.
    fn kilometres(&self, planted: bool) -> f64 {
        let margins = self.bodies.iter().filter(|body| body.density != 0.0).flat_map(Body::margins);
        margins.filter(|margin| margin.planted == planted).map(|margin| margin.length() / 1000.0).sum()
    }

    /// One line a depth with the middles of its decoys.
    fn decoys(&self) -> String {
        let mut text = String::new();
        for slice in &self.world.slices {
            let middles = slice.decoys.iter().map(|pod| pod.middle()).filter(|place| in_area(*place));
            let middles: Vec<_> = middles.map(|[x, y]| format!("({:.1}, {:.1})", x / 1000.0, y / 1000.0)).collect();
            text += &format!("- {} m, {} decoys: {}\n", slice.depth, middles.len(), middles.join(" "));
        }
        text
    }
}

/// The check as a table in Markdown.
pub fn check_table(lines: &[Line]) -> String {
    let mut text = String::from(
        "| depth (m) | planted | conductors near (%) | ground near (%) | ratio, margins | ratio, crests |\n\
         | ---: | --- | ---: | ---: | ---: | ---: |\n",
    );
    for line in lines {
        let (conductors, ground) = (100.0 * line.conductors_near, 100.0 * line.ground_near);
        let planted = if line.planted { "yes" } else { "no" };
        text += &format!(
            "| {} | {planted} | {conductors:.1} | {ground:.1} | {:.2} | {:.2} |\n",
            line.depth, line.by_margins, line.by_crests
        );
    }
    text
}

fn body_row(body: &Body) -> String {
    let Body { name, centre: [x, y], size: [length, width], strike, depth: [top, bottom], density, .. } = body;
    let susceptibility = body.susceptibility;
    format!(
        "| {name} | {x} | {y} | {length} | {width} | {strike} | {top} | {bottom} | {density} | {susceptibility} |\n"
    )
}

fn margins_row(body: &Body) -> String {
    let sides = |planted: bool| {
        let margins = body.margins().into_iter().filter(|margin| margin.planted == planted);
        let names: Vec<_> =
            margins.map(|margin| format!("{} ({:.1} km)", margin.faces, margin.length() / 1000.0)).collect();
        if names.is_empty() { "none".to_string() } else { names.join(", ") }
    };
    format!("| {} | {} | {} |\n", body.name, sides(true), sides(false))
}

fn deposit_row(deposit: &Deposit) -> String {
    match &deposit.margin {
        Some(margin) => format!("- {}: beside the {margin} margin, at a planted conductor\n", deposit.name),
        None => format!("- {}: anywhere, by lot\n", deposit.name),
    }
}

/// Whether a place lies in the survey area.
pub fn in_area(place: [f64; 2]) -> bool {
    (0..2).all(|i| place[i] > CORNER[i] && place[i] < CORNER[i] + SIZE[i])
}

/// Numbers as in "1500, 2500 and 4000".
fn list(numbers: &[f64]) -> String {
    let words: Vec<String> = numbers.iter().map(f64::to_string).collect();
    match words.split_last() {
        Some((last, rest)) if !rest.is_empty() => format!("{} and {last}", rest.join(", ")),
        _ => words.concat(),
    }
}
