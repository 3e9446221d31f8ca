//! The whole program on a 512 x 512 frame with 10 depths and 5 distances, every shift: seconds and peak memory.
//!
//! `cargo bench --bench whole_run`. The target is 6 s and 600 MB on 2 cores.

use std::path::Path;
use std::process::Command;
use std::time::Instant;

use ndarray::Array2;
use salband::grid::{Crs, Frame, Grid, write_raster};

#[path = "../tests/calibration/fields.rs"]
#[allow(dead_code, reason = "only the random fields are wanted here")]
mod fields;

use fields::{Smoothness, pair};

const SIDE: usize = 512;
const DEPTHS: usize = 10;

fn main() -> Result<(), Box<dyn std::error::Error>> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("target/whole_run");
    std::fs::create_dir_all(&folder)?;
    let frame = Frame::new(Crs::from_definition("EPSG:32633")?, 500_000.0, 5_700_000.0, 250.0, SIDE, SIDE)?;
    let write = |name: &str, values: Array2<f64>, unit: &str| -> Result<(), Box<dyn std::error::Error>> {
        Ok(write_raster(&folder.join(name), &Grid::new(frame.clone(), values)?, name, unit)?)
    };
    let [gravity, _] = pair(1, (SIDE, SIDE), 20.0, Smoothness::Twice);
    write("gravity.tif", gravity * 5.0, "mGal")?;
    let mut slices = String::new();
    for depth in 0..DEPTHS {
        let [field, _] = pair(2 + depth as u64, (SIDE, SIDE), 8.0, Smoothness::Once);
        write(&format!("rho_{depth}.tif"), field * 0.5 + 2.5, "log10 ohm m")?;
        slices += &format!("  {{ path = \"rho_{depth}.tif\", depth = {}.0 }},\n", 500 * (depth + 1));
    }
    let study = format!(
        "title = \"Timing\"\n[conductivity]\nquantity = \"log10-resistivity\"\nslices = [\n{slices}]\n\
         [[potential]]\nname = \"gravity\"\npath = \"gravity.tif\"\n\
         [test]\nwithin = [250.0, 500.0, 750.0, 1000.0, 1250.0]\n"
    );
    std::fs::write(folder.join("study.toml"), study)?;
    let program = env!("CARGO_BIN_EXE_salband");
    let mut best = f64::INFINITY;
    for _ in 0..3 {
        let began = Instant::now();
        // The shell's own report of its children's largest memory is the program's.
        let script = format!(
            "import resource,subprocess;subprocess.run({:?},check=True);\
             print(resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss)",
            [program, "run", "study.toml", "--out", "out", "--replace", "--threads", "2"]
        );
        let done = Command::new("python3").args(["-c", &script]).current_dir(&folder).output()?;
        if !done.status.success() {
            return Err(String::from_utf8_lossy(&done.stderr).into_owned().into());
        }
        best = best.min(began.elapsed().as_secs_f64());
        let text = String::from_utf8_lossy(&done.stdout);
        let kilobytes: f64 = text.lines().last().unwrap_or("0").trim().parse()?;
        println!("{:.2} s, {:.0} MB", began.elapsed().as_secs_f64(), kilobytes / 1024.0);
    }
    println!(
        "whole run, {SIDE} x {SIDE} cells, {DEPTHS} depths, 5 distances, every shift: best {best:.2} s (target 6 s)"
    );
    Ok(())
}
