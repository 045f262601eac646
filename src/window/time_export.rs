//! Charts over time put out: waveforms of a steady period, and the transient that is shown.

use super::command::Exported;
use super::export;
use super::session::Session;
use super::view::View;
use crate::analysis::{self, Steady, Transient};
use crate::figure::{self, TimeChart};
use crate::sheet;

/// The chart that is put out; none for what is no chart over time.
pub(super) fn chart(session: &Session, view: &View, what: Exported) -> Option<Result<TimeChart, String>> {
    let title = &session.design().title;
    match what {
        Exported::Waves => Some(steady(session).map(|steady| figure::waves(title, &steady))),
        Exported::Transient => Some(run(view).map(|run| {
            let said = format!("{} at {}", run.event.name(), run.condition.label);
            figure::transient(title, &said, &run.waveforms, run.prediction.as_ref())
        })),
        _ => None,
    }
}

/// The numbers that are put out as comma-separated values; none for what is not over time.
pub(super) fn numbers(session: &Session, view: &View, what: Exported) -> Option<Result<Vec<u8>, String>> {
    let mut bytes = Vec::new();
    let written = match what {
        Exported::WaveCurves => steady(session).map(|steady| sheet::write_waves(&steady, &mut bytes)),
        Exported::TransientCurves => run(view).map(|run| sheet::write_waveforms(&run.waveforms, &mut bytes)),
        _ => return None,
    };
    Some(written.and_then(|written| written.map_err(|error| error.to_string())).map(|()| bytes))
}

/// The steady period of the present results, worked out where no page shows it.
fn steady(session: &Session) -> Result<Steady, String> {
    export::usable(session)?;
    let known = session.steady().cloned();
    let design = session.examined().ok_or("There are no results yet.")?;
    known.unwrap_or_else(|| analysis::steady(design, session.request().shown)).map_err(|finding| finding.to_string())
}

/// The finished run that the transient page shows.
fn run(view: &View) -> Result<&Transient, String> {
    view.transient.result().ok_or_else(|| "There is no finished run: open the transient page (F4) first.".to_owned())
}
