//! `ketwork replay`: evaluates sessions again and compares with their record.

use super::batch::{Batch, Told};
use super::console::{OutputEnd, print, tell};
use super::status::Status;
use crate::report::replay as shown;
use crate::session::ReplayVerdict;
use std::path::{Path, PathBuf};

/// Replays every file, whatever became of the ones before.
pub fn replay(batch: &Batch, paths: &[PathBuf]) -> Status {
    let mut status = Status::Fine;
    for path in paths {
        match replay_one(batch, path) {
            Ok((of_file, stopped)) => {
                status = status.and(of_file);
                if stopped {
                    break;
                }
            }
            Err(end) => return batch.output_ended(&end),
        }
    }
    status
}

fn replay_one(batch: &Batch, path: &Path) -> Result<(Status, bool), OutputEnd> {
    let (source, mut session) = match batch.open(path) {
        Ok(opened) => opened,
        Err(status) => return Ok((status, false)),
    };
    let paint = batch.console.results;
    let effort = session.effort();
    let mut ended: Option<OutputEnd> = None;
    let done = batch.worker.run(&effort, || {
        batch.worker.progress.begin("entry 1".into());
        let report = session.replay(&mut |entry| {
            batch.worker.progress.begin(format!("entry {}", entry.number + 1));
            if ended.is_none()
                && let Err(end) = print(&shown::entry(entry, paint))
            {
                ended = Some(end);
                effort.stop();
            }
        });
        (report, &session)
    });
    if let Some(end) = ended {
        return Err(end);
    }
    let (report, session) = match done {
        Ok(done) => done,
        Err(problem) => {
            tell(&format!("{} {problem}", batch.console.messages.bad("error:")));
            return Ok((Status::Unusable, false));
        }
    };
    let mut told = Told::default();
    for entry in &report.entries {
        batch.tell_reports(&mut told, &source, session, &entry.reports);
    }
    told.end();
    print(&shown::summary(&source.name, &report, paint))?;
    let status = report.entries.iter().map(|entry| status_of(entry.verdict)).fold(Status::Fine, Status::and);
    Ok((status, report.stopped))
}

fn status_of(verdict: ReplayVerdict) -> Status {
    match verdict {
        ReplayVerdict::Agrees { .. } | ReplayVerdict::NotRecorded | ReplayVerdict::NothingToCompare => Status::Fine,
        ReplayVerdict::Differs { .. } | ReplayVerdict::Stopped => Status::Failed,
        ReplayVerdict::Failed => Status::Unusable,
    }
}
