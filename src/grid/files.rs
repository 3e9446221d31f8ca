//! The files that belong to a dataset: what a virtual raster points to, projection and world files, the parts of a shapefile.

use std::ffi::CStr;
use std::path::{Path, PathBuf};

use gdal::{Dataset, DatasetOptions, GdalOpenFlags};

use super::source::silence_gdal;

/// Every file that an open dataset is read from, as GDAL lists them; empty where it lists none.
pub(super) fn files_of(dataset: &Dataset) -> Vec<PathBuf> {
    // SAFETY: the handle comes from a live `Dataset`; the list returned is ours to free and may be null.
    let list = unsafe { gdal_sys::GDALGetFileList(dataset.c_dataset()) };
    let mut files = Vec::new();
    if list.is_null() {
        return files;
    }
    let mut at = list;
    // SAFETY: the list is an array of pointers to null-terminated strings that ends with a null pointer, so every read up
    // to and including that one lies inside it; each text is copied.
    unsafe {
        while !(*at).is_null() {
            files.push(PathBuf::from(CStr::from_ptr(*at).to_string_lossy().into_owned()));
            at = at.add(1);
        }
    }
    // SAFETY: the list came from GDALGetFileList, which hands over ownership, and is freed only here.
    unsafe { gdal_sys::CSLDestroy(list) };
    files
}

/// Every file that a vector file is read from; the path itself where GDAL lists none.
pub fn files_of_vector(path: &Path) -> Vec<PathBuf> {
    silence_gdal();
    let options = DatasetOptions { open_flags: GdalOpenFlags::GDAL_OF_VECTOR, ..DatasetOptions::default() };
    let files = Dataset::open_ex(path, options).map(|dataset| files_of(&dataset)).unwrap_or_default();
    if files.is_empty() { vec![path.to_path_buf()] } else { files }
}
