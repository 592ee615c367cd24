//! The terminal program: many files in, one row per site out, on the engine that the page uses.

mod fields;
mod sites;
mod write;

use std::path::{Path, PathBuf};
use std::process::ExitCode;
use std::rc::Rc;
use std::sync::mpsc;

use clap::Parser;
use rayon::prelude::*;

use crate::assess::{assess, failed};
use crate::case::Case;
use crate::fault::{Fault, Result};
use crate::job::finish;
use crate::record::{Disk, Memory, Source, read, site_of};
use crate::result::SiteResult;
use crate::technology::Catalogue;
use sites::Site;

/// Answers, for each site, what a store would have to do and which kinds could do it.
///
/// A file is one site; a folder is one site whose files are read together. This is screening, not design.
#[derive(Debug, Parser)]
#[command(name = "millpond", version)]
struct Call {
    /// Files and folders, each one site; also case files that carry their record.
    #[arg(value_name = "PATH")]
    paths: Vec<PathBuf>,
    /// A folder of which every entry is a site.
    #[arg(long, value_name = "FOLDER")]
    each: Vec<PathBuf>,
    /// The case: what a person chose, as JSON. Without a PATH its own record is taken.
    #[arg(long, value_name = "FILE")]
    case: Option<PathBuf>,
    /// Writes the list of a case file's fields, and ends.
    #[arg(long)]
    case_fields: bool,
    /// Writes a case file with every field at its default, to be edited, and ends.
    #[arg(long)]
    case_untouched: bool,
    /// Writes the JSON Schema of a case file, and ends.
    #[arg(long)]
    case_schema: bool,
    /// The form of the output: one object, row or paragraph a site.
    #[arg(long, value_enum, default_value = "text")]
    out: Form,
    /// Sites worked on at once; as many as the machine has processors unless said.
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..))]
    jobs: Option<u16>,
    /// Take only every N-th site, starting with the K-th, so that a list can be shared out.
    #[arg(long, value_name = "K/N", value_parser = part)]
    part: Option<(usize, usize)>,
}

/// The form of the output.
#[derive(Debug, Clone, Copy, PartialEq, Eq, clap::ValueEnum)]
enum Form {
    /// A paragraph for people.
    Text,
    /// A JSON object, one a line.
    Json,
    /// A row of a table, with units in the header.
    Csv,
}

fn part(text: &str) -> std::result::Result<(usize, usize), String> {
    let parts = text.split_once('/').and_then(|(k, n)| Some((k.parse().ok()?, n.parse().ok()?)));
    match parts {
        Some((k, n)) if k >= 1 && k <= n => Ok((k, n)),
        _ => Err("give K/N with K from 1 to N, such as 2/8".to_owned()),
    }
}

/// Runs the program with the arguments of the process.
///
/// Exit status: 0 all done; 1 some site failed (its object holds `error`); 2 the call is wrong.
pub fn main() -> ExitCode {
    let call = match Call::try_parse() {
        Ok(call) => call,
        Err(error) => {
            // Asking for help is no mistake.
            let wrong = error.use_stderr();
            let _ = error.print();
            return ExitCode::from(if wrong { 2 } else { 0 });
        }
    };
    if call.case_fields {
        print!("{}", fields::list());
        return ExitCode::SUCCESS;
    }
    if call.case_untouched {
        return match Case::default().to_json() {
            Ok(text) => {
                println!("{text}");
                ExitCode::SUCCESS
            }
            Err(_) => ExitCode::from(1),
        };
    }
    if call.case_schema {
        println!("{:#}", fields::schema());
        return ExitCode::SUCCESS;
    }
    match run(&call) {
        Ok(true) => ExitCode::SUCCESS,
        Ok(false) => ExitCode::from(1),
        Err(fault) => {
            eprintln!("millpond: {}\n  where: {}\n  remedy: {}", fault.what, fault.place, fault.remedy);
            ExitCode::from(2)
        }
    }
}

/// Works through the sites; whether all of them went well.
fn run(call: &Call) -> Result<bool> {
    let case = match &call.case {
        None => Case::default(),
        Some(path) => Case::from_json(&text_of(path)?)?,
    };
    let catalogue = Catalogue::published()?;
    let mut paths = call.paths.clone();
    if paths.is_empty() && call.each.is_empty() && !case.files.is_empty() {
        paths.extend(call.case.clone());
    }
    let mut sites = sites::list(&paths, &call.each)?;
    if let Some((k, n)) = call.part {
        sites = sites.into_iter().skip(k - 1).step_by(n).collect();
    }
    let pool =
        rayon::ThreadPoolBuilder::new().num_threads(call.jobs.map_or(0, usize::from)).build().map_err(
            |error| Fault::new(format!("no threads can be started: {error}"), "--jobs", "Ask for fewer."),
        )?;
    let (send, receive) = mpsc::channel();
    let mut all_well = true;
    std::thread::scope(|scope| {
        scope.spawn(|| {
            let send = send;
            pool.install(|| {
                sites.par_iter().enumerate().for_each_with(send, |send, (place, site)| {
                    // A receiver that has gone away has had its fill (a closed pipe): nothing is left to do.
                    let _ = send.send((place, guarded(site, &case, &catalogue)));
                });
            });
        });
        // Sites are written in the order of the list, each as soon as all before it are.
        let mut waiting = std::collections::BTreeMap::new();
        let mut next = 0;
        let mut out = write::Writer::new(call.out);
        for (place, result) in receive {
            waiting.insert(place, result);
            while let Some(result) = waiting.remove(&next) {
                all_well &= result.error.is_none();
                out.site(&result)?;
                next += 1;
            }
        }
        out.end()
    })?;
    Ok(all_well)
}

fn text_of(path: &Path) -> Result<String> {
    std::fs::read_to_string(path).map_err(|error| {
        Fault::new(
            format!("the case file cannot be read: {error}"),
            path.display().to_string(),
            "Check the path, and that the file is JSON in UTF-8.",
        )
    })
}

/// A site's result; a fault or a panic becomes its error, so that one bad site never stops the others.
fn guarded(site: &Site, case: &Case, catalogue: &Catalogue) -> SiteResult {
    let caught = std::panic::catch_unwind(std::panic::AssertUnwindSafe(|| one(site, case, catalogue)));
    match caught {
        Ok(Ok(result)) => result,
        Ok(Err(fault)) => failed(&site.name, fault),
        Err(_panic) => failed(
            &site.name,
            Fault::new(
                "the program stopped on this site",
                site.name.clone(),
                "Report this as a defect, with the file if you may.",
            ),
        ),
    }
}

fn one(site: &Site, case: &Case, catalogue: &Catalogue) -> Result<SiteResult> {
    if let [only] = site.files.as_slice()
        && sites::is_case(only)?
    {
        return carried(only, catalogue);
    }
    let sources = site
        .files
        .iter()
        .map(|path| Disk::open(path).map(|disk| Box::new(disk) as Box<dyn Source>))
        .collect::<Result<Vec<_>>>()?;
    through(&site.name, sources, case, catalogue)
}

/// A site whose case carries its record.
fn carried(path: &Path, catalogue: &Catalogue) -> Result<SiteResult> {
    let mut case = Case::from_json(&text_of(path)?)?;
    let files = std::mem::take(&mut case.files);
    if files.is_empty() {
        return Err(Fault::new(
            "the case carries no record",
            path.display().to_string(),
            "Name the meter file, and give the case by --case.",
        ));
    }
    let names: Vec<&str> = files.iter().map(|file| file.name.as_str()).collect();
    let sources = files
        .iter()
        .map(|file| Ok(Box::new(Memory::new(&file.name, file.unpack()?)) as Box<dyn Source>))
        .collect::<Result<Vec<_>>>()?;
    through(&site_of(&names), sources, &case, catalogue)
}

fn through(
    name: &str,
    sources: Vec<Box<dyn Source>>,
    case: &Case,
    catalogue: &Catalogue,
) -> Result<SiteResult> {
    let record = Rc::new(finish(read(name, sources, &case.record, &case.duty.columns())?)?);
    Ok(assess(&record, case, catalogue)?.result())
}
