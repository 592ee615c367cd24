//! Which sites a call names.

use std::path::{Path, PathBuf};

use crate::fault::{Fault, Result};
use crate::record::{Disk, Source};

/// A site: its name and the files that are read together.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Site {
    pub(super) name: String,
    pub(super) files: Vec<PathBuf>,
}

/// The sites in the order given, those of each `--each` folder by name.
pub(super) fn list(paths: &[PathBuf], each: &[PathBuf]) -> Result<Vec<Site>> {
    let mut sites: Vec<Site> = paths.iter().map(|path| site(path)).collect::<Result<_>>()?;
    for folder in each {
        for entry in entries(folder)? {
            sites.push(site(&entry)?);
        }
    }
    if sites.is_empty() {
        return Err(Fault::new(
            "no site is named",
            "command line",
            "Name files or folders, or a folder of sites with --each FOLDER.",
        ));
    }
    Ok(sites)
}

/// Whether a file is a case file: an object of JSON, which no meter file is.
pub(super) fn is_case(path: &Path) -> Result<bool> {
    let mut head = [0; 64];
    let mut file = Disk::open(path)?;
    let count = file.read_at(0, &mut head)?;
    let head = head[..count].strip_prefix(b"\xef\xbb\xbf").unwrap_or(&head[..count]);
    Ok(head.trim_ascii_start().first() == Some(&b'{'))
}

fn site(path: &Path) -> Result<Site> {
    let files = if path.is_dir() {
        entries(path)?.into_iter().filter(|entry| entry.is_file()).collect()
    } else {
        vec![path.to_owned()]
    };
    Ok(Site { name: name(path), files })
}

/// A folder's entries by name, hidden ones left out.
fn entries(folder: &Path) -> Result<Vec<PathBuf>> {
    let failed = |error: std::io::Error| {
        Fault::new(
            format!("the folder cannot be read: {error}"),
            folder.display().to_string(),
            "Check the path, and that you may read it.",
        )
    };
    let mut entries = std::fs::read_dir(folder)
        .map_err(failed)?
        .map(|entry| entry.map(|entry| entry.path()).map_err(failed))
        .collect::<Result<Vec<_>>>()?;
    entries.retain(|path| !path.file_name().is_some_and(|name| name.to_string_lossy().starts_with('.')));
    entries.sort();
    Ok(entries)
}

fn name(path: &Path) -> String {
    let full = path.canonicalize().unwrap_or_else(|_| path.to_owned());
    let name = full
        .file_name()
        .map_or_else(|| path.display().to_string(), |name| name.to_string_lossy().into_owned());
    if full.is_dir() { name } else { crate::record::site_name(&name) }
}
